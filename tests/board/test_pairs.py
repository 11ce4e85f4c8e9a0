"""Differential pairs by name and by geometry, on boards one can draw."""

from __future__ import annotations

from collections.abc import Sequence
from math import cos, radians, sin

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.pairs import Pair, find_pairs, legs_of
from splitcheck.errors import SplitcheckError
from tests.making.hand import Line, Sheet, board

GROUND = Sheet(areas=(("GND", shapely.box(0, 0, 60, 30)),))


def _pairs(
    lines: Sequence[Line], explicit: Sequence[tuple[str, str]] = ()
) -> list[tuple[str, str, str]]:
    made, found = _found(lines, explicit)
    return [(made[pair.nets[0]], made[pair.nets[1]], pair.known_by) for pair in found]


def _found(
    lines: Sequence[Line], explicit: Sequence[tuple[str, str]] = ()
) -> tuple[dict[int, str], tuple[Pair, ...]]:
    made = board(Sheet(lines=tuple(lines)), GROUND)
    names = {net.number: net.name for net in made.nets}
    nets = [number for number, name in names.items() if name != "GND"]
    return names, find_pairs(made, nets, explicit)


def _side_by_side(*nets: str, apart_mm: float = 0.4, length_mm: float = 40.0) -> list[Line]:
    return [
        Line(net, ((5.0, 5.0 + n * apart_mm), (5.0 + length_mm, 5.0 + n * apart_mm)))
        for n, net in enumerate(nets)
    ]


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("USB_D+", "USB_D-"),
        ("/usb/D+", "/usb/D-"),
        ("USB_DP", "USB_DM"),
        ("USB1-DP", "USB1-DM"),
        ("TX0_P", "TX0_N"),
        ("LVDS_P3", "LVDS_N3"),
        ("IO_L10P_34", "IO_L10N_34"),
        ("HTX2P", "HTX2N"),
        ("CLK.P", "CLK.N"),
        ("CANH", "CANL"),
        ("CAN_H", "CAN_L"),
        ("CAN1_H", "CAN1_L"),
        ("DQS0_T", "DQS0_C"),
        ("CK", "CK#"),
        ("AIN_POS", "AIN_NEG"),
        ("MDI[3]+", "MDI[3]-"),
        ("Net-(U12-IN+)", "Net-(U12-IN-)"),
        ("R86|USB0_D_P", "R87|USB0_D_N"),
    ],
)
def test_habits_of_the_trade_name_a_pair(one: str, other: str) -> None:
    """Names alone, 10 mm apart; the positive leg is told first whatever the order on the board."""
    lines = _side_by_side(other, one, apart_mm=10.0)
    assert _pairs(lines) == [(one, other, "name")]


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("D0_P", "D1_N"),
        ("TX_P", "RX_N"),
        ("TX_P", "TX"),
        ("RESET_N", "RESET"),
        ("SDA", "SCL"),
        ("ADDR_H", "ADDR_L"),
        ("Net-(U1-PadP1)", "Net-(U1-PadN1)"),
        ("NetU1_P5", "NetU1_N5"),
        ("STEP", "STEN_"),
    ],
)
def test_other_names_name_none(one: str, other: str) -> None:
    """Another digit, another stem, one leg only, active-low signals, balls of a package."""
    assert _pairs(_side_by_side(one, other, apart_mm=10.0)) == []


def test_two_candidates_for_a_leg_are_none() -> None:
    """Two nets that both could be the negative leg: nobody can tell which."""
    lines = _side_by_side("A_P", "A_N", "a_n", apart_mm=6.0)
    assert _pairs(lines) == []


def test_geometry_alone_tells_a_pair() -> None:
    """Two traces of equal width at one spacing, alone: distance and length are those drawn."""
    _, (pair,) = _found(_side_by_side("X", "Y"))
    assert pair.known_by == "geometry"
    assert pair.apart_mm == pytest.approx(0.4)
    assert pair.coupled_mm == pytest.approx(40.0)
    assert pair.coupled


