"""Shortest ways on copper round gaps: taut strings over a visibility graph."""

from __future__ import annotations

import heapq
from collections.abc import Sequence
from math import inf

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Polygon

from splitcheck.copper.marks import Point
from splitcheck.loops.terrain import Terrain
from splitcheck.planes.islands import box_size_mm
from splitcheck.planes.tracks import Ints
from splitcheck.units import Floats, segments

#: Ways keep this far off the gaps they go round, mm, and farther where corners are very many.
CLEAR_MM = (0.01, 0.05, 0.2, 0.8)
#: More corners than this in reach: thin the gaps more coarsely.
MOST_CORNERS = 330
#: Each ellipse in which a way is looked for reaches this much farther than the one before.
WIDER = 2.5
#: The corners of a crossed gap up to this size are all looked at from the start, mm.
SMALL_DETOUR_MM = 12.0


def shortest(
    terrain: Terrain,
    start: Point,
    goal: Point,
    barrier: LineString | None = None,
    first: Sequence[int] = (),
    longest_mm: float = inf,
    least_mm: float = 0.0,
) -> tuple[float, tuple[Point, ...]] | None:
    """Shortest way on copper between two points of one island.

    Parameters
    ----------
    terrain
        The plane's gaps as obstacles.
    start, goal
        Points on copper, mm.
    barrier
        A line that the way must not cross.
    first
        Indexes of gaps whose corners are needed from the start, where a barrier stands.
    longest_mm
        A way longer than this is not looked for, mm.
    least_mm
        No way is shorter than this, mm.

    Returns
    -------
    Length in mm and the corners of the way, or None if there is no way.

    Notes
    -----
    A taut way bends only at corners of gaps. Gaps are taken up one after the other as a way is
    found to run through them: a way that is shortest among some obstacles and free of all is
    shortest of all. Corners are first looked for inside an ellipse round the two points; a way no
    longer than the ellipse's reach cannot be beaten by one that leaves it.

    References
    ----------
    Visibility graphs: Lozano-Perez and Wesley, CACM 22 (1979), p. 560 (from memory).
    """
    straight = float(np.hypot(goal[0] - start[0], goal[1] - start[1]))
    x0, y0, x1, y1 = terrain.plane.gaps[0].shape.bounds if terrain.plane.gaps else (0, 0, 0, 0)
    widest = straight + 4 * (x1 - x0 + y1 - y0) + 1.0
    widest = min(widest, longest_mm)
    limit = 2 * straight + 2.0
    for gap in first:  # a small gap is gone round at once, whatever the way
        size = box_size_mm(terrain.plane.gaps[gap].shape)
        if size < SMALL_DETOUR_MM:
            limit = max(limit, straight + 4 * size)
    while limit < min(least_mm, widest):
        limit *= WIDER
    coarse = 0
    while True:
        tried = _within(terrain, start, goal, barrier, min(limit, widest), CLEAR_MM[coarse], first)
        if tried == "crowded":
            if coarse + 1 == len(CLEAR_MM):
                return None
            coarse += 1
            if coarse + 1 == len(CLEAR_MM):  # few corners are left: look everywhere at once
                limit = widest
            continue
        if isinstance(tried, tuple) and (tried[0] <= limit or limit >= widest):
            return tried if tried[0] <= longest_mm else None
        if limit >= widest:
            return None
        limit *= WIDER


