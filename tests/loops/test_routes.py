"""Ways round for the return current, on planes whose shortest way is known by hand."""

from __future__ import annotations

from math import dist, hypot, inf

import pytest
import shapely
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st
from shapely import LineString, Polygon

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.loops.routes import find_route
from splitcheck.loops.taut import CLEAR_MM, shortest
from splitcheck.loops.terrain import Terrain
from splitcheck.loops.ways import Route
from tests.making.hand import Line, Sheet, board, crossings, plane, scene, via

WHOLE = shapely.box(0, 0, 40, 30)
#: Ways keep clear of gaps, so they are a little longer than the string itself, mm.
SLACK_MM = 8 * CLEAR_MM[0]


def _cut(*holes: Polygon) -> Sheet:
    left = WHOLE.difference(shapely.union_all(holes))
    return Sheet(tuple(("GND", piece) for piece in shapely.get_parts(left)))


def _terrain(*holes: Polygon) -> Terrain:
    made = board(Sheet(lines=(Line("CLK", ((1, 1), (2, 1))),)), _cut(*holes), outline=WHOLE)
    return Terrain(plane(made, 2))


def _length(terrain: Terrain, one: Point, other: Point) -> float:
    found = shortest(terrain, one, other)
    return inf if found is None else found[0]


def _routes(made: Board) -> list[Route]:
    found = scene(made)
    return [
        find_route(crossing, found.planes, found.terrains, found.graph)
        for crossing in crossings(made)[0]
    ]


def _over(sheet: Sheet, y: float = 15.0) -> Board:
    return board(Sheet(lines=(Line("CLK", ((2, y), (38, y))),)), sheet, outline=WHOLE)


# --- the taut way ---------------------------------------------------------------------------


def test_nothing_in_the_way_is_straight() -> None:
    """The way is its two ends."""
    found = shortest(_terrain(shapely.box(1, 20, 39, 21)), (5, 5), (35, 10))
    assert found is not None
    assert found[0] == pytest.approx(dist((5, 5), (35, 10)))
    assert found[1] == ((5, 5), (35, 10))


def test_round_a_rectangle() -> None:
    """3-4-5: from the middle of one side out to a corner, along, and back in: 5 + 2 + 5."""
    found = shortest(_terrain(shapely.box(19, 12, 21, 18)), (15, 15), (25, 15))
    assert found is not None
    assert found[0] == pytest.approx(5 + 2 + 5, abs=SLACK_MM)
    assert len(found[1]) >= 4
    assert abs(found[1][1][1] - 15) == pytest.approx(3, abs=0.05)


def test_round_the_nearer_end() -> None:
    """Start and goal lie nearer to the upper end of the slot."""
    found = shortest(_terrain(shapely.box(19, 8, 21, 18)), (15, 15), (25, 15))
    assert found is not None
    assert found[0] == pytest.approx(12, abs=SLACK_MM)
    assert all(y >= 15 - 1e-9 for _, y in found[1])


def test_round_a_disc_is_two_tangents_and_an_arc() -> None:
    """Radius 3 at distance 5 on either side: 2 * 4 + 3 (pi - 2 acos(3/5))."""
    disc = shapely.Point(20, 15).buffer(3, quad_segs=32)
    arc = 3 * (shapely.Point(0, 0).buffer(1).length / 2 - 2 * 0.9272952180016122)
    assert _length(_terrain(disc), (15, 15), (25, 15)) == pytest.approx(8 + arc, rel=0.01)


def test_between_two_gaps() -> None:
    """A web of 1 mm between two slots in line is the way through: straight over it."""
    terrain = _terrain(shapely.box(19, 2, 21, 14.5), shapely.box(19, 15.5, 21, 28))
    assert _length(terrain, (15, 15), (25, 15)) == pytest.approx(10)


