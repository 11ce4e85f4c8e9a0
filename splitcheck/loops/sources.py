"""Traces and vias in, their source functions on the panels out, continuous within each gap."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from itertools import pairwise

import numpy as np
import shapely
from numpy.polynomial.legendre import leggauss
from shapely import LineString, Polygon
from shapely.ops import split

from splitcheck.loops.kernels import wall_source
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

_RAYS = 24
#: Panels further than this many widths (or half heights) from a trace see it as one line.
_CLOSE = 4.0
#: Rays and cuts are laid askew by this (rad, or part of their length), so that none runs along a
#: rim: boards are drawn in multiples of 15 degrees.
_ASKEW = 0.0123


def strip_source(
    panels: Panels,
    line: Floats,
    width_mm: float,
    height_mm: float,
    above_mm: float | None,
    between: Floats,
) -> tuple[Floats, Floats]:
    """Source function of a trace of finite width, as its mean over each panel.

    Parameters
    ----------
    panels
        The panels, shape (n,).
    line
        Centre line, shape (p, 2), mm; both ends over copper.
    width_mm
        Width over which the current is spread evenly, mm, >= 0.
    height_mm
        Height over the plane, mm, > 0.
    above_mm
        Distance of a plane on the trace's side, mm, or None.
    between
        Angle between the two ends of the trace seen from the points of the panels, continuous in
        each gap (`point_angles` of the last point less that of the first), shape (n, 4), rad.

    Returns
    -------
    Source of the strip and that of its centre line alone, shape (n,) each.

    Notes
    -----
    The strip is a bundle of filaments that leave from one point and end in one point, so that all
    of them enclose the same copper. Each filament's f jumps on its own line by its share s, and so
    does s A/2 pi, with A the angle that the filament is seen under: the difference is smooth. The
    angle between the ends, followed continuously through the gap, takes the place of A.
    """
    share = 1.0 if above_mm is None else 1.0 - height_mm / above_mm
    straight = np.concatenate([line[:-1], line[1:]], axis=1)

    def smooth(spots: Floats, segments: Floats, weights: Floats) -> Floats:
        value, seen = wall_source(spots[:, 0], spots[:, 1], segments, height_mm, above_mm)
        total: Floats = (value - share / (2 * np.pi) * seen) @ weights
        return total

    mean = share / (2 * np.pi) * between.mean(axis=1)
    centre = mean + smooth(panels.centre, straight, np.ones(len(straight)))
    strip = centre.copy()
    scale = max(width_mm, height_mm / 2)
    near = _distance(panels.centre, straight) < _CLOSE * scale + 2 * panels.radius
    if near.any():
        spots = panels.points[near].reshape(-1, 2)
        places, weights = _filaments(width_mm, height_mm)
        paths = [_beside(line, float(place)) for place in places]
        bundle = np.concatenate([np.concatenate([p[:-1], p[1:]], axis=1) for p in paths])
        each = np.repeat(weights, [len(path) - 1 for path in paths])
        strip[near] = mean[near] + smooth(spots, bundle, each).reshape(-1, 4).mean(axis=1)
        thin = smooth(spots, straight, np.ones(len(straight)))
        centre[near] = mean[near] + thin.reshape(-1, 4).mean(axis=1)
    return strip, centre


def _distance(spots: Floats, segments: Floats) -> Floats:
    """Distance of points from the nearest of some stretches."""
    x1, y1, x2, y2 = segments.T
    dx, dy = x2 - x1, y2 - y1
    from_x, from_y = spots[:, None, 0] - x1, spots[:, None, 1] - y1
    place = np.clip((from_x * dx + from_y * dy) / (dx * dx + dy * dy), 0.0, 1.0)
    nearest: Floats = np.hypot(from_x - place * dx, from_y - place * dy).min(axis=1)
    return nearest


@cache
def _filaments(width_mm: float, height_mm: float) -> tuple[Floats, Floats]:
    """Gauss points across the width: more for traces wide against their height."""
    if width_mm < 0.02 * height_mm:
        return np.zeros(1), np.ones(1)
    nodes, weights = leggauss(int(min(3 + width_mm / height_mm, 9)))
    return nodes * width_mm / 2, weights / 2


def _beside(line: Floats, offset_mm: float) -> Floats:
    """Run beside a polyline at a signed distance to the left, from its first to its last point."""
    if offset_mm == 0.0:
        return line
    step = np.diff(line, axis=0)
    step /= np.hypot(step[:, 0], step[:, 1])[:, None]
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1)
    before, after = np.concatenate([normal[:1], normal]), np.concatenate([normal, normal[-1:]])
    # mitred corners; a hairpin would throw its corner to infinity, so the mitre is held to 2
    mitre = (before + after) / np.maximum(1 + (before * after).sum(axis=1), 0.5)[:, None]
    beside: Floats = np.concatenate([line[:1], line + offset_mm * mitre, line[-1:]])
    return beside


def islands(gaps: Sequence[Polygon], points: Floats) -> list[tuple[int, Floats]]:
    """Which islands, surrounded by a gap, hold which points.

    Parameters
    ----------
    gaps
        Gaps with the islands as their holes.
    points
        Points on copper, shape (k, 2), mm.

    Returns
    -------
    For each hole that holds at least one of the points: the number of its gap, and which points
    it holds, shape (k,), 1 or 0.
    """
    found = []
    for number, gap in enumerate(gaps):
        for ring in gap.interiors:
            inside = shapely.contains_xy(Polygon(ring), points[:, 0], points[:, 1])
            if inside.any():
                found.append((number, inside.astype(np.float64)))
    return found


def point_angles(
    panels: Panels, gaps: Sequence[Polygon], points: Floats, held: list[tuple[int, Floats]]
) -> Floats:
    """Direction from points on copper to the panels, as angles continuous within each gap.

    Parameters
    ----------
    panels, gaps
        The panels, and the gaps they were cut from.
    points
        Points on copper, shape (k, 2), mm.
    held
        What `islands` found for these points.

    Returns
    -------
    Angles at the four points of each panel, shape (k, n, 4), rad, up to a constant for each gap.

    Notes
    -----
    Round a gap that surrounds a point its angle cannot come back to itself. But the currents that
    enter an island add up to zero, so that only differences between the points on one island
    count: there, the angle is given relative to the island's first point. Within the gap, an
    angle is followed from piece to piece over the cuts that a line from the point (to that first
    point, or else to where it meets the gap least) makes in it.
    """
    angles = np.zeros((len(points), len(panels), 4))
    for number, gap in enumerate(gaps):
        mine = np.flatnonzero(panels.gap == number)
        shapely.prepare(gap)
        for k, at in enumerate(points):
            base = next(
                (int(np.argmax(row)) for owner, row in held if owner == number and row[k]), None
            )
            if base is None:
                angles[k, mine] = _from_outside(gap, at, panels, mine)
            elif base != k:
                angles[k, mine] = _between(gap, at, points[base], panels, mine)
    return angles


def _seen(first: Floats, second: Floats, r: Floats) -> Floats:
    """Angle from the first to the second of two points as seen from r, within (-pi, pi]."""
    a, b = first - r, second - r
    return np.arctan2(
        a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1]
    )


def _followed(gap: Polygon, cut: LineString, angle: Floats, inside: Floats) -> Floats:
    """Add whole turns to an angle that jumps on a line, and spread it to the panels' points."""
    if shapely.intersects(gap, cut):
        return angle + 2 * np.pi * _turns(gap, cut, inside)
    return angle


