"""Changes of plane as findings: nearest way, its cost, and when nothing is said."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from math import cos, hypot, pi, radians, sin

import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from splitcheck.board.board import Board
from splitcheck.board.pairs import Pair, find_pairs
from splitcheck.copper.holes import Hole
from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import with_capacitor
from splitcheck.loops.handover import between_plates_nh, line_nh, plates_nf
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.listing import near_enough
from splitcheck.verdict.plane_changes import UNKNOWN, Case, change_findings
from splitcheck.verdict.rules import DEFAULT_CLASS, Rules
from splitcheck.verdict.scene import Judged, Scene
from splitcheck.verdict.score import noise_mv
from tests.making.hand import Line, Sheet, board, crossings, scene, via
from tests.planes.test_changes import changes

WHOLE = shapely.box(0, 0, 60, 40)
AT = (20.0, 15.0)


def _plane(net: str, *holes: Point) -> Sheet:
    left = WHOLE.difference(shapely.union_all([shapely.Point(at).buffer(0.5) for at in holes]))
    assert isinstance(left, shapely.Polygon)  # small holes leave one piece
    return Sheet(((net, left),))


def _made(
    vias: Sequence[Point] = (),
    nets: tuple[str, str] = ("GND", "GND"),
    apart_mm: float = 1.0,
    at: Sequence[Point] = (AT,),
    names: Sequence[str] = ("CLK",),
) -> Board:
    """A trace from the left on the top to the right on the bottom, over one hole each."""
    top = [Line(n, ((5.0, y), (x, y))) for n, (x, y) in zip(names, at, strict=True)]
    bottom = [Line(n, ((x, y), (55.0, y))) for n, (x, y) in zip(names, at, strict=True)]
    holes: list[Hole] = [via(*place) for place in (*at, *vias)]
    return board(
        Sheet(lines=tuple(top)),
        _plane(nets[0], *at),
        _plane(nets[1], *at),
        Sheet(lines=tuple(bottom)),
        holes=holes,
        heights_mm=(0.2, apart_mm, 0.2),
        outline=WHOLE,
    )


def _judged(made: Board, seen: Scene | None = None) -> Judged:
    return judge(seen or scene(made), *crossings(made), changes=changes(made))


def _one(made: Board, seen: Scene | None = None) -> Finding:
    (found,) = _judged(made, seen).findings
    return found


def _far(mm: float) -> list[Point]:
    return [(AT[0], AT[1] + mm)]


def test_far_return_via_is_told_with_its_distance_and_cost() -> None:
    """10 mm instead of 1.27 mm between planes 1 mm apart: the difference of two-wire lines."""
    found = _one(_made(_far(10.0)))
    expected = line_nh(10.0, 0.3, 1.0) - line_nh(1.27, 0.3, 1.0)
    assert expected == pytest.approx(0.83, abs=0.01)  # 0.4 ln(10 / 1.27), acosh to its limit
    assert (found.kind, found.net, found.layer) == ("plane-change", "CLK", "L1")
    assert (found.plane_layer, found.plane_net) == ("L2", "GND")
    assert found.at_mm == AT
    assert found.added_nh == pytest.approx(expected, rel=1e-3)
    assert found.noise_mv == pytest.approx(noise_mv(expected, DEFAULT_CLASS), rel=1e-3)
    assert (found.gap_mm, found.method) == (0.0, "estimated")
    assert found.detour_mm == pytest.approx(20.0)
    assert [(use.kind, use.at_mm) for use in found.bridges] == [("via", (20.0, 25.0))]
    assert found.islands == ("L2.1", "L3.1")
    assert "10.0 mm away" in found.reason
    assert found.level == "warning"  # 27 mV are none, but 0.5 nH of missing via are


@pytest.mark.parametrize("mm", [0.6, 1.27, 1.6])
def test_near_return_via_says_nothing(mm: float) -> None:
    """At what the guides ask for, and a little farther: counted, not listed."""
    judged = _judged(_made(_far(mm)))
    assert judged.findings == ()
    told = {count.what: count.number for count in judged.counts}
    assert told[near_enough("plane-change")] == 1


def test_several_vias_farther_off_are_as_good_as_one_near() -> None:
    """Four at 3 mm share the current: less than one at 1.27 mm costs."""
    ring = [(AT[0] + 3 * cos(k * pi / 2), AT[1] + 3 * sin(k * pi / 2)) for k in range(4)]
    assert _judged(_made(ring)).findings == ()
    assert _judged(_made(ring[1:2])).findings != ()


def test_slow_net_says_nothing() -> None:
    """The same far via and an edge of 20 ns."""
    made = _made(_far(10.0))
    slow = replace(DEFAULT_CLASS, name="slow", rise_ns=20.0)
    seen = replace(scene(made), drives=(slow,) * len(made.nets))
    assert _judged(made, seen).findings == ()


def test_distance_of_the_rules_is_what_counts() -> None:
    """Where 10 mm are allowed, a via 10 mm away adds nothing."""
    made = _made(_far(10.0))
    seen = replace(scene(made), rules=Rules(change_mm=10.0))
    assert _judged(made, seen).findings == ()


def test_thin_core_makes_it_harmless() -> None:
    """The same far via between planes 0.1 mm apart: a tenth of the inductance."""
    assert _judged(_made(_far(10.0), apart_mm=0.1)).findings == ()


def _with_capacitors(made: Board, *places: Point, mounted_nh: float = 1.0) -> Scene:
    seen = scene(made)
    graph = seen.graph
    for number, at in enumerate(places):
        graph = with_capacitor(graph, "L2.1", "L3.1", at, at, mounted_nh, ref=f"C{number}")
    return replace(seen, graph=graph)


def test_planes_of_two_nets_without_a_part_near_have_their_capacitance_alone() -> None:
    """Ground to supply, 1 mm apart, the only capacitor 38 mm away: spreading, and tr^2 / 2 C."""
    made = _made(nets=("GND", "+3V3"))
    found = _one(made, _with_capacitors(made, (58.0, 15.0)))
    area = scene(made).planes[2].islands[0].shape.area
    alone = between_plates_nh(0.3, 1.0, area, 1.0, plates_nf(area, 1.0, 4.3))
    alone -= line_nh(1.27, 0.3, 1.0)
    assert found.added_nh == pytest.approx(alone, rel=1e-3)
    assert found.plane_net == "GND to +3V3"
    assert (found.bridges, found.detour_mm) == ((), None)
    assert "no capacitor joins them near enough" in found.reason


def test_planes_of_two_nets_are_not_judged_where_no_file_tells_capacitors() -> None:
    """The same board without any part: counted, not listed."""
    judged = _judged(_made(nets=("GND", "+3V3")))
    assert judged.findings == ()
    assert UNKNOWN in {count.what for count in judged.counts}


def test_capacitor_between_two_nets_is_the_way() -> None:
    """One of 1 nH as mounted, 5 mm away: that and the line between the plates."""
    made = _made(nets=("GND", "+3V3"))
    found = _one(made, _with_capacitors(made, (20.0, 20.0)))
    expected = 1.0 + line_nh(5.0, 0.3, 1.0) - line_nh(1.27, 0.3, 1.0)
    assert found.level == ("warning" if noise_mv(expected, DEFAULT_CLASS) >= 33.0 else "note")
    assert found.added_nh == pytest.approx(expected, rel=1e-3)
    assert [(use.kind, use.at_mm, use.net) for use in found.bridges] == [
        ("capacitor", (20.0, 20.0), "C0")
    ]
    assert "the nearest capacitor that joins them, C0, is 5.0 mm away" in found.reason


def test_islands_of_one_layer_are_not_told_as_so_far_apart() -> None:
    """Down past the seam of a split layer, from over one island to under the other."""
    left, right = shapely.box(0, 0, 20.9, 40), shapely.box(21.1, 0, 60, 40)
    hole = shapely.Point(AT).buffer(0.5)
    kept = left.difference(hole)
    assert isinstance(kept, shapely.Polygon)
    made = board(
        Sheet(lines=(Line("CLK", ((5.0, 15.0), AT)),)),
        Sheet((("+5V", kept), ("GND", right))),
        Sheet(lines=(Line("CLK", (AT, (55.0, 15.0))),)),
        holes=[via(*AT)],
        heights_mm=(0.2, 0.2),
        outline=WHOLE,
    )
    seen = scene(made)
    islands = {island.net_name: island.id for island in seen.planes[2].islands}
    at = (20.0, 35.0)
    graph = with_capacitor(seen.graph, islands["+5V"], islands["GND"], at, at, 3.0, ref="C1")
    (found,) = change_findings(replace(seen, graph=graph), [Case(changes(made), 0.0)], {})
    assert "its return must change on L2 from +5V to GND; " in found.reason
    assert "apart" not in found.reason


def test_more_capacitors_never_make_it_worse() -> None:
    """Four round the hole share the current."""
    made = _made(nets=("GND", "+3V3"))
    ring = [(20.0, 20.0), (25.0, 15.0), (20.0, 10.0), (15.0, 15.0)]
    values = []
    for count in range(1, 5):
        found = _judged(made, _with_capacitors(made, *ring[:count])).findings
        values.append(found[0].added_nh or 0.0 if found else 0.0)
    assert values == sorted(values, reverse=True)
    assert values[-1] < 0.6 * values[0]


def test_capacitor_too_far_for_the_edge_is_no_way() -> None:
    """35 mm away at 1 ns: it answers too late (1 inch a ns)."""
    made = _made(nets=("GND", "+3V3"))
    near = _one(made, _with_capacitors(made, (55.0, 15.0)))
    assert near.bridges == ()


def test_nets_that_change_at_one_place_share_it() -> None:
    """Three holes in a row and a fourth elsewhere: two places."""
    at = [(20.0, 15.0), (20.0, 16.0), (20.0, 17.0), (40.0, 30.0)]
    found = _judged(_made([(5.0, 35.0)], at=at, names=("D0", "D1", "D2", "CLK"))).findings
    places = {f.net: f.gap for f in found}
    assert len(found) == 4
    assert places["D0"] == places["D1"] == places["D2"] != places["CLK"]
    (d0,) = (f for f in found if f.net == "D0")
    assert [share.net for share in d0.shares_gap_with] == ["D1", "D2"]


def test_pair_that_changes_together_carries_its_own_return() -> None:
    """Two legs side by side, the return via far off: only what they differ by is left."""
    made = _made([(20.0, 30.0)], at=[(20.0, 15.0), (20.0, 15.4)], names=("TX_P", "TX_N"))
    nets = [net.number for net in made.nets if net.name != "GND"]
    assert _judged(made).findings != ()
    assert _judged(made, replace(scene(made), pairs=find_pairs(made, nets))).findings == ()


def test_a_leg_with_its_way_near_is_not_told_as_whole() -> None:
    """One leg changes 10 mm from a return via, the other 1 mm from another one."""
    made = _made([(20.0, 25.0), (20.0, 36.0)], at=[AT, (20.0, 35.0)], names=("TX_P", "TX_N"))
    one, other = (next(n.number for n in made.nets if n.name == name) for name in ("TX_P", "TX_N"))
    pair = Pair((one, other), "rules", 0.4, 30.0, coupled=True)
    found = _one(made, replace(scene(made), pairs=(pair,)))
    assert found.net == "TX_P"
    assert "TX_N, keeps its plane here or finds a way near enough: all of it is" in found.reason


def test_long_run_over_another_plane_changes_at_both_ends() -> None:
    """12 mm over the next plane, joined 15 mm away only: a change in the layer, there and back."""
    with_window = WHOLE.difference(shapely.box(14, 10, 26, 20))
    assert isinstance(with_window, shapely.Polygon)
    made = board(
        Sheet(lines=(Line("CLK", ((2.0, 15.0), (50.0, 15.0))),)),
        Sheet((("GND", with_window),)),
        Sheet((("GND", WHOLE),)),
        holes=[via(20.0, 35.0)],
        heights_mm=(0.2, 0.5),
        outline=WHOLE,
    )
    found = _one(made)
    assert found.kind == "plane-change"
    assert found.gap_mm == pytest.approx(12.0)
    assert "for 12.0 mm and back" in found.reason


@given(st.floats(1.0, 25.0), st.floats(1.0, 25.0))
@settings(max_examples=15)
def test_nearer_return_via_is_never_worse(one: float, other: float) -> None:
    """Over the whole way from board to finding."""
    near, far = (
        sum(f.added_nh or 0.0 for f in _judged(_made(_far(mm))).findings)
        for mm in sorted((one, other))
    )
    assert near <= far + 1e-9


@given(st.sampled_from([30.0, 90.0, 137.5, 180.0]), st.floats(-50.0, 50.0), st.booleans())
@settings(max_examples=8)
def test_moved_turned_or_mirrored_board_has_the_same_changes(
    turn: float, move: float, mirror: bool
) -> None:
    """Where the board lies in its files does not matter."""

    def place(x: float, y: float) -> Point:
        c, s = cos(radians(turn)), sin(radians(turn))
        x = -x if mirror else x
        return c * x - s * y + move, s * x + c * y - move

    outline = shapely.Polygon([place(x, y) for x, y in WHOLE.exterior.coords])
    antipad = shapely.Point(place(*AT)).buffer(0.5, quad_segs=32)
    shape = outline.difference(antipad)
    assert isinstance(shape, shapely.Polygon)
    sheet = Sheet((("GND", shape),))
    ways = [((5.0, 15.0), AT), (AT, (55.0, 15.0))]
    top, bottom = (Sheet(lines=(Line("CLK", tuple(place(*p) for p in way)),)) for way in ways)
    made = board(
        top, sheet, sheet, bottom, outline=outline, heights_mm=(0.2, 1.0, 0.2),
        holes=[via(*place(*AT)), via(*place(20.0, 25.0))],
    )  # fmt: skip
    found, still = _one(made), _one(_made(_far(10.0)))
    assert found.added_nh == pytest.approx(still.added_nh, rel=1e-3)
    assert hypot(*(a - b for a, b in zip(found.at_mm, place(*AT), strict=True))) < 1e-3
