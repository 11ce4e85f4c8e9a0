"""Laws of the closed forms, and their limits against formulas of the trade."""

from __future__ import annotations

from math import acosh, e, inf, log, pi, sqrt

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.loops.estimate import (
    Inductance,
    added,
    beside_edge_nh_mm,
    between,
    handed_over,
    shielding,
    stub_nh,
    via_pair_nh,
)
from splitcheck.units import MU0

heights = st.floats(0.05, 2.0)
widths = st.floats(0.05, 2.0)
reaches = st.floats(0.01, 50.0)
gaps = st.floats(0.05, 10.0)
distances = st.floats(0.02, 10.0)


def _added(
    reach_mm: tuple[float, float],
    gap_mm: float = 0.5,
    height_mm: float = 0.2,
    width_mm: float = 0.2,
    *,
    beyond_mm: float | None = None,
    above_mm: float | None = None,
    share: float = 1.0,
) -> Inductance:
    found = added(
        reach_mm,
        (0.0, 0.0),
        gap_mm,
        height_mm,
        width_mm,
        beyond_mm=beyond_mm,
        above_mm=above_mm,
        share=share,
    )
    assert found is not None
    return found


def test_no_way_on_either_side_has_no_number() -> None:
    """Better none than an infinite one."""
    nothing = added((inf, inf), (0, 0), 1, 0.2, 0.2, beyond_mm=None, above_mm=None, share=1)
    assert nothing is None


@given(reaches, reaches, gaps, heights, widths)
def test_sides_may_be_swapped(
    left: float, right: float, gap: float, height: float, width: float
) -> None:
    """A mirrored board adds the same."""
    one = _added((left, right), gap, height, width)
    assert one == _added((right, left), gap, height, width)
    assert one.added_nh >= 0
    assert one.error_nh >= 0.01


@given(reaches, reaches, gaps, heights, widths, st.floats(0.2, 5.0))
def test_board_twice_the_size_adds_twice_the_inductance(
    left: float, right: float, gap: float, height: float, width: float, factor: float
) -> None:
    """Inductance scales with length, planes beyond included."""
    one = _added((left, right), gap, height, width, beyond_mm=height)
    sizes = [factor * size for size in (gap, height, width)]
    other = _added((factor * left, factor * right), *sizes, beyond_mm=factor * height)
    assert other.added_nh == pytest.approx(factor * one.added_nh, rel=1e-6, abs=1e-9)


@given(st.floats(1.5, 40.0), st.floats(0.05, 10.0))
def test_longer_slot_adds_more(reach: float, more: float) -> None:
    """With both ends farther off, and with one."""
    short, long = _added((reach, reach)), _added((reach + more, reach + more))
    assert long.added_nh > short.added_nh
    assert _added((reach, reach + more)).added_nh >= short.added_nh


@given(reaches, st.floats(0.001, 10.0), gaps, heights, widths)
def test_longer_slot_never_adds_less_than_the_error_allows(
    reach: float, more: float, gap: float, height: float, width: float
) -> None:
    """Where the form along a gap hands over to the one across it, error bars overlap."""
    short = _added((reach, reach), gap, height, width)
    long = _added((reach + more, reach + more), gap, height, width)
    assert long.added_nh + long.error_nh >= short.added_nh - short.error_nh


@given(st.floats(2.0, 40.0), st.floats(0.05, 0.6), st.floats(0.01, 0.5))
def test_wider_slot_adds_more(reach: float, gap: float, more: float) -> None:
    """The more so the longer the run of the trace over nothing."""
    assert _added((reach, reach), gap + more).added_nh > _added((reach, reach), gap).added_nh


@given(st.floats(1.0, 40.0), heights, st.floats(0.01, 2.0))
def test_higher_trace_never_adds_more(reach: float, height: float, more: float) -> None:
    """The return has spread before the slot is met."""
    near, far = (stub_nh(reach, 0.5, h, 0.2) for h in (height, height + more))
    assert far <= near


