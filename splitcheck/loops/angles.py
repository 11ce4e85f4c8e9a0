"""Points on copper in, their directions from the panels out, as angles continuous in each gap."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import NamedTuple, TypeAlias

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Polygon
from shapely.ops import split

from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

_RAYS = 24
#: Rays and cuts are laid askew by this (rad, or part of their length), so that none runs along a
#: rim: boards are drawn in multiples of 15 degrees.
_ASKEW = 0.0123


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
        rings = shapely.get_rings(gap)[1:]
        west, south, east, north = shapely.bounds(rings).reshape(-1, 4).T[:, :, None]
        x, y = points.T
        within = (x > west) & (x < east) & (y > south) & (y < north)
        for k in np.flatnonzero(within.any(axis=1)):
            inside = shapely.contains_xy(Polygon(rings[k]), x, y)
            if inside.any():
                found.append((number, inside.astype(np.float64)))
    return found


#: Cuts already made: by gap and point, the cut and the pieces of the gap with their turns.
Known: TypeAlias = "dict[tuple[int, int], _Sides]"


class _Sides(NamedTuple):
    """A gap parted by a cut: whole turns on each piece, the largest piece first."""

    direction: float
    """Where the angle starts, rad; counts for points that the gap does not surround."""
    pieces: tuple[Polygon, ...]
    turns: Floats


def point_angles(
    panels: Panels,
    gaps: Sequence[Polygon],
    points: Floats,
    held: Sequence[tuple[int, Floats]],
    known: Known,
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
    known
        Cuts made for these gaps and points before; what is missing is added.

    Returns
    -------
    Angles at the centre of each panel, shape (k, n), rad, up to a constant for each gap.

    Notes
    -----
    Round a gap that surrounds a point its angle cannot come back to itself. But the currents that
    enter an island add up to zero, so that only differences between the points on one island
    count: there, the angle is given relative to the island's first point. Within the gap, an
    angle is followed from piece to piece over the cuts that a line from the point (to that first
    point, or else to where it meets the gap least) makes in it.
    """
    if not gaps:
        return np.zeros((len(points), len(panels)))
    shapes = np.array(gaps, dtype=object)
    shapely.prepare(shapes)
    bases = np.stack([_bases(points, number, held) for number in range(len(gaps))])
    outer = bases < 0
    direction = _directions(shapes, points, outer, known)
    inside, centre, gap = panels.inside, panels.centre, panels.gap
    away = inside - points[:, None, :]
    start = direction[gap].T
    angles: Floats = start + np.mod(np.arctan2(away[:, :, 1], away[:, :, 0]) - start, 2 * np.pi)
    angles += turned(points[:, None, :], inside, centre)
    angles[~outer[gap].T] = 0.0
    for number, k in np.argwhere(outer | (bases != np.arange(len(points)))).tolist():
        if outer[number, k]:
            # turning left over its ray an angle falls from a full turn to none
            if len(known[number, k].pieces) > 1:
                mine = np.flatnonzero(gap == number)
                angles[k, mine] += _turns(known[number, k], inside[mine])
            continue
        at, base = points[k], points[bases[number, k]]
        if (number, k) not in known:
            cut = LineString([at, _way_over(at, base), base])
            known[number, k] = _parted(gaps[number], cut, 0.0)
        mine = np.flatnonzero(gap == number)
        angles[k, mine] = _between(at, base, known[number, k], inside[mine], centre[mine])
    return angles


def _bases(points: Floats, gap: int, held: Sequence[tuple[int, Floats]]) -> Ints:
    """The first point on the same island of a gap, for each point; -1 if it is on none."""
    bases = np.full(len(points), -1)
    for owner, row in held:
        if owner == gap:
            bases[row > 0] = int(np.argmax(row))
    return bases


def _seen(first: Floats, second: Floats, r: Floats) -> Floats:
    """Angle from the first to the second of two points as seen from r, within (-pi, pi]."""
    a, b = first - r, second - r
    return np.arctan2(
        a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1]
    )


def _way_over(at: Floats, base: Floats) -> Floats:
    """A point askew between two others, so that a cut by it runs along no rim."""
    step = at - base
    middle: Floats = (at + base) / 2 + _ASKEW * np.array([-step[1], step[0]])
    return middle


