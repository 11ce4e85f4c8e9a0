"""What of a plane a solve looks at: the crossed gap and its neighbours, without foreign copper."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, MultiPolygon, Polygon

from splitcheck.board.board import Board
from splitcheck.loops.foreseen import FEW_CORNERS
from splitcheck.loops.outlines import Ints
from splitcheck.loops.tasks import Task, parts_islands
from splitcheck.loops.windows import Windows, clipped, cut_ends, is_moderate
from splitcheck.planes.islands import Plane
from splitcheck.units import Floats

#: At most so many other gaps near the crossed one are looked at.
MOST_NEIGHBOURS = 12
#: Gaps with more corners than this in the window are not solved: the mesh would be too coarse.
MOST_CORNERS = 10000
#: Gaps beside a crossed one that is ragged by itself may bring so many corners more.
MORE_CORNERS = 1000
#: Gaps smaller than the height do not matter unless this many heights near, or crossed.
NEAR_HEIGHTS = 2.0
#: Pieces of gaps smaller than this are rounding, mm^2.
_SPECK_MM2 = 1e-9


class _Foreign(NamedTuple):
    """Copper of a plane's layer that carries no return: no flux goes through it either."""

    shapes: NDArray[np.object_]
    boxes: Floats
    gap: Ints
    """Number of the gap that each lies in; -1 where that is not sure."""
    plain: NDArray[np.bool_]
    """Which have no holes."""


class _Rings(NamedTuple):
    """A gap taken to pieces, so that only what is near is put together again."""

    outer: shapely.LinearRing
    inner: NDArray[np.object_]
    boxes: Floats
    """Of the inner rings, shape (n, 4)."""
    corners: Floats


class Seen(NamedTuple):
    """What a solve sees of a plane."""

    gaps: list[Polygon]
    ends: list[shapely.Point]
    """Where windows cut off what leads to the outside."""
    inner: Polygon | None
    """A region that ends half way to where gaps were cut off; None where none was."""
    outside: Polygon | None
    """What the plane's layer may hold copper in, if a gap leads out of it."""