@given(reaches, gaps, heights, widths)
def test_one_side_open_adds_more_than_both_closed(
    reach: float, gap: float, height: float, width: float
) -> None:
    """Two ways in parallel are better than one of them, and at best twice as good."""
    both = _added((reach, reach), gap, height, width).added_nh
    one = _added((reach, inf), gap, height, width).added_nh
    assert both <= one * (1 + 1e-9)
    assert one <= 2 * both * (1 + 1e-9) + 1e-12


@given(reaches, reaches, st.floats(0.01, 1.0))
def test_plane_with_a_share_adds_the_square_of_it(left: float, right: float, share: float) -> None:
    """Energy goes with the square of the current."""
    whole, part = _added((left, right)), _added((left, right), share=share)
    assert part.added_nh == pytest.approx(share**2 * whole.added_nh)


@given(gaps, distances, st.floats(0.001, 5.0))
def test_nearer_plane_beyond_shields_more(gap: float, beyond: float, more: float) -> None:
    """From nothing left right on it to all left far away."""
    near, far = shielding(beyond, gap, 5.0, 0.2), shielding(beyond + more, gap, 5.0, 0.2)
    assert 0 < near <= far < 1
    assert shielding(1e6 * gap, gap, 5.0, 0.2) == pytest.approx(1.0, abs=1e-5)
    assert shielding(1e-6 * gap, gap, 5.0, 0.2) == pytest.approx(0.0, abs=1e-5)


@given(st.floats(0.01, 1.0), st.floats(0.01, 1.0))
def test_planes_on_both_sides_shield_more_than_either(below: float, above: float) -> None:
    """And in either order the same."""
    both = between(below, above)
    assert both == pytest.approx(between(above, below))
    assert both <= min(below, above) * (1 + 1e-12)
    assert both >= below * above / (below + above)


@given(st.floats(2.0, 30.0), distances, distances)
def test_solid_planes_near_a_slot_never_add(reach: float, beyond: float, above: float) -> None:
    """One more plane, never a higher number."""
    none = _added((reach, reach)).added_nh
    one = _added((reach, reach), beyond_mm=beyond).added_nh
    two = _added((reach, reach), beyond_mm=beyond, above_mm=above).added_nh
    assert two <= one <= none


def test_bridge_is_added_to_its_side() -> None:
    """In series with the one way there is; the plane beyond does not shield it."""
    where = {"beyond_mm": 0.5, "above_mm": None, "share": 1.0}
    bare = added((5, inf), (0, 0), 0.5, 0.2, 0.2, **where)  # type: ignore[arg-type]
    bridged = added((5, inf), (1.5, 0), 0.5, 0.2, 0.2, **where)  # type: ignore[arg-type]
    assert bare is not None
    assert bridged is not None
    assert bridged.added_nh == pytest.approx(bare.added_nh + 1.5)


def test_bridge_right_beside_the_trace_still_counts() -> None:
    """Nearer than the return is wide, what is left is the bridge itself."""
    found = added((0, inf), (1.5, 0), 0.5, 0.2, 0.2, beyond_mm=None, above_mm=None, share=1)
    assert found is not None
    assert 1.5 <= found.added_nh <= 1.6


@pytest.mark.parametrize(
    ("inside_h", "nh_per_m"),
    [
        (20, 0.06),
        (10, 0.25),
        (5, 0.98),
        (3, 2.6),
        (2, 5.4),
        (1, 15.8),
        (0, 69.3),
        (-1, 192),
        (-3, 366),
    ],
)
def test_trace_beside_an_edge(inside_h: float, nh_per_m: float) -> None:
    """Half-plane by the conformal map w = sqrt(z): the increase over a whole plane."""
    found = 1000 * beside_edge_nh_mm(inside_h * 0.3, 0.3)
    assert found == pytest.approx(nh_per_m, rel=0.02, abs=0.006)


