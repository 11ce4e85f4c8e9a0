"""Traces and vias in, their source functions on the panels out, continuous within each gap."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from itertools import pairwise
from typing import NamedTuple, TypeAlias

import numpy as np
import shapely
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray
from shapely import LineString, Polygon
from shapely.ops import split

from splitcheck.loops.kernels import wall_source, walls_source
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

_RAYS = 24
#: Panels further than this many widths (or half heights) from a trace see it as one line.
_CLOSE = 4.0
#: Rays and cuts are laid askew by this (rad, or part of their length), so that none runs along a
#: rim: boards are drawn in multiples of 15 degrees.
_ASKEW = 0.0123


@dataclass(frozen=True, slots=True)
class Strip:
    """A trace of finite width with both ends over copper."""

    line: Floats
    """Centre line, shape (p, 2), mm."""
    width_mm: float
    """Over which the current is spread evenly, >= 0."""
    height_mm: float
    """Over the plane, > 0."""
    above_mm: float | None
    """Distance of a plane on the trace's side."""

    @property
    def share(self) -> float:
        """Part of the current that returns in this plane."""
        return 1.0 if self.above_mm is None else 1.0 - self.height_mm / self.above_mm

    @property
    def segments(self) -> Floats:
        """Its straight stretches, shape (p - 1, 4)."""
        return np.concatenate([self.line[:-1], self.line[1:]], axis=1)


def strip_sources(
    panels: Panels, strips: Sequence[Strip], between: Floats
) -> tuple[Floats, Floats]:
    """Source functions of traces of finite width, as their means over each panel.

    Parameters
    ----------
    panels
        The panels.
    strips
        The traces.
    between
        Angle between the two ends of each trace seen from the centres of the panels, continuous in
        each gap (`point_angles` of the last point less that of the first), shape (s, n), rad.

    Returns
    -------
    Sources of the strips and those of their centre lines alone, shape (n, s) each.

    Notes
    -----
    A strip is a bundle of filaments that leave from one point and end in one point, so that all
    of them enclose the same copper. Each filament's f jumps on its own line by its share s, and so
    does s A/2 pi, with A the angle that the filament is seen under: the difference is smooth. The
    angle between the ends, followed continuously through the gap, takes the place of A. Panels far
    from a strip see it as one line, from their centre.
    """
    lines = between.T * [strip.share / (2 * np.pi) for strip in strips]
    full = lines.copy()
    for like in _alike(strips):
        columns = np.array(like)
        thin, bundle = _smooth_means(panels, [strips[k] for k in like])
        lines[:, columns] += thin
        full[:, columns] += bundle
    return full, lines


def _alike(strips: Sequence[Strip]) -> list[list[int]]:
    """Numbers of strips of one width and height; they are worked off at once."""
    groups: dict[tuple[float, float, float], list[int]] = {}
    for k, strip in enumerate(strips):
        key = (strip.height_mm, strip.above_mm or 0.0, strip.width_mm)
        groups.setdefault(key, []).append(k)
    return [groups[key] for key in sorted(groups)]


class _Stretches(NamedTuple):
    """Stretches of strips of one width and height, one after another."""

    centre: Floats
    """On the centre lines, shape (s, 4)."""
    bundle: Floats
    """Those of the filaments, shape (s + 2 t, filaments, 4); the legs from the ends of the t
    strips to their filaments come last."""
    weights: Floats
    """Of the filaments."""
    owner: Ints
    """Number of the strip of each, shape (s + 2 t,)."""
    ends: Floats
    """Where the legs are, shape (2 t, 2)."""
    first: Ints
    """Number of the first stretch of each strip."""


def _stretches(strips: Sequence[Strip]) -> _Stretches:
    places, weights = filaments(strips[0].width_mm, strips[0].height_mm)
    paths = [run_beside(strip.line, places).transpose(1, 0, 2) for strip in strips]
    counts = np.array([len(strip.line) - 1 for strip in strips])
    every = np.arange(len(strips))
    return _Stretches(
        centre=np.concatenate([strip.segments for strip in strips]),
        bundle=np.concatenate(
            [*(path[1:-1] for path in paths), *(path[[0, -1]] for path in paths)]
        ),
        weights=weights,
        owner=np.concatenate([np.repeat(every, counts), np.repeat(every, 2)]),
        ends=np.concatenate([strip.line[[0, -1]] for strip in strips]),
        first=np.concatenate([[0], np.cumsum(counts)[:-1]]),
    )


