"""A report read back from its JSON: an earlier revision to compare with, from a file anybody wrote.

The fields are those of the data classes of ``verdict.findings``: what they do not ask for is passed
over, so that a newer file can be read, and what they have a default for may be missing, so that an
older one can. Everything else must be there and of its type.
"""

from __future__ import annotations

import json
from dataclasses import MISSING, Field, fields, is_dataclass
from math import isfinite
from types import NoneType, UnionType
from typing import Any, Literal, NoReturn, TypeAlias, Union, get_args, get_origin, get_type_hints

from splitcheck.errors import SplitcheckError
from splitcheck.report.jsonfile import SCHEMA
from splitcheck.verdict.findings import NetRow, Report

#: The largest board of the tests writes some megabytes.
LARGEST_CHARACTERS = 256_000_000
MOST_ROWS = 200_000
LONGEST_TEXT = 100_000
_Plan: TypeAlias = tuple[tuple[Field[Any], Any], ...]
_WRITE_IT = "write it with splitcheck rank PATH --out json=FILE"


def load(text: str, name: str) -> Report:
    """Read a report from the text of its JSON file.

    Parameters
    ----------
    text
        What ``jsonfile.render`` has written.
    name
        The file's name, for errors.

    Raises
    ------
    SplitcheckError
        If the text is no JSON, no report, of another version, too large, or holds a value of the
        wrong type; the place of the value is named.

    Examples
    --------
    >>> load("[]", "old.json")
    Traceback (most recent call last):
        ...
    splitcheck.errors.SplitcheckError: old.json: this is no report of splitcheck; write it with \
splitcheck rank PATH --out json=FILE
    """
    if len(text) > LARGEST_CHARACTERS:
        wrong = f"has {len(text)} characters, more than {LARGEST_CHARACTERS}"
        raise SplitcheckError(name, wrong, "give a report that splitcheck has written")
    whole = _parsed(text, name)
    if not isinstance(whole, dict) or "schema" not in whole:
        raise SplitcheckError(name, "this is no report of splitcheck", _WRITE_IT)
    if whole["schema"] != SCHEMA:
        wrong = f"its schema is {_short(whole['schema'])}, not {SCHEMA!r}"
        raise SplitcheckError(name, wrong, "read it with the version of splitcheck that wrote it")
    return _Reader(name).report(whole)


def _parsed(text: str, name: str) -> Any:
    try:
        return json.loads(text, parse_constant=_refuse)
    except json.JSONDecodeError as error:
        where = f"{name}:{error.lineno}"
        raise SplitcheckError(where, f"this is no JSON ({error.msg})", _WRITE_IT) from None
    except (ValueError, RecursionError) as error:
        wrong = "holds a number that is none, or is nested too deep"
        raise SplitcheckError(name, wrong, _WRITE_IT) from error


def _refuse(word: str) -> NoReturn:
    raise ValueError(word)


class _Reader:
    """Turns parsed JSON into rows; every error names the file and the place in it."""

    def __init__(self, name: str) -> None:
        self.name = name
        self._plans: dict[str, _Plan] = {}

    def report(self, whole: dict[str, Any]) -> Report:
        """The report: as written, but for what the file keeps one level deeper."""
        board = self._object(whole.get("board"), "board")
        summary = self._object(whole.get("summary", {}), "summary")
        seconds = self._object(summary.get("seconds", {}), "summary.seconds")
        flat = {
            **whole,
            "board": board.get("name"),
            "size_mm": board.get("size_mm"),
            "corner_mm": board.get("corner_mm"),
            "layers": board.get("layers"),
            "seconds": [[stage, spent] for stage, spent in seconds.items()],
        }
        report: Report = self._row(Report, flat, "")
        self._agree(report)
        return report

    def _agree(self, report: Report) -> None:
        """What later stages rely on: ids that are there once."""
        ids = [finding.id for finding in report.findings]
        if len(set(ids)) != len(ids):
            self._fail("findings", "two of them have the same id")

    def _row(self, kind: type[Any], value: Any, place: str) -> Any:
        given = self._object(value, place)
        found: dict[str, Any] = {}
        for field, hint in self._fields(kind):
            key = _key(kind, field.name)
            where = f"{place}.{key}" if place else key
            if key in given:
                found[field.name] = self._value(hint, given[key], where)
            elif field.default is MISSING:
                self._fail(where, "is missing")
        return kind(**found)

    def _fields(self, kind: type[Any]) -> _Plan:
        """Fields of a row with their types, looked up once."""
        if kind.__name__ not in self._plans:
            hints = get_type_hints(kind)
            self._plans[kind.__name__] = tuple((f, hints[f.name]) for f in fields(kind))
        return self._plans[kind.__name__]

    def _value(self, hint: Any, value: Any, place: str) -> Any:
        origin = get_origin(hint)
        if origin is tuple:
            return self._rows(get_args(hint), value, place)
        if origin in (UnionType, Union):
            (inner,) = (one for one in get_args(hint) if one is not NoneType)
            return None if value is None else self._value(inner, value, place)
        if origin is Literal:
            if not isinstance(value, str) or value not in get_args(hint):
                self._fail(place, f"{_short(value)} is none of {', '.join(get_args(hint))}")
            return value
        if isinstance(hint, type) and is_dataclass(hint):
            return self._row(hint, value, place)
        return self._plain(hint, value, place)

    def _plain(self, hint: Any, value: Any, place: str) -> Any:
        if hint is float:
            if isinstance(value, bool) or not isinstance(value, int | float):
                self._fail(place, f"{_short(value)} is no number")
            if abs(value) > 1e300 or not isfinite(value):
                self._fail(place, f"{_short(value)} is too large")
            return float(value)
        if type(value) is not hint:
            words = {str: "no text", int: "no whole number", bool: "neither true nor false"}
            self._fail(place, f"{_short(value)} is {words[hint]}")
        if isinstance(value, str) and len(value) > LONGEST_TEXT:
            self._fail(place, f"has {len(value)} characters, more than {LONGEST_TEXT}")
        if hint is int and abs(value) > 10**15:
            self._fail(place, f"{_short(value)} is too large")
        return value

    def _rows(self, inner: tuple[Any, ...], value: Any, place: str) -> tuple[Any, ...]:
        if not isinstance(value, list):
            self._fail(place, f"{_short(value)} is no list")
        if len(value) > MOST_ROWS:
            self._fail(place, f"has {len(value)} rows, more than {MOST_ROWS}")
        if len(inner) == 2 and inner[1] is Ellipsis:
            hints = [inner[0]] * len(value)
        else:
            hints = list(inner)
            if len(value) != len(hints):
                self._fail(place, f"has {len(value)} entries, not {len(hints)}")
        return tuple(
            self._value(hint, one, f"{place}[{number}]")
            for number, (hint, one) in enumerate(zip(hints, value, strict=True))
        )

    def _object(self, value: Any, place: str) -> dict[str, Any]:
        if not isinstance(value, dict):
            self._fail(place or "report", f"{_short(value)} is no object")
        return value

    def _fail(self, place: str, wrong: str) -> NoReturn:
        raise SplitcheckError(f"{self.name}: {place}", wrong, _WRITE_IT)


def _key(kind: type, name: str) -> str:
    """How a field is called in the file."""
    return "class" if kind is NetRow and name == "net_class" else name


def _short(value: Any) -> str:
    shown = repr(value) if not isinstance(value, list | dict) else type(value).__name__
    return shown if len(shown) <= 60 else f"{shown[:57]}..."
