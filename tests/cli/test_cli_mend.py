"""`mend` on the command line: what it writes, where, and how it refuses."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from splitcheck.cli import run
from splitcheck.road import fixtures_folder

Capture = pytest.CaptureFixture[str]


@pytest.fixture(autouse=True)
def _empty_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    for name in ("NO_COLOR", "FORCE_COLOR", "CLICOLOR", "CLICOLOR_FORCE", "COLUMNS"):
        monkeypatch.delenv(name, raising=False)


def _demo() -> str:
    return str(fixtures_folder() / "demo")


def _id_of(net: str) -> str:
    assert run(["rank", _demo(), "--quiet", "--out", "json=rank.json"]) == 1
    rows = json.loads(Path("rank.json").read_text(encoding="utf-8"))["findings"]
    return str(next(row["id"] for row in rows if row["net"] == net))


def test_a_named_finding_gets_proposals_in_text_and_json_and_no_other(capsys: Capture) -> None:
    """Exit code 0: finding what helps is no fault of the board."""
    wanted = _id_of("LCD_E")
    capsys.readouterr()
    assert run(["mend", _demo(), wanted, "--out", "json=mended.json"]) == 0
    out = capsys.readouterr().out
    assert f"{wanted}  warning  void-crossing  LCD_E" in out
    assert "1. copper: leaves" in out
    rows = json.loads(Path("mended.json").read_text(encoding="utf-8"))["findings"]
    for row in rows:
        assert bool(row["proposals"]) == (row["id"] == wanted)
    (best, *_) = next(row["proposals"] for row in rows if row["id"] == wanted)
    assert set(best) == {
        "what", "at_mm", "words", "added_nh", "error_nh", "noise_mv", "isolation"
    }  # fmt: skip


def test_the_worst_are_mended_if_none_is_named(capsys: Capture) -> None:
    """As many as asked for, the worst first."""
    assert run(["mend", _demo(), "--worst", "1"]) == 0
    out = capsys.readouterr().out
    assert "\nF1  " in out
    assert "\nF2  " not in out


def test_nothing_to_mend_on_the_clean_board(capsys: Capture) -> None:
    """No finding: said in words."""
    assert run(["mend", str(fixtures_folder() / "demo_clean")]) == 0
    assert "Nothing to mend" in capsys.readouterr().out


@pytest.mark.parametrize("wrong", ["F99", "f1", "", "SDA"])
def test_an_unknown_finding_is_the_calls_fault(wrong: str, capsys: Capture) -> None:
    """One line that says which there are."""
    assert run(["mend", _demo(), wrong]) == 2
    said = capsys.readouterr()
    assert not said.out
    assert said.err.startswith("splitcheck: finding ")
    assert "F1 to F12" in said.err
    assert len(said.err.splitlines()) == 1


def test_a_board_that_is_not_there(capsys: Capture) -> None:
    """As with every other command."""
    assert run(["mend", "nowhere"]) == 2
    assert len(capsys.readouterr().err.splitlines()) == 1


def test_help_says_that_it_edits_nothing(capsys: Capture) -> None:
    """And shows calls that can be pasted."""
    assert run(["mend", "--help"]) == 0
    out = capsys.readouterr().out
    assert "edits nothing" in out
    assert "\n    splitcheck mend gerbers/ F2 F7" in out
    assert all(len(line) <= 100 for line in out.splitlines())
