"""Gaps beside a trace: its centre line stays over copper, and the return is crowded still."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Polygon

from splitcheck.loops.estimate import beside_edge_nh_mm, beside_void_nh
from splitcheck.planes.crossings import Crossing, runs_through
from splitcheck.planes.islands import Plane, box_size_mm
from splitcheck.planes.shadows import Bare, Uncovered, merged, spans_of
from splitcheck.planes.tracks import Ints, Tracks
from splitcheck.units import Floats, segments

#: A gap farther from the centre line than this many heights adds next to nothing.
BESIDE_HEIGHTS = 1.5
#: The distance to a gap is looked at so many times within that reach.
STEPS_A_REACH = 4
#: Two gaps, one on either side, may come together to what is worth telling.
PART = 0.5
#: So many of the planes on either side of a layer are looked at, nearest first.
PLANES_A_SIDE = 2
#: A gap that fills this share of its box is no longer than the box: a square, a round antipad.
FULL = 0.75
#: How far the closed form may be too low, gaps behind the nearest ones being left out of it.
MARGIN = 1.5


class _Near(NamedTuple):
    """Pieces of trace and tiles of gaps that come within reach of one another."""

    piece: Ints
    tile: Ints
    gap: Ints


def find_beside(
    tracks: Tracks,
    planes: Sequence[Plane],
    height_mm: Callable[[int, int], float],
    least_nh: float,
) -> tuple[Crossing, ...]:
    """Find closed gaps that the traces of a layer pass by without running over them.

    Parameters
    ----------
    tracks
        The judged traces of one layer.
    planes
        All planes of the board.
    height_mm
        Distance of two layers by their numbers.
    least_nh
        What a place must be able to add, nH, > 0.

    Returns
    -------
    One for each stretch that passes by, whatever lies on its two sides, with ``run_mm`` 0 and the
    gap that can add most.

    Notes
    -----
    A gap that its net runs over on the same layer is in that crossing's solve, or the antipad of
    a hole of its own. Where a nearer plane carries the return nothing beyond it counts. A trace
    that ends beside a gap does not pass it.
    """
    found: list[Crossing] = []
    if not len(tracks.net):
        return ()
    lines = segments(np.stack([tracks.start, tracks.end], axis=1))
    for side in (-1, 1):
        nearer: list[Plane] = []
        seen = np.ones(len(lines), dtype=np.bool_)
        on_side = [plane for plane in planes if (plane.layer - tracks.layer) * side > 0]
        on_side.sort(key=lambda plane: abs(plane.layer - tracks.layer))
        for plane in on_side[:PLANES_A_SIDE]:
            height = height_mm(tracks.layer, plane.layer)
            near = _near(tracks, lines, np.flatnonzero(seen), plane, height, least_nh)
            zones = _zones(tracks, lines, plane, nearer, near, BESIDE_HEIGHTS * height)
            for run in runs_through(tracks, plane, zones) if zones else ():
                place = _place(run, plane, height, least_nh)
                if place is not None:
                    found.append(place)
            nearer.append(plane)
            seen[seen] = ~_covered(tracks, plane, np.flatnonzero(seen))
    return tuple(found)


def _covered(tracks: Tracks, plane: Plane, pieces: Ints) -> NDArray[np.bool_]:
    """Which of some pieces lie over a plane at both ends and in the middle."""
    covered = np.ones(len(pieces), dtype=np.bool_)
    start, end = tracks.start[pieces], tracks.end[pieces]
    for at in ((start + end) / 2, start, end):
        rows = np.flatnonzero(covered)
        covered[rows] = plane.island_at(at[rows, 0], at[rows, 1]) >= 0
    return covered


def _near(
    tracks: Tracks,
    lines: NDArray[np.object_],
    pieces: Ints,
    plane: Plane,
    height: float,
    least_nh: float,
) -> _Near:
    """What comes near enough to a large enough gap, each piece of trace by itself."""
    reach = BESIDE_HEIGHTS * height
    x0, y0, x1, y1 = shapely.bounds([gap.shape for gap in plane.gaps]).reshape(-1, 4).T
    closed = np.array([not gap.open for gap in plane.gaps], dtype=np.bool_)
    sizes = np.where(closed, _lengths(plane, x1 - x0, y1 - y0), 0.0)
    most = np.array([_most_nh(float(size), 0.0, height) for size in sizes])
    large = (np.maximum(x1 - x0, y1 - y0) >= height) & (most >= PART * least_nh)
    tiles = np.array([n for n, tile in enumerate(plane.tiles) if large[tile.gap]], dtype=np.intp)
    nothing = np.empty(0, dtype=np.intp)
    if not len(tiles) or not len(pieces):
        return _Near(nothing, nothing, nothing)
    shapes = np.array([plane.tiles[n].shape for n in tiles.tolist()], dtype=object)
    tree = shapely.STRtree(shapes)
    piece, which = tree.query(lines[pieces], predicate="dwithin", distance=reach)
    if not len(piece):
        return _Near(nothing, nothing, nothing)
    piece = pieces[piece]
    gap = np.array([plane.tiles[n].gap for n in tiles[which].tolist()], dtype=np.intp)
    far = shapely.distance(lines[piece], shapes[which])
    key = tracks.net[piece] * len(plane.gaps) + gap
    keys, place = np.unique(key, return_inverse=True)
    nearest = np.full(len(keys), np.inf)
    np.minimum.at(nearest, place, far)
    each = np.array(
        [
            _most_nh(float(sizes[k % len(plane.gaps)]), mm, height) if mm > 0.0 else 0.0
            for k, mm in zip(keys.tolist(), nearest.tolist(), strict=True)
        ]
    )
    keep = (each >= PART * least_nh)[place] & (_by_piece(piece, place, each) >= least_nh)
    return _Near(piece[keep], tiles[which][keep], gap[keep])


def _lengths(plane: Plane, wide: Floats, high: Floats) -> Floats:
    """How long the gaps of a plane are: the side of a box that is full, else its diagonal."""
    full = shapely.area([gap.shape for gap in plane.gaps]) > FULL * wide * high
    return np.asarray(np.where(full, np.maximum(wide, high), np.hypot(wide, high)))


def _by_piece(piece: Ints, place: Ints, each: Floats) -> Floats:
    """For each row, what all gaps near its piece of trace can add together."""
    rows = np.unique(np.stack([piece, place], axis=1), axis=0)
    total = np.bincount(rows[:, 0], each[rows[:, 1]], minlength=int(piece.max()) + 1)
    return np.asarray(total[piece])


def _most_nh(size_mm: float, aside_mm: float, height: float) -> float:
    """More than a gap of that length adds."""
    if size_mm <= 0.0:
        return 0.0
    along = size_mm * beside_edge_nh_mm(aside_mm, height)
    return MARGIN * beside_void_nh(along, aside_mm, size_mm, height)


def _zones(
    tracks: Tracks,
    lines: NDArray[np.object_],
    plane: Plane,
    nearer: Sequence[Plane],
    near: _Near,
    reach: float,
) -> Uncovered:
    """Stretches of trace within reach of the gaps, where this plane carries the return."""
    if not len(near.piece):
        return {}
    unique, back = np.unique(near.tile, return_inverse=True)
    grown = shapely.buffer([plane.tiles[n].shape for n in unique.tolist()], reach, quad_segs=2)
    overlaps = shapely.intersection(lines[near.piece], np.asarray(grown, dtype=object)[back])
    spans: dict[int, list[tuple[float, float]]] = defaultdict(list)
    owner, starts, stops = spans_of(tracks, near.piece, overlaps)
    for piece, *span in zip(
        near.piece[owner].tolist(), starts.tolist(), stops.tolist(), strict=True
    ):
        spans[piece].append((span[0], span[1]))
    rows = [(piece, *span) for piece in sorted(spans) for span in merged(spans[piece])]
    places = np.array([tracks.point(piece, (a + b) / 2) for piece, a, b in rows]).reshape(-1, 2)
    carried = plane.island_at(places[:, 0], places[:, 1]) >= 0
    for other in nearer:
        carried &= other.island_at(places[:, 0], places[:, 1]) < 0
    zones: dict[int, list[Bare]] = defaultdict(list)
    for (piece, start, stop), seen in zip(rows, carried.tolist(), strict=True):
        if seen and stop > start:
            zones[piece].append(Bare(start, stop, 0))
    return {piece: tuple(bits) for piece, bits in zones.items()}


def _place(run: Crossing, plane: Plane, height: float, least_nh: float) -> Crossing | None:
    """A run through the zones as a gap beside the trace, if it may add enough."""
    if run.islands[0] != run.islands[1]:
        return None
    found = gaps_beside(run.path, plane, height)
    if not found or MARGIN * sum(nh for nh, _, _ in found) < least_nh:
        return None
    _, gap, aside = max(found, key=lambda one: (one[0], -one[1]))
    return replace(run, gap=gap, run_mm=0.0, aside_mm=aside)


def gaps_beside(
    path: Sequence[tuple[float, float]], plane: Plane, height_mm: float
) -> list[tuple[float, int, float]]:
    """Closed gaps beside a stretch of trace, and what each adds by a closed form.

    Parameters
    ----------
    path
        The stretch, mm.
    plane
        The plane.
    height_mm
        Height of the trace over it, > 0.

    Returns
    -------
    nH, index of the gap, and its distance in mm; gaps under the stretch itself are left out.
    """
    reach = BESIDE_HEIGHTS * height_mm
    line = LineString(path)
    steps = max(int(np.ceil(line.length / (reach / STEPS_A_REACH))), 1)
    along = (np.arange(steps) + 0.5) / steps
    places = shapely.line_interpolate_point(line, along, normalized=True)
    x0, y0, x1, y1 = line.bounds
    found = []
    box = (x0 - reach, y0 - reach, x1 + reach, y1 + reach)
    for number in sorted(plane.gap_boxes.intersection(box)):
        gap = plane.gaps[number]
        if gap.open or box_size_mm(gap.shape) < height_mm:
            continue
        aside = float(gap.shape.distance(line))
        if not 0.0 < aside <= reach:
            continue
        far = shapely.distance(gap.shape, places)
        near = far[far <= reach]
        edge = sum(beside_edge_nh_mm(float(mm), height_mm) for mm in near)
        edge *= line.length / steps
        value = beside_void_nh(edge, aside, _depth_mm(gap.shape, line), height_mm)
        found.append((value, number, aside))
    return found


def _depth_mm(gap: Polygon, line: LineString) -> float:
    """How deep a gap reaches away from a stretch of trace, mm: the width of its box across."""
    (x0, y0), (x1, y1) = line.coords[0], line.coords[-1]
    ahead = np.array([x1 - x0, y1 - y0])
    length = float(np.hypot(*ahead)) or 1.0
    corners: Floats = shapely.get_coordinates(gap.exterior)
    across = corners @ np.array([-ahead[1], ahead[0]]) / length
    return float(across.max() - across.min())
