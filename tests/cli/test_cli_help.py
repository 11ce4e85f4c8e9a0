"""Help texts: complete, with examples, and quick."""

from __future__ import annotations

import subprocess
import sys

import pytest
import typer

from splitcheck import __version__
from splitcheck.cli import run
from splitcheck.cli.commands import app

Capture = pytest.CaptureFixture[str]


@pytest.mark.parametrize("command", ["rank", "read", "gate", "demo"])
def test_help_of_each_command_has_examples_and_exit_codes(command: str, capsys: Capture) -> None:
    """Each help text shows calls that can be pasted, one a line."""
    assert run([command, "--help"]) == 0
    out = capsys.readouterr().out
    assert f"\n    splitcheck {command}" in out.split("Examples:")[1]
    assert "3  our own crash" in out
    assert all(len(line) <= 100 for line in out.splitlines())


def test_help_of_the_program_lists_the_commands(capsys: Capture) -> None:
    """``--help`` and no argument at all show the same list."""
    assert run(["--help"]) == 0
    out = capsys.readouterr().out
    assert all(f"\n  {command} " in out for command in ("rank", "read", "gate", "demo"))


def test_version(capsys: Capture) -> None:
    """``--version`` prints name and version."""
    assert run(["--version"]) == 0
    assert capsys.readouterr().out == f"splitcheck {__version__}\n"


def test_every_option_has_a_help_text() -> None:
    """No option is left unexplained."""
    group = typer.main.get_command(app)
    for command in group.commands.values():  # type: ignore[attr-defined]  # a group by construction
        for parameter in command.params:
            assert parameter.help, f"{command.name} {parameter.name}"


def test_help_does_not_wait_for_the_road() -> None:
    """The libraries that the work needs are not loaded to show help."""
    code = (
        "import sys; from splitcheck.cli import run; run(['rank', '--help']);"
        "sys.exit(bool({'shapely', 'scipy', 'networkx', 'pygerber'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], stdout=subprocess.DEVNULL, check=False)
    assert done.returncode == 0
