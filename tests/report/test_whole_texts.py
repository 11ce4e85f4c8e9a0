"""Every format from the one small report, byte for byte, alone and against an earlier revision.

Run this file as a module to write the texts anew, then read them through.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from splitcheck import __version__
from splitcheck.report import annotations as commands
from splitcheck.report import codequality, csvfile, gated, jsonfile, junit, markdown, sarif
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import Report
from tests.report import made
from tests.report.compared import compared

TEXTS = Path(__file__).parent / "texts"


def _gate(report: Report, comparison: Comparison | None) -> str:
    return gated.render(
        report, comparison=comparison, fail_at="error", top=20, width=80, color=False
    )


RENDERERS: dict[str, Callable[[Report, Comparison | None], str]] = {
    "json": jsonfile.render,
    "sarif": sarif.render,
    "junit.xml": junit.render,
    "codequality.json": codequality.render,
    "annotations.txt": commands.render,
    "md": markdown.render,
    "csv": csvfile.render,
    "txt": _gate,
}


def texts() -> dict[str, str]:
    """Name and content of every file; plain JSON is looked at in ``test_jsonfile.py``."""
    pump = made.pump()
    found = {}
    for ending, render in RENDERERS.items():
        if ending != "json":
            found[f"alone.{ending}"] = render(pump, None)
        found[f"gate.{ending}"] = render(pump, compared(pump))
    return found


@pytest.mark.parametrize("name", sorted(texts()))
def test_the_whole_text(name: str) -> None:
    """As somebody has read it through."""
    expected = (TEXTS / name).read_bytes().decode().replace("VERSION", __version__)
    assert texts()[name] == expected, "run: python -m tests.report.test_whole_texts"


if __name__ == "__main__":
    for file, content in texts().items():
        (TEXTS / file).write_bytes(content.replace(__version__, "VERSION").encode())
