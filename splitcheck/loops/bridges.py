"""The island graph: islands of all layers, joined by plated holes and by two-pad parts."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from typing import Any, NamedTuple, TypeAlias

import networkx as nx
import numpy as np

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.loops.between import BridgeKind, Standing, standing_between
from splitcheck.planes.islands import Island, Plane
from splitcheck.units import Floats

#: An island graph: nodes are island ids, edges carry ``at``, the sorted places of the plated holes
#: that bridge them. What two-pad parts join is in a graph beside it: see ``over_parts``.
IslandGraph: TypeAlias = "nx.Graph[str]"

#: Keys of the graphs of two-pad parts, and of all bridges, among the attributes of an island graph.
_PARTS = "parts"
_ALL = "all"
#: Key of what others keep of a graph; a graph with other bridges begins with nothing.
KEPT = "kept"


class PartBridge(NamedTuple):
    """A two-pad part between two islands, seen from one of them."""

    kind: BridgeKind
    ref: str
    one: str
    other: str
    """Ids of the islands that it leads from and to."""
    at_one: Point
    at_other: Point
    """Where the current leaves the one and enters the other."""
    at: Point
    """Middle of its two pads."""
    layer: int
    """The outer layer that it is mounted on."""
    mounted_nh: float

    def turned(self) -> PartBridge:
        """The same part seen from the other island."""
        return self._replace(
            one=self.other, other=self.one, at_one=self.at_other, at_other=self.at_one
        )


def join_islands(board: Board, planes: Sequence[Plane]) -> IslandGraph:
    """Build the graph of islands and what bridges them.

    Parameters
    ----------
    board
        The board with its plated holes and components.
    planes
        All planes.

    Returns
    -------
    A graph whose nodes are ids of islands (attribute ``island``) and whose edges carry ``at``:
    places of the holes that join both, shape (n, 2), mm, sorted; and ``wide_mm``, their diameters.
    What capacitors and links join is no edge of it, as it holds for fast currents alone: see
    ``parts_between`` and ``over_parts``.
    """
    graph: IslandGraph = nx.Graph()
    by_part: dict[int, Island] = {}
    for plane in planes:
        for island in plane.islands:
            graph.add_node(island.id, island=island)
            by_part[island.part] = island
    places: dict[tuple[str, str], list[tuple[float, float, float]]] = defaultdict(list)
    for hole in board.holes:
        met = sorted({by_part[part].id for part in hole.parts if part in by_part})
        for number, one in enumerate(met):
            for other in met[number + 1 :]:
                places[one, other].append((*hole.at, hole.hole.diameter_mm))
    for (one, other), found in sorted(places.items()):
        _put_holes(graph, one, other, found)
    _put_parts(graph, (_bridge(standing) for standing in standing_between(board, by_part)))
    return graph


def _put_holes(
    graph: IslandGraph, one: str, other: str, holes: Iterable[tuple[float, float, float]]
) -> None:
    table = np.array(sorted(holes))
    graph.add_edge(one, other, at=table[:, :2], wide_mm=table[:, 2])


def _bridge(standing: Standing) -> PartBridge:
    ends = sorted(standing.ends, key=lambda end: end[0])
    (one, at_one), (other, at_other) = ends
    return PartBridge(
        standing.kind, standing.ref, one, other, at_one, at_other, standing.at, standing.layer,
        standing.mounted_nh,
    )  # fmt: skip


def _put_parts(graph: IslandGraph, bridges: Iterable[PartBridge]) -> None:
    """Lay the graph of parts beside that of holes; edges carry them, seen from the lesser id."""
    found: dict[tuple[str, str], list[PartBridge]] = defaultdict(list)
    for bridge in bridges:
        found[bridge.one, bridge.other].append(bridge)
    parts: IslandGraph = nx.Graph()
    for (one, other), some in sorted(found.items()):
        parts.add_edge(one, other, parts=tuple(sorted(some)))
    graph.graph[_PARTS] = parts
    graph.graph[_ALL] = nx.Graph([*graph.edges, *parts.edges])
    graph.graph[KEPT] = {}


def bridges_between(graph: IslandGraph, one: str, other: str) -> Floats:
    """Places of the plated holes that join two islands, shape (n, 2), mm; may be empty."""
    if not graph.has_edge(one, other):
        return np.empty((0, 2))
    places: Floats = graph.edges[one, other]["at"]
    return places


def over_parts(graph: IslandGraph) -> IslandGraph:
    """The graph of islands that two-pad parts join; it lacks islands that no part joins."""
    parts: IslandGraph | None = graph.graph.get(_PARTS)
    return nx.Graph() if parts is None else parts


def all_bridges(graph: IslandGraph) -> IslandGraph:
    """The graph of islands joined by anything; it lacks islands that nothing joins."""
    both: IslandGraph = graph.graph.get(_ALL, graph)
    return both


def parts_between(graph: IslandGraph, one: str, other: str) -> tuple[PartBridge, ...]:
    """Capacitors and links from one island to another, seen from the first; may be empty."""
    parts = over_parts(graph)
    if not parts.has_edge(one, other):
        return ()
    found: tuple[PartBridge, ...] = parts.edges[one, other]["parts"]
    return found if one <= other else tuple(part.turned() for part in found)


def all_parts(graph: IslandGraph) -> Iterator[PartBridge]:
    """Every capacitor and link once for each pair of islands that it joins, sorted."""
    for _, _, edge in sorted(over_parts(graph).edges(data=True), key=lambda row: sorted(row[:2])):
        yield from edge["parts"]


def joined_by_copper(graph: IslandGraph, one: str, other: str) -> bool:
    """Whether plated holes join two islands, directly or over others: capacitors do not count."""
    return one == other or bool(nx.has_path(graph, one, other))


def stitched_near(graph: IslandGraph, one: str, other: str, at: Point, reach_mm: float) -> bool:
    """Whether a plated hole joins two islands within a distance of a place."""
    places = bridges_between(graph, one, other)
    if not len(places):
        return False
    return bool(np.hypot(*(places - np.asarray(at)).T).min() <= reach_mm)


def with_via(
    graph: IslandGraph, islands: Sequence[str], at: Point, wide_mm: float = 0.3
) -> IslandGraph:
    """A copy of an island graph with one more plated hole.

    Parameters
    ----------
    graph
        The island graph; it is left as it is.
    islands
        Ids of the islands that the hole touches, two or more.
    at, wide_mm
        Its place and diameter, mm.

    Raises
    ------
    SplitcheckError
        If an island is not in the graph.
    """
    _check_known(graph, islands)
    more: IslandGraph = graph.copy()
    met = sorted(set(islands))
    for number, one in enumerate(met):
        for other in met[number + 1 :]:
            edge: dict[str, Any] = graph.edges[one, other] if graph.has_edge(one, other) else {}
            old = np.column_stack([edge["at"], edge["wide_mm"]]).tolist() if edge else []
            holes = [(x, y, wide) for x, y, wide in old]
            _put_holes(more, one, other, [*holes, (*at, wide_mm)])
    _put_parts(more, all_parts(graph))
    return more


def with_capacitor(
    graph: IslandGraph,
    one: str,
    other: str,
    at_one: Point,
    at_other: Point,
    mounted_nh: float,
    *,
    layer: int = 1,
    ref: str = "a capacitor",
) -> IslandGraph:
    """A copy of an island graph with one more capacitor.

    Parameters
    ----------
    graph
        The island graph; it is left as it is.
    one, other
        Ids of the islands that it joins, different ones.
    at_one, at_other
        Where its current leaves the one and enters the other, mm.
    mounted_nh
        Its inductance as mounted, nH: see ``mounted.mounted_nh``.
    layer
        The outer layer that it is mounted on.
    ref
        What to call it.

    Raises
    ------
    SplitcheckError
        If an island is not in the graph, or both are the same.
    """
    _check_known(graph, (one, other))
    if one == other:
        raise SplitcheckError(one, "is one island, not two", "name two islands to be joined")
    middle = ((at_one[0] + at_other[0]) / 2, (at_one[1] + at_other[1]) / 2)
    new = PartBridge("capacitor", ref, one, other, at_one, at_other, middle, layer, mounted_nh)
    more: IslandGraph = graph.copy()
    _put_parts(more, [*all_parts(graph), new if one < other else new.turned()])
    return more


def _check_known(graph: IslandGraph, islands: Iterable[str]) -> None:
    for island in islands:
        if island not in graph:
            raise SplitcheckError(island, "is no island of this board", "name one of its islands")
