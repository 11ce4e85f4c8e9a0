"""Rows of the text report that only some kinds have: pairs, common mode, places that are shared."""

from __future__ import annotations

from dataclasses import replace

from splitcheck.report import terminal
from splitcheck.verdict.findings import Finding
from tests.report.made import finding, pump


def _text(*findings: Finding) -> str:
    report = replace(pump(), findings=findings)
    rendered = terminal.render(report, top=0, width=140, color=False)
    return " ".join(rendered.replace("\u00a0", " ").split())


def test_a_pair_is_one_row_that_names_both_legs() -> None:
    """Two findings that refer to one another: one row, with what they are worth together."""
    legs = [
        finding(n, net, level="note", pair=other, odd_nh=0.61, unbalance_nh=0.12, noise_mv=10.1)
        for n, net, other in ((1, "TX_P", "TX_N"), (2, "TX_N", "TX_P"))
    ]
    text = _text(*legs)
    assert "pair with TX_N: 0.610 nH in odd mode, 0.120 nH unbalanced" in text
    assert "2 nets over one gap (2 note): TX_P, TX_N" in text
    assert "pair with TX_P" not in text


def test_a_leg_that_is_judged_alone_says_only_whose_it_is() -> None:
    """Its legs never run side by side."""
    text = _text(finding(1, "TX_P", pair="TX_N"))
    assert "pair with TX_N" in text
    assert "odd mode" not in text


def test_an_edge_run_has_its_common_mode() -> None:
    """Apart from the loop."""
    runs = [finding(n, f"A{n}", kind="edge-run", common_nh=2.35) for n in (1, 2)]
    text = _text(*runs)
    assert "2.35 nH in common mode along the plane" in text
    assert "2 nets along one edge" in text


def test_nets_that_change_planes_together_share_a_place() -> None:
    """Not a gap."""
    text = _text(*(finding(n, f"A{n}", kind="plane-change", gap="change 1") for n in (1, 2, 3)))
    assert "3 nets changing planes at one place (3 error)" in text
