"""A comparison made by hand over the one small report, with every verdict in it."""

from __future__ import annotations

from dataclasses import replace

from splitcheck.verdict.changes import Change, Comparison, Move
from splitcheck.verdict.findings import Report
from tests.report import made


def compared(report: Report) -> Comparison:
    """BUS0 is new, BUS1 worse, BUS2 better, FAN gone, all others as before; moved by 5 mm."""
    first, second, third, *rest = report.findings
    fan = made.finding(9, "FAN", at_mm=(60.0, 10.0))
    was = replace(second, added_nh=0.8, noise_mv=32.0, level="warning")
    worst = replace(third, added_nh=3.0, noise_mv=120.0, level="error")
    changes = (
        Change("new", "", first, None),
        Change("worse", "0.800 to 1.61 nH", second, was),
        Change("better", "3.00 to 1.07 nH", third, worst),
        Change("gone", "", None, fan),
        *(Change("unchanged", "", finding, finding) for finding in rest),
    )
    earlier = replace(report, findings=(was, worst, *rest, fan))
    move = Move(0.0, (5.0, 0.0))
    return Comparison(earlier, move, changes, ("The board was moved by (5.00, 0.00) mm.",))
