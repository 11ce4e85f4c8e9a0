"""Edge runs: traces along the edge of the only plane that carries their return."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Ints, Tracks
from splitcheck.units import Floats, segments

#: Traces are looked at in steps of half the reach, within these bounds, mm.
STEP_MM = (0.05, 0.25)
#: An edge has no copper of its layer beyond it for so many heights of the trace, and mm at least.
OPEN_HEIGHTS = 3.0
OPEN_MM = 1.0
#: So many of the planes on either side of a layer are looked at, nearest first.
PLANES_A_SIDE = 2
#: Places nearer to the rim than this have no direction away from it, mm.
ON_RIM_MM = 1e-4


@dataclass(frozen=True, slots=True)
class EdgeRun:
    """All of a net's trace on one layer along one edge of a plane, in small steps."""

    net: int
    layer: int
    plane: int
    gap: int
    """Index of the gap in the plane that begins at the edge."""
    island: int
    """Index of the island whose edge it is."""
    places: Floats
    """Middles of the steps, shape (n, 2), mm."""
    step_mm: Floats
    """Their lengths, shape (n,)."""
    inside_mm: Floats
    """Their distances from the edge, shape (n,), > 0."""
    ahead: Floats
    """Directions of the trace, shape (n, 2), of length 1."""
    line: int
    """Line in the Gerber file, where the trace is nearest to the edge."""
    width_mm: float
    """Width of the trace there."""

    @property
    def length_mm(self) -> float:
        """Length of the trace along the edge, mm."""
        return float(self.step_mm.sum())

    @property
    def at(self) -> Point:
        """Where it is nearest to the edge, mm."""
        x, y = self.places[int(np.argmin(np.round(self.inside_mm, 6)))]
        return float(x), float(y)


def find_edge_runs(
    board: Board,
    planes: Sequence[Plane],
    tracks: Sequence[Tracks],
    heights: float = 1.0,
    least_mm: float = 0.0,
) -> tuple[EdgeRun, ...]:
    """Find the traces that run along the edge of a plane.

    Parameters
    ----------
    board
        The board, for the distances of its layers.
    planes
        All planes.
    tracks
        The traces that are judged, layer by layer.
    heights, least_mm
        How near to the edge: within so many heights over the plane, or so many mm.

    Returns
    -------
    One for each net, layer and edge.

    Notes
    -----
    (1) An edge is the rim of a gap that leads outside or parts islands, with no copper beyond it
    for three heights: antipads, slots and narrow splits are none. (2) It counts for a trace over
    the plane, near its rim, where no other plane of the board lies over or under the trace:
    that one would carry the return, or keep it. What hangs beyond the edge is a crossing.
    """
    found: list[EdgeRun] = []
    rims: dict[int, _Rims] = {}
    for layer in tracks:
        if not len(layer.net):
            continue
        for side in (-1, 1):
            on_side = [plane for plane in planes if (plane.layer - layer.layer) * side > 0]
            on_side.sort(key=lambda plane: abs(plane.layer - layer.layer))
            for plane in on_side[:PLANES_A_SIDE]:
                height = board.stack.height_mm(layer.layer, plane.layer)
                reach = max(heights * height, least_mm)
                others = [p for p in planes if p.layer not in {layer.layer, plane.layer}]
                if plane.layer not in rims:
                    rims[plane.layer] = _rims(plane)
                known = rims[plane.layer]
                found.extend(_along(layer, plane, known, others, height, reach))
    return tuple(sorted(found, key=lambda run: (run.net, run.layer, run.plane, run.gap)))


class _Rims(NamedTuple):
    """Straight pieces of all rims of a plane that can be edges."""

    lines: NDArray[np.object_]
    gaps: Ints
    """The gap of each."""
    tree: shapely.STRtree


def _along(
    tracks: Tracks,
    plane: Plane,
    known: _Rims,
    others: Sequence[Plane],
    height: float,
    reach: float,
) -> Iterator[EdgeRun]:
    rims, gaps, tree = known
    if not len(rims):
        return
    pieces = _near(tracks, tree, reach)
    if not len(pieces):
        return
    piece, places, steps = _steps(tracks, pieces, reach)
    points = shapely.points(places)
    which, inside = tree.query_nearest(
        points, max_distance=reach, return_distance=True, all_matches=False
    )
    index, rim = which
    keep = inside > ON_RIM_MM
    index, rim, inside = index[keep], rim[keep], inside[keep]
    places, piece, steps = places[index], piece[index], steps[index]
    keep = _only_plane(plane, others, places)
    index, rim, inside = index[keep], rim[keep], inside[keep]
    places, piece, steps = places[keep], piece[keep], steps[keep]
    if not len(places):
        return
    keep = _is_open(plane, rims[rim], places, inside, max(OPEN_HEIGHTS * height, OPEN_MM))
    places, piece, steps = places[keep], piece[keep], steps[keep]
    inside, gap = inside[keep], gaps[rim[keep]]
    island = plane.island_at(places[:, 0], places[:, 1])
    groups: dict[tuple[int, int, int], list[int]] = defaultdict(list)
    for row in range(len(places)):
        groups[int(tracks.net[piece[row]]), int(gap[row]), int(island[row])].append(row)
    ahead = (tracks.end - tracks.start) / tracks.length_mm[:, None]
    for (net, gap_, island_), rows in sorted(groups.items()):
        nearest = rows[int(np.argmin(np.round(inside[rows], 6)))]
        yield EdgeRun(
            net,
            tracks.layer,
            plane.layer,
            gap_,
            island_,
            places[rows],
            steps[rows],
            inside[rows],
            ahead[piece[rows]],
            int(tracks.line[piece[nearest]]),
            float(tracks.width_mm[piece[nearest]]),
        )


