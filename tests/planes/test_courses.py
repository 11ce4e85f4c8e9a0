"""The order of a net's pieces: trunk, branches, layers, and that none is lost."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.board import Board
from splitcheck.planes.courses import Course, Step, courses
from splitcheck.planes.tracks import Tracks, lay_all
from tests.making.hand import Line, Sheet, board, via

WHOLE = shapely.box(0, 0, 60, 40)


def _ways(made: Board) -> tuple[tuple[Tracks, ...], tuple[Course, ...]]:
    tracks = lay_all(made, frozenset(net.number for net in made.nets), ())
    return tracks, courses(made, tracks)


def _ends(tracks: tuple[Tracks, ...], step: Step) -> tuple[tuple[float, ...], tuple[float, ...]]:
    layer = tracks[step.tracks]
    ends = (tuple(layer.start[step.piece].tolist()), tuple(layer.end[step.piece].tolist()))
    return ends if step.forward else ends[::-1]


def _length(tracks: tuple[Tracks, ...], course: Course) -> float:
    return sum(float(tracks[step.tracks].length_mm[step.piece]) for step in course.steps)


def test_a_bent_trace_is_one_course_from_end_to_end() -> None:
    """Three straight pieces, each beginning where the last one ends."""
    line = Line("A", ((0, 0), (10, 0), (10, 5), (30, 5)))
    tracks, (course,) = _ways(board(Sheet(lines=(line,)), Sheet(), outline=WHOLE))
    ends = [_ends(tracks, step) for step in course.steps]
    assert len(ends) == 3
    assert all(one[1] == other[0] for one, other in pairwise(ends))
    assert {ends[0][0], ends[-1][1]} == {(0.0, 0.0), (30.0, 5.0)}
    assert not course.branch


def test_the_longest_way_comes_first_and_then_its_branches() -> None:
    """A T: 20 mm to the left, 30 to the right, 5 down: the trunk is 50 mm."""
    lines = (Line("A", ((0, 10), (50, 10))), Line("A", ((20, 10), (20, 5))))
    tracks, ways = _ways(board(Sheet(lines=lines), Sheet(), outline=WHOLE))
    assert [round(_length(tracks, course), 6) for course in ways] == [50.0, 5.0]
    assert [course.branch for course in ways] == [False, True]
    assert _ends(tracks, ways[1].steps[0])[0] == (20.0, 10.0)


def test_a_plated_hole_leads_on_to_another_layer_and_its_absence_does_not() -> None:
    """Two strokes that end 0.1 mm beside the hole; without it they are two courses."""
    above = Sheet(lines=(Line("A", ((0, 10), (20, 10))),))
    below = Sheet(lines=(Line("A", ((20.1, 10), (40, 10))),))
    tracks, joined = _ways(board(above, below, holes=[via(20, 10)], outline=WHOLE))
    (course,) = joined
    assert [tracks[step.tracks].layer for step in course.steps] in ([1, 2], [2, 1])
    _, apart = _ways(board(above, below, outline=WHOLE))
    assert len(apart) == 2


def test_a_loop_is_left_open_once_and_its_last_piece_is_a_branch() -> None:
    """A ring of four sides with a tail: every side is told."""
    ring = Line("A", ((10, 10), (20, 10), (20, 20), (10, 20), (10, 10)))
    tracks, ways = _ways(
        board(Sheet(lines=(ring, Line("A", ((10, 10), (0, 10))))), Sheet(), outline=WHOLE)
    )
    assert sum(_length(tracks, course) for course in ways) == 50.0
    assert _length(tracks, ways[0]) == 30.0


@given(
    st.lists(
        st.tuples(st.integers(0, 30), st.sampled_from([(1, 0), (0, 1)]), st.integers(1, 4)),
        min_size=1,
        max_size=12,
    )
)
def test_every_piece_is_in_one_course(rows: list[tuple[int, tuple[int, int], int]]) -> None:
    """Whatever the shape of the net: nothing is lost and nothing is told twice."""
    lines, at = [], (5, 5)
    places = [at]
    for start, (dx, dy), length in rows:
        x, y = places[start % len(places)]
        places.append((x + dx * length, y + dy * length))
        lines.append(Line("A", ((x, y), places[-1])))
    tracks, ways = _ways(board(Sheet(lines=tuple(lines)), Sheet(), outline=WHOLE))
    told = [(step.tracks, step.piece) for course in ways for step in course.steps]
    assert len(told) == len(set(told))
    drawn = shapely.union_all([shapely.LineString(line.points) for line in lines]).length
    walked = shapely.union_all(
        [shapely.LineString(_ends(tracks, step)) for course in ways for step in course.steps]
    ).length
    assert np.isclose(drawn, walked)
    for course in ways:
        ends = [_ends(tracks, step) for step in course.steps]
        assert all(one[1] == other[0] for one, other in pairwise(ends))