def _smooth_means(panels: Panels, strips: Sequence[Strip]) -> tuple[Floats, Floats]:
    """Smooth part of f of centre lines and of whole strips, as means over panels, shape (n, s).

    Stretches that a panel is close to are averaged over its four points, and over the width.
    """
    made, one = _stretches(strips), strips[0]
    value = _smooth(panels.centre[:, None], made.centre, one)
    lines = np.add.reduceat(value, made.first, axis=1)
    away = [_distances(panels.centre, made.centre)]
    away.append(np.hypot(*np.moveaxis(panels.centre[:, None] - made.ends, 2, 0)))
    reach = _CLOSE * max(one.width_mm, one.height_mm / 2) + 2 * panels.radius
    i, k = np.nonzero(np.concatenate(away, axis=1) < reach[:, None])
    spots, owner = panels.points[i], made.owner[k]
    full = lines.copy()
    each = _smooth(spots[:, :, None], made.bundle[k][:, None], one) @ made.weights
    on_line = k < len(made.centre)
    ii, kk = i[on_line], k[on_line]
    single = _smooth(spots[on_line], made.centre[kk][:, None], one).mean(axis=1)
    np.add.at(full, (i, owner), each.mean(axis=1))
    np.add.at(full, (ii, owner[on_line]), -value[ii, kk])
    np.add.at(lines, (ii, owner[on_line]), single - value[ii, kk])
    near, strip = np.nonzero(_marked(lines.shape, i, owner))
    turn = _end_turns(panels, near, np.array([s.line[[0, -1]] for s in strips])[strip])
    turn *= one.share / (2 * np.pi)
    lines[near, strip] += turn
    full[near, strip] += turn
    return lines, full


def _marked(shape: tuple[int, ...], i: Ints, k: Ints) -> NDArray[np.bool_]:
    marked = np.zeros(shape, dtype=bool)
    marked[i, k] = True
    return marked


def _end_turns(panels: Panels, near: Ints, ends: Floats) -> Floats:
    """By how much the angle between two ends differs in the mean from that at the centre."""
    spots, middle = panels.points[near], panels.centre[near][:, None, :]
    turn = _turned(ends[:, 1, None], middle, spots) - _turned(ends[:, 0, None], middle, spots)
    mean: Floats = turn.mean(axis=1)
    return mean


def still_afar(
    panels: Panels,
    strips: Sequence[Strip],
    between: Floats,
    ends: Sequence[tuple[int, Floats]],
) -> Floats:
    """Set the angles between the ends of traces so that f fades away along a gap that goes on.

    Within a gap f is known up to whole turns, which do not matter if no net flux goes through it.
    Through a gap that goes on beyond what is looked at there may go some; its f is nothing far
    away, so that where it was cut off f is what the traces make there without any turns.

    Parameters
    ----------
    panels, strips
        The panels and the traces.
    between
        As in `strip_sources`, shape (s, n), rad.
    ends
        Numbers of gaps that go on, and where each was cut off, mm.

    Returns
    -------
    The angles, shape (s, n), rad.
    """
    turned = between.copy()
    for gap, at in ends:
        mine = np.flatnonzero(panels.gap == gap)
        if not len(mine):
            continue
        last = mine[np.argmin(np.hypot(*(panels.centre[mine] - at).T))]
        x, y = panels.centre[last, None].T
        for k, strip in enumerate(strips):
            _, seen = wall_source(x, y, strip.segments, strip.height_mm, strip.above_mm)
            turns = np.rint((between[k, last] - seen.sum()) / (2 * np.pi))
            turned[k, mine] -= 2 * np.pi * turns
    return turned


def _smooth(spots: Floats, segments: Floats, strip: Strip) -> Floats:
    """What stretches add to f, less what they add to the jump; points and stretches broadcast."""
    x, y = np.moveaxis(spots, -1, 0)
    value, seen = walls_source(x, y, segments, strip.height_mm, strip.above_mm)
    return value - strip.share / (2 * np.pi) * seen


