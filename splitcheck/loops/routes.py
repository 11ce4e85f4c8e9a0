"""The way round for the return current: inside islands round their holes, and over bridges."""

from __future__ import annotations

from itertools import pairwise
from math import inf

import networkx as nx
import numpy as np
import shapely

from splitcheck.copper.marks import Point
from splitcheck.loops.borrowed import add_borrowed_ways
from splitcheck.loops.bridges import IslandGraph, bridges_between, joined_by_copper
from splitcheck.loops.coupled import add_coupled_ways, coupled_chain
from splitcheck.loops.taut import shortest
from splitcheck.loops.terrain import Terrain, nearest_on
from splitcheck.loops.ways import OTHER_SIDE, Route, Way, heading, side_of, to_point, wall
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane

#: Entry and exit of a run lie this near to the rim of its gap, mm.
RIM_MM = 1e-3


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
    add_borrowed_ways(sides, crossing, planes, terrains, graph)
    if one == other and not sides:
        _add_rim_ways(sides, crossing, plane)
    if one == other:
        return Route(straight, sides.get(1), sides.get(-1), joined=True)
    if not sides and joined_by_copper(graph, one, other):
        sides[1] = _chain(graph, one, other, start, goal)
    add_coupled_ways(sides, crossing, (one, other), terrains, graph)
    if not sides:
        add_coupled_ways(sides, crossing, (one, other), terrains, graph, past_gaps=True)
    chain = None if sides else coupled_chain(graph, one, other, start, goal)
    left = sides.get(1, chain)
    return Route(straight, left, sides.get(-1), joined=bool(sides) or chain is not None)


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
            wall(crossing, -side, _across_mm(crossing, terrain, rims[side])),
            (crossing.gap,),
            longest,
            least,
        )
        if found is not None:
            sides[side] = Way(found[0], found[1], (), net, 0)


def _rim_distance(crossing: Crossing, terrain: Terrain, side: int) -> float:
    """How far it is from the middle of the run to the gap's rim straight aside, mm."""
    dx, dy = heading(crossing)
    return terrain.rim_distance_mm(crossing.gap, crossing.at, (-dy * side, dx * side))


def _across_mm(crossing: Crossing, terrain: Terrain, rim_mm: float) -> float:
    """How far a wall may reach across the gap itself: no way can pass there, which is soon seen."""
    within = shapely.contains_xy(terrain.shape(crossing.gap), *crossing.at)
    return max(rim_mm - RIM_MM, 0.0) if within and rim_mm < inf else 0.0


def _parted(crossing: Crossing, terrain: Terrain, side: int) -> bool:
    """Whether every way has to cross the wall on one side of the run."""
    dx, dy = heading(crossing)
    entry, exit_ = crossing.path[0], crossing.path[-1]
    wall = (-dy * side, dx * side)
    return terrain.parted(crossing.islands[0], entry, exit_, crossing.at, wall)


def _least_mm(crossing: Crossing, side: int, rim_mm: float) -> float:
    """Straight length by way of the rim aside: every way on that side passes it or farther out."""
    if rim_mm == inf:
        return 0.0
    (dx, dy), (x, y) = heading(crossing), crossing.at
    chord = side * ((crossing.before[1] - y) * dx - (crossing.before[0] - x) * dy)
    out = max(rim_mm, chord)  # the straight line from entry to exit may itself pass farther out
    rim = x - dy * side * out, y + dx * side * out
    return sum(
        float(np.hypot(rim[0] - end[0], rim[1] - end[1]))
        for end in (crossing.before, crossing.after)
    )


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
            (int(nearest_on(edges, at)[0]), at) for at in (crossing.path[0], crossing.path[-1])
        )
        inner = np.array([one, *corners[first + 1 : last + 1], other])
        outer = np.array([other, *corners[last + 1 :], *corners[: first + 1], one])
        for arc in (inner, outer):
            hull = shapely.convex_hull(
                shapely.LineString([crossing.path[0], *arc, crossing.path[-1]])
            )
            length = max(float(hull.length) - start.distance(goal), start.distance(goal))
            middle = to_point(arc.mean(axis=0))
            side = side_of(crossing, middle, middle)
            path = tuple(to_point(np.asarray(at)) for at in shapely.get_coordinates(hull))
            if side not in sides or length < sides[side].length_mm:
                sides[side] = Way(length, path, (), net, 0)
        return


def _chain(graph: IslandGraph, one: str, other: str, start: Point, goal: Point) -> Way:
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
