"""The text of `mend`: whole, the caution once and only where it belongs, hostile names."""

from __future__ import annotations

import unicodedata
from dataclasses import replace
from pathlib import Path

import pytest
from rich.cells import cell_len

from splitcheck import __version__
from splitcheck.report import mending
from splitcheck.verdict.findings import Finding, Miss, Proposal, Report

TEXTS = Path(__file__).parent / "texts"


def _proposal(what: str, added: float, words: str, *, isolation: bool = False) -> Proposal:
    return Proposal(
        what=what,  # type: ignore[arg-type]  # a word of the contract
        at_mm=((1.0, 2.0), (3.0, 4.0)),
        words=words,
        added_nh=added,
        error_nh=0.04 * added,
        noise_mv=30 * added,
        isolation=isolation,
    )


COPPER = _proposal("copper", 0.07, "copper of GND on Inner 1, 1 mm wide, under the trace")
ACROSS = _proposal("capacitor", 1.4, "a capacitor (0603) on Top from GND to VCC", isolation=True)


LITTLE = Miss("via", "2 tried, the best takes away only 1.3 %", 0.0132)
SAME = Miss("capacitor", "both sides are one net, GND")
FULL = Miss("move", "needs 7.80 mm towards +y, free room 7.25 mm")


def _without(report: Report, number: int, *misses: Miss) -> Report:
    changed: list[Finding] = list(report.findings)
    changed[number] = replace(changed[number], misses=misses)
    return replace(report, findings=tuple(changed))


def _with(report: Report, number: int, *proposals: Proposal) -> Report:
    changed: list[Finding] = list(report.findings)
    changed[number] = replace(changed[number], proposals=proposals)
    return replace(report, findings=tuple(changed))


def _plain(report: Report, width: int = 80, **asked: object) -> str:
    return mending.render(report, top=0, width=width, color=False, **asked)  # type: ignore[arg-type]


def test_the_whole_text(pump: Report) -> None:
    """Every word of it: two findings, one that nothing helps, and the caution at the end."""
    report = _without(_with(pump, 0, COPPER, ACROSS), 1, LITTLE, SAME, FULL)
    ids = [report.findings[0].id, report.findings[1].id]
    expected = (TEXTS / "mend.txt").read_text(encoding="utf-8").replace("VERSION", __version__)
    assert _plain(report, ids=ids) == expected


def test_the_caution_is_said_once_and_only_where_a_gap_may_be_a_barrier(pump: Report) -> None:
    """However many proposals may cross one."""
    both = _with(_with(pump, 0, ACROSS, ACROSS), 1, ACROSS)
    assert _plain(both).count("isolation barrier") == 1
    assert _plain(both).count("(!)") == 4  # three proposals, and the caution that names the mark
    assert "isolation" not in _plain(_with(pump, 0, COPPER))


def test_nothing_asked_is_said(pump: Report) -> None:
    """No finding, no proposals."""
    assert "Nothing to mend" in _plain(replace(pump, findings=()))


def test_the_threshold_is_told_only_where_something_fell_below_it(pump: Report) -> None:
    """Where nothing had room there was nothing to weigh; where something helps no way failed."""
    ids = [pump.findings[0].id]
    assert "less than 5 %" in _plain(_without(pump, 0, SAME, LITTLE), ids=ids)
    text = _plain(_without(pump, 0, SAME, FULL), ids=ids)
    assert "Nothing to propose. Capacitors: both sides are one net, GND; moving: needs" in text
    assert "less than 5 %" not in text
    assert "Nothing to propose" not in _plain(_with(pump, 0, COPPER), ids=ids)


def test_a_finding_that_no_way_is_known_for_says_so(pump: Report) -> None:
    """Nothing was tried: that is not the same as nothing that helps."""
    assert "no way to mend is known here" in _plain(pump, ids=[pump.findings[0].id])


@pytest.mark.parametrize("width", [20, 80, 140])
def test_no_line_is_wider_than_the_page_and_none_moves_the_cursor(pump: Report, width: int) -> None:
    """Names come from files."""
    nasty = "A\x1b[2J\u202e" + "\u7dda" * 300
    report = _with(pump, 0, replace(COPPER, words=f"copper of {nasty} on {nasty}"))
    finding = replace(report.findings[0], net=nasty, layer=nasty, plane_layer=nasty)
    missed = replace(finding, id="F2", proposals=(), misses=(replace(SAME, words=nasty),))
    ids = [finding.id, "F2"]
    text = _plain(replace(report, findings=(finding, missed), board=nasty), width, ids=ids)
    assert max(cell_len(line) for line in text.splitlines()) <= min(max(width, 80), 140)
    assert {unicodedata.category(c) for c in text if c != "\n"}.isdisjoint({"Cc", "Cf"})


def test_top_leaves_out_the_lesser_ones(pump: Report) -> None:
    """The best stays."""
    text = mending.render(_with(pump, 0, COPPER, ACROSS), top=1, width=80, color=False)
    assert "copper" in text
    assert "2. " not in text