def _distances(spots: Floats, segments: Floats) -> Floats:
    """Distance of points from stretches, shape (k, s)."""
    x1, y1, x2, y2 = segments.T
    dx, dy = x2 - x1, y2 - y1
    from_x, from_y = spots[:, None, 0] - x1, spots[:, None, 1] - y1
    place = np.clip((from_x * dx + from_y * dy) / (dx * dx + dy * dy), 0.0, 1.0)
    apart: Floats = np.hypot(from_x - place * dx, from_y - place * dy)
    return apart


@cache
def filaments(width_mm: float, height_mm: float) -> tuple[Floats, Floats]:
    """Gauss points across the width: more for traces wide against their height."""
    if width_mm < 0.02 * height_mm:
        return np.zeros(1), np.ones(1)
    nodes, weights = leggauss(int(min(3 + width_mm / height_mm, 9)))
    return nodes * width_mm / 2, weights / 2


def run_beside(line: Floats, offsets_mm: Floats) -> Floats:
    """Run beside a polyline at signed distances to the left, all from its first to its last point.

    Returns their stretches, shape (offsets, p + 1, 4).
    """
    step = np.diff(line, axis=0)
    step /= np.hypot(step[:, 0], step[:, 1])[:, None]
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1)
    before, after = np.concatenate([normal[:1], normal]), np.concatenate([normal, normal[-1:]])
    # mitred corners; a hairpin would throw its corner to infinity, so the mitre is held to 2
    mitre = (before + after) / np.maximum(1 + (before * after).sum(axis=1), 0.5)[:, None]
    # the legs at the ends have no length where the offset is none
    slight = np.where(np.abs(offsets_mm) < 1e-6, 1e-6, offsets_mm)
    path = np.empty((len(offsets_mm), len(line) + 2, 2))
    path[:, 0], path[:, -1] = line[0], line[-1]
    path[:, 1:-1] = line + slight[:, None, None] * mitre
    return np.concatenate([path[:, :-1], path[:, 1:]], axis=2)


def islands(gaps: Sequence[Polygon], points: Floats) -> list[tuple[int, Floats]]:
    """Which islands, surrounded by a gap, hold which points.

    Parameters
    ----------
    gaps
        Gaps with the islands as their holes.
    points
        Points on copper, shape (k, 2), mm.

    Returns
    -------
    For each hole that holds at least one of the points: the number of its gap, and which points
    it holds, shape (k,), 1 or 0.
    """
    found = []
    for number, gap in enumerate(gaps):
        rings = shapely.get_rings(gap)[1:]
        west, south, east, north = shapely.bounds(rings).reshape(-1, 4).T[:, :, None]
        x, y = points.T
        within = (x > west) & (x < east) & (y > south) & (y < north)
        for k in np.flatnonzero(within.any(axis=1)):
            inside = shapely.contains_xy(Polygon(rings[k]), x, y)
            if inside.any():
                found.append((number, inside.astype(np.float64)))
    return found


#: Cuts already made: by gap and point, the cut and the pieces of the gap with their turns.
Known: TypeAlias = "dict[tuple[int, int], _Sides]"


class _Sides(NamedTuple):
    """A gap parted by a cut: whole turns on each piece, the largest piece first."""

    direction: float
    """Where the angle starts, rad; counts for points that the gap does not surround."""
    pieces: tuple[Polygon, ...]
    turns: Floats


def point_angles(
    panels: Panels,
    gaps: Sequence[Polygon],
    points: Floats,
    held: list[tuple[int, Floats]],
    known: Known,
) -> Floats:
    """Direction from points on copper to the panels, as angles continuous within each gap.

    Parameters
    ----------
    panels, gaps
        The panels, and the gaps they were cut from.
    points
        Points on copper, shape (k, 2), mm.
    held
        What `islands` found for these points.
    known
        Cuts made for these gaps and points before; what is missing is added.

    Returns
    -------
    Angles at the centre of each panel, shape (k, n), rad, up to a constant for each gap.

    Notes
    -----
    Round a gap that surrounds a point its angle cannot come back to itself. But the currents that
    enter an island add up to zero, so that only differences between the points on one island
    count: there, the angle is given relative to the island's first point. Within the gap, an
    angle is followed from piece to piece over the cuts that a line from the point (to that first
    point, or else to where it meets the gap least) makes in it.
    """
    angles = np.zeros((len(points), len(panels)))
    for number, gap in enumerate(gaps):
        mine = np.flatnonzero(panels.gap == number)
        inside, centre = panels.inside[mine], panels.centre[mine]
        shapely.prepare(gap)
        bases = _bases(points, number, held)
        outer = np.flatnonzero(bases < 0)
        if len(outer):
            sides = _outer_sides(gap, points, [(number, int(k)) for k in outer], known)
            angles[np.ix_(outer, mine)] = _from_outside(points[outer], sides, inside, centre)
        for k in np.flatnonzero((bases >= 0) & (bases != np.arange(len(points)))):
            at, base = points[k], points[bases[k]]
            if (number, int(k)) not in known:
                cut = LineString([at, _way_over(at, base), base])
                known[number, int(k)] = _parted(gap, cut, 0.0)
            angles[k, mine] = _between(at, base, known[number, int(k)], inside, centre)
    return angles


