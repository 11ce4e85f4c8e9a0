"""Laws of the whole road: how a board is placed, written or named changes no finding."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from math import hypot
from pathlib import Path
from random import Random
from tempfile import TemporaryDirectory
from typing import Any, Literal, get_args

import pytest
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st

from fixtures.making.plan import BoardPlan, Placing, Point
from fixtures.making.write import Drill, write_board
from tests.making.boards import CROSSING_MM, slotted_board, split_board, two_ground_board
from tests.making.running import rank

few = settings(max_examples=10)
slotted = st.builds(
    slotted_board,
    slot_mm=st.floats(8, 20),
    slot_width_mm=st.floats(0.3, 1.5),
    aside_mm=st.floats(0, 2),
)
boards = st.one_of(slotted, st.builds(split_board, gap_mm=st.floats(0.3, 1.0)))
placings = st.builds(
    Placing,
    moved_mm=st.tuples(st.floats(-200, 200), st.floats(-200, 200)),
    turned_deg=st.sampled_from((0.0, 90.0, 180.0, 270.0, 30.0, 137.5)),
    mirrored=st.booleans(),
)


def _findings(plan: BoardPlan, **how: Any) -> list[dict[str, Any]]:
    with TemporaryDirectory() as folder:
        write_board(plan, Path(folder), **how)
        return _ranked(Path(folder))


def _ranked(folder: Path) -> list[dict[str, Any]]:
    """Findings with layers by number: their names may come from file names."""
    outcome = rank(folder, "--min-nh", "0")
    number = {row["name"]: row["number"] for row in outcome.report["board"]["layers"]}
    return [
        {**finding, **{key: number.get(finding[key]) for key in ("layer", "plane_layer")}}
        for finding in outcome.findings
    ]


def _same_place(point: Point) -> Point:
    return point


def _assert_same(
    found: list[dict[str, Any]],
    expected: list[dict[str, Any]],
    place: Callable[[Point], Point] = _same_place,
) -> None:
    """Two lists of findings say the same of the same places, within the polygons of round holes."""
    assert len(found) == len(expected) > 0
    for finding in expected:
        keys = ("kind", "net", "layer", "plane_layer", "plane_net", "level", "method")
        twins = [f for f in found if all(f[key] == finding[key] for key in keys)]
        assert len(twins) == 1, (finding, found)
        at = place((finding["at_mm"][0], finding["at_mm"][1]))
        assert twins[0]["at_mm"] == pytest.approx(at, abs=0.01)
        assert twins[0]["gap_mm"] == pytest.approx(finding["gap_mm"], abs=0.005)
        for key, slack in (("detour_mm", 0.05), ("added_nh", 0.01)):
            if finding[key] is None:
                assert twins[0][key] is None
            else:
                assert twins[0][key] == pytest.approx(finding[key], rel=0.01, abs=slack), key


@given(boards, placings)
@example(slotted_board(), Placing((0, 0), 45.0, mirrored=True))
@example(split_board(), Placing((-50, 12.5), 90.0, mirrored=False))
@few
def test_moved_turned_and_mirrored_board_has_the_same_findings(
    plan: BoardPlan, placing: Placing
) -> None:
    """Where a board lies in its files does not matter."""
    _assert_same(_findings(plan, placing=placing), _findings(plan), placing.place)


@given(boards)
@few
def test_inch_files_say_the_same_as_metric_files(plan: BoardPlan) -> None:
    """The unit of the files does not matter."""
    _assert_same(_findings(plan, units="inch"), _findings(plan))


@pytest.mark.parametrize("drilling", get_args(Drill))
@pytest.mark.parametrize("attributes", ["x2", "comments"])
def test_dialect_of_the_files_does_not_matter(
    drilling: Drill, attributes: Literal["x2", "comments"]
) -> None:
    """Excellon, XNC and Gerber drill files, attributes plain or in comments: the same findings."""
    plan = split_board()
    written = _findings(plan, drilling=drilling, attributes=attributes)
    _assert_same(written, _findings(plan))


def test_board_without_attributes_has_the_same_places() -> None:
    """Without net names the same gaps are found at the same places."""
    plan = slotted_board()
    bare = _findings(plan, attributes="none", job=True)
    named = _findings(plan)
    assert sorted(f["kind"] for f in bare) == sorted(f["kind"] for f in named)
    assert sorted(f["at_mm"] for f in bare) == sorted(f["at_mm"] for f in named)


@given(st.permutations(range(8)), boards)
@few
def test_names_and_order_of_files_do_not_matter(order: list[int], plan: BoardPlan) -> None:
    """Files that say what they are may be called anything, and so come in any order."""
    with TemporaryDirectory() as folder:
        paths = write_board(plan, Path(folder), job=False)
        for number, path in zip(order, paths, strict=False):
            path.rename(path.with_name(f"{number}-{'abcdefgh'[number]}.gbr"))
        renamed = _ranked(Path(folder))
    _assert_same(renamed, _findings(plan, job=False))


@given(st.randoms(use_true_random=False), boards)
@few
def test_order_of_traces_in_a_file_does_not_matter(random: Random, plan: BoardPlan) -> None:
    """Which trace, pad or hole is written first does not matter."""
    shuffled = replace(
        plan,
        traces=tuple(random.sample(plan.traces, len(plan.traces))),
        pads=tuple(random.sample(plan.pads, len(plan.pads))),
        holes=tuple(random.sample(plan.holes, len(plan.holes))),
    )
    _assert_same(_findings(shuffled), _findings(plan))


@given(st.floats(8, 14), st.floats(1, 6))
@few
def test_longer_slot_never_adds_less(slot_mm: float, more_mm: float) -> None:
    """A slot that grows at both ends costs CLK no less way and no less inductance."""
    short, long = (
        next(f for f in _findings(slotted_board(slot_mm=size)) if f["net"] == "CLK")
        for size in (slot_mm, slot_mm + more_mm)
    )
    assert long["detour_mm"] >= short["detour_mm"]
    assert long["added_nh"] >= short["added_nh"]


places = st.tuples(st.floats(2, 38), st.floats(2, 28))


@given(st.lists(places, min_size=2, max_size=5), places)
@example([(18.0, 12.0), (22.0, 12.0)], (18.0, 14.0))
@few
def test_one_more_stitching_via_never_lengthens_the_detour(
    stitches: list[Point], one_more: Point
) -> None:
    """A via more between the two grounds is one more way for the return, never a longer one."""
    everywhere = [*stitches, one_more]
    for number, (x, y) in enumerate(everywhere):
        assume(abs(y - 15) > 1.2)
        assume(abs(x - 20) > 1)
        assume(all(hypot(x - u, y - v) > 1 for u, v in everywhere[:number]))
    assume(min(x for x, _ in stitches) < 20 < max(x for x, _ in stitches))
    before, after = (
        next(f for f in _findings(two_ground_board(*some)) if f["kind"] == "split-crossing")
        for some in (stitches, everywhere)
    )
    assert before["detour_mm"] is not None
    assert after["detour_mm"] <= before["detour_mm"] + 1e-3
    assert after["added_nh"] <= before["added_nh"] + 1e-3


def test_crossing_lies_where_trace_and_slot_meet() -> None:
    """The place reported is the middle of the run over the slot."""
    clock = next(f for f in _findings(slotted_board()) if f["net"] == "CLK")
    assert clock["at_mm"] == pytest.approx(CROSSING_MM, abs=1e-3)
    assert clock["gap_mm"] == pytest.approx(0.6, abs=1e-3)
