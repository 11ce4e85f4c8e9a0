"""A return that goes from plane to plane: against closed forms and their tabulated values."""

from __future__ import annotations

from math import cos, log, pi, sin

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper.marks import Point
from splitcheck.loops.handover import between_plates_nh, line_nh, plates_nf, shared_nh
from splitcheck.units import MU0

# L = mu0 h/pi acosh(s/d), d = 0.3 mm, evaluated by hand calculator: two-wire line between plates
# (H. Johnson, EDN, "Parasitic inductance of bypass capacitors": (mu0/pi) H ln(2S/D)).
TABLE = [
    (0.2, 0.6, 0.105), (0.2, 1.0, 0.150), (0.2, 2.0, 0.207), (0.2, 5.0, 0.280), (0.2, 20.0, 0.391),
    (0.8, 0.6, 0.42), (0.8, 1.0, 0.60), (0.8, 2.0, 0.83), (0.8, 5.0, 1.12), (0.8, 20.0, 1.57),
    (1.6, 0.6, 0.84), (1.6, 1.0, 1.20), (1.6, 2.0, 1.65), (1.6, 5.0, 2.24), (1.6, 20.0, 3.13),
]  # fmt: skip


@pytest.mark.parametrize(("plates_mm", "apart_mm", "expected_nh"), TABLE)
def test_one_via_against_the_two_wire_line(
    plates_mm: float, apart_mm: float, expected_nh: float
) -> None:
    """Both the closed form and the solve with one way."""
    assert line_nh(apart_mm, 0.3, plates_mm) == pytest.approx(expected_nh, abs=0.006)
    solved = shared_nh((3.0, -2.0), 0.3, [((3.0 + apart_mm, -2.0), 0.3, 0.0)], plates_mm)
    assert solved == pytest.approx(line_nh(apart_mm, 0.3, plates_mm), rel=1e-6)


@pytest.mark.parametrize(("count", "expected_nh"), [(1, 0.607), (2, 0.400), (3, 0.346), (4, 0.324)])
def test_vias_on_a_circle_against_the_closed_form(count: int, expected_nh: float) -> None:
    """(mu0 h/2 pi) (ln(s/r) + ln(s/(n r))/n), s = 1, h = 0.8, r = 0.15 mm; thin wires: 3 %."""
    thin = MU0 * 0.8 / (2 * pi) * (log(1 / 0.15) + log(1 / (count * 0.15)) / count)
    assert thin == pytest.approx(expected_nh, abs=5e-4)
    turns = [2 * pi * k / count for k in range(count)]
    ways: list[tuple[Point, float, float]] = [((cos(a), sin(a)), 0.3, 0.0) for a in turns]
    assert shared_nh((0.0, 0.0), 0.3, ways, 0.8) == pytest.approx(expected_nh, rel=0.03)


def test_parts_far_away_share_their_own_inductance() -> None:
    """Ten parts of 10 nH each between planes that hardly matter: 1 nH."""
    ways: list[tuple[Point, float, float]] = [((5.0 * k, 4.0), 0.3, 10.0) for k in range(10)]
    assert shared_nh((20.0, 0.0), 0.3, ways, 0.001) == pytest.approx(1.0, rel=0.01)


def test_plates_against_textbook_capacitance() -> None:
    """e0 er A/d: 38 pF a square centimetre at 0.1 mm and er 4.3, 3.8 pF at 1 mm."""
    assert plates_nf(100.0, 0.1, 4.3) == pytest.approx(0.038, rel=0.01)
    assert plates_nf(100.0, 1.0, 4.3) == pytest.approx(0.0038, rel=0.01)


def test_spreading_between_plates_against_the_radial_form() -> None:
    """mu0 d/2 pi ln(r2/r1), 0.15 to 10 mm: 84 pH at 0.1 mm; what is left is the capacitance."""
    area = pi * 10.0**2
    spread = between_plates_nh(0.3, 0.1, area, 1e-3, plates_nf(area, 0.1, 4.3))
    assert spread == pytest.approx(0.084, abs=0.001)
    slow = between_plates_nh(0.3, 0.1, area, 1.0, plates_nf(area, 0.1, 4.3))
    assert slow - spread == pytest.approx(1.0 / (2 * plates_nf(area, 0.1, 4.3)), rel=1e-3)


places = st.tuples(st.floats(-20.0, 20.0), st.floats(-20.0, 20.0))


@given(st.lists(places, min_size=1, max_size=6), places, st.floats(0.05, 2.0))
def test_one_more_way_never_makes_it_worse(
    known: list[Point], more: Point, plates_mm: float
) -> None:
    """The ways share the return so that the energy is least: another one can only help."""

    def apart(one: Point, other: Point) -> bool:
        return (one[0] - other[0]) ** 2 + (one[1] - other[1]) ** 2 > 1.0

    kept: list[Point] = []
    for place in [*known, more]:
        if apart(place, (0.0, 0.0)) and all(apart(place, other) for other in kept):
            kept.append(place)
    if len(kept) < 2:
        return
    ways: list[tuple[Point, float, float]] = [(place, 0.3, 0.0) for place in kept]
    fewer = shared_nh((0.0, 0.0), 0.3, ways[:-1], plates_mm)
    assert shared_nh((0.0, 0.0), 0.3, ways, plates_mm) <= fewer + 1e-6


@given(st.floats(0.4, 30.0), st.floats(1.01, 3.0), st.floats(0.05, 2.0))
def test_nearer_is_never_worse_and_thinner_is_better(
    apart: float, more: float, plates: float
) -> None:
    """In the distance of the via and in that of the planes."""
    assert line_nh(apart, 0.3, plates) <= line_nh(apart * more, 0.3, plates)
    assert line_nh(apart, 0.3, plates) <= line_nh(apart, 0.3, plates * more)
