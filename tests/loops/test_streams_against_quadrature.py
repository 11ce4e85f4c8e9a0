"""The stream function of the return current against the field itself, integrated along lines.

The field comes from another road: Biot and Savart for the trace and its image, and point charges
for the flux through the gaps (`splitcheck.loops.stray`), summed just above the plane.
"""

from __future__ import annotations

from math import atan, pi

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.polynomial.legendre import leggauss
from shapely import LineString, Point, Polygon, box

from splitcheck.loops.solve import Solution, TraceOver, ViaBridge, added
from splitcheck.loops.stray import Wire, field_of_gaps, field_of_wires
from splitcheck.loops.streams import (
    Flow,
    current_across,
    flow_of,
    rises,
    smooth_part,
    without_gaps,
)

laws = settings(max_examples=12)
HEIGHT = 0.3
HALF = 400.0
#: Thin, so that the field of a single wire is its field.
TRACE = TraceOver(LineString([(-HALF, 0), (HALF, 0)]), 0.0)
SLOT = box(-0.3, -5, 0.3, 7)


def solved(gaps: list[Polygon]) -> tuple[Solution, Flow]:
    """The trace over gaps, and its return current."""
    solution = added(gaps, [TRACE], HEIGHT)
    flow = flow_of(solution, 0, [TRACE], HEIGHT)
    assert flow is not None
    return solution, flow


def integral(solution: Solution, line: LineString) -> float:
    """Current over a line from its left to its right: K . normal by Gauss' rule.

    K = z x (H above - H below). The trace and its image make H above alone; the flux through the
    gaps makes the same field on both faces with opposite sign.
    """
    (x0, y0), (x1, y1) = line.coords
    nodes, weights = leggauss(400)
    places = np.array([x0, y0]) + np.outer((nodes + 1) / 2, [x1 - x0, y1 - y0])
    at = np.column_stack((places, np.full(len(places), 1e-6)))
    field = field_of_wires(at, [Wire(np.array([[-HALF, 0.0], [HALF, 0.0]]), HEIGHT, 1.0)])
    field += 2.0 * field_of_gaps(at, solution.mesh, solution.flux_nwb[:, 0])
    kx, ky = -field[:, 1], field[:, 0]
    to_right = np.array([y1 - y0, x0 - x1]) / 2.0
    return float((kx * to_right[0] + ky * to_right[1]) @ weights)


@pytest.mark.parametrize(
    "ends",
    [
        ((-4, -3), (-4, 5)),
        ((-1.5, -9), (-1.5, 9)),
        ((-2, 7.5), (2, 7.5)),
        ((-6, 1), (-1, -4)),
        ((2, 9), (0.6, 7.6)),
    ],
)
def test_current_over_a_line_is_the_difference_of_the_stream_function(
    ends: tuple[tuple[float, float], tuple[float, float]],
) -> None:
    """On copper beside a slot, before it, past its end; within 1 % of the ampere."""
    solution, flow = solved([SLOT])
    line = LineString(ends)
    assert current_across(flow, line) == pytest.approx(integral(solution, line), abs=0.01)


@laws
@given(
    st.tuples(st.floats(-8, -1.2), st.floats(-8, 8), st.floats(-8, -1.2), st.floats(-8, 8)).filter(
        lambda e: abs(e[0] - e[2]) + abs(e[1] - e[3]) > 0.5
    )
)
def test_so_does_any_line_on_one_side_of_the_slot(ends: tuple[float, float, float, float]) -> None:
    """Drawn at random."""
    solution, flow = solved([SLOT])
    line = LineString([ends[:2], ends[2:]])
    assert current_across(flow, line) == pytest.approx(integral(solution, line), abs=0.01)


def test_over_a_whole_plane_it_is_the_arc_tangent() -> None:
    """Between -y and y flows 2/pi atan(y/h) of the return (images; any textbook)."""
    flow = without_gaps(solved([SLOT])[1])
    for y in (0.05, 0.3, 1.0, 5.0):
        found = current_across(flow, LineString([(3.0, y), (3.0, -y)]))
        assert found == pytest.approx(2 / pi * atan(y / HEIGHT), abs=2e-3)


def test_far_from_the_gap_it_is_that_of_the_whole_plane() -> None:
    """Forty millimetres from a slot of twelve."""
    _, flow = solved([SLOT])
    for y in (0.3, 1.0):
        found = current_across(flow, LineString([(40.0, y), (40.0, -y)]))
        assert found == pytest.approx(2 / pi * atan(y / HEIGHT), abs=0.01)


def test_nothing_flows_through_the_gap() -> None:
    """Beside a rim nothing gets through it: from one gap's panel to the next psi stays the same."""
    _, flow = solved([SLOT])
    mean = smooth_part(flow, flow.mesh.points.reshape(-1, 2)).reshape(-1, 4).mean(axis=1)
    order = np.argsort(flow.mesh.centre[:, 1], kind="stable")
    at, mean = flow.mesh.centre[order], mean[order]
    step = rises(flow, at[:-1], at[1:], mean[:-1], mean[1:])
    assert np.abs(step).max() < 0.01
    assert abs(step.sum()) < 0.03


def test_all_of_the_return_passes_the_ends_of_the_slot() -> None:
    """What goes round one end and what goes round the other make one ampere."""
    _, flow = solved([SLOT])
    far = 3000.0
    panel = int(np.argmin(np.abs(flow.mesh.centre[:, 1])))
    gap = smooth_part(flow, flow.mesh.points[panel]).mean()
    in_gap = flow.mesh.centre[panel]
    ends = np.array([[0.0, far], [0.0, -far]])
    inner = np.array([in_gap, in_gap])
    past, under = rises(flow, ends, inner, smooth_part(flow, ends), np.full(2, gap))
    assert past - under == pytest.approx(1.0, abs=0.02)
    assert past < -under  # the near end is at -5


def test_a_via_takes_what_the_solve_says() -> None:
    """Over a split all of it goes down through the vias: a ring round each carries its current."""
    split = [box(-0.3, -50, 0.3, 50)]
    vias = [ViaBridge(Point(x, y), 0.3) for x in (-2.0, 2.0) for y in (2.0, -5.0)]
    trace = TraceOver(LineString([(-30, 0), (30, 0)]), 0.2)
    solution = added(
        split, [trace], HEIGHT, beyond_mm=0.2, bridges=vias, outside=box(-40, -50, 40, 50)
    )
    flow = flow_of(solution, 0, [trace], HEIGHT, beyond_mm=0.2, bridges=vias)
    assert flow is not None
    turn = np.linspace(0, 2 * pi, 49)
    for via, amps in zip(vias, solution.bridge_a[:, 0], strict=True):
        ring = np.column_stack((via.at.x + 0.4 * np.cos(turn), via.at.y + 0.4 * np.sin(turn)))
        assert current_across(flow, LineString(ring)) == pytest.approx(amps, abs=1e-9)
    assert sum(solution.bridge_a[:2, 0]) == pytest.approx(1.0, abs=1e-6) or sum(
        solution.bridge_a[:2, 0]
    ) == pytest.approx(-1.0, abs=1e-6)