class Openings:
    """The gaps of all planes as solves see them; what does not hang on the crossing is kept."""

    def __init__(self, board: Board, planes: dict[int, Plane]) -> None:
        self.board = board
        self.planes = planes
        self._foreign: dict[int, _Foreign] = {}
        self._rings: dict[tuple[int, int], _Rings] = {}
        self._shapes: dict[int, NDArray[np.object_]] = {}
        self._hulls: dict[tuple[int, int], Polygon] = {}

    def hull_of(self, plane: Plane, number: int) -> Polygon:
        """Convex hull of a gap."""
        key = (plane.layer, number)
        if key not in self._hulls:
            hull = shapely.convex_hull(plane.gaps[number].shape)
            assert isinstance(hull, Polygon)
            self._hulls[key] = hull
        return self._hulls[key]

    def is_hopeless(self, plane: Plane, number: int, window: Polygon) -> bool:
        """Whether what of a gap is in a window is too ragged for a solve: told without cutting it.

        Foreign copper in it would only add corners.
        """
        return self._corners_in(plane, number, window) > MOST_CORNERS

    def within(
        self,
        tasks: Sequence[Task],
        windows: Windows,
        lines: Sequence[LineString],
        *,
        loose: bool,
    ) -> Seen | None:
        """The crossed gap and uncrossed neighbours, in the window, foreign copper taken out.

        The crossed gap leads to the outside where it is cut off if it is `loose`. None if the gaps
        are too ragged for a solve.
        """
        plane = self.planes[tasks[0].crossing.plane]
        crossed = tasks[0].crossing.gap
        beside = self._beside(plane, crossed, windows, lines, tasks[0].height_mm)
        # where a gap cuts islands apart the world ends with the window
        apart = any(parts_islands(task) for task in tasks)
        gaps: list[Polygon] = []
        ends: list[shapely.Point] = []
        inner = None
        outside = outside_of(plane, windows.outer, cut=True) if apart else None
        most = MOST_CORNERS
        for number in (crossed, *beside):
            gap = plane.gaps[number]
            far = number != crossed and not apart
            cut = self._cut(plane, number, (windows.far, windows.outer)[not far :], most)
            if cut is None and number == crossed:
                return None
            if cut is None:
                continue
            pieces, window = cut
            gaps.extend(pieces)
            corners = corners_of(pieces)
            ragged = number == crossed and corners > FEW_CORNERS
            most = MORE_CORNERS if ragged else min(most, FEW_CORNERS) - corners
            if loose if number == crossed else gap.open:
                ends.extend(cut_ends(pieces, window))
            if gap.open and not apart:
                outside = outside_of(plane, window, cut=False)
            if not window.contains(gap.shape):
                inner = windows.half if window is windows.outer else inner or windows.outer
        return Seen(gaps, ends, inner, outside)

    def _cut(
        self, plane: Plane, number: int, windows: Sequence[Polygon], most: int
    ) -> tuple[list[Polygon], Polygon] | None:
        """What of a gap is in the first of some windows with no more corners, and in which."""
        gap = plane.gaps[number]
        if len(windows) > 1 and is_moderate(gap, self.hull_of(plane, number)):
            windows = [shapely.box(*gap.shape.bounds), *windows]
        for window in windows:
            pieces = polygons(self._free(plane, number, window))
            if corners_of(pieces) <= most:
                return pieces, window
        return None

    def _beside(
        self,
        plane: Plane,
        crossed: int,
        windows: Windows,
        lines: Sequence[LineString],
        height_mm: float,
    ) -> list[int]:
        """Numbers of the nearest gaps that no trace crosses and that matter, open ones first."""
        near = sorted(plane.gap_boxes.intersection(windows.beside.bounds))
        numbers = np.array([number for number in near if number != crossed], dtype=np.int64)
        if plane.layer not in self._shapes:
            self._shapes[plane.layer] = np.array([gap.shape for gap in plane.gaps], dtype=object)
        shapes = self._shapes[plane.layer][numbers]
        across = shapely.multilinestrings(list(lines))
        shapely.prepare([across, windows.beside])
        boxes = shapely.bounds(shapes).reshape(-1, 4)
        small = (boxes[:, 2:] - boxes[:, :2]).max(axis=1) < height_mm
        counts = np.ones(len(shapes), dtype=np.bool_)
        counts[small] = shapely.dwithin(across, shapes[small], NEAR_HEIGHTS * height_mm)
        counts[counts] = shapely.intersects(windows.beside, shapes[counts])
        apart = shapely.distance(across, shapes[counts]).tolist()
        rows = [
            (not plane.gaps[number].open, far, number)
            for number, far in zip(numbers[counts].tolist(), apart, strict=True)
            if far > 0.0
        ]
        return [number for *_, number in sorted(rows)[:MOST_NEIGHBOURS]]

    def _free(self, plane: Plane, number: int, window: Polygon) -> shapely.Geometry:
        """What of a gap is in a window, foreign copper taken out.

        Copper without holes is a hole of the gap: it touches neither the planes nor other copper.
        """
        gap, foreign = self._rings_of(plane, number), self._foreign_on(plane)
        near = _meets(foreign.boxes, window)
        holes = near & foreign.plain & (foreign.gap == number)
        inner = np.concatenate(
            [
                gap.inner[_meets(gap.boxes, window)],
                shapely.get_exterior_ring(foreign.shapes[holes]),
            ]
        )
        free = clipped(shapely.polygons(gap.outer, inner), window)
        rest = near & ~holes & ((foreign.gap == number) | (foreign.gap < 0))
        if rest.any():
            free = shapely.difference(free, MultiPolygon(list(foreign.shapes[rest])))
        return free

    def _corners_in(self, plane: Plane, number: int, window: Polygon) -> int:
        """How many corners of a gap lie in a window, as far as that is more than may be."""
        x, y = self._rings_of(plane, number).corners.T
        if len(x) <= MOST_CORNERS:
            return len(x)
        west, south, east, north = window.bounds
        near = (x >= west) & (x <= east) & (y >= south) & (y <= north)
        if int(near.sum()) <= MOST_CORNERS:
            return int(near.sum())
        # on the one side of every side of the window, which is convex
        ring = shapely.get_coordinates(shapely.orient_polygons(window))
        dx, dy = np.diff(ring, axis=0).T
        ahead = dx * (y[near, None] - ring[:-1, 1]) - dy * (x[near, None] - ring[:-1, 0])
        return int((ahead >= 0.0).all(axis=1).sum())

    def _rings_of(self, plane: Plane, number: int) -> _Rings:
        """A gap taken to pieces."""
        key = (plane.layer, number)
        if key not in self._rings:
            shape = plane.gaps[number].shape
            rings = np.array(shapely.get_rings(shape), dtype=object)
            boxes = shapely.bounds(rings).reshape(-1, 4)
            self._rings[key] = _Rings(
                rings[0], rings[1:], boxes[1:], shapely.get_coordinates(shape)
            )
        return self._rings[key]

    def _foreign_on(self, plane: Plane) -> _Foreign:
        """The foreign copper of a plane's layer, and the gaps that it lies in."""
        if plane.layer not in self._foreign:
            islands = {island.part for island in plane.islands}
            found = [
                part.shape
                for part in self.board.parts
                if part.layer == plane.layer and part.id not in islands
            ]
            shapes = np.array(found, dtype=object)
            places = shapely.get_point(shapely.get_exterior_ring(shapes), 0)
            gap = np.full(len(shapes), -1)
            rows, tiles = plane.tiles_over(places)
            gap[rows] = np.array([tile.gap for tile in plane.tiles], dtype=np.int64)[tiles]
            plain = shapely.get_num_interior_rings(shapes) == 0
            boxes = shapely.bounds(shapes).reshape(-1, 4)
            self._foreign[plane.layer] = _Foreign(shapes, boxes, gap, plain)
        return self._foreign[plane.layer]


def outside_of(plane: Plane, window: Polygon, *, cut: bool) -> Polygon | None:
    """What the plane's layer may hold copper in, if the window looks beyond it.

    Where the gap cuts islands apart it ends with the window: else the copper that the solve takes
    to be beyond the window would join them.
    """
    if not plane.gaps or not plane.gaps[0].open:
        return window if cut else None
    frame: Polygon = shapely.box(*plane.gaps[0].shape.bounds)
    if cut:
        inside = shapely.intersection(frame, window)
        return inside if isinstance(inside, Polygon) else window
    return None if frame.contains_properly(window) else frame


def corners_of(gaps: Sequence[Polygon]) -> int:
    """How many corners gaps have."""
    return int(shapely.get_num_coordinates(gaps).sum())


def polygons(shape: shapely.Geometry) -> list[Polygon]:
    """The polygons that a shape is made of, but for specks."""
    parts = shapely.get_parts(shapely.get_parts(shape))
    flat = shapely.get_type_id(parts) == shapely.GeometryType.POLYGON
    kept: list[Polygon] = parts[flat & (shapely.area(parts) > _SPECK_MM2)].tolist()
    return kept


def _meets(boxes: Floats, window: Polygon) -> NDArray[np.bool_]:
    """Which boxes meet that of a window."""
    west, south, east, north = window.bounds
    meets = (boxes[:, 0] <= east) & (boxes[:, 1] <= north)
    return meets & (boxes[:, 2] >= west) & (boxes[:, 3] >= south)
