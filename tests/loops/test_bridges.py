"""The island graph: which islands plated holes join, and where."""

from __future__ import annotations

from random import Random

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import bridges_between, join_islands, stitched_near
from splitcheck.planes.islands import find_planes
from tests.making.hand import Sheet, board, islands_joined, via

LEFT, RIGHT = shapely.box(0, 0, 19, 30), shapely.box(21, 0, 40, 30)
WHOLE = shapely.box(0, 0, 40, 30)


def _made(*holes: tuple[float, float]) -> Board:
    return board(
        Sheet((("GND", LEFT), ("+5V", RIGHT))),
        Sheet((("GND", WHOLE),)),
        holes=[via(*at) for at in holes if at[0] < 19],
    )


def test_hole_joins_the_islands_that_it_touches() -> None:
    """The one over ground joins; the other supply stays alone."""
    graph = islands_joined(_made((5, 5), (7, 20)))
    assert sorted(graph.nodes) == ["L1.1", "L1.2", "L2.1"]
    assert [graph.nodes[node]["island"].net_name for node in sorted(graph.nodes)] == [
        "GND",
        "+5V",
        "GND",
    ]
    assert bridges_between(graph, "L1.1", "L2.1").tolist() == [[5, 5], [7, 20]]
    assert bridges_between(graph, "L2.1", "L1.1").tolist() == [[5, 5], [7, 20]]
    assert graph.edges["L1.1", "L2.1"]["wide_mm"].tolist() == [0.3, 0.3]
    assert bridges_between(graph, "L1.2", "L2.1").shape == (0, 2)


def test_hole_through_three_planes_joins_each_with_each() -> None:
    """And a blind one only what it reaches."""
    made = board(*[Sheet((("GND", WHOLE),))] * 3, holes=[via(5, 5), via(9, 9, (1, 2))])
    graph = islands_joined(made)
    assert {edge: len(bridges_between(graph, *edge)) for edge in graph.edges} == {
        ("L1.1", "L2.1"): 2,
        ("L1.1", "L3.1"): 1,
        ("L2.1", "L3.1"): 1,
    }


def test_small_copper_is_no_island_to_bridge_to() -> None:
    """A via's pad on the next layer carries no return anywhere."""
    made = board(
        Sheet((("GND", WHOLE),)),
        Sheet((("GND", shapely.box(4.7, 4.7, 5.3, 5.3)),)),
        holes=[via(5, 5)],
    )
    assert len(islands_joined(made).edges) == 0


@pytest.mark.parametrize(("reach_mm", "near"), [(4.9, False), (5.0, True), (9.0, True)])
def test_stitched_near_counts_from_hole_centres(reach_mm: float, *, near: bool) -> None:
    """The nearer of two holes is exactly 5 mm away."""
    graph = islands_joined(_made((5, 5), (1, 29)))
    assert stitched_near(graph, "L1.1", "L2.1", (8, 9), reach_mm) is near
    assert not stitched_near(graph, "L1.2", "L2.1", (8, 9), reach_mm)


spots = st.tuples(st.integers(1, 18), st.integers(1, 29))


@given(st.lists(spots, unique=True, max_size=12), st.randoms(use_true_random=False))
def test_order_of_holes_and_planes_does_not_matter(places: list[Point], random: Random) -> None:
    """The same graph with the same places in the same order."""
    one, other = _made(*places), _made(*random.sample(places, len(places)))
    first = join_islands(one, find_planes(one))
    second = join_islands(other, find_planes(other)[::-1])
    assert sorted(map(sorted, first.edges)) == sorted(map(sorted, second.edges))
    for a, b in first.edges:
        assert bridges_between(first, a, b).tolist() == bridges_between(second, a, b).tolist()
        assert bridges_between(first, a, b).tolist() == sorted(
            [float(x), float(y)] for x, y in places
        )
