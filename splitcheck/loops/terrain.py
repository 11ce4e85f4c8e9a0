"""One plane's gaps as obstacles: shapes, rims, and the corners at which ways bend round them."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from math import floor, inf
from typing import TypeAlias

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, MultiPolygon, Polygon

from splitcheck.copper.marks import Point
from splitcheck.loops.sights import Patch, Step
from splitcheck.planes.islands import Plane, box_size_mm
from splitcheck.units import Floats, segments

#: A point this near to a rim lies on it, mm.
ON_RIM_MM = 1e-4
#: A straight leg to a bridge passes gaps up to this size, mm (antipads), and stops at larger ones.
SMALL_GAP_MM = 3.0
#: Corners of gaps whose rim has more points than this are found in tiles, as they are needed, ...
TILED_POINTS = 400
#: ... with sides of this length, mm, ...
TILE_MM = 12.0
#: ... and room for the next corner: chords of an arc of radius r that leaves them by c are
#: 2 sqrt(2 r c) long, times this by sqrt(c) for arcs of the trade's sizes, mm^0.5.
WIDE_ARC = 4.0
#: So many steps between corners are kept of a plane: some 20 MB.
MOST_STEPS = 200_000
#: Steps between all corners of a patch are found at once if it has no more of them than this.
SMALL_PATCH = 200


Box: TypeAlias = tuple[float, float, float, float]
#: Column and row of a tile; None: the whole gap.
Tile: TypeAlias = tuple[int, int] | None


@dataclass(slots=True)
class Terrain:
    """The gaps of one plane as obstacles, and the corners at which ways bend round them."""

    plane: Plane
    _patches: dict[tuple[int, float, Tile], Patch] = field(default_factory=dict)
    _steps: int = 0
    _rims: dict[int, Floats] = field(default_factory=dict)
    _outlines: dict[int, Floats] = field(default_factory=dict)
    _large: MultiPolygon | None = None

    def shape(self, gap: int) -> Polygon:
        """A gap's shape, prepared for many tests."""
        shape = self.plane.gaps[gap].shape
        shapely.prepare(shape)
        return shape

    def patches(self, gap: int, clear_mm: float, box: Box) -> Iterator[Patch]:
        """Places just off a gap's rim at which a taut way round it may bend.

        All those in the box are given, and some others.

        The gap is widened by a little more than the rim is then thinned by: a way from corner to
        corner stays clear of it.
        """
        for tile in self._tiles(gap, box):
            key = (gap, clear_mm, tile)
            if key not in self._patches:
                self._patches[key] = Patch.of(gap, self._corners_in(gap, clear_mm, tile))
            yield self._patches[key]

    def steps(self, patch: Patch, corner: int, patches: Sequence[Patch]) -> list[list[Step]]:
        """Taut steps from a corner of a patch to those of others, for each of them.

        Steps that run into the gaps of the two patches are left out.
        """
        if self._steps > MOST_STEPS:
            self._steps = 0
            for other in self._patches.values():
                for some in other.known:
                    some.clear()
        known = patch.known[corner]
        fresh = [other for other in patches if other not in known]
        if patch in fresh and len(patch) <= SMALL_PATCH:
            self._find_pairs(patch)
            fresh.remove(patch)
        if fresh:
            self._find_steps(patch, corner, fresh)
        return [known[other] for other in patches]

    def _find_pairs(self, patch: Patch) -> None:
        """Find the steps between all corners of a patch at once."""
        pairs = patch.pairs()
        free = ~shapely.intersects(self.shape(patch.gap), segments(pairs.ends))
        rows: list[list[Step]] = [[] for _ in patch.known]
        own = 1 << patch.gap
        for one, other, length in zip(
            pairs.start[free].tolist(),
            pairs.to[free].tolist(),
            pairs.length_mm[free].tolist(),
            strict=True,
        ):
            rows[one].append(Step(length, other, own))
            rows[other].append(Step(length, one, own))
        for known, row in zip(patch.known, rows, strict=True):
            known[patch] = row
        self._steps += len(rows) + sum(len(row) for row in rows)

    def _find_steps(self, patch: Patch, corner: int, patches: Sequence[Patch]) -> None:
        touching = patch.touching(corner, patches)
        lines = segments(touching.ends)
        free = ~shapely.intersects(self.shape(patch.gap), lines)
        gaps = np.array([other.gap for other in patches])[touching.start]
        for gap in np.unique(gaps[gaps != patch.gap]).tolist():
            there = np.flatnonzero(free & (gaps == gap))
            free[there] = ~shapely.intersects(self.shape(gap), lines[there])
        found: list[list[Step]] = [[] for _ in patches]
        own = 1 << patch.gap
        for number, to, length in zip(
            touching.start[free].tolist(),
            touching.to[free].tolist(),
            touching.length_mm[free].tolist(),
            strict=True,
        ):
            found[number].append(Step(length, to, own | 1 << patches[number].gap))
        patch.known[corner].update(zip(patches, found, strict=True))
        self._steps += len(patches) + sum(len(steps) for steps in found)

    def is_plain(self, gap: int) -> bool:
        """Whether a gap is so simple that all its corners are found at once."""
        return bool(shapely.get_num_coordinates(self.plane.gaps[gap].shape) <= TILED_POINTS)

    def _tiles(self, gap: int, box: Box) -> Iterator[Tile]:
        """The tiles of an intricate gap that a box meets; None for the whole of a simple gap."""
        if self.is_plain(gap):
            yield None
            return
        x0, y0, x1, y1 = self.plane.gaps[gap].shape.bounds
        low = max(box[0], x0 - 1.0), max(box[1], y0 - 1.0)
        high = min(box[2], x1 + 1.0), min(box[3], y1 + 1.0)
        for i in range(floor(low[0] / TILE_MM), floor(high[0] / TILE_MM) + 1):
            for j in range(floor(low[1] / TILE_MM), floor(high[1] / TILE_MM) + 1):
                yield i, j

    def _corners_in(self, gap: int, clear_mm: float, tile: Tile) -> Floats:
        shape: shapely.Geometry = self.plane.gaps[gap].shape
        if tile is not None:  # with a margin, so that its own border makes no corner in the tile
            low, margin = np.array(tile) * TILE_MM, 4 * clear_mm + WIDE_ARC * clear_mm**0.5
            shape = shapely.clip_by_rect(shape, *(low - margin), *(low + TILE_MM + margin))
            shape = shapely.simplify(shape, 0.1 * clear_mm)
        wider = shapely.simplify(shapely.buffer(shape, 1.2 * clear_mm, quad_segs=2), clear_mm)
        bends = _bends(shapely.orient_polygons(wider, exterior_cw=False))
        if tile is not None:  # and with the next corner, so that steps lead from tile to tile
            mine = np.all((bends >= low) & (bends < low + TILE_MM), axis=2).any(axis=1)
            room = margin - 2 * clear_mm
            real = ((bends > low - room) & (bends < low + TILE_MM + room)).all(axis=2)
            # where the rim runs on is not known: any step touches there
            bends = np.where(real[:, :, None], bends, bends[:, :1])[mine & real[:, 0]]
        return bends

    def rim_distance_mm(self, gap: int, at: Point, along: Point) -> float:
        """How far it is from a point to a gap's rim in a direction of length 1; inf if never."""
        if gap not in self._rims:
            self._rims[gap] = _edges(self.plane.gaps[gap].shape)
        return float(_met(self._rims[gap], at, along)[0].min(initial=inf))

    def parted(self, island: int, entry: Point, exit_: Point, at: Point, along: Point) -> bool:
        """Whether a wall from a gap outside an island parts the rim's points entry and exit.

        What of the wall lies within the island's outline cuts it in two, and the rim into two arcs.
        """
        if island not in self._outlines:
            self._outlines[island] = _edges(Polygon(self.plane.islands[island].shape.exterior))
        outline = self._outlines[island]
        ends = [_place_on(outline, point) for point in (entry, exit_)]
        far, places = _met(outline, at, along)
        if ends[0] is None or ends[1] is None or len(far) % 2:
            return False
        cuts = np.sort(places[np.argsort(far, kind="stable")].reshape(-1, 2), axis=1).T
        between = [(cuts[0] < end) & (end < cuts[1]) for end in ends]
        return bool((between[0] != between[1]).any())

    def blocked(self, starts: Floats, stops: Floats) -> NDArray[np.bool_]:
        """Whether straight legs, shape (n, 2) at either end, run into a gap larger than small."""
        lines = segments(np.stack([starts, stops], axis=1))
        return np.asarray(shapely.intersects(self.large_gaps(), lines), dtype=np.bool_)

    def large_gaps(self) -> MultiPolygon:
        """All gaps larger than small, as one obstacle."""
        if self._large is None:
            self._large = MultiPolygon(
                [
                    gap.shape
                    for gap in self.plane.gaps
                    if gap.open or box_size_mm(gap.shape) > SMALL_GAP_MM
                ]
            )
            shapely.prepare(self._large)
        return self._large

    def crossed(self, line: LineString) -> list[int]:
        """Indexes of the gaps a line runs through."""
        near = sorted(self.plane.gap_boxes.intersection(line.bounds))
        return [gap for gap in near if self.shape(gap).intersects(line)]


