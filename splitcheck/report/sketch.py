"""A finding seen from near in, a small picture of plain characters out."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import LineString, Polygon

from splitcheck.verdict.views import FindingView, Line, Shape

#: Size of the picture in characters; one is twice as high as wide.
WIDE, HIGH = 68, 24
LEGEND = (
    ". plane, blank: no plane, = trace, X trace without plane, - other nets, * shortest way round, "
    "o plated hole or part on it"
)


def sketch(view: FindingView, wide: int = WIDE, high: int = HIGH) -> tuple[str, ...]:
    """Draw a finding with characters.

    Parameters
    ----------
    view
        The finding.
    wide, high
        The most characters to use, > 0.

    Returns
    -------
    Lines of ASCII, from north to south; see ``LEGEND``.
    """
    x0, y0, x1, y1 = view.window_mm
    cell = max((x1 - x0) / wide, (y1 - y0) / (2 * high))
    columns, rows = max(round((x1 - x0) / cell), 1), max(round((y1 - y0) / (2 * cell)), 1)
    x = x0 + (np.arange(columns) + 0.5) * (x1 - x0) / columns
    y = y1 - (np.arange(rows) + 0.5) * (y1 - y0) / rows
    xs, ys = (grid.ravel() for grid in np.meshgrid(x, y))
    signs = np.full(len(xs), ".")
    across, down = (x1 - x0) / columns / 2, (y1 - y0) / rows / 2
    cells = shapely.box(xs - across, ys - down, xs + across, ys + down)
    gaps = shapely.union_all([_polygon(shape) for shape in view.gaps])
    signs[shapely.contains_xy(gaps, xs, ys)] = " "
    # the gap in question is seen however thin it is
    crossed = shapely.union_all([_polygon(shape) for shape in view.crossed])
    signs[shapely.intersects(cells, crossed.buffer(-cell / 50))] = " "

    def mark(lines: list[Line], sign: str) -> None:
        if lines:
            drawn = shapely.union_all([_line(line) for line in lines])
            signs[shapely.intersects(cells, drawn)] = sign

    mark([trace.line for trace in view.others], "-")
    best = [way for way in view.ways if way.best]
    mark([way.path for way in best], "*")
    mark([trace.line for trace in view.own], "=")
    mark(list(view.runs), "X")
    mark([(at,) for way in best for at in way.bridges], "o")
    return tuple("".join(row).rstrip() for row in signs.reshape(rows, columns).tolist())


def _polygon(shape: Shape) -> shapely.Geometry:
    rings = [ring for ring in shape if len(ring) > 2]
    if not rings:
        return Polygon()
    polygon = Polygon(rings[0], rings[1:])
    # what was simplified for the eye may touch itself
    return polygon if polygon.is_valid else shapely.make_valid(polygon)


def _line(line: Line) -> shapely.Geometry:
    return LineString(line) if len(line) > 1 else shapely.Point(line[0])
