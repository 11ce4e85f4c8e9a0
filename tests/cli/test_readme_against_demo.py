"""README shows what ``rank`` prints today; run this file as a module to paste it anew."""

from __future__ import annotations

import re
from pathlib import Path

from splitcheck import road
from splitcheck.report import terminal

README = Path(__file__).parents[2] / "README.md"
BLOCK = re.compile(r"(?<=<!-- demo -->\n)```text\n.*?```\n(?=<!-- end of demo -->)", re.DOTALL)
ROWS = 3


def block() -> str:
    """The worst rows of the demo board's report, as a block for README."""
    report = road.rank(road.fixtures_folder() / "demo", road.Options())
    text = terminal.render(report, top=ROWS, width=80, color=False)
    found = text[text.index("Found, worst first") : text.index("\nIn all\n")]
    return f"```text\n{found}```\n"


def test_readme_shows_a_real_run() -> None:
    """No number in README is invented or old."""
    shown = BLOCK.search(README.read_text(encoding="utf-8"))
    assert shown is not None
    assert shown.group() == block(), "run: python -m tests.cli.test_readme_against_demo"


if __name__ == "__main__":
    whole = README.read_text(encoding="utf-8")
    README.write_text(BLOCK.sub(lambda _: block(), whole), encoding="utf-8")
