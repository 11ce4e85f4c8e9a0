"""What a command does with its result: files, the text for a person, the exit code."""

from __future__ import annotations

import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Protocol, TypeAlias

from splitcheck.cli import streams, targets
from splitcheck.cli.options import FailAt
from splitcheck.report import locate, tally
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import LEVELS, Report
from splitcheck.verdict.views import Pictures

#: Columns of a text report that goes to a file.
FILE_WIDTH = 100
#: A text file of the repository that hosts can show where they do not have the export itself.
ANCHOR = "splitcheck.toml"


#: Draws the board, and says what the drawing shows: the report, with proposals for the worst.
Draw: TypeAlias = Callable[[], tuple[Report, Pictures]]


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
    path: Path | None = None,
    comparison: Comparison | None = None,
    draw: Draw | None = None,
) -> None:
    """Deliver every ``--out``, then the text for the person before the screen.

    That text leaves standard output to a result that goes there, and is not said twice.

    Parameters
    ----------
    path
        What was read: hosts are pointed to the files in it.
    comparison
        What became of an earlier revision, if there is one.
    draw
        Draws the board, if a format asks for it.
    """
    taken = next((target for target in wanted if target.is_stdout), None)
    if not quiet and (taken is None or taken.format != "text"):
        stream = sys.stdout if taken is None else sys.stderr
        width = streams.width_for(stream)
        shown = render(report, top=top, width=width, color=streams.color_for(color, stream))
        streams.put(shown, stream)
    for target in wanted:
        if target.format in targets.DRAWN:
            assert draw is not None  # no other command lets such a format pass
            illustrated, pictures = draw()
            targets.deliver(target, target.drawer()(illustrated, comparison, pictures))
            continue
        if target.format != "text":
            told = located(report, path) if target.format in targets.HOSTED else report
            targets.deliver(target, target.renderer()(told, comparison))
            continue
        wide = streams.width_for(sys.stdout) if target.is_stdout else FILE_WIDTH
        colored = target.is_stdout and streams.color_for(color, sys.stdout)
        targets.deliver(target, render(report, top=0, width=wide, color=colored))


def located(report: Report, path: Path | None) -> Report:
    """The report with places that a host can show, seen from the folder the command runs in.

    1. A folder of exports in it: the Gerber file and the line that draws the trace.
    2. Anything else (a zip, an artefact kept elsewhere, a report): ``splitcheck.toml`` if it is
       there, a file that reviewers know and a host can show.
    3. Else the Gerber file as the export calls it.
    """
    here = Path.cwd().resolve()
    folder = None if path is None else path.resolve()
    if folder is not None and path is not None and path.suffix.lower() == ".gbrjob":
        folder = folder.parent
    if folder is not None and folder.is_dir() and folder.is_relative_to(here):
        inner = folder.relative_to(here).as_posix()
        return locate.in_folder(report, "" if inner == "." else inner)
    if (here / ANCHOR).is_file():
        return locate.at_file(report, ANCHOR)
    return report


def exit_code(report: Report, fail_at: FailAt, comparison: Comparison | None = None) -> int:
    """1 if a finding that counts is at or above the threshold, else 0.

    Waived findings never count; against an earlier revision only those that are new or worse do.
    """
    if fail_at == "never":
        return 0
    if comparison is not None:
        return int(bool(comparison.failing(fail_at)))
    counted = LEVELS[: LEVELS.index(fail_at) + 1]
    return int(any(finding.level in counted for finding in tally.standing(report.findings)))
