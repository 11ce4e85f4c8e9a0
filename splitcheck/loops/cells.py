"""Gap outlines in, pieces of graded cells out: halved until fine enough, clipped, made compact."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString
from shapely.affinity import rotate

from splitcheck.loops.outlines import Ints, axes, box_edges, edges_of, moments, padded
from splitcheck.units import Floats

#: Pieces smaller than this part of their cell are dropped.
_SLIVER = 1e-4
#: Cells reach this far beyond their gap, as part of its size; less is rounding.
_HAIR = 1e-7
_SLACK = 1e-9
#: Pieces with more corners than this, or that fill less than this of their hull, are cut again.
_MOST_CORNERS = 24
_HOLLOW = 0.6
#: Of so many pieces in one cell at most panels are made.
_MOST_PARTS = 6
#: A hole larger than this part of a cell must not lie in it whole.
_HOLE = 0.3
#: Intricate pieces are not cut on if they are this many times as large as a panel at the trace.
_LARGE = 12.0
#: Gaps with more corners than this are clipped step by step.
_INTRICATE = 100


class TooManyPanelsError(Exception):
    """More panels than `Grading.most`: the caller shall ask for coarser ones."""


@dataclass(frozen=True, slots=True)
class Grading:
    """How fine the panels are: by the distance from the traces and from where they cross a rim."""

    lines: tuple[LineString, ...]
    """Centre lines over the gaps."""
    near_mm: float
    """Size of a panel at the trace."""
    slope: float = 0.35
    """By how much a panel may grow per mm of distance."""
    far_mm: float = np.inf
    """From this distance on panels grow twice as fast, and faster further out."""
    stretch: float = 3.0
    """How much longer than wide a panel at the trace may be, along the trace."""
    slender: float = np.inf
    """How long against its width a panel may be at most."""
    root_mm: float = np.inf
    """Size of panel that the first division of a large gap aims at; inf: `near_mm`."""
    rounds: int = 3
    """How often to cut on pieces that are not compact, before they are lumped together."""
    most: int = 100_000
    """Give up on gaps that need more panels than this."""


class Cuts(NamedTuple):
    """Pieces of a gap on their way to be panels."""

    edges: Floats
    rim: NDArray[np.bool_]
    """Which edges lie on the rim of the gap."""
    area: Floats
    """Areas that the pieces stand for."""
    inside: Floats
    """A point in each of them."""
    gap: Ints
    """Number of the gap each is of."""


def stacked(cuts: Sequence[Cuts]) -> Cuts:
    """Put pieces together; all get as many edges as the one with most."""
    full = [some for some in cuts if len(some.area)]
    if not full:
        none = np.zeros((0, 1, 4))
        return Cuts(none, none[:, :, 0] > 0, none[:, 0, 0], none[:, 0, :2], np.zeros(0, np.int64))
    widest = max(some.edges.shape[1] for some in full)
    return Cuts(
        np.concatenate([padded(some.edges, widest) for some in full]),
        np.concatenate([np.pad(s.rim, ((0, 0), (0, widest - s.rim.shape[1]))) for s in full]),
        np.concatenate([some.area for some in full]),
        np.concatenate([some.inside for some in full]),
        np.concatenate([some.gap for some in full]),
    )


def laid(gaps: NDArray[np.object_], grading: Grading, least: Floats) -> Cuts:
    """Cut gaps in cells that lie along each of them."""
    local = _around(gaps, grading)
    angle = _frame_angles(gaps, local, grading)
    cos, sin = np.cos(angle), np.sin(angle)
    turned = gaps.copy()
    for k in np.flatnonzero(angle):
        turned[k] = rotate(gaps[k], -angle[k], origin=(0, 0), use_radians=True)
    plan = _Plan(turned, cos, sin, _segments(grading), _entries(local, grading), grading)
    cuts = _clipped(plan, least)
    c, s = cos[cuts.gap], sin[cuts.gap]
    back = np.stack([np.stack([c, s], axis=1), np.stack([-s, c], axis=1)], axis=1)
    ends = cuts.edges.reshape(len(c), -1, 2)
    return cuts._replace(
        edges=(ends @ back).reshape(cuts.edges.shape),
        inside=(cuts.inside[:, None, :] @ back)[:, 0],
    )


class _Plan(NamedTuple):
    """What decides the size of cells, for many gaps at once."""

    gaps: NDArray[np.object_]
    """Each turned into its own frame."""
    cos: Floats
    sin: Floats
    """Direction of the first axis of each frame."""
    lines: Floats
    """Stretches of the traces, shape (s, 4), not turned."""
    entries: Floats
    """Where traces cross the rim of each gap, shape (gaps, k, 2), not turned; far off if none."""
    grading: Grading


def _around(gaps: NDArray[np.object_], grading: Grading) -> NDArray[np.object_]:
    """What of each gap lies around the traces: all of it, unless it is intricate."""
    local = gaps.copy()
    if grading.lines:
        west, south, east, north = shapely.total_bounds(np.array(grading.lines, dtype=object))
        for k in np.flatnonzero(shapely.get_num_coordinates(gaps) > 10 * _INTRICATE):
            box = (west - 1.0, south - 1.0, east + 1.0, north + 1.0)
            local[k] = _clips(gaps[k : k + 1], np.array([box]))[0]
    return local


def _frame_angles(
    gaps: NDArray[np.object_], local: NDArray[np.object_], grading: Grading
) -> Floats:
    """Direction in which to lay the cells: that of a straight gap, else that of the trace."""
    outlines = shapely.oriented_envelope(gaps)
    straight = shapely.area(gaps) > 0.8 * np.maximum(shapely.area(outlines), 1e-300)
    angle = np.zeros(len(gaps))
    for k in range(len(gaps)):
        if straight[k]:
            ends = shapely.get_coordinates(outlines[k])[:2]
        else:
            over = shapely.intersection(local[k], np.array(grading.lines, dtype=object))
            longest = int(np.argmax(shapely.length(over))) if len(over) else 0
            ends = shapely.get_coordinates(over[longest]) if len(over) else np.zeros((0, 2))
        if len(ends) > 1:
            angle[k] = np.arctan2(*(ends[-1] - ends[0])[::-1])
    angle = (angle + np.pi / 4) % (np.pi / 2) - np.pi / 4
    return np.where(np.abs(angle) < 1e-9, 0.0, angle)


def _segments(grading: Grading) -> Floats:
    """Straight stretches of the traces, as fine as panels see them."""
    found: list[Floats] = []
    for line in grading.lines:
        points = shapely.get_coordinates(line.simplify(grading.near_mm / 4))
        found.append(np.concatenate([points[:-1], points[1:]], axis=1))
    return np.concatenate(found) if found else np.zeros((0, 4))


def _entries(gaps: NDArray[np.object_], grading: Grading) -> Floats:
    """Where the traces cross the rim of each gap."""
    bundle = shapely.multilinestrings(list(grading.lines)) if grading.lines else LineString()
    met = shapely.intersection(shapely.boundary(gaps), bundle)
    points, owner = shapely.get_coordinates(met, return_index=True)
    counts = np.bincount(owner, minlength=len(gaps))
    first = np.concatenate([[0], np.cumsum(counts)[:-1]])
    entries = np.full((len(gaps), max(int(counts.max(initial=0)), 1), 2), 1e9)
    entries[owner, np.arange(len(owner)) - first[owner]] = points
    return entries


def _wanted(plan: _Plan, middle: Floats, gap: Ints) -> Floats:
    """Largest panel wanted at points of the gaps' frames, along either axis, shape (k, 2), mm."""
    if not len(plan.lines):
        return np.full((len(middle), 2), np.inf)
    grading = plan.grading
    cos, sin = plan.cos[gap], plan.sin[gap]
    x = (cos * middle[:, 0] - sin * middle[:, 1])[:, None]
    y = (sin * middle[:, 0] + cos * middle[:, 1])[:, None]
    x1, y1, x2, y2 = plan.lines.T
    length = np.maximum(np.hypot(x2 - x1, y2 - y1), 1e-12)
    ux, uy = (x2 - x1) / length, (y2 - y1) / length
    along = np.clip((x - x1) * ux + (y - y1) * uy, 0.0, length)
    distance = np.hypot(x - x1 - along * ux, y - y1 - along * uy)
    growth = grading.slope * distance * (1.0 + distance / grading.far_mm)
    # a cell wider than its distance would reach the trace itself
    across_mm = np.maximum(grading.near_mm, np.minimum(growth, 0.8 * distance))
    rim = plan.entries[gap]
    entry = np.hypot(x - rim[:, :, 0], y - rim[:, :, 1]).min(axis=1)
    least = np.minimum(
        grading.near_mm * grading.stretch, grading.slope * entry + 1.5 * grading.near_mm
    )
    along_mm = np.maximum(across_mm, least[:, None])
    # a cell axis at an angle to the trace takes the radius of the ellipse in that direction
    cross_x = cos[:, None] * ux + sin[:, None] * uy
    cross_y = cos[:, None] * uy - sin[:, None] * ux
    a, b = along_mm**-2.0, across_mm**-2.0
    wide = (cross_x**2 * a + cross_y**2 * b).max(axis=1)
    high = (cross_y**2 * a + cross_x**2 * b).max(axis=1)
    return np.stack([wide, high], axis=1) ** -0.5


