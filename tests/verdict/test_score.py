"""Noise, levels and the order of findings."""

from __future__ import annotations

from dataclasses import replace
from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.verdict.findings import Finding, Source
from splitcheck.verdict.rules import DEFAULT_CLASS, Class
from splitcheck.verdict.score import (
    LUMPED_SHARE,
    bandwidth_ghz,
    corner_ghz,
    crosstalk_mv,
    knee_ghz,
    level,
    noise_mv,
    noise_over_gap,
    slot_limit_mv,
    slot_ns_mm,
    worst_first,
)

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


def test_break_of_a_published_measurement_is_not_told_as_less() -> None:
    """D. C. Smith, Technical Tidbit, December 2002: almost 100 mV across a break of 50 mm.

    Step 300 mV in 0.3 ns, 50 ohm, 30 mm to the closed end. With 12.5 nH, a field solution of what
    the text describes, the lumped formula says 227 mV; the limit of the slot as a line is nearer.
    """
    step = replace(DEFAULT_CLASS, rise_ns=0.3, wave_mv=300.0)
    told = noise_over_gap(12.5, step, 30 * slot_ns_mm(4.3, 1.0))
    assert told.capped
    assert told.mv == pytest.approx(600 * 45 / 145)
    assert 100 < told.mv < noise_mv(12.5, step)


def test_delay_along_a_gap() -> None:
    """5.4 ps/mm on the face of woven glass, 6.92 inside it: sqrt(e)/c, e the mean of both sides."""
    assert slot_ns_mm(4.3, 1.0) == pytest.approx(5.43e-3, rel=2e-3)
    assert slot_ns_mm(4.3, 4.3) == slot_ns_mm(1.0, 7.6) == pytest.approx(6.92e-3, rel=1e-3)


@given(st.floats(1e-3, 100), drives, st.floats(0, 10))
def test_short_gaps_are_lumped(added_nh: float, drive: Class, part: float) -> None:
    """While a wave runs along the gap in less than a quarter of the rise time."""
    along_ns = LUMPED_SHARE * drive.rise_ns / (1 + part)
    assert noise_over_gap(added_nh, drive, along_ns) == (noise_mv(added_nh, drive), False)


@given(st.floats(1e-3, 1000), drives, st.floats(0, 10))
def test_long_gaps_make_no_more_than_lumped_ones(
    added_nh: float, drive: Class, along_ns: float
) -> None:
    """Capped means less than lumped, and not below the limit of the slot as a line."""
    lumped = noise_mv(added_nh, drive)
    told = noise_over_gap(added_nh, drive, along_ns)
    assert told.mv <= lumped
    assert told.capped == (told.mv < lumped)
    if told.capped:
        assert told.mv >= slot_limit_mv(drive)


@given(st.floats(1e-3, 1000), drives, st.floats(0, 5), st.floats(1, 10), st.floats(1, 10))
def test_noise_over_a_gap_grows_with_inductance_and_with_the_edge(
    added_nh: float, drive: Class, along_ns: float, more: float, faster: float
) -> None:
    """Also across the places where the formula changes."""
    base = noise_over_gap(added_nh, drive, along_ns).mv
    quick = replace(drive, rise_ns=drive.rise_ns / faster)
    assert noise_over_gap(added_nh * more, drive, along_ns).mv >= base * (1 - 1e-9)
    assert noise_over_gap(added_nh, quick, along_ns).mv >= base * (1 - 1e-9)


def test_crosstalk_of_one_net_over_a_slot() -> None:
    """1.8 nH of mutual inductance, 33 mA in 1 ns: 59 mV (M dI/dt)."""
    assert crosstalk_mv([(1.8, DEFAULT_CLASS)]) == pytest.approx(59.4, rel=0.01)


@given(st.lists(st.tuples(st.floats(-5, 5), drives), max_size=6))
def test_crosstalk_adds_up_and_knows_no_sign(others: list[tuple[float, Class]]) -> None:
    """Of n nets that switch together; exempt ones do not switch."""
    turned = [(-mutual, drive) for mutual, drive in others]
    asleep = [(mutual, replace(drive, exempt=True)) for mutual, drive in others]
    total = sum(crosstalk_mv([one]) for one in others)
    assert crosstalk_mv(others) == pytest.approx(total)
    assert crosstalk_mv(turned) == pytest.approx(total)
    assert crosstalk_mv([*others, *asleep]) == pytest.approx(total)


def test_knees_of_1_ns() -> None:
    """350, 318 and 500 MHz: three definitions in use, each by its name."""
    said = (bandwidth_ghz(1.0), corner_ghz(1.0), knee_ghz(1.0))
    assert said == pytest.approx((0.350, 0.318, 0.500), abs=5e-4)


@pytest.mark.parametrize(
    ("added_nh", "expected"), [(0.4, "note"), (0.5, "warning"), (1.9, "warning"), (2.0, "error")]
)
def test_levels_by_inductance(added_nh: float, expected: str) -> None:
    """A class may state nH: then noise below its thresholds does not make a finding milder."""
    strict = replace(DEFAULT_CLASS, error_nh=2.0, warning_nh=0.5)
    assert level(0.0, strict, added_nh) == expected
    assert level(0.0, DEFAULT_CLASS, added_nh) == "note"


@given(st.floats(0, 200), st.floats(0, 200), st.floats(0, 9), st.floats(0, 9))
def test_level_never_falls_with_more(mv: float, more: float, nh: float, more_nh: float) -> None:
    """Neither with noise nor with inductance."""
    strict = replace(DEFAULT_CLASS, error_nh=6.0, warning_nh=2.0)
    order = ("note", "warning", "error")
    before = order.index(level(mv, strict, nh))
    assert order.index(level(mv + more, strict, nh + more_nh)) >= before


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
