"""TOML text in, its data out, and for every key the line it stands in.

``tomllib`` does not tell where a key stands, so the text is scanned a second time for statements:
headers and keys, outside strings, comments and brackets. What the scan tells is used for messages
alone; the data are those of ``tomllib``.
"""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass
from typing import Any, TypeAlias

from splitcheck.errors import SplitcheckError

#: Larger files are refused, bytes: a file of rules has some hundred lines.
LARGEST_BYTES = 1_000_000
#: A line with more dots than this is refused: keys of so many parts take for ever to read.
MOST_DOTS = 200
#: Where a key is: names of tables and keys, and indexes in arrays of tables.
Path: TypeAlias = tuple[str | int, ...]

_AT_LINE = re.compile(r"\(at line (\d+), column \d+\)$")
#: What a scan of values must not look into: strings and comments.
_SKIP = re.compile(
    r"'''.*?'{3,5}|\"\"\"(?:[^\\]|\\.)*?\"{3,5}|'[^'\n]*'|\"(?:[^\"\\\n]|\\.)*\"|#[^\n]*", re.DOTALL
)
#: Text without a second way to read it (``++``): a key is read once, however long.
_TEXT = r"(?:[^=\"'#\[\]\n]|\"(?:[^\"\\\n]|\\.)*+\"|'[^'\n]*+')++"
_HEAD = re.compile(rf"[ \t]*+(?P<double>\[)?\[(?P<keys>{_TEXT})\]")
_KEY = re.compile(rf"[ \t]*+(?P<keys>{_TEXT})=")
_BARE = re.compile(r"\s*[\w-]+(?:\.[\w-]+)*\s*", re.ASCII)


@dataclass(frozen=True, slots=True)
class TomlText:
    """A TOML file."""

    name: str
    data: dict[str, Any]
    lines: dict[Path, int]
    """Lines of headers and keys, counted from 1."""

    def line(self, *path: str | int) -> int:
        """The line of a key, or of what it is in if it has none of its own; 1 for the file."""
        for stop in range(len(path), 0, -1):
            if path[:stop] in self.lines:
                return self.lines[path[:stop]]
        return 1

    def place(self, *path: str | int) -> str:
        """File and line of a key, for messages."""
        return f"{self.name}:{self.line(*path)}"


def read_toml(text: str, name: str) -> TomlText:
    r"""Read TOML and find its lines.

    Parameters
    ----------
    text
        Contents of the file, at most ``LARGEST_BYTES``.
    name
        Its name, for messages.

    Raises
    ------
    SplitcheckError
        If it is too large or is not TOML.

    Examples
    --------
    >>> read = read_toml('a = 1\n[b."c d"]\ne = [\n  2]\n[[f]]\n[[f]]\ng.h = 3', "x.toml")
    >>> [read.line(*path) for path in (("a",), ("b", "c d"), ("b", "c d", "e"), ("f", 1, "g", "h"))]
    [1, 2, 3, 7]
    """
    if len(text) > LARGEST_BYTES:
        wrong = f"has {len(text)} characters"
        raise SplitcheckError(name, wrong, f"a file of rules has at most {LARGEST_BYTES}")
    text = text.removeprefix("\ufeff").replace("\r\n", "\n")
    for number, line in enumerate(text.split("\n"), start=1):
        if line.count(".") > MOST_DOTS:
            wrong = f"a line with more than {MOST_DOTS} dots"
            raise SplitcheckError(f"{name}:{number}", wrong, "mend the syntax")
    try:
        data = tomllib.loads(text)
    except RecursionError as error:
        raise SplitcheckError(name, "brackets are nested too deep", "mend the syntax") from error
    except ValueError as error:  # also numbers with more digits than Python reads
        said = str(error)
        at = _AT_LINE.search(said)
        line = at[1] if at else str(text.count("\n") + 1)
        told = (said[: at.start()] if at else said).removesuffix("(at end of document)").strip()
        wrong = f"is not TOML: {told}"
        raise SplitcheckError(f"{name}:{line}", wrong, "mend the syntax") from error
    return TomlText(name, data, _lines(text))


def _lines(text: str) -> dict[Path, int]:
    found: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    table: Path = ()
    at, number = 0, 1
    while at < len(text):
        end, keys, header, double = _statement(text, at)
        if keys is not None:
            path = _keys(keys)
            if header:
                table = _within(path, counts, opens=double)
                found.setdefault(table, number)
                if double:
                    found.setdefault(table[:-1], number)
            else:
                for stop in range(1, len(path) + 1):
                    found.setdefault((*table, *path[:stop]), number)
        number += text.count("\n", at, end)
        at = end
    return found


def _statement(text: str, at: int) -> tuple[int, str | None, bool, bool]:
    """End of the statement at a place, its keys if it has any, and whether it is a header."""
    head = _HEAD.match(text, at)
    if head:
        line_end = text.find("\n", head.end())
        return (line_end + 1 or len(text)), head["keys"], True, head["double"] is not None
    key = _KEY.match(text, at)
    if key is None:
        line_end = text.find("\n", at)
        return (line_end + 1 or len(text)), None, False, False
    return _value_end(text, key.end()), key["keys"], False, False


def _value_end(text: str, at: int) -> int:
    """Where a value ends: at the line end outside strings, comments and brackets."""
    depth = 0
    while at < len(text):
        letter = text[at]
        if letter in "\"'#":
            skipped = _SKIP.match(text, at)
            at = skipped.end() if skipped else at + 1
            continue
        at += 1
        if letter in "[{":
            depth += 1
        elif letter in "]}":
            depth -= 1
        elif letter == "\n" and depth <= 0:
            break
    return at


def _keys(text: str) -> tuple[str, ...]:
    """The names in a dotted key; the text has been read as TOML before, so it is well formed."""
    if _BARE.fullmatch(text):
        return tuple(text.strip().split("."))
    tree: Any = tomllib.loads(f"{text.strip()} = 0")
    names: list[str] = []
    while isinstance(tree, dict):
        ((name, tree),) = tree.items()
        names.append(name)
    return tuple(names)


def _within(path: tuple[str, ...], counts: dict[Path, int], *, opens: bool) -> Path:
    """The path of a header, with the index of the last table of every array in it."""
    full: Path = ()
    for place, name in enumerate(path):
        full = (*full, name)
        if opens and place == len(path) - 1:
            counts[full] = counts.get(full, -1) + 1
        if full in counts:
            full = (*full, counts[full])
    return full