def _bases(points: Floats, gap: int, held: Sequence[tuple[int, Floats]]) -> Ints:
    """The first point on the same island of a gap, for each point; -1 if it is on none."""
    bases = np.full(len(points), -1)
    for owner, row in held:
        if owner == gap:
            bases[row > 0] = int(np.argmax(row))
    return bases


def _seen(first: Floats, second: Floats, r: Floats) -> Floats:
    """Angle from the first to the second of two points as seen from r, within (-pi, pi]."""
    a, b = first - r, second - r
    return np.arctan2(
        a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1]
    )


def _way_over(at: Floats, base: Floats) -> Floats:
    """A point askew between two others, so that a cut by it runs along no rim."""
    step = at - base
    middle: Floats = (at + base) / 2 + _ASKEW * np.array([-step[1], step[0]])
    return middle


def _between(at: Floats, base: Floats, sides: _Sides, inside: Floats, centre: Floats) -> Floats:
    """Angle from the base to the point, both on one island."""
    via = _way_over(at, base)
    angle = _seen(base, via, inside) + _seen(via, at, inside) + _turns(sides, inside)
    return angle + _turned(at, inside, centre) - _turned(base, inside, centre)


def _turned(at: Floats, before: Floats, after: Floats) -> Floats:
    """By how much the direction from a point turns on a short way."""
    a, b = before - at, after - at
    return np.arctan2(
        a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1]
    )


def _outer_sides(
    gap: Polygon, points: Floats, keys: Sequence[tuple[int, int]], known: Known
) -> list[_Sides]:
    """Cuts for points that the gap does not surround: rays that meet it least."""
    new = [key for key in keys if key not in known]
    if new:
        west, south, east, north = gap.bounds
        at = points[[k for _, k in new]]
        out = at - np.array([(west + east) / 2, (south + north) / 2])
        direction = np.arctan2(out[:, 1], out[:, 0]) + _ASKEW
        far = 2 * np.hypot(*out.T) + 2 * float(np.hypot(east - west, north - south))
        ends = at + far[:, None] * np.stack([np.cos(direction), np.sin(direction)], axis=1)
        rays = [LineString(pair) for pair in zip(at, ends, strict=True)]
        blocked = shapely.intersects(gap, rays)
        for n, key in enumerate(new):
            start = float(direction[n])
            if blocked[n]:
                ray, start = _clearest_ray(gap, at[n], start, float(far[n]))
                known[key] = _parted(gap, ray, start)
            else:
                known[key] = _Sides(start, (gap,), np.zeros(1))
    return [known[key] for key in keys]


def _from_outside(
    points: Floats, sides: Sequence[_Sides], inside: Floats, centre: Floats
) -> Floats:
    """Angles about points that the gap does not surround, shape (k, n)."""
    direction = np.array([side.direction for side in sides])
    away = inside - points[:, None, :]
    angle = np.arctan2(away[:, :, 1], away[:, :, 0]) - direction[:, None]
    angle = direction[:, None] + np.mod(angle, 2 * np.pi)
    # turning left over its ray an angle falls from a full turn to none
    turns = np.array([_turns(side, inside) for side in sides])
    followed: Floats = angle + turns + _turned(points[:, None, :], inside, centre)
    return followed


