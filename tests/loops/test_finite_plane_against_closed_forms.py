"""Common-mode inductance over a plane of finite width: exact values, limit and laws."""

from __future__ import annotations

from math import pi

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.loops.estimate import beside_edge_nh_mm
from splitcheck.loops.finite_plane import common_nh_mm
from splitcheck.units import MU0


def _common(width: float, offset: float, height: float) -> float:
    return float(common_nh_mm(np.array([width]), np.array([offset]), height)[0])


@pytest.mark.parametrize(
    ("width", "offset", "height", "nh_m"),
    [(100.0, 0.0, 1.0, 4.00), (100.0, 45.0, 1.0, 9.13), (20.0, 9.0, 1.0, 41.9)],
)
def test_common_mode_against_the_exact_map(
    width: float, offset: float, height: float, nh_m: float
) -> None:
    """mu0/2 pi ln|w0| by Joukowski's map, evaluated independently (strip, W, x, h in mm)."""
    assert 1000 * _common(width, offset, height) == pytest.approx(nh_m, rel=2e-3)


@pytest.mark.parametrize(
    ("over_h", "nh_m"),
    [
        (20, 0.06), (10, 0.25), (5, 0.98), (3, 2.6), (2, 5.4), (1, 15.8), (0.5, 32.0),
        (0, 69.3), (-1, 192.0), (-3, 366.0),
    ],
)  # fmt: skip
def test_loop_beside_an_edge_against_the_half_plane(over_h: float, nh_m: float) -> None:
    """mu0/2 pi ln(2 sqrt(rho (rho - s)/2)/h) by the map w = sqrt(z), evaluated independently."""
    assert 1000 * beside_edge_nh_mm(over_h * 0.7, 0.7) == pytest.approx(nh_m, rel=0.02, abs=0.005)


@given(st.floats(20.0, 200.0), st.floats(0.0, 0.8), st.floats(0.05, 0.5))
def test_far_from_the_edge_it_is_the_simple_form(width: float, part: float, height: float) -> None:
    """mu0 h/(pi W) / sqrt(1 - (2x/W)^2) while the edge is many heights off."""
    offset = part * width / 2
    simple = MU0 * height / (pi * width) / (1 - part**2) ** 0.5
    assert _common(width, offset, height) == pytest.approx(simple, rel=0.05)


@given(st.floats(5.0, 200.0), st.floats(0.0, 1.5), st.floats(0.05, 3.0), st.floats(1.05, 3.0))
def test_nearer_to_the_edge_higher_or_narrower_is_worse(
    width: float, part: float, height: float, more: float
) -> None:
    """And the two sides of the plane are alike."""
    offset = part * width / 2
    here = _common(width, offset, height)
    assert here > 0
    assert _common(width, -offset, height) == pytest.approx(here)
    assert _common(width, offset * more + 0.01, height) >= here
    assert _common(width, offset, height * more) >= here
    assert _common(width / more, offset, height) >= here
