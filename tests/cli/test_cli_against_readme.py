"""README and the commands say the same."""

from __future__ import annotations

from pathlib import Path

import pytest
import typer

from splitcheck.board.stack import read_stack_file
from splitcheck.cli.commands import app

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def options(command: str) -> list[tuple[str, str, object]]:
    """How each option of a command is written, its help text and its default."""
    group = typer.main.get_command(app)
    found = []
    for parameter in group.commands[command].params:  # type: ignore[attr-defined]  # it is a group
        if parameter.param_type_name == "option" and parameter.name != "help":
            words = ", ".join(parameter.opts) + (f" {parameter.metavar or ''}".rstrip())
            found.append((words, parameter.help, parameter.default))
    return found


@pytest.mark.parametrize("words", [words for words, _, _ in options("rank")])
def test_readme_explains_every_option_in_the_words_of_the_help(words: str) -> None:
    """One row of the table an option, with its default."""
    text, default = next(rest for name, *rest in options("rank") if name == words)
    escaped = words.replace("|", "\\|")
    row = f"| `{escaped}` | {text}"
    if default not in {None, False}:
        row += f" Default: {default}."
    assert row + " |\n" in README


def test_readme_explains_no_option_that_is_not_there() -> None:
    """The table has as many rows as ``rank`` has options."""
    table = README.split("## Options of `rank`")[1].split("###")[0]
    assert table.count("\n| `-") == len(options("rank"))


def test_the_stack_file_of_readme_can_be_read() -> None:
    """The example is one, and says what its comments say."""
    text = README.split("```toml\n")[1].split("```")[0]
    top, ground, bottom = read_stack_file(text, "stack.toml")
    assert (top.copper_um, top.below_mm, top.below_er) == (35.0, 0.2, 4.3)
    assert (ground.file, ground.negative) == ("radio-gnd.gbr", True)
    assert (bottom.below_mm, bottom.negative) == (None, None)


def test_the_gate_runs_the_test_command_of_readme() -> None:
    """What README promises is what is checked before a change goes in."""
    command = "-m pytest -n auto --hypothesis-profile=ci"
    assert f".venv/bin/python {command}\n" in README
    assert command in (ROOT / ".ci" / "run").read_text(encoding="utf-8")
