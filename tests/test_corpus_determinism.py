"""Reports of real boards do not depend on how many processes made them."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from splitcheck.cli.entry import run
from splitcheck.copper.intake import open_export
from splitcheck.errors import SplitcheckError

pytestmark = pytest.mark.slow


def _shortest(corpus: Path) -> Path:
    """The board of four copper layers or more with the least copper to read."""
    found = []
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        try:
            copper = open_export(folder).copper()
        except SplitcheckError:
            continue
        if len(copper) >= 4:
            found.append((sum(len(file.text) for file in copper), folder))
    return min(found)[1]


def _report(folder: Path, out: Path, jobs: int) -> dict[str, Any]:
    run(["rank", str(folder), "--quiet", "--jobs", str(jobs), "--out", f"json={out}"])
    report: dict[str, Any] = json.loads(out.read_text(encoding="utf-8"))
    del report["summary"]["seconds"]
    return report


def test_one_process_or_two_make_the_same_report(corpus: Path, tmp_path: Path) -> None:
    """And so do two runs: findings, order and numbers, times aside."""
    folder = _shortest(corpus)
    one = _report(folder, tmp_path / "one.json", 1)
    two = _report(folder, tmp_path / "two.json", 2)
    assert one["findings"]
    assert json.dumps(one) == json.dumps(two)
