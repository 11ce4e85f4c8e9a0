"""Contours as files draw them, with cut-ins and crossings, to the area that they fill."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import LineString, Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.units import Floats


def filled(ring: Floats) -> BaseGeometry:
    """Area that a closed contour fills: every point that it winds round (the nonzero rule).

    Parameters
    ----------
    ring
        Corners, shape (n, 2), mm, closed or not; may touch, retrace or cross itself.

    Returns
    -------
    A valid polygon or several; empty for fewer than three corners.

    Notes
    -----
    The format allows cut-ins (a hole joined to the outside by a line drawn there and back) and
    forbids crossings. A cut-in hole runs against its outside, so even-odd and nonzero agree on
    it. Where rounding makes a contour overlap itself, even-odd would leave slits in solid copper;
    nonzero keeps it whole. A hole run the same way as its outside is thus filled.

    Examples
    --------
    >>> round_it = [(0, 0), (9, 0), (9, 9), (0, 9), (0, 5)]
    >>> hole = [(3, 5), (3, 6), (6, 6), (6, 3), (3, 3), (3, 5), (0, 5)]
    >>> filled(np.array(round_it + hole, float)).area
    72.0
    """
    if len(ring) < 3:
        return Polygon()
    shape = Polygon(ring)
    if shape.is_valid:
        return shape
    return mended(ring)


def mended(ring: Floats) -> BaseGeometry:
    """The same for a contour already known not to be a simple one."""
    x, y = (ring - ring[0]).T
    signed = 0.5 * float(np.dot(x, np.roll(y, -1)) - np.dot(np.roll(x, -1), y))
    shape = shapely.make_valid(Polygon(ring), method="structure", keep_collapsed=False)
    # Wound once everywhere: the signed area is the area, and any method finds the same.
    if abs(shape.area - abs(signed)) <= 1e-9 * max(1.0, abs(signed)):
        return shape
    return _wound(ring)


def _wound(ring: Floats) -> BaseGeometry:
    closed = ring if np.array_equal(ring[0], ring[-1]) else np.vstack((ring, ring[:1]))
    lines = shapely.unary_union(LineString(closed))
    faces = shapely.get_parts(shapely.polygonize(shapely.get_parts(lines)))
    inside = [face for face in faces if _winding(closed, face) != 0]
    return shapely.union_all(inside) if inside else Polygon()


def _winding(closed: Floats, face: Polygon) -> int:
    """How often the contour goes round a point of the face."""
    at = face.representative_point()
    x, y = closed[:, 0] - at.x, closed[:, 1] - at.y
    up = (y[:-1] <= 0) & (y[1:] > 0)
    down = (y[:-1] > 0) & (y[1:] <= 0)
    side = x[:-1] * (y[1:] - y[:-1]) - y[:-1] * (x[1:] - x[:-1])
    return int(np.count_nonzero(up & (side > 0)) - np.count_nonzero(down & (side < 0)))


def inside(ring: Floats) -> tuple[float, float] | None:
    """A point well inside the filled area of a closed contour, found without mending it.

    Parameters
    ----------
    ring
        Corners, shape (n, 2), mm, first repeated last.

    Returns
    -------
    The middle of the widest filled stretch of a level line, or ``None`` if that line meets none.

    Examples
    --------
    >>> inside(np.array([(0, 0), (4, 0), (4, 2), (0, 2), (0, 0)], float))
    (2.0, 1.0)
    """
    levels = np.unique(ring[:, 1])
    if len(levels) < 2:
        return None
    # Between two levels, so that the line meets no corner; the widest gap near the middle.
    middle = len(levels) // 2
    near = slice(max(0, middle - 50), middle + 50)
    gaps = np.diff(levels[near])
    lowest = int(np.argmax(gaps))
    at_y = float(levels[near][lowest] + gaps[lowest] / 2)
    (ax, ay), (bx, by) = ring[:-1].T, ring[1:].T
    up, down = (ay < at_y) & (by > at_y), (ay > at_y) & (by < at_y)
    meets = up | down
    crossing = ax[meets] + (at_y - ay[meets]) * (bx - ax)[meets] / (by - ay)[meets]
    order = np.argsort(crossing, kind="stable")
    crossing = crossing[order]
    winding = np.cumsum(np.where(up[meets], 1, -1)[order])[:-1]
    widths = np.where(winding != 0, np.diff(crossing), 0.0)
    if not len(widths) or widths.max() <= 1e-5:
        return None
    widest = int(np.argmax(widths))
    return float(crossing[widest] + widths[widest] / 2), at_y
