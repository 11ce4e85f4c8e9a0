"""Runs the command line in this process and brings back what a user would get."""

from __future__ import annotations

import json
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, NamedTuple

import pytest

from splitcheck.cli.entry import run


class Outcome(NamedTuple):
    """What one command left behind."""

    code: int
    report: dict[str, Any]
    """Contents of ``--out json``; empty if there was none."""

    @property
    def findings(self) -> list[dict[str, Any]]:
        """Findings of the report, worst first."""
        return list(self.report["findings"])

    def told(self) -> str:
        """Assumptions, remarks and facts as one text."""
        return "\n".join(
            [*self.report["assumptions"], *self.report["remarks"], *self.report["facts"]]
        )


def rank(path: Path, *options: str) -> Outcome:
    """Run ``splitcheck rank`` quietly in this process and read its JSON back."""
    with TemporaryDirectory() as folder:
        out = Path(folder) / "report.json"
        code = run(["rank", str(path), "--quiet", "--jobs", "1", "--out", f"json={out}", *options])
        report = json.loads(out.read_text(encoding="utf-8")) if out.is_file() else {}
    return Outcome(code, report)


def complaint(path: Path, capfd: pytest.CaptureFixture[str], *options: str) -> str:
    """What ``rank`` says on stderr of an input it cannot read; checks that it is one clean line."""
    capfd.readouterr()
    outcome = rank(path, *options)
    said = capfd.readouterr()
    assert outcome.code == 2, (outcome, said.err)
    assert not outcome.report
    assert not said.out
    assert "Traceback" not in said.err
    lines = said.err.splitlines()
    assert len(lines) == 1, said.err
    assert lines[0].count(": ") >= 1
    assert "; " in lines[0]
    return lines[0]
