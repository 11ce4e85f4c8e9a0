"""The island graph: islands of all layers, joined by the plated holes that touch both."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from typing import TypeAlias

import networkx as nx
import numpy as np

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.planes.islands import Island, Plane
from splitcheck.units import Floats

#: An island graph: nodes are island ids, edges carry ``at``, the sorted places of their bridges.
IslandGraph: TypeAlias = "nx.Graph[str]"


def join_islands(board: Board, planes: Sequence[Plane]) -> IslandGraph:
    """Build the graph of islands and the plated holes that bridge them.

    Parameters
    ----------
    board
        The board with its plated holes.
    planes
        All planes.

    Returns
    -------
    A graph whose nodes are ids of islands (attribute ``island``) and whose edges carry ``at``:
    places of the holes that join both, shape (n, 2), mm, sorted; and ``wide_mm``, their diameters.

    Notes
    -----
    Only copper and plated holes count. Capacitors join islands for fast currents as well, but
    nothing in the fabrication files alone says where they are.
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
        table = np.array(sorted(found))
        graph.add_edge(one, other, at=table[:, :2], wide_mm=table[:, 2])
    return graph


def bridges_between(graph: IslandGraph, one: str, other: str) -> Floats:
    """Places of the plated holes that join two islands, shape (n, 2), mm; may be empty."""
    if not graph.has_edge(one, other):
        return np.empty((0, 2))
    places: Floats = graph.edges[one, other]["at"]
    return places


def stitched_near(graph: IslandGraph, one: str, other: str, at: Point, reach_mm: float) -> bool:
    """Whether a plated hole joins two islands within a distance of a place."""
    places = bridges_between(graph, one, other)
    if not len(places):
        return False
    return bool(np.hypot(*(places - np.asarray(at)).T).min() <= reach_mm)