def _between(at: Floats, base: Floats, sides: _Sides, inside: Floats, centre: Floats) -> Floats:
    """Angle from the base to the point, both on one island."""
    via = _way_over(at, base)
    angle = _seen(base, via, inside) + _seen(via, at, inside) + _turns(sides, inside)
    return angle + turned(at, inside, centre) - turned(base, inside, centre)


def turned(at: Floats, before: Floats, after: Floats) -> Floats:
    """By how much the direction from a point turns on a short way, within (-pi, pi]."""
    return _seen(before, after, at)


def _directions(
    gaps: NDArray[np.object_], points: Floats, outer: NDArray[np.bool_], known: Known
) -> Floats:
    """Where angles about points start that gaps do not surround: at the rays that meet them least.

    Returns shape (gaps, points), 0 for the others; `known` gains the cuts that the rays make.
    """
    number, which = np.nonzero(outer)
    keys = list(zip(number.tolist(), which.tolist(), strict=True))
    new = [n for n, key in enumerate(keys) if key not in known]
    if new:
        gap, at = gaps[number[new]], points[which[new]]
        west, south, east, north = shapely.bounds(gap).T
        out = at - np.stack([(west + east) / 2, (south + north) / 2], axis=1)
        start = np.arctan2(out[:, 1], out[:, 0]) + _ASKEW
        far = 2 * np.hypot(*out.T) + 2 * np.hypot(east - west, north - south)
        ends = at + far[:, None] * np.stack([np.cos(start), np.sin(start)], axis=1)
        blocked = shapely.intersects(gap, shapely.linestrings(np.stack([at, ends], axis=1)))
        for k, n in enumerate(new):
            known[keys[n]] = _Sides(float(start[k]), (gap[k],), np.zeros(1))
            if blocked[k]:
                ray, clear = _clearest_ray(gap[k], at[k], float(start[k]), float(far[k]))
                known[keys[n]] = _parted(gap[k], ray, clear)
    direction = np.zeros(outer.shape)
    direction[number, which] = [known[key].direction for key in keys]
    return direction


def _clearest_ray(gap: Polygon, at: Floats, start: float, far: float) -> tuple[LineString, float]:
    """A ray from the point that meets the gap least often, and its direction."""
    # between which two rays each corner of the rim lies; an edge crosses those between its ends
    away = shapely.get_coordinates(gap.exterior) - at
    angle = np.mod(np.arctan2(away[:, 1], away[:, 0]) - start, 2 * np.pi)
    sector = np.minimum((angle * (_RAYS / (2 * np.pi))).astype(np.int64), _RAYS - 1)
    (crossing,) = np.diff(sector).nonzero()
    ahead = np.diff(sector)[crossing]
    left = turned(np.zeros(2), away[crossing], away[crossing + 1]) > 0
    count = np.mod(np.where(left, ahead, -ahead), _RAYS)
    first = np.where(left, sector[crossing], sector[crossing + 1]) + 1
    which = np.repeat(first - np.cumsum(count) + count, count) + np.arange(count.sum())
    best = int(np.argmin(np.bincount(which % _RAYS, minlength=_RAYS)))
    direction = start + 2 * np.pi / _RAYS * best
    end = at + far * np.array([np.cos(direction), np.sin(direction)])
    return LineString([at, end]), float(direction)


def _parted(gap: Polygon, cut: LineString, direction: float) -> _Sides:
    """Part a gap by a cut, where an angle falls by one turn to its left."""
    if not shapely.intersects(gap, cut):
        return _Sides(direction, (gap,), np.zeros(1))
    parts = [part for part in split(gap, cut).geoms if isinstance(part, Polygon)]
    pieces = sorted(parts, key=lambda piece: -piece.area)
    if len(pieces) < 2:
        return _Sides(direction, (gap,), np.zeros(1))
    for piece in pieces:
        shapely.prepare(piece)
    return _Sides(direction, tuple(pieces), _walked(len(pieces), _steps(gap, cut, pieces)))


def _turns(sides: _Sides, spots: Floats) -> Floats:
    """Whole turns to add at points of a gap, rad."""
    turns = np.full(len(spots), sides.turns[0])
    for piece, own in zip(sides.pieces[1:], sides.turns[1:], strict=True):
        turns[shapely.contains_xy(piece, spots[:, 0], spots[:, 1])] = own
    return 2 * np.pi * turns


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
