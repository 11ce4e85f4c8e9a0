"""Gap outlines in, graded panels out: small pieces of the gaps, each with one flux density."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Polygon
from shapely.affinity import rotate

from splitcheck.units import Floats

Ints = NDArray[np.int64]

#: A panel at the rim is widened by this part of its thickness there. The density rises towards
#: the rim as one over the root of the distance; for a strip cut into n equal cells of uniform
#: density this widening gives back the exact capacity (0.1204 for n = 1 and 2, 0.1152 for many).
_WIDEN = 0.118
#: Pieces smaller than this part of their cell are dropped.
_SLIVER = 1e-4
#: Pieces with more corners than this, or that fill less than this of their hull, are cut again.
_MOST_CORNERS = 24
_HOLLOW = 0.6
#: More pieces than this in one cell are lumped together.
_MOST_PARTS = 4
#: ... at once if they are this many times as large as a panel at the trace.
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
    rounds: int = 3
    """How often to cut on pieces that are not compact, before they are lumped together."""
    most: int = 100_000
    """Give up on gaps that need more panels than this."""


@dataclass(frozen=True, slots=True)
class Panels:
    """The panels of all gaps, as arrays with one row a panel."""

    edges: Floats
    """Outlines as edges, shape (n, m, 4), mm, widened at the rim; unused edges have no length."""
    area: Floats
    """mm^2, shape (n,)."""
    centre: Floats
    """Centroids, shape (n, 2), mm."""
    spread: Floats
    """Second moments per area about the centroid, shape (n, 3) as xx, xy, yy, mm^2."""
    sides: Floats
    """Sides of the rectangle of the same second moments, shape (n, 2), mm, longer first."""
    points: Floats
    """Four points of equal weight that have the same second moments, shape (n, 4, 2), mm."""
    radius: Floats
    """Largest distance of a corner from the centroid, shape (n,), mm."""
    gap: Ints
    """Number of the gap each panel belongs to, shape (n,)."""

    def __len__(self) -> int:
        return len(self.area)


def cut(gaps: Sequence[Polygon], grading: Grading, least: Sequence[float] = ()) -> Panels:
    """Cut gaps into graded panels.

    Parameters
    ----------
    gaps
        Valid polygons that do not overlap, mm; holes are copper.
    grading
        How fine, and where.
    least
        For each gap, into how many panels to cut its longer side at least; 4 if not given.

    Returns
    -------
    The panels of all gaps, in the order of the gaps.

    Examples
    --------
    >>> slot = shapely.box(-0.2, -4, 0.2, 4)
    >>> panels = cut([slot], Grading((LineString([(-9, 0), (9, 0)]),), near_mm=0.2))
    >>> bool(panels.area.sum() > slot.area)
    True
    """
    edges: list[Floats] = []
    rims: list[NDArray[np.bool_]] = []
    areas: list[Floats] = []
    numbers: list[Ints] = []
    for number, gap in enumerate(gaps):
        outline, rim, area = _pieces(gap, grading, least[number] if least else 4.0)
        edges.append(outline)
        areas.append(area)
        rims.append(rim)
        numbers.append(np.full(len(outline), number, dtype=np.int64))
    widest = max((outline.shape[1] for outline in edges), default=1)
    if not edges:
        nothing = np.zeros((0, 1, 4))
        return _measured(nothing, nothing[:, :, 0] > 0, np.zeros(0), np.zeros(0, np.int64))
    return _measured(
        np.concatenate([_padded(outline, widest) for outline in edges]),
        np.concatenate([np.pad(rim, ((0, 0), (0, widest - rim.shape[1]))) for rim in rims]),
        np.concatenate(areas),
        np.concatenate(numbers),
    )


def _padded(outline: Floats, widest: int) -> Floats:
    """Add edges of no length, all at the start of the outline."""
    room = widest - outline.shape[1]
    start = np.concatenate([outline[:, :1, :2], outline[:, :1, :2]], axis=2)
    return np.concatenate([outline, np.repeat(start, room, axis=1)], axis=1)


def _pieces(
    gap: Polygon, grading: Grading, least: float
) -> tuple[Floats, NDArray[np.bool_], Floats]:
    """Edges of the panels of one gap, which of them lie on the rim of the gap, and areas."""
    angle = _frame_angle(gap, grading)
    turned = rotate(gap, -angle, origin=(0, 0), use_radians=True) if angle else gap
    lines = _segments(grading.lines, gap, grading)
    cos, sin = np.cos(angle), np.sin(angle)
    back = np.array([[cos, -sin], [sin, cos]])
    local = (lines.reshape(-1, 2) @ back).reshape(-1, 4)
    outline, rim, area = _clipped(turned, local, grading, least)
    return (outline.reshape(-1, 2) @ back.T).reshape(outline.shape), rim, area


def _frame_angle(gap: Polygon, grading: Grading) -> float:
    """Direction in which to lay the cells: that of a straight gap, else that of the trace."""
    outline = shapely.minimum_rotated_rectangle(gap)
    if isinstance(outline, Polygon) and gap.area > 0.8 * outline.area:
        (x0, y0), (x1, y1) = outline.exterior.coords[:2]
        angle = float(np.arctan2(y1 - y0, x1 - x0))
    else:
        over = [line.intersection(gap) for line in grading.lines]
        longest = max(over, key=lambda part: part.length, default=None)
        angle = 0.0
        if longest is not None and longest.length > 0:
            ends = shapely.get_coordinates(longest)
            angle = float(np.arctan2(*(ends[-1] - ends[0])[::-1]))
    angle = (angle + np.pi / 4) % (np.pi / 2) - np.pi / 4
    return 0.0 if abs(angle) < 1e-9 else angle


def _segments(lines: Sequence[LineString], gap: Polygon, grading: Grading) -> Floats:
    """Straight stretches of the traces that matter for the size of panels in this gap."""
    found: list[Floats] = []
    for line in lines:
        points = shapely.get_coordinates(line.simplify(grading.near_mm / 4))
        found.append(np.concatenate([points[:-1], points[1:]], axis=1))
    return np.concatenate(found) if found else np.zeros((0, 4))


def _wanted(x: Floats, y: Floats, lines: Floats, rim: Floats, grading: Grading) -> Floats:
    """Largest panel wanted at points, as width along x and along y, shape (k, 2), mm."""
    wanted = np.full((len(x), 2), np.inf)
    if not len(lines):
        return wanted
    x1, y1, x2, y2 = lines.T
    dx, dy = x2 - x1, y2 - y1
    length = np.maximum(np.hypot(dx, dy), 1e-12)
    ux, uy = dx / length, dy / length
    along = np.clip((x[:, None] - x1) * ux + (y[:, None] - y1) * uy, 0.0, length)
    distance = np.hypot(x[:, None] - x1 - along * ux, y[:, None] - y1 - along * uy)
    growth = grading.slope * distance * (1.0 + distance / grading.far_mm)
    across_mm = np.maximum(grading.near_mm, growth)
    along_mm = np.maximum(across_mm, grading.near_mm * grading.stretch)
    if len(rim):
        entry = np.hypot(x[:, None] - rim[:, 0], y[:, None] - rim[:, 1]).min(axis=1)
        along_mm = np.minimum(
            along_mm,
            np.maximum(across_mm, (grading.slope * entry + 1.5 * grading.near_mm)[:, None]),
        )
    # a cell axis at an angle to the trace takes the radius of the ellipse in that direction
    wanted[:, 0] = (1.0 / np.sqrt((ux / along_mm) ** 2 + (uy / across_mm) ** 2)).min(axis=1)
    wanted[:, 1] = (1.0 / np.sqrt((uy / along_mm) ** 2 + (ux / across_mm) ** 2)).min(axis=1)
    return wanted


def _entries(gap: Polygon, lines: Floats) -> Floats:
    """Where the traces cross the rim of the gap, shape (k, 2)."""
    if not len(lines):
        return np.zeros((0, 2))
    segments = shapely.linestrings(lines.reshape(-1, 2, 2))
    return shapely.get_coordinates(shapely.intersection(segments, gap.boundary))


def _clipped(
    gap: Polygon, lines: Floats, grading: Grading, least: float
) -> tuple[Floats, NDArray[np.bool_], Floats]:
    """Halve the cells of the bounding box until they are fine enough, and clip them."""
    shapely.prepare(gap)
    west, south, east, north = gap.bounds
    # a hair wider, by odd amounts, so that no cell border falls on a rim
    hair = 1e-7 * max(east - west, north - south)
    around = [west - hair, south - 1.7 * hair, east + 2.3 * hair, north + 1.3 * hair]
    boxes = _roots(around, grading.near_mm)
    shapes = np.full(len(boxes), gap, dtype=object)
    rim = _entries(gap, lines)
    holes = np.array([ring.bounds for ring in gap.interiors]).reshape(-1, 4)
    limit = max(east - west, north - south) / least
    done: list[tuple[Floats, NDArray[np.object_]]] = []
    count = 0
    while len(boxes):
        size = boxes[:, 2:] - boxes[:, :2]
        middle = (boxes[:, :2] + boxes[:, 2:]) / 2
        wanted = np.minimum(_wanted(middle[:, 0], middle[:, 1], lines, rim, grading), limit)
        over = (size > wanted * 1.2) | _swallows(boxes, holes)[:, None]
        fine = ~over.any(axis=1)
        done.append((boxes[fine], shapes[fine]))
        count += int(fine.sum())
        boxes, owner = _halved(boxes[~fine], middle[~fine], over[~fine])
        if count + len(boxes) > grading.most:
            raise TooManyPanelsError
        boxes, shapes = _met(gap, boxes, shapes[~fine][owner])
    cells, shapes = (np.concatenate(part) for part in zip(*done, strict=True))
    return _cut_out(gap, cells, shapes, grading)


def _met(
    gap: Polygon, boxes: Floats, shapes: NDArray[np.object_]
) -> tuple[Floats, NDArray[np.object_]]:
    """Cells that meet the gap, each with the part of an intricate gap that is left in it."""
    cells = shapely.box(*boxes.T)
    met = shapely.intersects(gap, cells)
    boxes, cells, shapes = boxes[met], cells[met], shapes[met]
    intricate = shapely.get_num_coordinates(shapes) > _INTRICATE
    if intricate.any():
        shapes = shapes.copy()
        shapes[intricate] = shapely.intersection(shapes[intricate], cells[intricate])
    return boxes, shapes


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


def _swallows(boxes: Floats, holes: Floats) -> NDArray[np.bool_]:
    """Which cells hold a whole hole that is not small in them."""
    inside = (boxes[:, None, :2] < holes[:, :2]) & (boxes[:, None, 2:] > holes[:, 2:])
    large = (holes[:, 2:] - holes[:, :2]).max(axis=1) > 0.3 * np.min(
        boxes[:, 2:] - boxes[:, :2], axis=1
    )[:, None]
    swallowed: NDArray[np.bool_] = (inside.all(axis=2) & large).any(axis=1)
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


def _cut_out(
    gap: Polygon, boxes: Floats, shapes: NDArray[np.object_], grading: Grading
) -> tuple[Floats, NDArray[np.bool_], Floats]:
    """Clip cells to the gap: edges of the pieces, which of them lie on the rim, and areas."""
    whole = shapely.contains_properly(gap, shapely.box(*boxes.T))
    outlines = [_box_edges(boxes[whole])]
    rims = [np.zeros((int(whole.sum()), 4), dtype=bool)]
    areas = [np.prod(boxes[whole, 2:] - boxes[whole, :2], axis=1)]
    if not whole.all():
        plain, cells, area, rough, owner = _plain_pieces(shapes[~whole], boxes[~whole], grading)
        if len(plain):
            edges = _edges_of(shapely.orient_polygons(plain))
            outlines.append(edges)
            rims.append(_on_rim(edges, cells))
            areas.append(area)
        if len(rough):
            edges, whole_area = _lumps(rough, owner)
            outlines.append(edges)
            rims.append(np.zeros((len(edges), 4), dtype=bool))
            areas.append(whole_area)
    widest = max(outline.shape[1] for outline in outlines)
    full = [_padded(outline, widest) for outline in outlines if len(outline)]
    marks = [np.pad(r, ((0, 0), (0, widest - r.shape[1]))) for r in rims if len(r)]
    return np.concatenate(full), np.concatenate(marks), np.concatenate(areas)


def _plain_pieces(
    shapes: NDArray[np.object_], boxes: Floats, grading: Grading
) -> tuple[NDArray[np.object_], Floats, Floats, NDArray[np.object_], Ints]:
    """Clip to cells, and cut on what is not compact.

    Returns the compact pieces, their cells and areas, and what is still not compact at the end,
    with the number of the cell that each such piece lies in.
    """
    done: list[tuple[NDArray[np.object_], Floats]] = []
    lumps: list[tuple[NDArray[np.object_], Ints]] = []
    count = len(boxes)
    number = np.arange(count)
    for left in range(grading.rounds, -1, -1):
        pieces, owner = shapely.get_parts(
            shapely.intersection(shapes, shapely.box(*boxes.T)), return_index=True
        )
        cells = boxes[owner]
        keep = shapely.area(pieces) > _SLIVER * np.prod(cells[:, 2:] - cells[:, :2], axis=1)
        pieces, cells, owner = shapely.simplify(pieces[keep], 0.0), cells[keep], owner[keep]
        if len(pieces) > 3 * grading.most:
            raise TooManyPanelsError
        bounds = shapely.bounds(pieces)
        compact = _compact(pieces, bounds, grading)
        parts = np.bincount(owner, minlength=1)[owner]
        extent = bounds[:, 2:] - bounds[:, :2]
        # far from the traces, where cells are large, shapes do not matter so much
        over = extent.max(axis=1) > _LARGE * grading.near_mm * 2.0 ** (left - grading.rounds)
        end = over & (left < grading.rounds) | (left == 0)
        compact &= ~(end & (parts > _MOST_PARTS))
        done.append((pieces[compact], cells[compact]))
        lumps.append((pieces[~compact & end], number[owner[~compact & end]]))
        again = ~compact & ~end
        if not again.any():
            break
        middle = (bounds[again, :2] + bounds[again, 2:]) / 2
        along = extent[again] > 0.4 * extent[again].max(axis=1)[:, None]
        boxes, half = _halved(cells[again], middle, along)
        number = count + np.arange(len(boxes))
        count += len(boxes)
        shapes = pieces[again][half]
    plain, inside = (np.concatenate(part) for part in zip(*done, strict=True))
    rough, cell = (np.concatenate(part) for part in zip(*lumps, strict=True))
    area = shapely.area(plain)
    many = shapely.get_num_coordinates(plain) > 7
    plain[many] = shapely.simplify(plain[many], 0.03 * np.sqrt(area[many]))
    return plain, inside, area, rough, cell


def _compact(
    pieces: NDArray[np.object_], bounds: Floats, grading: Grading
) -> NDArray[np.bool_]:
    """Which pieces one density and a few points can stand for."""
    area = shapely.area(pieces)
    rough = shapely.simplify(pieces, 0.03 * np.sqrt(area))
    long = (bounds[:, 2:] - bounds[:, :2]).max(axis=1)
    good: NDArray[np.bool_] = shapely.get_num_coordinates(rough) <= _MOST_CORNERS
    good &= area > _HOLLOW * shapely.area(shapely.convex_hull(pieces))
    good &= long**2 <= grading.slender * area
    return good


def _lumps(pieces: NDArray[np.object_], owner: Ints) -> tuple[Floats, Floats]:
    """One rectangle, of the same area and second moments, for what is left in each cell."""
    area, centre, spread = _moments(_edges_of(shapely.orient_polygons(pieces)))
    _, cell = np.unique(owner, return_inverse=True)
    whole = np.bincount(cell, area)
    mean = np.stack([np.bincount(cell, area * centre[:, k]) / whole for k in (0, 1)], axis=1)
    off = centre - mean[cell]
    square = np.stack([off[:, 0] ** 2, off[:, 0] * off[:, 1], off[:, 1] ** 2], axis=1)
    moment = area[:, None] * (spread + square)
    total = np.stack([np.bincount(cell, moment[:, k]) / whole for k in (0, 1, 2)], axis=1)
    u, v = _axes(total)
    # the moments keep the reach of a hollow lump; its rectangle is longer, not wider, than it is
    corners = [-u - v, u - v, u + v, v - u]
    ring = mean[:, None, :] + np.sqrt(3.0) * np.stack(corners, axis=1)
    return np.concatenate([ring, np.roll(ring, -1, axis=1)], axis=2), whole


def _axes(spread: Floats) -> tuple[Floats, Floats]:
    """Principal axes of second moments, each as long as the root of its moment."""
    xx, xy, yy = spread.T
    half = np.hypot((xx - yy) / 2, xy)
    mean = (xx + yy) / 2
    long, short = np.sqrt(mean + half), np.sqrt(np.maximum(mean - half, 1e-6 * mean))
    turn = 0.5 * np.arctan2(2 * xy, xx - yy)
    u = np.stack([np.cos(turn), np.sin(turn)], axis=1) * long[:, None]
    v = np.stack([-np.sin(turn), np.cos(turn)], axis=1) * short[:, None]
    return u, v


def _box_edges(boxes: Floats) -> Floats:
    west, south, east, north = boxes.T
    corners = np.stack([west, south, east, south, east, north, west, north], axis=1).reshape(
        -1, 4, 2
    )
    return np.concatenate([corners, np.roll(corners, -1, axis=1)], axis=2)


def _edges_of(pieces: NDArray[np.object_]) -> Floats:
    """Edges of polygons with counter-clockwise shells, holes included, padded to one length."""
    rings, piece = shapely.get_rings(pieces, return_index=True)
    points, ring = shapely.get_coordinates(rings, return_index=True)
    same = ring[1:] == ring[:-1]
    edges = np.concatenate([points[:-1], points[1:]], axis=1)[same]
    owner = piece[ring[:-1][same]]
    counts = np.bincount(owner, minlength=len(pieces))
    first = np.concatenate([[0], np.cumsum(counts)[:-1]])
    place = np.arange(len(owner)) - first[owner]
    start = edges[first][:, [0, 1, 0, 1]]
    padded: Floats = np.repeat(start[:, None, :], int(counts.max()), axis=1)
    padded[owner, place] = edges
    return padded


def _on_rim(edges: Floats, boxes: Floats) -> NDArray[np.bool_]:
    """Which edges do not lie on the border of their cell, and so on the rim of the gap."""
    slack = 1e-10 * np.ptp(boxes)
    border = np.zeros(edges.shape[:2], dtype=bool)
    for axis in (0, 1):
        for side in (0, 2):
            level = boxes[:, side + axis, None]
            border |= (np.abs(edges[:, :, axis] - level) < slack) & (
                np.abs(edges[:, :, 2 + axis] - level) < slack
            )
    length = np.hypot(edges[:, :, 2] - edges[:, :, 0], edges[:, :, 3] - edges[:, :, 1])
    return ~border & (length > 0)


def _measured(edges: Floats, rim: NDArray[np.bool_], true: Floats, gap: Ints) -> Panels:
    """Widen panels at the rim, up to what their true area asks for, and measure them."""
    area, centre, _ = _moments(edges)
    edges = _widened(edges, rim, (1 + _WIDEN) * true / area - 1, centre)
    area, centre, spread = _moments(edges)
    u, v = _axes(spread)
    points = centre[:, None, :] + np.stack([u + v, u - v, v - u, -u - v], axis=1)
    reach = np.hypot(edges[:, :, 0] - centre[:, None, 0], edges[:, :, 1] - centre[:, None, 1])
    sides = np.sqrt(12.0) * np.stack([np.hypot(*u.T), np.hypot(*v.T)], axis=1)
    radius = reach.max(axis=1) if len(edges) else np.zeros(0)
    return Panels(edges, area, centre, spread, sides, points, radius, gap)


def _moments(edges: Floats) -> tuple[Floats, Floats, Floats]:
    """Area, centroid and second moments per area of outlines, by Green's theorem."""
    origin = edges[:, :1, :2]
    x1, y1 = np.moveaxis(edges[:, :, :2] - origin, 2, 0)
    x2, y2 = np.moveaxis(edges[:, :, 2:] - origin, 2, 0)
    turn = x1 * y2 - x2 * y1
    area = turn.sum(axis=1) / 2
    cx = ((x1 + x2) * turn).sum(axis=1) / (6 * area)
    cy = ((y1 + y2) * turn).sum(axis=1) / (6 * area)
    xx = ((x1 * x1 + x1 * x2 + x2 * x2) * turn).sum(axis=1) / (12 * area) - cx * cx
    yy = ((y1 * y1 + y1 * y2 + y2 * y2) * turn).sum(axis=1) / (12 * area) - cy * cy
    xy = ((x1 * y2 + 2 * x1 * y1 + 2 * x2 * y2 + x2 * y1) * turn).sum(axis=1) / (24 * area)
    centre = np.stack([cx, cy], axis=1) + origin[:, 0]
    return area, centre, np.stack([xx, xy - cx * cy, yy], axis=1)