def test_out_of_a_spiral() -> None:
    """A gap like a U, open to the left: out of it round the tip of one arm."""
    u = shapely.union_all(
        [shapely.box(10, 10, 30, 11), shapely.box(10, 19, 30, 20), shapely.box(29, 10, 30, 20)]
    )
    assert isinstance(u, Polygon)
    way = _length(_terrain(u), (25, 15), (35, 15))
    assert way == pytest.approx(hypot(15, 4) + 1 + hypot(20, 0) + hypot(5, 5), abs=SLACK_MM)


def test_point_within_a_gap_has_no_way() -> None:
    """Not on copper: none, rather than one through the gap."""
    assert shortest(_terrain(shapely.box(19, 12, 21, 18)), (20, 15), (25, 15)) is None


def test_wall_forces_the_way_to_the_other_side() -> None:
    """A wall up from the middle of the slot: the way goes round its lower end."""
    terrain = _terrain(shapely.box(19, 8, 21, 18))
    wall = LineString([(20, 13), (20, 2000)])
    found = shortest(terrain, (15, 15), (25, 15), wall, (1,))
    assert found is not None
    assert found[0] == pytest.approx(2 * hypot(4, 7) + 2, abs=SLACK_MM)
    assert not LineString(found[1]).intersects(wall)


def test_way_longer_than_asked_for_is_none() -> None:
    """The way round is 12 mm."""
    terrain = _terrain(shapely.box(19, 12, 21, 18))
    assert shortest(terrain, (15, 15), (25, 15), longest_mm=11) is None
    assert shortest(terrain, (15, 15), (25, 15), longest_mm=13) is not None


# --- laws -----------------------------------------------------------------------------------

boxes = st.lists(
    st.tuples(st.integers(1, 17), st.integers(1, 12), st.integers(1, 8), st.integers(1, 8)),
    max_size=6,
).map(lambda some: [shapely.box(2 * x, 2 * y, 2 * x + w, 2 * y + h) for x, y, w, h in some])
spots = st.tuples(st.integers(1, 39), st.integers(1, 29)).map(lambda p: (p[0] + 0.03, p[1] + 0.03))
some = settings(max_examples=40)


def _on_one_copper(holes: list[Polygon], *points: Point) -> None:
    """Holes that reach the rim cut the plane up: take points on one piece, off all rims."""
    left = WHOLE.difference(shapely.union_all(holes).buffer(2 * CLEAR_MM[0]))
    pieces = shapely.get_parts(left)
    assume(any(all(piece.contains(shapely.Point(p)) for p in points) for piece in pieces))


@given(boxes, spots, spots)
@example([shapely.box(18, 2, 22, 28)], (10.0, 15.0), (30.0, 15.0))
@some
def test_way_is_the_same_forth_and_back_and_never_shorter_than_straight(
    holes: list[Polygon], one: Point, other: Point
) -> None:
    """A distance, and one that stays on copper."""
    _on_one_copper(holes, one, other)
    terrain = _terrain(*holes)
    forth, back = shortest(terrain, one, other), shortest(terrain, other, one)
    assert forth is not None
    assert back is not None
    assert forth[0] == pytest.approx(back[0], abs=1e-6)
    assert forth[0] >= dist(one, other) - 1e-9
    assert forth[0] == pytest.approx(LineString(forth[1]).length)
    assert shapely.union_all(holes).intersection(LineString(forth[1])).is_empty


@given(boxes, spots, spots, spots)
@some
def test_way_by_another_place_is_never_shorter(
    holes: list[Polygon], one: Point, middle: Point, other: Point
) -> None:
    """The triangle inequality, as far as keeping clear of gaps allows."""
    _on_one_copper(holes, one, middle, other)
    terrain = _terrain(*holes)
    by_way = _length(terrain, one, middle) + _length(terrain, middle, other)
    assert _length(terrain, one, other) <= by_way + SLACK_MM


@given(boxes, boxes, spots, spots)
@some
def test_one_more_gap_never_shortens_the_way(
    holes: list[Polygon], more: list[Polygon], one: Point, other: Point
) -> None:
    """Less copper, no shorter way; as far as keeping clear of gaps allows."""
    _on_one_copper([*holes, *more], one, other)
    before = _length(_terrain(*holes), one, other)
    assert _length(_terrain(*holes, *more), one, other) >= before - SLACK_MM


