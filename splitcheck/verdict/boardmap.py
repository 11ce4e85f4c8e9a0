"""A walked board in, its map out: outlines drawn only as well as the eye can see them."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Polygon

from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Tracks
from splitcheck.verdict.findings import Finding, Point
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.views import (
    BoardView,
    Box,
    IslandView,
    LayerView,
    Line,
    NetView,
    Shape,
)

#: Outlines are drawn this well, as a share of the board's larger side; holes smaller than so many
#: times that are left out.
TOLERANCE = 1 / 1500
LEAST_HOLE = 4.0
#: No more corners than this are drawn of all planes together: they are drawn more coarsely.
MOST_CORNERS = 90_000
#: Coordinates of pictures are rounded to so many decimals of a mm.
DECIMALS = 4


def board_view(
    scene: Scene,
    planes: Sequence[Plane],
    tracks: Sequence[Tracks],
    findings: Sequence[Finding],
    most_corners: int = MOST_CORNERS,
) -> BoardView:
    """Draw the map of a board.

    Parameters
    ----------
    scene
        The board.
    planes, tracks
        Its reference copper, and the traces that are judged.
    findings
        What was found.
    most_corners
        How many corners all planes together may have in the drawing.
    """
    board = scene.board
    box = board.outline.bounds
    fine = TOLERANCE * max(box[2] - box[0], box[3] - box[1])
    shapes = {plane.layer: _islands(plane, fine) for plane in planes}
    while fine < max(box[2] - box[0], box[3] - box[1]) / 50:
        if sum(_corners(i.shape) for some in shapes.values() for i in some) <= most_corners:
            break
        fine *= 1.6
        shapes = {plane.layer: _islands(plane, fine) for plane in planes}
    lines = {layer.layer: layer for layer in tracks}
    return BoardView(
        box_mm=rounded_box(box),
        outline=shapes_of(board.outline, fine),
        layers=tuple(
            LayerView(
                row.number,
                row.name,
                shapes.get(row.number, ()),
                _chains(lines[row.number], fine) if row.number in lines else (),
            )
            for row in board.layers
        ),
        nets=_nets(scene, tracks, findings, fine),
        gaps=_gaps(planes, findings, shapely.box(*box), fine),
        tolerance_mm=fine,
    )


def rounded_box(bounds: Sequence[float]) -> Box:
    """A box with its coordinates rounded as in pictures."""
    x0, y0, x1, y1 = (round(float(value), DECIMALS) for value in bounds)
    return x0, y0, x1, y1


def line_of(points: Iterable[Sequence[float]]) -> Line:
    """Points as they are drawn, none twice in a row."""
    line: list[Point] = []
    for x, y in points:
        point = (round(float(x), DECIMALS) + 0.0, round(float(y), DECIMALS) + 0.0)
        if not line or line[-1] != point:
            line.append(point)
    return tuple(line)


def shapes_of(
    geometry: shapely.Geometry | Sequence[shapely.Geometry], tolerance_mm: float
) -> tuple[Shape, ...]:
    """The polygons of a geometry, or of several, drawn so well; what is too small is left out.

    Examples
    --------
    >>> shapes_of(shapely.box(0, 0, 2, 1).segmentize(0.3), 0.01)
    ((((2.0, 0.0), (2.0, 1.0), (0.0, 1.0), (0.0, 0.0)),),)
    """
    plain = shapely.simplify(_polygons(geometry, tolerance_mm), tolerance_mm)
    parts = _polygons(plain, tolerance_mm)
    rings, owner = shapely.get_rings(parts, return_index=True)
    first = np.concatenate([[True], owner[1:] != owner[:-1]]) if len(owner) else owner > 0
    x0, y0, x1, y1 = shapely.bounds(rings).reshape(-1, 4).T
    seen = first | (np.maximum(x1 - x0, y1 - y0) >= LEAST_HOLE * tolerance_mm)
    rings, owner = rings[seen], owner[seen].tolist()
    points, ring = shapely.get_coordinates(rings, return_index=True)
    rows = (points.round(DECIMALS) + 0.0).tolist()
    ends = np.searchsorted(ring, np.arange(len(rings) + 1)).tolist()
    shapes: list[list[Line]] = [[] for _ in range(len(parts))]
    for number, (start, stop) in enumerate(pairwise(ends)):
        shapes[owner[number]].append(tuple((x, y) for x, y in rows[start : stop - 1]))
    return tuple(tuple(shape) for shape in shapes if shape)


def _polygons(
    geometry: shapely.Geometry | Sequence[shapely.Geometry] | NDArray[np.object_],
    tolerance_mm: float,
) -> NDArray[np.object_]:
    """Polygons of a geometry that can be seen."""
    parts = shapely.get_parts(shapely.get_parts(np.atleast_1d(np.asarray(geometry, dtype=object))))
    solid = shapely.get_type_id(parts) == shapely.GeometryType.POLYGON
    visible: NDArray[np.object_] = parts[solid & (shapely.area(parts) >= tolerance_mm**2)]
    return visible


def _corners(shape: Shape) -> int:
    return sum(len(ring) for ring in shape)


def _islands(plane: Plane, tolerance_mm: float) -> tuple[IslandView, ...]:
    return tuple(
        IslandView(island.id, island.net_name, shape)
        for island in plane.islands
        for shape in shapes_of(island.shape, tolerance_mm)
    )


def _chains(tracks: Tracks, tolerance_mm: float) -> tuple[Line, ...]:
    """Straight pieces joined into lines where they meet two by two."""
    if not len(tracks.net):
        return ()
    merged = shapely.line_merge(shapely.multilinestrings(np.stack([tracks.start, tracks.end], 1)))
    parts = [part for part in shapely.get_parts(merged) if isinstance(part, LineString)]
    lines = [line_of(part.simplify(tolerance_mm / 2).coords) for part in parts]
    return tuple(sorted(line for line in lines if len(line) > 1))


def _nets(
    scene: Scene, tracks: Sequence[Tracks], findings: Sequence[Finding], tolerance_mm: float
) -> tuple[NetView, ...]:
    """The traces of every net with a finding."""
    wanted = {finding.net for finding in findings}
    numbers = [net.number for net in scene.board.nets if net.name in wanted]
    lines: dict[str, list[tuple[int, Line]]] = defaultdict(list)
    for layer in tracks:
        order = np.argsort(layer.net, kind="stable")
        ranked = layer.net[order]
        for number in numbers:
            first, last = np.searchsorted(ranked, [number, number + 1])
            mine = order[first:last]
            if not len(mine):
                continue
            ends = np.stack([layer.start[mine], layer.end[mine]], axis=1)
            merged = shapely.line_merge(shapely.multilinestrings(ends))
            for part in shapely.get_parts(merged):
                line = line_of(part.simplify(tolerance_mm / 2).coords)
                if len(line) > 1:
                    lines[scene.board.nets[number].name].append((layer.layer, line))
    return tuple(NetView(name, tuple(sorted(found))) for name, found in sorted(lines.items()))


def _gaps(
    planes: Sequence[Plane], findings: Sequence[Finding], frame: Polygon, tolerance_mm: float
) -> tuple[tuple[str, Shape], ...]:
    wanted = {finding.gap for finding in findings if finding.gap}
    found: list[tuple[str, Shape]] = []
    for plane in planes:
        for gap in plane.gaps:
            if gap.id in wanted and not gap.open:
                clipped = shapely.clip_by_rect(gap.shape, *frame.bounds)
                found.extend((gap.id, shape) for shape in shapes_of(clipped, tolerance_mm / 4))
    return tuple(sorted(found))