def _edges(shape: Polygon) -> Floats:
    """Edges of all rings as x1, y1, x2, y2, shape (4, n)."""
    points, ring = shapely.get_coordinates(shapely.get_rings(shape), return_index=True)
    ends = np.concatenate([points[:-1], points[1:]], axis=1)
    return np.ascontiguousarray(ends[ring[1:] == ring[:-1]].T)


def _met(edges: Floats, at: Point, along: Point) -> tuple[Floats, Floats]:
    """Where a ray meets edges: how far out, mm, and the edge's number plus the part of it."""
    x1, y1, x2, y2 = edges
    first = along[0] * (y1 - at[1]) - along[1] * (x1 - at[0])
    last = along[0] * (y2 - at[1]) - along[1] * (x2 - at[0])
    met = np.flatnonzero((first < 0) != (last < 0))
    part = first[met] / (first[met] - last[met])
    x, y = (one[met] + part * (two[met] - one[met]) for one, two in ((x1, x2), (y1, y2)))
    far = along[0] * (x - at[0]) + along[1] * (y - at[1])
    return far[far >= 0], (met + part)[far >= 0]


def _place_on(edges: Floats, at: Point) -> float | None:
    """The edge that a point lies on, by its number plus the part of it; None if it is off them."""
    place, off_mm = nearest_on(edges, at)
    return place if off_mm < ON_RIM_MM else None