def _clipped(plan: _Plan, least: Floats) -> Cuts:
    """Halve the cells of the bounding boxes until they are fine enough, and clip them."""
    gaps, grading = plan.gaps, plan.grading
    shapely.prepare(gaps)
    bounds = shapely.bounds(gaps)
    extent = (bounds[:, 2:] - bounds[:, :2]).max(axis=1)
    # a hair wider, by odd amounts, so that no cell border falls on a rim
    around = bounds + _HAIR * extent[:, None] * np.array([-1.0, -1.7, 2.3, 1.3])
    first = min(grading.root_mm, grading.near_mm)
    roots = [_roots(box, first) for box in around.tolist()]
    boxes, gap = np.concatenate(roots), np.repeat(np.arange(len(gaps)), [len(r) for r in roots])
    shapes = gaps[gap]
    holes = [shapely.bounds(shapely.get_rings(shape)[1:]).reshape(-1, 4) for shape in gaps]
    limit = (extent / least)[:, None]
    done: list[tuple[Floats, NDArray[np.object_], Ints]] = []
    count = 0
    while len(boxes):
        size = boxes[:, 2:] - boxes[:, :2]
        middle = (boxes[:, :2] + boxes[:, 2:]) / 2
        wanted = np.minimum(_wanted(plan, middle, gap), limit[gap])
        over = (size > wanted * 1.2) | _swallows(boxes, wanted.min(axis=1), gap, holes)[:, None]
        fine = ~over.any(axis=1)
        done.append((boxes[fine], shapes[fine], gap[fine]))
        count += int(fine.sum())
        boxes, owner = _halved(boxes[~fine], middle[~fine], over[~fine])
        if count + len(boxes) > grading.most:
            raise TooManyPanelsError
        boxes, shapes, gap = _met(gaps, boxes, shapes[~fine][owner], gap[~fine][owner])
    boxes, shapes, gap = (np.concatenate(part) for part in zip(*done, strict=True))
    return _cut_out(gaps, _Cells(boxes, shapes, gap, _SLACK * extent[gap]), grading)


