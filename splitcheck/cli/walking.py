"""From the options of a command to the road, and along it: what ranking commands do alike."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from os import environ
from pathlib import Path
from typing import TYPE_CHECKING

from splitcheck.cli import streams
from splitcheck.cli.day import today
from splitcheck.cli.options import check_min_nh

if TYPE_CHECKING:
    from splitcheck.cli.results import Draw
    from splitcheck.road import Options
    from splitcheck.verdict.findings import Report


def asked(
    *,
    net: Sequence[str] | None = None,
    layer: Sequence[str] | None = None,
    min_nh: float = 0.05,
    stack: Path | None = None,
    rules: Path | None = None,
    jobs: int | None = None,
) -> Options:
    """What the options of a command ask of the road.

    Raises
    ------
    SplitcheckError
        If the threshold is no inductance, or the environment states a day that is none.
    """
    from splitcheck import road

    check_min_nh(min_nh)
    return road.Options(
        tuple(net or ()), tuple(layer or ()), min_nh, stack, jobs, rules, today(environ)
    )


def ranked(path: Path, options: Options, *, quiet: bool, drawn: bool) -> tuple[Report, Draw | None]:
    """Rank a board before the eyes of the user; and what draws it, if that is wanted."""
    from splitcheck import road

    with streams.progress_bar(quiet=quiet) as progress:
        if not drawn:
            return road.rank(path, options, progress), None
        walked = road.look(path, options, progress)
        return walked.report, partial(road.illustrate, walked, options)
