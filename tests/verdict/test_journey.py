"""What carries the return of a net, stretch by stretch, on boards one can draw."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import pytest
import shapely
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.planes.crossings import judged_nets
from splitcheck.planes.islands import find_planes, reference_nets
from splitcheck.planes.tracks import lay_all
from splitcheck.verdict import journey
from splitcheck.verdict.findings import Finding, Leg
from splitcheck.verdict.journey import journeys, sum_nh
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene, via

WHOLE = shapely.box(0, 0, 60, 30)
SLOT = shapely.box(29.5, 10, 30.5, 20)


def _plane(*holes: Polygon, net: str = "GND") -> Sheet:
    left = WHOLE.difference(shapely.union_all(holes))
    return Sheet(tuple((net, piece) for piece in shapely.get_parts(left)))


def _line(net: str = "A", y: float = 15.0, x0: float = 2.0, x1: float = 58.0) -> Line:
    return Line(net, ((x0, y), (x1, y)))


def _told(made: Board) -> tuple[dict[str, tuple[Leg, ...]], Sequence[Finding]]:
    found = judge(scene(made), *crossings(made)).findings
    tracks = lay_all(made, judged_nets(made, reference_nets(made)), ())
    told = journeys(made, find_planes(made), tracks, found)
    assert told.left_out == 0
    return told.legs, found


def _shape(legs: Sequence[Leg]) -> list[tuple[str, str, tuple[str, ...], float]]:
    return [(leg.kind, leg.layer, leg.plane_layers, round(leg.length_mm, 2)) for leg in legs]


def test_a_whole_plane_is_one_stretch() -> None:
    """56 mm over L2, nothing added."""
    legs, _ = _told(board(Sheet(lines=(_line(),)), _plane(), outline=WHOLE))
    assert _shape(legs["A"]) == [("stretch", "L1", ("L2",), 56.0)]
    assert (legs["A"][0].plane_nets, legs["A"][0].added_nh) == (("GND",), 0.0)


def test_a_slot_parts_the_stretch_and_is_told_by_its_finding() -> None:
    """27.5 mm, 1 mm of slot, 27.5 mm; the sum is that of the finding."""
    legs, found = _told(board(Sheet(lines=(_line(),)), _plane(SLOT), outline=WHOLE))
    assert _shape(legs["A"]) == [
        ("stretch", "L1", ("L2",), 27.5),
        ("finding", "L1", ("L2",), 1.0),
        ("stretch", "L1", ("L2",), 27.5),
    ]
    assert legs["A"][1].finding == found[0].id
    assert legs["A"][1].added_nh == found[0].added_nh
    assert sum_nh(found) == found[0].added_nh


def test_antipads_part_nothing() -> None:
    """A row of small holes under the trace that adds too little to be a finding."""
    dots = [shapely.box(x, 14.8, x + 0.4, 15.2) for x in range(10, 50, 4)]
    made = board(Sheet(lines=(_line(),)), _plane(*dots), outline=WHOLE)
    legs, found = _told(made)
    assert not found
    assert len(legs["A"]) == 1


def test_a_via_to_the_other_side_changes_planes() -> None:
    """Down from L1 over L2 to L4 under L3: a change in between, at the hole."""
    made = board(
        Sheet(lines=(_line(x1=30.0),)),
        _plane(SLOT.centroid.buffer(0.5)),
        _plane(SLOT.centroid.buffer(0.5)),
        Sheet(lines=(_line(x0=30.0),)),
        holes=[via(30, 15)],
        outline=WHOLE,
    )
    legs, _ = _told(made)
    assert [(leg.kind, leg.layer, leg.plane_layers) for leg in legs["A"]] == [
        ("stretch", "L1", ("L2",)),
        ("change", "L4", ("L3",)),
        ("stretch", "L4", ("L3",)),
    ]
    assert legs["A"][1].at_mm == (30.0, 15.0)
    assert sum(leg.length_mm for leg in legs["A"]) == pytest.approx(56.0)


def test_both_planes_of_a_stripline_at_one_place_add_up() -> None:
    """Two findings, each with its plane's share already; the net sees their sum."""
    made = board(_plane(SLOT), Sheet(lines=(_line(),)), _plane(SLOT), outline=WHOLE)
    legs, found = _told(made)
    assert {finding.plane_layer for finding in found} == {"L1", "L3"}
    told = [leg for leg in legs["A"] if leg.kind == "finding"]
    assert [round(leg.length_mm, 6) for leg in told] == [1.0, 0.0]
    added = [finding.added_nh or 0.0 for finding in found]
    assert sum_nh(found) == pytest.approx(sum(added))
    assert min(added) > 0.05
    assert legs["A"][0].plane_layers == ("L1", "L3")


