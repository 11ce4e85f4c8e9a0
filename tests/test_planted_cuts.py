"""Every cut made on purpose under a trace is found, on that net and at that place."""

from __future__ import annotations

import shutil
from math import dist
from pathlib import Path

import pytest
from shapely import LineString, Point

from splitcheck.copper.intake import open_export
from splitcheck.errors import SplitcheckError
from splitcheck.verdict.packs import shipped_rules
from splitcheck.verdict.rulesfile import RULES_FILE
from tests.making.cuts import PlantedCut, choose_cuts, plant
from tests.making.running import Outcome, rank

CLEAN = Path(__file__).parent.parent / "fixtures" / "demo_clean"
WANTED = 50
#: Rules that exempt no class of nets: cuts lie under lamps and enables as well.
ALL_AWAKE = "".join(
    f"[class.{one.name}]\nexempt = false\n" for one in shipped_rules().classes if one.exempt
)
#: How far the reported place may be from the cut, mm.
NEAR_MM = 0.5


def _missed(outcome: Outcome, cuts: tuple[PlantedCut, ...]) -> list[PlantedCut]:
    files = {row["name"]: row["file"] for row in outcome.report["board"]["layers"]}
    return [
        cut
        for cut in cuts
        if not any(
            cut.net in finding["net"].split("|")
            and files.get(finding["plane_layer"]) == cut.plane_file
            and dist(finding["at_mm"], cut.at) <= NEAR_MM
            for finding in outcome.findings
        )
    ]


def _planted(folder: Path, tmp_path: Path, seed: int) -> tuple[Path, tuple[PlantedCut, ...]]:
    cuts = choose_cuts(folder, WANTED, seed)
    spoiled = tmp_path / f"{folder.name}-{seed}"
    shutil.copytree(folder, spoiled)
    plant(spoiled, cuts)
    (spoiled / RULES_FILE).write_text(ALL_AWAKE, encoding="utf-8")
    return spoiled, cuts


@pytest.mark.parametrize("seed", [1, 2])
def test_every_cut_planted_in_the_clean_twin_is_found(tmp_path: Path, seed: int) -> None:
    """The demo's twin, which shows nothing, shows each of its cuts and nothing anywhere else."""
    folder, cuts = _planted(CLEAN, tmp_path, seed)
    assert len(cuts) == WANTED
    outcome = rank(folder)
    assert _missed(outcome, cuts) == []
    lines = [LineString(cut.ends) for cut in cuts]
    for finding in outcome.findings:
        assert min(line.distance(Point(finding["at_mm"])) for line in lines) <= NEAR_MM, finding


def _boards_with_names(corpus: Path) -> list[Path]:
    """Boards of four copper layers or more whose traces carry net names, the shortest first."""
    chosen = []
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        try:
            copper = open_export(folder).copper()
        except SplitcheckError:
            continue
        if len(copper) >= 4 and "%TO.N," in copper[0].text:
            chosen.append((sum(len(file.text) for file in copper), folder))
    return [folder for _, folder in sorted(chosen)]


@pytest.mark.slow
def test_every_cut_planted_in_real_boards_is_found(corpus: Path, tmp_path: Path) -> None:
    """Fifty cuts each in three boards as their makers exported them."""
    tried = 0
    for folder in _boards_with_names(corpus):
        if tried == 3:
            break
        spoiled, cuts = _planted(folder, tmp_path, seed=1)
        if len(cuts) < WANTED:
            continue
        tried += 1
        assert _missed(rank(spoiled), cuts) == [], folder.name
    assert tried == 3
