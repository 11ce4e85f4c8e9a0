"""Shortest ways on copper round gaps: taut strings over a visibility graph."""

from __future__ import annotations

import heapq
from bisect import bisect_right
from collections.abc import Sequence
from math import inf
from typing import Literal, NamedTuple, TypeAlias

import numpy as np
import shapely
from shapely import LineString

from splitcheck.copper.marks import Point
from splitcheck.loops.sights import Patch, Step
from splitcheck.loops.terrain import Terrain
from splitcheck.planes.islands import box_size_mm
from splitcheck.units import Floats, segments

#: Ways keep this far off the gaps they go round, mm, and farther where corners are very many.
CLEAR_MM = (0.01, 0.05, 0.2, 0.8)
#: More corners than this in reach: thin the gaps more coarsely.
MOST_CORNERS = 330
#: Each ellipse in which a way is looked for reaches this much farther than the one before.
WIDER = 2.5
#: The corners of a crossed gap up to this size are all looked at from the start, mm.
SMALL_DETOUR_MM = 12.0
#: So many steps from the start are tried first, those that could make a way short before others.
FIRST_STEPS = 8
#: Nearer to a barrier's line than the first, or to its end than the second, exact arithmetic says
#: whether a step crosses it, mm.
DOUBT_MM = 1e-6
DOUBT_AT_END_MM = 1e-4

#: Length in mm and corners of a way.
Found: TypeAlias = tuple[float, tuple[Point, ...]]


def shortest(
    terrain: Terrain,
    start: Point,
    goal: Point,
    barrier: LineString | None = None,
    first: Sequence[int] = (),
    longest_mm: float = inf,
    least_mm: float = 0.0,
) -> Found | None:
    """Shortest way on copper between two points of one island.

    Parameters
    ----------
    terrain
        The plane's gaps as obstacles.
    start, goal
        Points on copper, mm.
    barrier
        A straight line of two points that the way must not cross.
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
    search = _Search(terrain, start, goal, barrier)
    coarse = 0
    while True:
        limit, found = search.promising(limit, widest, CLEAR_MM[coarse], first)
        if limit == inf:
            return None
        tried = search.within(min(limit, widest), CLEAR_MM[coarse], first, found)
        if tried == "crowded":
            if coarse + 1 == len(CLEAR_MM):
                return None
            coarse += 1
            if coarse + 1 == len(CLEAR_MM):  # few corners are left: look everywhere at once
                limit = widest
            continue
        if tried is not None and (tried[0] <= limit or limit >= widest):
            return tried if tried[0] <= longest_mm else None
        if limit >= widest:
            return None
        limit *= WIDER


class _View(NamedTuple):
    """A patch as seen on the way between two points."""

    patch: Patch
    first: Floats
    """Distances of its corners from the start, mm."""
    ahead: Floats
    """Their distances from the goal, mm."""
    places: list[Point]
    """How far they lie to the left of the barrier's line, and along it, mm."""
    from_start: dict[int, Step]
    to_goal: dict[int, Step]


