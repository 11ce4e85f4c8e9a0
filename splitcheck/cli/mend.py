"""The command ``mend``: what could be done about the worst findings, or about those named."""

from __future__ import annotations

from functools import partial
from typing import Annotated

import typer

from splitcheck.cli import results, streams, targets, walking
from splitcheck.cli.commands import app
from splitcheck.cli.options import (
    BoardPath,
    ColorFlag,
    Debug,
    Jobs,
    Layers,
    MinNh,
    Nets,
    Out,
    Quiet,
    Rules,
    Stack,
    ending,
)

Findings = Annotated[
    list[str] | None,
    typer.Argument(
        metavar="[FINDING...]", help="Ids of findings as `rank` numbers them, such as F3."
    ),
]
Worst = Annotated[
    int,
    typer.Option(
        "--worst",
        metavar="N",
        min=1,
        help="If no finding is named, mend the worst finding of the N worst gaps.",
    ),
]


@app.command(
    epilog=ending(
        "splitcheck mend gerbers/",
        "splitcheck mend gerbers/ F2 F7",
        "splitcheck mend board.zip --worst 10 --out json=mended.json",
    )
)
def mend(
    path: BoardPath,
    finding: Findings = None,
    worst: Worst = 3,
    net: Nets = None,
    layer: Layers = None,
    min_nh: MinNh = 0.05,
    stack: Stack = None,
    rules: Rules = None,
    jobs: Jobs = None,
    out: Out = None,
    quiet: Quiet = False,
    color: ColorFlag = "auto",
    debug: Debug = False,
) -> None:
    """Propose what would mend findings; it edits nothing.

    Stitching vias, capacitors, bridges of copper and moved traces, where there is room, each with
    what is left of the added nH and mV, found by the same solve. Ends with 0 whatever it finds.
    """
    from splitcheck import road
    from splitcheck.report import mending
    from splitcheck.report.tally import worst_ids

    options = walking.asked(
        net=net, layer=layer, min_nh=min_nh, stack=stack, rules=rules, jobs=jobs
    )
    wanted = targets.parse(out or (), path)
    with streams.progress_bar(quiet=quiet) as progress:
        walked = road.look(path, options, progress)
        ids = tuple(finding or worst_ids(walked.report, worst))
        report = road.mend(walked, ids)
    render = partial(mending.render, ids=ids)
    results.show(
        report,
        render,
        wanted,
        top=0,
        quiet=quiet,
        color=color,
        path=path,
        draw=lambda: (report, road.picture(walked, options)),
    )
