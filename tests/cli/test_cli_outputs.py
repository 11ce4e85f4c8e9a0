"""What goes to which stream and file, with and without colour."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from splitcheck.cli import run, streams
from splitcheck.report import jsonfile, terminal
from tests.cli.conftest import Road

Capture = pytest.CaptureFixture[str]


def test_rank_writes_the_report_to_standard_output_alone(road: Road, capsys: Capture) -> None:
    """Standard error stays empty when nothing is wrong and nobody watches."""
    run(["rank", "board"])
    out, err = capsys.readouterr()
    assert out == terminal.render(road.report, top=20, width=80, color=False)
    assert err == ""


def test_top_cuts_the_text_and_never_the_json(road: Road, capsys: Capture) -> None:
    """``--top`` is for eyes; a program gets everything."""
    run(["rank", "board", "--top", "1", "--out", "json=all.json"])
    out = capsys.readouterr().out
    assert "BUS0" in out
    assert "MOTOR_EN" not in out
    assert len(json.loads(Path("all.json").read_text(encoding="utf-8"))["findings"]) == 6


def test_json_on_standard_output_moves_the_text_to_standard_error(
    road: Road, capsys: Capture
) -> None:
    """A pipe gets JSON and nothing else."""
    run(["rank", "board", "--out", "json=-"])
    out, err = capsys.readouterr()
    assert out == jsonfile.render(road.report)
    assert err == terminal.render(road.report, top=20, width=80, color=False)


def test_quiet_leaves_only_what_was_asked_for(road: Road, capsys: Capture) -> None:
    """``--quiet`` prints nothing of its own."""
    assert run(["rank", "board", "--quiet"]) == 1
    assert capsys.readouterr() == ("", "")
    run(["rank", "board", "--quiet", "--out", "json=-"])
    out, err = capsys.readouterr()
    assert out == jsonfile.render(road.report)
    assert err == ""


def test_text_on_standard_output_is_not_said_twice(road: Road, capsys: Capture) -> None:
    """``--out text=-`` takes the place of the report that would be shown anyway."""
    run(["rank", "board", "--out", "text=-"])
    out, err = capsys.readouterr()
    assert out == terminal.render(road.report, top=0, width=80, color=False)
    assert err == ""


def test_several_outs_are_all_written(road: Road) -> None:
    """``--out`` can be given again; text in a file is never coloured."""
    words = ["rank", "b", "--out", "json=a.json", "--out", "text=a.txt", "--color", "always"]
    run(words)
    assert Path("a.json").read_text(encoding="utf-8") == jsonfile.render(road.report)
    expected = terminal.render(road.report, top=0, width=100, color=False)
    assert Path("a.txt").read_text(encoding="utf-8") == expected


@pytest.mark.parametrize(
    ("outs", "said"),
    [
        (["pdf=a"], 'no format "pdf"; use one of text, json, sarif'),
        (["json"], "write it as FORMAT=FILE"),
        (["json="], "write it as FORMAT=FILE"),
        (["json=nowhere/a.json"], 'there is no folder "nowhere"'),
        (["json=."], "this is a folder"),
        (["json=-", "text=-"], "another --out goes there already"),
        (["json=a", "text=./a"], "another --out goes there already"),
        (["json=board.zip"], "the very file that is read"),
    ],
)
def test_an_out_that_cannot_be_is_refused_before_the_work(
    road: Road, capsys: Capture, outs: list[str], said: str
) -> None:
    """Nobody waits for a result that has nowhere to go."""
    Path("board.zip").touch()
    assert run(["rank", "board.zip", *(word for out in outs for word in ("--out", out))]) == 2
    assert said in capsys.readouterr().err
    assert road.asked == []


def test_an_out_that_may_not_be_written_is_refused_before_the_work(
    road: Road, capsys: Capture, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Rights are looked at first; the system's answer is made up, for root may write anywhere."""
    monkeypatch.setattr(os, "access", lambda path, mode: mode != os.W_OK)
    assert run(["rank", "board", "--out", "json=a.json"]) == 2
    assert "may not be written" in capsys.readouterr().err
    assert road.asked == []


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full on this system")
def test_a_full_disk_is_code_2(road: Road, capsys: Capture) -> None:
    """A result that cannot be written after all is said, not lost."""
    assert run(["rank", "board", "--quiet", "--out", "json=/dev/full"]) == 2
    assert "cannot be written" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("flag", "environment", "on_terminal", "off_terminal"),
    [
        ("auto", {}, True, False),
        ("always", {"NO_COLOR": "1"}, True, True),
        ("never", {"FORCE_COLOR": "1"}, False, False),
        ("auto", {"NO_COLOR": "0"}, False, False),
        ("auto", {"NO_COLOR": ""}, True, False),
        ("auto", {"NO_COLOR": "1", "FORCE_COLOR": "1"}, False, False),
        ("auto", {"FORCE_COLOR": "1", "TERM": "dumb"}, True, True),
        ("auto", {"FORCE_COLOR": "0"}, True, False),
        ("auto", {"CLICOLOR_FORCE": "1"}, True, True),
        ("auto", {"CLICOLOR_FORCE": "0"}, True, False),
        ("auto", {"CLICOLOR": "0"}, False, False),
        ("auto", {"TERM": "dumb"}, False, False),
        ("auto", {"TERM": "xterm"}, True, False),
    ],
)
def test_colour_follows_the_stated_order(
    flag: streams.Color, environment: dict[str, str], on_terminal: bool, off_terminal: bool
) -> None:
    """The flag, then NO_COLOR (no-color.org: any value that is not empty), then the rest."""
    assert streams.wants_color(flag, environment, terminal=True) is on_terminal
    assert streams.wants_color(flag, environment, terminal=False) is off_terminal


