"""What a command does with its result: files, the text for a person, the exit code."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import Protocol

from splitcheck.cli import streams, targets
from splitcheck.cli.options import FailAt
from splitcheck.report import jsonfile, tally
from splitcheck.verdict.findings import LEVELS, Report

#: Columns of a text report that goes to a file.
FILE_WIDTH = 100


class Render(Protocol):
    """A way of showing a report as text."""

    def __call__(self, report: Report, *, top: int, width: int, color: bool) -> str:
        """Write the report as text of this width."""


def show(
    report: Report,
    render: Render,
    wanted: Sequence[targets.Target],
    *,
    top: int,
    quiet: bool,
    color: streams.Color,
) -> None:
    """Deliver every ``--out``, then the text for the person before the screen.

    That text leaves standard output to a result that goes there, and is not said twice.
    """
    taken = next((target for target in wanted if target.is_stdout), None)
    if not quiet and (taken is None or taken.format != "text"):
        stream = sys.stdout if taken is None else sys.stderr
        width = streams.width_for(stream)
        shown = render(report, top=top, width=width, color=streams.color_for(color, stream))
        streams.put(shown, stream)
    for target in wanted:
        if target.format == "json":
            targets.deliver(target, jsonfile.render(report))
            continue
        wide = streams.width_for(sys.stdout) if target.is_stdout else FILE_WIDTH
        colored = target.is_stdout and streams.color_for(color, sys.stdout)
        targets.deliver(target, render(report, top=0, width=wide, color=colored))


def exit_code(report: Report, fail_at: FailAt) -> int:
    """1 if a finding that nobody has waived is at or above the threshold, else 0."""
    if fail_at == "never":
        return 0
    counted = LEVELS[: LEVELS.index(fail_at) + 1]
    return int(any(finding.level in counted for finding in tally.standing(report.findings)))
