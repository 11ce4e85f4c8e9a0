"""Exit codes, and the one line on standard error that goes with each."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path

import pytest

from splitcheck.cli import run
from splitcheck.errors import SplitcheckError
from splitcheck.road import Options
from tests.cli.conftest import Road

#: The day that the environment states in these tests.
DAY = date(2030, 3, 17)
Capture = pytest.CaptureFixture[str]


@pytest.mark.parametrize(
    ("levels", "fail_at", "code"),
    [
        (("error",), "error", 1),
        (("warning",), "error", 0),
        (("warning",), "warning", 1),
        (("note",), "warning", 0),
        (("note",), "note", 1),
        (("error", "warning", "note"), "never", 0),
        ((), "note", 0),
    ],
)
def test_rank_fails_from_the_threshold_up(
    road: Road, levels: tuple[str, ...], fail_at: str, code: int
) -> None:
    """Only findings at or above ``--fail-at`` make the exit code 1."""
    findings = tuple(f for f in road.report.findings if f.level in levels)
    road.report = replace(road.report, findings=findings)
    assert run(["rank", "board", "--fail-at", fail_at]) == code


def test_rank_fails_at_errors_by_default(road: Road) -> None:
    """Without ``--fail-at`` an error fails and a warning does not."""
    assert run(["rank", "board"]) == 1
    warnings = tuple(f for f in road.report.findings if f.level != "error")
    road.report = replace(road.report, findings=warnings)
    assert run(["rank", "board"]) == 0


def test_a_waived_finding_does_not_fail(road: Road) -> None:
    """What somebody has waived with a reason is shown, and does not count."""
    waived = tuple(replace(f, waived="measured on the bench") for f in road.report.findings)
    road.report = replace(road.report, findings=waived)
    assert run(["rank", "board", "--fail-at", "note"]) == 0


def test_a_fault_of_the_input_is_one_line_and_code_2(road: Road, capsys: Capture) -> None:
    """The sentence of the error is all that is said, on standard error."""
    road.error = SplitcheckError("top.gbr:118", "aperture D14 is not defined", "export it again")
    assert run(["rank", "board"]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err == "splitcheck: top.gbr:118: aperture D14 is not defined; export it again\n"


def test_a_hostile_error_message_cannot_reach_the_terminal(road: Road, capsys: Capture) -> None:
    """Text out of a file is shown with its control characters written out, in one line."""
    road.error = SplitcheckError("a\x1b[2Jb.gbr", "bad\nword", "x" * 10_000)
    assert run(["rank", "board"]) == 2
    err = capsys.readouterr().err
    assert "\x1b" not in err
    assert "a\\x1b[2Jb.gbr: bad\\x0aword" in err
    assert err.count("\n") == 1
    assert len(err) < 2100


def test_a_file_that_the_system_refuses_is_code_2(road: Road, capsys: Capture) -> None:
    """An error of the operating system that names a file is the input's fault."""
    road.error = PermissionError(13, "Permission denied", "board/top.gbr")
    assert run(["read", "board"]) == 2
    assert capsys.readouterr().err.startswith("splitcheck: board/top.gbr: Permission denied; ")


def test_our_own_crash_says_so_and_is_code_3(road: Road, capsys: Capture) -> None:
    """A crash is one line that takes the blame and says how to get the traceback."""
    road.error = KeyError("no such island")
    assert run(["rank", "board"]) == 3
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert "our fault" in err
    assert "KeyError" in err
    assert "--debug" in err


@pytest.mark.parametrize(
    ("error", "code"), [(KeyError("x"), 3), (SplitcheckError("a", "b", "c"), 2)]
)
def test_debug_adds_the_traceback_and_keeps_the_code(
    road: Road, capsys: Capture, error: Exception, code: int
) -> None:
    """``--debug`` shows where it happened."""
    road.error = error
    assert run(["rank", "board", "--debug"]) == code
    assert "Traceback (most recent call last):\n" in capsys.readouterr().err


def test_stopping_from_the_keyboard_is_code_130(road: Road, capsys: Capture) -> None:
    """Ctrl-C leaves no traceback."""
    road.error = KeyboardInterrupt()
    assert run(["rank", "board"]) == 130
    assert "Traceback" not in capsys.readouterr().err


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["rank"], "missing argument 'PATH'"),
        (["rank", "board", "--lever", "3"], "no such option: --lever"),
        (["rnak", "board"], "no such command 'rnak'"),
        (["rank", "board", "--fail-at", "fatal"], "fatal"),
        (["rank", "board", "--top", "-1"], "--top"),
        (["rank", "board", "--top", "ten"], "--top"),
        (["rank", "board", "--jobs", "0"], "--jobs"),
        (["rank", "board", "--color", "mauve"], "mauve"),
        (["rank", "board", "--min-nh", "nan"], "--min-nh"),
        (["rank", "board", "--min-nh", "-1"], "--min-nh"),
    ],
)
def test_a_wrong_call_is_one_line_and_code_2(
    road: Road, capsys: Capture, arguments: list[str], said: str
) -> None:
    """A call that cannot be understood names the offending word and where help is."""
    assert run(arguments) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert said in err
    assert err.count("\n") == 1
    assert err.startswith("splitcheck: ")
    assert "; " in err
    assert road.asked == []


def test_every_option_reaches_the_road(road: Road) -> None:
    """What is typed is what the road is asked."""
    words = ["--net", "A*", "--net", "B", "--layer", "Top", "--min-nh", "0.2", "--jobs", "2"]
    assert run(["rank", "b", "--stack", "s.toml", "--rules", "r.toml", *words]) == 1
    asked = Options(("A*", "B"), ("Top",), 0.2, Path("s.toml"), 2, Path("r.toml"), DAY)
    assert road.asked == [("rank", Path("b"), asked)]


def test_the_defaults_are_those_of_the_road(road: Road) -> None:
    """Nothing typed means the defaults that the road states."""
    run(["rank", "b"])
    run(["read", "b"])
    asked = Options(today=DAY)
    assert road.asked == [("rank", Path("b"), asked), ("read", Path("b"), asked)]


@pytest.fixture(autouse=True)
def the_day(monkeypatch: pytest.MonkeyPatch) -> None:
    """The day that the environment states, for waivers that end."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1900000000")


def test_a_day_that_is_no_number_is_the_calls_fault(
    road: Road, monkeypatch: pytest.MonkeyPatch, capfd: Capture
) -> None:
    """Named, with what to do; nothing is read."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "yesterday")
    assert run(["rank", "b"]) == 2
    assert capfd.readouterr().err == (
        "splitcheck: SOURCE_DATE_EPOCH: 'yesterday' is no number of seconds; give seconds since "
        "1970, or unset it\n"
    )
    assert road.asked == []