def _between(gap: Polygon, at: Floats, base: Floats, panels: Panels, mine: Ints) -> Floats:
    """Angle from the base to the point, both on one island."""
    step = at - base
    via = (at + base) / 2 + _ASKEW * np.array([-step[1], step[0]])
    inside = panels.inside[mine]
    angle = _seen(base, via, inside) + _seen(via, at, inside)
    angle = _followed(gap, LineString([at, via, base]), angle, inside)
    spot, middle = panels.points[mine], inside[:, None, :]
    return angle[:, None] + _turned(at, middle, spot) - _turned(base, middle, spot)


def _turned(at: Floats, before: Floats, after: Floats) -> Floats:
    """By how much the direction from a point turns on a short way."""
    a, b = before - at, after - at
    return np.arctan2(
        a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1]
    )


def _from_outside(gap: Polygon, at: Floats, panels: Panels, mine: Ints) -> Floats:
    """Angle about a point that the gap does not surround."""
    ray, direction = _clearest_ray(gap, at)
    inside = panels.inside[mine]
    away = inside - at
    angle = direction + np.mod(np.arctan2(away[:, 1], away[:, 0]) - direction, 2 * np.pi)
    if ray is not None:
        # turning left over the ray the angle falls from a full turn to none
        angle = angle + 2 * np.pi * _turns(gap, ray, inside)
    return angle[:, None] + _turned(at, inside[:, None, :], panels.points[mine])


