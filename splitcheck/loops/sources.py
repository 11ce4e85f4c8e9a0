"""Traces and vias in, their source functions on the panels out, continuous within each gap."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.polynomial.legendre import leggauss
from shapely import LineString, Point, Polygon
from shapely.ops import split

from splitcheck.loops.kernels import wall_source
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

_RAYS = 24


def strip_source(
    panels: Panels,
    gaps: Sequence[Polygon],
    line: Floats,
    width_mm: float,
    height_mm: float,
    above_mm: float | None,
) -> tuple[Floats, Floats]:
    """Source function of a trace of finite width, as its mean over each panel.

    Parameters
    ----------
    panels, gaps
        The panels, and the gaps they were cut from.
    line
        Centre line, shape (p, 2), mm; both ends over copper.
    width_mm
        Width over which the current is spread evenly, mm, >= 0.
    height_mm
        Height over the plane, mm, > 0.
    above_mm
        Distance of a plane on the trace's side, mm, or None.

    Returns
    -------
    Source of the strip and that of its centre line alone, shape (n,) each.

    Notes
    -----
    The strip is a bundle of filaments that leave from one point and end in one point, so that all
    of them enclose the same copper. Each filament's f jumps on its own line; inside a gap it is
    made continuous by the whole number n = (Theta - A)/2 pi, with A the angle that the filament is
    seen under (it jumps on the same line) and Theta the angle between its ends, followed
    continuously through the gap.
    """
    x, y = panels.points[:, :, 0].ravel(), panels.points[:, :, 1].ravel()
    theta = point_angle(panels, gaps, line[-1]) - point_angle(panels, gaps, line[0])
    share = 1.0 if above_mm is None else 1.0 - height_mm / above_mm
    places, weights = _filaments(width_mm, height_mm)

    def filament(offset_mm: float) -> Floats:
        path = _beside(line, offset_mm)
        segments = np.concatenate([path[:-1], path[1:]], axis=1)
        value, seen = wall_source(x, y, segments, height_mm, above_mm)
        number = np.round((theta.ravel() - seen) / (2 * np.pi))
        mean: Floats = (value + share * number).reshape(-1, 4).mean(axis=1)
        return mean

    centre = filament(0.0)
    if not len(places):
        return centre, centre
    strip = sum(
        (w * filament(o) for o, w in zip(places, weights, strict=True)), np.zeros_like(centre)
    )
    return strip, centre


def _filaments(width_mm: float, height_mm: float) -> tuple[Floats, Floats]:
    """Gauss points across the width: more for traces wide against their height."""
    if width_mm < 0.02 * height_mm:
        return np.zeros(0), np.zeros(0)
    count = int(min(3 + width_mm / height_mm, 9))
    nodes, weights = leggauss(count)
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
    moved = line + offset_mm * mitre
    return np.concatenate([line[:1], moved, line[-1:]])


def point_angle(panels: Panels, gaps: Sequence[Polygon], at: Floats) -> Floats:
    """Angle of the direction from a point to the panels, continuous within each gap.

    Parameters
    ----------
    panels, gaps
        The panels, and the gaps they were cut from.
    at
        A point on copper, shape (2,), mm.

    Returns
    -------
    Angle at the four points of each panel, shape (n, 4), rad, up to a constant for each gap.
    Round a gap that surrounds the point the angle cannot come back to itself; it then jumps by
    2 pi somewhere, which is for the caller to rule out (see `encloses`).
    """
    away = panels.centre - at
    base = np.arctan2(away[:, 1], away[:, 0])
    for number, gap in enumerate(gaps):
        mine = np.flatnonzero(panels.gap == number)
        ray, direction = _clearest_ray(gap, at)
        angle = direction + np.mod(base[mine] - direction, 2 * np.pi)
        if ray is not None:
            angle += 2 * np.pi * _windings(gap, ray, panels.centre[mine])
        base[mine] = angle
    turn = panels.points - at
    cross = away[:, None, 0] * turn[:, :, 1] - away[:, None, 1] * turn[:, :, 0]
    return base[:, None] + np.arctan2(cross, (away[:, None, :] * turn).sum(axis=2))


def _clearest_ray(gap: Polygon, at: Floats) -> tuple[LineString | None, float]:
    """A direction in which a ray from the point meets the gap least often; None if not at all."""
    west, south, east, north = gap.bounds
    far = 2 * float(np.hypot(max(abs(west - at[0]), abs(east - at[0])),
                             max(abs(south - at[1]), abs(north - at[1])))) + 1.0
    middle = np.array([(west + east) / 2, (south + north) / 2])
    # not a multiple of anything that boards are drawn in, so that no ray runs along an edge
    start = float(np.arctan2(*(at - middle)[::-1])) + 0.01234
    directions = start + 2 * np.pi / _RAYS * np.arange(_RAYS)
    ends = at + far * np.stack([np.cos(directions), np.sin(directions)], axis=1)
    if gap.distance(Point(at)) > 0:
        first = LineString([at, ends[0]])
        if not shapely.intersects(gap, first):
            return None, float(directions[0])
    rays = shapely.linestrings(np.stack([np.broadcast_to(at, ends.shape), ends], axis=1))
    met = shapely.get_num_geometries(shapely.intersection(gap, rays))
    empty = ~shapely.intersects(gap, rays)
    met = np.where(empty, 0, met)
    best = int(np.argmin(met))
    return (None if met[best] == 0 else rays[best]), float(directions[best])


def _windings(gap: Polygon, ray: LineString, centres: Floats) -> Floats:
    """Whole turns to add on each side of a ray so that the angle is continuous in the gap."""
    pieces = list(split(gap, ray).geoms)
    if len(pieces) < 2:
        return np.zeros(len(centres))
    number = _walked(pieces, _steps(gap, ray, pieces))
    tree = shapely.STRtree(pieces)
    nearest = tree.nearest(shapely.points(centres))
    return number[nearest]


def _steps(
    gap: Polygon, ray: LineString, pieces: Sequence[Polygon]
) -> list[tuple[int, int]]:
    """Pairs of pieces that meet on the ray: first the one before it, turning to the left."""
    (x0, y0), (x1, y1) = ray.coords[0], ray.coords[-1]
    length = np.hypot(x1 - x0, y1 - y0)
    normal = np.array([-(y1 - y0), x1 - x0]) / length
    steps: list[tuple[int, int]] = []
    tree = shapely.STRtree(pieces)
    for part in shapely.get_parts(gap.intersection(ray)):
        if part.length == 0:
            continue
        middle = shapely.get_coordinates(part.interpolate(0.5, normalized=True))[0]
        aside = min(1e-6, part.length / 100) * normal
        before, after = tree.nearest(shapely.points([middle - aside, middle + aside]))
        if before != after:
            steps.append((int(before), int(after)))
    return steps


def _walked(pieces: Sequence[Polygon], steps: Sequence[tuple[int, int]]) -> Floats:
    """Number the pieces: crossing the ray to its left the angle restarts at 0, one turn short."""
    number: dict[int, int] = {}
    for seed in range(len(pieces)):
        if seed in number:
            continue
        number[seed] = 0
        queue = [seed]
        while queue:
            here = queue.pop()
            for before, after in steps:
                for near, other, change in ((before, after, 1), (after, before, -1)):
                    if near == here and other not in number:
                        number[other] = number[here] + change
                        queue.append(other)
    return np.array([number[i] for i in range(len(pieces))], dtype=np.float64)


def encloses(gaps: Sequence[Polygon], points: Floats) -> Floats:
    """Which islands, surrounded by a gap, hold which points.

    Parameters
    ----------
    gaps
        Gaps with the islands as their holes.
    points
        Points on copper, shape (k, 2), mm.

    Returns
    -------
    One row for each hole that holds at least one of the points, shape (holes, k), 1 or 0.
    """
    rows = []
    for gap in gaps:
        for ring in gap.interiors:
            inside = shapely.contains_xy(Polygon(ring), points[:, 0], points[:, 1])
            if inside.any():
                rows.append(inside.astype(np.float64))
    return np.array(rows).reshape(-1, len(points))
