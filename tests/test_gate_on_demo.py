"""Two revisions of the demo board down the whole road: what became of its planted faults."""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from fixtures.making.plan import BoardPlan, Cut, Placing, Trace
from fixtures.making.write import write_board
from fixtures.tide_logger import tide_logger
from splitcheck.cli.entry import run
from tests.making.boards import slotted_board

ROOT = Path(__file__).parents[1]
FAULTY, CLEAN = ROOT / "fixtures" / "demo", ROOT / "fixtures" / "demo_clean"


def gate(new: Path, was: Path, folder: Path, *options: str) -> tuple[int, dict[str, Any]]:
    """Exit code and JSON of a gate."""
    out = folder / "gate.json"
    words = ["gate", str(new), "--was", str(was), "--quiet", "--jobs", "1", "--out", f"json={out}"]
    code = run([*words, *options])
    return code, json.loads(out.read_text(encoding="utf-8"))


def verdicts(report: dict[str, Any]) -> Counter[str]:
    """How many findings of each verdict."""
    return Counter(change["verdict"] for change in report["comparison"]["changes"])


@pytest.fixture(scope="module")
def kept(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A report of the faulty board, kept as a baseline."""
    out = tmp_path_factory.mktemp("kept") / "baseline.json"
    words = ["rank", str(FAULTY), "--quiet", "--fail-at", "never", "--out", f"json={out}"]
    assert run(words) == 0
    return out


def test_every_fault_is_new_on_the_board_that_had_none(tmp_path: Path, kept: Path) -> None:
    """From the clean twin to the faulty board."""
    code, report = gate(FAULTY, CLEAN, tmp_path)
    assert code == 1
    assert verdicts(report) == {"new": len(report["findings"])}
    assert len(report["findings"]) == len(json.loads(kept.read_text())["findings"]) > 10


def test_every_fault_is_gone_once_it_is_mended(tmp_path: Path, kept: Path) -> None:
    """From the faulty board to its clean twin, from the folder and from a report of it."""
    for was in (FAULTY, kept):
        code, report = gate(CLEAN, was, tmp_path, "--fail-at", "note")
        assert code == 0
        assert set(verdicts(report)) == {"gone"}
        assert report["findings"] == []


def test_the_old_faults_block_nothing(tmp_path: Path, kept: Path) -> None:
    """The same board again, by folder and by report: all as before."""
    for was in (FAULTY, kept):
        code, report = gate(FAULTY, was, tmp_path, "--fail-at", "note")
        assert code == 0
        assert set(verdicts(report)) == {"unchanged"}


def _written(folder: Path, plan: BoardPlan, **how: Any) -> Path:
    write_board(plan, folder, **how)
    return folder


def _renamed_files(folder: Path) -> None:
    """Call every copper file otherwise; what each is its attributes say."""
    for path in sorted(folder.glob("*-L?-*.gbr")):
        number = re.findall(r"-L(\d)-", path.name)[0]
        path.rename(folder / f"rev-b.copper{number}.gbr")
    (folder / "tide-logger.gbrjob").unlink()


@pytest.mark.parametrize("turned", [0.0, 90.0, 180.0])
def test_a_board_that_was_moved_is_unchanged(tmp_path: Path, kept: Path, turned: float) -> None:
    """By 5 mm and turned."""
    placing = Placing((5.0, -5.0), turned)
    moved = _written(tmp_path / "moved", tide_logger(faulty=True), placing=placing)
    code, report = gate(moved, kept, tmp_path, "--fail-at", "note")
    assert (code, set(verdicts(report))) == (0, {"unchanged"})
    _assert_moved(report, turned)


def test_a_board_turned_by_any_angle_is_unchanged(tmp_path: Path, kept: Path) -> None:
    """By 30 degrees: every finding has its twin, and no value changes by more than its error."""
    placing = Placing((5.0, -5.0), 30.0)
    moved = _written(tmp_path / "moved", tide_logger(faulty=True), placing=placing)
    code, report = gate(moved, kept, tmp_path, "--fail-at", "note")
    assert (code, set(verdicts(report))) == (0, {"unchanged"})
    nets = {finding["id"]: finding["net"] for finding in report["findings"]}
    assert all(c["was"]["net"] == nets[c["finding"]] for c in report["comparison"]["changes"])
    _assert_moved(report, 30.0)


def _assert_moved(report: dict[str, Any], turned: float) -> None:
    move = report["comparison"]["move"]
    assert abs(abs(move["turned_deg"]) - turned) < 0.01
    assert move["shift_mm"] == pytest.approx([5.0, -5.0], abs=0.01)


@pytest.mark.parametrize("turned", [0.0, 90.0])
def test_nets_without_names_are_known_by_their_places(tmp_path: Path, turned: float) -> None:
    """No names in the files at all: names are made from places, and change with them."""
    plan = tide_logger(faulty=True)
    before = _written(tmp_path / "before", plan, attributes="none")
    placing = Placing((5.0, 0.0), turned)
    after = _written(tmp_path / "after", plan, attributes="none", placing=placing)
    code, report = gate(after, before, tmp_path, "--fail-at", "note")
    assert (code, set(verdicts(report))) == (0, {"unchanged"})
    nets = {f["net"] for f in report["findings"]}
    assert all(net.startswith("@L") for net in nets if net)
    assert len(nets) > 5


def _with_names(plan: BoardPlan, name: Callable[[str], str]) -> BoardPlan:
    """All nets but ground and supplies called otherwise."""

    def of(net: str | None) -> str | None:
        return net if net is None or net[0] == "+" or net in {"GND", "VIN"} else name(net)

    return replace(
        plan,
        traces=tuple(row._replace(net=of(row.net)) for row in plan.traces),
        pads=tuple(row._replace(net=of(row.net)) for row in plan.pads),
        holes=tuple(row._replace(net=of(row.net)) for row in plan.holes),
        pours=tuple(row._replace(net=of(row.net)) for row in plan.pours),
    )


def test_nets_numbered_anew_are_unchanged(tmp_path: Path) -> None:
    """N$1, N$2 ... in another order: each name now stands for another net."""
    plan = tide_logger(faulty=True)
    nets = sorted({row.net for row in plan.traces if row.net})
    number = {net: place for place, net in enumerate(nets, 1)}
    before = _written(tmp_path / "before", _with_names(plan, lambda n: f"N${number[n]}"))
    after = _written(tmp_path / "after", _with_names(plan, lambda n: f"N${99 - number[n]}"))
    code, report = gate(after, before, tmp_path, "--fail-at", "note")
    assert (code, set(verdicts(report))) == (0, {"unchanged"})


def test_names_that_come_to_a_board_fail_nothing(tmp_path: Path) -> None:
    """A first revision without attributes, a second with: names, and capacitors that help."""
    before = _written(tmp_path / "before", tide_logger(faulty=True), attributes="none")
    code, report = gate(FAULTY, before, tmp_path, "--fail-at", "note")
    assert code == 0
    assert set(verdicts(report)) <= {"unchanged", "better"}
    for change in report["comparison"]["changes"]:
        (finding,) = (f for f in report["findings"] if f["id"] == change["finding"])
        assert finding["at_mm"] == pytest.approx(change["was"]["at_mm"], abs=0.01)


def test_files_called_otherwise_are_unchanged(tmp_path: Path, kept: Path) -> None:
    """Layers take their names from files."""
    folder = _written(tmp_path / "renamed", tide_logger(faulty=True))
    _renamed_files(folder)
    code, report = gate(folder, kept, tmp_path, "--fail-at", "note")
    assert (code, set(verdicts(report))) == (0, {"unchanged"})
    old = {row["name"] for row in json.loads(kept.read_text())["board"]["layers"]}
    assert old.isdisjoint(row["name"] for row in report["board"]["layers"])


def test_all_of_it_at_once_is_unchanged(tmp_path: Path) -> None:
    """Moved, turned, files and nets called otherwise."""
    plan = tide_logger(faulty=True)
    nets = sorted({row.net for row in plan.traces if row.net})
    number = {net: place for place, net in enumerate(nets, 1)}
    before = _written(tmp_path / "before", _with_names(plan, lambda n: f"N${number[n]}"))
    after = _written(
        tmp_path / "after",
        _with_names(plan, lambda n: f"N${99 - number[n]}"),
        placing=Placing((5.0, 0.0), 90.0),
    )
    _renamed_files(after)
    code, report = gate(after, before, tmp_path, "--fail-at", "note")
    assert (code, set(verdicts(report))) == (0, {"unchanged"})


def _shifted(plan: BoardPlan, net: str, line: float, by_mm: float) -> BoardPlan:
    """The part of a trace that runs at x = ``line`` moved sideways, what joins it stretched."""

    def moved(row: Trace) -> Trace:
        if row.net != net:
            return row
        points = tuple((x + by_mm * (x == line), y) for x, y in row.points)
        return row._replace(points=points)

    return replace(plan, traces=tuple(moved(row) for row in plan.traces))


@pytest.mark.parametrize("by_mm", [1.0, -1.0, 2.0])
def test_a_trace_that_was_shifted_keeps_its_finding(
    tmp_path: Path, kept: Path, by_mm: float
) -> None:
    """RTC_CLK over the slot that LEAK makes, from x = 66 to the board's edge: 1 mm costs 10 %."""
    plan = _shifted(tide_logger(faulty=True), "RTC_CLK", 70.0, by_mm)
    code, report = gate(_written(tmp_path / "shifted", plan), kept, tmp_path)
    changes = {c["finding"]: c for c in report["comparison"]["changes"]}
    (finding,) = (f for f in report["findings"] if f["net"] == "RTC_CLK")
    change = changes[finding["id"]]
    assert finding["at_mm"][0] == pytest.approx(70.0 + by_mm, abs=0.05)
    assert change["was"]["at_mm"][0] == pytest.approx(70.0, abs=0.05)
    assert (code, set(verdicts(report))) == (0, {"unchanged"})


def test_one_fault_more_is_the_only_new_one(tmp_path: Path) -> None:
    """A clear stroke through the ground plane under SENS_A, on the board with its old faults."""
    plan = tide_logger(faulty=True)
    cut = Cut(2, ((33.5, 45.0), (36.5, 45.0)), 0.5)
    cut_too = _written(tmp_path / "cut", replace(plan, cuts=(*plan.cuts, cut)))
    code, report = gate(cut_too, FAULTY, tmp_path, "--fail-at", "note")
    assert code == 1
    assert verdicts(report)["new"] == 1
    new = next(c["finding"] for c in report["comparison"]["changes"] if c["verdict"] == "new")
    found = next(f for f in report["findings"] if f["id"] == new)
    assert found["net"] == "SENS_A"
    assert found["at_mm"] == pytest.approx([35.0, 45.0], abs=0.1)
    assert verdicts(report)["unchanged"] == len(report["findings"]) - 1


def test_a_longer_slot_is_worse(tmp_path: Path) -> None:
    """The slot under the only trace over it grows from 8 to 14 mm."""
    short = _written(tmp_path / "short", slotted_board(slot_mm=8.0))
    long = _written(tmp_path / "long", slotted_board(slot_mm=14.0))
    code, report = gate(long, short, tmp_path, "--fail-at", "note")
    assert code == 1
    assert set(verdicts(report)) == {"worse"}
    code, report = gate(short, long, tmp_path, "--fail-at", "note")
    assert code == 0
    assert set(verdicts(report)) == {"better"}
