"""The options that several commands share, each with its help text."""

from __future__ import annotations

from math import isfinite
from pathlib import Path
from typing import Annotated, Literal, TypeAlias

import typer

from splitcheck.cli import streams
from splitcheck.errors import SplitcheckError

FailAt: TypeAlias = Literal["error", "warning", "note", "never"]

EXIT_CODES = """
Exit codes:
  0  nothing at or above the threshold of --fail-at
  1  findings at or above it
  2  the input or the call is at fault: one line says what and where
  3  our own crash: run again with --debug and report it
"""


def ending(*examples: str) -> str:
    """What stands under a help text; the backspace tells the formatter to keep the line ends."""
    shown = "".join(f"\n  {example}" for example in examples)
    return f"\b\nExamples:{shown}\n\n\b{EXIT_CODES}"


def check_min_nh(min_nh: float) -> None:
    """Complain of a threshold that is no inductance."""
    if not isfinite(min_nh) or min_nh < 0:
        raise SplitcheckError(
            f"--min-nh {min_nh}", "this is no inductance", "give 0 or more, in nH"
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
Rules = Annotated[
    Path | None,
    typer.Option(
        "--rules",
        metavar="FILE.toml",
        help="Rules of this board: classes, references, waivers. Else the splitcheck.toml beside "
        "the export or in the current directory.",
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
        help="Also write the whole result as text, json, sarif, junit, codequality, annotations, "
        "markdown, csv or html; FILE - is stdout, and then everything else goes to stderr. "
        "Repeatable.",
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
