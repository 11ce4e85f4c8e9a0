"""Runs of a trace where the plane that carried its return is missing, on boards one can draw."""

from __future__ import annotations

from itertools import pairwise
from math import sqrt

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.errors import SplitcheckError
from splitcheck.planes.crossings import judged_nets
from splitcheck.planes.islands import reference_nets
from splitcheck.planes.tracks import lay_all
from tests.making.hand import Line, Sheet, board, crossings

WHOLE = shapely.box(0, 0, 40, 30)
OUTLINE = shapely.box(0, 0, 40, 30)
#: 1 mm wide, 10 mm long, upright, middle of the board.
SLOT = shapely.box(19.5, 10, 20.5, 20)


def _cut(*holes: Polygon) -> Sheet:
    left = WHOLE.difference(shapely.union_all(holes))
    return Sheet(tuple(("GND", piece) for piece in shapely.get_parts(left)))


def _over(sheet: Sheet, *lines: Line) -> Board:
    return board(Sheet(lines=lines), sheet, outline=OUTLINE)


def test_straight_trace_over_a_slot() -> None:
    """Entry, exit, run and place; both ends on the one island."""
    (found,), bare = crossings(_over(_cut(SLOT), Line("CLK", ((5, 15), (35, 15)))))
    assert found.path == ((19.5, 15.0), (20.5, 15.0))
    assert found.run_mm == pytest.approx(1.0)
    assert found.at == (20.0, 15.0)
    assert found.islands == (0, 0)
    assert (found.layer, found.plane, found.width_mm, found.line) == (1, 2, 0.2, 1)
    assert bare == ()


def test_trace_beside_a_slot_crosses_nothing() -> None:
    """The centre line counts, not the rim of the trace."""
    assert crossings(_over(_cut(SLOT), Line("CLK", ((5, 20.05), (35, 20.05))))) == ((), ())


def test_oblique_run_is_longer_than_the_slot_is_wide() -> None:
    """At 45 degrees: root two times the width."""
    (found,), _ = crossings(_over(_cut(SLOT), Line("CLK", ((10, 5), (30, 25)))))
    assert found.run_mm == pytest.approx(sqrt(2))


def test_two_gaps_are_two_crossings() -> None:
    """One stroke over two slots."""
    second = shapely.box(29, 10, 29.5, 20)
    found, _ = crossings(_over(_cut(SLOT, second), Line("CLK", ((5, 15), (35, 15)))))
    assert sorted(c.run_mm for c in found) == pytest.approx([0.5, 1.0])
    assert len({c.gap for c in found}) == 2


def test_one_gap_passed_twice_is_two_crossings() -> None:
    """A trace that goes over, comes back and stays."""
    there_and_back = ((5, 13), (30, 13), (30, 17), (5, 17))
    found, _ = crossings(_over(_cut(SLOT), Line("CLK", there_and_back)))
    assert sorted(c.at for c in found) == [(20.0, 13.0), (20.0, 17.0)]
    assert len({c.gap for c in found}) == 1


@pytest.mark.parametrize("pieces", [2, 3, 7])
def test_many_strokes_over_one_gap_are_one_crossing(pieces: int) -> None:
    """A trace drawn in bits over a slot: those that start and end in the gap count too."""
    xs = [5.0, *(19.6 + 0.8 * n / pieces for n in range(pieces)), 35.0]
    bits = [Line("CLK", ((a, 15.0), (b, 15.0))) for a, b in pairwise(xs)]
    (found,), bare = crossings(_over(_cut(SLOT), *bits))
    assert found.run_mm == pytest.approx(1.0)
    assert found.at == pytest.approx((20.0, 15.0))
    assert bare == ()


def test_trace_that_bends_in_a_gap() -> None:
    """The run is the way of the trace: 2 mm up within a gap 1 mm wide."""
    bent = ((5, 13), (20, 13), (20, 15), (35, 15))
    (found,), _ = crossings(_over(_cut(SLOT), Line("CLK", bent)))
    assert found.run_mm == pytest.approx(0.5 + 2.0 + 0.5)
    assert found.path == ((19.5, 13.0), (20.0, 13.0), (20.0, 15.0), (20.5, 15.0))


def test_branch_in_the_middle_of_a_gap() -> None:
    """A T whose stem ends in the middle of a wide gap: the longest way through, once."""
    wide = shapely.box(15, 10, 25, 20)
    (found,), bare = crossings(
        _over(_cut(wide), Line("CLK", ((5, 12), (35, 12))), Line("CLK", ((18, 12), (18, 26))))
    )
    assert found.run_mm == pytest.approx(7 + 8)
    assert {found.path[0], found.path[-1]} == {(25.0, 12.0), (18.0, 20.0)}
    assert bare == ()


def test_trace_that_ends_in_a_gap_does_not_cross_it() -> None:
    """It runs out of its plane, which is for the rule of bare ends."""
    found, bare = crossings(_over(_cut(SLOT), Line("CLK", ((5, 15), (20.1, 15)))))
    assert found == ()
    assert [b.bare_mm for b in bare] == pytest.approx([0.6])


def test_split_plane_changes_the_island() -> None:
    """From one supply to the other."""
    halves = Sheet((("+5V", shapely.box(0, 0, 18, 30)), ("+3V3", shapely.box(21, 0, 40, 30))))
    (found,), _ = crossings(_over(halves, Line("CLK", ((5, 15), (35, 15)))))
    assert found.islands == (1, 0)
    assert found.run_mm == pytest.approx(3.0)


def test_trace_of_another_net_does_not_join_the_run() -> None:
    """Two nets that end at one place in the gap are not one trace."""
    found, bare = crossings(
        _over(_cut(SLOT), Line("A", ((5, 15), (20, 15))), Line("B", ((35, 15), (20, 15))))
    )
    assert found == ()
    assert len(bare) == 2


