"""Impedance of two ways, the frequency they swap at, and the resistance that goes into them."""

from __future__ import annotations

import cmath
from math import pi

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from splitcheck.loops.corner import (
    COPPER_OHM_MM,
    Way,
    corner_khz,
    detour_corner_khz,
    impedance_ohm,
    loop_nh_mm,
    return_width_mm,
    sheet_mohm,
    skin_depth_um,
    spread_mohm,
    swap_khz,
    ways,
)

ohms = st.floats(0.1, 100.0)
henries = st.floats(0.1, 300.0)


def test_the_return_leaves_the_easy_way_for_the_near_one() -> None:
    """10 mohm and 230 nH against 36 mohm and 70 nH (common practice, no source)."""
    easy, near = Way(10.0, 230.0), Way(36.0, 70.0)
    assert impedance_ohm(easy, [0.001])[0] == pytest.approx(1.45, abs=0.005)
    assert impedance_ohm(near, [0.001])[0] == pytest.approx(0.44, abs=0.005)
    assert swap_khz(easy, near) == pytest.approx(25, rel=0.02)


@given(ohms, henries, ohms, henries)
def test_at_the_swap_both_ways_have_one_impedance(
    r1: float, l1: float, r2: float, l2: float
) -> None:
    """Below it the way of less resistance has less, above it the way of less inductance."""
    one, other = Way(r1, l1), Way(r2, l2)
    swap = swap_khz(one, other)
    assert swap == swap_khz(other, one)
    if swap is None:
        assert (r1 - r2) * (l1 - l2) >= 0
        return
    at, far = [swap / 1e6], [1e3 * swap / 1e6 + 1.0]
    assert impedance_ohm(one, at)[0] == pytest.approx(impedance_ohm(other, at)[0], rel=1e-6)
    assert (impedance_ohm(one, [0.0])[0] < impedance_ohm(other, [0.0])[0]) == (r1 < r2)
    assert (impedance_ohm(one, far)[0] < impedance_ohm(other, far)[0]) == (l1 < l2)


def test_copper_has_the_values_of_handbooks() -> None:
    """IEC 60028: 1/58 ohm mm^2/m at 20 C. Depth 66 um at 1 MHz, 2.09 um at 1 GHz (from memory)."""
    assert skin_depth_um(0.001) == pytest.approx(66, rel=0.005)
    assert skin_depth_um(1.0) == pytest.approx(2.09, rel=0.005)
    assert sheet_mohm(35.0) == pytest.approx(1e3 / 58 / 35.0, rel=1e-6)
    assert sheet_mohm(35.0) == pytest.approx(0.49, abs=0.005)
    assert sheet_mohm(35.0, 1.0) == pytest.approx(8.2, rel=0.01)


@given(st.floats(5.0, 400.0), st.floats(-7.0, 1.0))
def test_sheet_resistance_is_the_real_part_of_the_surface_impedance(
    um: float, decade: float
) -> None:
    """(1 + j) rho/delta coth((1 + j) t/delta), by complex numbers."""
    depth_um = skin_depth_um(10**decade)
    argument = (1 + 1j) * min(um / depth_um, 300.0)
    truth = (1 + 1j) * 1e6 * COPPER_OHM_MM / depth_um / cmath.tanh(argument)
    assert sheet_mohm(um, 10**decade) == pytest.approx(truth.real, rel=1e-6)


@given(st.floats(5.0, 400.0), st.floats(-7.0, 1.0), st.floats(0.01, 1.0))
def test_resistance_rises_with_frequency_but_no_faster_than_it(
    um: float, decade: float, more: float
) -> None:
    """Which is why there is only one corner."""
    one, other = sheet_mohm(um, 10**decade), sheet_mohm(um, 10 ** (decade + more))
    # a foil 1.6 depths thick has 8 % less than one without end: there the rise is not even
    assert 0.9 * one <= other <= one * 10**more * (1 + 1e-9)
    assert one >= sheet_mohm(um) * (1 - 1e-9)


