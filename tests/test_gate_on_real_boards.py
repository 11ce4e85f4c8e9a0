"""Two revisions of a real board: as its maker exported it, and with cuts planted in its planes."""

from __future__ import annotations

import json
import shutil
from math import dist
from pathlib import Path
from typing import Any

import pytest

from splitcheck.cli.entry import run
from splitcheck.copper.intake import open_export
from splitcheck.errors import SplitcheckError
from tests.making.cuts import PlantedCut, choose_cuts, plant

WANTED = 12
#: How far the reported place may be from the cut, mm.
NEAR_MM = 0.5
#: A cut changes what crosses the same plane within some lengths of it, mm.
AROUND_MM = 8.0


def _with_names(corpus: Path) -> Path:
    """The shortest of the boards whose traces carry net names."""
    chosen = []
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        try:
            copper = open_export(folder).copper()
        except SplitcheckError:
            continue
        if len(copper) >= 4 and "%TO.N," in copper[0].text:
            chosen.append((sum(len(file.text) for file in copper), folder))
    return min(chosen)[1]


def _gate(new: Path, was: Path, out: Path) -> tuple[int, dict[str, Any]]:
    words = ["gate", str(new), "--was", str(was), "--quiet", "--out", f"json={out}"]
    code = run([*words, "--fail-at", "note"])
    return code, json.loads(out.read_text(encoding="utf-8"))


def _near(cuts: tuple[PlantedCut, ...], at: list[float], reach_mm: float) -> bool:
    return any(dist(cut.at, at) <= reach_mm for cut in cuts)


@pytest.mark.slow
def test_planted_cuts_are_new_and_nothing_else_is(corpus: Path, tmp_path: Path) -> None:
    """There: each cut is new or worse on its net. Back: what was new is gone. Again: as before."""
    whole = _with_names(corpus)
    spoiled = tmp_path / "board"
    shutil.copytree(whole, spoiled)
    cuts = choose_cuts(whole, WANTED, seed=3)
    plant(spoiled, cuts)
    kept = tmp_path / "kept.json"
    assert run(["rank", str(whole), "--fail-at", "never", "--quiet", "--out", f"json={kept}"]) == 0

    code, there = _gate(spoiled, kept, tmp_path / "there.json")
    assert code == 1
    changes = {c["finding"]: c for c in there["comparison"]["changes"] if c["finding"]}
    fresh = [f for f in there["findings"] if changes[f["id"]]["verdict"] in {"new", "worse"}]
    exempt = {row["name"] for row in there["nets"] if row["exempt"] is not None}
    judged = [cut for cut in cuts if cut.net not in exempt]
    assert len(judged) >= WANTED // 2
    for cut in judged:
        assert any(
            cut.net in finding["net"].split("|") and dist(cut.at, finding["at_mm"]) <= NEAR_MM
            for finding in fresh
        ), cut
    strangers = [f for f in fresh if not _near(cuts, f["at_mm"], AROUND_MM)]
    assert strangers == []

    _, back = _gate(kept, tmp_path / "there.json", tmp_path / "back.json")
    forth, return_ = there["comparison"]["by_verdict"], back["comparison"]["by_verdict"]
    assert (return_["gone"], return_["new"]) == (forth["new"], forth["gone"])
    assert forth["new"] + forth["worse"] >= len(judged)

    code, again = _gate(tmp_path / "there.json", tmp_path / "there.json", tmp_path / "again.json")
    assert code == 0
    assert again["comparison"]["by_verdict"]["unchanged"] == len(there["findings"])
