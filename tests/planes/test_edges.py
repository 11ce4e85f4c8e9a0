"""Traces along the edges of planes, on boards one can draw."""

from __future__ import annotations

from collections.abc import Sequence
from math import cos, radians, sin

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import Polygon

from splitcheck.copper.marks import Point
from splitcheck.planes.crossings import judged_nets
from splitcheck.planes.edges import EdgeRun, find_edge_runs, widths_across
from splitcheck.planes.islands import find_planes, reference_nets
from splitcheck.planes.tracks import lay_all
from tests.making.hand import Line, Sheet, board

WHOLE = shapely.box(0, 0, 60, 40)


def _plane(*shapes: Polygon) -> Sheet:
    return Sheet(tuple(("GND", shape) for shape in shapes))


def _along(y: float, *net: str) -> Sheet:
    return Sheet(lines=(Line(net[0] if net else "CLK", ((10.0, y), (50.0, y))),))


def runs(
    *sheets: Sheet, heights_mm: Sequence[float] | None = None, near: float = 1.0
) -> tuple[EdgeRun, ...]:
    """The edge runs of a board."""
    made = board(*sheets, heights_mm=heights_mm, outline=WHOLE)
    nets = judged_nets(made, reference_nets(made))
    return find_edge_runs(made, find_planes(made), lay_all(made, nets, ()), near)


def test_trace_along_the_edge_is_found_with_its_distance() -> None:
    """40 mm of trace, 0.5 mm inside the edge at a height of 1 mm."""
    (run,) = runs(_along(0.5), _plane(WHOLE), heights_mm=[1.0])
    assert run.length_mm == pytest.approx(40.0)
    assert run.inside_mm == pytest.approx(np.full(len(run.inside_mm), 0.5))
    assert (run.layer, run.plane, run.line) == (1, 2, 1)


def test_trace_farther_in_than_its_height_is_none() -> None:
    """1.2 mm inside at a height of 1 mm; with two heights it is one."""
    assert runs(_along(1.2), _plane(WHOLE), heights_mm=[1.0]) == ()
    assert len(runs(_along(1.2), _plane(WHOLE), heights_mm=[1.0], near=2.0)) == 1


def test_another_plane_underneath_is_enough() -> None:
    """The second plane reaches farther out and carries the return there."""
    inner = _plane(shapely.box(0, 5, 60, 40))
    assert len(runs(_along(5.1), inner, heights_mm=[0.2])) == 1
    assert runs(_along(5.1), inner, _plane(WHOLE), heights_mm=[0.2, 0.5]) == ()


def test_antipads_slots_and_narrow_splits_are_no_edge() -> None:
    """A round hole, a slot, and a split of 0.3 mm beside the trace."""
    hole = WHOLE.difference(shapely.Point(30, 20.5).buffer(0.4))
    slot = WHOLE.difference(shapely.box(10, 20.1, 50, 22))
    assert isinstance(hole, Polygon)
    assert isinstance(slot, Polygon)
    assert runs(_along(20.0), _plane(hole), heights_mm=[0.2]) == ()
    assert runs(_along(20.0), _plane(slot), heights_mm=[0.2]) == ()
    split = _plane(shapely.box(0, 0, 60, 20.1), shapely.box(0, 20.4, 60, 40))
    assert runs(_along(20.0), split, heights_mm=[0.2]) == ()


def test_wide_split_is_an_edge() -> None:
    """A bare strip of 3 mm between two planes."""
    split = _plane(shapely.box(0, 0, 60, 20.1), shapely.box(0, 23.1, 60, 40))
    assert len(runs(_along(20.0), split, heights_mm=[0.2])) == 1


def test_trace_across_the_edge_counts_where_it_is_near() -> None:
    """Upright towards the edge: only its last millimetre."""
    upright = Sheet(lines=(Line("CLK", ((30.0, 20.0), (30.0, 0.1))),))
    (run,) = runs(upright, _plane(WHOLE), heights_mm=[1.0])
    assert run.length_mm == pytest.approx(0.9, abs=0.3)


def test_widths_across_a_trace() -> None:
    """A plane 60 by 40 mm: 40 mm across a level trace, 12 mm off its middle; holes do not count."""
    holed = WHOLE.difference(shapely.box(20, 10, 40, 20))
    assert isinstance(holed, Polygon)
    widths, offsets = widths_across(
        holed, np.array([[30.0, 8.0], [30.0, -5.0]]), np.array([[1.0, 0.0], [1.0, 0.0]]), 200.0
    )
    assert widths == pytest.approx(np.array([40.0, 40.0]))
    assert np.abs(offsets) == pytest.approx(np.array([12.0, 25.0]))


@given(st.sampled_from([30.0, 90.0, 137.5]), st.floats(-40.0, 40.0), st.floats(0.1, 0.9))
@settings(max_examples=10)
def test_moved_and_turned_board_has_the_same_runs(turn: float, move: float, inside: float) -> None:
    """Where the board lies in its files does not matter."""
    c, s = cos(radians(turn)), sin(radians(turn))

    def place(x: float, y: float) -> Point:
        return c * x - s * y + move, s * x + c * y - move

    plane = Polygon([place(x, y) for x, y in WHOLE.exterior.coords])
    line = Line("CLK", (place(10.0, inside), place(50.0, inside)))
    (run,) = runs(Sheet(lines=(line,)), _plane(plane), heights_mm=[1.0])
    assert run.length_mm == pytest.approx(40.0)
    assert run.inside_mm == pytest.approx(np.full(len(run.inside_mm), inside), abs=1e-6)
