"""The return over capacitors: hand-made splits with and without them, laws and closed forms."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from math import dist

import networkx as nx
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.loops import windows
from splitcheck.loops.bridges import (
    IslandGraph,
    all_parts,
    bridges_between,
    joined_by_copper,
    over_parts,
    parts_between,
    with_capacitor,
    with_via,
)
from splitcheck.loops.estimate import via_pair_nh
from splitcheck.loops.routes import find_route
from splitcheck.loops.ways import MM_PER_NH, Route
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.scene import Scene
from tests.making.hand import Line, Sheet, board, crossings, islands_joined, mounted, scene, via

LEFT, RIGHT = shapely.box(0, 0, 29.8, 60), shapely.box(30.2, 0, 60, 60)
WHOLE = shapely.box(0, 0, 60, 60)
#: Small pads on the part's side, with a hole through each.
PAD = 0.4


def _square(at: Point) -> shapely.Polygon:
    return shapely.box(at[0] - PAD, at[1] - PAD, at[0] + PAD, at[1] + PAD)


def _split(
    *parts: tuple[str, str, Point, str, Point],
    ground: bool = True,
    apart_mm: float = 0.2,
    values: dict[str, str] | None = None,
) -> Board:
    """A trace on top over a supply plane that is split, over whole ground or nothing.

    Each part has pads on top with a hole in each, and a net at either.
    """
    pads = [
        (net, _square(at))
        for _, one, start, other, stop in parts
        for net, at in ((one, start), (other, stop))
    ]
    holes = [via(*at) for _, _, start, _, stop in parts for at in (start, stop)]
    sheets = [
        Sheet(tuple(pads), (Line("SIG", ((10, 30), (50, 30)), 0.3),)),
        Sheet((("+5V", _cleared(LEFT, pads, "+5V")), ("+3V3", _cleared(RIGHT, pads, "+3V3")))),
    ]
    if ground:
        sheets.append(Sheet((("GND", _cleared(WHOLE, pads, "GND")),)))
    made = board(*sheets, holes=holes, heights_mm=[0.2, apart_mm][: len(sheets) - 1])
    return mounted(
        made,
        *((ref, 1, start, stop, (values or {}).get(ref)) for ref, _, start, _, stop in parts),
    )


def _cleared(
    area: shapely.Polygon, pads: list[tuple[str, shapely.Polygon]], net: str
) -> shapely.Polygon:
    """Copper of a net with antipads round the holes of all others."""
    others = [pad.centroid.buffer(0.4, quad_segs=4) for name, pad in pads if name != net]
    cleared = shapely.difference(area, shapely.union_all(others))
    assert isinstance(cleared, shapely.Polygon)
    return cleared


def _one(made: Board, graph: IslandGraph | None = None) -> Finding:
    seen = scene(made)
    if graph is not None:
        seen = replace(seen, graph=graph)
    found = [f for f in judge(seen, *crossings(made)).findings if f.kind == "split-crossing"]
    assert len(found) == 1
    return found[0]


def _route(made: Board, graph: IslandGraph | None = None) -> Route:
    seen = scene(made)
    (crossing,) = [c for c in crossings(made)[0] if c.islands[0] != c.islands[1]]
    return find_route(crossing, seen.planes, seen.terrains, graph or seen.graph)


STRAIGHT = ("C1", "+5V", (29.2, 33.0), "+3V3", (30.8, 33.0))
FIVE = ("C2", "+5V", (27.0, 33.0), "GND", (25.4, 33.0))
THREE = ("C3", "+3V3", (33.0, 33.0), "GND", (34.6, 33.0))


def test_without_a_capacitor_there_is_no_way_back() -> None:
    """The negative twin of all that follows."""
    finding = _one(_split())
    assert (finding.method, finding.added_nh, finding.detour_mm) == ("none", None, None)
    assert finding.bridges == ()
    assert "no galvanic way back" in finding.reason


def test_capacitor_across_the_split_carries_the_return() -> None:
    """Solved, worth its mounted inductance and a little more for the 3 mm aside."""
    made = _split(STRAIGHT)
    (part,) = parts_between(islands_joined(made), "L2.1", "L2.2")
    finding = _one(made)
    assert finding.method == "solved"
    assert [(b.kind, b.at_mm, b.net) for b in finding.bridges] == [
        ("capacitor", (30.0, 33.0), "+5V to +3V3")
    ]
    assert part.mounted_nh < (finding.added_nh or 0.0) < part.mounted_nh + 1.5
    assert f"capacitor C1 (30.00, 33.00), {part.mounted_nh:.1f} nH as mounted" in finding.reason
    # to the pads 3 mm aside, across, and back
    taut = dist((29.8, 30), (29.2, 33)) + 1.6 + dist((30.8, 33), (30.2, 30)) - 0.4
    assert finding.detour_mm == pytest.approx(taut, abs=0.5)


def test_two_capacitors_to_ground_carry_the_return_over_it() -> None:
    """Down by one, over the plane below, up by the other: both in series, and the planes' field."""
    made = _split(FIVE, THREE)
    finding = _one(made)
    both = sum(part.mounted_nh for part in all_parts(islands_joined(made)))
    between = via_pair_nh(6.0, 0.3, 0.2)
    assert finding.method == "solved"
    assert [b.kind for b in finding.bridges] == ["capacitor", "capacitor"]
    assert both < (finding.added_nh or 0.0) < both + 3 * between
    assert "C2 (26.20, 33.00) and C3 (33.80, 33.00) over GND on L3" in finding.reason


