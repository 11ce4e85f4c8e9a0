"""The command that compares two revisions: for pull requests, which must not add what is broken."""

from __future__ import annotations

from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from splitcheck.cli import results, targets, walking
from splitcheck.cli.commands import app
from splitcheck.cli.options import (
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
from splitcheck.errors import SplitcheckError

if TYPE_CHECKING:
    from splitcheck.road import Options
    from splitcheck.verdict.findings import Report

#: No report is larger, bytes.
LARGEST_BYTES = 256_000_000


@app.command(
    epilog=ending(
        "splitcheck gate gerbers/ --was baseline.json",
        "splitcheck gate new.zip --was old.zip --fail-at warning",
        "splitcheck gate gerbers/ --was baseline.json --out annotations=- --quiet",
        "splitcheck rank gerbers/ --fail-at never --quiet --out json=baseline.json",
    )
)
def gate(
    new: Annotated[
        Path,
        typer.Argument(
            metavar="NEW", help="Folder, .zip or job file of an export, or a .json report of one."
        ),
    ],
    was: Annotated[
        Path | None,
        typer.Option(
            "--was",
            metavar="OLD",
            help="The earlier revision, the same kinds of things. Without it every finding is new.",
        ),
    ] = None,
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
    """Fail if a revision of a board has new or worse broken return paths.

    What the earlier revision had already does not count. Findings are known again where the board
    was moved or turned, nets or files were renamed, or a trace was shifted by some mm.
    """
    from splitcheck.report import gated
    from splitcheck.verdict.compare import compare

    options = walking.asked(
        net=net, layer=layer, min_nh=min_nh, stack=stack, rules=rules, jobs=jobs
    )
    boards = (new,) if was is None else (new, was)
    known = targets.TOLD if _is_kept(new) else targets.FORMATS
    wanted = targets.parse(out or (), *boards, known=known)
    old = None
    if was is not None:
        old, _ = _revision(was, options, "--was ", quiet=quiet)
    drawn = targets.are_drawn(wanted)
    report, draw = _revision(new, options, "", quiet=quiet, drawn=drawn)
    comparison = None if old is None else compare(old, report)
    render = partial(
        gated.render, comparison=comparison, fail_at=None if fail_at == "never" else fail_at
    )
    results.show(
        report,
        render,
        wanted,
        top=top,
        quiet=quiet,
        color=color,
        path=new,
        comparison=comparison,
        draw=draw,
    )
    raise typer.Exit(results.exit_code(report, fail_at, comparison))


def _revision(
    path: Path, options: Options, option: str, *, quiet: bool, drawn: bool = False
) -> tuple[Report, results.Draw | None]:
    """One revision, ranked now or read from a kept report; and what draws it, if that is asked."""
    if not path.exists():
        do = (
            "check out or unpack that revision, or keep a report of it: "
            "splitcheck rank PATH --fail-at never --out json=FILE"
        )
        raise SplitcheckError(f"{option}{path}", "there is no such file or folder", do)
    if _is_kept(path):
        return _kept(path), None
    return walking.ranked(path, options, quiet=quiet, drawn=drawn)


def _is_kept(path: Path) -> bool:
    return path.suffix.lower() == ".json" and path.is_file()


def _kept(path: Path) -> Report:
    from splitcheck.report import readback

    size = path.stat().st_size
    if size > LARGEST_BYTES:
        wrong = f"has {size} bytes, more than {LARGEST_BYTES}"
        raise SplitcheckError(str(path), wrong, "give a report that splitcheck has written")
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        do = "give a report that splitcheck has written"
        raise SplitcheckError(str(path), "is no UTF-8 text", do) from error
    return readback.load(text, str(path))
