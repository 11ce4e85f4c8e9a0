"""The whole way, from files on the disk to text and exit code, on the demo board and its twin."""

from __future__ import annotations

import json
import shutil
from pathlib import Path
from typing import Any

import pytest

from splitcheck.cli import run
from splitcheck.road import fixtures_folder

Capture = pytest.CaptureFixture[str]


@pytest.fixture(autouse=True)
def _empty_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    for name in ("NO_COLOR", "FORCE_COLOR", "CLICOLOR", "CLICOLOR_FORCE", "COLUMNS"):
        monkeypatch.delenv(name, raising=False)


def ranked(*words: str) -> tuple[int, Any]:
    """Exit code and JSON of ``rank``, without the seconds."""
    code = run(["rank", *words, "--quiet", "--out", "json=report.json"])
    report = json.loads(Path("report.json").read_text(encoding="utf-8"))
    report["summary"].pop("seconds")
    return code, report


def test_the_demo_board_fails_and_its_clean_twin_passes() -> None:
    """The first thing a user sees, and the thing a user trusts."""
    code, report = ranked(str(fixtures_folder() / "demo"))
    assert code == 1
    assert report["findings"]
    code, report = ranked(str(fixtures_folder() / "demo_clean"), "--fail-at", "note")
    assert code == 0
    assert report["findings"] == []


def test_two_runs_give_the_same_bytes_however_many_processes_read() -> None:
    """Only the seconds may differ."""
    board = str(fixtures_folder() / "demo")
    first = ranked(board, "--jobs", "1")
    assert ranked(board, "--jobs", "2") == first
    assert ranked(board) == first


def test_a_zip_of_the_board_gives_the_same_findings() -> None:
    """An archive is only another way to hand over the files."""
    folder = fixtures_folder() / "demo"
    shutil.make_archive("board", "zip", folder)
    assert ranked("board.zip")[1]["findings"] == ranked(str(folder))[1]["findings"]


def test_the_demo_can_be_written_twice_but_never_over_other_files(capsys: Capture) -> None:
    """The line of README can be typed again; somebody's own folder stays as it is."""
    assert run(["demo", "--run"]) == 0
    first = capsys.readouterr().out
    assert run(["demo", "--run"]) == 0
    assert capsys.readouterr().out == first
    Path("mine").mkdir()
    Path("mine/notes.txt").touch()
    assert run(["demo", "mine"]) == 2
    assert "notes.txt" in capsys.readouterr().err
    assert run(["demo", "mine/notes.txt"]) == 2
    assert [path.name for path in Path("mine").iterdir()] == ["notes.txt"]


def test_net_judges_only_the_nets_it_means(capsys: Capture) -> None:
    """One net of the bus; a name that is nowhere is refused, with its neighbours."""
    board = str(fixtures_folder() / "demo")
    _, report = ranked(board, "--net", "D3")
    assert {finding["net"] for finding in report["findings"]} == {"D3"}
    _, report = ranked(board, "--net", "D?")
    assert {finding["net"] for finding in report["findings"]} == {f"D{bit}" for bit in range(8)}
    assert run(["rank", board, "--net", "RTC_CKL"]) == 2
    assert "RTC_CLK" in capsys.readouterr().err


def test_layer_judges_only_traces_on_it(capsys: Capture) -> None:
    """A layer that is not there is refused, and the layers there are, are told."""
    board = str(fixtures_folder() / "demo")
    _, report = ranked(board, "--layer", "L1-top")
    assert {finding["layer"] for finding in report["findings"]} == {"L1-top"}
    assert run(["rank", board, "--layer", "L9"]) == 2
    assert "L4-bottom" in capsys.readouterr().err


def test_min_nh_leaves_out_what_adds_less() -> None:
    """A high bar leaves only places without any way back."""
    _, report = ranked(str(fixtures_folder() / "demo"), "--min-nh", "1000")
    assert all(finding["added_nh"] is None for finding in report["findings"])


def test_read_tells_layers_and_reasons(capsys: Capture) -> None:
    """Every file of the board is there with a reason."""
    folder = fixtures_folder() / "demo"
    assert run(["read", str(folder)]) == 0
    out = " ".join(capsys.readouterr().out.split())
    for file in folder.iterdir():
        assert f"{file.name}: " in out
