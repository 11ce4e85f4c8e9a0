"""Lines of the return current: equal shares of it, from one end of the trace to the other."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Point, Polygon, box
from shapely.affinity import rotate

from splitcheck.loops.sheet import Stream, lay, stream_lines
from splitcheck.loops.solve import TraceOver, ViaBridge, added
from splitcheck.loops.streams import Flow, current_across, flow_of, without_gaps

laws = settings(max_examples=10)
HEIGHT = 0.3
TRACE = TraceOver(LineString([(-14, 0), (14, 0)]), 0.3)
WINDOW = box(-18, -14, 18, 14)
SLOT = box(-0.3, -5, 0.3, 7)
MANY = 20


def flowing(gaps: list[Polygon], trace: TraceOver = TRACE) -> Flow:
    """Return current of a trace over gaps."""
    solution = added(gaps, [trace], HEIGHT)
    flow = flow_of(solution, 0, [trace], HEIGHT)
    assert flow is not None
    return flow


def crossing(streams: tuple[Stream, ...], line: LineString) -> float:
    """Current that the lines carry over a line, whichever way."""
    return sum(stream.amps for stream in streams if stream.path.intersects(line))


def test_lines_over_a_whole_plane_run_beside_the_trace() -> None:
    """Each carries a twentieth, and half of them run within one height of the trace."""
    streams = stream_lines(without_gaps(flowing([SLOT])), WINDOW, MANY)
    assert {stream.amps for stream in streams} == {1 / MANY}
    assert crossing(streams, LineString([(2, -HEIGHT), (2, HEIGHT)])) == pytest.approx(0.5, abs=0.1)


@laws
@given(st.floats(1, 9), st.floats(1, 9), st.floats(0.15, 2.0), st.floats(0, 180))
def test_no_line_crosses_a_gap(left: float, right: float, wide: float, degrees: float) -> None:
    """Whatever the slot's length, width and direction; the way over it is not clear."""
    gap = rotate(box(-wide / 2, -left, wide / 2, right), degrees % 70 - 35, origin=(0, 0))
    inside = gap.buffer(-0.05 * wide)
    streams = stream_lines(flowing([gap]), WINDOW, MANY)
    assert len(streams) >= MANY - 1
    assert not [s for s in streams if s.path.intersects(inside)]


@laws
@given(st.floats(-7, 7), st.floats(-9, 9), st.floats(-7, 7), st.floats(-9, 9))
def test_lines_over_a_line_carry_the_current_over_it(
    x0: float, y0: float, x1: float, y1: float
) -> None:
    """Between two places on copper: that of the stream function, to one line and a half."""
    flow = flowing([SLOT])
    line = LineString([(x0, y0), (x1, y1)])
    gap = SLOT.buffer(0.3)
    if gap.intersects(Point(x0, y0)) or gap.intersects(Point(x1, y1)) or line.length < 0.1:
        return
    if line.intersects(gap):
        line = LineString([(x0, y0), (0, 7.6), (x1, y1)])
        if line.intersects(gap):
            return
    streams = stream_lines(flow, box(-60, -60, 60, 60), MANY, focus=WINDOW)
    over = sum(
        stream.amps * _signed(stream.path, line)
        for stream in streams
        if stream.path.intersects(line)
    )
    assert over == pytest.approx(current_across(flow, line), abs=1.5 / MANY)


def _signed(path: LineString, line: LineString) -> int:
    """How often a path crosses a line from its left to its right, less how often back."""
    total = 0
    for (ax, ay), (bx, by) in zip(line.coords, line.coords[1:], strict=False):
        points = np.asarray(path.coords)
        side = (bx - ax) * (points[:, 1] - ay) - (by - ay) * (points[:, 0] - ax) > 0
        for k in np.flatnonzero(side[:-1] != side[1:]):
            if LineString(points[k : k + 2]).intersects(LineString([(ax, ay), (bx, by)])):
                total += 1 if side[k] else -1
    return total


def test_lines_run_against_the_current_of_the_trace() -> None:
    """The return starts where the trace ends."""
    for stream in stream_lines(flowing([SLOT]), WINDOW, MANY):
        x = np.asarray(stream.path.coords)[:, 0]
        assert x[-1] < x[0]


def test_over_a_split_lines_end_in_the_vias() -> None:
    """All of the return goes down through them."""
    vias = [ViaBridge(Point(x, y), 0.3) for x in (-2.0, 2.0) for y in (2.0, -5.0)]
    gaps, frame = [box(-0.3, -50, 0.3, 50)], box(-40, -50, 40, 50)
    solution = added(gaps, [TRACE], HEIGHT, beyond_mm=0.2, bridges=vias, outside=frame)
    flow = flow_of(solution, 0, [TRACE], HEIGHT, beyond_mm=0.2, bridges=vias)
    assert flow is not None
    ends = shapely.union_all([via.at for via in vias] + [Point(-14, 0), Point(14, 0)])
    streams = stream_lines(flow, box(-30, -30, 30, 30), MANY)
    for stream in streams:
        for end in (stream.path.coords[0], stream.path.coords[-1]):
            near_border = max(abs(end[0]), abs(end[1])) > 29.9
            assert near_border or ends.distance(Point(end)) < 0.6
    assert len(streams) >= 2 * MANY


def test_small_gaps_that_the_solve_left_out_are_passed_by() -> None:
    """Obstacles are no part of the solve, but no line runs through them either."""
    holes = [Point(-5, 2).buffer(0.8), Point(4, -1.5).buffer(0.5)]
    streams = stream_lines(flowing([SLOT]), WINDOW, MANY, obstacles=holes)
    for hole in holes:
        assert not [s for s in streams if s.path.intersects(hole.buffer(-0.05))]


def test_an_antipad_at_the_end_of_the_trace_takes_no_lines_away() -> None:
    """The pad that a trace ends at lies in a gap of its own, which the solve does not see."""
    flow = flowing([SLOT])
    holes = [Point(14, 0).buffer(0.8), Point(-14, 0).buffer(0.8)]
    plain = stream_lines(flow, WINDOW, MANY)
    assert len(stream_lines(flow, WINDOW, MANY, obstacles=holes)) == len(plain)


def test_as_many_lines_arrive_as_leave() -> None:
    """On either side of the slot, where a small window cuts off its ends as well."""
    flow = flowing([SLOT])
    for window in (WINDOW, box(-16, -4, 16, 6)):
        streams = stream_lines(flow, window, MANY)
        before, after = (crossing(streams, LineString([(x, -14), (x, 14)])) for x in (-6.0, 6.0))
        assert before == pytest.approx(after, abs=1.5 / MANY)
        assert before > 0.8


def test_triangles_fill_the_window() -> None:
    """With none missing: their areas add up to it."""
    sheet = lay(flowing([SLOT]), WINDOW)
    a, b, c = (sheet.nodes[sheet.corners[:, k]] for k in range(3))
    area = ((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]) / 2
    assert (area > 0).all()
    assert area.sum() == pytest.approx(WINDOW.area)
    assert area[~sheet.open].sum() == pytest.approx(SLOT.area, rel=0.01)
