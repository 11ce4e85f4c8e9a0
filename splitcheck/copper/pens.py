"""Long runs of pen strokes as few shapes: pours drawn line by line, and pens led round pours."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from itertools import groupby

import numpy as np
import shapely
from shapely import LineString
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import curves
from splitcheck.copper.marks import Fill, Mark, Point, Stroke
from splitcheck.copper.outlines import Shapes, outlines, thick
from splitcheck.units import GRID_MM

#: Strokes are thickened together from so many on, and up to so many.
FEWEST_IN_RUN = 8
MOST_IN_RUN = 64

Path = tuple[Point, ...]


def outlines_to_unite(marks: Sequence[Mark]) -> Shapes:
    """Outlines of dark marks whose union alone is wanted.

    Parameters
    ----------
    marks
        Dark marks in file order.

    Returns
    -------
    Valid polygons and multipolygons, mm: fewer than marks, and in another order.

    Notes
    -----
    A run of thousands of short strokes, each starting where the last one ended, need not be
    united stroke by stroke. Where the pen went round a contour that is also filled (a very common
    way to write pours) both together are the filled area grown by half the pen. Other runs are
    thickened sixty at a time. Corners of such shapes are chords inside the true arc, so runs of a
    few strokes, where that could be seen in the area, stay single.
    """
    runs, single = _sorted_out(marks)
    if not runs:
        return outlines(marks)
    fills = [mark for mark in marks if isinstance(mark, Fill)]
    areas = outlines(fills)
    bare = np.ones(len(fills), dtype=bool)
    grown: list[BaseGeometry] = []
    number_of = {
        _path(fill.ring): number for number, fill in enumerate(fills) if not areas[number].is_empty
    }
    pieces: dict[float, list[Path]] = defaultdict(list)
    for width, path in runs:
        number = number_of.get(path)
        if number is not None:
            grown.extend(_grown(areas[number], path, width))
            bare[number] = False
        else:
            step = MOST_IN_RUN
            pieces[width] += [path[n : n + step + 1] for n in range(0, len(path) - 1, step)]
    drawn = [thick(paths, width) for width, paths in pieces.items()]
    return np.concatenate([np.array(grown, dtype=object), areas[bare], outlines(single), *drawn])


def _sorted_out(marks: Sequence[Mark]) -> tuple[list[tuple[float, Path]], list[Mark]]:
    """Long runs as width and path, and all marks that are neither in one nor fills."""
    strokes: list[Stroke] = []
    others: list[Mark] = []
    for mark in marks:
        if type(mark) is Stroke and mark.shape is None and mark.width_mm > 0:
            strokes.append(mark)
        elif type(mark) is not Fill:
            others.append(mark)
    runs: list[tuple[float, Path]] = []
    single: list[Mark] = []
    for run in _runs(strokes):
        if len(run) < FEWEST_IN_RUN:
            single.extend(run)
            continue
        corners = [point for mark in run for point in mark.points[:-1]]
        corners.append(run[-1].points[-1])
        runs.append((run[0].width_mm, _path(corners)))
    return runs, [*single, *others]


def _runs(strokes: Sequence[Stroke]) -> Iterator[Sequence[Stroke]]:
    """Consecutive round strokes of one width, each starting at the end of the last."""
    first, width, end = 0, -1.0, None
    for number, mark in enumerate(strokes):
        points = mark.points
        if points[0] != end or mark.width_mm != width:
            if number:
                yield strokes[first:number]
            first, width = number, mark.width_mm
        end = points[-1]
    if strokes:
        yield strokes[first:]


def _path(points: Sequence[Point]) -> Path:
    """Points without those that repeat the last; a dot keeps two."""
    kept = tuple(point for point, _ in groupby(points))
    return kept if len(kept) > 1 else (points[0], points[0])


def _grown(area: BaseGeometry, path: Path, width_mm: float) -> list[BaseGeometry]:
    """A filled contour with the pen led round it."""
    quarter = curves.corners_of_quarter(width_mm / 2)
    grown: list[BaseGeometry] = [shapely.buffer(area, width_mm / 2, quad_segs=quarter)]
    rim = shapely.buffer(area, GRID_MM, quad_segs=1)
    shapely.prepare(rim)
    line = LineString(path)
    if not shapely.covers(rim, line):
        # A contour may run outside of what it fills, there and back: the pen has drawn that too.
        strayed = shapely.difference(line, rim)
        grown.append(shapely.buffer(strayed, width_mm / 2, quad_segs=quarter))
    return grown
