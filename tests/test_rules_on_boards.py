"""Rules from their file to the report, on boards a reader can check; each with a negative twin."""

from __future__ import annotations

import shutil
import zipfile
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from fixtures.making.plan import BoardPlan
from fixtures.making.write import write_board
from tests.making.boards import slotted_board, split_board
from tests.making.running import Outcome, complaint, rank


def _write(plan: BoardPlan, folder: Path, rules: str = "") -> Path:
    write_board(plan, folder)
    if rules:
        (folder / "splitcheck.toml").write_text(rules, encoding="utf-8")
    return folder


def _by_net(outcome: Outcome) -> dict[str, dict[str, Any]]:
    return {finding["net"]: finding for finding in outcome.findings}


def _named(name: str) -> BoardPlan:
    """The slotted board, with its CLK called otherwise."""
    plan = slotted_board()
    traces = tuple(t._replace(net=name) if t.net == "CLK" else t for t in plan.traces)
    pads = tuple(p._replace(net=name) if p.net == "CLK" else p for p in plan.pads)
    return replace(plan, traces=traces, pads=pads)


@pytest.mark.parametrize(
    ("name", "net_class", "level"),
    [
        ("DDR4_DQ0", "ddr4", "error"),
        ("MISC", "default", "warning"),
        ("I2C_SDA", "i2c", "note"),
        ("USB_FS_D+", "usb-full", "note"),
    ],
)
def test_one_slot_is_as_bad_as_what_crosses_it(
    tmp_path: Path, name: str, net_class: str, level: str
) -> None:
    """The same trace over the same slot: what it carries decides."""
    finding = _by_net(rank(_write(_named(name), tmp_path)))[name]
    assert (finding["net_class"], finding["level"]) == (net_class, level)


def test_exempt_nets_are_counted_and_not_found(tmp_path: Path) -> None:
    """A lamp over the slot: no finding; the net, its class and its crossing are in the report."""
    outcome = rank(_write(_named("LED1"), tmp_path))
    assert "LED1" not in _by_net(outcome)
    (row,) = [net for net in outcome.report["nets"] if net["name"] == "LED1"]
    assert (row["class"], row["exempt"]) == ("led", "class led")
    counts = {count["what"]: count["number"] for count in outcome.report["counts"]}
    assert counts["nets exempt by class: led"] == 1
    assert counts["crossings of nets that are exempt by class"] == 1
    assert [c["name"] for c in outcome.report["classes"] if c["exempt"]] == ["enable", "led"]


def test_exempt_nets_are_found_when_the_rules_say_so(tmp_path: Path) -> None:
    """The twin: the same lamp, with a rise time of its own."""
    outcome = rank(_write(_named("LED1"), tmp_path, "[nets]\nLED1 = { rise_ns = 1 }\n"))
    assert _by_net(outcome)["LED1"]["rise_ns"] == 1.0


def test_report_says_what_each_class_is_judged_by(tmp_path: Path) -> None:
    """Every class with nets, with its numbers and their sources; the sentences give the counts."""
    outcome = rank(_write(slotted_board(), tmp_path))
    rows = {row["name"]: row for row in outcome.report["classes"]}
    assert {name: row["nets"] for name, row in rows.items()} == {
        "clock": 1, "default": 1, "enable": 1,
    }  # fmt: skip
    assert rows["clock"]["rise_ns"] == 1.0
    assert "common practice" in rows["clock"]["source"]
    assert "1 net that no class knows is taken to switch in 1 ns" in outcome.told()
    assert "2 nets are judged, or exempt, by their class, known by name (2): 1 clock, 1 enable" in (
        outcome.told()
    )
    assert "rules: the shipped ones; no splitcheck.toml was found" in outcome.told()