def _clearest_ray(gap: Polygon, at: Floats) -> tuple[LineString | None, float]:
    """A direction in which a ray from the point meets the gap least often; None if not at all."""
    west, south, east, north = gap.bounds
    corners = np.array([[west, south], [east, south], [east, north], [west, north]])
    far = 2.0 * float(np.hypot(*(corners - at).T).max()) + 1.0
    start = float(np.arctan2(*(at - corners.mean(axis=0))[::-1])) + _ASKEW
    directions = start + 2 * np.pi / _RAYS * np.arange(_RAYS)
    ends = at + far * np.stack([np.cos(directions), np.sin(directions)], axis=1)
    if not shapely.intersects(gap, LineString([at, ends[0]])):
        return None, float(directions[0])
    rays = np.array([LineString([at, end]) for end in ends], dtype=object)
    free = np.flatnonzero(~shapely.intersects(gap, rays))
    if len(free):
        return None, float(directions[free[0]])
    met = shapely.get_num_geometries(shapely.intersection(gap.exterior, rays))
    best = int(np.argmin(met))
    return rays[best], float(directions[best])


def _turns(gap: Polygon, cut: LineString, centres: Floats) -> Floats:
    """Whole turns to add on each side of a cut, where the angle falls by one to its left."""
    parts = [part for part in split(gap, cut).geoms if isinstance(part, Polygon)]
    pieces = sorted(parts, key=lambda piece: -piece.area)
    if len(pieces) < 2:
        return np.zeros(len(centres))
    number = _walked(len(pieces), _steps(gap, cut, pieces))
    turns = np.full(len(centres), number[0])
    for piece, own in zip(pieces[1:], number[1:], strict=True):
        shapely.prepare(piece)
        turns[shapely.contains_xy(piece, centres[:, 0], centres[:, 1])] = own
    return turns


def _steps(gap: Polygon, cut: LineString, pieces: Sequence[Polygon]) -> list[tuple[int, int]]:
    """Pairs of pieces that meet on the cut: right of it first, then left."""
    steps: list[tuple[int, int]] = []
    # cuts cross rims, so that rim points and bends part them into stretches in and out of the gap
    met = shapely.get_coordinates(shapely.intersection(shapely.boundary(gap), cut))
    places = {shapely.line_locate_point(cut, shapely.points(spot)) for spot in met}
    bends = np.cumsum([0.0, *np.hypot(*np.diff(cut.coords, axis=0).T)])
    stops = sorted({*(float(place) for place in places), *bends.tolist()})
    for start, end in pairwise(stops):
        if end - start < 1e-9:
            continue
        middle = np.array(cut.interpolate((start + end) / 2).coords[0])
        if not shapely.contains_xy(gap, *middle):
            continue
        ahead = np.array(cut.interpolate(end).coords[0]) - middle
        normal = np.array([-ahead[1], ahead[0]]) / np.hypot(*ahead)
        aside = min(1e-6, (end - start) / 100) * normal
        right, left = (_piece_at(pieces, spot) for spot in (middle - aside, middle + aside))
        if right != left:
            steps.append((right, left))
    return steps


def _piece_at(pieces: Sequence[Polygon], spot: Floats) -> int:
    """The piece that holds a point; the first and largest if rounding puts it in none."""
    for number in range(len(pieces) - 1, 0, -1):
        if shapely.contains_xy(pieces[number], *spot):
            return number
    return 0


def _walked(count: int, steps: Sequence[tuple[int, int]]) -> Floats:
    """Number the pieces, one more for each step to the left; the first piece is number 0."""
    number: dict[int, int] = {}
    for seed in range(count):
        queue = [] if seed in number else [seed]
        number.setdefault(seed, 0)
        while queue:
            here = queue.pop()
            for right, left in steps:
                for near, other, change in ((right, left, 1), (left, right, -1)):
                    if near == here and other not in number:
                        number[other] = number[here] + change
                        queue.append(other)
    return np.array([number[piece] for piece in range(count)], dtype=np.float64)
