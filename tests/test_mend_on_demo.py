"""The best proposal for each fault of the demo board, carried out and judged by the whole road."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
import shapely

from fixtures.making.write import write_board
from fixtures.tide_logger import tide_logger
from splitcheck import road
from splitcheck.planes.tracks import redrawn
from splitcheck.verdict.findings import Finding, Proposal
from splitcheck.verdict.proposals.case import beside_worth
from tests.making.mended import mended, nearest

NETS = (*(f"D{bit}" for bit in range(8)), "LCD_E", "SDA", "RTC_CLK", "BUZZ")
OPTIONS = road.Options(jobs=1)


@pytest.fixture(scope="module")
def walked() -> road.Walked:
    """The demo board with its faults."""
    return road.look(road.fixtures_folder() / "demo", OPTIONS)


def _best(walked: road.Walked, net: str) -> tuple[Finding, Proposal]:
    (finding,) = (f for f in walked.report.findings if f.net == net)
    found = next(f for f in road.mend(walked, [finding.id]).findings if f.net == net)
    return finding, found.proposals[0]


def _beside(before: road.Walked, after: road.Walked, finding: Finding) -> float:
    """What gaps right beside the trace add now that none is crossed, by the same solve."""
    item = before.judged.weighed.get(finding.id)
    if item is None:
        return 0.0
    tracks = next(t for t in after.seen.tracks if t.layer == item.crossing.layer)
    numbers = {net.name: net.number for net in after.scene.board.nets}
    own = redrawn(tracks, numbers[finding.net])
    lines = shapely.linestrings(list(zip(own.start.tolist(), own.end.tolist(), strict=True)))
    x, y = finding.at_mm
    there = shapely.union_all(lines).intersection(shapely.box(x - 9, y - 2.5, x + 9, y + 2.5))
    return beside_worth(after.scene, item, own, there).added_nh


@pytest.mark.slow
@pytest.mark.parametrize("net", NETS)
def test_best_proposal_does_what_it_says(walked: road.Walked, net: str, tmp_path: Path) -> None:
    """Carried out on the plan, written as Gerber files and ranked: within 10 % of its promise."""
    finding, proposal = _best(walked, net)
    plan = mended(tide_logger(faulty=True), finding, proposal)
    write_board(plan, tmp_path)
    after = road.look(tmp_path, OPTIONS)
    left = nearest(after.report.findings, finding, 10.0)
    measured = _beside(walked, after, finding) if left is None else left.added_nh
    assert measured is not None
    assert proposal.added_nh == pytest.approx(measured, rel=0.10, abs=0.003)
    assert finding.added_nh is None or measured < 0.95 * finding.added_nh
    told = re.search(r"near it over this gap (\S+) nH left", proposal.words)
    assert (told is not None) == (finding.kind == "split-crossing")  # the bus D0 to D7
    if told is not None:
        bus = [f.added_nh or 0.0 for f in after.report.findings if f.kind == "split-crossing"]
        assert len(bus) == 8
        assert float(told[1]) == pytest.approx(sum(bus), rel=0.10)
    before = {(f.net, f.kind) for f in walked.report.findings}
    assert {(f.net, f.kind) for f in after.report.findings} <= before
