"""Laws of returns that get past a gap on the plane on the other side, and of their estimate."""

from __future__ import annotations

from math import log, pi, sin

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Point, box

from splitcheck.copper.marks import Point as Place
from splitcheck.loops.handover import over_holes
from splitcheck.loops.solve import Strap, TraceOver, ViaBridge, added
from splitcheck.units import MU0

HIGH, APART, WIDE = 0.2, 0.8, 0.3
laws = settings(max_examples=12, deadline=None)


def _over(run_mm: float) -> TraceOver:
    """A trace along x that goes on for 12 mm on either side of a run."""
    return TraceOver(LineString([(-run_mm / 2 - 12, 0), (run_mm / 2 + 12, 0)]), WIDE)


def _holes(run_mm: float, inside_mm: float, *ys: float) -> list[Place]:
    """Holes so far inside either rim, at these places across the trace."""
    return [(side * (run_mm / 2 + inside_mm), y) for y in ys for side in (-1.0, 1.0)]


def _added(run_mm: float, half_mm: float, holes: list[Place], beyond: float | None = None) -> float:
    vias = [ViaBridge(Point(at), 0.3, above=True) for at in holes]
    gap = box(-run_mm / 2, -half_mm, run_mm / 2, half_mm)
    value = added([gap], [_over(run_mm)], HIGH, above_mm=APART, beyond_mm=beyond, bridges=vias).of(
        0
    )
    assert value is not None
    return value


def _estimated(run_mm: float, holes: list[Place]) -> tuple[float, float]:
    ends = [
        ((side * run_mm / 2, 0.0), [(at, 0.3) for at in holes if at[0] * side > 0])
        for side in (-1.0, 1.0)
    ]
    value = over_holes(ends, run_mm, HIGH, WIDE, APART)
    return value.added_nh, value.error_nh


@laws
@given(
    st.floats(0.3, 4.0), st.floats(2.0, 10.0), st.floats(0.4, 4.0), st.floats(-4.0, 4.0),
    st.sampled_from([None, 0.3]),
)  # fmt: skip
def test_a_hole_to_the_other_plane_never_adds(
    run: float, half: float, inside: float, aside: float, beyond: float | None
) -> None:
    """Two are a way past the gap, four are never worse."""
    none = _added(run, half, [], beyond)
    two = _added(run, half, _holes(run, inside, aside), beyond)
    four = _added(run, half, _holes(run, inside, aside, aside + 1.0), beyond)
    assert 0 < four <= two + 1e-9
    assert two <= none + 1e-9


def test_one_hole_alone_is_no_way() -> None:
    """What leaves must come back: the other plane keeps no current."""
    assert _added(1.0, 5.0, [(2.0, 0.5)]) == pytest.approx(_added(1.0, 5.0, []), rel=1e-9)


def test_holes_to_either_plane_do_not_hinder_one_another() -> None:
    """A hole through three planes is a way down and a way up."""
    gap, trace = box(-0.5, -6, 0.5, 6), _over(1.0)
    down = [ViaBridge(Point(at), 0.3) for at in _holes(1.0, 1.0, 0.7)]
    up = [ViaBridge(Point(at), 0.3, above=True) for at in _holes(1.0, 1.0, 0.7)]
    strap = Strap(LineString([(-1, 3), (1, 3)]), 0.5, 0.3, 0.5)
    several: list[list[ViaBridge | Strap]] = [[], [*down], [*up], [*up, *down]]
    several.append([strap, *up, *down])
    values = [
        added([gap], [trace], HIGH, above_mm=APART, beyond_mm=0.5, bridges=some).of(0)
        for some in several
    ]
    none, below, above, both, all_three = (value or 0.0 for value in values)
    assert 0 < all_three < both < min(below, above)
    assert max(below, above) < none


def test_a_hole_to_a_plane_that_is_not_there_is_said() -> None:
    """Neither plane takes the other's holes."""
    gap, holes = box(-0.5, -6, 0.5, 6), _holes(1.0, 1.0, 0.7)
    up = [ViaBridge(Point(at), 0.3, above=True) for at in holes]
    found = added([gap], [_over(1.0)], HIGH, beyond_mm=0.5, bridges=up)
    assert [remark for remark in found.remarks if "not there" in remark] == list(found.remarks)
    assert len(found.remarks) == len(up)


def test_islands_cut_apart_come_together_by_the_other_plane() -> None:
    """A split right through a board: nothing without holes, a number with them."""
    gap, board = box(-1, -30, 1, 30), box(-20, -10, 20, 10)
    none = added([gap], [_over(2.0)], HIGH, above_mm=APART, outside=board)
    assert none.cut_off == (True,)
    vias = [ViaBridge(Point(at), 0.3, above=True) for at in _holes(2.0, 1.0, -1.0, 1.0)]
    some = added([gap], [_over(2.0)], HIGH, above_mm=APART, outside=board, bridges=vias).of(0)
    value, error = _estimated(2.0, _holes(2.0, 1.0, -1.0, 1.0))
    assert some == pytest.approx(value, abs=error)


@pytest.mark.parametrize("inside", [0.5, 1.0, 3.0])
@pytest.mark.parametrize("run", [0.5, 2.0, 6.0])
def test_the_estimate_holds_within_its_error(run: float, inside: float) -> None:
    """Of a gap that is far longer than its holes are away; the solve has none of its formulas."""
    holes = _holes(run, inside, -1.5, 0.8)
    value, error = _estimated(run, holes)
    assert _added(run, 40.0, holes) == pytest.approx(value, abs=error)


def test_along_a_long_run_it_is_the_trace_over_the_other_plane_alone() -> None:
    """What a longer run adds is the difference of two textbook lines, 0.24 nH/mm here.

    Images of a thin line: ln(2 d sin(pi h/d)/(pi r)) between planes, ln(2 (d - h)/r) over one; at
    h = 0.2, d = 0.8 mm ln(pi 0.6/(0.8 sin 45 deg)) = 1.2036, and mu0/2 pi = 0.2 nH/mm.
    """
    along = MU0 / (2 * pi) * log(pi * (APART - HIGH) / (APART * sin(pi * HIGH / APART)))
    assert along == pytest.approx(0.2407, abs=5e-5)
    longer, shorter = (_added(run, 40.0, _holes(run, 0.5, -0.8, 0.8)) for run in (12.0, 8.0))
    assert (longer - shorter) / 4 == pytest.approx(along, rel=0.04)


@given(st.floats(0.2, 20.0), st.floats(0.5, 8.0), st.floats(1.1, 3.0))
def test_the_estimate_grows_with_run_and_distance(run: float, inside: float, more: float) -> None:
    """Longer over the gap, or farther to the holes, is never better."""
    value, error = _estimated(run, _holes(run, inside, 0.0))
    assert error > 0
    assert value <= _estimated(run * more, _holes(run * more, inside, 0.0))[0]
    assert value <= _estimated(run, _holes(run, inside * more, 0.0))[0]
