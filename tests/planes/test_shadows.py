"""Spans of straight pieces, and which plane lies under a place."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
import shapely
from hypothesis import assume, given
from hypothesis import strategies as st

from splitcheck.planes.islands import find_planes
from splitcheck.planes.shadows import (
    Span,
    common,
    merged,
    nearest_cover,
    uncovered,
    without,
)
from splitcheck.planes.tracks import lay_all
from tests.making.hand import Line, Sheet, board

eighths = st.integers(0, 64).map(lambda n: n / 64)
spans = st.lists(st.tuples(eighths, eighths).map(lambda s: (min(s), max(s))), max_size=8)


def _length(some: list[Span]) -> float:
    return sum(stop - start for start, stop in some)


def _cells(some: list[Span]) -> set[int]:
    """The 64ths of the piece that spans hold."""
    return {n for n in range(64) for a, b in some if a <= n / 64 and (n + 1) / 64 <= b}


@given(spans)
def test_merged_spans_are_apart_and_hold_the_same(some: list[Span]) -> None:
    """In order, none touching the next."""
    joined = merged(some)
    assert all(a[1] < b[0] for a, b in pairwise(joined))
    assert _cells(joined) == _cells(some)


@given(spans, spans)
def test_common_is_what_both_hold(one: list[Span], other: list[Span]) -> None:
    """Cell by cell, and in either order."""
    both = common(merged(one), merged(other))
    assert _cells(both) == _cells(one) & _cells(other)
    assert _length(both) == pytest.approx(_length(common(merged(other), merged(one))))


@given(spans)
def test_without_is_the_rest(some: list[Span]) -> None:
    """What is taken and what is left are the whole, and nothing is in both."""
    taken = merged(some)
    left = without((0.0, 1.0), taken)
    assert _length(left) + _length(taken) == 1.0
    assert common(left, taken) == []


@given(
    st.lists(st.tuples(st.integers(0, 15), st.integers(0, 11)), unique=True, max_size=25),
    st.tuples(st.floats(0.1, 15.9), st.floats(0.1, 11.9)),
    st.tuples(st.floats(0.1, 15.9), st.floats(0.1, 11.9)),
)
def test_uncovered_and_covered_are_the_whole(
    holes: list[tuple[int, int]], one: tuple[float, float], other: tuple[float, float]
) -> None:
    """Any straight piece over a plane with square holes, against shapely's own difference."""
    cut = shapely.union_all([shapely.box(x + 0.2, y + 0.2, x + 0.8, y + 0.8) for x, y in holes])
    line = shapely.LineString([one, other])
    copper = shapely.box(0, 0, 16, 12).difference(cut)
    assume(line.length > 0.01)
    assume(line.intersection(copper.boundary).length == 0)  # on a rim it is either
    made = board(
        Sheet(lines=(Line("CLK", (one, other)),)),
        Sheet(tuple(("GND", piece) for piece in shapely.get_parts(copper))),
        outline=shapely.box(0, 0, 16, 12),
    )
    (tracks, _), (plane,) = lay_all(made, frozenset({0}), ()), find_planes(made)
    bits = uncovered(tracks, plane, range(len(tracks.net))).get(0, ())
    bare = _length([(bit.start, bit.stop) for bit in bits]) * line.length
    assert bare == pytest.approx(line.difference(copper).length, abs=2e-3 * (1 + len(holes)))
    for bit in bits:
        x, y = tracks.point(0, (bit.start + bit.stop) / 2)
        assert plane.gaps[bit.gap].shape.covers(shapely.Point(x, y).buffer(1e-9))


def test_nearest_cover_asks_for_every_point() -> None:
    """The first layer that covers all points, not the first that covers one."""
    made = board(
        Sheet(lines=(Line("CLK", ((1, 1), (9, 1))),)),
        Sheet((("GND", shapely.box(0, 0, 5, 5)),)),
        Sheet((("GND", shapely.box(0, 0, 10, 5)),)),
    )
    planes = find_planes(made)
    xs, ys = np.array([2.0, 8.0]), np.array([1.0, 1.0])
    assert nearest_cover(planes, [2, 3], xs[:1], ys[:1]) == 2
    assert nearest_cover(planes, [2, 3], xs, ys) == 3
    assert nearest_cover(planes, [2], xs, ys) is None