# --- crossings ------------------------------------------------------------------------------


def test_slot_crossed_off_centre_has_a_short_and_a_long_way() -> None:
    """Left of the trace, as it runs to the right, is up: 2 mm there, 6 mm below."""
    (route,) = _routes(_over(_cut(shapely.box(19.5, 9, 20.5, 17))))
    assert route.joined
    assert route.left is not None
    assert route.right is not None
    straight = 1 + 2 * 0.005
    assert route.straight_mm == pytest.approx(straight, abs=1e-9)
    assert route.left.length_mm == pytest.approx(2 * 2 + 1, abs=SLACK_MM)
    assert route.right.length_mm == pytest.approx(2 * 6 + 1, abs=SLACK_MM)
    assert route.best == route.left
    assert route.detour_mm == pytest.approx(4, abs=SLACK_MM)
    assert route.reach_mm(route.right) == pytest.approx(6, abs=SLACK_MM)
    assert route.left.bridges == ()


def test_slot_open_to_the_edge_leaves_one_way() -> None:
    """Cut from the lower edge up to 5 mm above the trace."""
    (route,) = _routes(_over(_cut(shapely.box(19.5, -1, 20.5, 20))))
    assert route.right is None
    assert route.left is not None
    assert route.detour_mm == pytest.approx(10, abs=SLACK_MM)
    assert route.reach_mm(None) == inf


def _halves(*holes: tuple[float, float], third: Polygon = WHOLE) -> Board:
    """Ground cut in two at x = 19.5 to 20.5 on layer 2, more ground on layer 3."""
    return board(
        Sheet(lines=(Line("CLK", ((2, 15), (38, 15))),)),
        _cut(shapely.box(19.5, -1, 20.5, 31)),
        Sheet((("GND", third),)),
        holes=[via(*at) for at in holes],
        outline=WHOLE,
    )


def test_islands_joined_by_nothing() -> None:
    """No way, and it is said that there is none."""
    for made in (_halves(), _halves((15, 10)), _over(_cut(shapely.box(19.5, -1, 20.5, 31)))):
        (route,) = _routes(made)
        assert not route.joined
        assert route.best is None
        assert route.detour_mm is None


def test_pair_of_bridges_over_the_next_plane() -> None:
    """Out 3-4-5 to a hole, straight over to the other hole, and back: 5 + d + 5."""
    (route,) = _routes(_halves((16.495, 19), (23.505, 19)))
    assert route.joined
    assert route.left is not None
    assert route.right is None
    assert route.left.length_mm == pytest.approx(5 + 7.01 + 5, abs=1e-6)
    assert route.left.bridges == ((16.495, 19.0), (23.505, 19.0))
    assert (route.left.bridge_net, route.left.bridge_layer) == ("GND", 3)


def test_nearest_of_many_bridges_on_either_side() -> None:
    """The nearer pair above, the nearer below."""
    pairs = [(16.495, y) for y in (19, 22, 26, 11, 5)] + [(23.505, y) for y in (19, 22, 26, 11, 5)]
    (route,) = _routes(_halves(*pairs))
    assert route.left is not None
    assert route.right is not None
    assert [y for _, y in route.left.bridges] == [19, 19]
    assert [y for _, y in route.right.bridges] == [11, 11]


def test_bridge_beats_a_longer_way_round_the_slot() -> None:
    """A closed slot of 20 mm with a stitched pair 2 mm beside the trace."""
    made = board(
        Sheet(lines=(Line("CLK", ((2, 15), (38, 15))),)),
        _cut(shapely.box(19.5, 5, 20.5, 25)),
        Sheet((("GND", WHOLE),)),
        holes=[via(19, 17), via(21, 17)],
        outline=WHOLE,
    )
    (route,) = _routes(made)
    assert route.left is not None
    assert route.left.bridges == ((19.0, 17.0), (21.0, 17.0))
    assert route.right is not None
    assert route.right.bridges == ()


