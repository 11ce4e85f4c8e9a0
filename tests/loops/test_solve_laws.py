"""Laws that the added inductance must obey, whatever the gap."""

from __future__ import annotations

from math import cos, hypot, pi, sin

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Point, Polygon, box, unary_union
from shapely.affinity import rotate, scale, translate

from splitcheck.loops.solve import Solution, TraceOver, ViaBridge, added

laws = settings(max_examples=12)


@st.composite
def gaps(draw: st.DrawFn) -> Polygon:
    """A slot, bent slot, void, or ring round an island, somewhere under the x axis."""
    long, wide = draw(st.floats(1, 12)), draw(st.floats(0.2, 1.5))
    kind = draw(st.sampled_from(["slot", "bent", "void", "ring"]))
    if kind == "slot":
        shape: Polygon = box(-wide / 2, -long / 2, wide / 2, long / 2)
    elif kind == "bent":
        shape = LineString([(0, -long / 2), (0, long / 4), (long / 3, long / 2)]).buffer(wide / 2)
    elif kind == "void":
        shape = Point(0, 0).buffer(long / 3)
    else:
        at = Point(0, long / 2)
        shape = Polygon(at.buffer(long / 3 + wide).exterior, [at.buffer(long / 3).exterior])
    turned = rotate(shape, draw(st.floats(-60, 60)), origin=(0, 0))
    return translate(turned, 0, draw(st.floats(-long / 4, long / 4)))


heights = st.floats(0.1, 1.0)


def across(y: float = 0.0, width: float = 0.3, half: float = 25.0) -> TraceOver:
    """A trace along x."""
    return TraceOver(LineString([(-half, y), (half, y)]), width)


def pair(solution: Solution) -> tuple[float, float]:
    """Value and error of the first trace."""
    value = solution.of(0)
    assert value is not None
    return value, float(solution.error_nh[0, 0])


def same(first: Solution, second: Solution) -> bool:
    """Whether two solutions agree within their errors."""
    (a, da), (b, db) = pair(first), pair(second)
    return abs(a - b) <= (da + db) / 2 + 1e-4


@laws
@given(gaps(), heights)
def test_matrix_is_symmetric_and_positive_definite(gap: Polygon, height: float) -> None:
    """Energy is positive whatever currents flow, and i hears j as j hears i."""
    matrix = added([gap], [across(-0.7), across(0.0), across(0.9)], height).added_nh
    assert matrix == pytest.approx(matrix.T)
    assert np.linalg.eigvalsh(matrix).min() > -1e-9
    assert np.diag(matrix).min() > 0


@laws
@given(gaps(), heights, st.floats(0.4, 3.0))
def test_all_lengths_times_k_give_k(gap: Polygon, height: float, factor: float) -> None:
    """Inductance is a length times mu0; within the error, as nH decide when to refine."""
    large = scale(gap, factor, factor, origin=(0, 0))
    wide = across(width=0.3 * factor, half=25 * factor)
    a, da = pair(added([gap], [across()], height))
    b, db = pair(added([large], [wide], height * factor))
    assert abs(b / factor - a) <= (da + db / factor) / 2


@laws
@given(gaps(), heights, st.floats(0, 360), st.floats(-80, 80), st.booleans())
def test_moved_turned_or_mirrored_it_stays_the_same(
    gap: Polygon, height: float, degrees: float, shift: float, mirror: bool
) -> None:
    """Only shapes matter, not where on the board they lie; within the error."""

    def put(shape: Polygon | LineString) -> Polygon | LineString:
        turned = rotate(scale(shape, 1, -1 if mirror else 1, origin=(0, 0)), degrees, origin=(0, 0))
        return translate(turned, shift, shift / 3)

    line, there = put(across().line), put(gap)
    assert isinstance(line, LineString)
    assert isinstance(there, Polygon)
    assert same(added([gap], [across()], height), added([there], [TraceOver(line, 0.3)], height))


