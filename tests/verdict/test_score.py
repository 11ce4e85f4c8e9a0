"""Noise, levels and the order of findings."""

from __future__ import annotations

from dataclasses import replace
from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.verdict.findings import Finding, Source
from splitcheck.verdict.rules import DEFAULT_CLASS, Class
from splitcheck.verdict.score import level, noise_mv, worst_first

drives = st.builds(
    Class,
    st.just("some"),
    st.floats(0.05, 20),
    st.floats(100, 5000),
    st.floats(20, 120),
    st.just(100.0),
    st.just(33.0),
)


@pytest.mark.parametrize(
    ("added_nh", "rise_ns", "mv"), [(1, 1, 33), (3, 1, 99), (3, 0.3, 330), (10, 1, 330)]
)
def test_noise_of_a_3_3_v_driver_into_50_ohm(added_nh: float, rise_ns: float, mv: float) -> None:
    """Ramp into a series inductance between matched halves, 2 V tau/tr (1 - exp(-tr/tau))."""
    assert noise_mv(added_nh, replace(DEFAULT_CLASS, rise_ns=rise_ns)) == pytest.approx(
        mv, rel=0.01
    )


@given(st.floats(1e-4, 0.05), drives)
def test_small_inductance_is_l_di_dt(added_nh: float, drive: Class) -> None:
    """With dI = V / Z0 in the rise time."""
    if added_nh / drive.line_ohm < 0.05 * drive.rise_ns:
        slope = drive.wave_mv / drive.line_ohm / drive.rise_ns
        assert noise_mv(added_nh, drive) == pytest.approx(added_nh * slope, rel=0.01)


@given(st.floats(0, 1e4), st.floats(0, 1e3), drives)
def test_noise_grows_with_inductance_up_to_twice_the_wave(
    added_nh: float, more_nh: float, drive: Class
) -> None:
    """An open line reflects all of the wave, and no more."""
    low, high = noise_mv(added_nh, drive), noise_mv(added_nh + more_nh, drive)
    assert 0 <= low <= high * (1 + 1e-12) <= 2 * drive.wave_mv * (1 + 1e-9)


@given(st.floats(0.01, 100), st.floats(0.05, 10), st.floats(1, 10))
def test_slower_edge_makes_less_noise(added_nh: float, rise_ns: float, slower: float) -> None:
    """Never more than the faster one."""
    fast = noise_mv(added_nh, replace(DEFAULT_CLASS, rise_ns=rise_ns))
    slow = noise_mv(added_nh, replace(DEFAULT_CLASS, rise_ns=rise_ns * slower))
    assert slow <= fast * (1 + 1e-12)


@pytest.mark.parametrize(
    ("mv", "expected"),
    [
        (None, "error"),
        (100.0, "error"),
        (99.9, "warning"),
        (33.0, "warning"),
        (32.9, "note"),
        (0.0, "note"),
    ],
)
def test_levels_at_their_thresholds(mv: float | None, expected: str) -> None:
    """Thresholds belong to the worse level; no way back for the current is an error."""
    assert level(mv, DEFAULT_CLASS) == expected


def _finding(mv: float | None, nh: float | None, net: str) -> Finding:
    return Finding(
        id="", kind="slot-crossing", level=level(mv, DEFAULT_CLASS), net=net, net_class="default",
        layer="L1", plane_layer="L2", plane_net="GND", at_mm=(1.0, 2.0), gap_mm=1.0,
        detour_mm=1.0, added_nh=nh, error_nh=0.1, method="estimated", noise_mv=mv, rise_ns=1.0,
        corner_khz=None, stray_db=None, islands=(), bridges=(), gap="L2.g1", shares_gap_with=(),
        pair=None, source=Source("l1.gbr", 1), waived=None, fingerprint="", reason="",
    )  # fmt: skip


def test_worst_comes_first_whatever_the_order_before() -> None:
    """Level, then noise, then nH; at the end the name."""
    ranked = [
        _finding(None, None, "OPEN"),
        _finding(300.0, 9.0, "A"),
        _finding(200.0, 8.0, "A"),
        _finding(200.0, 7.0, "A"),
        _finding(50.0, 1.5, "A"),
        _finding(50.0, 1.5, "B"),
        _finding(5.0, 0.1, "A"),
    ]
    for seed in range(5):
        shuffled = Random(seed).sample(ranked, len(ranked))
        assert sorted(shuffled, key=worst_first) == ranked
