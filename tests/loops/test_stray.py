"""What a loop probe above a crossing finds: laws, closed forms, and what boards are known to do."""

from __future__ import annotations

from math import hypot, pi

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Point, Polygon, box
from shapely.affinity import rotate, translate

from splitcheck.loops.grading import Grading
from splitcheck.loops.matrix import interaction
from splitcheck.loops.panels import cut
from splitcheck.loops.solve import Solution, Strap, TraceOver, added
from splitcheck.loops.stray import Wire, field_of_gaps, field_of_wires, stray_db
from splitcheck.units import MU0, Floats

laws = settings(max_examples=12)
#: A straight wire so long that its ends do not matter.
LONG = np.array([[-1e5, 0.0], [1e5, 0.0]])


def across(y: float = 0.0, width: float = 0.3, half: float = 25.0) -> TraceOver:
    """A trace along x."""
    return TraceOver(LineString([(-half, y), (half, y)]), width)


def slot(length: float, wide: float = 0.5, y: float = 0.0) -> Polygon:
    """A slot across the trace."""
    return box(-wide / 2, y - length / 2, wide / 2, y + length / 2)


def heard(
    gaps: list[Polygon],
    height: float,
    trace: TraceOver | None = None,
    probe: float = 10.0,
    beyond: float | None = None,
) -> float:
    """Stray field above the origin."""
    trace = trace or across()
    solution = added(gaps, [trace], height, beyond_mm=beyond)
    found = stray_db(solution, 0, trace, height, (0.0, 0.0), probe_mm=probe)
    assert found is not None
    return found


def with_gaps(solution: Solution, height: float, y: float, places: Floats) -> Floats:
    """Field of an endless trace at y and of the gaps."""
    without = field_of_wires(places, [Wire(LONG + np.array([0.0, y]), height, 1.0)])
    return without + field_of_gaps(places, solution.mesh, solution.flux_nwb[:, 0])


def test_a_whole_plane_has_no_stray_field() -> None:
    """No gap, no difference."""
    assert heard([], 0.2) == pytest.approx(0.0, abs=1e-9)


@laws
@given(st.floats(0.1, 1.5), st.floats(1, 15), st.floats(0.2, 1.5), st.floats(1.1, 3.0))
def test_a_longer_or_wider_slot_is_never_heard_less(
    height: float, length: float, wide: float, more: float
) -> None:
    """Within 0.2 dB, and it is always heard more than a whole plane."""
    one = heard([slot(length, wide)], height)
    assert one >= -0.01
    assert heard([slot(more * length, wide)], height) >= one - 0.2
    assert heard([slot(length, more * wide)], height) >= one - 0.2


@laws
@given(st.floats(0.1, 1.0), st.floats(1, 15), st.floats(-3, 3), st.floats(0.3, 3.0))
def test_all_lengths_times_k_change_nothing(
    height: float, length: float, y: float, k: float
) -> None:
    """With the height of the probe among them; within 0.3 dB, as nH decide when to refine."""
    one = heard([slot(length, 0.5, y)], height)
    large = heard(
        [slot(k * length, k * 0.5, k * y)], k * height, across(0, k * 0.3, k * 25), k * 10
    )
    assert large == pytest.approx(one, abs=0.3)


@laws
@given(st.floats(1, 15), st.floats(-3, 3), st.floats(0, 360), st.floats(-50, 50))
def test_turned_and_moved_it_stays_the_same(
    length: float, y: float, degrees: float, shift: float
) -> None:
    """The grid of the probe lies along the trace; within 0.3 dB, as panels fall otherwise."""
    gap, trace = slot(length, 0.5, y), across()
    turned = translate(rotate(gap, degrees, origin=(0, 0)), shift, -shift)
    line = translate(rotate(trace.line, degrees, origin=(0, 0)), shift, -shift)
    there = TraceOver(line, trace.width_mm)
    solution = added([turned], [there], 0.3)
    found = stray_db(solution, 0, there, 0.3, (shift, -shift))
    assert found == pytest.approx(heard([gap], 0.3), abs=0.3)


def test_a_plane_beyond_is_heard_less() -> None:
    """It shields the slot, the more the nearer it lies."""
    found = [heard([slot(16)], 0.2, beyond=beyond) for beyond in (None, 1.0, 0.2)]
    assert found[0] > found[1] + 0.5 > found[2] + 1.0


def test_the_field_of_a_wire_over_a_plane() -> None:
    """H = 1/2pi (1/(z - h) - 1/(z + h)) right above it, by images."""
    found = field_of_wires(np.array([[3.0, 0.0, 10.0]]), [Wire(LONG, 2.0, 1.0)])[0]
    assert hypot(*found) == pytest.approx((1 / 8 - 1 / 12) / (2 * pi))


def test_field_of_a_ring_of_current() -> None:
    """On its axis I a^2/2 (1/R1^3 - 1/R2^3), the image below taken off (Biot and Savart)."""
    turn = np.linspace(0, 2 * pi, 721)
    ring = 3.0 * np.stack([np.cos(turn), np.sin(turn)], axis=1)
    found = field_of_wires(np.array([[0.0, 0.0, 5.0]]), [Wire(ring, 1.0, 2.0)])[0]
    truth = 9.0 * (1 / 5.0**3 - 1 / hypot(3.0, 6.0) ** 3)
    assert found == pytest.approx([0.0, 0.0, truth], rel=1e-4, abs=1e-12)


