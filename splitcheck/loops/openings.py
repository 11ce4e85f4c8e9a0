"""What of a plane a solve looks at: the crossed gap and its neighbours, without foreign copper."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from shapely import LineString, MultiPolygon, Polygon

from splitcheck.board.board import Board
from splitcheck.loops.tasks import Task
from splitcheck.loops.windows import Windows, clipped, cut_ends
from splitcheck.planes.islands import Plane, box_size_mm

#: At most so many other gaps near the crossed one are looked at.
MOST_NEIGHBOURS = 12
#: Gaps with more corners than this in the window are not solved: the mesh would be too coarse.
MOST_CORNERS = 5000
#: Gaps smaller than the height do not matter unless this many heights near, or crossed.
NEAR_HEIGHTS = 2.0


class Openings:
    """The gaps of all planes as solves see them."""

    def __init__(self, board: Board, planes: dict[int, Plane]) -> None:
        self.board = board
        self.planes = planes
        self._foreign: dict[int, shapely.STRtree] = {}

    def within(
        self,
        tasks: Sequence[Task],
        windows: Windows,
        lines: Sequence[LineString],
        *,
        loose: bool,
    ) -> tuple[list[Polygon], list[shapely.Point]]:
        """The crossed gap and uncrossed neighbours, in the window, foreign copper taken out.

        Returned with the places where the window cuts off what leads to the outside; the crossed
        gap does if it is `loose`.
        """
        window = windows.outer
        shapely.prepare(windows.beside)
        plane = self.planes[tasks[0].crossing.plane]
        across = shapely.union_all(lines)
        height = tasks[0].height_mm
        crossed = plane.gaps[tasks[0].crossing.gap]
        beside = []
        for number in sorted(plane.gap_boxes.intersection(windows.beside.bounds)):
            shape = plane.gaps[number].shape
            if shape is crossed.shape or not windows.beside.intersects(shape):
                continue
            apart = shape.distance(across)
            small = box_size_mm(shape) < height
            if apart == 0 or (small and apart > NEAR_HEIGHTS * height):
                continue
            beside.append((apart, number))
        chosen = [plane.gaps[number] for _, number in sorted(beside)[:MOST_NEIGHBOURS]]
        foreign = self._foreign_copper(plane, window)
        gaps: list[Polygon] = []
        ends: list[shapely.Point] = []
        for gap in (crossed, *chosen):
            inside = clipped(gap.shape, window)
            if too_ragged(_polygons(inside)):
                # foreign copper in it only adds corners; taking it out would be in vain
                return _polygons(inside), []
            free = shapely.difference(inside, foreign)
            pieces = _polygons(free)
            if gap is not crossed and too_ragged([*gaps, *pieces]):
                break
            gaps.extend(pieces)
            if loose if gap is crossed else gap.open:
                ends.extend(cut_ends(pieces, window))
        return gaps, ends

    def _foreign_copper(self, plane: Plane, window: Polygon) -> shapely.Geometry:
        """Copper of the plane's layer that carries no return: no flux goes through it either."""
        if plane.layer not in self._foreign:
            islands = {island.part for island in plane.islands}
            self._foreign[plane.layer] = shapely.STRtree(
                [
                    part.shape
                    for part in self.board.parts
                    if part.layer == plane.layer and part.id not in islands
                ]
            )
        tree = self._foreign[plane.layer]
        # pieces of copper do not touch one another, so that they are a multipolygon as they stand
        return MultiPolygon(list(tree.geometries[np.sort(tree.query(window))]))


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


def too_ragged(gaps: Sequence[Polygon]) -> bool:
    """Whether gaps have too many corners to be worth a solve."""
    return sum(int(shapely.get_num_coordinates(gap)) for gap in gaps) > MOST_CORNERS


def _polygons(shape: shapely.Geometry) -> list[Polygon]:
    parts = getattr(shape, "geoms", [shape])
    return [part for part in parts if isinstance(part, Polygon) and part.area > 1e-9] + [
        inner for part in parts if isinstance(part, MultiPolygon) for inner in _polygons(part)
    ]