class _Search:
    """What is known of the surroundings of two points while a way between them is looked for."""

    def __init__(
        self, terrain: Terrain, start: Point, goal: Point, barrier: LineString | None
    ) -> None:
        self.terrain = terrain
        self.start = start
        self.goal = goal
        self.wall = None if barrier is None else _Wall(barrier)
        self._views: dict[Patch, _View] = {}
        self.straight = Step(float(np.hypot(start[0] - goal[0], start[1] - goal[1])), 1)
        self.ends = [] if self.wall is None else self.wall.places(np.array([start, goal]))

    def promising(
        self, limit: float, widest: float, clear_mm: float, first: Sequence[int]
    ) -> tuple[float, Found | None]:
        """The first ellipse in which there may be a way, from a given one on, and what is known.

        That is the way in it that heeds only the gaps that are gone round first. An ellipse of inf:
        there is no way in any.

        It is looked for in the widest ellipse whose corners are not too many: what is not found
        there need not be looked for in narrower ones.
        """
        if not first:
            return limit, None
        limits = [limit]
        while limits[-1] < widest:
            limits.append(limits[-1] * WIDER)
        last, patches = self._widest(limits, widest, clear_mm, first)
        if patches is None:
            return limit, None
        found = _Graph(self, patches, first).taut(min(limits[last], widest))
        if found is None:
            return (inf if limits[last] >= widest else limits[last + 1]), None
        return next(some for some in limits if some >= found[0] or some >= widest), found

    def _widest(
        self, limits: Sequence[float], widest: float, clear_mm: float, first: Sequence[int]
    ) -> tuple[int, list[Patch] | None]:
        """The last of some ellipses whose corners are not too many, and their patches."""
        if all(self.terrain.is_plain(gap) for gap in first):  # most have few corners in all
            patches = self.patches(first, clear_mm, widest)
            if patches is not None:
                return len(limits) - 1, patches
        last, best = 0, None
        for number, limit in enumerate(limits):
            patches = self.patches(first, clear_mm, min(limit, widest))
            if patches is None:
                break
            last, best = number, patches
        return last, best

    def patches(self, gaps: Sequence[int], clear_mm: float, limit: float) -> list[Patch] | None:
        """Patches of gaps with corners in an ellipse; None if those are too many."""
        middle, half = np.mean([self.start, self.goal], axis=0), limit / 2
        box = (*(middle - half).tolist(), *(middle + half).tolist())
        patches: list[Patch] = []
        count = 2
        for gap in gaps:
            for patch in self.terrain.patches(gap, clear_mm, box):
                view = self.view(patch)
                near = int(np.count_nonzero(view.first + view.ahead <= limit))
                if near:
                    patches.append(patch)
                    count += near
                if count > MOST_CORNERS:
                    return None
        return patches

    def within(
        self, limit: float, clear_mm: float, first: Sequence[int], found: Found | None
    ) -> Found | Literal["crowded"] | None:
        """The shortest way among the corners in an ellipse, free of all gaps.

        ``found`` is the way that heeds only the first gaps, if it is known.
        """
        obstacles = list(first)
        for _ in range(60):
            if found is None:
                patches = self.patches(obstacles, clear_mm, limit)
                if patches is None:
                    return "crowded"
                found = _Graph(self, patches, obstacles).taut(limit)
            if found is None:
                return None
            line = LineString(found[1])
            fresh = [gap for gap in self.terrain.crossed(line) if gap not in obstacles]
            if not fresh:
                return found
            obstacles.extend(fresh)
            found = None
        return None

    def view(self, patch: Patch) -> _View:
        """How a patch lies to the two points and the barrier."""
        view = self._views.get(patch)
        if view is None:
            x, y = patch.points.T
            first = np.hypot(x - self.start[0], y - self.start[1])
            ahead = np.hypot(x - self.goal[0], y - self.goal[1])
            places = [] if self.wall is None else self.wall.places(patch.points)
            view = self._views[patch] = _View(patch, first, ahead, places, {}, {})
        return view


class _Wall:
    """A barrier, and where points lie to it."""

    def __init__(self, line: LineString) -> None:
        self.line = line
        (self.x, self.y), (x1, y1) = line.coords
        dx, dy = x1 - self.x, y1 - self.y
        self.length = float(np.hypot(dx, dy))
        self.dx, self.dy = dx / self.length, dy / self.length

    def places(self, points: Floats) -> list[Point]:
        """How far points lie to the left of its line, and along it, mm."""
        x, y = points[:, 0] - self.x, points[:, 1] - self.y
        left, along = self.dx * y - self.dy * x, self.dx * x + self.dy * y
        return list(zip(left.tolist(), along.tolist(), strict=True))

    def crossed(self, one: Point, other: Point) -> bool | None:
        """Whether a step between two places as ``places`` has them crosses it; None: in doubt."""
        (left, along), (its_left, its_along) = one, other
        if (left > DOUBT_MM and its_left > DOUBT_MM) or (left < -DOUBT_MM and its_left < -DOUBT_MM):
            return False
        far = self.length + DOUBT_AT_END_MM
        if (along < -DOUBT_AT_END_MM and its_along < -DOUBT_AT_END_MM) or min(
            along, its_along
        ) > far:
            return False
        if abs(left) <= DOUBT_MM or abs(its_left) <= DOUBT_MM:
            return None
        at = (along * its_left - its_along * left) / (its_left - left)
        if at < -DOUBT_AT_END_MM or at > far:
            return False
        return True if DOUBT_AT_END_MM < at < self.length - DOUBT_AT_END_MM else None