class _Cells(NamedTuple):
    """Cells and what they lie over."""

    boxes: Floats
    shapes: NDArray[np.object_]
    """The gap, or the part of it that is left in the cell."""
    gap: Ints
    slack: Floats
    """What counts as on the border of a cell, mm."""

    def take(self, which: NDArray[np.bool_] | Ints) -> _Cells:
        """Some of the cells."""
        return _Cells(self.boxes[which], self.shapes[which], self.gap[which], self.slack[which])


def _met(
    gaps: NDArray[np.object_], boxes: Floats, shapes: NDArray[np.object_], gap: Ints
) -> tuple[Floats, NDArray[np.object_], Ints]:
    """Cells that meet their gap, each with the part of an intricate gap that is left in it."""
    met = shapely.intersects(gaps[gap], shapely.box(*boxes.T))
    boxes, shapes, gap = boxes[met], shapes[met], gap[met]
    intricate = shapely.get_num_coordinates(shapes) > _INTRICATE
    if intricate.any():
        shapes = shapes.copy()
        shapes[intricate] = _clips(shapes[intricate], boxes[intricate])
    return boxes, shapes, gap


def _clips(shapes: NDArray[np.object_], boxes: Floats) -> NDArray[np.object_]:
    """Clip polygons to boxes; by far faster than an intersection where they are intricate."""
    out = np.empty(len(shapes), dtype=object)
    for k, (shape, box) in enumerate(zip(shapes, boxes.tolist(), strict=True)):
        out[k] = shapely.clip_by_rect(shape, *box)
    bad = ~shapely.is_valid(out)
    if bad.any():
        out[bad] = shapely.intersection(shapes[bad], shapely.box(*boxes[bad].T))
    return out


def _roots(around: Sequence[float], near_mm: float) -> Floats:
    """First cells: halving them shall lead close to the size wanted, not up to twice below it."""
    west, south, east, north = around
    steps = [_division((east - west) / near_mm), _division((north - south) / near_mm)]
    x = np.linspace(west, east, steps[0] + 1)
    y = np.linspace(south, north, steps[1] + 1)
    corners = [np.repeat(x[:-1], steps[1]), np.tile(y[:-1], steps[0])]
    corners += [np.repeat(x[1:], steps[1]), np.tile(y[1:], steps[0])]
    return np.stack(corners, axis=1)


