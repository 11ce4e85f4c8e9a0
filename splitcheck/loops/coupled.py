"""Ways that go over capacitors and links: where no copper joins two islands, or only far off."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from math import inf
from typing import NamedTuple, TypeAlias

import networkx as nx
import numpy as np
from numpy.typing import NDArray

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import (
    KEPT,
    IslandGraph,
    PartBridge,
    all_bridges,
    bridges_between,
    over_parts,
    parts_between,
)
from splitcheck.loops.terrain import Terrain
from splitcheck.loops.ways import MM_PER_NH, OTHER_SIDE, Way, heading, to_point
from splitcheck.planes.crossings import Crossing
from splitcheck.units import Floats

#: Which straight legs a plane's gaps are in the way of.
_Blocked: TypeAlias = Callable[[Terrain, Floats, Floats], NDArray[np.bool_]]

#: So many of the holes and so many of the parts that make a way shortest are looked at.
MOST_HOPS = 12


class _Hops(NamedTuple):
    """Everything that leads from one island to another, by holes and by parts."""

    leave: Floats
    """Where it leaves the one island, shape (n, 2)."""
    arrive: Floats
    """Where it comes to the other, shape (n, 2)."""
    cost_mm: Floats
    """Its own length and what its inductance is worth in length."""
    parts: tuple[PartBridge | None, ...]
    """The part it is; None for a hole."""

    def taken(self, rows: list[int]) -> _Hops:
        """Some of them."""
        return _Hops(
            self.leave[rows],
            self.arrive[rows],
            self.cost_mm[rows],
            tuple(self.parts[row] for row in rows),
        )


class _Found(NamedTuple):
    """A way as it is compared."""

    cost_mm: float
    side: int
    way: Way


def add_coupled_ways(
    sides: dict[int, Way],
    crossing: Crossing,
    islands: tuple[str, str],
    terrains: dict[int, Terrain],
    graph: IslandGraph,
    *,
    past_gaps: bool = False,
) -> None:
    """Put in ways over capacitors from one island to another, where they are worth more.

    Parameters
    ----------
    sides
        Best way on either side of the trace, 1 left, -1 right; changed in place.
    crossing
        The crossing, whose trace leaves one island for another.
    islands
        Ids of the two.
    terrains
        Obstacles by layer number.
    graph
        The island graph.
    past_gaps
        Whether legs may run past large gaps: for where no straight ones are free of them.

    Notes
    -----
    Over one part, or over another island with a part at one end at least and a plated hole or a
    part at the other. An nH of a part counts as so many mm of way as a bridge farther off costs:
    see ``MM_PER_NH``. Legs run straight past antipads and the like, as over plated holes.
    """
    one, other = islands
    parts = over_parts(graph)
    if one not in parts and other not in parts:
        return
    own = terrains[crossing.plane]
    shut = _nothing if past_gaps else Terrain.blocked
    _keep_best(sides, _direct(crossing, parts_between(graph, one, other), own, shut))
    near = [
        set(known[end]) if end in known else set() for end in islands for known in (graph, parts)
    ]
    middles = ((near[0] | near[1]) & (near[2] | near[3])) - {one, other}
    for middle in sorted(middles & (near[1] | near[3])):
        island = graph.nodes[middle]["island"]
        enough = _enough(sides)
        hops = (
            _shortest(_hops(graph, one, middle), crossing, enough),
            _shortest(_hops(graph, middle, other), crossing, enough),
        )
        borrowed = (island.net_name, island.layer)
        _keep_best(sides, _over(crossing, hops, borrowed, (own, terrains[island.layer]), shut))


def _keep_best(sides: dict[int, Way], found: list[_Found]) -> None:
    for candidate in found:
        known = sides.get(candidate.side)
        if known is None or candidate.cost_mm < known.cost_mm:
            sides[candidate.side] = candidate.way


def coupled_chain(
    graph: IslandGraph, one: str, other: str, start: Point, goal: Point
) -> Way | None:
    """A way over three or more bridges of any kind: island by island, the best bridge each time."""
    both = all_bridges(graph)
    if one not in both or other not in both or not nx.has_path(both, one, other):
        return None
    ids = nx.shortest_path(both, one, other)
    at, length, path = np.asarray(start), 0.0, [start]
    holes: list[Point] = []
    parts: list[PartBridge] = []
    for here, there in pairwise(ids):
        hops = _hops(graph, here, there)
        far = np.hypot(*(hops.leave - at).T) + hops.cost_mm
        best = int(np.argmin(far))
        part = hops.parts[best]
        length += float(np.hypot(*(hops.leave[best] - at)))
        length += float(np.hypot(*(hops.arrive[best] - hops.leave[best])))
        at = hops.arrive[best]
        if part is None:
            holes.append(to_point(at))
        else:
            parts.append(part)
        path += [to_point(hops.leave[best]), to_point(at)]
    length += float(np.hypot(*(np.asarray(goal) - at)))
    borrowed = graph.nodes[ids[len(ids) // 2]]["island"]
    return Way(
        length, _path([*path, goal]), tuple(holes), borrowed.net_name, borrowed.layer, tuple(parts)
    )


def _hops(graph: IslandGraph, one: str, other: str) -> _Hops:
    """All that leads from one island to another; made once for each two of a graph."""
    kept: dict[tuple[str, str], _Hops] = graph.graph.setdefault(KEPT, {})
    if (one, other) not in kept:
        kept[one, other] = _gathered(graph, one, other)
    return kept[one, other]


def _gathered(graph: IslandGraph, one: str, other: str) -> _Hops:
    holes = bridges_between(graph, one, other)
    parts = parts_between(graph, one, other)
    leave = np.array([part.at_one for part in parts]).reshape(-1, 2)
    arrive = np.array([part.at_other for part in parts]).reshape(-1, 2)
    nh = np.array([part.mounted_nh for part in parts])
    return _Hops(
        np.concatenate([holes, leave]),
        np.concatenate([holes, arrive]),
        np.concatenate([np.zeros(len(holes)), np.hypot(*(arrive - leave).T) + MM_PER_NH * nh]),
        (*[None] * len(holes), *parts),
    )


def _nothing(_terrain: Terrain, starts: Floats, _stops: Floats) -> NDArray[np.bool_]:
    """Nothing is in the way of legs."""
    return np.zeros(len(starts), dtype=np.bool_)


def _direct(
    crossing: Crossing, parts: tuple[PartBridge, ...], own: Terrain, blocked: _Blocked
) -> list[_Found]:
    """Ways over one part from the one island to the other."""
    if not parts:
        return []
    leave = np.array([part.at_one for part in parts])
    arrive = np.array([part.at_other for part in parts])
    shut = blocked(own, _all_at(crossing.before, leave), leave)
    shut |= blocked(own, _all_at(crossing.after, arrive), arrive)
    found = []
    for row in np.flatnonzero(~shut).tolist():
        part = parts[row]
        path = (crossing.before, part.at_one, part.at_other, crossing.after)
        length = sum(float(np.hypot(b[0] - a[0], b[1] - a[1])) for a, b in pairwise(path))
        net = own.plane.islands[crossing.islands[1]].net_name
        way = Way(length, path, (), net, 0, (part,))
        side = 1 if _left(crossing, leave[row], arrive[row]) else -1
        found.append(_Found(way.cost_mm, side, way))
    return found


def _all_at(at: Point, like: Floats) -> Floats:
    """One place as often as there are others."""
    return np.broadcast_to(np.asarray(at), like.shape)


def _left(crossing: Crossing, one: Floats, other: Floats) -> NDArray[np.bool_]:
    """Whether the middle of two places lies on the left of the trace; shape of all but the last."""
    (dx, dy), (x, y) = heading(crossing), crossing.at
    middle = (one + other) / 2
    return np.asarray((middle[..., 1] - y) * dx - (middle[..., 0] - x) * dy >= 0)


def _over(
    crossing: Crossing,
    hops: tuple[_Hops, _Hops],
    borrowed: tuple[str, int],
    terrains: tuple[Terrain, Terrain],
    blocked: _Blocked,
) -> list[_Found]:
    """The best way on either side over one borrowed island, with a part at one end at least."""
    if not hops[0].parts or not hops[1].parts:
        return []
    own, middle = terrains
    reached = [
        some.taken(np.flatnonzero(~blocked(own, _all_at(at, ends), ends)).tolist())
        for some, ends, at in (
            (hops[0], hops[0].leave, crossing.before),
            (hops[1], hops[1].arrive, crossing.after),
        )
    ]
    down, up = reached
    if not down.parts or not up.parts:
        return []
    between = np.hypot(*(down.arrive[:, None, :] - up.leave[None, :, :]).transpose(2, 0, 1))
    first = np.hypot(*(down.leave - crossing.before).T) + down.cost_mm
    last = np.hypot(*(up.arrive - crossing.after).T) + up.cost_mm
    total = first[:, None] + between + last[None, :]
    plain = [np.array([part is None for part in some.parts]) for some in (down, up)]
    total[plain[0][:, None] & plain[1][None, :]] = inf
    rows, columns = np.nonzero(total < inf)
    order = np.argsort(total[rows, columns], kind="stable")
    rows, columns = rows[order], columns[order]
    left = _left(crossing, down.leave[rows], up.arrive[columns])
    found = []
    for side, there in ((1, left), (-1, ~left)):
        for first_of in range(0, int(there.sum()), MOST_HOPS):
            i = rows[there][first_of : first_of + MOST_HOPS]
            j = columns[there][first_of : first_of + MOST_HOPS]
            free = np.flatnonzero(~blocked(middle, down.arrive[i], up.leave[j]))
            if len(free):
                a, b = int(i[free[0]]), int(j[free[0]])
                way = _joined(crossing, down, a, up, b, borrowed)
                found.append(_Found(float(total[a, b]), side, way))
                break
    return found


def _enough(sides: dict[int, Way]) -> float:
    """No way worth less than this is looked for: the other side's would carry hardly anything."""
    known = [way.cost_mm for way in sides.values()]
    worst = max(known) if len(known) == 2 else inf
    return min(worst, OTHER_SIDE * min(known, default=inf))


