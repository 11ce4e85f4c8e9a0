"""The way round for the return current: inside islands round their holes, and over bridges."""

from __future__ import annotations

import heapq
from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from math import inf
from typing import NamedTuple

import networkx as nx
import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, MultiPolygon, Polygon

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import IslandGraph, bridges_between
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane, box_size_mm
from splitcheck.planes.tracks import Ints
from splitcheck.units import Floats, segments

#: Ways keep this far off the gaps they go round, mm, and farther where corners are very many.
CLEAR_MM = (0.01, 0.05, 0.2, 0.8)
#: More corners than this in reach: thin the gaps more coarsely.
MOST_CORNERS = 300
#: So many bridges are looked at first from either end of a crossing, then three times as many.
FIRST_BRIDGES = 12
#: A way on the other side of the trace this many times longer than the best is not looked for.
OTHER_SIDE = 5.0
#: A straight leg to a bridge passes gaps up to this size, mm (antipads), and stops at larger ones.
SMALL_GAP_MM = 3.0
#: The corners of a crossed gap up to this size are all looked at from the start, mm.
SMALL_DETOUR_MM = 12.0


class Way(NamedTuple):
    """One way for the return current from the entry of a crossing to its exit."""

    length_mm: float
    path: tuple[Point, ...]
    bridges: tuple[Point, ...]
    """Places of the plated holes it goes through; empty if it stays on the plane."""
    bridge_net: str
    bridge_layer: int
    """Layer of the island it borrows; 0 if it stays on the plane."""


@dataclass(frozen=True, slots=True)
class Route:
    """How the return current gets round a gap."""

    straight_mm: float
    left: Way | None
    """Best way that passes the gap on the left of the trace; None if there is none."""
    right: Way | None
    joined: bool
    """Whether copper and plated holes join the two sides at all."""

    @property
    def best(self) -> Way | None:
        """The shorter of the two ways."""
        ways = [way for way in (self.left, self.right) if way is not None]
        return min(ways, key=lambda way: way.length_mm) if ways else None

    @property
    def detour_mm(self) -> float | None:
        """What the best way is longer than the straight one, mm."""
        best = self.best
        return None if best is None else max(best.length_mm - self.straight_mm, 0.0)

    def reach_mm(self, way: Way | None) -> float:
        """How far along the gap a way must go before it can cross, mm; inf for none."""
        if way is None:
            return inf
        return max((way.length_mm - self.straight_mm) / 2, 0.0)


@dataclass(slots=True)
class Terrain:
    """The gaps of one plane as obstacles, and the corners at which ways bend round them."""

    plane: Plane
    _corners: dict[tuple[int, float], Floats] = field(default_factory=dict)
    _large: MultiPolygon | None = None

    def shape(self, gap: int) -> Polygon:
        """A gap's shape, prepared for many tests."""
        shape = self.plane.gaps[gap].shape
        shapely.prepare(shape)
        return shape

    def corners(self, gap: int, clear_mm: float) -> Floats:
        """Places just off a gap's rim at which a taut way round it may bend; shape (n, 3, 2).

        Each comes with the corners of the rim before and after it.

        The gap is widened by a little more than the rim is then thinned by: a way from corner to
        corner stays clear of it.
        """
        key = (gap, clear_mm)
        if key not in self._corners:
            wider = self.plane.gaps[gap].shape.buffer(1.2 * clear_mm, quad_segs=2)
            thinned = wider.simplify(clear_mm)
            self._corners[key] = _bends(shapely.orient_polygons(thinned, exterior_cw=False))
        return self._corners[key]

    def blocked(self, starts: Floats, stops: Floats) -> NDArray[np.bool_]:
        """Whether straight legs, shape (n, 2) at either end, run into a gap larger than small."""
        lines = segments(np.stack([starts, stops], axis=1))
        return np.asarray(shapely.intersects(self.large_gaps(), lines), dtype=np.bool_)

    def large_gaps(self) -> MultiPolygon:
        """All gaps larger than small, as one obstacle."""
        if self._large is None:
            self._large = MultiPolygon(
                [
                    gap.shape
                    for gap in self.plane.gaps
                    if gap.open or box_size_mm(gap.shape) > SMALL_GAP_MM
                ]
            )
            shapely.prepare(self._large)
        return self._large

    def crossed(self, line: LineString) -> list[int]:
        """Indexes of the gaps a line runs through."""
        near = sorted(self.plane.gap_boxes.intersection(line.bounds))
        return [gap for gap in near if self.shape(gap).intersects(line)]


