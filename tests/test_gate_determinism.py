"""The same two revisions give the same bytes in every format, whatever the process is like."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from splitcheck.cli.targets import FORMATS

ROOT = Path(__file__).parents[1]
BOARDS = ROOT / "fixtures"


def _written(folder: Path, seed: str, *words: str) -> dict[str, bytes]:
    """Every format of one gate, run in a process of its own with its own order of sets."""
    folder.mkdir()
    outs = [word for name in FORMATS for word in ("--out", f"{name}={folder / name}")]
    done = subprocess.run(
        [sys.executable, "-m", "splitcheck", *words, "--quiet", "--fail-at", "never", *outs],
        cwd=ROOT,
        env={**os.environ, "PYTHONHASHSEED": seed},
        check=False,
        capture_output=True,
        text=True,
    )
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")
    return {name: (folder / name).read_bytes() for name in FORMATS}


def _timeless(text: bytes) -> object:
    report = json.loads(text)
    del report["summary"]["seconds"]
    return report


@pytest.mark.slow
def test_two_runs_write_the_same_bytes(tmp_path: Path) -> None:
    """All formats, from the folders and from a report of the earlier revision alike."""
    demo, clean = str(BOARDS / "demo"), str(BOARDS / "demo_clean")
    one = _written(tmp_path / "1", "1", "gate", demo, "--was", clean, "--jobs", "1")
    two = _written(tmp_path / "2", "2", "gate", demo, "--was", clean, "--jobs", "2")
    kept = _written(tmp_path / "3", "3", "rank", clean)["json"]
    (tmp_path / "kept.json").write_bytes(kept)
    three = _written(tmp_path / "4", "4", "gate", demo, "--was", str(tmp_path / "kept.json"))
    for name in FORMATS:
        if name == "json":
            assert _timeless(one[name]) == _timeless(two[name]) == _timeless(three[name])
        else:
            assert one[name] == two[name] == three[name], name
