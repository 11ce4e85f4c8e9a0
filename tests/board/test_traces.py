"""Traces told from the paint of a pour."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.traces import centre_lines, locate
from splitcheck.copper.marks import NO_TAG, Fill, Mark, Point, Stroke
from splitcheck.copper.paint import paint


def _stroke(*points: Point, width_mm: float = 0.2, dark: bool = True, line: int = 1) -> Stroke:
    return Stroke(points, width_mm, None, dark, NO_TAG, line)


def _fill(x0: float, y0: float, x1: float, y1: float) -> Fill:
    return Fill(((x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)), True, NO_TAG, 1)


def _found(*marks: Mark) -> list[int]:
    return sorted(line.line for line in centre_lines(marks, paint(marks)))


def test_lone_stroke_is_a_trace_with_its_piece_and_line() -> None:
    """Bare on both sides: a trace; it knows the piece of copper that it lies in."""
    marks = (_fill(0, 5, 3, 8), _stroke((0.0, 0.0), (10.0, 0.0), line=7))
    pieces = paint(marks)
    (line,) = centre_lines(marks, pieces)
    assert (line.points, line.width_mm, line.line) == (((0.0, 0.0), (10.0, 0.0)), 0.2, 7)
    assert pieces[line.piece].area == pytest.approx(10 * 0.2 + np.pi * 0.01, rel=0.01)


@pytest.mark.parametrize("pitch_mm", [0.1, 0.15, 0.19])
def test_painted_pour_holds_no_trace(pitch_mm: float) -> None:
    """Strokes that lie side by side and overlap are paint, those along the rim too."""
    rows = [_stroke((0.0, n * pitch_mm), (10.0, n * pitch_mm), line=n + 1) for n in range(30)]
    assert _found(*rows) == []


def test_rim_of_a_pour_is_not_a_trace() -> None:
    """A pour drawn as a filled contour with a stroke all round it."""
    ring = ((0.0, 0.0), (10.0, 0.0), (10.0, 8.0), (0.0, 8.0), (0.0, 0.0))
    rim = [_stroke(a, b, line=n) for n, (a, b) in enumerate(pairwise(ring), 2)]
    assert _found(_fill(0, 0, 10, 8), *rim, _stroke(*ring, line=9)) == []


def test_stub_into_copper_of_its_own_net_is_a_trace_only_outside_it() -> None:
    """A stroke mostly inside a pour is paint; one that leaves it for most of its length is not."""
    pour = _fill(0, 0, 10, 10)
    inside, leaving = ((2.0, 5.0), (8.0, 5.0)), ((9.0, 8.0), (19.0, 8.0))
    assert _found(pour, _stroke(*inside, line=2), _stroke(*leaving, line=3)) == [3]


def test_parallel_traces_with_clearance_between_are_traces() -> None:
    """A bus at 0.1 mm clearance is not a pour."""
    assert _found(*(_stroke((0.0, 0.3 * n), (9.0, 0.3 * n), line=n + 1) for n in range(5))) == [
        1, 2, 3, 4, 5,
    ]  # fmt: skip


def test_cleared_empty_and_clear_strokes_are_no_traces() -> None:
    """Only what is copper in the end counts; a stroke of no length is a dot."""
    marks = (
        _stroke((0.0, 0.0), (10.0, 0.0), line=1),
        _stroke((-1.0, 0.0), (11.0, 0.0), width_mm=1.0, dark=False, line=2),
        _stroke((3.0, 5.0), (3.0, 5.0), line=3),
        _stroke((0.0, 9.0), (10.0, 9.0), width_mm=0.0, line=4),
        _stroke((0.0, 7.0), (10.0, 7.0), line=5),
    )
    assert _found(*marks) == [5]


def test_trace_in_a_channel_of_a_foreign_pour_is_a_trace() -> None:
    """The clearance round it makes its sides bare."""
    marks = (
        _fill(0, 0, 10, 10),
        _stroke((0.0, 5.0), (10.0, 5.0), width_mm=0.6, dark=False, line=2),
        _stroke((1.0, 5.0), (9.0, 5.0), line=3),
    )
    assert _found(*marks) == [3]


def test_bent_polyline_is_one_trace() -> None:
    """A flattened arc is looked at along its whole way."""
    angles = np.linspace(0, np.pi, 20)
    arc = tuple((5 * float(np.cos(a)), 5 * float(np.sin(a))) for a in angles)
    assert _found(_stroke(*arc, line=4)) == [4]


@given(
    st.lists(st.tuples(st.integers(-3, 33), st.integers(-3, 33)), min_size=1, max_size=30),
)
def test_points_are_located_in_the_piece_that_holds_them(cells: list[tuple[int, int]]) -> None:
    """Against shapely's own test, piece by piece, away from rims."""
    pieces = [
        shapely.box(10 * i, 10 * j, 10 * i + 8, 10 * j + 8) for i in range(3) for j in range(3)
    ]
    xs, ys = np.array(cells, dtype=float).T + 0.5
    expected = [
        next((k for k, piece in enumerate(pieces) if piece.contains(shapely.Point(x, y))), -1)
        for x, y in zip(xs, ys, strict=True)
    ]
    assert locate(xs, ys, pieces).tolist() == expected
