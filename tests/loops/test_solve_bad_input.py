"""Degenerate gaps, traces and distances: a value with its error, or a reason; never a NaN."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from shapely import LineString, Point, Polygon, box

from splitcheck.errors import SplitcheckError
from splitcheck.loops.solve import MAX_PANELS, Solution, Strap, TraceOver, ViaBridge, added

TRACE = TraceOver(LineString([(-20, 0), (20, 0)]), 0.2)
SLOT = box(-0.2, -4, 0.2, 4)
BOARD = box(-30, -20, 30, 20)


def sound(solution: Solution) -> float:
    """Check that nothing is undefined; the value of the first trace."""
    assert not np.isnan(solution.added_nh).any()
    assert not np.isnan(solution.error_nh).any()
    assert solution.panels <= MAX_PANELS
    value = solution.of(0)
    assert value is not None
    return value


@pytest.mark.parametrize("height", [0.0, -0.2, float("nan"), float("inf")])
def test_a_height_that_is_none_is_refused(height: float) -> None:
    """Nothing can be said of a trace in its own plane."""
    with pytest.raises(SplitcheckError, match="height_mm"):
        added([SLOT], [TRACE], height)


def test_distances_that_make_no_sense_are_refused() -> None:
    """Planes at zero distance, a plane above that lies below the trace, lines of no length."""
    with pytest.raises(SplitcheckError, match="beyond_mm"):
        added([SLOT], [TRACE], 0.2, beyond_mm=0.0)
    with pytest.raises(SplitcheckError, match="above_mm"):
        added([SLOT], [TRACE], 0.2, above_mm=0.15)
    with pytest.raises(SplitcheckError, match="no length"):
        added([SLOT], [TraceOver(LineString([(1, 1), (1, 1)]), 0.2)], 0.2)
    with pytest.raises(SplitcheckError, match="width"):
        added([SLOT], [TraceOver(TRACE.line, -1.0)], 0.2)


@pytest.mark.parametrize(
    "gap",
    [
        Polygon([(0, 0), (1, 1), (2, 2)]),
        Polygon([(0, -3), (1e-9, -3), (1e-9, 3), (0, 3)]),
        Polygon(),
    ],
    ids=["no area", "a hair", "empty"],
)
def test_a_gap_of_no_area_adds_nothing(gap: Polygon) -> None:
    """Less than the grid of the drawing is no gap."""
    assert sound(added([gap], [TRACE], 0.2)) == 0.0


def test_a_sliver_adds_little_and_stays_finite() -> None:
    """A slot of 2 um over 8 mm."""
    assert 0 < sound(added([box(-0.001, -4, 0.001, 4)], [TRACE], 0.2)) < 1.0


def test_a_ring_that_crosses_itself_is_read_as_its_parts() -> None:
    """A bow tie is two triangles that meet in a point."""
    bow = Polygon([(-1, -2), (1, 2), (-1, 2), (1, -2)])
    halves = [Polygon([(0, 0), (1, 2), (-1, 2)]), Polygon([(0, 0), (-1, -2), (1, -2)])]
    trace = TraceOver(LineString([(-20, 1), (20, 1)]), 0.2)
    assert sound(added([bow], [trace], 0.2)) == pytest.approx(sound(added(halves, [trace], 0.2)))


def test_repeated_points_on_line_and_gap_do_no_harm() -> None:
    """A doubled corner has no direction of its own."""
    line = LineString([(-20, 0), (-20, 0), (0, 0), (0, 0), (20, 0)])
    gap = Polygon([(-0.2, -4), (-0.2, -4), (0.2, -4), (0.2, 4), (0.2, 4), (-0.2, 4)])
    doubled = sound(added([gap], [TraceOver(line, 0.2)], 0.2))
    assert doubled == pytest.approx(sound(added([SLOT], [TRACE], 0.2)), rel=1e-3)


def test_a_trace_that_ends_in_the_gap_is_cut_short_and_said_so() -> None:
    """The part over nothing goes; the error grows by what it may add."""
    void = box(-3, -3, 3, 3)
    solution = added([void], [TraceOver(LineString([(-20, 0), (1, 0)]), 0.2)], 0.2)
    sound(solution)
    assert "ends in a gap" in solution.remarks[0]
    assert solution.error_nh[0, 0] > 0.5


def test_a_trace_with_its_own_antipad_adds_next_to_nothing() -> None:
    """Where a via comes down through the plane the trace ends in the antipad."""
    antipad = Point(5, 0).buffer(0.4)
    solution = added([antipad], [TraceOver(LineString([(-20, 0), (5, 0)]), 0.2)], 0.2)
    assert sound(solution) < 0.02
    assert solution.error_nh[0, 0] < 0.05


def test_a_trace_along_a_gap_has_a_value() -> None:
    """It runs inside a slot for 10 mm, entering and leaving at the ends."""
    alongside = added([box(-5, -0.3, 5, 0.3)], [TRACE], 0.2)
    assert 0 < sound(alongside) < 6


def test_a_trace_nowhere_over_copper_has_no_number() -> None:
    """It lies over a gap from end to end."""
    solution = added([box(-50, -5, 50, 5)], [TRACE], 0.2)
    assert solution.cut_off == (True,)
    assert solution.of(0) is None
    assert "nowhere over copper" in solution.remarks[0]


def test_a_gap_as_large_as_the_board_cuts_the_trace_off() -> None:
    """The gap from edge to edge leaves two islands and no bridge."""
    solution = added([box(-0.5, -30, 0.5, 30)], [TRACE, TRACE], 0.2, outside=BOARD)
    assert solution.cut_off == (True, True)
    assert np.isinf(np.diag(solution.added_nh)).all()
    assert not np.isnan(solution.added_nh).any()


def test_only_the_trace_that_enters_an_island_is_cut_off() -> None:
    """A moat round an island; one trace ends on it, the other passes over it."""
    moat = Polygon(box(-4, -4, 4, 4).exterior, [box(-3, -3, 3, 3).exterior])
    onto = TraceOver(LineString([(-20, 1), (0, 1)]), 0.2)
    solution = added([moat], [onto, TRACE], 0.2)
    assert solution.cut_off == (True, False)
    alone = added([moat], [TRACE], 0.2).of(0)
    assert solution.of(1) == pytest.approx(alone, rel=0.03)


def test_vias_on_one_side_only_are_no_way_back() -> None:
    """Two vias on the same island do not reach the other."""
    same_side = [ViaBridge(Point(-5, 0), 0.3), ViaBridge(Point(-5, 3), 0.3)]
    cut_ = box(-0.5, -30, 0.5, 30)
    solution = added([cut_], [TRACE], 0.2, beyond_mm=0.5, bridges=same_side, outside=BOARD)
    assert solution.cut_off == (True,)


def test_bridges_that_cannot_count_are_named() -> None:
    """A via in the gap, and vias to a plane that is not there."""
    there = added([SLOT], [TRACE], 0.2, beyond_mm=0.5, bridges=[ViaBridge(Point(0, 1), 0.3)])
    assert "does not stand on copper" in there.remarks[0]
    absent = added([SLOT], [TRACE], 0.2, bridges=[ViaBridge(Point(3, 1), 0.3)])
    assert "not there" in absent.remarks[0]


def test_no_traces_and_no_gaps_give_an_empty_or_zero_answer() -> None:
    """Nothing in, nothing out."""
    assert added([SLOT], [], 0.2).added_nh.shape == (0, 0)
    assert sound(added([], [TRACE], 0.2)) == 0.0


def test_ten_thousand_antipads_in_range_end_in_time() -> None:
    """The gaps that matter are solved for, the rest goes into the error."""
    places = [(x * 1.0, y * 1.0) for x in range(-50, 50) for y in range(-50, 50)]
    voids = list(shapely.buffer(shapely.points(places), 0.3, quad_segs=4))
    solution = added([*voids, box(-0.7, -4.2, 0.7, 4.2)], [TRACE], 0.2)
    assert sound(solution) > 1.0


def comb(teeth: int) -> Polygon:
    """A gap of many fingers, 30 mm long."""
    pitch = 40 / teeth
    fingers = [box(-20 + k * pitch, 0.0, -20 + (k + 0.5) * pitch, 30) for k in range(teeth)]
    whole = shapely.union_all([*fingers, box(-20, -0.5, 20.0, 0.01)])
    assert isinstance(whole, Polygon)
    return whole


def test_a_comb_of_hundreds_of_fingers_is_made_coarser() -> None:
    """More panels than can be solved are not tried."""
    trace = TraceOver(LineString([(0.0, -5), (0.0, 35)]), 0.1)
    assert sound(added([comb(300)], [trace], 0.1)) > 0


def test_a_comb_of_thousands_of_fingers_ends_in_time() -> None:
    """A value with its error, or a reason why there is none."""
    trace = TraceOver(LineString([(0.0, -5), (0.0, 35)]), 0.1)
    try:
        solution = added([comb(3000)], [trace], 0.1)
    except SplitcheckError as reason:
        assert "panels" in str(reason)  # noqa: PT017 (either outcome is sound)
    else:
        assert sound(solution) > 0


def test_a_strap_and_vias_share_the_current() -> None:
    """A capacitor beside a via pair: both carry part of it, together all of it."""
    cut_ = box(-0.5, -30, 0.5, 30)
    strap = Strap(LineString([(-1, 2), (1, 2)]), 0.5, 0.2, 0.6)
    vias = [ViaBridge(Point(-2, -2), 0.3), ViaBridge(Point(2, -2), 0.3)]
    solution = added([cut_], [TRACE], 0.2, beyond_mm=0.5, bridges=[strap, *vias], outside=BOARD)
    carried = solution.bridge_a[:, 0]
    assert -1 < carried[0] < 0
    assert carried[1] == pytest.approx(-carried[2])
    assert abs(carried[0]) + abs(carried[1]) == pytest.approx(1)