def _division(ratio: float) -> int:
    """First division of a side that is `ratio` final cells long: 4 to 7, or 1 where it is short."""
    if ratio < 40:
        return 1
    halvings = int(np.floor(np.log2(ratio / 4)))
    return int(np.ceil(ratio / 1.1 / 2**halvings))


def _swallows(
    boxes: Floats, wanted: Floats, gap: Ints, holes: Sequence[Floats]
) -> NDArray[np.bool_]:
    """Which cells hold a whole hole that is not small, in them or against what is wanted."""
    swallowed = np.zeros(len(boxes), dtype=bool)
    for number in np.unique(gap):
        if len(hole := holes[int(number)]):
            mine = np.flatnonzero(gap == number)
            box = boxes[mine, None]
            inside = (box[:, :, :2] < hole[:, :2]) & (box[:, :, 2:] > hole[:, 2:])
            side = np.maximum((boxes[mine, 2:] - boxes[mine, :2]).min(axis=1), wanted[mine])
            large = (hole[:, 2:] - hole[:, :2]).max(axis=1) > _HOLE * side[:, None]
            swallowed[mine] = (inside.all(axis=2) & large).any(axis=1)
    return swallowed


def _halved(boxes: Floats, middle: Floats, over: NDArray[np.bool_]) -> tuple[Floats, Ints]:
    """Halve each cell along the axes that are too long; the parts and whose parts they are."""
    owner = np.arange(len(boxes))
    for axis in (0, 1):
        split = over[:, axis]
        low, high = boxes.copy(), boxes[split].copy()
        low[split, 2 + axis] = middle[split, axis]
        high[:, axis] = middle[split, axis]
        boxes = np.concatenate([low, high])
        owner = np.concatenate([owner, owner[split]])
        middle = np.concatenate([middle, middle[split]])
        over = np.concatenate([over, over[split]])
    return boxes, owner


def _cut_out(gaps: NDArray[np.object_], cells: _Cells, grading: Grading) -> Cuts:
    """Clip cells to their gaps."""
    whole = shapely.contains_properly(gaps[cells.gap], shapely.box(*cells.boxes.T))
    inner = cells.boxes[whole]
    middle, size = (inner[:, :2] + inner[:, 2:]) / 2, inner[:, 2:] - inner[:, :2]
    off_rim = np.zeros((len(inner), 4), dtype=bool)
    cuts = [Cuts(box_edges(inner), off_rim, size.prod(axis=1), middle, cells.gap[whole])]
    if not whole.all():
        plain, hollow = _plain_pieces(cells.take(~whole), grading)
        if len(plain.gap):
            area = shapely.area(plain.shapes)
            edges = edges_of(shapely.orient_polygons(_simpler(plain.shapes, area)))
            rim = _on_rim(edges, plain)
            cuts.append(Cuts(edges, rim, area, _points_in(plain.shapes), plain.gap))
        if len(hollow.gap):
            cuts.append(_lumps(hollow.shapes, hollow.gap))
    return stacked(cuts)


def _simpler(pieces: NDArray[np.object_], area: Floats) -> NDArray[np.object_]:
    """Straighten curved rims."""
    many = np.flatnonzero(shapely.get_num_coordinates(pieces) > 7)
    if not len(many):
        return pieces
    slack = 0.03 * np.sqrt(area[many])
    rough = shapely.simplify(pieces[many], slack, preserve_topology=False)
    fit = shapely.get_type_id(rough) == shapely.GeometryType.POLYGON
    fit &= (shapely.area(rough) > 0.7 * area[many]) & shapely.is_valid(rough)
    rough[~fit] = shapely.simplify(pieces[many[~fit]], slack[~fit])
    pieces = pieces.copy()
    pieces[many] = rough
    return pieces


def _points_in(pieces: NDArray[np.object_]) -> Floats:
    return shapely.get_coordinates(shapely.point_on_surface(pieces))


