"""The commands and their options; each calls the road once and hands its report on.

The road and the renderers are imported inside the commands: ``--help`` must not wait for them.
"""

from __future__ import annotations

import shlex
import sys
from pathlib import Path
from typing import Annotated

import typer

from splitcheck import __version__
from splitcheck.cli import results, streams, targets, walking
from splitcheck.cli.options import (
    BoardPath,
    ColorFlag,
    Debug,
    FailLevel,
    Jobs,
    Layers,
    MinNh,
    Nets,
    Out,
    Quiet,
    Rules,
    Stack,
    Top,
    ending,
)

app = typer.Typer(
    name="splitcheck",
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog=ending("splitcheck demo --run", "splitcheck rank gerbers/", "splitcheck rank --help"),
)


def _version(wanted: bool) -> None:
    if wanted:
        streams.put(f"splitcheck {__version__}\n", sys.stdout)
        raise typer.Exit


@app.callback()
def splitcheck(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_version, is_eager=True, help="Show the version."),
    ] = False,
) -> None:
    """Find where the return current of a trace is broken by a cut in its reference plane.

    From exported Gerber files alone: each place with its net, gap, detour and added inductance.
    """


@app.command(
    epilog=ending(
        "splitcheck rank gerbers/",
        'splitcheck rank board.zip --net "DDR_*" --top 5',
        "splitcheck rank gerbers/ --fail-at warning --out json=report.json",
        "splitcheck rank gerbers/ --out json=- --quiet | python3 -m json.tool",
    )
)
def rank(
    path: BoardPath,
    net: Nets = None,
    layer: Layers = None,
    top: Top = 20,
    min_nh: MinNh = 0.05,
    stack: Stack = None,
    rules: Rules = None,
    fail_at: FailLevel = "error",
    jobs: Jobs = None,
    out: Out = None,
    quiet: Quiet = False,
    color: ColorFlag = "auto",
    debug: Debug = False,
) -> None:
    """Rank the broken return paths of a board, worst first.

    One row a gap, with its worst net: what the return current must walk more, what that adds in
    nH, what it makes in mV. Only traces and planes that the files hold are judged.
    """
    from splitcheck.report import terminal

    options = walking.asked(
        net=net, layer=layer, min_nh=min_nh, stack=stack, rules=rules, jobs=jobs
    )
    wanted = targets.parse(out or (), path)
    report, draw = walking.ranked(path, options, quiet=quiet, drawn=targets.are_drawn(wanted))
    results.show(
        report,
        terminal.render,
        wanted,
        top=top,
        quiet=quiet,
        color=color,
        path=path,
        draw=draw,
    )
    raise typer.Exit(results.exit_code(report, fail_at))


@app.command(
    epilog=ending(
        "splitcheck read gerbers/", "splitcheck read board.zip --stack stack.toml --top 0"
    )
)
def read(
    path: BoardPath,
    top: Top = 20,
    stack: Stack = None,
    rules: Rules = None,
    jobs: Jobs = None,
    out: Out = None,
    quiet: Quiet = False,
    color: ColorFlag = "auto",
    debug: Debug = False,
) -> None:
    """Show how the files were understood.

    Layers, stack, islands of the planes, nets, and every assumption that changes results.
    """
    from splitcheck import road
    from splitcheck.report import readout

    wanted = targets.parse(out or (), path, known=targets.TOLD)
    options = walking.asked(stack=stack, rules=rules, jobs=jobs)
    with streams.progress_bar(quiet=quiet) as progress:
        report = road.read(path, options, progress)
    results.show(report, readout.render, wanted, top=top, quiet=quiet, color=color)


@app.command(epilog=ending("splitcheck demo", "splitcheck demo /tmp/board --run"))
def demo(
    folder: Annotated[
        Path, typer.Argument(metavar="[FOLDER]", help="Where to write the board.")
    ] = Path("splitcheck-demo"),
    run: Annotated[bool, typer.Option("--run", help="Rank it at once.")] = False,
    color: ColorFlag = "auto",
    debug: Debug = False,
) -> None:
    """Write the demo board to a folder.

    An invented board of four layers with faults planted in its planes.
    """
    from splitcheck import road
    from splitcheck.report import terminal

    board = road.write_demo(folder)
    command = f"splitcheck rank {shlex.quote(str(board))}"
    if not run:
        streams.put(f"The demo board is in {board}\nNext, type:  {command}\n", sys.stdout)
        return
    with streams.progress_bar(quiet=False) as progress:
        report = road.rank(board, road.Options(), progress)
    results.show(report, terminal.render, (), top=0, quiet=False, color=color)
    code = results.exit_code(report, "error")
    streams.put(f"\nThis was  {command}\nwhich ends with exit code {code}.\n", sys.stdout)