def test_names_and_geometry_agree() -> None:
    """A pair by both says so."""
    assert _pairs(_side_by_side("TX_P", "TX_N")) == [("TX_P", "TX_N", "name and geometry")]


def test_bus_is_no_pair() -> None:
    """Three traces at one spacing: each of the inner ones has two neighbours."""
    assert _pairs(_side_by_side("D0", "D1", "D2")) == []


def test_named_pairs_in_a_bus_of_pairs_stay_pairs() -> None:
    """Two pairs side by side at one spacing: by geometry a bus, by name two pairs."""
    found = _pairs(_side_by_side("A_P", "A_N", "B_P", "B_N"))
    assert found == [("A_P", "A_N", "name"), ("B_P", "B_N", "name")]


def test_unequal_widths_wide_spacing_or_short_way_are_no_pair() -> None:
    """Each thing that a pair by geometry needs, missing."""
    wide = [Line("X", ((5, 5), (45, 5)), 0.2), Line("Y", ((5, 5.5), (45, 5.5)), 0.4)]
    assert _pairs(wide) == []
    assert _pairs(_side_by_side("X", "Y", apart_mm=0.9)) == []
    assert _pairs(_side_by_side("X", "Y", length_mm=4.0)) == []
    strays = [Line("X", ((5, 5), (45, 5))), Line("Y", ((5, 5.4), (25, 5.4), (25, 25)))]
    assert _pairs(strays) == []


def test_named_pair_apart_is_not_coupled() -> None:
    """Its legs never run side by side."""
    _, (pair,) = _found(_side_by_side("TX_P", "TX_N", apart_mm=10.0))
    assert (pair.apart_mm, pair.coupled_mm, pair.coupled) == (None, 0.0, False)


def test_explicit_pair_wins_over_names() -> None:
    """What the rules say comes first; the left-over leg is none."""
    lines = _side_by_side("TX_P", "TX_N", "AUX", apart_mm=8.0)
    assert _pairs(lines, [("TX_P", "AUX")]) == [("TX_P", "AUX", "rules")]


@pytest.mark.parametrize(
    "explicit", [[("TX_P", "NOT_THERE")], [("TX_P", "TX_N"), ("TX_P", "AUX")], [("AUX", "AUX")]]
)
def test_explicit_pair_that_cannot_be_is_an_error(explicit: list[tuple[str, str]]) -> None:
    """An unknown net, and a net in two pairs."""
    with pytest.raises(SplitcheckError, match="pairs: "):
        _found(_side_by_side("TX_P", "TX_N", "AUX", apart_mm=8.0), explicit)


@given(st.floats(0.0, 360.0), st.floats(-20.0, 20.0), st.booleans())
def test_turned_moved_or_mirrored_pair_is_the_same(turn: float, move: float, mirror: bool) -> None:
    """Where the board lies in its files does not matter."""
    c, s = cos(radians(turn)), sin(radians(turn))

    def place(x: float, y: float) -> tuple[float, float]:
        x = -x if mirror else x
        return c * x - s * y + move, s * x + c * y - move

    ways = [[(5.0, 5.0), (20.0, 5.0), (30.0, 15.0)], [(5.0, 5.4), (19.8, 5.4), (29.7, 15.3)]]
    lines = [Line(net, tuple(place(*p) for p in way)) for net, way in zip("XY", ways, strict=True)]
    _, (pair,) = _found(lines)
    assert pair.known_by == "geometry"
    assert pair.apart_mm == pytest.approx(0.4, abs=0.03)
    assert pair.coupled_mm == pytest.approx(28.9, abs=0.5)


@given(st.text(max_size=30))
def test_any_name_is_read(name: str) -> None:
    """Names are foreign text: whatever they hold, reading them ends."""
    for stem, positive in legs_of(name):
        assert stem
        assert isinstance(positive, bool)