@given(st.floats(-20, 20), st.floats(0.001, 5), heights)
def test_farther_outside_the_edge_costs_more(inside: float, more: float, height: float) -> None:
    """Never less than nothing, deep inside too where digits are lost."""
    near, far = beside_edge_nh_mm(inside, height), beside_edge_nh_mm(inside - more, height)
    assert far > near >= -1e-12


def test_far_outside_the_edge_grows_with_the_logarithm() -> None:
    """Twice as far: mu0/(2 pi) ln 2 more, as of a wire."""
    step = beside_edge_nh_mm(-400, 0.2) - beside_edge_nh_mm(-200, 0.2)
    assert step == pytest.approx(MU0 / (2 * pi) * log(2), rel=1e-3)


@pytest.mark.parametrize(
    ("apart_mm", "height_mm", "nh"),
    [
        (0.6, 0.2, 0.105),
        (1, 0.2, 0.150),
        (2, 0.8, 0.83),
        (5, 1.6, 2.24),
        (10, 0.8, 1.34),
        (20, 1.6, 3.13),
    ],
)
def test_via_pair_against_the_two_wire_line(apart_mm: float, height_mm: float, nh: float) -> None:
    """mu0 h/pi acosh(s/D), barrels of 0.3 mm (textbook); to the digits printed."""
    assert via_pair_nh(apart_mm, 0.3, height_mm) == pytest.approx(nh, abs=0.006)
    assert via_pair_nh(apart_mm, 0.3, height_mm) == pytest.approx(
        MU0 * height_mm / pi * acosh(apart_mm / 0.3)
    )


def test_barrels_that_touch_do_not_break_it() -> None:
    """Two holes side by side, or the same hole twice: small and finite."""
    assert 0 < via_pair_nh(0.0, 0.3, 0.2) < 0.05


@pytest.mark.parametrize("reach_mm", [10.0, 20.0, 40.0])
def test_long_slot_against_the_slot_as_a_dipole(reach_mm: float) -> None:
    """Booker (1946): pi mu0 D/8 / (ln(2 D/g) - 1) for a slot in an infinite plane, trace near it.

    The trace takes off what the return has spread by at its height, so the estimate lies below.
    """
    length_mm = 2 * reach_mm
    dipole_nh = pi * MU0 * length_mm / 8 / (log(2 * length_mm / 1.0) - 1)
    found = _added((reach_mm, reach_mm), 1.0, 0.01, 0.01).added_nh
    assert found == pytest.approx(dipole_nh, rel=0.12)
    assert _added((reach_mm, reach_mm), 1.0, 0.2, 0.2).added_nh < dipole_nh


@given(distances, st.floats(1, 1e4), st.floats(0.01, 1.0))
def test_share_handed_over_is_radial_spreading_on_both_sides(
    planes: float, area: float, share: float
) -> None:
    """2 mu0 d/(2 pi) ln(R/d) for islands much larger than the spacing; never negative."""
    found = handed_over(planes, area, share)
    assert found.added_nh > 0
    radius = sqrt(area / pi)
    if radius > 3 * planes:
        spread_nh = MU0 * planes / pi * log(radius / planes)
        assert found.added_nh == pytest.approx(share**2 * spread_nh)
    assert found.error_nh >= found.added_nh


def test_narrower_slot_tends_to_nothing() -> None:
    """As one over the logarithm of its width: slowly, but to nothing."""
    narrow = [_added((5, 5), 10.0**-n).added_nh for n in range(1, 12)]
    assert sorted(narrow, reverse=True) == narrow
    one, other = (log(4 * 5 / (e * gap_mm)) for gap_mm in (1e-6, 1e-11))
    assert narrow[5] / narrow[10] == pytest.approx(other / one, rel=1e-3)
    assert stub_nh(0.0, 0.5, 0.2, 0.2) == 0.0