def test_rules_are_found_beside_the_export_or_where_it_runs(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """In this order: --rules, the folder of the export, the current directory."""
    folder, here = tmp_path / "board", tmp_path / "here"
    folder.mkdir()
    here.mkdir()
    monkeypatch.chdir(here)
    _write(slotted_board(), folder)
    rises = {"typed": 3, "beside": 4, "here": 5}
    texts = {name: f"[nets]\nCLK = {{ rise_ns = {rise} }}\n" for name, rise in rises.items()}

    def told(*options: str) -> tuple[float, str]:
        outcome = rank(folder, *options)
        (fact,) = [fact for fact in outcome.report["facts"] if fact.startswith("rules: ")]
        return _by_net(outcome)["CLK"]["rise_ns"], fact

    (here / "splitcheck.toml").write_text(texts["here"])
    rise, fact = told()
    assert rise == 5
    assert fact == "rules: splitcheck.toml, found in the current directory, 0 waivers"
    (folder / "splitcheck.toml").write_text(texts["beside"])
    rise, fact = told()
    assert rise == 4
    assert fact == "rules: splitcheck.toml, found in the folder of the export, 0 waivers"
    (tmp_path / "mine.toml").write_text(texts["typed"])
    rise, fact = told("--rules", str(tmp_path / "mine.toml"))
    assert rise == 3
    assert fact == "rules: mine.toml, named by --rules, 0 waivers"


def test_rules_inside_an_archive_are_not_asked(tmp_path: Path) -> None:
    """What is judged does not waive itself; its rules are an input like any other file."""
    folder = _write(slotted_board(), tmp_path / "board", "[[waive]]\nnet = '*'\nreason = 'no'\n")
    shutil.make_archive(str(tmp_path / "board"), "zip", folder)
    assert "splitcheck.toml" in zipfile.ZipFile(tmp_path / "board.zip").namelist()
    outcome = rank(tmp_path / "board.zip")
    assert all(finding["waived"] is None for finding in outcome.findings)
    assert outcome.report["waivers"] == []


def test_rules_are_one_of_the_inputs(tmp_path: Path) -> None:
    """Once, with their digest."""
    outcome = rank(_write(slotted_board(), tmp_path, "# nothing\n"))
    rows = [row for row in outcome.report["inputs"] if row["file"] == "splitcheck.toml"]
    assert [row["kind"] for row in rows] == ["rules"]
    assert len(rows[0]["sha256"]) == 64


WAIVED = """
[[waive]]
net = "CLK"
kind = "slot-crossing"
reason = "agreed with the safety engineer"
until = 2030-06-30

[[waive]]
net = "DATA"
at_mm = [999, 999]
reason = "another place"
"""


@pytest.mark.parametrize(
    ("day", "waived", "state"),
    [("1900000000", "agreed with the safety engineer", "used"), ("1910000000", None, "expired")],
)
def test_waived_findings_stay_and_do_not_count(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, day: str, waived: str | None, state: str
) -> None:
    """Before and after its last day; the other waiver fits nothing, and both are reported."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", day)
    folder = _write(slotted_board(), tmp_path, WAIVED)
    outcome = rank(folder, "--fail-at", "note", "--net", "CLK")
    assert _by_net(outcome)["CLK"]["waived"] == waived
    assert outcome.code == (0 if waived else 1)
    assert [(row["state"], row["source"]["line"]) for row in outcome.report["waivers"]] == [
        (state, 2),
        ("unmatched", 8),
    ]
    assert outcome.report["summary"]["waived"] == (1 if waived else 0)


def test_rules_with_a_mistake_are_the_inputs_fault(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    """One line with file and line; nothing is judged by half of the rules."""
    folder = _write(slotted_board(), tmp_path, '\n[nets]\n"CLX" = "clock"\n')
    assert complaint(folder, capfd) == (
        "splitcheck: splitcheck.toml:3: 'CLX' matches no net of this board; did you mean 'CLK'"
    )


def test_rules_that_are_not_there_are_the_calls_fault(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    """Also a folder, and a file that is much too large."""
    folder = _write(slotted_board(), tmp_path / "board")
    large = tmp_path / "large.toml"
    large.write_bytes(b"#" * 1_000_001)
    for name in ("none.toml", "board", "large.toml"):
        assert name in complaint(folder, capfd, "--rules", str(tmp_path / name))


@pytest.mark.parametrize("rule", ["allowed", "discouraged", "forbidden"])
def test_supply_planes_as_references(tmp_path: Path, rule: str) -> None:
    """Allowed: nothing is said. Discouraged: it is said and counted. Forbidden: it is found."""
    outcome = rank(_write(split_board(), tmp_path, f'supply_reference = "{rule}"\n'))
    counted = [c["what"] for c in outcome.report["counts"] if "supply plane," in c["what"]]
    split = [f for f in outcome.findings if f["kind"] == "split-crossing"]
    by_rule = [f for f in outcome.findings if "which the rules forbid" in f["reason"]]
    assert split
    said = [f"is {rule} by the rules" in f["reason"] for f in split]
    assert all(said) if rule != "allowed" else not any(said)
    assert bool(counted) == (rule != "allowed")
    assert bool(by_rule) == (rule == "forbidden")
    assert all(f["level"] != "note" for f in (*by_rule, *split)) or rule != "forbidden"
