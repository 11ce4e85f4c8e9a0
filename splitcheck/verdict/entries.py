"""Values out of tables of TOML, each checked where it is taken: a fault is told with its line."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from datetime import date, datetime
from difflib import get_close_matches
from math import isfinite
from typing import Any, TypeVar

from splitcheck.errors import SplitcheckError
from splitcheck.verdict.patterns import LONGEST_PATTERN
from splitcheck.verdict.tomltext import Path, TomlText

#: More entries than this in one list or table are refused: no board needs them.
MOST_ENTRIES = 2000
#: Longer texts are refused.
LONGEST_TEXT = 1000

#: What one of a unit is in the unit that a key of that quantity is in.
_UNITS: dict[str, dict[str, float]] = {
    "ns": {"ps": 1e-3, "us": 1e3, "ms": 1e6, "s": 1e9, "fs": 1e-6},
    "mv": {"v": 1e3, "uv": 1e-3, "volt": 1e3},
    "ma": {"a": 1e3, "ua": 1e-3},
    "nh": {"ph": 1e-3, "uh": 1e3, "h": 1e9},
    "mm": {
        "um": 1e-3,
        "cm": 10.0,
        "m": 1e3,
        "mil": 0.0254,
        "mils": 0.0254,
        "in": 25.4,
        "inch": 25.4,
    },
    "ohm": {"kohm": 1e3, "mohm": 1e-3, "ohms": 1.0},
}
_WITH_UNIT = re.compile(r"\s*([-+]?\d+(?:\.\d*)?(?:[eE][-+]?\d+)?)\s*([a-zA-Z]*)\s*")
_Choice = TypeVar("_Choice", bound=str)


@dataclass(frozen=True, slots=True)
class Table:
    """A table of a TOML file."""

    text: TomlText
    path: Path
    data: dict[str, Any]

    def place(self, *keys: str | int) -> str:
        """File and line of a key of it; without keys, of the table."""
        return self.text.place(*self.path, *keys)

    def line(self, *keys: str | int) -> int:
        """Line of a key of it."""
        return self.text.line(*self.path, *keys)

    def allow(self, known: Collection[str]) -> None:
        """Refuse keys that mean nothing here.

        Raises
        ------
        SplitcheckError
            With the unit if the key is one of ours in another unit, else with near ones.
        """
        for key in self.data:
            if key in known:
                continue
            right = _in_other_unit(key, known)
            if right is not None:
                stem, unit, factor = right
                value = self.data[key]
                as_ours = ""
                if isinstance(value, int | float) and not isinstance(value, bool):
                    as_ours = f" = {value * factor:g}"
                raise SplitcheckError(
                    self.place(key),
                    f"unknown key {shown(key)}: this quantity is in {stem.rsplit('_', 1)[-1]}",
                    f"write {stem}{as_ours}" + ("" if as_ours else f" (1 {unit} is {factor:g})"),
                )
            near = get_close_matches(key[:100], sorted(known), 1, 0.6)
            do = f"did you mean {near[0]}" if near else f"the keys are {', '.join(sorted(known))}"
            raise SplitcheckError(self.place(key), f"unknown key {shown(key)}", do)

    def number(self, key: str, low: float, high: float) -> float | None:
        """A number from low to high; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        if isinstance(value, str):
            raise SplitcheckError(
                self.place(key), f"{key} = {shown(value)} is a text", _as_number(key, value)
            )
        good = isinstance(value, int | float) and not isinstance(value, bool)
        if not good or not isfinite(value) or not low <= value <= high:
            unit = f", in {key.rsplit('_', 1)[-1]}" if key.rsplit("_", 1)[-1] in _UNITS else ""
            do = f"give a number from {low:g} to {high:g}{unit}"
            raise SplitcheckError(self.place(key), f"{key} = {shown(value)}", do)
        return float(value)

    def words(self, key: str) -> str | None:
        """A text that is not empty; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        if not isinstance(value, str) or not value.strip():
            raise SplitcheckError(self.place(key), f"{key} = {shown(value)}", "give a text")
        if len(value) > LONGEST_TEXT:
            do = f"shorten it to {LONGEST_TEXT}"
            raise SplitcheckError(self.place(key), f"{key} has {len(value)} characters", do)
        return value

    def pattern(self, key: str) -> str | None:
        """A pattern of names; None if the key is not there."""
        value = self.words(key)
        if value is not None:
            check_pattern(value, self.place(key))
        return value

    def texts(self, key: str) -> tuple[str, ...] | None:
        """A list of texts, or one text; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        listed = [value] if isinstance(value, str) else value
        if not isinstance(listed, list) or not all(
            isinstance(text, str) and text.strip() for text in listed
        ):
            wrong = f"{key} = {shown(value)}"
            raise SplitcheckError(self.place(key), wrong, f'write {key} = ["one", "another"]')
        if len(listed) > MOST_ENTRIES:
            wrong = f"{key} has {len(listed)} entries"
            raise SplitcheckError(self.place(key), wrong, f"give at most {MOST_ENTRIES}")
        for text in listed:
            check_pattern(text, self.place(key))
        return tuple(listed)

    def flag(self, key: str) -> bool | None:
        """True or false; None if the key is not there."""
        value = self.data.get(key)
        if value is None or isinstance(value, bool):
            return value
        raise SplitcheckError(self.place(key), f"{key} = {shown(value)}", "write true or false")

    def choice(self, key: str, choices: Collection[_Choice]) -> _Choice | None:
        """One of some words; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        for choice in choices:
            if value == choice:
                return choice
        near = get_close_matches(str(value)[:100], list(choices), 1, 0.5)
        do = f"did you mean {near[0]}" if near else f"it is one of {', '.join(choices)}"
        raise SplitcheckError(self.place(key), f"{key} = {shown(value)}", do)

    def point(self, key: str) -> tuple[float, float] | None:
        """A place, mm; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        if not _is_place(value):
            wrong = f"{key} = {shown(value)} is no place"
            raise SplitcheckError(self.place(key), wrong, f"write {key} = [x, y], in mm")
        return float(value[0]), float(value[1])

    def points(self, key: str) -> tuple[tuple[float, float], ...] | None:
        """A list of places, mm; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        if not isinstance(value, list) or not all(_is_place(one) for one in value):
            wrong = f"{key} = {shown(value)} are no places"
            raise SplitcheckError(self.place(key), wrong, f"write {key} = [[x, y], [x, y]], in mm")
        return tuple((float(x), float(y)) for x, y in value)

    def day(self, key: str) -> date | None:
        """A day; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        if isinstance(value, date) and not isinstance(value, datetime):
            return value
        try:
            if isinstance(value, str) and re.fullmatch(r"\d{4}-\d\d-\d\d", value, re.ASCII):
                return date.fromisoformat(value)
        except ValueError:
            pass
        wrong = f"{key} = {shown(value)} is no day"
        raise SplitcheckError(self.place(key), wrong, f'write {key} = "2030-12-31": year-month-day')

    def table(self, key: str) -> Table | None:
        """A table within it; None if the key is not there."""
        value = self.data.get(key)
        if value is None:
            return None
        if not isinstance(value, dict):
            path = ".".join(str(part) for part in (*self.path, key))
            wrong = f"{key} = {shown(value)} is no table"
            raise SplitcheckError(self.place(key), wrong, f"write [{path}] and its keys below")
        if len(value) > MOST_ENTRIES:
            wrong = f"{key} has {len(value)} keys"
            raise SplitcheckError(self.place(key), wrong, f"give at most {MOST_ENTRIES}")
        return Table(self.text, (*self.path, key), value)

    def tables(self, key: str) -> Iterator[Table]:
        """The tables of an array within it, in order."""
        value = self.data.get(key, [])
        if not isinstance(value, list) or not all(isinstance(one, dict) for one in value):
            wrong = f"{key} is not a list of tables"
            raise SplitcheckError(self.place(key), wrong, f"write [[{key}]] for each")
        if len(value) > MOST_ENTRIES:
            wrong = f"{key} has {len(value)} entries"
            raise SplitcheckError(self.place(key), wrong, f"give at most {MOST_ENTRIES}")
        for number, one in enumerate(value):
            yield Table(self.text, (*self.path, key, number), one)


