"""What is proposed and what is not, on boards whose answer one can see."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise
from math import hypot

import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.copper.holes import Hole
from splitcheck.errors import SplitcheckError
from splitcheck.loops.bridges import with_capacitor
from splitcheck.planes.crossings import judged_nets
from splitcheck.planes.edges import EdgeRun, find_edge_runs
from splitcheck.planes.islands import find_planes, reference_nets
from splitcheck.planes.tracks import lay_all
from splitcheck.verdict.edge_runs import edge_findings
from splitcheck.verdict.findings import Finding, Proposal
from splitcheck.verdict.judge import judge
from splitcheck.verdict.mend import mend, mended
from splitcheck.verdict.proposals.room import Room
from splitcheck.verdict.scene import Judged, Scene
from tests.making.hand import Line, Sheet, board, crossings, scene, via
from tests.planes.test_changes import changes
from tests.report.made import pump

WHOLE = shapely.box(0, 0, 40, 30)
#: 1 mm wide, 6 mm long, upright, middle of the board.
SLOT = shapely.box(19.5, 12, 20.5, 18)
#: Right through.
SPLIT = shapely.box(19.7, -1, 20.3, 31)


def _plane(*holes: Polygon, net: str = "GND") -> Sheet:
    left = WHOLE.difference(shapely.union_all(holes))
    return Sheet(tuple((net, piece) for piece in shapely.get_parts(left)))


def _split(one: str, other: str) -> Sheet:
    left = shapely.get_parts(WHOLE.difference(SPLIT))
    return Sheet(tuple(zip((one, other), left, strict=True)))


def _across(y: float = 15.0, net: str = "CLK") -> Line:
    return Line(net, ((2, y), (38, y)))


def _made(*sheets: Sheet, holes: Sequence[Hole] = ()) -> Board:
    heights = [0.2, 0.5, 0.2][: len(sheets) - 1]
    return board(*sheets, holes=holes, heights_mm=heights, outline=WHOLE)


def _seen(made: Board, seen: Scene | None = None) -> tuple[Judged, tuple[Proposal, ...]]:
    """What is judged, and what would mend the worst of it."""
    judged, worst = _looked_at(made, seen)
    assert bool(worst.proposals) != bool(worst.misses)
    assert all(miss.share is None or miss.share < 0.05 for miss in worst.misses)
    return judged, worst.proposals


def _looked_at(made: Board, seen: Scene | None = None, net: str = "") -> tuple[Judged, Finding]:
    """What is judged, and the worst of it, or of a net, with what would mend it or why not."""
    seen = seen or scene(made)
    judged = judge(seen, *crossings(made), changes=changes(made), edges=_edges(made))
    tracks = lay_all(made, judged_nets(made, reference_nets(made)), ())
    worst = next(finding for finding in judged.findings if net in {"", finding.net})
    room = Room(made, seen.planes)
    return judged, mended(worst, tracks, seen, judged, room)


def _edges(made: Board) -> tuple[EdgeRun, ...]:
    nets = judged_nets(made, reference_nets(made))
    return find_edge_runs(made, find_planes(made), lay_all(made, nets, ()))


def _of(found: Sequence[Proposal], what: str) -> list[Proposal]:
    return [proposal for proposal in found if proposal.what == what]


def _worst(made: Board) -> Finding:
    return judge(scene(made), *crossings(made), changes=changes(made)).findings[0]


def test_vias_to_the_plane_beyond_are_put_at_both_ends_and_hold_their_promise() -> None:
    """A slot over a whole plane of the same net: the same board with those vias says the same."""
    slotted, whole = _plane(SLOT), _plane()
    judged, found = _seen(_made(Sheet(lines=(_across(),)), slotted, whole))
    best = _of(found, "via")[0]
    assert len(best.at_mm) == 2
    before = judged.findings[0].added_nh or 0.0
    for x, y in best.at_mm:
        assert abs(y - 15.0) >= 0.1 + 0.2 + 0.3 - 1e-6  # half a trace, a clearance, half a pad
        assert abs(x - 20.0) > 0.5  # beside the slot, not in it
    assert {x > 20 for x, _ in best.at_mm} == {False, True}
    holes = [via(*at) for at in best.at_mm]
    after = _worst(_made(Sheet(lines=(_across(),)), slotted, whole, holes=holes))
    assert best.added_nh == pytest.approx(after.added_nh, rel=1e-3)
    assert best.added_nh < 0.8 * before
    assert not best.isolation


def test_no_via_where_the_plane_beyond_is_of_another_net() -> None:
    """The twin of the above: joining them would be a short."""
    _, found = _seen(_made(Sheet(lines=(_across(),)), _plane(SLOT), _plane(net="VCC")))
    assert not _of(found, "via")


def test_no_via_where_foreign_copper_leaves_no_room() -> None:
    """The same board, with traces so near to one another on the bottom that no pad fits between."""
    lines = tuple(Line(f"N{i}", ((2, 5 + 0.7 * i), (38, 5 + 0.7 * i))) for i in range(30))
    sheets = Sheet(lines=(_across(),)), _plane(SLOT), _plane()
    room = _seen(_made(*sheets, Sheet(lines=(Line("N", ((2, 2), (38, 2))),))))[1]
    assert _of(room, "via")
    assert not _of(_seen(_made(*sheets, Sheet(lines=lines)))[1], "via")


def test_no_via_nearer_than_allowed_to_another_hole() -> None:
    """Walls of holes stay 0.25 mm apart."""
    holes = [via(19.0, 14.35), via(21.0, 15.65)]
    made = _made(Sheet(lines=(_across(),)), _plane(SLOT), _plane(), holes=holes)
    for proposal in _of(_seen(made)[1], "via"):
        for x, y in proposal.at_mm:
            for hole in holes:
                assert hypot(x - hole.path[0][0], y - hole.path[0][1]) >= 0.55 - 1e-6


def test_a_bridge_of_copper_closes_a_slot() -> None:
    """Nothing is in the way: hardly anything is left, and the ends lie on either side."""
    _, found = _seen(_made(Sheet(lines=(_across(),)), _plane(SLOT)))
    (bridge,) = _of(found, "copper")
    assert bridge.added_nh < 0.05
    assert sorted(x for x, _ in bridge.at_mm) == pytest.approx([19.2, 20.8])
    assert "GND on L2" in bridge.words


def test_no_bridge_over_a_foreign_trace() -> None:
    """A trace runs along the slot: copper would lie across it."""
    slotted = _plane(SLOT)
    inner = Line("LEAK", ((20, 12.5), (20, 17.5)))
    made = _made(Sheet(lines=(_across(),)), replace_lines(slotted, inner))
    assert not _of(_seen(made)[1], "copper")


def replace_lines(sheet: Sheet, *lines: Line) -> Sheet:
    """The same areas with traces."""
    return Sheet(sheet.areas, lines)


def test_no_bridge_between_two_nets() -> None:
    """Copper between GND and VCC is a short; a capacitor is not."""
    _, found = _seen(_made(Sheet(lines=(_across(),)), _split("GND", "VCC")))
    assert {proposal.what for proposal in found} == {"capacitor"}


def test_the_trace_is_moved_past_the_end_of_the_slot() -> None:
    """2.5 or 3.5 mm to its ends, 5 heights of 0.2 mm beyond, half a width: 3.6 or 4.6 mm.

    A trace in the way on one side leaves the other.
    """
    sheets = Sheet(lines=(_across(14.5),)), _plane(SLOT)
    moves = _of(_seen(_made(*sheets))[1], "move")
    assert sorted(_shift(move) for move in moves) == [3.6, 4.6]
    assert all(move.added_nh < 0.02 for move in moves)
    below = Line("N", ((2, 11.5), (38, 11.5)))
    made = _made(Sheet(lines=(_across(14.5), below)), _plane(SLOT))
    assert [_shift(move) for move in _of(_seen(made)[1], "move")] == [4.6]


def _shift(move: Proposal) -> float:
    found = re.search(r"by (\d+\.\d+) mm", move.words)
    assert found is not None
    return float(found[1])


def test_a_slot_too_long_is_not_walked_round() -> None:
    """Nobody moves a trace by 14 mm."""
    long = shapely.box(19.5, 1, 20.5, 29)
    assert not _of(_seen(_made(Sheet(lines=(_across(),)), _plane(long)))[1], "move")


def test_a_capacitor_across_a_gap_without_any_bridge_may_cross_a_barrier() -> None:
    """GND and VCC share nothing: every proposal says so; with one capacitor far off none does."""
    made = _made(Sheet(lines=(_across(),)), _split("GND", "VCC"))
    judged, found = _seen(made)
    assert judged.findings[0].added_nh is None
    assert found
    assert all(proposal.isolation for proposal in found)
    seen = scene(made)
    one, other = judged.findings[0].islands
    graph = with_capacitor(seen.graph, one, other, (18.0, 3.0), (22.0, 3.0), 1.5)
    _, found = _seen(made, replace(seen, graph=graph))
    assert found
    assert not any(proposal.isolation for proposal in found)


def test_two_capacitors_where_one_leaves_more_than_a_note() -> None:
    """One on either side of the trace: less than either alone, as the same board with both says."""
    made = _made(Sheet(lines=(_across(),)), _split("GND", "VCC"), Sheet(lines=(_across(net="M"),)))
    seen = scene(made)
    judged, found = _seen(made)
    both, alone = found
    assert (len(both.at_mm), len(alone.at_mm)) == (4, 2)
    sides = {y > 15.0 for _, y in both.at_mm}
    assert sides == {True, False}
    assert both.added_nh < 0.9 * alone.added_nh
    graph = seen.graph
    one, other = judged.findings[0].islands
    value = re.search(r"taken as (\d+\.\d+) nH each", both.words)
    assert value is not None
    down = re.findall(r"its vias at x (\S+) y (\S+) and x ([\d.]+) y ([\d.]+)", both.words)
    assert len(down) == 2
    for x0, y0, x1, y1 in down:
        ends = (float(x0), float(y0)), (float(x1), float(y1))
        graph = with_capacitor(graph, one, other, *ends, float(value[1]), layer=1)
    after = judge(replace(seen, graph=graph), *crossings(made)).findings
    (left,) = (f.added_nh for f in after if f.net == "CLK")
    assert both.added_nh == pytest.approx(left, rel=0.01)


def test_what_a_mend_leaves_for_all_nets_over_the_gap_is_said() -> None:
    """Four traces 1 mm apart over one slot: the sum of their values in the board as mended.

    And one piece of copper serves all of them.
    """
    ys = (13.5, 14.5, 15.5, 16.5)
    slotted, whole = _plane(shapely.box(19.5, 5, 20.5, 25)), _plane()
    bus = Sheet(lines=tuple(_across(y, f"D{i}") for i, y in enumerate(ys)))
    judged, found = _seen(_made(bus, slotted, whole))
    best = _of(found, "via")[0]
    told = re.search(
        r"with the 3 other nets near it over this gap (\S+) nH left of (\S+)", best.words
    )
    assert told is not None
    before = sum(f.added_nh or 0.0 for f in judged.findings)
    assert float(told[2]) == pytest.approx(before, abs=0.006)
    holes = [via(*at) for at in best.at_mm]
    made = _made(bus, slotted, whole, holes=holes)
    after = judge(scene(made), *crossings(made))
    left = sum(f.added_nh or 0.0 for f in after.findings)
    assert float(told[1]) == pytest.approx(left, rel=1e-3, abs=0.006)
    assert left < 0.95 * before
    piece = next(p for p in _of(found, "copper") if "under all 4 nets" in p.words)
    assert "3 other nets" in piece.words
    closed = slotted.areas[0][1].union(Polygon(piece.at_mm))
    assert isinstance(closed, Polygon)
    made = _made(bus, Sheet((("GND", closed),)))
    after = judge(scene(made), *crossings(made))
    assert after.findings == ()
    assert piece.added_nh < 0.02


def test_one_trace_over_a_gap_is_told_without_others() -> None:
    """The twin of the above."""
    _, found = _seen(_made(Sheet(lines=(_across(),)), _plane(SLOT), _plane()))
    assert found
    assert not any("over this gap" in proposal.words for proposal in found)


def test_four_vias_where_two_leave_more_than_a_note() -> None:
    """A long slot: both ends, both sides of the trace; and the twin, a short one, gets two."""
    long = shapely.box(19.5, 5, 20.5, 25)
    sheets = Sheet(lines=(_across(),)), _plane(long), _plane()
    thick = (0.3, 2.0)
    judged, found = _seen(board(*sheets, heights_mm=thick, outline=WHOLE))
    best = _of(found, "via")[0]
    assert judged.findings[0].level != "note"
    assert {(x > 20, y > 15) for x, y in best.at_mm} == {
        (True, True),
        (True, False),
        (False, True),
        (False, False),
    }
    assert best.words.startswith("four stitching vias of GND")
    holes = [via(*at) for at in best.at_mm]
    after = _worst(board(*sheets, holes=holes, heights_mm=thick, outline=WHOLE))
    assert best.added_nh == pytest.approx(after.added_nh, rel=1e-3)
    short = shapely.box(19.8, 14, 20.2, 16)
    _, found = _seen(_made(Sheet(lines=(_across(),)), _plane(short), _plane()))
    assert all(len(proposal.at_mm) <= 2 for proposal in _of(found, "via"))


def test_a_trace_that_bends_over_the_slot_is_moved_with_its_bends() -> None:
    """It steps up by 0.4 mm over the slot: so does it after the move, and nothing is left."""
    bent = Line("CLK", ((2, 14.3), (19.9, 14.3), (20.1, 14.7), (38, 14.7)))
    made = _made(Sheet(lines=(bent,)), _plane(SLOT))
    judged, found = _seen(made)
    moves = _of(found, "move")
    assert moves
    for move in moves:
        way = [(float(x), float(y)) for x, y in re.findall(r"x ([\d.]+) y ([\d.]+)", move.words)]
        assert len(way) == 6
        assert way[3][1] - way[2][1] == pytest.approx(0.4)
        points = ((2.0, 14.3), *way, (38.0, 14.7))
        drawn = _made(Sheet(lines=(Line("CLK", points),)), _plane(SLOT))
        assert judge(scene(drawn), *crossings(drawn)).findings == ()
        assert move.added_nh < 0.05 * (judged.findings[0].added_nh or 0.0)


def _along_edge(y: float = 0.2, net: str = "CLK") -> Line:
    return Line(net, ((5, y), (35, y)))


def test_a_trace_along_the_edge_is_moved_inwards_and_holds_its_promise() -> None:
    """0.2 mm within the edge and above the plane: some heights farther in, hardly a trace of it."""
    plane = Sheet((("GND", shapely.box(0, 10, 40, 30)),))
    judged, found = _seen(_made(Sheet(lines=(_along_edge(10.1),)), plane))
    assert judged.findings[0].kind == "edge-run"
    (move,) = _of(found, "move")
    way = [(float(x), float(y)) for x, y in re.findall(r"x ([\d.]+) y ([\d.]+)", move.words)]
    assert _shift(move) == pytest.approx(0.9)  # five heights of 0.2 mm from the edge
    assert way[1][1] == pytest.approx(11.0)
    assert move.added_nh < 0.1 * (judged.findings[0].added_nh or 0.0)
    drawn = _made(Sheet(lines=(Line("CLK", tuple(way)),)), plane)
    runs = find_edge_runs(drawn, find_planes(drawn), lay_all(drawn, _nets(drawn), ()), 12.0)
    seen = replace(scene(drawn), min_nh=0.0)
    left = sum(f.added_nh or 0.0 for f in edge_findings(seen, runs, (), defaultdict(int)))
    assert move.added_nh == pytest.approx(left, rel=0.1)


def test_a_plane_is_let_out_beneath_a_trace_along_its_edge() -> None:
    """There is room beyond the edge: the trace stays where it is."""
    plane = Sheet((("GND", shapely.box(0, 10, 40, 30)),))
    judged, found = _seen(_made(Sheet(lines=(_along_edge(10.1),)), plane))
    (let_out,) = _of(found, "copper")
    assert "plane of GND on L2 let out" in let_out.words
    assert let_out.added_nh < 0.1 * (judged.findings[0].added_nh or 0.0)
    half = re.search(r"(\d+\.\d+) mm to either side", let_out.words)
    assert half is not None
    more = shapely.box(5, 10.1 - float(half[1]), 35, 10.1 + float(half[1]))
    whole = plane.areas[0][1].union(more)
    assert isinstance(whole, Polygon)
    drawn = _made(Sheet(lines=(_along_edge(10.1),)), Sheet((("GND", whole),)))
    runs = find_edge_runs(drawn, find_planes(drawn), lay_all(drawn, _nets(drawn), ()), 12.0)
    seen = replace(scene(drawn), min_nh=0.0)
    left = sum(f.added_nh or 0.0 for f in edge_findings(seen, runs, (), defaultdict(int)))
    assert let_out.added_nh == pytest.approx(left, rel=0.1)


def test_along_the_edge_of_the_board_the_trace_is_moved_and_no_plane_let_out() -> None:
    """The outline ends there; and a trace in the way leaves the move less far."""
    plane = Sheet((("GND", shapely.box(0, 0.3, 40, 30)),))
    _, found = _seen(_made(Sheet(lines=(_along_edge(0.4),)), plane))
    assert {proposal.what for proposal in found} == {"move"}
    near = Line("N", ((2, 1.2), (38, 1.2)))
    _, less = _seen(_made(Sheet(lines=(_along_edge(0.4), near)), plane))
    assert all(_shift(move) < _shift(found[0]) for move in less)
    full = Line("N", ((2, 0.75), (38, 0.75)))
    assert _seen(_made(Sheet(lines=(_along_edge(0.4), full)), plane))[1] == ()


def _nets(made: Board) -> frozenset[int]:
    return judged_nets(made, reference_nets(made))


def _full(name: str) -> Sheet:
    """A layer with traces so near to one another that nothing fits between."""
    return Sheet(
        lines=tuple(Line(f"{name}{i}", ((2, 1 + 0.7 * i), (38, 1 + 0.7 * i))) for i in range(42))
    )


def test_a_capacitor_lies_across_the_gap_beside_the_trace() -> None:
    """Pads on either side, nearest to the trace; what it leaves is about its own inductance."""
    below = Sheet(lines=(_across(net="M"),))
    _, found = _seen(_made(Sheet(lines=(_across(),)), _split("GND", "VCC"), below))
    found = tuple(proposal for proposal in found if len(proposal.at_mm) == 2)
    (x0, y0), (x1, y1) = found[0].at_mm
    assert x0 < 19.7
    assert x1 > 20.3
    assert y0 == pytest.approx(y1)
    assert 0.1 + 0.2 + 0.3 <= abs(y0 - 15.0) <= 2.0
    mounted = re.search(r"taken as (\d+\.\d+) nH", found[0].words)
    assert mounted is not None
    assert float(mounted[1]) < found[0].added_nh < float(mounted[1]) + 2.5


def test_no_capacitor_where_its_pads_have_no_room() -> None:
    """The twin: both outer layers are full of foreign traces."""
    made = _made(_full("N"), _split("GND", "VCC"), _full("M"))
    assert _seen(made)[1] == ()


def test_a_return_via_is_put_beside_a_change_of_plane() -> None:
    """Both planes are ground: a via within the distance that guides ask for, or near it."""
    antipad = shapely.Point(20, 15).buffer(0.5)
    sheets = [
        Sheet(lines=(Line("CLK", ((2, 15), (20, 15))),)),
        _plane(antipad),
        _plane(antipad),
        Sheet(lines=(Line("CLK", ((20, 15), (38, 15))),)),
    ]
    holes = [via(20, 15), via(5, 3)]
    made = board(*sheets, holes=holes, heights_mm=(0.2, 1.0, 0.2), outline=WHOLE)
    judged, found = _seen(made)
    assert judged.findings[0].kind == "plane-change"
    (x, y), *_ = found[0].at_mm
    assert found[0].what == "via"
    assert hypot(x - 20, y - 15) <= 1.27
    assert found[0].added_nh < 0.1 * (judged.findings[0].added_nh or 0.0)


def test_planes_of_two_nets_get_a_capacitor_and_no_via() -> None:
    """The twin: ground above, supply below, and a capacitor far off."""
    antipad = shapely.Point(20, 15).buffer(0.5)
    sheets = [
        Sheet(lines=(Line("CLK", ((2, 15), (20, 15))),)),
        _plane(antipad),
        _plane(antipad, net="VCC"),
        Sheet(lines=(Line("CLK", ((20, 15), (38, 15))),)),
    ]
    made = board(*sheets, holes=[via(20, 15)], heights_mm=(0.2, 1.0, 0.2), outline=WHOLE)
    seen = scene(made)
    graph = with_capacitor(seen.graph, "L2.1", "L3.1", (38.0, 28.0), (38.0, 28.0), 1.5)
    judged, found = _seen(made, replace(seen, graph=graph))
    assert judged.findings[0].kind == "plane-change"
    assert {proposal.what for proposal in found} == {"capacitor"}
    assert not any(proposal.isolation for proposal in found)
    (x0, y0), (x1, y1) = found[0].at_mm
    assert hypot((x0 + x1) / 2 - 20, (y0 + y1) / 2 - 15) < 4.0


def test_plane_is_drawn_under_a_bare_trace() -> None:
    """The last 12 mm hang over nothing: plane is added there, and the finding is gone."""
    bare = shapely.box(26, -1, 41, 31)
    judged, found = _seen(_made(Sheet(lines=(_across(),)), _plane(bare)))
    assert judged.findings[0].kind == "no-plane"
    assert [proposal.what for proposal in found] == ["copper"]
    assert found[0].added_nh == 0.0


@settings(max_examples=12, deadline=None)
@given(
    st.floats(3.0, 14.0),
    st.floats(0.3, 2.0),
    st.floats(-0.8, 0.8),
    st.booleans(),
)
def test_no_proposal_adds_and_the_best_comes_first(
    length: float, width: float, off: float, beyond: bool
) -> None:
    """Whatever the slot: less than before by 5 % at least, in order, at most two of a kind."""
    slot = shapely.box(20 - width / 2, 15 - length / 2, 20 + width / 2, 15 + length / 2)
    sheets = [Sheet(lines=(_across(15 + off * length / 2),)), _plane(slot)]
    made = _made(*sheets, *([_plane()] if beyond else []))
    if not judge(scene(made), *crossings(made)).findings:
        return
    judged, found = _seen(made)
    before = judged.findings[0].added_nh
    assert before is not None
    assert all(0.0 <= proposal.added_nh <= 0.95 * before for proposal in found)
    assert all(one.added_nh <= other.added_nh + 1e-4 for one, other in pairwise(found))
    kinds = [proposal.what for proposal in found]
    assert max((kinds.count(kind) for kind in kinds), default=0) <= 2


#: 1 mm wide, 14 mm long: its ends are 6.5 and 7.5 mm from a trace at y 14.5.
LONG = shapely.box(19.5, 8, 20.5, 22)
#: Two traces past either end, so near that none fits beyond it nor between.
STUBS = tuple(Line(f"N{y}", ((17, y), (23, y))) for y in (7.1, 7.7, 22.3, 22.9))
LEAK = Line("LEAK", ((20, 8.2), (20, 21.8)))


def _stuck(*beyond: Sheet, leak: bool = True, holes: Sequence[Hole] = ()) -> Finding:
    """A trace over a slot that a foreign trace fills, with foreign traces past its ends."""
    slotted = replace_lines(_plane(LONG), *([LEAK] if leak else []))
    top = Sheet(lines=(_across(14.5), *STUBS))
    heights = (0.2, 3.0)[: len(beyond) + 1]
    made = board(top, slotted, *beyond, holes=holes, heights_mm=heights, outline=WHOLE)
    return _looked_at(made, net="CLK")[1]


def test_where_nothing_has_room_each_way_says_why() -> None:
    """One plane, a trace in the slot, and traces past its ends.

    By hand: past an end the trace lies 1 height (0.2 mm) and half its width (0.1 mm) beyond, 7.8 or
    6.8 mm from where it is; a foreign trace's middle 0.4 mm off is as near as it may come (two half
    widths, 0.2 mm clear), which leaves 7.4 or 6.4 mm: 7.25 or 6.25 in steps of 0.25.
    """
    told = {miss.what: miss.words for miss in _stuck().misses}
    assert told["via"] == "no other plane of GND within 6 mm that the return could use"
    assert told["capacitor"] == "both sides are one net, GND"
    assert told["copper"] == "other nets' copper, holes or the outline leave no way across"
    up, down = told["move"].split(" and ")
    assert up == "needs 7.80 mm towards +y, free room 7.25 mm"
    assert down == "needs 6.80 mm towards -y, free room 6.25 mm"
    assert all(miss.share is None for miss in _stuck().misses)


def test_where_something_helps_no_way_is_told_to_have_failed() -> None:
    """The twin of the above: without the trace in the slot copper closes it."""
    helped = _stuck(leak=False)
    assert [proposal.what for proposal in helped.proposals] == ["copper"]
    assert helped.misses == ()


def test_where_nothing_helps_enough_the_best_says_how_little(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """A plane beyond, stitched beside the trace already: more vias take away hardly anything.

    Without a threshold the same vias are proposed, and the share is that of what they leave.
    """
    holes = [via(x, y) for x in (19.2, 20.8) for y in (13.8, 15.2)]
    stuck = _stuck(_plane(), holes=holes)
    assert stuck.proposals == ()
    (vias,) = (miss for miss in stuck.misses if miss.what == "via")
    assert vias.share is not None
    assert 0.0 < vias.share < 0.05
    said = re.fullmatch(r"2 tried, the best takes away only (\d+\.\d) %", vias.words)
    assert said is not None
    assert 0.0 <= 100 * vias.share - float(said[1]) < 0.1
    monkeypatch.setattr("splitcheck.verdict.proposals.case.LEAST_GAIN", 0.0)
    best = _of(_stuck(_plane(), holes=holes).proposals, "via")[0]
    assert stuck.added_nh is not None
    assert vias.share == pytest.approx(1.0 - best.added_nh / stuck.added_nh)


def test_sides_of_two_nets_are_told_of_copper() -> None:
    """Both outer layers are full: no part has room, copper would be a short."""
    _, full = _looked_at(_made(_full("N"), _split("GND", "VCC"), _full("M")))
    told = {miss.what: miss.words for miss in full.misses}
    assert told["copper"] in {
        "the sides are of two nets, GND and VCC",
        "the sides are of two nets, VCC and GND",
    }
    assert told["capacitor"].startswith("no room for its pads and vias within 10 mm")
    assert told["move"].startswith("the gap parts its plane in two")


def test_same_board_same_proposals() -> None:
    """Nothing depends on the order of a set."""
    made = _made(Sheet(lines=(_across(),)), _plane(SLOT), _plane())
    assert _seen(made)[1] == _seen(made)[1]


def test_an_unknown_finding_is_refused() -> None:
    """With what there is instead."""
    made = _made(Sheet(lines=(_across(),)), _plane(SLOT))
    with pytest.raises(SplitcheckError, match=r"finding F99: there is no such finding; .*`rank`"):
        mend(pump(), (), scene(made), Judged((), (), {}), ["F99"])