@pytest.mark.parametrize("parts", [(FIVE,), (THREE,), (FIVE, FIVE)])
def test_capacitors_on_one_side_only_are_no_way(
    parts: tuple[tuple[str, str, Point, str, Point], ...],
) -> None:
    """Both islands must be reached."""
    assert _one(_split(*parts)).method == "none"


@pytest.mark.parametrize(
    ("ref", "value", "kind"),
    [
        ("C1", None, "capacitor"),
        ("R1", "0R", "copper"),
        ("R1", "10k", None),
        ("R1", None, None),
        ("U1", "0", None),
    ],
)
def test_only_capacitors_and_links_of_no_resistance_bridge(
    ref: str, value: str | None, kind: str | None
) -> None:
    """A resistor that is not told to be 0 ohm does not."""
    made = _split((ref, *STRAIGHT[1:]), values={} if value is None else {ref: value})
    bridges = _one(made).bridges
    assert [bridge.kind for bridge in bridges] == ([] if kind is None else [kind])


def test_pads_off_copper_or_on_signals_join_nothing() -> None:
    """A pad on no net, on the trace, and both pads on one island."""
    made = _split(("C1", "+5V", (27.0, 33.0), "+5V", (25.4, 33.0)))
    assert list(all_parts(islands_joined(made))) == []
    nowhere = mounted(_split(), ("C1", 1, (27.0, 33.0), (31.0, 33.0), None))
    assert list(all_parts(islands_joined(nowhere))) == []
    on_trace = mounted(_split(FIVE), ("C1", 1, (27.0, 33.0), (20.0, 30.0), None))
    assert list(all_parts(islands_joined(on_trace))) == []


def test_part_on_the_planes_own_layer_needs_no_hole() -> None:
    """Pads that are the islands themselves: the current enters at the pads."""
    made = mounted(
        board(
            Sheet((("A", LEFT), ("B", RIGHT))),
            Sheet((), (Line("SIG", ((10, 30), (50, 30)), 0.3),)),
        ),
        ("C1", 1, (29.3, 31.0), (30.7, 31.0), None),
    )
    (part,) = all_parts(islands_joined(made))
    assert (part.at_one, part.at_other) == ((29.3, 31.0), (30.7, 31.0))
    finding = _one(made)
    assert finding.method == "solved"
    assert part.mounted_nh < (finding.added_nh or 0.0) < part.mounted_nh + 1.0


def test_nearest_hole_is_taken_for_each_island() -> None:
    """Of two holes through a pad's copper, the nearer."""
    long_pad = shapely.box(20, 33, 27.4, 34)
    made = mounted(
        board(
            Sheet((("+5V", long_pad), ("GND", _square((29.0, 33.5))))),
            Sheet((("+5V", _cleared(LEFT, [("GND", _square((29.0, 33.5)))], "+5V")),)),
            Sheet((("GND", shapely.box(28.5, 0, 60, 60)),)),
            holes=[via(20.5, 33.5), via(25.0, 33.5), via(29.0, 33.5)],
        ),
        ("C1", 1, (27.0, 33.5), (29.0, 33.5), None),
    )
    (part,) = parts_between(islands_joined(made), "L2.1", "L3.1")
    assert (part.at_one, part.at_other) == ((25.0, 33.5), (29.0, 33.5))


def _with(graph: IslandGraph, *capacitors: tuple[str, Point, float]) -> IslandGraph:
    """More capacitors: from which supply, where, and how many nH."""
    for side, at, nh in capacitors:
        beside = (at[0] - 1.0, at[1])
        graph = with_capacitor(graph, side, "L3.1", at, beside, nh)
    return graph


