"""The field solve against what is known in closed form."""

from __future__ import annotations

from math import hypot, log, pi

import numpy as np
import pytest
from shapely import LineString, Point, Polygon, box

from splitcheck.loops.grading import Grading
from splitcheck.loops.matrix import interaction
from splitcheck.loops.panels import cut
from splitcheck.loops.share import via_matrix
from splitcheck.loops.solve import Strap, TraceOver, ViaBridge, added
from splitcheck.units import MU0


def trace(half_mm: float = 25.0, y_mm: float = 0.0, width_mm: float = 0.2) -> TraceOver:
    """A trace along x."""
    return TraceOver(LineString([(-half_mm, y_mm), (half_mm, y_mm)]), width_mm)


def slot(length_mm: float, width_mm: float) -> Polygon:
    """A slot across x, centred."""
    return box(-width_mm / 2, -length_mm / 2, width_mm / 2, length_mm / 2)


def value(*args: object, **kwargs: object) -> float:
    """What the first trace gains."""
    found = added(*args, **kwargs).of(0)  # type: ignore[arg-type]  # passed through
    assert found is not None
    return found


@pytest.mark.parametrize("turn", [0.0, 0.4])
def test_a_round_hole_has_the_polarisability_of_bethe(turn: float) -> None:
    """A hole of radius a in a tangential field has the magnetic moment 4/3 a^3 per field.

    Bethe, "Theory of diffraction by small holes", Phys. Rev. 66 (1944), p. 163 (from memory). The
    solve's equation with f = x and the moment as its answer.
    """
    line = LineString([(-9, -9 * turn), (9, 9 * turn)])
    mesh = cut([Point(0, 0).buffer(1.5, quad_segs=32)], Grading((line,), near_mm=0.1))
    field = mesh.centre[:, 0]
    flux = np.linalg.solve(interaction(mesh, ()), field)
    assert 2 * pi * field @ flux == pytest.approx(4 / 3 * 1.5**3, rel=0.01)


@pytest.mark.parametrize("inside", [3.0, 1.0, 0.3, -1.0, -3.0])
def test_a_trace_along_the_edge_of_a_half_plane(inside: float) -> None:
    """mu0/2pi ln(2 sqrt(rho (rho - s)/2)/h) per length, s inside the edge, rho^2 = s^2 + h^2.

    By the conformal map w = sqrt z. A trace of finite length differs from it as one over its
    length, so that three lengths give the limit. Outside the edge it bends back over the copper.
    """
    plane = box(-200, -200, 200, 0)

    def at(half: float) -> float:
        legs = [(-half, -6.0), (-half, -inside), (half, -inside), (half, -6.0)]
        line = LineString(legs if inside < 0 else legs[1:3])
        return value([], [TraceOver(line, 0.0)], 1.0, outside=plane)

    short, middle, long = at(15), at(30), at(60)
    truth = MU0 / (2 * pi) * log(2 * ((rho := hypot(inside, 1)) * (rho - inside) / 2) ** 0.5)
    per_mm = 2 * (long - middle) / 60 - (middle - short) / 30
    assert per_mm == pytest.approx(truth, rel=0.03, abs=2e-4)


@pytest.mark.parametrize(("length", "width"), [(10.0, 0.5), (20.0, 1.0), (40.0, 1.0), (40.0, 2.0)])
def test_a_long_slot_is_the_complement_of_a_dipole(length: float, width: float) -> None:
    """Pi mu0 D/8 / (ln(2D/g) - 1), by Booker's relation and the capacitance of a thin dipole.

    Booker, "Slot aerials and their relation to complementary wire aerials", J. IEE 93 IIIA (1946)
    (from memory). It holds to the first order in 1/ln(D/g) and for a trace close to the plane.
    """
    truth = pi * MU0 * length / 8 / (log(2 * length / width) - 1)
    assert value([slot(length, width)], [trace(100)], width / 10) == pytest.approx(truth, rel=0.1)


@pytest.mark.parametrize(
    ("height", "truth"),
    [(0.1, 3.60), (0.2, 3.32), (0.5, 2.84), (1.0, 2.36), (1.6, 1.97), (3, 1.39)],
)
def test_height_spreads_the_return_current(height: float, truth: float) -> None:
    """A slot of 20 x 1 mm, against a sheet solver whose mesh reads up to 3 % high."""
    assert value([slot(20, 1)], [trace()], height) == pytest.approx(truth, rel=0.05)


@pytest.mark.parametrize(
    ("offset", "factor"), [(0.25, 0.954), (0.5, 0.810), (0.75, 0.546), (0.9, 0.291)]
)
def test_off_the_centre_of_the_slot_it_adds_less(offset: float, factor: float) -> None:
    """Ratios against a sheet solver, mesh 0.25 mm, for a trace at part of the half length."""
    centred = value([slot(20, 1)], [trace()], 0.2)
    aside = value([slot(20, 1)], [trace(y_mm=10 * offset)], 0.2)
    assert aside / centred == pytest.approx(factor, rel=0.04)


@pytest.mark.parametrize(("side", "truth"), [(2.0, 0.91), (4.0, 2.45), (8.0, 6.0)])
def test_square_voids(side: float, truth: float) -> None:
    """Against a sheet solver of 0.25 mm cells, which reads small voids high."""
    assert value([slot(side, side)], [trace()], 0.2) == pytest.approx(truth, rel=0.08)


