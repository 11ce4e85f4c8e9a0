"""The way round for the return current: inside islands round their holes, and over bridges."""

from __future__ import annotations

import heapq
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from math import floor, inf
from typing import NamedTuple, TypeAlias

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
#: Entry and exit of a run lie this near to the rim of its gap, mm.
RIM_MM = 1e-3
#: More corners than this in reach: thin the gaps more coarsely.
MOST_CORNERS = 330
#: A point this near to a rim lies on it, mm.
ON_RIM_MM = 1e-4
#: Each ellipse in which a way is looked for reaches this much farther than the one before.
WIDER = 2.5
#: So many bridges are looked at first from either end of a crossing, then three times as many.
FIRST_BRIDGES = 12
#: A way on the other side of the trace this many times longer than the best is not looked for.
OTHER_SIDE = 5.0
#: A straight leg to a bridge passes gaps up to this size, mm (antipads), and stops at larger ones.
SMALL_GAP_MM = 3.0
#: The corners of a crossed gap up to this size are all looked at from the start, mm.
SMALL_DETOUR_MM = 12.0
#: Corners of gaps whose rim has more points than this are found in tiles, as they are needed, ...
TILED_POINTS = 400
#: ... with sides of this length, mm, ...
TILE_MM = 12.0
#: ... and room for the next corner: chords of an arc of radius r that leaves them by c are
#: 2 sqrt(2 r c) long, times this by sqrt(c) for arcs of the trade's sizes, mm^0.5.
WIDE_ARC = 4.0


Box: TypeAlias = tuple[float, float, float, float]
#: Column and row of a tile; None: the whole gap.
Tile: TypeAlias = tuple[int, int] | None


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
    _corners: dict[tuple[int, float, Tile], Floats] = field(default_factory=dict)
    _rims: dict[int, Floats] = field(default_factory=dict)
    _outlines: dict[int, Floats] = field(default_factory=dict)
    _large: MultiPolygon | None = None

    def shape(self, gap: int) -> Polygon:
        """A gap's shape, prepared for many tests."""
        shape = self.plane.gaps[gap].shape
        shapely.prepare(shape)
        return shape

    def corners(self, gap: int, clear_mm: float, box: Box) -> Iterator[Floats]:
        """Places just off a gap's rim at which a taut way round it may bend; shape (n, 3, 2) each.

        Each comes with the corners of the rim before and after it. All those in the box are given,
        and some others.

        The gap is widened by a little more than the rim is then thinned by: a way from corner to
        corner stays clear of it.
        """
        for tile in self._tiles(gap, box):
            key = (gap, clear_mm, tile)
            if key not in self._corners:
                self._corners[key] = self._corners_in(gap, clear_mm, tile)
            yield self._corners[key]

    def _tiles(self, gap: int, box: Box) -> Iterator[Tile]:
        """The tiles of an intricate gap that a box meets; None for the whole of a simple gap."""
        shape = self.plane.gaps[gap].shape
        if shapely.get_num_coordinates(shape) <= TILED_POINTS:
            yield None
            return
        x0, y0, x1, y1 = shape.bounds
        low = max(box[0], x0 - 1.0), max(box[1], y0 - 1.0)
        high = min(box[2], x1 + 1.0), min(box[3], y1 + 1.0)
        for i in range(floor(low[0] / TILE_MM), floor(high[0] / TILE_MM) + 1):
            for j in range(floor(low[1] / TILE_MM), floor(high[1] / TILE_MM) + 1):
                yield i, j

    def _corners_in(self, gap: int, clear_mm: float, tile: Tile) -> Floats:
        shape: shapely.Geometry = self.plane.gaps[gap].shape
        if tile is not None:  # with a margin, so that its own border makes no corner in the tile
            low, margin = np.array(tile) * TILE_MM, 4 * clear_mm + WIDE_ARC * clear_mm**0.5
            shape = shapely.clip_by_rect(shape, *(low - margin), *(low + TILE_MM + margin))
            shape = shapely.simplify(shape, 0.1 * clear_mm)
        wider = shapely.simplify(shapely.buffer(shape, 1.2 * clear_mm, quad_segs=2), clear_mm)
        bends = _bends(shapely.orient_polygons(wider, exterior_cw=False))
        if tile is not None:  # and with the next corner, so that steps lead from tile to tile
            mine = np.all((bends >= low) & (bends < low + TILE_MM), axis=2).any(axis=1)
            room = margin - 2 * clear_mm
            real = ((bends > low - room) & (bends < low + TILE_MM + room)).all(axis=2)
            # where the rim runs on is not known: any step touches there
            bends = np.where(real[:, :, None], bends, bends[:, :1])[mine & real[:, 0]]
        return bends

    def rim_distance_mm(self, gap: int, at: Point, along: Point) -> float:
        """How far it is from a point to a gap's rim in a direction of length 1; inf if never."""
        if gap not in self._rims:
            self._rims[gap] = _edges(self.plane.gaps[gap].shape)
        return float(_met(self._rims[gap], at, along)[0].min(initial=inf))

    def parted(self, island: int, entry: Point, exit_: Point, at: Point, along: Point) -> bool:
        """Whether a wall from a gap outside an island parts the rim's points entry and exit.

        What of the wall lies within the island's outline cuts it in two, and the rim into two arcs.
        """
        if island not in self._outlines:
            self._outlines[island] = _edges(Polygon(self.plane.islands[island].shape.exterior))
        outline = self._outlines[island]
        ends = [_place_on(outline, point) for point in (entry, exit_)]
        far, places = _met(outline, at, along)
        if ends[0] is None or ends[1] is None or len(far) % 2:
            return False
        cuts = np.sort(places[np.argsort(far, kind="stable")].reshape(-1, 2), axis=1).T
        between = [(cuts[0] < end) & (end < cuts[1]) for end in ends]
        return bool((between[0] != between[1]).any())

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