@laws
@given(gaps(), heights, st.floats(0.05, 0.6))
def test_a_larger_gap_never_adds_less(gap: Polygon, height: float, more: float) -> None:
    """Copper taken away is a way for the current taken away; within the error."""
    holes = [Polygon(ring) for ring in gap.interiors]
    larger = Polygon(gap.buffer(more).exterior)
    for hole in holes:
        smaller = hole.buffer(-more)
        larger = Polygon(larger.exterior, [smaller.exterior] if smaller.area else [])
    (a, da), (b, db) = (
        pair(added([gap], [across()], height)),
        pair(added([larger], [across()], height)),
    )
    assert b >= a - max(da, db) / 2


@laws
@given(gaps(), heights, st.floats(0.1, 3.0))
def test_a_plane_beyond_never_adds(gap: Polygon, height: float, beyond: float) -> None:
    """It shields the gap, the more the nearer it lies."""
    bare = pair(added([gap], [across()], height))[0]
    near = pair(added([gap], [across()], height, beyond_mm=beyond))[0]
    far = pair(added([gap], [across()], height, beyond_mm=2 * beyond))[0]
    assert 0 < near <= far * 1.001
    assert far <= bare * 1.001


@laws
@given(gaps(), heights, st.floats(0.6, 6.0), st.floats(0, 2 * pi))
def test_a_bridge_never_adds(gap: Polygon, height: float, away: float, angle: float) -> None:
    """One more way for the current costs nothing."""
    x, y = away * cos(angle), away * sin(angle)
    vias = [ViaBridge(Point(12, 3), 0.3), ViaBridge(Point(-12, -3), 0.3)]
    more = [*vias, ViaBridge(Point(x, y), 0.3), ViaBridge(Point(-x, -y), 0.3)]
    none = pair(added([gap], [across()], height, beyond_mm=0.4))[0]
    two = pair(added([gap], [across()], height, beyond_mm=0.4, bridges=vias))[0]
    four = pair(added([gap], [across()], height, beyond_mm=0.4, bridges=more))[0]
    assert 0 < four <= two + 1e-9
    assert two <= none + 1e-9


@laws
@given(gaps(), heights)
def test_current_split_over_two_traces_superposes(gap: Polygon, height: float) -> None:
    """Half the current in each of two traces that run in one place acts as all of it in one."""
    matrix = added([gap], [across(), across()], height).added_nh
    assert np.full(2, 0.5) @ matrix @ np.full(2, 0.5) == pytest.approx(matrix[0, 0])


@pytest.mark.parametrize("height", [0.2, 1.0])
def test_a_gap_that_closes_adds_nothing(height: float) -> None:
    """Narrower and shorter slots add less and less, down to nothing."""
    values = [
        pair(added([box(-k / 10, -k, k / 10, k)], [across()], height))[0]
        for k in (2.0, 1.0, 0.3, 0.1, 0.03)
    ]
    assert values == sorted(values, reverse=True)
    assert values[-1] < 2e-4


def test_two_gaps_far_apart_add_up() -> None:
    """Each adds what it adds alone."""
    here, there = box(-15.2, -2, -14.8, 2), box(14.8, -2, 15.2, 2)
    both, one = added([here, there], [across(half=40)], 0.2), added([here], [across(half=40)], 0.2)
    assert pair(both)[0] == pytest.approx(2 * pair(one)[0], rel=0.01)


def test_gaps_that_overlap_or_touch_are_one() -> None:
    """However a slot is cut into polygons, it stays one slot."""
    whole = added([box(-0.2, -4, 0.2, 4)], [across()], 0.2)
    parts = [box(-0.2, -4, 0.2, 1), box(-0.2, 0.5, 0.2, 4), box(-0.2, -3, 0.0, 3)]
    assert pair(added(parts, [across()], 0.2))[0] == pytest.approx(pair(whole)[0], rel=1e-6)