@pytest.mark.parametrize(("name", "colored"), [("FORCE_COLOR", True), ("NO_COLOR", False)])
def test_the_environment_reaches_the_report(
    road: Road, capsys: Capture, monkeypatch: pytest.MonkeyPatch, name: str, colored: bool
) -> None:
    """What the environment asks for is what is printed, and colour changes no word."""
    monkeypatch.setenv(name, "1")
    run(["rank", "board"])
    out = capsys.readouterr().out
    assert ("\x1b[" in out) is colored


def test_color_flag_beats_the_environment(
    road: Road, capsys: Capture, monkeypatch: pytest.MonkeyPatch
) -> None:
    """``--color always`` colours although NO_COLOR is set."""
    monkeypatch.setenv("NO_COLOR", "1")
    run(["rank", "board", "--color", "always"])
    assert "\x1b[" in capsys.readouterr().out


def test_columns_sets_the_width(
    road: Road, capsys: Capture, monkeypatch: pytest.MonkeyPatch
) -> None:
    """COLUMNS is obeyed where there is no terminal to measure."""
    monkeypatch.setenv("COLUMNS", "120")
    run(["rank", "board"])
    assert capsys.readouterr().out == terminal.render(road.report, top=20, width=120, color=False)


def test_a_stream_without_unicode_gets_escapes(monkeypatch: pytest.MonkeyPatch) -> None:
    """A CI log in ASCII takes any net name."""
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii"))
    streams.prepare()
    streams.put("net Ω\n", sys.stdout)
    assert raw.getvalue() == b"net \\u03a9\n"


def test_a_reader_that_goes_away_is_no_error() -> None:
    """``splitcheck --help | head -0`` leaves no traceback."""
    code = "from splitcheck.cli import run; import sys; sys.exit(run(['--version']))"
    read_end, write_end = os.pipe()
    os.close(read_end)
    with os.fdopen(write_end, "wb") as pipe:
        done = subprocess.run(
            [sys.executable, "-c", code], stdout=pipe, stderr=subprocess.PIPE, check=False
        )
    assert done.stderr == b""
    assert done.returncode == 0


def test_read_shows_the_files_and_fails_on_nothing(road: Road, capsys: Capture) -> None:
    """``read`` ends with 0 whatever the planes look like."""
    assert run(["read", "board"]) == 0
    out = capsys.readouterr().out
    assert "its attributes say layer 1, top" in out
    assert road.asked[0][0] == "read"


def test_demo_says_what_to_type_next(road: Road, capsys: Capture) -> None:
    """The next command can be pasted, also when the folder has a space in its name."""
    assert run(["demo", "my board"]) == 0
    assert "splitcheck rank 'my board'\n" in capsys.readouterr().out
    assert road.asked == []


def test_demo_can_rank_at_once(road: Road, capsys: Capture) -> None:
    """``demo --run`` is a success although the board is full of faults, and says so."""
    assert run(["demo", "--run"]) == 0
    out = capsys.readouterr().out
    assert "BUS0" in out
    assert "splitcheck rank splitcheck-demo" in out
    assert "exit code 1" in out


class Terminal(io.StringIO):
    """Somebody sits before it."""

    def isatty(self) -> bool:
        """Claim to be a terminal."""
        return True


def test_progress_goes_to_standard_error_of_a_terminal(monkeypatch: pytest.MonkeyPatch) -> None:
    """The stage is shown while it runs; without a terminal, or quiet, there is nobody to tell."""
    monkeypatch.setenv("TERM", "xterm")
    screen = Terminal()
    monkeypatch.setattr(sys, "stderr", screen)
    with streams.progress_bar(quiet=False) as progress:
        assert progress is not None
        progress("[copper]", 1, 4)
    assert "[copper]" in screen.getvalue()
    assert "1/4" in screen.getvalue()
    with streams.progress_bar(quiet=True) as progress:
        assert progress is None
    monkeypatch.setenv("TERM", "dumb")
    with streams.progress_bar(quiet=False) as progress:
        assert progress is None
    monkeypatch.setattr(sys, "stderr", io.StringIO())
    with streams.progress_bar(quiet=False) as progress:
        assert progress is None
