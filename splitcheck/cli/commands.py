"""The commands and their options; each calls the road once and hands its report on.

The road and the renderers are imported inside the commands: ``--help`` must not wait for them.
"""

from __future__ import annotations

import shlex
import sys
from collections.abc import Sequence
from math import isfinite
from pathlib import Path
from typing import Annotated, Literal, Protocol, TypeAlias

import typer

from splitcheck import __version__
from splitcheck.cli import streams, targets
from splitcheck.errors import SplitcheckError
from splitcheck.report import jsonfile, tally
from splitcheck.verdict.findings import LEVELS, Report

FailAt: TypeAlias = Literal["error", "warning", "note", "never"]

_EXIT_CODES = """
Exit codes:
  0  nothing at or above the threshold of --fail-at
  1  findings at or above it
  2  the input or the call is at fault: one line says what and where
  3  our own crash: run again with --debug and report it
"""

#: Columns of a text report that goes to a file.
FILE_WIDTH = 100


def _ending(*examples: str) -> str:
    """What stands under a help text; the backspace tells the formatter to keep the line ends."""
    shown = "".join(f"\n  {example}" for example in examples)
    return f"\b\nExamples:{shown}\n\n\b{_EXIT_CODES}"


app = typer.Typer(
    name="splitcheck",
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog=_ending("splitcheck demo --run", "splitcheck rank gerbers/", "splitcheck rank --help"),
)

BoardPath = Annotated[
    Path, typer.Argument(metavar="PATH", help="Folder, .zip or job file of an export.")
]
Nets = Annotated[
    list[str] | None,
    typer.Option(
        "--net",
        metavar="GLOB",
        help='Judge only nets of this name; * and ? stand for any text, as in "DDR_*". Repeatable.',
    ),
]
Layers = Annotated[
    list[str] | None,
    typer.Option("--layer", metavar="NAME", help="Judge only traces on this layer. Repeatable."),
]
Top = Annotated[
    int, typer.Option("--top", metavar="N", min=0, help="Rows the text shows; 0 shows all.")
]
MinNh = Annotated[
    float, typer.Option("--min-nh", metavar="X", help="Leave out what adds less than X nH.")
]
Stack = Annotated[
    Path | None,
    typer.Option(
        "--stack",
        metavar="FILE.toml",
        help="Layers, thicknesses and polarity, where the files do not say them or say them wrong.",
    ),
]
FailLevel = Annotated[
    FailAt,
    typer.Option(
        "--fail-at",
        metavar="error|warning|note|never",
        help="Lowest level that makes the exit code 1; never keeps it 0.",
    ),
]
Jobs = Annotated[
    int | None,
    typer.Option(
        "--jobs", metavar="N", min=1, help="Processes that read files; all cores if not given."
    ),
]
Out = Annotated[
    list[str] | None,
    typer.Option(
        "--out",
        metavar="FORMAT=FILE",
        help="Also write the whole result as text or json; FILE - is stdout, and then everything "
        "else goes to stderr. Repeatable.",
    ),
]
Quiet = Annotated[
    bool, typer.Option("-q", "--quiet", help="No progress and no report, only --out and errors.")
]
ColorFlag = Annotated[
    streams.Color,
    typer.Option(
        "--color",
        metavar="auto|always|never",
        help="Colour; auto asks, in this order, NO_COLOR, FORCE_COLOR or CLICOLOR_FORCE, "
        "CLICOLOR=0 or TERM=dumb, then whether it is a terminal.",
    ),
]
Debug = Annotated[bool, typer.Option("--debug", help="Show the traceback behind an error.")]


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
    epilog=_ending(
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
    from splitcheck import road
    from splitcheck.report import terminal

    if not isfinite(min_nh) or min_nh < 0:
        raise SplitcheckError(
            f"--min-nh {min_nh}", "this is no inductance", "give 0 or more, in nH"
        )
    wanted = targets.parse(out or (), path)
    options = road.Options(tuple(net or ()), tuple(layer or ()), min_nh, stack, jobs)
    with streams.progress_bar(quiet=quiet) as progress:
        report = road.rank(path, options, progress)
    _show(report, terminal.render, wanted, top=top, quiet=quiet, color=color)
    raise typer.Exit(exit_code(report, fail_at))


@app.command(
    epilog=_ending(
        "splitcheck read gerbers/", "splitcheck read board.zip --stack stack.toml --top 0"
    )
)
def read(
    path: BoardPath,
    top: Top = 20,
    stack: Stack = None,
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

    wanted = targets.parse(out or (), path)
    options = road.Options(stack=stack, jobs=jobs)
    with streams.progress_bar(quiet=quiet) as progress:
        report = road.read(path, options, progress)
    _show(report, readout.render, wanted, top=top, quiet=quiet, color=color)


@app.command(epilog=_ending("splitcheck demo", "splitcheck demo /tmp/board --run"))
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
    _show(report, terminal.render, (), top=0, quiet=False, color=color)
    code = exit_code(report, "error")
    streams.put(f"\nThis was  {command}\nwhich ends with exit code {code}.\n", sys.stdout)


class Render(Protocol):
    """A way of showing a report as text."""

    def __call__(self, report: Report, *, top: int, width: int, color: bool) -> str:
        """Write the report as text of this width."""


def _show(
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
