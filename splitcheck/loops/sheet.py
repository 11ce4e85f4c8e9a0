"""A flow and a window in, lines of the return current out: copper in triangles, followed by level.

Level lines of a grid would step over a thin gap, and the stream function of a plane with sources
has no one value at a point. So the copper is cut into triangles that keep to the rims of its gaps,
only differences along their edges are used, and each line is followed from where it begins.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.spatial import Delaunay
from shapely import LineString, Polygon

from splitcheck.loops.outlines import Ints
from splitcheck.loops.streams import Flow, rises, smooth_part
from splitcheck.planes.islands import box_size_mm
from splitcheck.units import Floats, segments

#: Smallest triangle, as a share of the larger side of the window and of the height of the trace;
#: how fast they grow away from rims and trace; and the largest, as a share of the window.
_FINE, _FINE_HEIGHTS = 1 / 170, 0.35
_GROWTH = 0.28
_COARSE = 1 / 36
#: A node keeps this much of its size away from rims and rings.
_CLEAR = 1.0
#: Pieces of rim are this many smallest triangles long before they are cut as they ask for.
_PIECES = 8.0
#: A rim is cut where a triangle would cross it, at most so often.
_ROUNDS = 5
#: More nodes than this are not laid: the triangles are made larger instead.
_MOST_NODES = 9_000
#: Nodes on the ring about a pole.
_RING = 16


class Stream(NamedTuple):
    """One line of the return current."""

    path: LineString
    amps: float
    """Current it stands for, per ampere in the trace."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """Copper in triangles with the stream function on their corners."""

    nodes: Floats
    """Shape (n, 2), mm."""
    smooth: Floats
    """`smooth_part` on them, shape (n,); on a rim such that nothing flows through the gap."""
    corners: Ints
    """Nodes of each triangle, counterclockwise, shape (t, 3)."""
    rise: Floats
    """By how much the stream function rises from each corner to the next, shape (t, 3)."""
    beside: Ints
    """Triangle beyond the edge that faces each corner; -1 for none, shape (t, 3)."""
    open: NDArray[np.bool_]
    """Which triangles are copper, shape (t,)."""
    rings: tuple[Ints, ...]
    """Nodes round each pole, counterclockwise; empty for a pole outside the window."""
    pole_in: Ints
    """Number of the pole that each triangle lies at, -1 for none, shape (t,)."""


def stream_lines(
    flow: Flow,
    window: Polygon,
    count: int,
    *,
    obstacles: Sequence[Polygon] = (),
    focus: Polygon | None = None,
) -> tuple[Stream, ...]:
    """Lines along which the return current flows, each for an equal part of it.

    Parameters
    ----------
    flow
        The flow.
    window
        A box, mm: lines are followed to its border. One that holds both ends of the trace shows
        all of the return.
    count
        Into how many parts the current of the trace is divided, >= 1.
    obstacles
        More places without copper that the solve left out as too small to count: lines are led
        round them.
    focus
        The part of the window that is looked at closely; None: all of it.

    Returns
    -------
    The lines, against the current in the trace; none crosses a gap.

    Examples
    --------
    >>> from splitcheck.loops.solve import TraceOver, added
    >>> from splitcheck.loops.streams import flow_of
    >>> traces = [TraceOver(LineString([(-9, 0), (9, 0)]), 0.3)]
    >>> solution = added([shapely.box(-0.4, -3, 0.4, 3)], traces, 0.2)
    >>> flow = flow_of(solution, 0, traces, 0.2)
    >>> streams = stream_lines(flow, shapely.box(-10, -8, 10, 8), 8)
    >>> len(streams), any(s.path.intersects(shapely.box(-0.39, -3, 0.39, 3)) for s in streams)
    (8, False)
    """
    sheet = lay(flow, window, obstacles, focus)
    ways = _Ways(sheet)
    found: list[Stream] = []
    done: set[int] = set()
    for pole, strength in enumerate(flow.poles[1]):
        share = round(abs(float(strength)) * count)
        for seed in _seeds(sheet, pole, share):
            path, end = ways.followed(seed)
            if end not in done and len(path) > 1:
                line = path if strength > 0 else path[::-1]
                found.append(Stream(LineString(line), abs(float(strength)) / share))
        if len(sheet.rings[pole]):
            done.add(pole)
    return tuple(found)


def lay(
    flow: Flow,
    window: Polygon,
    obstacles: Sequence[Polygon] = (),
    focus: Polygon | None = None,
) -> Sheet:
    """Cut the copper in a window into triangles, and find the stream function on their corners.

    Parameters
    ----------
    flow, window, obstacles, focus
        As in `stream_lines`.

    Returns
    -------
    The sheet.
    """
    gaps, owners = _merged(_without_poles(obstacles, flow), flow.gaps)
    focus = window if focus is None else focus
    least = max(_FINE * box_size_mm(focus), _FINE_HEIGHTS * flow.strips[0].height_mm)
    for _ in range(8):
        plan = _planned(flow, window, gaps, focus, least)
        if len(plan.nodes) <= _MOST_NODES:
            break
        least *= 1.6
    return _triangles(flow, gaps, owners, plan)


def _merged(
    obstacles: Sequence[Polygon], gaps: Sequence[Polygon]
) -> tuple[list[Polygon], list[Ints]]:
    """Gaps and obstacles in pieces that do not touch, and the numbers of the gaps in each.

    A solve cuts gaps off at its window; what is left of them beyond it is an obstacle.
    """
    if not obstacles:
        return list(gaps), [np.array([k]) for k in range(len(gaps))]
    united = shapely.union_all([*gaps, *obstacles])
    pieces = [part for part in shapely.get_parts(united) if isinstance(part, Polygon)]
    owners: list[list[int]] = [[] for _ in pieces]
    spots = [gap.representative_point() for gap in gaps]
    for spot, piece in zip(*shapely.STRtree(pieces).query(spots, "intersects"), strict=True):
        owners[int(piece)].append(int(spot))
    return pieces, [np.array(some, dtype=np.int64) for some in owners]


def _without_poles(obstacles: Sequence[Polygon], flow: Flow) -> list[Polygon]:
    """Obstacles but for those in which current gets in or out.

    A trace ends at a pad of its own, often within its antipad; the solve does not see that either.
    """
    at = shapely.multipoints(flow.poles[0])
    return [shape for shape in obstacles if not shape.intersects(at)]


class _Plan(NamedTuple):
    """Nodes before they are joined."""

    nodes: Floats
    rims: list[Ints]
    """Nodes along each rim in the window; closed if the first is the last."""
    owner: list[int]
    """Number of the gap that each rim is of."""
    rings: tuple[Ints, ...]
    border: Ints
    """Nodes along the border of the window."""


def _planned(
    flow: Flow, window: Polygon, gaps: Sequence[Polygon], focus: Polygon, least: float
) -> _Plan:
    """Nodes on rims, round poles, and between them."""
    near = shapely.box(*window.bounds)
    rims: list[Floats] = []
    owner: list[int] = []
    for number, gap in enumerate(gaps):
        for ring in (gap.exterior, *gap.interiors):
            cut = ring if near.contains(ring) else shapely.intersection(ring, near)
            for part in shapely.get_parts(shapely.line_merge(cut) if cut is not ring else cut):
                if part.geom_type in {"LineString", "LinearRing"} and part.length > 0:
                    rims.append(shapely.get_coordinates(part))
                    owner.append(number)
    lines = [LineString(strip.line) for strip in flow.strips]
    field = _Sizes(lines, rims, focus, least, _COARSE * box_size_mm(window))
    at, _ = flow.poles
    circles = [_ring(flow, gaps, near, pole, least) for pole in at]
    laid = [_cut_up(rim, field) for rim in rims]
    inner = _filled(near, field, gaps, laid, [c for c in circles if len(c)])
    parts = [*laid, *circles, inner]
    first = np.cumsum([0, *(len(part) for part in parts)])
    numbers = [np.arange(a, b) for a, b in pairwise(first)]
    nodes = np.concatenate([np.reshape(part, (-1, 2)) for part in parts])
    closed = [_closed(nodes, own) for own in numbers[: len(laid)]]
    west, south, east, north = near.bounds
    x, y = nodes.T
    (border,) = np.nonzero((x <= west) | (x >= east) | (y <= south) | (y >= north))
    return _Plan(nodes, closed, owner, tuple(numbers[len(laid) : len(laid) + len(at)]), border)


def _closed(nodes: Floats, own: Ints) -> Ints:
    """Numbers along a rim; one that comes back to its first point ends with its first number."""
    if len(own) > 2 and (nodes[own[0]] == nodes[own[-1]]).all():
        return np.append(own[:-1], own[0])
    return own


class _Sizes:
    """How large triangles may be, by the distance from traces and rims, and from the focus."""

    def __init__(
        self,
        lines: Sequence[LineString],
        rims: Sequence[Floats],
        focus: Polygon,
        least: float,
        most: float,
    ) -> None:
        self.focus, self.least = focus, least
        self.most = max(most, _COARSE * box_size_mm(focus), least)
        self.inner = max(_COARSE * box_size_mm(focus), least)
        ends = [shapely.get_coordinates(line) for line in lines] + list(rims)
        pieces = np.concatenate([np.stack([e[:-1], e[1:]], axis=1) for e in ends])
        self.tree = shapely.STRtree(segments(pieces))

    def __call__(self, points: Floats) -> Floats:
        """Wanted size at points, mm."""
        if not len(points):
            return np.zeros(0)
        spots = shapely.points(points)
        (which, _), apart = self.tree.query_nearest(spots, return_distance=True, all_matches=False)
        distance = np.zeros(len(points))
        distance[which] = apart
        size = np.clip(self.least + _GROWTH * distance, self.least, self.inner)
        size += _GROWTH * shapely.distance(self.focus, spots)
        most: Floats = np.minimum(size, self.most)
        return most


def _cut_up(rim: Floats, field: _Sizes) -> Floats:
    """Points along a rim no further apart than two triangles of the size wanted there."""
    pieces = _parted(rim, np.full(len(rim) - 1, _PIECES * field.least))
    return _parted(pieces, 2.0 * field((pieces[:-1] + pieces[1:]) / 2))


def _parted(line: Floats, step: Floats) -> Floats:
    """Points along a line such that no stretch of it is longer than its step."""
    length = np.hypot(*np.diff(line, axis=0).T)
    parts = np.maximum(np.ceil(length / step), 1).astype(np.int64)
    owner = np.repeat(np.arange(len(parts)), parts)
    first = np.repeat(np.cumsum(parts) - parts, parts)
    share = ((np.arange(len(owner)) - first) / parts[owner])[:, None]
    points = line[owner] * (1 - share) + line[owner + 1] * share
    return np.concatenate([points, line[-1:]])


def _ring(flow: Flow, gaps: Sequence[Polygon], near: Polygon, pole: Floats, least: float) -> Floats:
    """A ring of nodes about a pole on copper, if the window holds it."""
    spot = shapely.Point(pole)
    apart = min([near.boundary.distance(spot), *(gap.distance(spot) for gap in gaps)])
    others = np.hypot(*(flow.poles[0] - pole).T)
    apart = min(apart, float(np.min(others[others > 1e-6], initial=np.inf)))
    radius = min(1.5 * least, 0.4 * apart)
    if radius <= 1e-3 or not near.contains(spot):
        return np.zeros((0, 2))
    turn = 2 * np.pi * (np.arange(_RING) + 0.37) / _RING
    return pole + radius * np.stack([np.cos(turn), np.sin(turn)], axis=1)


def _filled(
    near: Polygon,
    field: _Sizes,
    gaps: Sequence[Polygon],
    rims: Sequence[Floats],
    rings: Sequence[Floats],
) -> Floats:
    """Nodes on copper: the middles of squares, quartered until they are small enough."""
    x0, y0, x1, y1 = near.bounds
    # not quite the centre, so that nodes do not lie on the axes of what is symmetric
    columns, rows = (int(np.ceil((b - a) / field.most)) for a, b in ((x0, x1), (y0, y1)))
    u, v = np.meshgrid(np.arange(columns) + 0.5, np.arange(rows) + 0.5)
    at = np.stack([u.ravel(), v.ravel()], axis=1) * field.most + [x0, y0]
    side, found = field.most, [_frame(near, field.most)]
    while len(at):
        fine = field(at) >= side
        found.append(at[fine])
        quarter = np.array([[-0.25, -0.25], [0.25, -0.25], [-0.25, 0.25], [0.25, 0.25]])
        at = (at[~fine][:, None, :] + quarter * side).reshape(-1, 2)
        side /= 2
        if sum(map(len, found)) + len(at) > 2 * _MOST_NODES:
            break
    points = np.concatenate(found)
    inside = (points >= [x0, y0]).all(1) & (points <= [x1, y1]).all(1)
    points = points[inside]
    size = field(points)
    for fixed in (rims, rings):
        if fixed:
            spots = np.asarray(shapely.points(np.concatenate(list(fixed))), dtype=object)
            tree = shapely.STRtree(spots)
            (which, _), apart = tree.query_nearest(
                shapely.points(points), return_distance=True, all_matches=False
            )
            keep = np.ones(len(points), dtype=bool)
            keep[which] = apart > _CLEAR * size[which]
            points, size = points[keep], size[keep]
    for ring in rings:
        centre = ring.mean(axis=0)
        reach = float(np.hypot(*(ring[0] - centre))) * 1.4
        points = points[np.hypot(*(points - centre).T) > reach]
    if gaps:
        hit, _ = shapely.STRtree(list(gaps)).query(shapely.points(points), predicate="intersects")
        points = np.delete(points, np.unique(hit), axis=0)
    return points


def _frame(near: Polygon, step: float) -> Floats:
    """Nodes along the border of the window."""
    return shapely.get_coordinates(near.exterior.segmentize(step))[:-1]


def _triangles(flow: Flow, gaps: Sequence[Polygon], owners: Sequence[Ints], plan: _Plan) -> Sheet:
    """Join the nodes; cut rims where a triangle would cross them."""
    nodes, rims = plan.nodes, list(plan.rims)
    used = Delaunay(nodes)
    for _ in range(_ROUNDS):
        tri = used.simplices.astype(np.int64)
        edges = np.sort(_keys(tri[:, [0, 1, 2]], tri[:, [1, 2, 0]]).ravel())
        extra: list[Floats] = []
        total = len(nodes)
        for k, rim in enumerate(rims):
            keys = _keys(rim[:-1], rim[1:])
            place = np.minimum(np.searchsorted(edges, keys), len(edges) - 1)
            (missing,) = np.nonzero((edges[place] != keys) & (rim[:-1] != rim[1:]))
            extra.append((nodes[rim[missing]] + nodes[rim[missing + 1]]) / 2)
            rims[k] = np.insert(rim, missing + 1, total + np.arange(len(missing)))
            total += len(missing)
        if total == len(nodes):
            break
        nodes = np.concatenate([nodes, *extra])
        used = Delaunay(nodes)
    corners = used.simplices.astype(np.int64)
    smooth = smooth_part(flow, nodes)
    for rim, owner in zip(rims, plan.owner, strict=True):
        _still(flow, nodes, smooth, rim, owners[owner])
    copper = np.ones(len(corners), dtype=bool)
    if gaps:
        # a triangle in a gap has all its corners on rims, or on the border of the window
        rim = np.zeros(len(nodes), dtype=bool)
        rim[np.concatenate([*rims, plan.border])] = True
        (maybe,) = np.nonzero(rim[corners].all(axis=1))
        middle = shapely.points(nodes[corners[maybe]].mean(axis=1))
        hit, _ = shapely.STRtree(list(gaps)).query(middle, predicate="intersects")
        copper[maybe[hit]] = False
    pole_in = np.full(len(corners), -1)
    for number, ring in enumerate(plan.rings):
        if len(ring):
            mine = np.zeros(len(nodes), dtype=bool)
            mine[ring] = True
            pole_in[mine[corners].all(axis=1)] = number
    a, b = nodes[corners.ravel()], nodes[corners[:, [1, 2, 0]].ravel()]
    rise = rises(flow, a, b, smooth[corners.ravel()], smooth[corners[:, [1, 2, 0]].ravel()])
    beside = used.neighbors.astype(np.int64)
    return Sheet(nodes, smooth, corners, rise.reshape(-1, 3), beside, copper, plan.rings, pole_in)


def _keys(one: Ints, other: Ints) -> Ints:
    """A number for each pair of nodes, whichever comes first."""
    keys: Ints = (np.minimum(one, other) << 32) + np.maximum(one, other)
    return keys


def _still(flow: Flow, nodes: Floats, smooth: Floats, rim: Ints, owners: Ints) -> None:
    """Set the stream function on a rim to what it is in the gap, in place.

    At the rim the panels' even density is at its worst, while its mean over each panel in the gap
    is what the solve made constant.
    """
    at = nodes[rim]
    zero = np.zeros(len(at))
    turned = np.concatenate([[0.0], np.cumsum(rises(flow, at[:-1], at[1:], zero[1:], zero[1:]))])
    mine = np.flatnonzero(np.isin(flow.mesh.gap, owners))
    if len(mine):
        centre = flow.mesh.centre[mine]
        nearest = np.argmin(np.hypot(*(at[:, None] - centre).transpose(2, 0, 1)), axis=1)
        which, back = np.unique(nearest, return_inverse=True)
        spots = flow.mesh.points[mine[which]].reshape(-1, 2)
        mean = smooth_part(flow, spots).reshape(-1, 4).mean(axis=1)[back]
        raw = mean - rises(flow, at, centre[nearest], zero, zero)
    else:
        raw = smooth[rim]
    step = np.hypot(*np.diff(at, axis=0).T)
    weight = np.concatenate([step, [0.0]]) + np.concatenate([[0.0], step])
    level = float(((raw + turned) * weight).sum() / weight.sum())
    smooth[rim] = level - turned


class _Seed(NamedTuple):
    """Where a line enters a triangle: its edge, from left to right, and where on it."""

    triangle: int
    left: int
    right: int
    share: float


def _seeds(sheet: Sheet, pole: int, count: int) -> list[_Seed]:
    """Where lines leave the ring round a pole, with equal current between them."""
    ring = sheet.rings[pole]
    if not len(ring) or not count:
        return []
    outer: dict[tuple[int, int], tuple[int, float]] = {}
    mine = np.zeros(len(sheet.nodes), dtype=bool)
    mine[ring] = True
    for triangle in np.flatnonzero(mine[sheet.corners].sum(axis=1) == 2).tolist():
        tri = sheet.corners[triangle].tolist()
        for k in range(3):
            outer[tri[(k + 1) % 3], tri[k]] = (triangle, -float(sheet.rise[triangle, k]))
    ends = list(zip(ring.tolist(), np.roll(ring, -1).tolist(), strict=True))
    if any(edge not in outer for edge in ends):
        return []
    behind = np.cumsum([0.0, *(outer[edge][1] for edge in ends)])
    behind /= behind[-1] or 1.0
    seeds = []
    for level in (np.arange(count) + 0.5) / count:
        # the current leaves all round, unless a gap is very near
        (found,) = np.nonzero((behind[:-1] <= level) & (level < behind[1:]))
        for k in found[:1].tolist():
            share = (level - behind[k]) / (behind[k + 1] - behind[k])
            left, right = ends[k]
            seeds.append(_Seed(outer[left, right][0], left, right, float(share)))
    return seeds


class _Ways:
    """A sheet as plain lists, which are followed faster."""

    def __init__(self, sheet: Sheet) -> None:
        self.nodes: list[tuple[float, float]] = [(x, y) for x, y in sheet.nodes.tolist()]
        self.corners: list[list[int]] = sheet.corners.tolist()
        self.rise: list[list[float]] = sheet.rise.tolist()
        self.beside: list[list[int]] = sheet.beside.tolist()
        self.open: list[bool] = sheet.open.tolist()
        self.pole_in: list[int] = sheet.pole_in.tolist()

    def followed(self, seed: _Seed) -> tuple[list[tuple[float, float]], int]:
        """Follow a level through the triangles; its points, and the pole it comes to, or -1."""
        triangle, left, right, share = seed
        path = []
        for _ in range(4 * len(self.corners)):
            (x0, y0), (x1, y1) = self.nodes[left], self.nodes[right]
            path.append(((1 - share) * x0 + share * x1, (1 - share) * y0 + share * y1))
            if triangle < 0 or not self.open[triangle]:
                return path, -1
            if self.pole_in[triangle] >= 0:
                return path, self.pole_in[triangle]
            tri, rise = self.corners[triangle], self.rise[triangle]
            at, to = tri.index(left), tri.index(right)
            ahead = tri[3 - at - to]
            forward = (at + 1) % 3 == to
            whole = rise[at] if forward else -rise[to]
            there = -rise[3 - at - to] if forward else rise[at]
            level = share * whole
            # between the left node and the one ahead, or else between that and the right
            if (level - there) * (level - whole) > 0 or whole == there:
                share = level / there if there else 0.0
                face, right = to, ahead
            else:
                share = (level - there) / (whole - there)
                face, left = at, ahead
            share = min(max(share, 0.0), 1.0)
            triangle = self.beside[triangle][face]
        return path, -1