def _within(
    terrain: Terrain,
    start: Point,
    goal: Point,
    barrier: LineString | None,
    limit: float,
    clear_mm: float,
    first: Sequence[int],
) -> tuple[float, tuple[Point, ...]] | str | None:
    obstacles = list(first)
    ends = np.repeat(np.array([start, goal], dtype=float)[:, None, :], 3, axis=1)
    middle, half = ends[:, 0].mean(axis=0), limit / 2
    box = (*(middle - half).tolist(), *(middle + half).tolist())
    corners, count = [ends], 2
    fresh = obstacles
    for _ in range(60):
        for gap in fresh:
            for bends in terrain.corners(gap, clear_mm, box):
                if not len(bends):
                    continue
                x, y = bends[:, 0, 0], bends[:, 0, 1]
                far = np.hypot(x - start[0], y - start[1]) + np.hypot(x - goal[0], y - goal[1])
                near = far <= limit
                if near.any():
                    corners.append(bends[near])
                    count += len(corners[-1])
                if count > MOST_CORNERS:
                    return "crowded"
        blocks = [terrain.shape(gap) for gap in obstacles]
        found = _taut(np.concatenate(corners), blocks, barrier, limit)
        if found is None:
            return None
        line = LineString(found[1])
        fresh = [gap for gap in terrain.crossed(line) if gap not in obstacles]
        if not fresh:
            return found
        obstacles.extend(fresh)
    return None


def _taut(
    bends: Floats, blocks: Sequence[Polygon], barrier: LineString | None, limit: float
) -> tuple[float, tuple[Point, ...]] | None:
    """A* over the bends, the first being the start and the second the goal.

    A taut string leaves a corner so that both sides of the corner lie on one side of it: only such
    steps are looked at, and only on ways no longer than the limit.
    """
    points = bends[:, 0].copy()
    x, y = points.T.copy()
    sides = (bends[:, 1:] - bends[:, :1]).transpose(1, 2, 0).copy()
    ahead = np.hypot(x - x[1], y - y[1])
    reached = np.minimum(limit - ahead + 1e-9, inf)
    came = np.full(len(points), -1)
    reached[0] = 0.0
    queue: list[tuple[float, int]] = [(float(ahead[0]), 0)]
    done = np.zeros(len(points), dtype=bool)
    while queue:
        _, here = heapq.heappop(queue)
        if done[here]:
            continue
        if here == 1:
            return float(reached[1]), _backwards(points, came)
        done[here] = True
        dx, dy = x - x[here], y - y[here]
        along = reached[here] + np.hypot(dx, dy)
        better = along < reached - 1e-12
        if here > 1:  # from the start, nearer the rim than the corners, any step may be taut
            taut = _touches(dx, dy, sides, here)
            taut[1] = True
            better &= taut
        (chosen,) = better.nonzero()
        if not len(chosen):
            continue
        chosen = chosen[_free(points[here], points[chosen], blocks, barrier)]
        reached[chosen] = along[chosen]
        came[chosen] = here
        for cost, other in zip((along + ahead)[chosen].tolist(), chosen.tolist(), strict=True):
            heapq.heappush(queue, (cost, other))
    return None


def _touches(dx: Floats, dy: Floats, sides: Floats, here: int) -> NDArray[np.bool_]:
    """Whether straight steps from one corner to all others touch both as a string does.

    ``sides`` holds the steps from each corner to those before and after it, shape (2, 2, n).
    """
    (ax, ay), (bx, by) = sides
    leaves = (dx * ay[here] - dy * ax[here]) * (dx * by[here] - dy * bx[here])
    meets = (dx * ay - dy * ax) * (dx * by - dy * bx)
    slack = -1e-15 * (1.0 + dx * dx + dy * dy)
    return np.asarray((leaves >= slack) & (meets >= slack))


def _free(
    here: Floats, there: Floats, blocks: Sequence[Polygon], barrier: LineString | None
) -> NDArray[np.bool_]:
    """Which straight steps run into nothing."""
    ends = np.empty((len(there), 2, 2))
    ends[:, 0], ends[:, 1] = here, there
    lines = segments(ends)
    left = np.arange(len(there))
    for block in blocks if barrier is None else (barrier, *blocks):
        left = left[~shapely.intersects(block, lines[left])]
        if not len(left):
            break
    free = np.zeros(len(there), dtype=np.bool_)
    free[left] = True
    return free


def _backwards(points: Floats, came: Ints) -> tuple[Point, ...]:
    at, path = 1, []
    while at >= 0:
        path.append((float(points[at, 0]), float(points[at, 1])))
        at = int(came[at])
    return tuple(reversed(path))
