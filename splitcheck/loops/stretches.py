"""Crossings in, the traces that a solve lays over the gap out."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from shapely import LineString, Polygon
from shapely.ops import substring

from splitcheck.copper.marks import Point
from splitcheck.loops import solve as engine
from splitcheck.loops.tasks import Task
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane

#: A trace is solved with at least this many heights of it beyond either rim of its gap.
ENDS = 10.0
#: Parts of what is missing that are tried for a longer end.
FARTHEST_FIRST = (1.0, 0.75, 0.5, 0.25)
#: A trace that a window cuts off ends so far inside it, mm.
ON_RIM_MM = 0.01


def trace_over(task: Task, plane: Plane) -> engine.TraceOver:
    """The trace over its runs and on either side of them.

    Where it comes over the same gap again in a run that is judged by itself, it is cut short. A
    short end goes straight on over copper, as far as it keeps a height away from the gap: the
    source of a trace that ends right at the rim would be that of its end, not of its length.
    """
    points: list[Point] = [(x, y) for x, y in _own_stretch(task, plane).coords]
    gap = plane.gaps[task.crossing.gap].shape
    shapely.prepare(gap)
    for ahead in (False, True):
        ends = points if ahead else points[::-1]
        missing = ENDS * task.height_mm - _beyond_rim_mm(task.crossing, ends)
        step = np.subtract(ends[-1], ends[-2])
        length = float(np.hypot(*step))
        if missing <= 0 or length <= 0:
            continue
        for share in FARTHEST_FIRST:
            x, y = np.asarray(ends[-1]) + step / length * missing * share
            end = (float(x), float(y))
            near = shapely.dwithin(gap, shapely.Point(end), task.height_mm)
            if not near and not gap.intersects(LineString([ends[-1], end])):
                points = [*points, end] if ahead else [end, *points]
                break
    return engine.TraceOver(LineString(points), task.crossing.width_mm)


def within_window(trace: engine.TraceOver, task: Task, window: Polygon) -> engine.TraceOver:
    """The stretch of a trace round its run that lies in the window."""
    inside = shapely.intersection(trace.line, window.buffer(-ON_RIM_MM, join_style="mitre"))
    pieces = [piece for piece in shapely.get_parts(inside) if isinstance(piece, LineString)]
    run = shapely.Point(task.crossing.at)
    line = min(pieces, key=lambda piece: piece.distance(run), default=trace.line)
    return engine.TraceOver(line, trace.width_mm)


def _own_stretch(task: Task, plane: Plane) -> LineString:
    """The stretch of a crossing up to where it would count another finding's run."""
    stretch = LineString(task.crossing.stretch)
    own = shapely.union_all([LineString(path) for path in task.runs])
    met = [plane.tiles[tile] for tile in np.sort(plane.tiles_over(np.array([stretch]))[1])]
    tiles = [tile.shape for tile in met if tile.gap == task.crossing.gap]
    bare = shapely.line_merge(shapely.union_all(shapely.intersection(stretch, tiles)))
    mine: list[tuple[float, float]] = []
    others: list[tuple[float, float]] = []
    for part in getattr(bare, "geoms", [bare]):
        if part.geom_type != "LineString" or part.is_empty:
            continue
        ends = sorted(
            stretch.project(shapely.Point(end)) for end in (part.coords[0], part.coords[-1])
        )
        is_own = shapely.dwithin(part.interpolate(0.5, normalized=True), own, 1e-3)
        (mine if is_own else others).append((ends[0], ends[1]))
    if not mine or not others:
        return stretch
    first, last = min(start for start, _ in mine), max(stop for _, stop in mine)
    before = max((stop for _, stop in others if stop <= first + 1e-6), default=None)
    after = min((start for start, _ in others if start >= last - 1e-6), default=None)
    room = 3 * task.height_mm
    start = 0.0 if before is None else min(before + room, (before + first) / 2)
    stop = stretch.length if after is None else max(after - room, (after + last) / 2)
    cut = substring(stretch, start, stop)
    return cut if isinstance(cut, LineString) else stretch


def _beyond_rim_mm(crossing: Crossing, ends: Sequence[Point]) -> float:
    """Length of the trace from the rim of the gap to the last of its points, mm."""
    line = LineString(ends)
    rims = (line.project(shapely.Point(rim)) for rim in (crossing.path[0], crossing.path[-1]))
    return float(line.length - max(rims))