def _bends(shape: shapely.Geometry) -> Floats:
    """Corners where a polygon bulges outward, with those before and after; shape (n, 3, 2)."""
    corners = []
    for polygon in getattr(shape, "geoms", [shape]):
        for ring in [polygon.exterior, *polygon.interiors]:
            at = np.asarray(ring.coords)[:-1]
            before, after = np.roll(at, 1, axis=0), np.roll(at, -1, axis=0)
            bulges = _cross(at - before, after - at) > 0
            corners.append(np.stack([at, before, after], axis=1)[bulges])
    return np.concatenate(corners) if corners else np.empty((0, 3, 2))


def _cross(one: Floats, other: Floats) -> Floats:
    return np.asarray(one[..., 0] * other[..., 1] - one[..., 1] * other[..., 0])


def shortest(
    terrain: Terrain,
    start: Point,
    goal: Point,
    barrier: LineString | None = None,
    first: Sequence[int] = (),
    longest_mm: float = inf,
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
    coarse = 0
    while True:
        tried = _within(terrain, start, goal, barrier, min(limit, widest), CLEAR_MM[coarse], first)
        if tried == "crowded":
            if coarse + 1 == len(CLEAR_MM):
                return None
            coarse += 1
            continue
        if isinstance(tried, tuple) and (tried[0] <= limit or limit >= widest):
            return tried if tried[0] <= longest_mm else None
        if limit >= widest:
            return None
        limit *= 2.5


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
    for _ in range(60):
        corners = [ends]
        for gap in obstacles:
            bends = terrain.corners(gap, clear_mm)
            at = bends[:, 0]
            far = np.hypot(*(at - ends[0, 0]).T) + np.hypot(*(at - ends[1, 0]).T)
            corners.append(bends[far <= limit])
        bends = np.concatenate(corners)
        if len(bends) > MOST_CORNERS:
            return "crowded"
        blocks = [terrain.shape(gap) for gap in obstacles]
        found = _taut(bends, blocks, barrier)
        if found is None:
            return None
        line = LineString(found[1])
        fresh = [gap for gap in terrain.crossed(line) if gap not in obstacles]
        if not fresh:
            return found
        obstacles.extend(fresh)
    return None


def _taut(
    bends: Floats, blocks: Sequence[Polygon], barrier: LineString | None
) -> tuple[float, tuple[Point, ...]] | None:
    """A* over the bends, the first being the start and the second the goal.

    A taut string leaves a corner so that both sides of the corner lie on one side of it: only such
    steps are looked at.
    """
    points = bends[:, 0]
    ahead = np.hypot(*(points - points[1]).T)
    reached = np.full(len(points), inf)
    came = np.full(len(points), -1)
    closed = np.zeros(len(points), dtype=bool)
    reached[0] = 0.0
    queue: list[tuple[float, int]] = [(float(ahead[0]), 0)]
    while queue:
        _, here = heapq.heappop(queue)
        if closed[here]:
            continue
        if here == 1:
            return float(reached[1]), _backwards(points, came)
        closed[here] = True
        step = np.hypot(*(points - points[here]).T)
        better = np.flatnonzero(~closed & (reached[here] + step < reached - 1e-12))
        if here > 1:  # from the start, nearer the rim than the corners, any step may be taut
            better = better[(better == 1) | _touches(bends[here], bends[better])]
        for other in better[_free(points[here], points[better], blocks, barrier)].tolist():
            reached[other] = reached[here] + step[other]
            came[other] = here
            heapq.heappush(queue, (float(reached[other] + ahead[other]), other))
    return None


def _touches(here: Floats, there: Floats) -> NDArray[np.bool_]:
    """Whether straight steps from one corner to others, shape (n, 3, 2), touch both as a string."""
    step = there[:, 0] - here[0]
    leaves = _cross(step, here[1] - here[0]) * _cross(step, here[2] - here[0])
    meets = _cross(step, there[:, 1] - there[:, 0]) * _cross(step, there[:, 2] - there[:, 0])
    slack = -1e-15 * (1.0 + (step**2).sum(axis=1))
    return np.asarray((leaves >= slack) & (meets >= slack))


def _free(
    here: Floats, there: Floats, blocks: Sequence[Polygon], barrier: LineString | None
) -> NDArray[np.bool_]:
    lines = segments(np.stack([np.broadcast_to(here, there.shape), there], axis=1))
    free = np.ones(len(there), dtype=np.bool_)
    if barrier is not None:
        free &= ~shapely.intersects(barrier, lines)
    for block in blocks:
        left = np.flatnonzero(free)
        if not len(left):
            break
        free[left] = ~shapely.intersects(block, lines[left])
    return free


def _backwards(points: Floats, came: Ints) -> tuple[Point, ...]:
    at, path = 1, []
    while at >= 0:
        path.append((float(points[at, 0]), float(points[at, 1])))
        at = int(came[at])
    return tuple(reversed(path))


def find_route(
    crossing: Crossing, planes: dict[int, Plane], terrains: dict[int, Terrain], graph: IslandGraph
) -> Route:
    """Find how the return current gets round the gap of a crossing.

    Parameters
    ----------
    crossing
        The crossing.
    planes, terrains
        Planes and their obstacles by layer number.
    graph
        The island graph.

    Returns
    -------
    The best way on either side of the trace, in the plane itself or over bridges to another layer.
    """
    plane = planes[crossing.plane]
    start, goal = crossing.before, crossing.after
    straight = float(np.hypot(goal[0] - start[0], goal[1] - start[1]))
    one, other = (plane.islands[i].id for i in crossing.islands)
    sides: dict[int, Way] = {}
    if one == other:
        _add_own_ways(sides, crossing, terrains[crossing.plane])
    _add_borrowed_ways(sides, crossing, planes, terrains, graph)
    joined = one == other or nx.has_path(graph, one, other)
    if joined and not sides:
        chain = _chain(graph, one, other, start, goal)
        return Route(straight, chain, None, joined)
    return Route(straight, sides.get(1), sides.get(-1), joined)


def _add_own_ways(sides: dict[int, Way], crossing: Crossing, terrain: Terrain) -> None:
    """Put in the ways inside the crossed island itself, where they are shorter.

    The side that the crossing lies nearer to is looked at first; a way on the other side many
    times longer would carry hardly anything.
    """
    net = terrain.plane.islands[crossing.islands[0]].net_name
    order = sorted((1, -1), key=lambda side: _rim_distance(crossing, terrain, side))
    for side in order:
        known = [way.length_mm for way in sides.values()]
        longest = min(
            [OTHER_SIDE * min(known, default=inf), sides[side].length_mm if side in sides else inf]
        )
        found = shortest(
            terrain,
            crossing.before,
            crossing.after,
            _wall(crossing, -side),
            (crossing.gap,),
            longest,
        )
        if found is not None:
            sides[side] = Way(found[0], found[1], (), net, 0)


def _rim_distance(crossing: Crossing, terrain: Terrain, side: int) -> float:
    """How far it is from the middle of the run to the gap's rim straight aside, mm."""
    rim = terrain.plane.gaps[crossing.gap].shape.boundary
    aside = rim.intersection(_wall(crossing, side))
    return float(aside.distance(shapely.Point(crossing.at))) if not aside.is_empty else inf


def _heading(crossing: Crossing) -> tuple[float, float]:
    dx = crossing.after[0] - crossing.before[0]
    dy = crossing.after[1] - crossing.before[1]
    length = float(np.hypot(dx, dy)) or 1.0
    return dx / length, dy / length


def _wall(crossing: Crossing, side: int) -> LineString:
    """A wall from the middle of the run out to one side (1 left, -1 right)."""
    (dx, dy), (x, y) = _heading(crossing), crossing.at
    far = 2000.0 * side
    return LineString([(x, y), (x - dy * far, y + dx * far)])


def _add_borrowed_ways(
    sides: dict[int, Way],
    crossing: Crossing,
    planes: dict[int, Plane],
    terrains: dict[int, Terrain],
    graph: IslandGraph,
) -> None:
    """Put in shorter ways over a plated hole, another layer's island and a plated hole back."""
    plane = planes[crossing.plane]
    one, other = (plane.islands[i].id for i in crossing.islands)
    for middle in sorted(set(graph.adj[one]) & set(graph.adj[other])):
        island = graph.nodes[middle]["island"]
        down = _candidates(crossing, bridges_between(graph, one, middle), -1)
        up = _candidates(crossing, bridges_between(graph, middle, other), 1)
        search = _Search(crossing, terrains[crossing.plane], terrains[island.layer], sides)
        for length, side, a, b in search.pairs(down, up):
            path = (crossing.before, a, b, crossing.after)
            sides[side] = Way(length, path, (a, b), island.net_name, island.layer)


def _candidates(crossing: Crossing, places: Floats, end: int) -> Floats:
    """Bridges on one end's side of the gap, in the order in which they can make a way short."""
    if crossing.islands[0] == crossing.islands[1]:
        (dx, dy), (x, y) = _heading(crossing), crossing.at
        places = places[((places[:, 0] - x) * dx + (places[:, 1] - y) * dy) * end > 0]
    return places[np.argsort(_through(crossing, places), kind="stable")]


def _through(crossing: Crossing, places: Floats) -> Floats:
    """Straight length from entry to exit by way of each place: no way through it is shorter."""
    return np.asarray(
        np.hypot(*(places - np.asarray(crossing.before)).T)
        + np.hypot(*(places - np.asarray(crossing.after)).T)
    )


class _Search:
    """Best pairs of bridges over one borrowed island, given the ways already known.

    Legs go straight past antipads and the like; gaps larger than that are not gone through.
    """

    def __init__(
        self, crossing: Crossing, own: Terrain, borrowed: Terrain, best: dict[int, Way]
    ) -> None:
        self.crossing = crossing
        self.own = own
        self.borrowed = borrowed
        self.known = {side: way.length_mm for side, way in best.items()}

    def pairs(self, down: Floats, up: Floats) -> list[tuple[float, int, Point, Point]]:
        """The shortest pair on either side, each better than what is known: length, side, places.

        Places are taken up in the order of ``_through``, a few more each time, until those left
        cannot be on a shorter way than the one found.
        """
        found: dict[int, tuple[float, int, Point, Point]] = {}
        through = [_through(self.crossing, down), _through(self.crossing, up)]
        left = [float(far[0]) if len(far) else inf for far in through]
        if max(left) >= self._enough():
            return []
        taken = FIRST_BRIDGES
        while min(left) < self._enough():
            reached = [self._reached(down[:taken], -1), self._reached(up[:taken], 1)]
            for pair in self._best_of(*reached):
                if pair[0] < self.known.get(pair[1], inf):
                    self.known[pair[1]] = pair[0]
                    found[pair[1]] = pair
            left = [float(far[taken]) if taken < len(far) else inf for far in through]
            taken *= 3
        return [found[side] for side in sorted(found)]

    def _enough(self) -> float:
        """No way longer than this is looked for: the other side's would carry hardly anything."""
        if not self.known:
            return inf
        worst = max(self.known.values()) if len(self.known) == 2 else inf
        return min(worst, OTHER_SIDE * min(self.known.values()))

    def _reached(self, places: Floats, end: int) -> Floats:
        at = np.asarray(self.crossing.before if end < 0 else self.crossing.after)
        return places[~self.own.blocked(np.broadcast_to(at, places.shape), places)]

    def _best_of(self, down: Floats, up: Floats) -> list[tuple[float, int, Point, Point]]:
        if not len(down) or not len(up):
            return []
        (dx, dy), (x, y) = _heading(self.crossing), self.crossing.at
        between = np.hypot(down[:, None, 0] - up[None, :, 0], down[:, None, 1] - up[None, :, 1])
        total = (
            np.hypot(*(down - np.asarray(self.crossing.before)).T)[:, None]
            + between
            + np.hypot(*(up - np.asarray(self.crossing.after)).T)[None, :]
        )
        middle = (down[:, None, :] + up[None, :, :]) / 2
        left = (middle[..., 1] - y) * dx - (middle[..., 0] - x) * dy >= 0
        pairs = []
        for side, there in ((1, left), (-1, ~left)):
            rows, columns = np.nonzero(there & (total < self.known.get(side, inf)))
            order = np.argsort(total[rows, columns], kind="stable")
            for start in range(0, len(order), FIRST_BRIDGES):
                i = rows[order[start : start + FIRST_BRIDGES]]
                j = columns[order[start : start + FIRST_BRIDGES]]
                open_legs = np.flatnonzero(~self.borrowed.blocked(down[i], up[j]))
                if len(open_legs):
                    i, j = i[open_legs[0]], j[open_legs[0]]
                    pairs.append((float(total[i, j]), side, _point(down[i]), _point(up[j])))
                    break
        return pairs


def _point(place: Floats) -> Point:
    return float(place[0]), float(place[1])


def _chain(graph: IslandGraph, one: str, other: str, start: Point, goal: Point) -> Way | None:
    """A way over three or more bridges: island by island, the nearest bridge each time."""
    ids = nx.shortest_path(graph, one, other)
    at, length, path = np.asarray(start), 0.0, [start]
    for here, there in pairwise(ids):
        places = bridges_between(graph, here, there)
        far = np.hypot(*(places - at).T)
        nearest = int(np.argmin(far))
        length += float(far[nearest])
        at = places[nearest]
        path.append((float(at[0]), float(at[1])))
    length += float(np.hypot(*(np.asarray(goal) - at)))
    borrowed = graph.nodes[ids[len(ids) // 2]]["island"]
    return Way(length, (*path, goal), tuple(path[1:]), borrowed.net_name, borrowed.layer)