def _rims(plane: Plane) -> _Rims:
    ends: list[Floats] = []
    owner: list[Ints] = []
    for number, gap in enumerate(plane.gaps):
        if not (gap.open or len(gap.shape.interiors)):
            continue
        for ring in (gap.shape.exterior, *gap.shape.interiors):
            corners = shapely.get_coordinates(ring)
            ends.append(np.stack([corners[:-1], corners[1:]], axis=1))
            owner.append(np.full(len(corners) - 1, number, dtype=np.intp))
    lines = segments(np.concatenate(ends)) if ends else np.empty(0, dtype=object)
    gaps = np.concatenate(owner) if owner else np.empty(0, dtype=np.intp)
    return _Rims(lines, gaps, shapely.STRtree(lines))


def _near(tracks: Tracks, tree: shapely.STRtree, reach: float) -> Ints:
    """Pieces of trace whose boxes come that near to a rim's."""
    low = np.minimum(tracks.start, tracks.end) - reach
    high = np.maximum(tracks.start, tracks.end) + reach
    pieces, _ = tree.query(shapely.box(*low.T, *high.T))
    return np.unique(pieces).astype(np.intp)


def _steps(tracks: Tracks, pieces: Ints, reach: float) -> tuple[Ints, Floats, Floats]:
    """Pieces cut into even steps: piece, middle and length of each."""
    step = float(np.clip(reach / 2, *STEP_MM))
    count = np.maximum(np.ceil(tracks.length_mm[pieces] / step), 1).astype(np.intp)
    piece = np.repeat(pieces, count)
    first = np.cumsum(count) - count
    part = (np.arange(len(piece)) - np.repeat(first, count) + 0.5) / np.repeat(count, count)
    places = tracks.start[piece] + part[:, None] * (tracks.end[piece] - tracks.start[piece])
    return piece, places, tracks.length_mm[piece] / np.repeat(count, count)


def _only_plane(plane: Plane, others: Sequence[Plane], places: Floats) -> np.ndarray:
    """Which places lie over this plane and over no other."""
    only = plane.island_at(places[:, 0], places[:, 1]) >= 0
    for other in others:
        rows = np.flatnonzero(only)
        if not len(rows):
            break
        only[rows] = other.island_at(places[rows, 0], places[rows, 1]) < 0
    return only


def _is_open(
    plane: Plane, rims: np.ndarray, places: Floats, inside: Floats, beyond_mm: float
) -> np.ndarray:
    """Which rims have no copper of the plane's layer beyond them for some distance."""
    nearest = shapely.get_coordinates(
        shapely.line_interpolate_point(
            rims, shapely.line_locate_point(rims, shapely.points(places))
        )
    )
    away = (nearest - places) / inside[:, None]
    is_open = np.ones(len(places), dtype=np.bool_)
    for part in (0.1, 0.4, 0.7, 1.0):
        probe = nearest + part * beyond_mm * away
        is_open &= plane.island_at(probe[:, 0], probe[:, 1]) < 0
    return is_open


def widths_across(
    island: Polygon, places: Floats, ahead: Floats, far_mm: float
) -> tuple[Floats, Floats]:
    """How wide a plane is across a trace, and how far off its middle the trace lies.

    Parameters
    ----------
    island
        The plane; holes in it are passed over.
    places, ahead
        Places on the trace and its directions there, shape (n, 2).
    far_mm
        More than the size of the board, mm.

    Returns
    -------
    Widths and offsets, shape (n,), mm. Where the line across the trace misses the plane the width
    is 0.
    """
    across = np.stack([-ahead[:, 1], ahead[:, 0]], axis=1)
    lines = segments(np.stack([places - far_mm * across, places + far_mm * across], axis=1))
    cuts = shapely.intersection(lines, Polygon(island.exterior))
    widths, offsets = np.zeros(len(places)), np.zeros(len(places))
    for row, cut in enumerate(cuts):
        best = None
        for part in shapely.get_parts(cut):
            ends = (shapely.get_coordinates(part) - places[row]) @ across[row]
            if len(ends) < 2:
                continue
            low, high = float(ends.min()), float(ends.max())
            off = max(low, -high, 0.0)
            if best is None or off < best[0]:
                best = (off, high - low, (low + high) / 2)
        if best is not None:
            widths[row], offsets[row] = best[1], best[2]
    return widths, offsets
