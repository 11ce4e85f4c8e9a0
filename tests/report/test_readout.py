"""How the files were understood, as text."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from splitcheck import __version__
from splitcheck.report import readout
from splitcheck.verdict.findings import Report

TEXTS = Path(__file__).parent / "texts"


def test_the_whole_readout(pump: Report) -> None:
    """Every word of it."""
    expected = (TEXTS / "read.txt").read_text(encoding="utf-8").replace("VERSION", __version__)
    assert readout.render(pump, top=4, width=80, color=False) == expected


def test_top_0_lists_everything(pump: Report) -> None:
    """All nets and islands are there."""
    text = readout.render(pump, top=0, width=80, color=False)
    assert all(net.name in text for net in pump.nets)
    assert all(island.id in text for island in pump.islands)
    assert "--top 0" not in text


def test_an_empty_board_says_none(pump: Report) -> None:
    """Every part of the page stays, and says that it is empty."""
    empty = replace(pump, layers=(), inputs=(), islands=(), nets=(), facts=(), remarks=())
    assert readout.render(empty, top=0, width=80, color=False).count("  None.\n") == 6