@pytest.mark.parametrize("nh", [0.5, 1.5, 4.0])
def test_a_single_pair_adds_twice_its_inductance(nh: float) -> None:
    """All of the return goes through both: so much more than with mere holes."""
    made = _split()
    pair = [("L2.1", (26.0, 33.0)), ("L2.2", (34.0, 33.0))]
    graph = islands_joined(made)
    bare = _one(made, _with(graph, *((side, at, 0.0) for side, at in pair)))
    full = _one(made, _with(graph, *((side, at, nh) for side, at in pair)))
    assert full.method == bare.method == "solved"
    assert (full.added_nh or 0) - (bare.added_nh or 0) == pytest.approx(2 * nh, abs=0.02)


def test_capacitors_of_no_inductance_are_plated_holes() -> None:
    """The same board with holes instead: the same value."""
    made = _split()
    graph = islands_joined(made)
    places = [("L2.1", (26.0, 33.0)), ("L2.2", (34.0, 33.0))]
    holes = graph
    for side, at in places:
        holes = with_via(holes, [side, "L3.1"], at, 0.3)
    parts = _with(graph, *((side, at, 0.0) for side, at in places))
    one, other = _one(made, holes), _one(made, parts)
    assert one.method == other.method == "solved"
    assert other.added_nh == pytest.approx(one.added_nh, rel=0.02)


def test_two_pairs_alike_halve_what_one_adds() -> None:
    """Two in parallel on either side of the trace: the inductance of the parts halves."""
    made, nh = _split(), 2.0
    graph = islands_joined(made)
    four = [
        (side, (x, 30.0 + dy), nh) for side, x in (("L2.1", 26.0), ("L2.2", 34.0)) for dy in (-3, 3)
    ]
    without = [(side, at, 0.0) for side, at, _ in four]
    full, bare = _one(made, _with(graph, *four)), _one(made, _with(graph, *without))
    assert (full.added_nh or 0) - (bare.added_nh or 0) == pytest.approx(nh, abs=0.05)


def test_value_does_not_hang_on_the_window(monkeypatch: pytest.MonkeyPatch) -> None:
    """The copper beyond the window does not join islands that the gap parts."""
    made = _split()
    four = [
        (side, (x, 30.0 + dy), 1.5)
        for side, x in (("L2.1", 26.0), ("L2.2", 34.0))
        for dy in (-3, 3)
    ]
    graph = _with(islands_joined(made), *four)
    near = _one(made, graph)
    monkeypatch.setattr(windows, "BEYOND_MM", 15.0)
    far = _one(made, graph)
    assert near.method == far.method == "solved"
    assert near.added_nh == pytest.approx(far.added_nh, rel=0.03)


spots = st.tuples(
    st.sampled_from(["L2.1", "L2.2"]), st.integers(1, 14), st.integers(-13, 13), st.floats(0.5, 4.0)
)


@settings(max_examples=15)
@given(st.lists(spots, min_size=1, max_size=6, unique_by=lambda spot: spot[:3]))
def test_a_bridge_never_adds(places: list[tuple[str, int, int, float]]) -> None:
    """Capacitors one by one, wherever they are: the added inductance only falls.

    Within what the solves themselves say they may be off by.
    """
    made = _split()
    graph = _with(islands_joined(made), ("L2.1", (25.0, 37.0), 3.0), ("L2.2", (35.0, 37.0), 3.0))
    before = _one(made, graph)
    for side, aside, along, nh in places:
        x = 29.0 - aside if side == "L2.1" else 31.0 + aside
        graph = _with(graph, (side, (x, 30.0 + along), nh))
        after = _one(made, graph)
        assert after.added_nh is not None
        assert before.added_nh is not None
        room = (after.error_nh or 0.0) + (before.error_nh or 0.0)
        assert after.added_nh <= before.added_nh + room
        before = after


@settings(max_examples=25)
@given(st.lists(spots, max_size=6, unique_by=lambda spot: spot[:3]))
def test_more_capacitors_never_make_the_best_way_worse(
    places: list[tuple[str, int, int, float]],
) -> None:
    """By length and what their inductance is worth in length."""
    made = _split()
    graph = islands_joined(made)
    best = float("inf")
    for side, aside, along, nh in places:
        x = 29.0 - aside if side == "L2.1" else 31.0 + aside
        graph = _with(graph, (side, (x, 30.0 + along), nh))
        route = _route(made, graph)
        cost = float("inf") if route.best is None else route.best.cost_mm
        assert cost <= best + 1e-9
        best = cost
        if route.best is not None:
            way = route.best
            walked = sum(dist(a, b) for a, b in pairwise(way.path))
            assert way.length_mm == pytest.approx(walked, abs=1e-6)
            assert way.cost_mm == pytest.approx(walked + MM_PER_NH * way.parts_nh)