class _Graph:
    """Corners of some patches, two points, and which steps between them are free of some gaps.

    Corners are numbered patch by patch, after the start, 0, and the goal, 1.
    """

    def __init__(self, search: _Search, patches: Sequence[Patch], obstacles: Sequence[int]) -> None:
        self.search = search
        self.patches = patches
        self.obstacles = tuple(obstacles)
        self.mask = sum(1 << gap for gap in obstacles)
        self.views = [search.view(patch) for patch in patches]
        self.starts = np.cumsum([2, *(len(patch) for patch in patches)]).tolist()
        straight = search.straight.length_mm
        self.first = np.concatenate([[0.0, straight], *(view.first for view in self.views)])
        self.ahead = np.concatenate([[straight, 0.0], *(view.ahead for view in self.views)])
        self.places: list[Point] = []
        if search.wall is not None:
            self.places = [*search.ends, *(at for view in self.views for at in view.places)]

    def taut(self, limit: float) -> Found | None:
        """A* from start to goal by taut steps, on ways no longer than a limit, mm."""
        through = self.first + self.ahead
        reached = np.where(through <= limit, limit - self.ahead + 1e-9, -inf)
        near = np.flatnonzero(self.first < reached - 1e-12)
        near = near[near > 0]
        near = near[np.argsort(through[near], kind="stable")]
        least = through[near].tolist()
        walk = _Walk(near.tolist(), self.ahead.tolist(), [0.0, *reached[1:].tolist()])
        while True:
            while walk.left < len(near) and (
                not walk.queue or least[walk.left] <= walk.queue[0][0] + 1e-9
            ):  # the start's own steps are tried in the order in which they can lead on
                self._leave(walk)
            if not walk.queue:
                return None
            _, here = heapq.heappop(walk.queue)
            if here == 1:
                return walk.reached[1], self._backwards(walk.came)
            if not walk.done[here]:
                walk.done[here] = True
                self._go_on(here, walk)

    def _leave(self, walk: _Walk) -> None:
        """Try steps from the start. Nearer the rim than the corners, any step may be taut."""
        steps = []
        for there in walk.near[walk.left : walk.left + walk.some]:
            step = self.search.straight
            if there > 1:
                view, corner = self._at(there)
                if corner not in view.from_start:
                    view.from_start[corner] = Step(float(self.first[there]), corner)
                step = view.from_start[corner]
            if not (step.blocked & self.mask or walk.done[there] or self._walled(0, there)):
                steps.append((step, 0, there))
        walk.left, walk.some = walk.left + walk.some, 2 * walk.some
        for step, _, there in self._free(steps):
            # the straight way is the shortest: it stands for others as long to within rounding
            walk.reach(there, 0, step.length_mm)

    def _go_on(self, here: int, walk: _Walk) -> None:
        """Try the taut steps from a corner, and that to the goal."""
        reached, mask, so_far = walk.reached, self.mask, walk.reached[here]
        straight = so_far + walk.ahead[here]
        if straight < reached[1] - 1e-12 and not self._walled(here, 1) and self._ends(here, walk):
            walk.reach(1, here, straight)
        view, corner = self._at(here)
        steps = []
        rows = self.search.terrain.steps(view.patch, corner, self.patches)
        for start, row in zip(self.starts, rows, strict=False):
            for step in row:
                there = start + step.to
                if (
                    so_far + step.length_mm < reached[there] - 1e-12
                    and not step.blocked & mask
                    and not self._walled(here, there)
                ):
                    steps.append((step, here, there))
        for step, _, there in self._free(steps):
            walk.reach(there, here, so_far + step.length_mm)

    def _ends(self, here: int, walk: _Walk) -> bool:
        """Whether nothing is between a corner and the goal: asked for some more corners at once."""
        step = self._to_goal(here)
        mask = self.mask
        if not (step.blocked & mask or step.free & mask == mask):
            steps = [(step, here, 1)]
            stop = walk.ended + walk.more
            for there in walk.near[walk.ended : stop]:
                if there > 1 and not self._walled(there, 1):
                    other = self._to_goal(there)
                    if other is not step and not other.blocked & mask:
                        steps.append((other, there, 1))
            walk.ended, walk.more = stop, 2 * walk.more
            self._free(steps)
        return not step.blocked & mask

    def _to_goal(self, here: int) -> Step:
        view, corner = self._at(here)
        if corner not in view.to_goal:
            view.to_goal[corner] = Step(float(self.ahead[here]), 1)
        return view.to_goal[corner]

    def _free(self, steps: list[tuple[Step, int, int]]) -> list[tuple[Step, int, int]]:
        """Those of steps from one place to another that run into no gap.

        What is not known of them is found out; no more is asked of one that is blocked.
        """
        mask = self.mask
        unsure = [row for row in steps if row[0].free & mask != mask]
        if not unsure:
            return steps
        ends = [(*self._point(here), *self._point(there)) for _, here, there in unsure]
        lines = segments(np.array(ends).reshape(-1, 2, 2))
        for gap in self.obstacles:
            bit = 1 << gap
            rows = [
                k
                for k, row in enumerate(unsure)
                if not (row[0].free & bit or row[0].blocked & mask)
            ]
            if not rows:
                continue
            met = shapely.intersects(self.search.terrain.shape(gap), lines[rows])
            for k, blocked in zip(rows, met.tolist(), strict=True):
                if blocked:
                    unsure[k][0].blocked |= bit
                else:
                    unsure[k][0].free |= bit
        return [row for row in steps if row[0].free & mask == mask]

    def _walled(self, here: int, there: int) -> bool:
        """Whether a step runs into the barrier."""
        wall = self.search.wall
        if wall is None:
            return False
        crossed = wall.crossed(self.places[here], self.places[there])
        if crossed is None:
            return bool(LineString([self._point(here), self._point(there)]).intersects(wall.line))
        return crossed

    def _at(self, number: int) -> tuple[_View, int]:
        """The patch and the number within it of a corner."""
        k = bisect_right(self.starts, number) - 1
        return self.views[k], number - self.starts[k]

    def _point(self, number: int) -> Point:
        if number < 2:
            return self.search.goal if number else self.search.start
        view, corner = self._at(number)
        x, y = view.patch.points[corner].tolist()
        return x, y

    def _backwards(self, came: Sequence[int]) -> tuple[Point, ...]:
        way = [1]
        while way[-1] != 0:
            way.append(came[way[-1]])
        return tuple(self._point(number) for number in reversed(way))


class _Walk:
    """How far a search has come."""

    def __init__(self, near: list[int], ahead: list[float], reached: list[float]) -> None:
        self.near = near
        """Corners in reach, those that could make a way short before others."""
        self.ahead = ahead
        """Distances from the goal, mm."""
        self.reached = reached
        """Shortest way to each corner so far, or the longest that could be of use, mm."""
        self.came = [-1] * len(ahead)
        self.done = [False] * len(ahead)
        self.queue: list[tuple[float, int]] = []
        self.left, self.some = 0, FIRST_STEPS
        self.ended, self.more = 0, FIRST_STEPS

    def reach(self, there: int, here: int, along: float) -> None:
        """Take a way to a corner by another one."""
        self.reached[there], self.came[there] = along, here
        heapq.heappush(self.queue, (along + self.ahead[there], there))
