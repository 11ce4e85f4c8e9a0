"""Windows of solves: laws of their shape, and that no value hangs on one."""

from __future__ import annotations

from dataclasses import replace
from math import hypot
from pathlib import Path
from typing import Any

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from shapely import LineString, Polygon, box
from shapely.affinity import rotate

from fixtures.making.plan import BoardPlan, Hole, Placing
from fixtures.making.write import write_board
from fixtures.tide_logger import tide_logger
from splitcheck import road
from splitcheck.loops import fields, windows
from splitcheck.loops.windows import (
    BEYOND_MM,
    Windows,
    along_rim,
    clipped,
    cut_ends,
    span_mm,
    windows_of,
)
from splitcheck.planes.islands import Gap
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene

spots = st.tuples(st.floats(-20, 20), st.floats(-20, 20))
#: Crossings and ways round lie on their gap or near its ends.
near_gap = st.tuples(st.floats(-20, 20), st.floats(-3, 3))


def _gap(shape: Polygon, *, opened: bool = False) -> Gap:
    return Gap("L2.g1", 2, shape, opened)


@given(st.lists(near_gap, min_size=2, max_size=6), st.floats(0, 360), st.booleans(), st.booleans())
def test_window_turns_with_the_board(
    points: list[tuple[float, float]], turned: float, one_sided: bool, shut: bool
) -> None:
    """The window of what was turned is the turned window, but for the corners of round ends."""
    gap = box(-45, -0.3, 45, 0.3)
    plain = windows_of(points, _gap(gap), 0.2, one_sided=one_sided, shut=shut)
    moved = [(p.x, p.y) for at in points for p in [rotate(shapely.Point(at), turned, (0, 0))]]
    far = windows_of(moved, _gap(rotate(gap, turned, (0, 0))), 0.2, one_sided=one_sided, shut=shut)
    for one, other in zip(plain, far, strict=True):
        apart = rotate(one, turned, (0, 0)).symmetric_difference(other)
        assert apart.area < 0.05 * other.area


@given(st.lists(spots, min_size=2, max_size=6), st.booleans(), st.booleans())
def test_window_has_room_round_its_points_and_holds_the_inner_one(
    points: list[tuple[float, float]], one_sided: bool, shut: bool
) -> None:
    """Convex, with room on all sides; a small gap is in it whole."""
    slot = box(-12, -0.3, 12, 0.3)
    for gap in (_gap(slot), _gap(slot, opened=True)):
        window, half, beside, far = windows_of(points, gap, 0.2, one_sided=one_sided, shut=shut)
        hull = shapely.MultiPoint(points).convex_hull
        assert window.buffer(1e-6).contains(half)
        assert window.buffer(1e-6).contains(beside)
        assert far.buffer(1e-6).contains(window)
        assert window.contains(hull.buffer(0.9 * BEYOND_MM))
        assert window.convex_hull.area == pytest.approx(window.area)
    closed = windows_of(points, _gap(slot), 0.2, one_sided=one_sided, shut=shut)
    assert closed.outer.contains(slot)


def test_ways_along_a_rim_go_round_either_end() -> None:
    """A slot of 10 by 1 mm entered 2 mm from one end: 5 mm round the one, 17 mm round the other."""
    ways = list(along_rim(box(0, 0, 1, 10), (0.0, 2.0), (1.0, 2.0)))
    assert sorted(way.length for way in ways) == pytest.approx([5.0, 17.0])
    assert all({way.coords[0], way.coords[-1]} == {(0.0, 2.0), (1.0, 2.0)} for way in ways)


def test_there_is_no_way_from_one_rim_to_another() -> None:
    """A moat parts its inside from the outside."""
    moat = Polygon(box(0, 0, 10, 10).exterior, [box(1, 1, 9, 9).exterior])
    assert list(along_rim(moat, (0.0, 5.0), (1.0, 5.0))) == []


@given(st.floats(0, 180))
def test_a_cut_is_found_on_a_rim_at_any_angle(turned: float) -> None:
    """A slot of 1 mm that leaves the window on one side: the middle of the cut."""
    window = rotate(box(-5, -5, 5, 5), turned, (0, 0))
    slot = rotate(box(0, -0.5, 20, 0.5), turned, (0, 0))
    (piece,) = [clipped(slot, window)]
    assert isinstance(piece, Polygon)
    assert piece.area == pytest.approx(5.0)
    (end,) = cut_ends([piece], window)
    assert hypot(end.x, end.y) == pytest.approx(5.0, abs=0.01)
    assert cut_ends([rotate(box(0, -0.5, 3, 0.5), turned, (0, 0))], window) == []


def test_span_is_the_same_however_it_is_turned() -> None:
    """A line of 7 mm."""
    line = LineString([(0, 0), (7, 0)])
    assert [span_mm(rotate(line, by)) for by in (0, 30, 45)] == pytest.approx([7.0] * 3)


def _solved(folder: Path) -> dict[str, Finding]:
    """Solved findings of a board by their nets: the demo board has one a net."""
    found = road.look(folder, road.Options(jobs=1)).report.findings
    return {finding.net: finding for finding in found if finding.method == "solved"}


def _of_plan(folder: Path, plan: BoardPlan, **how: Any) -> dict[str, Finding]:
    write_board(plan, folder, **how)
    return _solved(folder)


@pytest.fixture(scope="module")
def demo() -> dict[str, Finding]:
    """The demo board with its faults."""
    return _solved(road.fixtures_folder() / "demo")


def _assert_within_errors(found: dict[str, Finding], expected: dict[str, Finding]) -> None:
    """Each value within the error bar of its twin, and the twin within its own."""
    assert found.keys() == expected.keys()
    assert len(found) > 8
    for net, finding in expected.items():
        value, error, twin = finding.added_nh, finding.error_nh, found[net]
        assert value is not None
        assert twin.added_nh is not None
        assert abs(value - twin.added_nh) <= min(error or 0.0, twin.error_nh or 0.0), net