def nearest_on(edges: Floats, at: Point) -> tuple[float, float]:
    """The place on edges nearest to a point, and how far off it is, mm."""
    x1, y1, x2, y2 = edges
    dx, dy = x2 - x1, y2 - y1
    square = np.maximum(dx * dx + dy * dy, 1e-30)
    part = np.clip(((at[0] - x1) * dx + (at[1] - y1) * dy) / square, 0.0, 1.0)
    off = np.hypot(x1 + part * dx - at[0], y1 + part * dy - at[1])
    nearest = int(np.argmin(off))
    return nearest + float(part[nearest]), float(off[nearest])


def _bends(shape: shapely.Geometry) -> Floats:
    """Corners where a polygon bulges outward, with those before and after; shape (n, 3, 2)."""
    corners = []
    for polygon in getattr(shape, "geoms", [shape]):
        for ring in [polygon.exterior, *polygon.interiors]:
            at = np.asarray(ring.coords)[:-1]
            before, after = np.roll(at, 1, axis=0), np.roll(at, -1, axis=0)
            bulges = _cross(at - before, after - at) > 0
            corners.append(np.stack([at, before, after], axis=1)[bulges])
    return np.concatenate(corners) if corners else np.empty((0, 3, 2))


def _cross(one: Floats, other: Floats) -> Floats:
    return np.asarray(one[..., 0] * other[..., 1] - one[..., 1] * other[..., 0])