def _plain_pieces(cells: _Cells, grading: Grading) -> tuple[_Cells, _Cells]:
    """Clip to cells, and cut on what is not compact.

    Returns the compact pieces as the shapes of their cells, and what is still not compact at the
    end. Of cells that hold many pieces only the largest count.
    """
    done: list[_Cells] = []
    lumps: list[_Cells] = []
    for left in range(grading.rounds, -1, -1):
        pieces, owner = _parts(cells)
        if len(owner) > 3 * grading.most:
            raise TooManyPanelsError
        bounds = shapely.bounds(pieces.shapes)
        compact = _compact(pieces.shapes, bounds, grading)
        extent = bounds[:, 2:] - bounds[:, :2]
        # far from the traces, where cells are large, shapes do not matter so much
        over = extent.max(axis=1) > _LARGE * grading.near_mm * 2.0 ** (left - grading.rounds)
        end = over & (left < grading.rounds) | (left == 0)
        kept = ~end | (_rank(shapely.area(pieces.shapes), owner) < _MOST_PARTS)
        done.append(pieces.take(compact & kept))
        lumps.append(pieces.take(~compact & end & kept))
        again = ~compact & ~end
        if not again.any():
            break
        middle = (bounds[again, :2] + bounds[again, 2:]) / 2
        along = extent[again] > 0.4 * extent[again].max(axis=1)[:, None]
        boxes, half = _halved(pieces.boxes[again], middle, along)
        cells = pieces.take(again).take(half)._replace(boxes=boxes)
    return (
        _Cells(*(np.concatenate(column) for column in zip(*done, strict=True))),
        _Cells(*(np.concatenate(column) for column in zip(*lumps, strict=True))),
    )


def _parts(cells: _Cells) -> tuple[_Cells, Ints]:
    """Clip shapes to their cells; the pieces, and the number of the cell each came from."""
    clipped = _clips(cells.shapes, cells.boxes)
    pieces, owner = shapely.get_parts(clipped, return_index=True)
    whole = np.prod(cells.boxes[:, 2:] - cells.boxes[:, :2], axis=1)
    keep = shapely.area(pieces) > _SLIVER * whole[owner]
    owner = owner[keep]
    return cells.take(owner)._replace(shapes=pieces[keep]), owner


def _compact(pieces: NDArray[np.object_], bounds: Floats, grading: Grading) -> NDArray[np.bool_]:
    """Which pieces one density and a few points can stand for."""
    area = shapely.area(pieces)
    corners = shapely.get_num_coordinates(pieces)
    many = np.flatnonzero(corners > _MOST_CORNERS)
    slack = 0.03 * np.sqrt(area[many])
    rough = shapely.simplify(pieces[many], slack, preserve_topology=False)
    corners[many] = shapely.get_num_coordinates(rough)
    long = (bounds[:, 2:] - bounds[:, :2]).max(axis=1)
    good: NDArray[np.bool_] = corners <= _MOST_CORNERS
    good &= area > _HOLLOW * shapely.area(shapely.convex_hull(pieces))
    good &= long**2 <= grading.slender * area
    return good


def _rank(area: Floats, owner: Ints) -> Ints:
    """The how-manieth largest of its owner each piece is, from 0."""
    order = np.lexsort((-area, owner))
    first = np.searchsorted(owner[order], owner[order], side="left")
    rank = np.empty(len(area), dtype=np.int64)
    rank[order] = np.arange(len(area)) - first
    return rank


def _lumps(pieces: NDArray[np.object_], gap: Ints) -> Cuts:
    """A rectangle of the same centre and second moments in place of each intricate piece."""
    area, centre, spread = moments(edges_of(shapely.orient_polygons(pieces)))
    u, v = axes(spread)
    corners = np.stack([-u - v, u - v, u + v, v - u], axis=1)
    ring = centre[:, None, :] + np.sqrt(3.0) * corners
    edges = np.concatenate([ring, np.roll(ring, -1, axis=1)], axis=2)
    off_rim = np.zeros((len(pieces), 4), dtype=bool)
    return Cuts(edges, off_rim, area, _points_in(pieces), gap)


def _on_rim(edges: Floats, cells: _Cells) -> NDArray[np.bool_]:
    """Which edges do not lie on the border of their cell, and so on the rim of the gap."""
    boxes, slack = cells.boxes, cells.slack[:, None]
    border = np.zeros(edges.shape[:2], dtype=bool)
    for axis in (0, 1):
        for side in (0, 2):
            level = boxes[:, side + axis, None]
            border |= (np.abs(edges[:, :, axis] - level) < slack) & (
                np.abs(edges[:, :, 2 + axis] - level) < slack
            )
    length = np.hypot(edges[:, :, 2] - edges[:, :, 0], edges[:, :, 3] - edges[:, :, 1])
    return ~border & (length > 0)