def test_plane_hidden_by_a_nearer_one() -> None:
    """A slot under whole copper is not seen; where the nearer copper ends it is."""
    near = Sheet((("GND", shapely.box(0, 0, 40, 16)),))
    made = board(
        Sheet(lines=(Line("LOW", ((5, 12), (35, 12))), Line("HIGH", ((5, 18), (35, 18))))),
        near,
        _cut(SLOT),
        outline=OUTLINE,
    )
    found, bare = crossings(made)
    assert [(made.nets[c.net].name, c.plane) for c in found] == [("HIGH", 3)]
    assert bare == ()


def test_gap_entered_from_a_nearer_plane_is_not_crossed() -> None:
    """The nearer plane ends where the slot begins: the farther one carried nothing before it."""
    made = board(
        Sheet(lines=(Line("CLK", ((5, 15), (35, 15))),)),
        Sheet((("GND", shapely.box(0, 0, 19.5, 30)),)),
        _cut(SLOT),
        outline=OUTLINE,
    )
    assert [c for c in crossings(made)[0] if c.plane == 3] == []


def test_gap_over_a_plane_beyond_is_a_crossing_still() -> None:
    """The nearer plane carried the return: the farther one does not undo its gap."""
    made = board(
        Sheet(lines=(Line("CLK", ((5, 15), (35, 15))),)),
        _cut(SLOT),
        Sheet((("GND", WHOLE),)),
        outline=OUTLINE,
    )
    found, bare = crossings(made)
    assert [c.plane for c in found] == [2]
    assert found[0].run_mm == pytest.approx(1.0)
    assert bare == ()


def test_stripline_crosses_in_the_broken_plane_only() -> None:
    """Planes above and below, the slot in the lower one."""
    made = board(
        Sheet((("GND", WHOLE),)),
        Sheet(lines=(Line("CLK", ((5, 15), (35, 15))),)),
        _cut(SLOT),
        outline=OUTLINE,
    )
    found, _ = crossings(made)
    assert [(c.layer, c.plane) for c in found] == [(2, 3)]


def test_no_plane_above_or_below_is_bare() -> None:
    """A trace beyond the rim of the only plane: its length, and no crossing."""
    half = Sheet((("GND", shapely.box(0, 0, 20, 30)),))
    found, bare = crossings(_over(half, Line("CLK", ((10, 15), (32, 15)))))
    assert found == ()
    assert [b.bare_mm for b in bare] == pytest.approx([12.0])
    assert bare[0].at == pytest.approx((26.0, 15.0))


def test_branches_that_meet_beyond_the_plane_are_one_bare_trace() -> None:
    """Three strokes of one net that hang together."""
    half = Sheet((("GND", shapely.box(0, 0, 20, 30)),))
    star = [Line("CLK", ((25, 15), end)) for end in ((35, 15), (25, 25), (25, 5))]
    _, bare = crossings(_over(half, *star))
    assert [b.bare_mm for b in bare] == pytest.approx([30.0])


cuts = st.lists(
    st.tuples(st.integers(2, 36), st.integers(1, 3)), max_size=6, unique_by=lambda c: c[0] // 5
)


@given(cuts, st.integers(6, 24))
def test_runs_add_up_to_the_length_of_trace_over_gaps(slots: list[tuple[int, int]], y: int) -> None:
    """Covered and uncovered together are the whole trace, against shapely's own difference."""
    holes = [shapely.box(x, 3, x + 0.5 * w, 27) for x, w in slots]
    line = Line("CLK", ((1.0, y + 0.25), (39.0, y + 0.25)))
    made = _over(_cut(*holes), line)
    found, bare = crossings(made)
    copper = shapely.union_all(list(made.layers[1].pieces))
    missing = shapely.LineString(line.points).difference(copper).length
    assert sum(c.run_mm for c in found) + sum(b.bare_mm for b in bare) == pytest.approx(missing)


def test_grounds_and_supplies_are_not_judged() -> None:
    """Their traces carry returns or direct current; copper without pad or hole is text."""
    made = _over(
        Sheet((("GND", WHOLE),)),
        Line("GND", ((1, 1), (5, 1))),
        Line("+3V3", ((1, 2), (5, 2))),
        Line("CLK", ((1, 3), (5, 3))),
        Line("", ((1, 4), (5, 4))),
    )
    judged = judged_nets(made, reference_nets(made))
    assert [made.nets[number].name for number in judged] == ["CLK"]


def test_patterns_choose_nets_and_a_wrong_one_is_told() -> None:
    """``*`` and ``?``; the message offers names that are near."""
    made = _over(Sheet((("GND", WHOLE),)), *(Line(f"D{n}", ((1, n), (5, n))) for n in range(1, 4)))
    carriers = reference_nets(made)
    assert len(judged_nets(made, carriers, ("D*",))) == 3
    assert len(judged_nets(made, carriers, ("D1", "D2"))) == 2
    with pytest.raises(SplitcheckError, match="did you mean D"):
        judged_nets(made, carriers, ("d1",))


def test_layers_may_be_chosen_and_a_wrong_one_is_told() -> None:
    """By name or by file."""
    made = _over(Sheet((("GND", WHOLE),)), Line("CLK", ((1, 3), (5, 3))))
    nets = judged_nets(made, reference_nets(made))
    assert [len(t.net) for t in lay_all(made, nets, ["L1"])] == [1]
    assert [t.layer for t in lay_all(made, nets, ["l2.gbr"])] == [2]
    with pytest.raises(SplitcheckError, match="the layers are L1, L2"):
        lay_all(made, nets, ["L3"])
