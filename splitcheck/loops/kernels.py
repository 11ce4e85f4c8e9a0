"""Points and outlines in, potentials and source functions out: the closed forms of the field solve.

Everything here is numpy on plain arrays. The letters are those of the docstrings; lengths in mm.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np

from splitcheck.loops.outlines import Ints
from splitcheck.units import Floats

#: Image terms summed one by one; the rest of the series is added in closed form. With two, f is
#: within 2e-5 of the sum of 400.
_TERMS = 2
#: The image series is tabled up to this many image distances; beyond, its logarithm is exact.
_TABLED = 3.0
_STEPS = 4096


def outline_potential(x: Floats, y: Floats, edges: Floats) -> Floats:
    """Potential of a uniform sheet at points in its own plane, per unit density.

    Parameters
    ----------
    x, y
        Points, shape (k, p), mm.
    edges
        Outline as edges, shape (k, m, 4) as x1, y1, x2, y2 in mm; the sheet lies to the left, so
        that holes run clockwise. Edges of no length are allowed and count nothing.

    Returns
    -------
    Integral of 1/r over the sheet, shape (k, p), mm.

    Notes
    -----
    In polar coordinates about the point the integral over the sheet is the sum over its edges of
    d ln[(R1 + R2 + l) / (R1 + R2 - l)], with d the distance of the edge's line (positive where the
    point lies to the left), l its length and R1, R2 the distances of its ends. On the edge itself
    the logarithm is infinite but d is 0, and the product is 0.

    References
    ----------
    Wilton et al., "Potential integrals for uniform and linear source distributions on polygonal
    and polyhedral domains", IEEE Trans. AP 32(3), 1984, in the limit of a point in the plane
    (from memory).

    Examples
    --------
    The centre of a unit square: 4 ln(1 + sqrt 2).

    >>> corners = [(0, 0), (1, 0), (1, 1), (0, 1)]
    >>> square = np.array([[[*a, *b] for a, b in zip(corners, corners[1:] + corners[:1])]], float)
    >>> outline_potential(np.array([[0.5]]), np.array([[0.5]]), square).round(4)
    array([[3.5255]])
    """
    real = (edges[:, :, :2] != edges[:, :, 2:]).any(axis=2)
    # one edge each at least, so that every sum has a term
    real[:, 0] = True
    count = real.sum(axis=1)
    return edges_potential(x, y, edges[real], np.cumsum(count) - count)


def edges_potential(x: Floats, y: Floats, edges: Floats, first: Ints) -> Floats:
    """`outline_potential` of outlines of any number of edges, laid one after another.

    Parameters
    ----------
    x, y
        Points, shape (k, p), mm.
    edges
        Edges of all outlines, shape (e, 4).
    first
        Number of the first edge of each outline, rising, shape (k,).

    Returns
    -------
    Integral of 1/r over the sheets, shape (k, p), mm.
    """
    if not len(first):
        return np.zeros_like(x)
    owner = np.repeat(np.arange(len(first)), np.diff(first, append=len(edges)))
    x1, y1, x2, y2 = edges.T[:, :, None]
    along_x, along_y = x2 - x1, y2 - y1
    length = np.sqrt(along_x * along_x + along_y * along_y)
    x, y = x[owner], y[owner]
    from_x, from_y = x - x1, y - y1
    reach = np.sqrt(from_x * from_x + from_y * from_y)
    distance = along_x * from_y
    distance -= along_y * from_x
    distance /= np.maximum(length, 1e-300)
    x -= x2
    y -= y2
    reach += np.sqrt(x * x + y * y)
    np.maximum(reach, 1e-300, out=reach)
    ratio = (reach + length) / np.maximum(reach - length, 1e-15 * reach)
    distance *= np.log(ratio)
    total: Floats = np.add.reduceat(distance, first, axis=0)
    return total


def plate_images(r: Floats, plate_mm: float) -> Floats:
    """What a solid plane parallel to the sheet adds to 1/r, up to a constant.

    Parameters
    ----------
    r
        Distances in the plane, any shape, mm, >= 0.
    plate_mm
        Distance d of the solid plane, mm, > 0.

    Returns
    -------
    Sum over n != 0 of 1/sqrt(r^2 + (2 n d)^2), less a constant, shape of `r`, 1/mm. The constant
    is of no effect where the net flux is zero; it is chosen such that the value tends to
    -ln(r/2d)/d - 1/r far away.

    Notes
    -----
    With x = r/2d and M = N + 1/2 the value is [2 sum_1^N (x^2 + n^2)^-1/2
    - 2 ln(M + sqrt(M^2 + x^2))]/2d: what lies beyond N is its integral, and the logarithm is
    finite at x = 0. Far away the images merge into a line charge; what is left of the single
    images falls as K0(2 pi x), below 1e-8 from x = 3, where the table ends.

    Examples
    --------
    >>> plate_images(np.array([0.0, 1.0, 10.0]), 0.5).round(4)
    array([-0.2319, -0.9963, -4.7052])
    """
    return plate_images_squared(r * r, plate_mm)


def plate_images_squared(square: Floats, plate_mm: float) -> Floats:
    """`plate_images` of distances given by their squares, mm^2."""
    x2 = square * (0.25 / plate_mm**2)
    place = np.minimum(x2 * _PER_STEP, _STEPS - 0.5)
    step = place.astype(np.int32)
    place -= step
    place *= np.take(_TABLE_RISE, step)
    place += np.take(_TABLE, step)
    far = x2 >= _TABLED**2
    if far.any():
        beyond = x2[far]
        place[far] = -np.log(beyond) - 1.0 / np.sqrt(beyond)
    place /= 2.0 * plate_mm
    return place


def images_rise(square: Floats, plate_mm: float) -> tuple[Floats, Floats]:
    """First and second derivative of `plate_images_squared` by the square, 1/mm^3 and 1/mm^5."""
    per_mm2 = 0.25 / plate_mm**2
    x2 = square * per_mm2
    place = np.clip(x2 * _PER_STEP, 0.5, _STEPS - 1.5)
    step = place.astype(np.int32)
    place -= step
    # a rise is that of the middle of its step
    before = np.where(place < 0.5, np.maximum(step - 1, 0), step)
    low, high = np.take(_TABLE_RISE, before), np.take(_TABLE_RISE, before + 1)
    first = low + (high - low) * np.where(place < 0.5, place + 0.5, place - 0.5)
    scale = _PER_STEP * per_mm2 / (2.0 * plate_mm)
    return first * scale, (high - low) * _PER_STEP * per_mm2 * scale


def _tabled_images() -> tuple[Floats, Floats]:
    """Table the image sum against x^2, in which it is smooth, and its rise from step to step."""
    square = np.linspace(0.0, _TABLED**2, _STEPS + 1)
    n = np.arange(1, 121, dtype=np.float64)
    near = 2.0 / np.sqrt(square[:, None] + n**2)
    last = 120.5
    rest = np.log(last + np.sqrt(last**2 + square))
    table = near.sum(axis=1) - 2.0 * rest
    return table, np.diff(table)


_TABLE, _TABLE_RISE = _tabled_images()
_PER_STEP = _STEPS / _TABLED**2


def rectangle_self(a: Floats, b: Floats) -> Floats:
    """Mean of 1/r over all pairs of points of an a x b rectangle.

    Parameters
    ----------
    a, b
        Sides, shape (n,), mm, > 0.

    Returns
    -------
    Mean of 1/r, shape (n,), 1/mm.

    Notes
    -----
    The fourfold integral of 1/r over the rectangle, in the asinh form that is exact for any ratio
    of the sides: [2 a^2 b asinh(b/a) + 2 a b^2 asinh(a/b) - 2/3 (D^3 - a^3 - b^3)] / (a b)^2 with
    D^2 = a^2 + b^2.

    Examples
    --------
    A unit square: 4 ln(1 + sqrt 2) - 4/3 (sqrt 2 - 1) = 2.9732.

    >>> rectangle_self(np.array([1.0]), np.array([1.0])).round(4)
    array([2.9732])
    """
    d = np.hypot(a, b)
    corner = 2.0 * a**2 * b * np.arcsinh(b / a) + 2.0 * a * b**2 * np.arcsinh(a / b)
    return (corner - (d**3 - a**3 - b**3) * (2.0 / 3.0)) / (a * b) ** 2


def wall_source(
    x: Floats, y: Floats, segments: Floats, height_mm: float, above_mm: float | None
) -> tuple[Floats, Floats]:
    """Source function of a polyline trace at points of the plane, and the angle it is seen under.

    Parameters
    ----------
    x, y
        Points of the plane, shape (k,), mm.
    segments
        Straight stretches of the centre line, shape (s, 4) as x1, y1, x2, y2, mm.
    height_mm
        Height h of the trace over the plane, mm, > 0.
    above_mm
        Distance H > h of a second solid plane on the trace's side, or None.

    Returns
    -------
    What each stretch adds to f in ampere per ampere, shape (k, s), and the angle A in rad that it
    is seen under, positive from the left, shape (k, s). Both jump on the centre line: A by 2 pi, f
    by the share 1 - h/H of this plane (1 without a second plane).

    Notes
    -----
    The tangential field on the plane is the gradient of the solid angle of the wall between trace
    and image, over 4 pi. With y the distance of the point from the line of a stretch and s1, s2
    its ends measured along it, the wall from z = 0 to z is seen under half of
    T(z) = atan(s2 z / (y R2)) - atan(s1 z / (y R1)), R^2 = s^2 + y^2 + z^2, so f = T(h)/2 pi.
    Between two planes the walls repeat every 2H: f = [T(h) + sum_1^N (T(2nH + h) - T(2nH - h))
    - (h/H) (T(z) - (H^2 - h^2)/6 T''(z))]/2 pi with z = (2N + 1)H; the last term is the rest of the
    series by the midpoint rule with its first correction, less the current h/H that the upper plane
    takes over at the ends of the trace.
    """
    x1, y1, x2, y2 = segments.T
    length = np.hypot(x2 - x1, y2 - y1)
    ux, uy = (x2 - x1) / length, (y2 - y1) / length
    from_x, from_y = x[:, None] - x1, y[:, None] - y1
    off = ux * from_y - uy * from_x
    # a point on the line itself belongs to its left side, in f and in A alike
    off = np.where(np.abs(off) < 1e-12, 1e-12, off)
    first = -(ux * from_x + uy * from_y)
    last = first + length
    square = off * off
    seen = np.arctan2(off * length, first * last + square)
    early, late = first * first + square, last * last + square

    def wall(z: float) -> Floats:
        value: Floats = np.arctan(last * z / (off * np.sqrt(late + z * z)))
        value -= np.arctan(first * z / (off * np.sqrt(early + z * z)))
        return value

    ends = _Ends(off, first, last, square, early, late)
    total = _repeated(ends, wall, height_mm, above_mm)
    return total / (2.0 * np.pi), seen


def smooth_source(
    x: Floats, y: Floats, segments: Floats, height_mm: float, above_mm: float | None
) -> Floats:
    """What stretches of a trace add to f, less what they add to its jump: f - s A/2 pi.

    Parameters
    ----------
    x, y
        Points of the plane, any shape, mm.
    segments
        Stretches, shape (..., 4); all but the last axis broadcasts with `x`.
    height_mm, above_mm
        As in `wall_source`, with s = 1 - h/H.

    Returns
    -------
    The smooth part of the source function, of the common shape.

    Notes
    -----
    A is T at an endless wall, so that each end of a stretch adds the difference of two angles that
    lie in one quadrant: atan(s z/(y R)) - atan(s/y) = -atan(s y (R - z)/(y^2 R + s^2 z)).

    Examples
    --------
    Beside the middle of a long trace, at its height: (atan(1) - pi/2)/pi.

    >>> value = smooth_source(np.array(0.0), np.array(0.2), np.array([-1e4, 0, 1e4, 0]), 0.2, None)
    >>> round(float(value), 4)
    -0.25
    """
    x1, y1, x2, y2 = np.moveaxis(segments, -1, 0)
    ux, uy = x2 - x1, y2 - y1
    length = np.sqrt(ux * ux + uy * uy)
    ux, uy = ux / length, uy / length
    from_x, from_y = x - x1, y - y1
    off = ux * from_y - uy * from_x
    first = -(ux * from_x + uy * from_y)
    last = first + length
    square = off * off
    early, late = first * first, last * last
    ends = _Ends(off, first, last, square, early + square, late + square)
    up_first, up_last = off * first * ends.early, off * last * ends.late

    def wall(z: float) -> Floats:
        reach = np.sqrt(ends.early + z * z)
        value: Floats = np.arctan(
            up_first / np.maximum((square * reach + early * z) * (reach + z), 1e-300)
        )
        reach = np.sqrt(ends.late + z * z)
        value -= np.arctan(up_last / np.maximum((square * reach + late * z) * (reach + z), 1e-300))
        return value

    return _repeated(ends, wall, height_mm, above_mm) / (2.0 * np.pi)


class _Ends(NamedTuple):
    """Where the ends of stretches lie from points."""

    off: Floats
    """Distance of the line of a stretch, to its left."""
    first: Floats
    last: Floats
    """Its ends measured along it."""
    square: Floats
    early: Floats
    late: Floats
    """Squared distances of the line and of the ends."""


def _repeated(
    ends: _Ends, wall: Callable[[float], Floats], height_mm: float, above_mm: float | None
) -> Floats:
    """The wall under a trace, and those that a plane above it repeats; see `wall_source`."""
    total = wall(height_mm)
    if above_mm is not None:
        for n in range(1, _TERMS + 1):
            total += wall(2 * n * above_mm + height_mm) - wall(2 * n * above_mm - height_mm)
        z = (2 * _TERMS + 1) * above_mm
        slack = (above_mm**2 - height_mm**2) / 6
        total -= height_mm / above_mm * (wall(z) - slack * _bend(ends, z))
    return total


def _bend(ends: _Ends, z: float) -> Floats:
    """T''(z)."""
    up = ends.square + z * z
    value = np.zeros_like(ends.off)
    for along, reach in ((ends.first, ends.early + z * z), (ends.last, ends.late + z * z)):
        value = along / np.sqrt(reach) * (1.0 / reach + 2.0 / up) - value
    value *= ends.off * (-z) / up
    return value