def _edges(shape: Polygon) -> Floats:
    """Edges of all rings as x1, y1, x2, y2, shape (4, n)."""
    points, ring = shapely.get_coordinates(shapely.get_rings(shape), return_index=True)
    ends = np.concatenate([points[:-1], points[1:]], axis=1)
    return np.ascontiguousarray(ends[ring[1:] == ring[:-1]].T)


def _met(edges: Floats, at: Point, along: Point) -> tuple[Floats, Floats]:
    """Where a ray meets edges: how far out, mm, and the edge's number plus the part of it."""
    x1, y1, x2, y2 = edges
    first = along[0] * (y1 - at[1]) - along[1] * (x1 - at[0])
    last = along[0] * (y2 - at[1]) - along[1] * (x2 - at[0])
    met = np.flatnonzero((first < 0) != (last < 0))
    part = first[met] / (first[met] - last[met])
    x, y = (one[met] + part * (two[met] - one[met]) for one, two in ((x1, x2), (y1, y2)))
    far = along[0] * (x - at[0]) + along[1] * (y - at[1])
    return far[far >= 0], (met + part)[far >= 0]


def _place_on(edges: Floats, at: Point) -> float | None:
    """The edge that a point lies on, by its number plus the part of it; None if it is off them."""
    place, off_mm = _nearest_on(edges, at)
    return place if off_mm < ON_RIM_MM else None


def _nearest_on(edges: Floats, at: Point) -> tuple[float, float]:
    """The place on edges nearest to a point, and how far off it is, mm."""
    x1, y1, x2, y2 = edges
    dx, dy = x2 - x1, y2 - y1
    square = np.maximum(dx * dx + dy * dy, 1e-30)
    part = np.clip(((at[0] - x1) * dx + (at[1] - y1) * dy) / square, 0.0, 1.0)
    off = np.hypot(x1 + part * dx - at[0], y1 + part * dy - at[1])
    nearest = int(np.argmin(off))
    return nearest + float(part[nearest]), float(off[nearest])


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
    if one == other and not sides:
        _add_rim_ways(sides, crossing, plane)
    joined = one == other or nx.has_path(graph, one, other)
    if joined and not sides and one != other:
        chain = _chain(graph, one, other, start, goal)
        return Route(straight, chain, None, joined)
    return Route(straight, sides.get(1), sides.get(-1), joined)


def _add_own_ways(sides: dict[int, Way], crossing: Crossing, terrain: Terrain) -> None:
    """Put in the ways inside the crossed island itself, where they are shorter.

    The side that the crossing lies nearer to is looked at first; a way on the other side many
    times longer would carry hardly anything.
    """
    net = terrain.plane.islands[crossing.islands[0]].net_name
    rims = {side: _rim_distance(crossing, terrain, side) for side in (1, -1)}
    for side in sorted(rims, key=rims.__getitem__):
        known = [way.length_mm for way in sides.values()]
        longest = min(
            [OTHER_SIDE * min(known, default=inf), sides[side].length_mm if side in sides else inf]
        )
        least = _least_mm(crossing, side, rims[side])
        if least > longest or _parted(crossing, terrain, -side):
            continue
        found = shortest(
            terrain,
            crossing.before,
            crossing.after,
            _wall(crossing, -side),
            (crossing.gap,),
            longest,
            least,
        )
        if found is not None:
            sides[side] = Way(found[0], found[1], (), net, 0)