@pytest.mark.parametrize("turned", [17.0, 30.0, 45.0])
def test_a_board_that_was_turned_has_the_same_values(
    demo: dict[str, Finding], turned: float, tmp_path: Path
) -> None:
    """Windows turn with the board; meshes do not quite, and the error bars hold that."""
    placing = Placing((5.0, -5.0), turned)
    _assert_within_errors(_of_plan(tmp_path, tide_logger(faulty=True), placing=placing), demo)


def _twice_as_large(*args: Any, **how: Any) -> Windows:
    """Windows that cut gaps off further out; what counts as beside a crossing stays the same."""
    found = windows_of(*args, **how)
    more = span_mm(found.outer) / 2
    return found._replace(outer=found.outer.buffer(more), far=found.far.buffer(more))


def test_a_larger_window_moves_no_value(
    demo: dict[str, Finding], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Each window twice as large."""
    monkeypatch.setattr(windows, "windows_of", _twice_as_large)
    _assert_within_errors(_solved(road.fixtures_folder() / "demo"), demo)


def _beside_long_gap(height_mm: float, aside_mm: float, long_mm: float) -> Finding:
    """A trace over a slot whose end comes near a long gap that runs along the trace."""
    slot = box(59.6, 34, 60.4, 34.7 + aside_mm)
    second = box(65 - long_mm / 2, 35 + aside_mm, 65 + long_mm / 2, 35.8 + aside_mm)
    ground = box(0, 0, 140, 70).difference(shapely.union(slot, second))
    assert isinstance(ground, Polygon)
    made = board(
        Sheet(lines=(Line("CLK", ((20.0, 35.0), (120.0, 35.0)), 0.3),)),
        Sheet(areas=(("GND", ground),)),
        heights_mm=[height_mm],
    )
    (found,) = judge(scene(made, 0.001), *crossings(made)).findings
    assert found.method == "solved"
    return found


@pytest.mark.parametrize("height_mm", [0.3, 1.2])
@pytest.mark.parametrize("aside_mm", [1.0, 2.0, 3.0])
@pytest.mark.parametrize("long_mm", [50.0, 100.0])
def test_a_neighbour_that_a_window_cuts_off_is_in_the_error(
    height_mm: float, aside_mm: float, long_mm: float, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The second gap is taken whole, or what is left out of it is in the error bar.

    A neighbour cut off at the window of the crossing lets no flux out: it added up to 0.27 nH, five
    times the value, as the window grew.
    """
    plain = _beside_long_gap(height_mm, aside_mm, long_mm)
    monkeypatch.setattr(windows, "windows_of", _twice_as_large)
    larger = _beside_long_gap(height_mm, aside_mm, long_mm)
    assert plain.added_nh is not None
    assert plain.error_nh is not None
    assert larger.added_nh == pytest.approx(plain.added_nh, abs=plain.error_nh)
    assert plain.error_nh < 0.5 * plain.added_nh


def _near_slot(hole: Hole) -> bool:
    return 16 < hole.at[0] < 24 and 41 < hole.at[1] < 46 and hole.net == "GND"


def test_vias_that_the_solve_does_not_know_move_no_value(
    demo: dict[str, Finding], tmp_path: Path
) -> None:
    """SDA over its slot with ground vias to the bottom beside it, with none, and with two more."""
    plan = tide_logger(faulty=True)
    stitches = [hole for hole in plan.holes if _near_slot(hole)]
    assert len(stitches) == 4
    none = tuple(hole for hole in plan.holes if not _near_slot(hole))
    more = tuple(stitches[0]._replace(at=(19.0, y)) for y in (41.5, 44.5))
    bare = _of_plan(tmp_path / "bare", replace(plan, holes=none))["SDA"]
    full = _of_plan(tmp_path / "full", replace(plan, holes=(*plan.holes, *more)))["SDA"]
    assert full.detour_mm is not None
    assert bare.detour_mm is not None
    assert full.detour_mm < bare.detour_mm
    for other in (bare, full):
        assert other.added_nh == pytest.approx(demo["SDA"].added_nh, abs=demo["SDA"].error_nh)


def test_a_closed_gap_cut_off_nearby_is_bracketed(monkeypatch: pytest.MonkeyPatch) -> None:
    """A slot of 136 mm crossed near its end, by a window that holds a part of it only.

    With flux that finds room without end beyond the window it reads 6 % high, with none 6 % low.
    """
    whole = box(0, 0, 120, 140)
    slot = box(59.5, 2, 60.5, 138)
    made = board(
        Sheet(lines=(Line("CLK", ((2, 131), (118, 131))),)),
        Sheet((("GND", Polygon(whole.exterior, [slot.exterior])),)),
        heights_mm=(0.2,),
        outline=whole,
    )
    found, _ = crossings(made)
    (wide,) = judge(scene(made), found, ()).findings
    look_at = fields.Fields._look_at

    def nearby(self: fields.Fields, *args: Any, narrow: bool) -> Any:
        return look_at(self, *args, narrow=True) if narrow else None

    monkeypatch.setattr(fields.Fields, "_look_at", nearby)
    (near,) = judge(scene(made), found, ()).findings
    assert (wide.method, near.method) == ("solved", "solved")
    assert wide.added_nh is not None
    assert near.added_nh is not None
    assert near.error_nh is not None
    assert near.added_nh == pytest.approx(wide.added_nh, rel=0.03)
    assert 0.05 * wide.added_nh < near.error_nh < 0.3 * wide.added_nh