@pytest.mark.parametrize("radius", [20.0, 60.0])
def test_over_a_large_hole_the_image_is_gone(radius: float) -> None:
    """Well inside the hole the trace has the field 1/(2 pi r) of a wire without a plane."""
    trace = across(0.0, 0.0, radius + 25.0)
    solution = added([Point(0, 0).buffer(radius, quad_segs=32)], [trace], 0.5)
    places = np.array([[0.0, 0.0, 2.5], [0.0, 2.0, 2.5]])
    found = with_gaps(solution, 0.5, 0.0, places)
    truth = [[0.0, -1 / (4 * pi), 0.0], [0.0, -1 / (8 * pi), 1 / (8 * pi)]]
    assert found == pytest.approx(np.array(truth), rel=0.025, abs=1e-4)


@pytest.mark.parametrize(("width", "inside"), [(20.0, 0.0), (40.0, 15.0)])
@pytest.mark.parametrize("height", [3.0, 10.0])
def test_field_over_a_plane_of_finite_width(width: float, inside: float, height: float) -> None:
    """Exact by the map z = W/4 (w + 1/w) of the plane's cross section to a circle (Joukowski).

    The current at w0, and -1 at its mirror in the circle: |H| = |1/(w - w0) - 1/(w - 1/w0*)| /
    (2 pi |dz/dw|).
    """
    plane, trace = box(-200, -width / 2, 200, width / 2), across(inside, 0.0, 197.0)
    solution = added([], [trace], 1.0, outside=plane)
    y = np.array([-5.0, 0.0, 5.0, inside])
    places = np.column_stack((np.zeros(4), y, np.full(4, height)))

    z = np.append(y + 1j * height, inside + 1j) * 2 / width
    *_, w0 = mapped = z + np.sqrt(z - 1) * np.sqrt(z + 1)
    w = mapped[:-1]
    slope = width / 4 * (1 - 1 / w**2)
    truth = np.abs((1 / (w - w0) - 1 / (w - 1 / np.conj(w0))) / slope) / (2 * pi)
    found = np.hypot(*with_gaps(solution, 1.0, inside, places).T[1:])
    assert found == pytest.approx(truth, rel=0.012)
    bare = np.hypot(*field_of_wires(places, [Wire(LONG + np.array([0.0, inside]), 1.0, 1.0)]).T[1:])
    assert np.abs(bare / truth - 1).max() > 0.015


def test_a_small_hole_radiates_as_the_dipole_of_bethe() -> None:
    """A hole of radius a in a tangential field H has, seen from one side, the moment 4/3 a^3 H.

    Bethe, "Theory of diffraction by small holes", Phys. Rev. 66 (1944), p. 163 (from memory). On
    its axis the half space above holds twice the field of that moment: 4/3 a^3 H/(2 pi z^3).
    """
    line = LineString([(-9, -3), (9, 3)])
    mesh = cut([Point(0, 0).buffer(1.5, quad_segs=32)], Grading((line,), near_mm=0.1))
    flux = 2 * pi * MU0 * np.linalg.solve(interaction(mesh, ()), mesh.centre[:, 1])
    found = field_of_gaps(np.array([[0.0, 0.0, 150.0]]), mesh, flux.astype(np.float64))[0]
    truth = 4 / 3 * 1.5**3 / (2 * pi * 150.0**3)
    assert found == pytest.approx([0.0, truth, 0.0], rel=0.015, abs=0.005 * truth)


def test_a_strap_carries_its_own_field() -> None:
    """A link across the slot takes current and takes field away."""
    trace, gap = across(), slot(30)
    link = Strap(LineString([(-1.5, 2.0), (1.5, 2.0)]), 1.0, 0.3, 0.5)
    linked = added([gap], [trace], 0.3, bridges=[link])
    found = stray_db(linked, 0, trace, 0.3, (0.0, 0.0), bridges=[link])
    gaps_alone = stray_db(linked, 0, trace, 0.3, (0.0, 0.0))
    assert found is not None
    assert found < heard([gap], 0.3) - 1.0
    assert found != gaps_alone


def test_a_trace_without_a_way_back_has_no_number() -> None:
    """Nothing is said of what cannot be."""
    trace = across(half=15)
    plane = box(-20, -10, 20, 10)
    solution = added([box(-0.5, -11, 0.5, 11)], [trace], 0.2, outside=plane)
    assert solution.cut_off == (True,)
    assert stray_db(solution, 0, trace, 0.2, (0.0, 0.0)) is None


def test_a_cut_run_out_to_the_edge_is_another_board() -> None:
    """1 mm dielectric, a trace 5 mm from the edge of its plane (common practice, no source).

    A cut that passes under it but stops 2 mm short of the edge barely changes loop or field; run
    out by those last millimetres it raises the field about tenfold. So it does from some way off:
    10 mm up even no plane at all would be no more than (10 + 2)/2, six times, as a trace 1 mm over
    a plane is heard that well there.
    """
    plane, trace = box(-80, -50, 80, 50), across(45.0, 1.0, 76.0)

    def with_cut(end: float | None) -> Solution:
        gaps = [] if end is None else [box(-0.5, -45, 0.5, end)]
        return added(gaps, [trace], 1.0, outside=plane)

    whole, short, out = with_cut(None), with_cut(48.0), with_cut(52.0)

    def times(solution: Solution, probe: float) -> float:
        found = stray_db(solution, 0, trace, 1.0, (0.0, 45.0), probe_mm=probe)
        assert found is not None
        return float(10 ** (found / 20))

    own, little, much = (float(solution.added_nh[0, 0]) for solution in (whole, short, out))
    assert little - own < 2.0
    assert much > 12 * little
    for probe in (10.0, 50.0):
        assert times(short, probe) < 1.25 * times(whole, probe)
    assert 3.0 < times(out, 10.0) / times(whole, 10.0) < 6.0
    assert 7.0 < times(out, 50.0) / times(whole, 50.0) < 14.0