def _rim_distance(crossing: Crossing, terrain: Terrain, side: int) -> float:
    """How far it is from the middle of the run to the gap's rim straight aside, mm."""
    dx, dy = _heading(crossing)
    return terrain.rim_distance_mm(crossing.gap, crossing.at, (-dy * side, dx * side))


def _parted(crossing: Crossing, terrain: Terrain, side: int) -> bool:
    """Whether every way has to cross the wall on one side of the run."""
    dx, dy = _heading(crossing)
    entry, exit_ = crossing.path[0], crossing.path[-1]
    wall = (-dy * side, dx * side)
    return terrain.parted(crossing.islands[0], entry, exit_, crossing.at, wall)


def _least_mm(crossing: Crossing, side: int, rim_mm: float) -> float:
    """Straight length by way of the rim aside: every way on that side passes it or farther out."""
    if rim_mm == inf:
        return 0.0
    (dx, dy), (x, y) = _heading(crossing), crossing.at
    chord = side * ((crossing.before[1] - y) * dx - (crossing.before[0] - x) * dy)
    out = max(rim_mm, chord)  # the straight line from entry to exit may itself pass farther out
    rim = x - dy * side * out, y + dx * side * out
    return sum(
        float(np.hypot(rim[0] - end[0], rim[1] - end[1]))
        for end in (crossing.before, crossing.after)
    )


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
        search = _Search(crossing, terrains[crossing.plane], terrains[island.layer], sides)
        down = search.candidates(bridges_between(graph, one, middle), -1)
        up = search.candidates(bridges_between(graph, middle, other), 1)
        for length, side, a, b in search.pairs(down, up):
            path = (crossing.before, a, b, crossing.after)
            sides[side] = Way(length, path, (a, b), island.net_name, island.layer)


def _through(crossing: Crossing, places: Floats) -> Floats:
    """Straight length from entry to exit by way of each place: no way through it is shorter."""
    (x0, y0), (x1, y1) = crossing.before, crossing.after
    x, y = places[:, 0], places[:, 1]
    return np.asarray(np.hypot(x - x0, y - y0) + np.hypot(x - x1, y - y1))


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

    def candidates(self, places: Floats, end: int) -> Floats:
        """Bridges on one end's side of the gap, in the order in which they can make a way short.

        Those that cannot be on a way shorter than what is known are left out.
        """
        through = _through(self.crossing, places)
        near = through < self._enough()
        if self.crossing.islands[0] == self.crossing.islands[1]:
            (dx, dy), (x, y) = _heading(self.crossing), self.crossing.at
            near &= ((places[:, 0] - x) * dx + (places[:, 1] - y) * dy) * end > 0
        which = np.flatnonzero(near)
        return places[which[np.argsort(through[which], kind="stable")]]

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


def _add_rim_ways(sides: dict[int, Way], crossing: Crossing, plane: Plane) -> None:
    """Where rims have too many corners for a search: the hull of the rim on either side.

    The rim itself is a way on copper; pulled taut it is hardly longer than its hull.
    """
    net = plane.islands[crossing.islands[0]].net_name
    start, goal = shapely.Point(crossing.path[0]), shapely.Point(crossing.path[-1])
    shape = plane.gaps[crossing.gap].shape
    for ring in (shape.exterior, *shape.interiors):
        if max(ring.distance(start), ring.distance(goal)) > RIM_MM:
            continue
        corners = np.asarray(ring.coords)[:-1]
        edges = np.concatenate([corners, np.roll(corners, -1, axis=0)], axis=1).T
        (first, one), (last, other) = sorted(
            (int(_nearest_on(edges, at)[0]), at) for at in (crossing.path[0], crossing.path[-1])
        )
        inner = np.array([one, *corners[first + 1 : last + 1], other])
        outer = np.array([other, *corners[last + 1 :], *corners[: first + 1], one])
        for arc in (inner, outer):
            hull = shapely.convex_hull(
                shapely.LineString([crossing.path[0], *arc, crossing.path[-1]])
            )
            length = max(float(hull.length) - start.distance(goal), start.distance(goal))
            middle = _point(arc.mean(axis=0))
            side = _side(crossing, middle, middle)
            path = tuple(_point(np.asarray(at)) for at in shapely.get_coordinates(hull))
            if side not in sides or length < sides[side].length_mm:
                sides[side] = Way(length, path, (), net, 0)
        return


def _side(crossing: Crossing, a: Point, b: Point) -> int:
    """On which side of the trace the middle of two places lies: 1 left, -1 right."""
    (dx, dy), (x, y) = _heading(crossing), crossing.at
    return 1 if ((a[1] + b[1]) / 2 - y) * dx - ((a[0] + b[0]) / 2 - x) * dy >= 0 else -1


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