def _clearest_ray(gap: Polygon, at: Floats, start: float, far: float) -> tuple[LineString, float]:
    """A ray from the point that meets the gap least often, and its direction."""
    # between which two rays each corner of the rim lies; an edge crosses those between its ends
    away = shapely.get_coordinates(gap.exterior) - at
    turned = np.mod(np.arctan2(away[:, 1], away[:, 0]) - start, 2 * np.pi)
    sector = np.minimum((turned * (_RAYS / (2 * np.pi))).astype(np.int64), _RAYS - 1)
    (crossing,) = np.diff(sector).nonzero()
    ahead = np.diff(sector)[crossing]
    left = _turned(np.zeros(2), away[crossing], away[crossing + 1]) > 0
    count = np.mod(np.where(left, ahead, -ahead), _RAYS)
    first = np.where(left, sector[crossing], sector[crossing + 1]) + 1
    which = np.repeat(first - np.cumsum(count) + count, count) + np.arange(count.sum())
    best = int(np.argmin(np.bincount(which % _RAYS, minlength=_RAYS)))
    direction = start + 2 * np.pi / _RAYS * best
    end = at + far * np.array([np.cos(direction), np.sin(direction)])
    return LineString([at, end]), float(direction)


def _parted(gap: Polygon, cut: LineString, direction: float) -> _Sides:
    """Part a gap by a cut, where an angle falls by one turn to its left."""
    if not shapely.intersects(gap, cut):
        return _Sides(direction, (gap,), np.zeros(1))
    parts = [part for part in split(gap, cut).geoms if isinstance(part, Polygon)]
    pieces = sorted(parts, key=lambda piece: -piece.area)
    if len(pieces) < 2:
        return _Sides(direction, (gap,), np.zeros(1))
    for piece in pieces:
        shapely.prepare(piece)
    return _Sides(direction, tuple(pieces), _walked(len(pieces), _steps(gap, cut, pieces)))


def _turns(sides: _Sides, spots: Floats) -> Floats:
    """Whole turns to add at points of a gap, rad."""
    turns = np.full(len(spots), sides.turns[0])
    for piece, own in zip(sides.pieces[1:], sides.turns[1:], strict=True):
        turns[shapely.contains_xy(piece, spots[:, 0], spots[:, 1])] = own
    return 2 * np.pi * turns


def _steps(gap: Polygon, cut: LineString, pieces: Sequence[Polygon]) -> list[tuple[int, int]]:
    """Pairs of pieces that meet on the cut: right of it first, then left."""
    steps: list[tuple[int, int]] = []
    # cuts cross rims, so that rim points and bends part them into stretches in and out of the gap
    met = shapely.get_coordinates(shapely.intersection(shapely.boundary(gap), cut))
    places = {shapely.line_locate_point(cut, shapely.points(spot)) for spot in met}
    bends = np.cumsum([0.0, *np.hypot(*np.diff(cut.coords, axis=0).T)])
    stops = sorted({*(float(place) for place in places), *bends.tolist()})
    for start, end in pairwise(stops):
        if end - start < 1e-9:
            continue
        middle = np.array(cut.interpolate((start + end) / 2).coords[0])
        if not shapely.contains_xy(gap, *middle):
            continue
        ahead = np.array(cut.interpolate(end).coords[0]) - middle
        normal = np.array([-ahead[1], ahead[0]]) / np.hypot(*ahead)
        aside = min(1e-6, (end - start) / 100) * normal
        right, left = (_piece_at(pieces, spot) for spot in (middle - aside, middle + aside))
        if right != left:
            steps.append((right, left))
    return steps


def _piece_at(pieces: Sequence[Polygon], spot: Floats) -> int:
    """The piece that holds a point; the first and largest if rounding puts it in none."""
    for number in range(len(pieces) - 1, 0, -1):
        if shapely.contains_xy(pieces[number], *spot):
            return number
    return 0


def _walked(count: int, steps: Sequence[tuple[int, int]]) -> Floats:
    """Number the pieces, one more for each step to the left; the first piece is number 0."""
    number: dict[int, int] = {}
    for seed in range(count):
        queue = [] if seed in number else [seed]
        number.setdefault(seed, 0)
        while queue:
            here = queue.pop()
            for right, left in steps:
                for near, other, change in ((right, left, 1), (left, right, -1)):
                    if near == here and other not in number:
                        number[other] = number[here] + change
                        queue.append(other)
    return np.array([number[piece] for piece in range(count)], dtype=np.float64)
