"""The two streams of the process: colour or not, how wide, progress, and pipes that close early."""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from io import TextIOWrapper
from time import monotonic
from typing import Literal, TextIO, TypeAlias

from splitcheck.report.words import inert, shorten, visible

Color: TypeAlias = Literal["auto", "always", "never"]
Progress: TypeAlias = Callable[[str, int, int], None]

#: Without a terminal to measure, as in a CI log.
_DEFAULT_WIDTH = 80
_LONGEST_COMPLAINT = 2000
_REDRAW_SECONDS = 0.05


def prepare() -> None:
    """Let both streams take any text: what their encoding lacks is written as an escape."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, TextIOWrapper):
            stream.reconfigure(errors="backslashreplace")


def wants_color(flag: Color, environment: Mapping[str, str], *, terminal: bool) -> bool:
    """Decide on colour; the first of these that speaks decides.

    1. ``--color always`` or ``never``.
    2. ``NO_COLOR``, not empty: no colour.
    3. ``FORCE_COLOR`` or ``CLICOLOR_FORCE``, not empty and not 0: colour.
    4. ``CLICOLOR=0`` or ``TERM=dumb``: no colour.
    5. Colour if, and only if, the text goes to a terminal.

    Examples
    --------
    >>> wants_color("auto", {"FORCE_COLOR": "1"}, terminal=False)
    True
    >>> wants_color("auto", {"NO_COLOR": "1", "FORCE_COLOR": "1"}, terminal=True)
    False
    """
    if flag != "auto":  # 1
        return flag == "always"
    if environment.get("NO_COLOR"):  # 2
        return False
    if any(
        environment.get(name, "") not in {"", "0"} for name in ("FORCE_COLOR", "CLICOLOR_FORCE")
    ):
        return True  # 3
    if environment.get("CLICOLOR") == "0" or environment.get("TERM") == "dumb":  # 4
        return False
    return terminal  # 5


def color_for(flag: Color, stream: TextIO) -> bool:
    """Whether text to this stream is coloured."""
    return wants_color(flag, os.environ, terminal=stream.isatty())


def width_for(stream: TextIO) -> int:
    """Columns of the terminal; ``COLUMNS`` decides if it is set, and a file or pipe has 80."""
    if os.environ.get("COLUMNS", "").isdigit() or stream.isatty():
        return shutil.get_terminal_size((_DEFAULT_WIDTH, 24)).columns
    return _DEFAULT_WIDTH


def put(text: str, stream: TextIO) -> None:
    """Write text; a reader that has gone away (``| head``) takes the rest in silence.

    The exit code then still says what was found.
    """
    try:
        stream.write(text)
        stream.flush()
    except BrokenPipeError:
        _leave(stream)


def put_bytes(result: bytes, stream: TextIO) -> None:
    """Write a result that is no text, as `put` writes one that is."""
    try:
        stream.flush()
        stream.buffer.write(result)
        stream.buffer.flush()
    except BrokenPipeError:
        _leave(stream)


def _leave(stream: TextIO) -> None:
    """Python flushes a stream once more at its end: let that go nowhere."""
    with open(os.devnull, "w", encoding="utf-8") as nowhere:  # noqa: PTH123
        os.dup2(nowhere.fileno(), stream.fileno())


def complain(sentence: str) -> None:
    """One line on standard error; whatever a file put into it is made visible first."""
    put(f"splitcheck: {shorten(sentence, _LONGEST_COMPLAINT)}\n", sys.stderr)


def complain_raw(text: str) -> None:
    """Several lines on standard error: a traceback somebody asked for."""
    put("".join(inert(visible(line)) + "\n" for line in text.splitlines()), sys.stderr)


@contextmanager
def progress_bar(*, quiet: bool) -> Iterator[Progress | None]:
    """Show a bar on standard error while the block runs, if anybody sits before it."""
    if quiet or not sys.stderr.isatty() or os.environ.get("TERM") == "dumb":
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, TextColumn
    from rich.progress import Progress as Bar

    color = color_for("auto", sys.stderr)
    console = Console(file=sys.stderr, no_color=not color)
    columns = (TextColumn("{task.description}", markup=False), BarColumn(), MofNCompleteColumn())
    # No thread that redraws by itself: readers fork, and a fork beside a thread can hang.
    with Bar(*columns, console=console, transient=True, auto_refresh=False) as bar:
        task = bar.add_task("start", total=None)
        drawn = (monotonic(), "")

        def advance(stage: str, done: int, total: int) -> None:
            nonlocal drawn
            bar.update(task, description=stage, completed=done, total=total or None)
            now = monotonic()
            if stage != drawn[1] or now - drawn[0] > _REDRAW_SECONDS:
                bar.refresh()
                drawn = (now, stage)

        yield advance