def test_borrowed_plane_with_a_cut_of_its_own_is_no_bridge_there() -> None:
    """Layer 3 is cut where the pair would cross: the islands are not joined."""
    left, right = shapely.box(0, 0, 19, 30), shapely.box(21, 0, 40, 30)
    made = board(
        Sheet(lines=(Line("CLK", ((2, 15), (38, 15))),)),
        _cut(shapely.box(19.5, -1, 20.5, 31)),
        Sheet((("GND", left), ("GND", right))),
        holes=[via(16, 19), via(24, 19)],
        outline=WHOLE,
    )
    (route,) = _routes(made)
    assert not route.joined


def test_leg_on_the_borrowed_plane_goes_round_its_gaps() -> None:
    """A slot in layer 3 stands between the nearest pair: a farther pair is taken."""
    third = WHOLE.difference(shapely.box(19, 17, 21, 24))
    assert isinstance(third, Polygon)
    near, far = [(17.0, 19.0), (23.0, 19.0)], [(17.0, 8.0), (23.0, 8.0)]
    (route,) = _routes(_halves(*near, *far, third=third))
    assert route.best is not None
    assert route.best.bridges == ((17.0, 8.0), (23.0, 8.0))


def test_chain_over_two_layers() -> None:
    """From half to half over three islands: down to layer 3, on to layer 4, and back up."""
    made = board(
        Sheet(lines=(Line("CLK", ((2, 15), (38, 15))),)),
        _cut(shapely.box(19.5, -1, 20.5, 31)),
        _cut(shapely.box(24.5, -1, 25.5, 31)),
        _cut(),
        holes=[via(10, 15, (2, 3)), via(10, 18, (3, 4)), via(30, 15, (2, 4))],
        outline=WHOLE,
    )
    routes = [route for route in _routes(made) if not route.detour_mm or route.detour_mm > 0]
    (route,) = routes
    assert route.joined
    assert route.best is not None
    assert len(route.best.bridges) >= 2
    assert route.best.path[0] == pytest.approx((19.495, 15), abs=1e-6)
    assert route.best.path[-1] == pytest.approx((20.505, 15), abs=1e-6)
    steps = zip(route.best.path, route.best.path[1:], strict=False)
    assert route.best.length_mm == pytest.approx(sum(dist(a, b) for a, b in steps))


@given(st.floats(6, 24), st.floats(2, 9), st.floats(0.2, 2.0))
@some
def test_way_round_a_straight_slot_is_twice_the_reach_and_the_width(
    y: float, half: float, width: float
) -> None:
    """Wherever the trace crosses: both ways by hand."""
    assume(y + half < 29)
    assume(y - half / 3 > 1)
    slot = shapely.box(20 - width / 2, y - half / 3, 20 + width / 2, y + half)
    (route,) = _routes(_over(_cut(slot), y))
    assert route.left is not None
    assert route.right is not None
    for way, reach in ((route.left, half), (route.right, half / 3)):
        assert way.length_mm == pytest.approx(2 * reach + width, abs=SLACK_MM)


@given(st.lists(st.tuples(st.floats(2, 38), st.floats(2, 28)), min_size=1, max_size=8))
@some
def test_pair_of_bridges_is_the_shortest_of_all_pairs(places: list[Point]) -> None:
    """Against trying every pair, on either side of the trace."""
    assume(all(abs(x - 20) > 1 and abs(y - 15) > 0.5 for x, y in places))
    assume(any(x < 20 for x, _ in places))
    assume(any(x > 20 for x, _ in places))
    (route,) = _routes(_halves(*places))
    start, goal = (19.495, 15.0), (20.505, 15.0)
    pairs = [
        dist(start, a) + dist(a, b) + dist(b, goal)
        for a in places if a[0] < 20 for b in places if b[0] > 20
    ]  # fmt: skip
    assert route.best is not None
    assert route.best.length_mm == pytest.approx(min(pairs), abs=1e-6)
