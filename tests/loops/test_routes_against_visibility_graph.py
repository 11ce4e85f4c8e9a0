"""Shortest ways against a plain visibility graph: every corner with every corner, by networkx.

Lozano-Perez and Wesley, CACM 22 (1979), p. 560 (from memory): a shortest way among polygons bends
at their corners only.
"""

from __future__ import annotations

from itertools import combinations

import networkx as nx
import pytest
import shapely
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from shapely import LineString, Polygon

from splitcheck.copper.marks import Point
from splitcheck.loops.taut import CLEAR_MM, shortest
from splitcheck.loops.terrain import Terrain
from tests.making.hand import Line, Sheet, board, plane

WHOLE = shapely.box(0, 0, 40, 30)


def _by_visibility(holes: list[Polygon], start: Point, goal: Point) -> float:
    blocked = shapely.union_all(holes)
    inside = blocked.buffer(-1e-9)
    corners = [
        point
        for part in shapely.get_parts(blocked)
        for ring in (part.exterior, *part.interiors)
        for point in list(ring.coords)[:-1]
    ]
    graph: nx.Graph[Point] = nx.Graph()
    graph.add_nodes_from([start, goal])
    for one, other in combinations({start, goal, *corners}, 2):
        line = LineString([one, other])
        if not inside.intersects(line) and WHOLE.covers(line):
            graph.add_edge(one, other, weight=line.length)
    return float(nx.shortest_path_length(graph, start, goal, weight="weight"))


def _turned(x: int, y: int, wide: int, high: int, turn: int) -> Polygon:
    return shapely.affinity.rotate(shapely.box(x, y, x + wide, y + high), 15 * turn)


shapes = st.builds(
    _turned,
    st.integers(4, 30),
    st.integers(4, 22),
    st.integers(1, 8),
    st.integers(1, 8),
    st.integers(0, 11),
)
spots = st.tuples(st.integers(1, 39), st.integers(1, 29)).map(lambda p: (p[0] + 0.03, p[1] + 0.03))


@given(st.lists(shapes, min_size=1, max_size=7), spots, spots)
@settings(max_examples=60)
def test_shortest_way_is_that_of_the_visibility_graph(
    holes: list[Polygon], start: Point, goal: Point
) -> None:
    """Turned rectangles, overlapping or not: as short, but for keeping clear of their rims."""
    union = shapely.union_all(holes)
    copper = WHOLE.difference(union.buffer(5 * CLEAR_MM[0]))
    ends = [shapely.Point(start), shapely.Point(goal)]
    assume(isinstance(copper, Polygon))
    assume(all(copper.contains(end) for end in ends))
    left = WHOLE.difference(union)
    pieces = tuple(("GND", piece) for piece in shapely.get_parts(left))
    made = board(Sheet(lines=(Line("CLK", ((1, 1), (2, 1))),)), Sheet(pieces), outline=WHOLE)
    found = shortest(Terrain(plane(made, 2)), start, goal)
    assert found is not None
    truth = _by_visibility(holes, start, goal)
    assert truth - 1e-6 <= found[0]
    # each corner is passed at up to twice the clearance, so a way of n bends grows by 4 n of it
    assert found[0] <= truth + 4 * CLEAR_MM[0] * max(len(found[1]), 2)
    assert left.buffer(1e-9).covers(LineString(found[1]))


def test_ring_of_antipads() -> None:
    """A staggered field of 24 octagons between start and goal."""
    holes = [
        shapely.Point(12 + 2.5 * i, 9 + 3 * j + 1.5 * (i % 2)).buffer(1.2, quad_segs=2)
        for i in range(6)
        for j in range(4)
    ]
    left = WHOLE.difference(shapely.union_all(holes))
    assert isinstance(left, Polygon)
    made = board(
        Sheet(lines=(Line("CLK", ((1, 1), (2, 1))),)), Sheet((("GND", left),)), outline=WHOLE
    )
    found = shortest(Terrain(plane(made, 2)), (5.0, 13.7), (35.0, 14.9))
    assert found is not None
    truth = _by_visibility(holes, (5.0, 13.7), (35.0, 14.9))
    assert found[0] == pytest.approx(truth, abs=4 * CLEAR_MM[0] * len(found[1]))
    assert found[0] >= truth - 1e-6
