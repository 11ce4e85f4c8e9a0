"""The block of nets by sum: only where the order by worst place hides something."""

from __future__ import annotations

from dataclasses import replace

from splitcheck.report import terminal
from splitcheck.report.sums import higher_by_sum
from splitcheck.verdict.findings import NetRow, Report


def _net(name: str, findings: int, worst: float | None, total: float | None) -> NetRow:
    return NetRow(name, "default", 10.0, ("L1",), findings, worst, sum_nh=total)


def test_many_small_places_overtake_one_larger() -> None:
    """A: three of 1 nH; B: one of 2. By worst place B leads, by sum A."""
    nets = [_net("A", 3, 1.0, 3.0), _net("B", 1, 2.0, 2.0)]
    assert [net.name for net in higher_by_sum(nets)] == ["A"]


def test_one_place_each_says_nothing_new() -> None:
    """Nor do several places of the net that leads anyway, nor what has no way back."""
    assert higher_by_sum([_net("A", 1, 1.0, 1.0), _net("B", 1, 2.0, 2.0)]) == ()
    assert higher_by_sum([_net("A", 2, 3.0, 4.0), _net("B", 1, 2.0, 2.0)]) == ()
    assert higher_by_sum([_net("A", 2, None, None), _net("B", 1, 2.0, 2.0)]) == ()


def test_the_block_is_in_the_text_only_then(pump: Report) -> None:
    """And hostile names are shown as they are shown elsewhere."""
    nets = (_net("A\x1b[31m", 3, 1.0, 3.0), _net("B", 1, 2.0, 2.0))
    text = terminal.render(replace(pump, nets=nets), top=20, width=80, color=False)
    assert "Nets by sum" in text
    assert "\x1b" not in text
    text = terminal.render(replace(pump, nets=nets[1:]), top=20, width=80, color=False)
    assert "Nets by sum" not in text
