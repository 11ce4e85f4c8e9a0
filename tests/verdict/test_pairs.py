"""Legs of differential pairs over gaps: odd mode, unbalance, and pairs that are none in deed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from math import pi

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.pairs import find_pairs
from splitcheck.units import MU0
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.pairs import coupling, odd_nh, open_odd_nh, pair_rows
from splitcheck.verdict.rules import DEFAULT_CLASS
from splitcheck.verdict.score import noise_mv
from tests.making.hand import Line, Sheet, board, crossings, scene

WHOLE = shapely.box(0, 0, 40, 30)
#: 1 mm wide, 10 mm long, upright, middle of the board.
SLOT = shapely.box(19.5, 10, 20.5, 20)
CUT = shapely.box(19.5, -1, 20.5, 31)


def _legs(*ys: float, names: Sequence[str] = ("TX_P", "TX_N")) -> list[Line]:
    return [Line(net, ((2, y), (38, y))) for net, y in zip(names, ys, strict=True)]


def _judged(lines: Sequence[Line], hole: shapely.Geometry) -> dict[str, Finding]:
    left = shapely.get_parts(WHOLE.difference(hole))
    plane = Sheet(tuple(("GND", piece) for piece in left))
    made = board(Sheet(lines=tuple(lines)), plane, outline=WHOLE)
    nets = [net.number for net in made.nets if net.name != "GND"]
    seen = replace(scene(made), pairs=find_pairs(made, nets))
    return {f.net: f for f in judge(seen, *crossings(made)).findings}


def test_both_legs_over_one_slot_are_judged_in_odd_mode() -> None:
    """Side by side over the middle of a slot: L11 + L22 - 2 L12 of the solved matrix."""
    found = _judged(_legs(14.8, 15.2), SLOT)
    one, other = found["TX_P"], found["TX_N"]
    (share,) = one.shares_gap_with
    assert share.mutual_nh is not None
    assert one.added_nh is not None
    assert other.added_nh is not None
    assert (one.pair, other.pair) == ("TX_N", "TX_P")
    odd = one.added_nh + other.added_nh - 2 * share.mutual_nh
    assert one.odd_nh == other.odd_nh == pytest.approx(odd)
    assert one.unbalance_nh == pytest.approx(abs(one.added_nh - other.added_nh))
    assert one.noise_mv == pytest.approx(noise_mv(odd / 2, DEFAULT_CLASS))
    assert one.level == "note"
    assert one.gap == other.gap
    assert "as a pair with TX_N" in one.reason


def test_nets_that_are_no_pair_keep_their_own_noise() -> None:
    """The same two traces with other names and too far apart for geometry: a warning each."""
    found = _judged(_legs(14, 16, names=("A", "B")), SLOT)
    assert {f.level for f in found.values()} == {"warning"}
    assert all((f.pair, f.odd_nh, f.unbalance_nh) == (None, None, None) for f in found.values())


def test_leg_that_crosses_alone_is_unbalanced_altogether() -> None:
    """The slot ends between the legs: what one leg gains turns into common mode."""
    found = _judged(_legs(19.6, 20.2), SLOT.buffer(0.0))
    assert set(found) == {"TX_P"}
    leg = found["TX_P"]
    assert leg.pair == "TX_N"
    assert leg.unbalance_nh == leg.odd_nh == leg.added_nh
    assert leg.noise_mv == pytest.approx(noise_mv(leg.added_nh or 0.0, DEFAULT_CLASS))
    assert "not broken here" in leg.reason


def test_pair_by_name_whose_legs_keep_apart_is_judged_leg_by_leg() -> None:
    """5 mm apart over one slot: noise of each alone, and the reason says why."""
    found = _judged(_legs(12.5, 17.5), SLOT)
    alone = _judged(_legs(12.5, 17.5, names=("A", "B")), SLOT)
    leg = found["TX_P"]
    assert (leg.pair, leg.odd_nh) == ("TX_N", None)
    assert leg.noise_mv == alone["A"].noise_mv
    assert "judged by itself" in leg.reason


def test_pair_over_a_full_cut_is_a_warning_not_an_error() -> None:
    """Each leg alone has no way back; together they carry one another's return across 1 mm."""
    found = _judged(_legs(14.8, 15.2), CUT)
    one = found["TX_P"]
    assert one.added_nh is None
    # two wires 0.4 mm apart at 0.2 mm: ln(1 + (0.4 / 0.4)^2) = ln 2
    assert one.odd_nh == pytest.approx(MU0 / (2 * pi) * 0.693147, rel=1e-4)
    assert (one.level, one.unbalance_nh) == ("warning", None)
    assert _judged(_legs(14, 16, names=("A", "B")), CUT)["A"].level == "error"


def test_rows_of_the_report_name_the_positive_leg_first() -> None:
    """By name, with distance and length."""
    made = board(Sheet(lines=tuple(_legs(15.2, 14.8, names=("B_N", "B_P")))), Sheet())
    (row,) = pair_rows(made, find_pairs(made, [net.number for net in made.nets]))
    assert (row.nets, row.known_by) == (("B_P", "B_N"), "name and geometry")
    assert row.apart_mm == pytest.approx(0.4)
    assert row.coupled_mm == pytest.approx(36.0)


@pytest.mark.parametrize(("apart_mm", "k"), [(1, 0.89), (2, 0.79), (5, 0.57), (10, 0.33)])
def test_coupling_against_a_sheet_solver(apart_mm: float, k: float) -> None:
    """A stream-function sheet solver, slot 20 x 1 mm, h 0.2 mm (computed for this purpose)."""
    assert coupling(apart_mm, 20.0) == pytest.approx(k, rel=0.05)


@given(st.floats(0.0, 20.0), st.floats(0.0, 20.0), st.floats(0.0, 1.0))
def test_odd_mode_lies_between_nothing_and_both_legs(one: float, other: float, k: float) -> None:
    """Coupling only ever helps; without it the legs add up."""
    mutual = k * (one * other) ** 0.5
    assert 0.0 <= odd_nh(one, other, mutual) <= one + other + 1e-12
    assert odd_nh(one, other, 0.0) == pytest.approx(one + other)
    assert odd_nh(one, one, one) == pytest.approx(0.0)


@given(st.floats(0.05, 5.0), st.floats(0.05, 5.0), st.floats(0.1, 20.0))
def test_tight_pair_hardly_needs_a_plane(apart: float, height: float, gap: float) -> None:
    """Over a gap it gains less the closer its legs are, and in proportion to the way."""
    assert open_odd_nh(apart, height, gap) <= open_odd_nh(2 * apart, height, gap)
    assert open_odd_nh(apart, height, 2 * gap) == pytest.approx(2 * open_odd_nh(apart, height, gap))
    assert open_odd_nh(apart, None, gap) == 0.0


def test_how_the_legs_are_drawn_does_not_matter() -> None:
    """One leg drawn from the right to the left: its mutual inductance has the other sign."""
    there = _judged(_legs(14.8, 15.2), SLOT)["TX_P"]
    legs = _legs(14.8, 15.2)
    back = _judged([legs[0], Line(legs[1].net, legs[1].points[::-1])], SLOT)["TX_P"]
    assert back.odd_nh == pytest.approx(there.odd_nh, rel=1e-3)
