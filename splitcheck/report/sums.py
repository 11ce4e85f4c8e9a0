"""Nets whose places add up: those that rank higher by their sum than by their worst place."""

from __future__ import annotations

from collections.abc import Sequence
from math import inf

from splitcheck.report.page import Column, Page
from splitcheck.report.words import number, plural
from splitcheck.verdict.findings import NetRow

_COLUMNS = (
    Column("net", gives=True),
    Column("places", "right"),
    Column("worst\nnH", "right"),
    Column("sum\nnH", "right"),
)
_SHOWN = 5


def higher_by_sum(nets: Sequence[NetRow]) -> tuple[NetRow, ...]:
    """Nets that more others are worse than by their worst place than by their sum, largest first.

    A net with no way back somewhere has no sum, and is worse than any number.
    """
    worst = {net.name: inf if net.sum_nh is None else net.worst_added_nh or 0.0 for net in nets}
    sums = {net.name: inf if net.sum_nh is None else net.sum_nh for net in nets}
    found = [
        net
        for net in nets
        if net.findings > 1
        and net.sum_nh is not None
        and sum(value > sums[net.name] for value in sums.values())
        < sum(value > worst[net.name] for value in worst.values())
    ]
    return tuple(sorted(found, key=lambda net: (-sums[net.name], net.name)))


def say_sums(page: Page, nets: Sequence[NetRow]) -> None:
    """Write the nets that matter more by their sum, if there are any."""
    found = higher_by_sum([net for net in nets if net.findings])
    if not found:
        return
    page.heading("Nets by sum, where that ranks them higher than their worst place")
    rows = [
        (net.name, str(net.findings), number(net.worst_added_nh or 0.0), number(net.sum_nh or 0.0))
        for net in found[:_SHOWN]
    ]
    page.table(_COLUMNS, rows)
    if len(found) > _SHOWN:
        page.say(f"and {plural(len(found) - _SHOWN, 'more net')}: the JSON has all sums")
