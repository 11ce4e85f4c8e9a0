"""Where results go besides the terminal: ``--out FORMAT=FILE``, checked before the long work."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from importlib import import_module
from pathlib import Path
from typing import TypeAlias

from splitcheck.cli import streams
from splitcheck.errors import SplitcheckError
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import Report
from splitcheck.verdict.views import Pictures

#: Writes a report, and what became of an earlier one if there is one, as a file.
Renderer: TypeAlias = Callable[[Report, Comparison | None], str | bytes]
#: Writes a report with pictures of the board.
Drawer: TypeAlias = Callable[[Report, Comparison | None, Pictures], str | bytes]

#: What ``--out`` can write: each format by the module with its ``render``, which is loaded when
#: it is asked for. ``text`` is what the command itself shows.
MODULES = {
    "text": "",
    "json": "splitcheck.report.jsonfile",
    "sarif": "splitcheck.report.sarif",
    "junit": "splitcheck.report.junit",
    "codequality": "splitcheck.report.codequality",
    "annotations": "splitcheck.report.annotations",
    "markdown": "splitcheck.report.markdown",
    "csv": "splitcheck.report.csvfile",
    "html": "splitcheck.report.htmlpage",
}
FORMATS = tuple(MODULES)
#: Formats that are drawn from the board itself: only commands that read one can write them.
DRAWN = frozenset({"html"})
#: Formats that point a host to a file of the repository.
HOSTED = frozenset({"sarif", "junit", "codequality", "annotations"})
#: What a command writes that has no board at hand.
TOLD = tuple(name for name in MODULES if name not in DRAWN)
#: The file name that means standard output.
STDOUT = "-"


@dataclass(frozen=True, slots=True)
class Target:
    """One ``--out``: a format, and the file it goes to."""

    format: str
    file: str

    def renderer(self) -> Renderer:
        """What writes this format; not for ``text``."""
        render: Renderer = import_module(MODULES[self.format]).render
        return render

    def drawer(self) -> Drawer:
        """What writes this format; only for one that is drawn."""
        draw: Drawer = import_module(MODULES[self.format]).render
        return draw

    @property
    def is_stdout(self) -> bool:
        """Whether it goes to standard output."""
        return self.file == STDOUT


def parse(
    words: Sequence[str], *boards: Path, known: Sequence[str] = FORMATS
) -> tuple[Target, ...]:
    """Read all ``--out`` and make sure that each can be written, long before there is a result.

    Parameters
    ----------
    boards
        What is going to be read; a result never goes over it.
    known
        Formats that the command can write.

    Raises
    ------
    SplitcheckError
        For an unknown format, a file named twice, a folder that is not there, a file that may not
        be written.

    Examples
    --------
    >>> parse(["json=-"], Path("board"))
    (Target(format='json', file='-'),)
    >>> parse([], Path("board"))
    ()
    """
    targets = tuple(_target(word, known) for word in words)
    seen: set[str] = set()
    for target in targets:
        place = f"--out {target.format}={target.file}"
        name = STDOUT if target.is_stdout else os.path.realpath(target.file)
        if name in seen:
            do = "give each --out a file of its own"
            raise SplitcheckError(place, "another --out goes there already", do)
        seen.add(name)
        if not target.is_stdout:
            _check(Path(target.file), place, boards)
    return targets


def are_drawn(targets: Sequence[Target]) -> bool:
    """Whether any of them needs pictures of the board.

    Examples
    --------
    >>> are_drawn(parse(["json=-"], Path("board")))
    False
    """
    return any(target.format in DRAWN for target in targets)


def _target(word: str, formats: Sequence[str]) -> Target:
    name, equals, file = word.partition("=")
    known = ", ".join(formats)
    if not equals or not file:
        do = f"write it as FORMAT=FILE, where FORMAT is one of {known} and FILE may be - for stdout"
        raise SplitcheckError(f"--out {word}", "the file is missing", do)
    if name not in formats:
        raise SplitcheckError(f"--out {word}", f'no format "{name}"', f"use one of {known}")
    return Target(name, file)


def _check(path: Path, place: str, boards: Sequence[Path]) -> None:
    folder = path.parent
    if path.is_dir():
        raise SplitcheckError(place, "this is a folder", "name a file in it")
    if not folder.is_dir():
        wrong = f'there is no folder "{folder}"'
        raise SplitcheckError(place, wrong, "make the folder first or name another")
    if path.exists() and any(board.is_file() and path.samefile(board) for board in boards):
        wrong = "this is the very file that is read"
        raise SplitcheckError(place, wrong, "name another file for the result")
    if not os.access(path if path.exists() else folder, os.W_OK):
        raise SplitcheckError(place, "it may not be written", "change its rights or name another")


def deliver(target: Target, result: str | bytes) -> None:
    """Write one result; text is UTF-8, with the line ends that its format has, on every system.

    Raises
    ------
    SplitcheckError
        If the file cannot be written after all.
    """
    if target.is_stdout and isinstance(result, str):
        streams.put(result, sys.stdout)
        return
    if isinstance(result, str):
        result = result.encode(errors="backslashreplace")
    if target.is_stdout:
        streams.put_bytes(result, sys.stdout)
        return
    try:
        Path(target.file).write_bytes(result)
    except OSError as error:
        place = f"--out {target.format}={target.file}"
        wrong = f"cannot be written ({error.strerror})"
        raise SplitcheckError(place, wrong, "free the space or name another file") from error