def test_a_split_leads_from_one_net_to_another_without_a_change_of_its_own() -> None:
    """The finding is the change; no way back makes the sum None."""
    cut = shapely.box(29.8, -1, 30.2, 31)
    halves = shapely.get_parts(WHOLE.difference(cut))
    made = board(
        Sheet(lines=(_line(),)),
        Sheet(tuple(zip(("GND", "VCC"), halves, strict=True))),
        outline=WHOLE,
    )
    legs, found = _told(made)
    assert [leg.kind for leg in legs["A"]] == ["stretch", "finding", "stretch"]
    assert {legs["A"][0].plane_nets, legs["A"][2].plane_nets} == {("GND",), ("VCC",)}
    assert legs["A"][1].added_nh is None
    assert sum_nh(found) is None


def test_no_plane_is_bare_and_told_once() -> None:
    """Both ends of the net hang over nothing: the longer one is the finding, the other its echo."""
    holes = shapely.box(-1, -1, 12, 31), shapely.box(40, -1, 61, 31)
    made = board(Sheet(lines=(_line(),)), _plane(*holes), outline=WHOLE)
    legs, (found,) = _told(made)
    assert _shape(legs["A"]) == [
        ("finding", "L1", (), 10.0),
        ("stretch", "L1", ("L2",), 28.0),
        ("finding", "L1", (), 18.0),
    ]
    ends = legs["A"][0], legs["A"][-1]
    assert [leg.finding for leg in ends] == [found.id, found.id]
    assert [leg.added_nh for leg in ends] == [0.0, found.added_nh]


def test_a_net_of_many_legs_is_cut_short_and_counted(monkeypatch: pytest.MonkeyPatch) -> None:
    """Nothing is dropped in silence."""
    monkeypatch.setattr(journey, "MOST_LEGS", 2)
    made = board(Sheet(lines=(_line(),)), _plane(SLOT), outline=WHOLE)
    tracks = lay_all(made, judged_nets(made, reference_nets(made)), ())
    found = judge(scene(made), *crossings(made)).findings
    told = journeys(made, find_planes(made), tracks, found)
    assert (len(told.legs["A"]), told.left_out) == (2, 1)


@pytest.mark.parametrize("turned", [False, True])
def test_legs_follow_one_another(turned: bool) -> None:
    """The lengths add up to the trace whichever way it is drawn, and each begins where one ends."""
    points = ((2.0, 3.0), (29.9, 3.0), (29.9, 27.0), (58.0, 27.0))
    line = Line("A", points[::-1] if turned else points)
    cuts = shapely.box(20, 1, 21, 8), shapely.box(40, 20, 41, 29.5)
    legs, found = _told(board(Sheet(lines=(line,)), _plane(*cuts), outline=WHOLE))
    assert len(found) == 2
    assert sum(leg.length_mm for leg in legs["A"]) == pytest.approx(27.9 + 24 + 28.1)
    stretches = [leg for leg in legs["A"] if leg.kind == "stretch"]
    assert len(stretches) == 3
    assert all(one.plane_layers == other.plane_layers for one, other in pairwise(stretches))
