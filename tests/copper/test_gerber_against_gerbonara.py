"""Copper areas against gerbonara 1.5.0, an independent Gerber reader (PyPI, Apache-2.0)."""

from __future__ import annotations

import warnings
from collections.abc import Iterable
from importlib import resources
from itertools import groupby
from math import cos, hypot, pi, sin
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely
from shapely import LineString, Point, Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import gerber, paint

gerbonara = pytest.importorskip("gerbonara")


def gerbonara_area_mm2(text: str) -> float:
    """Area of the copper that gerbonara sees, each primitive by the plainest shapely means."""
    from gerbonara.utils import MM

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        file = gerbonara.GerberFile.from_string(text)
    primitives = [p for thing in file.objects for p in thing.to_primitives(unit=MM)]
    image: BaseGeometry = Polygon()
    for dark, run in groupby(primitives, key=lambda p: bool(p.polarity_dark)):
        shapes = shapely.union_all(np.array([shape_of(p) for p in run], dtype=object))
        image = image.union(shapes) if dark else image.difference(shapes)
    return float(image.area)


def shape_of(primitive: Any) -> BaseGeometry:
    """One primitive of gerbonara as a polygon, circles as 256 corners."""
    match type(primitive).__name__:
        case "Circle":
            return Point(primitive.x, primitive.y).buffer(primitive.r, quad_segs=64)
        case "Line":
            line = LineString(((primitive.x1, primitive.y1), (primitive.x2, primitive.y2)))
            return line.buffer(primitive.width / 2, quad_segs=32)
        case "Arc":
            start, end = (primitive.x1, primitive.y1), (primitive.x2, primitive.y2)
            centre = (primitive.cx, primitive.cy)
            path = [start, *bent(start, end, centre, clockwise=primitive.clockwise)]
            return LineString(path).buffer(primitive.width / 2, quad_segs=32)
        case "Rectangle":
            w, h = primitive.w / 2, primitive.h / 2
            box = shapely.box(-w, -h, w, h)
            turned = shapely.affinity.rotate(box, primitive.rotation, (0, 0), use_radians=True)
            return shapely.affinity.translate(turned, primitive.x, primitive.y)
        case "ArcPoly":
            return outline_of(primitive)
        case other:
            raise AssertionError(other)


def outline_of(polygon: Any) -> BaseGeometry:
    ring = list(polygon.outline[:1])
    for start, end, (clockwise, centre) in polygon.segments:
        if clockwise is None:
            ring.append(end)
        else:
            ring.extend(bent(start, end, centre, clockwise=clockwise))
    if len(ring) < 4:
        return Polygon()
    return shapely.make_valid(Polygon(ring))


Pair = tuple[float, float]


def bent(start: Pair, end: Pair, centre: Pair, *, clockwise: bool) -> Iterable[Pair]:
    """Points of an arc after its start, one a degree."""
    cx, cy = centre
    first = np.arctan2(start[1] - cy, start[0] - cx)
    last = np.arctan2(end[1] - cy, end[0] - cx)
    angle = (first - last if clockwise else last - first) % (2 * pi)
    if hypot(start[0] - end[0], start[1] - end[1]) < 1e-6:
        angle = 2 * pi
    radius = hypot(start[0] - cx, start[1] - cy)
    steps = max(2, int(angle / (pi / 180)))
    sign = -1 if clockwise else 1
    for n in range(1, steps):
        turn = first + sign * angle * n / steps
        yield cx + radius * cos(turn), cy + radius * sin(turn)
    yield end


def area_mm2(text: str) -> float:
    return sum(piece.area for piece in paint.paint(gerber.read(text, "it").marks))
