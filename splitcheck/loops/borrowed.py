"""Ways that borrow an island of another layer: a plated hole, its copper, a plated hole back."""

from __future__ import annotations

from collections.abc import Mapping
from math import inf
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import KEPT, IslandGraph, bridges_between
from splitcheck.loops.terrain import Terrain
from splitcheck.loops.ways import OTHER_SIDE, Way, heading, to_point
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane
from splitcheck.units import Floats

#: So many bridges are looked at first from either end of a crossing, then three times as many.
FIRST_BRIDGES = 12


def add_borrowed_ways(
    sides: dict[int, Way],
    crossing: Crossing,
    planes: dict[int, Plane],
    terrains: dict[int, Terrain],
    graph: IslandGraph,
) -> None:
    """Put in shorter ways over a plated hole, another layer's island and a plated hole back."""
    plane = planes[crossing.plane]
    one, other = (plane.islands[i].id for i in crossing.islands)
    for middle, least_mm in _middles(crossing, graph, one, other):
        if least_mm >= _enough({side: way.length_mm for side, way in sides.items()}):
            continue
        island = graph.nodes[middle]["island"]
        search = _Search(crossing, terrains[crossing.plane], terrains[island.layer], sides)
        down = search.candidates(bridges_between(graph, one, middle), -1)
        up = search.candidates(bridges_between(graph, middle, other), 1)
        for length, side, a, b in search.pairs(down, up):
            path = (crossing.before, a, b, crossing.after)
            sides[side] = Way(length, path, (a, b), island.net_name, island.layer)


class _Leading(NamedTuple):
    """Everything that leads from an island by plated holes to islands that can be borrowed."""

    places: Floats
    """The holes, each once, shape (n, 2), mm."""
    islands: tuple[str, ...]
    """Ids of the islands that they lead to, sorted."""
    hole: NDArray[np.intp]
    """Numbers of holes: those that lead to the first island, then to the second, and so on."""
    start: NDArray[np.intp]
    """Where those of each island begin in ``hole``."""


def _leading(graph: IslandGraph, island: str) -> _Leading:
    """What leads from an island; found once for each island of a graph."""
    kept: dict[tuple[str, ...], _Leading] = graph.graph.setdefault(KEPT, {})
    if (island,) not in kept:
        others = tuple(sorted(graph.adj[island]))
        holes = [bridges_between(graph, island, other) for other in others]
        places, hole = np.unique(
            np.concatenate([np.empty((0, 2)), *holes]), axis=0, return_inverse=True
        )
        start = np.cumsum([0, *(len(some) for some in holes)])[:-1]
        kept[(island,)] = _Leading(places, others, hole.reshape(-1), start)
    return kept[(island,)]


def _middles(
    crossing: Crossing, graph: IslandGraph, one: str, other: str
) -> list[tuple[str, float]]:
    """Islands that may be borrowed, sorted, and the least length of a way over each, mm."""
    found: list[dict[str, float]] = []
    for end, island in ((-1, one), (1, other)):
        leading = _leading(graph, island)
        if not len(leading.places):
            return []
        through = _through(crossing, leading.places)
        if one == other:
            through = np.where(_on_side(crossing, leading.places, end), through, inf)
        least = np.minimum.reduceat(through[leading.hole], leading.start)
        found.append(dict(zip(leading.islands, least.tolist(), strict=True)))
    down, up = found
    return [(middle, max(down[middle], up[middle])) for middle in down if middle in up]


def _on_side(crossing: Crossing, places: Floats, end: int) -> NDArray[np.bool_]:
    """Which places lie before the middle of the run (-1) or after it (1)."""
    (dx, dy), (x, y) = heading(crossing), crossing.at
    return np.asarray(((places[:, 0] - x) * dx + (places[:, 1] - y) * dy) * end > 0)


def _enough(known_mm: Mapping[int, float]) -> float:
    """No way longer than this is looked for: the other side's would carry hardly anything."""
    if not known_mm:
        return inf
    worst = max(known_mm.values()) if len(known_mm) == 2 else inf
    return min(worst, OTHER_SIDE * min(known_mm.values()))


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
            near &= _on_side(self.crossing, places, end)
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
        return _enough(self.known)

    def _reached(self, places: Floats, end: int) -> Floats:
        at = np.asarray(self.crossing.before if end < 0 else self.crossing.after)
        return places[~self.own.blocked(np.broadcast_to(at, places.shape), places)]

    def _best_of(self, down: Floats, up: Floats) -> list[tuple[float, int, Point, Point]]:
        if not len(down) or not len(up):
            return []
        (dx, dy), (x, y) = heading(self.crossing), self.crossing.at
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
                    pairs.append((float(total[i, j]), side, to_point(down[i]), to_point(up[j])))
                    break
        return pairs
