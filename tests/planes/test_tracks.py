"""Centre lines as pieces: what is drawn twice, and where pieces are cut (hand-made boards)."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from shapely import Polygon, box

from splitcheck.planes.tracks import Tracks, lay_all
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene

WHOLE = box(0, 0, 40, 20)


def _laid(*lines: Line) -> Tracks:
    made = board(Sheet(lines=lines), Sheet((("GND", WHOLE),)), outline=WHOLE)
    nets = frozenset(net.number for net in made.nets if net.name != "GND")
    (top,) = lay_all(made, nets, ["L1"])
    return top


def _ends(tracks: Tracks) -> set[frozenset[tuple[float, ...]]]:
    return {
        frozenset((tuple(one), tuple(other)))
        for one, other in zip(tracks.start.tolist(), tracks.end.tolist(), strict=True)
    }


def test_a_stroke_over_a_part_of_another_counts_once() -> None:
    """From 2 to 38 and again from 38 to 20: two pieces that meet at 20, nothing twice."""
    tracks = _laid(Line("CLK", ((2, 10), (38, 10))), Line("CLK", ((38, 10), (20, 10))))
    assert _ends(tracks) == {
        frozenset(((2.0, 10.0), (20.0, 10.0))),
        frozenset(((20.0, 10.0), (38.0, 10.0))),
    }
    assert len(tracks.length_mm) == 2


@given(st.lists(st.integers(0, 3), min_size=1, max_size=6))
def test_drawn_again_and_again_it_is_one_trace(turns: list[int]) -> None:
    """However often and whichever way round the two strokes of a trace are drawn."""
    ways = (((2, 10), (20, 10)), ((20, 10), (2, 10)), ((20, 10), (38, 12)), ((38, 12), (20, 10)))
    tracks = _laid(*(Line("CLK", ways[turn]) for turn in turns))
    assert len(tracks.length_mm) == len({turn // 2 for turn in turns})


def test_a_trace_drawn_twice_in_part_adds_what_it_does_drawn_once() -> None:
    """The second stroke ends in the middle of the first: a trace must not come back over itself."""
    plane = Sheet((("GND", Polygon(WHOLE.exterior, [box(29.8, 4, 30.2, 16).exterior])),))
    once, twice = (
        judge(scene(made), crossings(made)[0], ()).findings
        for lines in (
            (Line("CLK", ((2, 10), (38, 10))),),
            (Line("CLK", ((38, 10), (2, 10))), Line("CLK", ((38, 10), (20, 10)))),
        )
        for made in [board(Sheet(lines=lines), plane, outline=WHOLE)]
    )
    assert len(once) == len(twice) == 1
    assert twice[0].added_nh == pytest.approx(once[0].added_nh, rel=1e-3)
