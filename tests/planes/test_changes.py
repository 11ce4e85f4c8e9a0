"""Plated holes where the return of a trace changes planes, on boards one can draw."""

from __future__ import annotations

from collections.abc import Sequence

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.copper.holes import Hole
from splitcheck.planes.changes import PlaneChange, find_changes
from splitcheck.planes.crossings import judged_nets
from splitcheck.planes.islands import find_planes, reference_nets
from splitcheck.planes.tracks import lay_all
from tests.making.hand import Line, Sheet, board, via

WHOLE = shapely.box(0, 0, 40, 30)
ANTIPAD = shapely.Point(20, 15).buffer(0.5)
LEFT = Line("CLK", ((5.0, 15.0), (20.0, 15.0)))
RIGHT = Line("CLK", ((20.0, 15.0), (35.0, 15.0)))


def plane(net: str = "GND", shape: shapely.Polygon = WHOLE) -> Sheet:
    """A plane with the antipad of the hole in it."""
    return Sheet(tuple((net, piece) for piece in shapely.get_parts(shape.difference(ANTIPAD))))


def traces(*lines: Line) -> Sheet:
    """A layer with traces alone."""
    return Sheet(lines=lines)


def changes(made: Board) -> tuple[PlaneChange, ...]:
    """The changes of plane of a board."""
    nets = judged_nets(made, reference_nets(made))
    return find_changes(made, find_planes(made), lay_all(made, nets, ()))


def _through(*sheets: Sheet, holes: Sequence[Hole] = (), heights: Sequence[float] = ()) -> Board:
    return board(
        *sheets,
        holes=[via(20, 15), *holes],
        outline=WHOLE,
        heights_mm=heights or [0.2, *([1.0] * (len(sheets) - 3)), 0.2],
    )


def test_from_top_to_bottom_the_return_moves_from_plane_to_plane() -> None:
    """Four layers, two planes: all of it moves from the second to the third."""
    (found,) = changes(_through(traces(LEFT), plane(), plane(), traces(RIGHT)))
    assert (found.at, found.hole_mm, found.layers) == ((20.0, 15.0), 0.3, (1, 4))
    assert found.moved == {(2, 0): -1.0, (3, 0): 1.0}
    assert found.share == 1.0
    assert found.line == 1


def test_two_faces_of_one_plane_are_no_change() -> None:
    """Three layers, the plane in the middle: the return goes round the rim of the antipad."""
    assert changes(_through(traces(LEFT), plane(), traces(RIGHT))) == ()


def test_hole_without_a_trace_on_another_layer_is_no_change() -> None:
    """A pad at the end of a trace."""
    assert changes(_through(traces(LEFT), plane(), plane(), traces())) == ()


def test_trace_that_is_a_stub_on_one_layer_is_no_change() -> None:
    """0.8 mm to its part's pad: its return goes through the part."""
    stub = Line("CLK", ((20.0, 15.0), (20.8, 15.0)))
    assert changes(_through(traces(LEFT), plane(), plane(), traces(stub))) == ()


def test_stripline_moves_only_the_share_of_the_farther_plane() -> None:
    """From the top to between planes at 0.3 and 0.6 mm: a third goes on to the lower one."""
    made = _through(traces(LEFT), plane(), traces(RIGHT), plane(), heights=[0.2, 0.3, 0.6])
    (found,) = changes(made)
    assert found.layers == (1, 3)
    assert found.moved[4, 0] == pytest.approx(1 / 3)
    assert found.share == pytest.approx(1 / 3)


def test_three_layers_at_one_hole_are_looked_at_step_by_step() -> None:
    """Traces on the first, third and last layer: two changes."""
    middle = Line("CLK", ((20.0, 15.0), (20.0, 28.0)))
    made = _through(
        traces(LEFT), plane(), traces(middle), plane(), traces(RIGHT), heights=[0.2, 0.3, 0.3, 0.2]
    )
    found = changes(made)
    assert [change.layers for change in found] == [(1, 3), (3, 5)]
    assert [change.share for change in found] == [pytest.approx(0.5), pytest.approx(0.5)]


def test_hole_where_a_plane_begins_has_none_before() -> None:
    """Nothing beneath the trace on the top: no change from anything."""
    half = plane(shape=shapely.box(20, 0, 40, 30))
    assert changes(_through(traces(LEFT), half, half, traces(RIGHT))) == ()