def _shortest(hops: _Hops, crossing: Crossing, enough_mm: float) -> _Hops:
    """The holes and parts that can make a way short, a few of each."""
    cost = (
        np.hypot(*(hops.leave - crossing.before).T)
        + hops.cost_mm
        + np.hypot(*(hops.arrive - crossing.after).T)
    )
    order = np.argsort(cost, kind="stable")
    order = order[cost[order] < enough_mm]
    is_part = np.array([part is not None for part in hops.parts], dtype=bool)[order]
    return hops.taken([*order[is_part][:MOST_HOPS].tolist(), *order[~is_part][:MOST_HOPS].tolist()])


def _joined(
    crossing: Crossing, down: _Hops, i: int, up: _Hops, j: int, borrowed: tuple[str, int]
) -> Way:
    places = [down.leave[i], down.arrive[i], up.leave[j], up.arrive[j]]
    path = _path([crossing.before, *(to_point(place) for place in places), crossing.after])
    length = sum(float(np.hypot(b[0] - a[0], b[1] - a[1])) for a, b in pairwise(path))
    hops = ((down.parts[i], down.leave[i]), (up.parts[j], up.arrive[j]))
    return Way(
        length,
        path,
        tuple(to_point(at) for part, at in hops if part is None),
        *borrowed,
        tuple(part for part, _ in hops if part is not None),
    )


def _path(points: list[Point]) -> tuple[Point, ...]:
    """The points, none twice in a row."""
    return (points[0], *(b for a, b in pairwise(points) if a != b))
