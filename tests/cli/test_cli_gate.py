"""The command ``gate``: what it reads, where its results go, how it ends."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from splitcheck.cli import results, run, targets
from splitcheck.errors import SplitcheckError
from splitcheck.report import gated, jsonfile
from splitcheck.verdict.compare import compare
from splitcheck.verdict.findings import Report
from tests.cli.conftest import Road
from tests.report import made

Capture = pytest.CaptureFixture[str]
FORMATS = [name for name in targets.TOLD if name != "text"]


def keep(report: Report, file: str) -> str:
    """Keep a report as JSON."""
    Path(file).write_text(jsonfile.render(report), encoding="utf-8")
    return file


@pytest.fixture
def was(road: Road) -> str:
    """A baseline that knows all but the first finding."""
    Path("board").mkdir()
    return keep(replace(road.report, findings=road.report.findings[1:]), "was.json")


def test_without_an_earlier_revision_every_finding_is_new(road: Road, capsys: Capture) -> None:
    """A first run fails as ``rank`` does, and says so."""
    Path("board").mkdir()
    assert run(["gate", "board"]) == 1
    out = capsys.readouterr().out
    assert "No earlier revision (--was): every finding counts as new." in out
    assert "Failed: 2 findings of level error are new or worse." in out
    assert run(["gate", "board", "--fail-at", "never"]) == 0
    assert "Passed: --fail-at never." in capsys.readouterr().out


def test_only_what_is_new_fails(road: Road, was: str, capsys: Capture) -> None:
    """BUS0 alone is new; the other error was there before."""
    assert run(["gate", "board", "--was", was]) == 1
    out = capsys.readouterr().out
    assert "Failed: 1 finding of level error is new or worse." in out
    assert "BUS0" in out
    assert "MOTOR_EN" not in out
    assert run(["gate", "board", "--was", keep(road.report, "all.json")]) == 0
    assert "Passed: nothing of level error is new or worse." in capsys.readouterr().out


def test_the_threshold_is_that_of_rank(road: Road, capsys: Capture) -> None:
    """A new warning passes unless it is asked for; a new waived error always does."""
    Path("board").mkdir()
    first, *rest = road.report.findings
    baseline = keep(replace(road.report, findings=tuple(rest)), "was.json")
    road.report = replace(road.report, findings=(replace(first, level="warning"), *rest))
    assert run(["gate", "board", "--was", baseline]) == 0
    assert run(["gate", "board", "--was", baseline, "--fail-at", "warning"]) == 1
    road.report = replace(road.report, findings=(replace(first, waived="barrier"), *rest))
    assert run(["gate", "board", "--was", baseline, "--fail-at", "note"]) == 0


def test_both_revisions_can_be_reports(road: Road, was: str) -> None:
    """Then no board is read at all."""
    new = keep(road.report, "new.json")
    assert run(["gate", new, "--was", was]) == 1
    assert run(["gate", new, "--was", new, "--fail-at", "note"]) == 0
    assert road.asked == []


def test_both_revisions_can_be_boards(road: Road, was: str) -> None:
    """Both are ranked, with the same options."""
    Path("old").mkdir()
    assert run(["gate", "board", "--was", "old", "--net", "BUS*", "--min-nh", "0.2"]) == 0
    assert [path for _, path, _ in road.asked] == [Path("old"), Path("board")]
    assert all(asked.nets == ("BUS*",) and asked.min_nh == 0.2 for *_, asked in road.asked)


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (
            ["board", "--was", "no.json"],
            "--was no.json: there is no such file or folder; check out",
        ),
        (["nowhere"], "nowhere: there is no such file or folder"),
        (["board", "--was", "bad.json"], "bad.json:1: this is no JSON"),
        (["board", "--was", "other.json"], "other.json: this is no report of splitcheck"),
        (["board", "--was", "latin.json"], "latin.json: is no UTF-8 text"),
        (["board", "--was", "was.json", "--out", "json=was.json"], "the very file that is read"),
        (["board", "--min-nh", "-1"], "this is no inductance"),
        (["board", "--fail-at", "bad"], "see splitcheck gate --help"),
    ],
)
def test_what_is_wrong_is_one_line_and_code_2(
    was: str, capsys: Capture, words: list[str], said: str
) -> None:
    """Place, what is wrong, what to do."""
    Path("bad.json").write_text("{", encoding="utf-8")
    Path("other.json").write_text("{}", encoding="utf-8")
    Path("latin.json").write_bytes(b'{"\xff": 1}')
    assert run(["gate", *words]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert said in err
    assert len(err.splitlines()) == 1


def test_a_huge_report_is_refused(was: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """Before it is read."""
    monkeypatch.setattr("splitcheck.cli.gate.LARGEST_BYTES", 10)
    assert run(["gate", "board", "--was", was]) == 2


def test_a_fault_of_either_board_is_code_2(road: Road, was: str) -> None:
    """As with ``rank``."""
    road.error = SplitcheckError("top.gbr", "is broken", "export it again")
    assert run(["gate", "board", "--was", was]) == 2


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize(
    "command", [["rank", "board"], ["gate", "board"], ["gate", "board", "--was", "was.json"]]
)
def test_standard_output_is_the_format_alone_and_the_same_each_time(
    road: Road, was: str, capsys: Capture, command: list[str], name: str
) -> None:
    """The text goes to standard error, or nowhere if it is to be quiet; two runs, one result."""
    said = []
    for quiet in ([], ["--quiet"]):
        code = run([*command, "--out", f"{name}=-", *quiet])
        assert code == 1
        said.append(capsys.readouterr())
    assert said[0].out == said[1].out != ""
    assert "In all" in said[0].err
    assert said[1].err == ""
    run([*command, "--out", f"{name}=file", "--quiet"])
    assert Path("file").read_bytes() == said[0].out.encode()


def test_the_text_of_a_gate_can_be_written_too(road: Road, was: str, capsys: Capture) -> None:
    """With all rows, in 100 columns."""
    run(["gate", "board", "--was", was, "--top", "1", "--quiet", "--out", "text=gate.txt"])
    earlier = replace(road.report, findings=road.report.findings[1:])
    expected = gated.render(
        road.report,
        comparison=compare(earlier, road.report),
        fail_at="error",
        top=0,
        width=100,
        color=False,
    )
    assert Path("gate.txt").read_text(encoding="utf-8") == expected


def test_a_kept_report_cannot_be_drawn(road: Road, was: str, capsys: Capture) -> None:
    """There is no board behind it."""
    assert run(["gate", was, "--was", was, "--out", "html=a.html"]) == 2
    assert 'no format "html"' in capsys.readouterr().err


def test_hosts_are_pointed_to_the_file_in_the_repository(road: Road, was: str) -> None:
    """The folder of the export, seen from where the command runs, comes before the file."""
    Path("hw/out").mkdir(parents=True)
    run(["rank", "hw/out", "--quiet", "--out", "sarif=a.sarif", "--out", "codequality=a.json"])
    (first, *_) = json.loads(Path("a.sarif").read_text())["runs"][0]["results"]
    physical = first["locations"][0]["physicalLocation"]
    assert physical["artifactLocation"]["uri"] == "hw/out/pump-top.gbr"
    assert physical["region"]["startLine"] == 118
    (row, *_) = json.loads(Path("a.json").read_text())
    assert row["location"] == {"path": "hw/out/pump-top.gbr", "lines": {"begin": 118}}


@pytest.mark.parametrize("anchored", [True, False])
def test_an_export_outside_the_repository_is_shown_at_its_rules(
    road: Road, capsys: Capture, anchored: bool
) -> None:
    """A zip has no lines: splitcheck.toml has, if it is there; the text says where it is drawn."""
    Path("board.zip").touch()
    if anchored:
        Path("splitcheck.toml").touch()
    run(["rank", "board.zip", "--quiet", "--out", "annotations=-"])
    first = capsys.readouterr().out.splitlines()[0]
    if anchored:
        assert first.startswith("::error file=splitcheck.toml,line=1,")
        assert "Drawn in pump-top.gbr:118." in first
    else:
        assert first.startswith("::error file=pump-top.gbr,line=118,")


def test_a_job_file_stands_for_its_folder(road: Road) -> None:
    """Its files lie beside it."""
    Path("out").mkdir()
    Path("out/pump.gbrjob").touch()
    told = results.located(made.pump(), Path("out/pump.gbrjob"))
    assert told.findings[0].source.file == "out/pump-top.gbr"