def shown(value: Any) -> str:
    r"""A value of a file as a message shows it: short and in plain characters.

    Examples
    --------
    >>> shown("a\x1bb"), shown([1] * 99)
    ('"a\\x1bb"', '[1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1...')
    """
    if isinstance(value, date):
        return value.isoformat()
    text = ascii(value)
    if isinstance(value, str):
        text = f'"{text[1:-1]}"'
    return text if len(text) <= 60 else text[:39] + "..."


def _is_place(value: Any) -> bool:
    """Whether a value is two numbers that can be a place on a board, mm."""
    return (
        isinstance(value, list)
        and len(value) == 2
        and all(isinstance(v, int | float) and not isinstance(v, bool) for v in value)
        and all(isfinite(v) and abs(v) < 1e5 for v in value)
    )


def check_pattern(text: str, place: str) -> None:
    """Refuse patterns that are too long.

    Raises
    ------
    SplitcheckError
        If it is longer than ``LONGEST_PATTERN``.
    """
    if len(text) > LONGEST_PATTERN:
        wrong = f"a name or pattern of {len(text)} characters"
        raise SplitcheckError(place, wrong, f"shorten it to {LONGEST_PATTERN}, with * for the rest")


def _in_other_unit(key: str, known: Collection[str]) -> tuple[str, str, float] | None:
    """The key of the same quantity in our unit, the unit that was written, and its size in ours."""
    stem, _, unit = key.lower().rpartition("_")
    for right in sorted(known):
        own_stem, _, own = right.rpartition("_")
        if own not in _UNITS:
            continue
        if own_stem == stem and unit in _UNITS[own]:
            return right, unit, _UNITS[own][unit]
        if key.lower() == own_stem:
            return right, own, 1.0
    return None


def _as_number(key: str, text: str) -> str:
    """How to write a text with a number as the number that it means."""
    unit = key.rsplit("_", 1)[-1]
    found = _WITH_UNIT.fullmatch(text[:60])
    scale = {unit: 1.0, "": 1.0, **_UNITS.get(unit, {})}
    if found is None or found[2].lower() not in scale:
        return f"give a number without quotes{f', in {unit}' if unit in _UNITS else ''}"
    value = float(found[1]) * scale[found[2].lower()]
    told = f": the unit, {unit}, is in the key" if unit in _UNITS else ""
    return f"write {key} = {value:g}{told}"
