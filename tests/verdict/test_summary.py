"""What the report says of a board beside its findings."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
import shapely

from fixtures.making.plan import BoardPlan, Trace
from fixtures.making.write import write_board
from splitcheck.road import Options, rank, read
from splitcheck.verdict.findings import Report
from splitcheck.verdict.summary import _facts
from tests.making.boards import slotted_board, split_board
from tests.making.hand import Line, Sheet, board


def _report(plan: BoardPlan, folder: Path, *, job: bool = True) -> Report:
    write_board(plan, folder, job=job)
    return rank(folder, Options(jobs=1))


def test_layers_are_given_in_order_with_depth_and_role(tmp_path: Path) -> None:
    """Signals outside, planes inside; depth grows downwards from the upper face of the top."""
    rows = _report(split_board(), tmp_path).layers
    assert [(row.number, row.role) for row in rows] == [
        (1, "signal"), (2, "plane"), (3, "plane"), (4, "signal"),
    ]  # fmt: skip
    assert [row.z_mm for row in rows] == pytest.approx([0, 0.235, 1.07, 1.305])
    assert rows[1].file == "split-ground.gbr"


def test_plane_with_traces_on_it_is_mixed(tmp_path: Path) -> None:
    """Fifteen traces that cut into the ground plane's layer."""
    plan = slotted_board()
    lines = [Trace(2, "AUX", ((5, 4 + 0.5 * n), (30, 4 + 0.5 * n))) for n in range(15)]
    report = _report(replace(plan, traces=(*plan.traces, *lines)), tmp_path)
    assert [row.role for row in report.layers] == ["signal", "mixed"]


def test_islands_are_those_of_the_planes(tmp_path: Path) -> None:
    """One ground, two supplies, with their areas to the antipads and thermal clearances."""
    rows = _report(split_board(), tmp_path).islands
    assert [row.id for row in rows] == ["L2.1", "L3.1", "L3.2"]
    assert (rows[0].net, {row.net for row in rows[1:]}) == ("GND", {"+5V", "+3V3"})
    assert rows[0].area_mm2 == pytest.approx(39 * 29 - 2 * 3.1416 * 0.25, abs=0.1)


def test_nets_have_their_length_layers_and_worst_finding(tmp_path: Path) -> None:
    """Signals only; a net without a finding has no worst."""
    report = _report(slotted_board(), tmp_path)
    rows = {row.name: row for row in report.nets}
    assert sorted(rows) == ["CLK", "DATA", "EN"]
    assert rows["CLK"].length_mm == pytest.approx(22)
    assert (rows["CLK"].findings, rows["EN"].findings) == (1, 0)
    (worst,) = [f.added_nh for f in report.findings if f.net == "CLK"]
    assert worst is not None
    assert rows["CLK"].worst_added_nh == worst
    assert rows["EN"].worst_added_nh is None


def test_what_is_not_judged_is_counted(tmp_path: Path) -> None:
    """One ground and two supplies carry returns."""
    counts = {count.what: count.number for count in _report(split_board(), tmp_path).counts}
    assert counts["nets that carry returns (ground and supply planes), not judged"] == 3
    assert counts["nets that are supplies by name, not judged"] == 0


def test_assumptions_name_the_stack_only_where_it_is_assumed(tmp_path: Path) -> None:
    """With a job file the heights are known; without one the default build is told."""
    with_job = _report(split_board(), tmp_path / "with")
    without = _report(split_board(), tmp_path / "without", job=False)
    assert not any("no layer spacing" in text for text in with_job.assumptions)
    assert any("no layer spacing" in text for text in without.assumptions)
    assert any("1 ns" in text for text in with_job.assumptions)


def test_reading_says_all_but_findings(tmp_path: Path) -> None:
    """``read`` and ``rank`` understand the files alike."""
    ranked = _report(split_board(), tmp_path)
    only_read = read(tmp_path, Options(jobs=1))
    assert only_read.findings == ()
    assert (only_read.layers, only_read.islands, only_read.inputs) == (
        ranked.layers, ranked.islands, ranked.inputs,
    )  # fmt: skip
    assert only_read.facts == ranked.facts


def test_boards_without_net_names_say_what_stands_for_them(tmp_path: Path) -> None:
    """What is a plane was decided by area alone then; with names in the files nothing is said."""
    write_board(slotted_board(), tmp_path / "bare", attributes="none")
    write_board(slotted_board(), tmp_path / "named")
    bare, named = (
        rank(tmp_path / folder, Options(jobs=1)).assumptions for folder in ("bare", "named")
    )
    assert any(said.startswith("No file names the nets") for said in bare)
    assert not any(said.startswith("No file names the nets") for said in named)


def test_names_made_from_places_are_explained_where_there_are_any() -> None:
    """A reader who sees @L1(1.20,3.40) is told what it is; named boards are not bothered."""
    sheets = [
        Sheet((("GND", shapely.box(0, 0, 20, 20)),), (Line(name, ((2, 30), (18, 30))),))
        for name in ("", "CLK")
    ]
    nameless, named = (_facts(board(sheet))[1] for sheet in sheets)
    assert nameless == (
        "2 nets, 1 of them named by the files; the others are called after a place on them,"
        " @L1(x,y): layer and mm"
    )
    assert named == "2 nets, 2 of them named by the files"