@pytest.mark.parametrize(("height", "above"), [(0.2, None), (1.5, None), (0.2, 0.4), (0.1, 0.8)])
def test_return_width_is_that_of_the_current_density(height: float, above: float | None) -> None:
    """(integral of K)^2 / integral of K^2 by quadrature; K by images."""

    def density(x: float) -> float:
        if above is None:
            return height / (pi * (x * x + height * height))
        turn = pi * height / above
        return float(np.sin(turn) / (2 * above) / (np.cosh(pi * x / above) - np.cos(turn)))

    end = np.inf if above is None else 20 * above
    whole = 2 * quad(density, 0, end)[0]
    square = 2 * quad(lambda x: density(x) ** 2, 0, end)[0]
    assert return_width_mm(height, above) == pytest.approx(whole**2 / square, rel=1e-6)


def test_resistance_of_the_return_under_a_trace() -> None:
    """0.39 ohm/m at 0.2 mm over 1 oz: 0.491 mohm per square over 2 pi 0.2 mm (by hand)."""
    direct, detour = ways(1000, 0.01, 3.0, height_mm=0.2, width_mm=0.36, copper_um=35.0)
    assert direct.resistance_mohm == pytest.approx(390, rel=0.01)
    more = detour.resistance_mohm - direct.resistance_mohm
    assert more == pytest.approx(1e-5 * direct.resistance_mohm, rel=0.02)
    assert detour.inductance_nh - direct.inductance_nh == pytest.approx(3.0)


@pytest.mark.parametrize("apart", [10.0, 40.0])
def test_a_way_round_resists_as_contacts_on_the_rim_of_a_sheet(apart: float) -> None:
    """Two half rings of radius a on the rim of half a plane, d apart: R = 2 Rs/pi ln(d/a).

    Two small contacts on a whole sheet have Rs/pi ln(d/a); on the rim, where only half the sheet
    is left, twice that (standard result, by images). A way that is pi a wide at first comes to it
    for d >> a, but for a constant: each doubling of d adds the same number of squares.
    """
    one, two = (spread_mohm(d, pi * 0.05, 35.0) for d in (apart, 2 * apart))
    truth = 2 * sheet_mohm(35.0) / pi * np.log(2)
    assert two - one == pytest.approx(truth, rel=0.01)


@pytest.mark.parametrize(("width", "impedance"), [(2.0, 89.9), (1.0, 126.6)])
def test_loop_of_a_line_in_air_has_its_impedance(width: float, impedance: float) -> None:
    """w/h = 2 and 1 in air: 90 and 127 ohm, and 1 nH/mm is 299.8 ohm (handbook, from memory)."""
    assert 299.792 * loop_nh_mm(1.0, width) == pytest.approx(impedance, rel=0.01)


def test_corner_of_a_resistance_and_an_inductance() -> None:
    """2.46 mohm and 20 nH meet at R/(2 pi L) = 19.6 kHz (by hand)."""
    assert corner_khz(2.46, 20.0) == pytest.approx(19.6, abs=0.05)
    assert corner_khz(2.46, 20.0, copper_um=35.0) == pytest.approx(19.6, abs=0.05)
    assert corner_khz(0.0, 20.0) is None
    assert corner_khz(2.46, 0.0) is None
    assert corner_khz(float("inf"), 1.0) is None


@given(st.floats(0.1, 1e5), st.floats(0.01, 100.0), st.floats(10.0, 300.0))
def test_at_the_corner_both_parts_are_equal(mohm: float, nh: float, um: float) -> None:
    """With the resistance that the copper has at that frequency."""
    corner = corner_khz(mohm, nh, copper_um=um)
    assert corner is not None
    resistance = mohm / 1e3 * sheet_mohm(um, corner / 1e6) / sheet_mohm(um)
    assert resistance == pytest.approx(2 * pi * corner / 1e6 * nh, rel=1e-5)


@given(st.floats(1.0, 50.0), st.floats(0.1, 30.0), st.floats(0.05, 2.0), st.floats(2.0, 5.0))
def test_corner_of_a_detour_follows_lengths(
    detour: float, nh: float, height: float, k: float
) -> None:
    """All lengths but the copper's times k leave the resistance and divide the corner by k."""
    one = detour_corner_khz(detour, nh, height_mm=height, copper_um=0.1)
    other = detour_corner_khz(k * detour, k * nh, height_mm=k * height, copper_um=0.1)
    assert one is not None
    assert other is not None
    # a foil of 0.1 um feels no skin effect below 100 GHz
    assert other == pytest.approx(one / k, rel=0.01)
    far = detour_corner_khz(detour, nh, height_mm=height, copper_um=0.1, above_mm=1e4 * height)
    assert far == pytest.approx(one, rel=0.01)