@pytest.mark.parametrize(
    "gap",
    [
        box(-0.2, -4, 0.2, 4),
        box(-1, -1, 1, 1),
        unary_union([box(-0.3, -5, 0.3, 0.5), box(-0.3, -0.1, 6, 0.5)]),
    ],
    ids=["slot", "void", "bent"],
)
def test_halving_the_panels_converges(gap: Polygon) -> None:
    """The distance from the finest falls at least as the size of the panels: first order."""
    values = [pair(added([gap], [across()], 0.3, fineness=k))[0] for k in (1.0, 2.0, 6.0)]
    steps = [abs(value / values[-1] - 1) for value in values[:-1]]
    assert steps[0] < 0.02
    assert steps[1] < 0.01


def test_the_same_input_gives_the_same_bytes() -> None:
    """Nothing depends on order of hashes or on memory."""
    gap = Point(0, 0.2).buffer(1.0)
    first, second = (added([gap], [across(), across(0.5)], 0.2) for _ in range(2))
    assert first.added_nh.tobytes() == second.added_nh.tobytes()
    assert hypot(*first.added_nh[0]) > 0


@laws
@given(gaps(), heights, st.floats(1.2, 6.0))
def test_a_plane_above_never_adds(gap: Polygon, height: float, times: float) -> None:
    """It takes its share of the return; far away it takes none, and nothing changes."""
    bare = pair(added([gap], [across()], height))[0]
    near = pair(added([gap], [across()], height, above_mm=height * times))[0]
    far = pair(added([gap], [across()], height, above_mm=2 * height * times))[0]
    none = pair(added([gap], [across()], height, above_mm=1000 * height))[0]
    assert 0 < near <= far * 1.001
    assert far <= bare * 1.001
    # a twentieth of what the error bar cannot tell from nothing
    assert none == pytest.approx(bare, rel=0.01, abs=5e-5)


def test_gaps_known_to_be_disjoint_give_the_same() -> None:
    """Saying so saves time and changes nothing."""
    gaps_ = [box(-0.2, -4, 0.2, 4), Point(2, 1).buffer(0.4), Point(-3, -1).buffer(0.6)]
    board = box(-30, -30, 30, 30)
    slow, quick = (
        added(gaps_, [across()], 0.2, outside=board, disjoint=known) for known in (False, True)
    )
    assert pair(quick)[0] == pytest.approx(pair(slow)[0], rel=1e-3)


def test_a_gap_that_runs_round_the_board_is_its_outside() -> None:
    """Whether the outside comes as a gap or as an outline, it is one and the same."""
    board, notch = box(-30, -20, 30, 20), box(-0.3, -2, 0.3, 30)
    ring = box(-40, -30, 40, 30).difference(board.difference(notch))
    assert isinstance(ring, Polygon)
    by_outline = added([notch], [across()], 0.2, outside=board)
    by_ring = added([ring], [across()], 0.2, outside=board, disjoint=True)
    assert pair(by_ring)[0] == pytest.approx(pair(by_outline)[0], rel=0.01)


@pytest.mark.parametrize("apart", [1.0, 3.0, 8.0])
@pytest.mark.parametrize("beyond", [None, 0.3])
def test_a_hairpin_adds_what_its_legs_do_in_odd_mode(apart: float, beyond: float | None) -> None:
    """One trace there and back over a slot is two legs in series against one another."""
    slot = [box(-0.3, -6, 0.3, 7)]
    legs = [LineString([(-12, y), (12, y)]) for y in (-apart / 2, apart / 2)]
    (x1, y1), (x2, y2) = legs[0].coords
    hairpin = LineString([(x1, y1), (x2, y2), (x2, -y2), (x1, -y1)])
    matrix = added(slot, [TraceOver(leg, 0.3) for leg in legs], 0.2, beyond_mm=beyond).added_nh
    whole = added(slot, [TraceOver(hairpin, 0.3)], 0.2, beyond_mm=beyond).added_nh
    odd_nh = matrix[0, 0] + matrix[1, 1] - 2 * matrix[0, 1]
    assert whole[0, 0] == pytest.approx(odd_nh, rel=0.02)