def _widened(edges: Floats, rim: NDArray[np.bool_], part: Floats, centre: Floats) -> Floats:
    """Stretch panels across the rim by a part of them, away from their inner side."""
    dx, dy = edges[:, :, 2] - edges[:, :, 0], edges[:, :, 3] - edges[:, :, 1]
    length = np.where(rim, np.hypot(dx, dy), 0.0)
    whole = np.maximum(length.sum(axis=1), 1e-300)
    square = np.maximum(length, 1e-300)
    nx, ny = dy / square, -dx / square
    weight = length / whole[:, None]
    pull = np.stack(
        [(weight * nx * nx).sum(1), (weight * nx * ny).sum(1), (weight * ny * ny).sum(1)]
    )
    middle = (edges[:, :, :2] + edges[:, :, 2:]) / 2
    rim_at = (weight[:, :, None] * middle).sum(axis=1)
    touched = length.sum(axis=1) > 0
    fixed = np.where(touched[:, None], 2 * centre - rim_at, centre)
    out = edges.copy()
    for first in (0, 2):
        x = edges[:, :, first] - fixed[:, None, 0]
        y = edges[:, :, first + 1] - fixed[:, None, 1]
        out[:, :, first] += part[:, None] * (pull[0][:, None] * x + pull[1][:, None] * y)
        out[:, :, first + 1] += part[:, None] * (pull[1][:, None] * x + pull[2][:, None] * y)
    return out
