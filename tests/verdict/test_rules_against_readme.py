"""The rules that README shows can be read, and it names every class that ships."""

from __future__ import annotations

import re
from pathlib import Path

from splitcheck.verdict.packs import rules_of, shipped_files, shipped_rules
from splitcheck.verdict.rulesfile import read_rules

TEXT = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")


def test_readme_shows_rules_that_can_be_read() -> None:
    """Every key of it."""
    section = TEXT[TEXT.index("### splitcheck.toml") :]
    shown = re.search(r"```toml\n(.*?)```", section, re.DOTALL)
    assert shown is not None
    read = read_rules(shown[1], "splitcheck.toml")
    assert len(read.waivers) == 2
    rules = rules_of(shipped_files(), read)
    assert rules.classes[0].name == "camera"
    assert (rules.change_mm, rules.edge_heights) == (1.27, 1.0)


def test_readme_names_every_class() -> None:
    """None is missing, none is invented."""
    section = TEXT[TEXT.index("## Classes and rules") : TEXT.index("### splitcheck.toml")]
    named = set(re.findall(r"`([a-z0-9-]+)`", section)) - {"read", "level", "capped"}
    assert named == {one.name for one in shipped_rules().classes}
