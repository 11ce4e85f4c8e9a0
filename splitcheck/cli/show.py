"""The command ``show``: one finding in depth, or the journey of one net."""

from __future__ import annotations

import sys
from difflib import get_close_matches
from typing import TYPE_CHECKING, Annotated, TextIO

import typer

from splitcheck.cli import streams, targets, walking
from splitcheck.cli.commands import app
from splitcheck.cli.options import (
    BoardPath,
    ColorFlag,
    Debug,
    Jobs,
    MinNh,
    Quiet,
    Rules,
    Stack,
    ending,
)
from splitcheck.errors import SplitcheckError
from splitcheck.report.words import shorten

if TYPE_CHECKING:
    from splitcheck.verdict.findings import Finding, NetRow, Report
    from splitcheck.verdict.views import FindingView

#: What it draws.
FORMATS = ("svg", "png")

What = Annotated[
    str,
    typer.Argument(
        metavar="FINDING_OR_NET", help="Id of a finding, such as F3, or the name of a net."
    ),
]
Drawn = Annotated[
    list[str] | None,
    typer.Option(
        "--out",
        metavar="FORMAT=FILE",
        help="Also write a figure of the finding as svg or png (png: install splitcheck[png]); "
        "FILE - is stdout. Repeatable.",
    ),
]


@app.command(
    epilog=ending(
        "splitcheck show F1 gerbers/",
        "splitcheck show F3 board.zip --out svg=f3.svg",
        "splitcheck show SPI_CLK gerbers/",
    )
)
def show(
    what: What,
    path: BoardPath,
    min_nh: MinNh = 0.05,
    stack: Stack = None,
    rules: Rules = None,
    jobs: Jobs = None,
    out: Drawn = None,
    quiet: Quiet = False,
    color: ColorFlag = "auto",
    debug: Debug = False,
) -> None:
    """Show one finding in depth, or the journey of one net.

    Numbers, why it was taken for a crossing, a small picture, what was assumed. Ends with 0.
    """
    from splitcheck import road

    wanted = targets.parse(out or (), path, known=FORMATS)
    options = walking.asked(min_nh=min_nh, stack=stack, rules=rules, jobs=jobs)
    with streams.progress_bar(quiet=quiet) as progress:
        walked = road.look(path, options, progress)
        found = _found(walked.report, what)
        view = None
        if isinstance(found, str):
            view = road.picture(walked, options, only=[found]).of(found)
    if isinstance(found, str):
        finding = next(f for f in walked.report.findings if f.id == found)
        _finding(walked.report, finding, view, wanted, quiet=quiet, color=color)
    else:
        _net(walked.report, found, wanted, quiet=quiet, color=color)


def _found(report: Report, what: str) -> str | NetRow:
    """The id of the finding that is meant, or the net."""
    ids = {finding.id.upper(): finding.id for finding in report.findings}
    if what.upper() in ids and all(net.name != what for net in report.nets):
        return ids[what.upper()]
    for net in report.nets:
        if net.name == what:
            return net
    names = [*ids.values(), *(net.name for net in report.nets)]
    near = get_close_matches(what, names, n=3, cutoff=0.5)
    count = len(report.findings)
    known = f"findings are F1 to F{count}" if count else "nothing was found"
    do = f"try {', '.join(shorten(name, 40) for name in near)}" if near else known
    wrong = "this is neither a finding of this board nor a net of it"
    raise SplitcheckError(shorten(what, 60), wrong, do)


def _finding(
    report: Report,
    finding: Finding,
    view: FindingView | None,
    wanted: tuple[targets.Target, ...],
    *,
    quiet: bool,
    color: streams.Color,
) -> None:
    from splitcheck.report import figure, indepth, pngfile

    if wanted and view is None:
        wrong = f"{finding.id} lies over no plane, so that there is no gap to draw"
        raise SplitcheckError(f"--out {wanted[0].format}", wrong, "leave --out away")
    if not quiet:
        stream = _stream(wanted)
        width, colored = streams.width_for(stream), streams.color_for(color, stream)
        streams.put(indepth.of_finding(report, finding, view, width=width, color=colored), stream)
    for target in wanted:
        assert view is not None
        svg = figure.render(finding, view)
        targets.deliver(target, svg if target.format == "svg" else pngfile.render(svg))


def _net(
    report: Report,
    net: NetRow,
    wanted: tuple[targets.Target, ...],
    *,
    quiet: bool,
    color: streams.Color,
) -> None:
    from splitcheck.report import indepth

    if wanted:
        wrong = "a net has no figure of its own"
        raise SplitcheckError(f"--out {wanted[0].format}", wrong, "name one of its findings")
    if not quiet:
        width, colored = streams.width_for(sys.stdout), streams.color_for(color, sys.stdout)
        shown = indepth.of_net(net, report.findings, width=width, color=colored)
        streams.put(shown, sys.stdout)


def _stream(wanted: tuple[targets.Target, ...]) -> TextIO:
    """Standard output, unless a figure goes there."""
    return sys.stderr if any(target.is_stdout for target in wanted) else sys.stdout