def test_many_antipads_with_webs_are_no_slot() -> None:
    """Voids of 0.75 mm at 1 mm pitch: fifteen add hardly more than the one under the trace."""
    voids = [box(-0.375, y - 0.375, 0.375, y + 0.375) for y in range(-7, 8)]
    one, all_of_them = value([voids[7]], [trace()], 0.2), value(voids, [trace()], 0.2)
    assert one < all_of_them < 1.1 * one


def test_a_near_plane_above_leaves_the_slot_its_share_alone() -> None:
    """Without coupling through the slot to anything, f shrinks by the share: added by its square.

    A slot short against both distances sees the field of the trace and nothing of the planes: the
    field on the plane under a stripline, over that under a microstrip, is known in closed form.
    """
    small = slot(0.05, 0.05)
    between, height = 1.2, 0.4
    turn = pi * height / between
    strip = np.sin(turn) / (2 * between) / (1 - np.cos(turn))
    ratio = value([small], [trace(width_mm=0)], height, above_mm=between) / value(
        [small], [trace(width_mm=0)], height
    )
    assert ratio == pytest.approx((strip * pi * height) ** 2, rel=0.01)


@pytest.mark.parametrize(
    ("apart", "truth"), [(1.0, 0.150), (2.0, 0.207), (5.0, 0.280), (20, 0.391)]
)
def test_a_via_pair_between_planes_is_a_two_wire_line(apart: float, truth: float) -> None:
    """mu0 d/pi acosh(s/D) at d = 0.2, D = 0.3 mm: the inductance of a two-wire line."""
    matrix = via_matrix(np.array([[0.0, 0.0], [apart, 0.0]]), [0.3, 0.3], 0.2)
    there_and_back = np.array([1.0, -1.0])
    assert there_and_back @ matrix @ there_and_back == pytest.approx(truth, rel=0.015)


def test_four_vias_carry_by_symmetry_and_less_than_two() -> None:
    """Two pairs beside the trace share the return; superposition holds them below one pair."""
    plane, cut_ = box(-20, -20, 20, 20), box(-0.2, -25, 0.2, 25)
    near = [ViaBridge(Point(x, 2), 0.47) for x in (-2, 2)]
    both = [*near, *(ViaBridge(Point(x, -2), 0.47) for x in (-2, 2))]
    one, two = (
        added([cut_], [trace(15)], 0.2, beyond_mm=0.8, bridges=vias, outside=plane)
        for vias in (near, both)
    )
    assert two.bridge_a[:, 0] == pytest.approx(two.bridge_a[[2, 3, 0, 1], 0], abs=0.02)
    assert 0.5 * one.added_nh[0, 0] < two.added_nh[0, 0] < one.added_nh[0, 0]


def test_a_strap_right_under_the_trace_costs_its_own_inductance() -> None:
    """Across a full cut, at the trace's own height and place, the strap takes back what it took."""
    plane, cut_ = box(-40, -40, 40, 40), box(-0.5, -50, 0.5, 50)
    whole = trace(30)
    strap = Strap(whole.line, whole.width_mm, 0.2, mounted_nh=1.25)
    solution = added([cut_], [whole], 0.2, bridges=[strap], outside=plane)
    assert solution.bridge_a[0, 0] == pytest.approx(-1)
    assert solution.of(0) == pytest.approx(1.25, abs=1e-6)


def test_a_strap_on_the_other_side_of_the_plane_does_as_much() -> None:
    """What opens a gap is the whole current of the sheet, whichever face it is induced on."""
    plane, cut_ = box(-40, -40, 40, 40), box(-0.5, -50, 0.5, 50)
    straps = [
        Strap(LineString([(-1, 3), (1, 3)]), 0.5, 0.3, 0.5, beyond=beyond)
        for beyond in (False, True)
    ]
    one, other = (
        added([cut_], [trace(30)], 0.2, bridges=[strap], outside=plane).of(0) for strap in straps
    )
    assert one is not None
    assert one == pytest.approx(other, rel=1e-12)


def test_a_strap_has_the_planes_of_its_own_side() -> None:
    """Far under the plane, none of the plane above is near it; beyond that one it bridges nothing.

    With the plane above 0.25 mm up, a link 1.5 mm high can only stand on the other side.
    """
    plane, cut_ = box(-40, -40, 40, 40), box(-0.5, -50, 0.5, 50)
    line = LineString([(-1, 3), (1, 3)])
    under, over = (Strap(line, 0.5, 1.5, 0.5, beyond=beyond) for beyond in (True, False))
    value = added([cut_], [trace(30)], 0.2, above_mm=0.25, bridges=[under], outside=plane).of(0)
    alone = added([cut_], [trace(30)], 0.2, bridges=[under], outside=plane).of(0)
    assert value is not None
    assert alone is not None
    # a fifth of the current is left to this plane, and with it 1/25 of the energy
    assert 0 < value < 0.2 * alone
    lost = added([cut_], [trace(30)], 0.2, above_mm=0.25, bridges=[over], outside=plane)
    assert lost.of(0) is None
    assert lost.remarks == ("bridge 1 stands beyond another plane and is left out",)