def test_plated_holes_are_preferred_to_capacitors_beside_them() -> None:
    """Holes right beside either capacitor: the way goes by the holes."""
    made = _split()
    pair = (("L2.1", (26.0, 33.0), 1.5), ("L2.2", (34.0, 33.0), 1.5))
    graph = _with(islands_joined(made), *pair)
    for side, at, _ in pair:
        graph = with_via(graph, [side, "L3.1"], (at[0], at[1] + 0.2))
    best = _route(made, graph).best
    assert best is not None
    assert (best.bridges, best.capacitors) == (((26.0, 33.2), (34.0, 33.2)), ())


def test_a_hole_on_one_side_and_a_capacitor_on_the_other() -> None:
    """The way goes by both, and the solve takes both."""
    made = _split()
    graph = with_via(islands_joined(made), ["L2.1", "L3.1"], (26.0, 33.0))
    graph = _with(graph, ("L2.2", (34.0, 33.0), 1.5))
    finding = _one(made, graph)
    assert [bridge.kind for bridge in finding.bridges] == ["via", "capacitor"]
    assert finding.method == "solved"
    assert 1.5 < (finding.added_nh or 0.0) < 3.0


def test_chain_over_two_other_planes_is_estimated() -> None:
    """Supply, capacitor, ground of one layer, hole, ground of another, capacitor, supply."""
    made = board(
        Sheet((), (Line("SIG", ((10, 30), (50, 30)), 0.3),)),
        Sheet((("+5V", LEFT), ("+3V3", RIGHT))),
        Sheet((("GND", LEFT),)),
        Sheet((("AGND", RIGHT),)),
    )
    graph = with_capacitor(islands_joined(made), "L2.1", "L3.1", (27, 33), (26, 33), 1.5)
    graph = with_capacitor(graph, "L2.2", "L4.1", (33, 33), (34, 33), 1.5)
    assert _one(made, graph).method == "none"
    graph = with_capacitor(graph, "L3.1", "L4.1", (20, 33), (40, 33), 2.0)
    finding = _one(made, graph)
    assert finding.method == "estimated"
    assert len(finding.bridges) == 3
    assert (finding.added_nh or 0.0) > 5.0


def test_parts_are_seen_from_where_one_stands() -> None:
    """The same part from either island, and on neither a plated hole."""
    graph = islands_joined(_split(STRAIGHT))
    (here,) = parts_between(graph, "L2.1", "L2.2")
    (there,) = parts_between(graph, "L2.2", "L2.1")
    assert here.turned() == there
    assert (here.at_one, here.at_other) == ((29.2, 33.0), (30.8, 33.0))
    assert not joined_by_copper(graph, "L2.1", "L2.2")
    assert bridges_between(graph, "L2.1", "L2.2").shape == (0, 2)
    assert parts_between(graph, "L2.1", "L3.1") == ()


def test_copies_leave_the_graph_as_it_is() -> None:
    """One more via or capacitor is in the copy alone, and both stay in further copies."""
    graph = islands_joined(_split(FIVE, THREE))
    parts, holes = list(all_parts(graph)), nx.to_dict_of_lists(graph)
    more = with_capacitor(graph, "L2.2", "L2.1", (31, 40), (29, 40), 1.0)
    both = with_via(more, ["L2.1", "L3.1"], (20.0, 20.0), 0.4)
    assert list(all_parts(graph)) == parts
    assert nx.to_dict_of_lists(graph) == holes
    assert len(list(all_parts(both))) == len(parts) + 1
    (new,) = parts_between(both, "L2.1", "L2.2")
    assert (new.at_one, new.at_other) == ((29, 40), (31, 40))
    assert bridges_between(both, "L3.1", "L2.1").tolist() == [[20.0, 20.0]]
    assert both.edges["L2.1", "L3.1"]["wide_mm"].tolist() == [0.4]
    assert joined_by_copper(both, "L2.1", "L3.1")
    assert not joined_by_copper(more, "L2.1", "L3.1")
    assert set(over_parts(both)) == {"L2.1", "L2.2", "L3.1"}


def test_copies_refuse_what_is_not_there() -> None:
    """An unknown island, and one with itself."""
    graph = islands_joined(_split())
    with pytest.raises(SplitcheckError, match=r"L9\.9"):
        with_via(graph, ["L2.1", "L9.9"], (1, 1))
    with pytest.raises(SplitcheckError, match=r"L9\.9"):
        with_capacitor(graph, "L2.1", "L9.9", (1, 1), (2, 2), 1.0)
    with pytest.raises(SplitcheckError, match="one island, not two"):
        with_capacitor(graph, "L2.1", "L2.1", (1, 1), (2, 2), 1.0)


def test_scene_without_parts_finds_what_it_found_before() -> None:
    """A graph that knows of no parts at all, as others may build it, is one without capacitors."""
    seen: Scene = scene(_split())
    bare: IslandGraph = nx.Graph(seen.graph)
    bare.graph.clear()
    assert _route(_split(), bare).best is None
