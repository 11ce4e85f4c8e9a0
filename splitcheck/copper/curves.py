"""Circles and arcs as chords: within 2 um of the true curve and with the true area."""

from __future__ import annotations

from collections.abc import Sequence
from math import acos, atan2, ceil, cos, hypot, pi, sin, sqrt

import numpy as np

from splitcheck.copper.marks import Point
from splitcheck.units import Floats

#: How far a chord may lie from its arc, mm. Half the finest etching tolerance, by far.
SAGITTA_MM = 0.002
#: An arc that turns less than this may be one chord (0.04 % of its sector's area), radians.
FLAT_RAD = 0.05
#: A circle never has fewer corners than this, however small.
FEWEST_CORNERS = 16


def step_rad(radius_mm: float) -> float:
    """Largest angle of one chord that stays within ``SAGITTA_MM`` of the arc, radians."""
    widest = 2 * pi / FEWEST_CORNERS
    if radius_mm <= SAGITTA_MM:
        return widest
    return min(widest, 2 * acos(1 - SAGITTA_MM / radius_mm))


def corners_of_quarter(radius_mm: float) -> int:
    """Chords of a quarter circle that stay within ``SAGITTA_MM``."""
    return ceil(pi / 2 / step_rad(radius_mm) - 1e-9)


def stretch(chords: int, angle_rad: float) -> float:
    """By how much inner corners move outward so that the chords enclose the area of the sector.

    Parameters
    ----------
    chords
        Number of chords, >= 1; the two ends of the arc stay on it.
    angle_rad
        Angle of the whole arc, radians, > 0; at most a quarter turn a chord.

    Returns
    -------
    Radius of the inner corners over the radius of the arc, >= 1.

    Notes
    -----
    Two triangles with one corner at the arc and n - 2 with both moved by k have the area
    sin(d)/2 (2 k + (n - 2) k^2); it is set equal to that of the sector, angle/2.

    Examples
    --------
    >>> round(stretch(8, pi), 5)
    1.01486
    """
    if chords < 2:
        return 1.0
    want = angle_rad / sin(angle_rad / chords)
    if chords == 2:
        return want / 2
    return (sqrt(1 + (chords - 2) * want) - 1) / (chords - 2)


def circle(diameter_mm: float, at: Point = (0.0, 0.0)) -> Floats:
    """Corners of a circle of exactly its area, counter-clockwise, shape (n, 2), mm, not closed.

    Examples
    --------
    >>> x, y = circle(2.0).T
    >>> area = 0.5 * abs(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
    >>> round(float(area) / pi, 5)
    1.0
    """
    radius = diameter_mm / 2
    corners = 4 * ceil(pi / step_rad(radius) / 2)
    angle = 2 * pi / corners
    outer = radius * sqrt(angle / sin(angle))
    turn = np.arange(corners) * angle
    return np.column_stack((at[0] + outer * np.cos(turn), at[1] + outer * np.sin(turn)))


def cap(width_mm: float) -> Floats:
    """Round end of a line that comes from the left, as seen from its end point, shape (n, 2), mm.

    From (0, -width/2) round to (0, +width/2): both exact, so a line has its width, and between
    them as much area as the half circle has.
    """
    radius = width_mm / 2
    chords = max(FEWEST_CORNERS // 2, ceil(pi / step_rad(radius)))
    turn = np.linspace(-pi / 2, pi / 2, chords + 1)
    reach = np.full(chords + 1, radius * stretch(chords, pi))
    reach[0] = reach[-1] = radius
    return np.column_stack((reach * np.cos(turn), reach * np.sin(turn)))


def sweep_rad(start: Point, end: Point, centre: Point, *, clockwise: bool) -> float:
    """Angle from start to end round the centre, radians, in (0, 2 pi]; a full turn if they meet."""
    first = atan2(start[1] - centre[1], start[0] - centre[0])
    last = atan2(end[1] - centre[1], end[0] - centre[0])
    angle = first - last if clockwise else last - first
    angle %= 2 * pi
    # Ends that meet to a rounding mean a whole turn only if they are one point.
    return 2 * pi if angle == 0 or start == end else angle


def arc(start: Point, end: Point, centre: Point, *, clockwise: bool) -> list[Point]:
    """Corners of an arc after its start, up to its end, mm, on the 1 nm grid.

    Parameters
    ----------
    start, end, centre
        mm. Start and end may differ in radius (files round them); the arc then spirals between.
        Where they are one point the arc is a whole circle.
    clockwise
        Sense of the turn.

    Returns
    -------
    One or more points; the last is ``end`` itself.

    Examples
    --------
    >>> len(arc((1.0, 0.0), (1.0, 0.0), (0.0, 0.0), clockwise=False))
    50
    """
    cx, cy = centre
    first = hypot(start[0] - cx, start[1] - cy)
    last = hypot(end[0] - cx, end[1] - cy)
    if first == 0 or last == 0:
        return [end]
    angle = sweep_rad(start, end, centre, clockwise=clockwise)
    chords = max(1, ceil(angle / step_rad(max(first, last)) - 1e-9))
    if chords == 1:
        if angle < FLAT_RAD:
            return [end]
        # One chord has no inner corner to move: a circle of many short arcs would lose area.
        chords = 2
    outward = stretch(chords, angle)
    begin = atan2(start[1] - cy, start[0] - cx)
    step = (-angle if clockwise else angle) / chords
    grow = (last - first) / chords
    points = []
    for number in range(1, chords):
        reach = (first + grow * number) * outward
        turn = begin + step * number
        points.append((round(cx + reach * cos(turn), 6), round(cy + reach * sin(turn), 6)))
    points.append(end)
    return points


def quadrant_centre(
    start: Point, end: Point, offsets: Point, *, clockwise: bool
) -> tuple[Point, bool]:
    """Centre of a single-quadrant arc (G74), whose offsets come without their signs.

    Returns
    -------
    The centre, mm, and whether an arc of at most a quarter turn fits it.
    """
    best: tuple[float, Point] | None = None
    fallback: tuple[float, Point] | None = None
    for sign_x, sign_y in ((1, 1), (1, -1), (-1, 1), (-1, -1)):
        centre = (start[0] + sign_x * abs(offsets[0]), start[1] + sign_y * abs(offsets[1]))
        miss = abs(
            hypot(start[0] - centre[0], start[1] - centre[1])
            - hypot(end[0] - centre[0], end[1] - centre[1])
        )
        # A quarter turn and a little: ends are rounded to the file's own grid.
        quarter = sweep_rad(start, end, centre, clockwise=clockwise) <= pi / 2 + 0.02
        if quarter and (best is None or miss < best[0]):
            best = (miss, centre)
        if fallback is None or miss < fallback[0]:
            fallback = (miss, centre)
    if best is not None:
        return best[1], True
    assert fallback is not None
    return fallback[1], False


def as_ring(points: Floats) -> Sequence[Point]:
    """Corners rounded to the 1 nm grid, as tuples."""
    return [tuple(p) for p in np.round(points, 6).tolist()]
