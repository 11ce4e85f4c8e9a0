"""Marks to the outlines that they cover, many at a time: one polygon array for a whole layer."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from itertools import chain, pairwise
from typing import Any, TypeAlias

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import Polygon

from splitcheck.copper import curves, fills
from splitcheck.copper.marks import Fill, Flash, Mark, Point, Stroke
from splitcheck.units import Floats

Shapes: TypeAlias = NDArray[Any]


def outlines(marks: Sequence[Mark]) -> Shapes:
    """Area that each mark covers, whatever is painted over it.

    Parameters
    ----------
    marks
        Strokes, flashes and fills.

    Returns
    -------
    Valid polygons or multipolygons, shape (n,), mm; empty where a mark covers nothing.
    """
    shapes: Shapes = np.empty(len(marks), dtype=object)
    lines: dict[float, list[int]] = defaultdict(list)
    paths: dict[float, list[int]] = defaultdict(list)
    stamps: dict[int, list[int]] = defaultdict(list)
    contours: list[int] = []
    for number, mark in enumerate(marks):
        if type(mark) is Stroke:
            if mark.shape is not None:
                shapes[number] = swept(mark.points, mark.shape)
            elif len(mark.points) == 2:
                lines[mark.width_mm].append(number)
            else:
                paths[mark.width_mm].append(number)
        elif type(mark) is Flash:
            stamps[id(mark.shape)].append(number)
        else:
            contours.append(number)
    for width, numbers in lines.items():
        shapes[numbers] = _capsules([marks[n].points for n in numbers], width)  # type: ignore[union-attr]
    for width, numbers in paths.items():
        shapes[numbers] = thick([marks[n].points for n in numbers], width)  # type: ignore[union-attr]
    for numbers in stamps.values():
        first = marks[numbers[0]]
        assert isinstance(first, Flash)
        shapes[numbers] = _stamped(first.shape, [marks[n].at for n in numbers])  # type: ignore[union-attr]
    if contours:
        shapes[contours] = _filled([marks[n] for n in contours])  # type: ignore[misc]
    return shapes


def _capsules(ends: Sequence[tuple[Point, ...]], width_mm: float) -> Shapes:
    """Straight round-ended lines of one width."""
    if width_mm <= 0:
        return np.full(len(ends), Polygon(), dtype=object)
    pairs = np.array(ends, dtype=np.float64)
    start, end = pairs[:, 0], pairs[:, 1]
    along = end - start
    length = np.hypot(along[:, 0], along[:, 1])
    dot = length == 0
    along[~dot] /= length[~dot, None]
    cap = curves.cap(width_mm)
    # Turn the end cap into each line's direction; the start cap is the same, half a turn on.
    east, north = along[:, 0:1], along[:, 1:2]
    turned = np.stack(
        (east * cap[:, 0] - north * cap[:, 1], north * cap[:, 0] + east * cap[:, 1]), axis=2
    )
    corners = np.concatenate((end[:, None] + turned, start[:, None] - turned), axis=1)
    shapes: Shapes = np.empty(len(ends), dtype=object)
    shapes[~dot] = shapely.polygons(np.round(corners[~dot], 6))
    if dot.any():
        disc = curves.circle(width_mm)
        shapes[dot] = shapely.polygons(np.round(start[dot][:, None] + disc, 6))
    return shapes


def thick(paths: Sequence[tuple[Point, ...]], width_mm: float) -> Shapes:
    """Paths of many points drawn with a round pen, mm."""
    if width_mm <= 0:
        return np.full(len(paths), Polygon(), dtype=object)
    quarter = curves.corners_of_quarter(width_mm / 2)
    made: Shapes = shapely.buffer(
        _lines(paths),
        width_mm / 2,
        quad_segs=quarter,
    )
    return made


def _lines(paths: Sequence[tuple[Point, ...]]) -> Shapes:
    counts = np.fromiter(map(len, paths), dtype=np.intp, count=len(paths))
    corners = np.array(list(chain.from_iterable(paths)), dtype=np.float64).reshape(-1, 2)
    numbers = np.repeat(np.arange(len(paths)), counts)
    return np.asarray(shapely.linestrings(corners, indices=numbers), dtype=object)


def _stamped(shape: Polygon, places: Sequence[Point]) -> Shapes:
    """One shape set down at many places."""
    at = np.array(places, dtype=np.float64)[:, None]

    def rings(ring: shapely.LinearRing) -> Shapes:
        corners = np.round(at + shapely.get_coordinates(ring), 6)
        return np.asarray(shapely.linearrings(corners), dtype=object)

    shell = rings(shape.exterior)
    if not shape.interiors:
        return np.asarray(shapely.polygons(shell), dtype=object)
    holes = np.column_stack([rings(ring) for ring in shape.interiors])
    return np.array(
        [shapely.polygons(one, holes=inner) for one, inner in zip(shell, holes, strict=True)],
        dtype=object,
    )


def _filled(marks: Sequence[Fill]) -> Shapes:
    """Contours of regions; most are simple, the rest are mended one by one."""
    counts = np.array([len(mark.ring) for mark in marks])
    corners = np.array([point for mark in marks for point in mark.ring])
    rings = shapely.linearrings(corners, indices=np.repeat(np.arange(len(marks)), counts))
    shapes: Shapes = np.asarray(shapely.polygons(rings), dtype=object)
    ends = np.cumsum(counts)
    for number in np.flatnonzero(~shapely.is_valid(shapes)):
        ring = corners[ends[number] - counts[number] : ends[number]]
        shapes[number] = fills.mended(ring)
    return shapes


def swept(points: Iterable[Point], shape: Polygon) -> shapely.Geometry:
    """What an aperture that is not round covers on its way along a line, mm.

    Notes
    -----
    The shape at every point, and between two points the parallelogram that each of its edges
    sweeps: together the Minkowski sum with the line, also for shapes with holes or notches.
    """
    path = np.array(list(points), dtype=np.float64)
    placed = _stamped(shape, [(x, y) for x, y in path.tolist()])
    edges = np.concatenate([_edges(ring) for ring in (shape.exterior, *shape.interiors)])
    quads = [placed]
    for start, end in pairwise(path):
        if np.array_equal(start, end):
            continue
        first, last = edges[:, 0], edges[:, 1]
        corners = np.stack((first + start, last + start, last + end, first + end), axis=1)
        across = (last - first)[:, 0] * (end - start)[1] - (last - first)[:, 1] * (end - start)[0]
        quads.append(shapely.polygons(np.round(corners[across != 0], 6)))
    every = np.concatenate(quads)
    return shapely.union_all(every[shapely.is_valid(every)])


def _edges(ring: shapely.LinearRing) -> Floats:
    corners: Floats = shapely.get_coordinates(ring)
    return np.stack((corners[:-1], corners[1:]), axis=1)
