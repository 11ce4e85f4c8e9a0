"""From a list of placed parts to reference, centre in mm, side and value of each."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass
from math import isfinite
from typing import Literal, NamedTuple, TypeAlias

from splitcheck.copper.naming import ending
from splitcheck.units import INCH_MM

Side: TypeAlias = Literal["top", "bottom"]

#: Most rows of one file that are read, and most characters of a row and of a name.
ROWS_CAP = 200_000
_ROW_CAP = 2_000
_NAME_CAP = 80
#: The header stands within so many rows from the top.
_HEADER_WITHIN = 80
#: Rows further from the origin than this are no places on a board, mm.
_FAR_MM = 10_000.0

_UNITS_MM = {"mm": 1.0, "in": INCH_MM, "mil": INCH_MM / 1000.0}
_UNIT_WORDS = {
    "mm": "mm", "millimeter": "mm", "millimeters": "mm", "millimetre": "mm", "millimetres": "mm",
    "in": "in", "inch": "in", "inches": "in", "mil": "mil", "mils": "mil", "thou": "mil",
}  # fmt: skip
_WORDS = "|".join(sorted(_UNIT_WORDS, key=len, reverse=True))
_STATED = re.compile(
    rf"\bunits?\b(?:\s+used)?\s*[=:,]?\s*\"?({_WORDS})\b"
    rf"|\b(?:measurements?|dimensions?|coordinates?)\b(?:\s+are)?\s+in\s+({_WORDS})\b",
    re.IGNORECASE,
)
_OF_COLUMN = re.compile(rf"[(\[_ ]\s*({_WORDS})\s*[)\]]?$", re.IGNORECASE)
_NUMBER = re.compile(r"\s*([-+]?(?:\d{1,9}\.?\d{0,12}|\.\d{1,12}))\s*(mm|mils?|in|inch|\")?\s*$")
_BARE = re.compile(
    r"(\S{1,80})\s+([-+]?[\d.]{1,16})\s+([-+]?[\d.]{1,16})\s+([-+]?[\d.]{1,12})(?:\s+(\S.*))?$"
)
#: What columns are called by the habits of the trade (common practice, no source), best first.
_COLUMNS: dict[str, tuple[str, ...]] = {
    "ref": ("refdes", "designator", "reference", "ref", "refdesignator", "component", "part"),
    "x": ("midx", "centerx", "centrex", "centroidx", "posx", "locationx", "locx", "xpos", "x",
          "xcoord", "xlocation", "xcenter", "centerxmm", "refx"),
    "y": ("midy", "centery", "centrey", "centroidy", "posy", "locationy", "locy", "ypos", "y",
          "ycoord", "ylocation", "ycenter", "centerymm", "refy"),
    "turn": ("rot", "rotation", "angle", "orientation"),
    "side": ("side", "layer", "tb", "boardside", "mountside", "topbottom"),
    "value": ("val", "value", "comment"),
}  # fmt: skip
_TOP = {"top", "t", "f", "front", "toplayer", "topside", "fcu", "1"}
_BOTTOM = {"bottom", "bot", "b", "back", "bottomlayer", "bottomside", "bcu", "2"}


class Placed(NamedTuple):
    """One part and where its centre is."""

    ref: str
    x_mm: float
    y_mm: float
    side: Side | None
    """None if neither the row nor the file's name tells."""
    turn_deg: float | None
    value: str | None
    line: int


@dataclass(frozen=True, slots=True)
class Placement:
    """A list of placed parts as read, in mm."""

    name: str
    parts: tuple[Placed, ...]
    """In file order."""
    unit: str
    """Unit of its places: ``mm``, ``in`` or ``mil``."""
    stated: bool
    """Whether the file states the unit; if not, mm was taken."""
    remarks: tuple[str, ...]

    def factor(self, unit: str) -> float:
        r"""What to multiply its places by to take them in another unit.

        Examples
        --------
        >>> read("Ref,X,Y,Side\nC1,1.0,2.0,top", "a.csv").factor("in")
        25.4
        """
        return _UNITS_MM[unit] / _UNITS_MM[self.unit]


class _Table(NamedTuple):
    """How the rows of a file are to be cut and understood."""

    delimiter: str | None
    """None: blanks."""
    columns: dict[str, int]
    width: int
    """How many columns the header has."""
    unit: str | None
    first: int
    """Index of the first row after the header."""


def read(text: str, name: str) -> Placement:
    r"""Read a list of placed parts.

    Parameters
    ----------
    text
        The whole file: a table with a header, its columns parted by commas, semicolons, tabs or
        blanks; or rows of reference, x, y, angle, value and package without one.
    name
        Its name, which may tell the side, and for messages.

    Returns
    -------
    The parts. Rows that cannot be read are remarks: no such file is needed to judge a board.

    Notes
    -----
    Columns are known by the names that the trade gives them. The unit is that of a number, of its
    column, or what the text above the table states.

    Examples
    --------
    >>> text = "## Unit = mm\n# Ref Val PosX PosY Rot Side\nC1 1uF 6.05 91.6 90 bottom"
    >>> read(text, "a.pos").parts[0][:6]
    ('C1', 6.05, 91.6, 'bottom', 90.0, '1uF')
    >>> read("C43 56.25 37.39 270 100n C0603", "a.mnb").parts[0][:6]
    ('C43', 56.25, 37.39, 'bottom', 270.0, '100n')
    """
    rows = text.splitlines()
    remarks = []
    if len(rows) > ROWS_CAP:
        remarks.append(f"{name}: only the first {ROWS_CAP} of {len(rows)} rows are read")
        rows = rows[:ROWS_CAP]
    table = _table(rows)
    side = _side_of_name(name)
    parts: list[Placed] = []
    odd: list[int] = []
    for number, row in enumerate(
        rows[table.first :] if table else rows, (table.first if table else 0) + 1
    ):
        if not row.strip() or row.lstrip().startswith(("#", ";", "//")):
            continue
        found = _from_table(row, table, number, side) if table else _from_bare(row, number, side)
        if found is None:
            odd.append(number)
        else:
            parts.append(found)
    if not parts:
        remarks.append(f"{name}: no part with a place was found in it")
    elif odd:
        listed = ", ".join(str(number) for number in odd[:5]) + (" ..." if len(odd) > 5 else "")
        remarks.append(f"{name}: {len(odd)} rows give no part and place (line {listed})")
    unit = table.unit if table else _stated(rows)
    return Placement(name, tuple(parts), unit or "mm", unit is not None, tuple(remarks))


def _table(rows: Sequence[str]) -> _Table | None:
    """Find the header: the first row that names a reference and two coordinates."""
    for number, row in enumerate(rows[:_HEADER_WITHIN]):
        plain = row.strip().lstrip("#").strip()
        if len(plain) > _ROW_CAP:
            continue
        for delimiter in (",", ";", "\t", None):
            cells = _cells(plain, delimiter)
            columns = _columns(cells)
            if columns is not None:
                units = [_OF_COLUMN.search(cells[columns[axis]]) for axis in ("x", "y")]
                unit = _UNIT_WORDS[units[0][1].lower()] if units[0] and units[1] else None
                unit = unit or _stated(rows[:number])
                return _Table(delimiter, columns, len(cells), unit, number + 1)
    return None


def _stated(rows: Sequence[str]) -> str | None:
    for row in rows[:_HEADER_WITHIN]:
        found = _STATED.search(row[:_ROW_CAP])
        if found:
            return _UNIT_WORDS[(found[1] or found[2]).lower()]
    return None


def _columns(cells: Sequence[str]) -> dict[str, int] | None:
    """Which column holds what; None if reference or place is missing."""
    names = [re.sub(r"[^a-z]", "", _OF_COLUMN.sub("", cell).lower()) for cell in cells]
    found: dict[str, int] = {}
    for what, known in _COLUMNS.items():
        at = next((names.index(word) for word in known if word in names), None)
        if at is not None:
            found[what] = at
    return found if {"ref", "x", "y"} <= set(found) else None


def _cells(row: str, delimiter: str | None) -> list[str]:
    if delimiter is None:
        return row.split()
    try:
        return [cell.strip() for cell in next(csv.reader([row], delimiter=delimiter), [])]
    except csv.Error:
        return []


def _from_table(row: str, table: _Table, number: int, side: Side | None) -> Placed | None:
    if len(row) > _ROW_CAP:
        return None
    cells = _cells(row.strip(), table.delimiter)
    spare = len(cells) - table.width
    if table.delimiter is None and spare > 0 and "value" in table.columns:
        # blanks inside a value: the columns after it are counted from the right
        at = table.columns["value"]
        cells = [*cells[:at], " ".join(cells[at : at + spare + 1]), *cells[at + spare + 1 :]]
    held = {what: cells[at] for what, at in table.columns.items() if at < len(cells)}
    unit = table.unit or "mm"
    comma = table.delimiter != ","
    return _placed(
        held.get("ref", ""),
        (
            _length(held.get("x", ""), unit, comma=comma),
            _length(held.get("y", ""), unit, comma=comma),
        ),
        _side(held.get("side", "")) or side,
        held.get("turn", ""),
        held.get("value"),
        number,
    )


def _from_bare(row: str, number: int, side: Side | None) -> Placed | None:
    found = _BARE.match(row.strip()[:_ROW_CAP])
    if found is None:
        return None
    words = (found[5] or "").split()
    # the last word is the package
    value = " ".join(words[:-1]) if len(words) > 1 else None
    place = (_length(found[2], "mm"), _length(found[3], "mm"))
    return _placed(found[1], place, side, found[4], value, number)


def _placed(
    ref: str,
    place: tuple[float | None, float | None],
    side: Side | None,
    turn: str,
    value: str | None,
    number: int,
) -> Placed | None:
    x, y = place
    ref = ref.strip()
    if not ref or len(ref) > _NAME_CAP or x is None or y is None or max(abs(x), abs(y)) > _FAR_MM:
        return None
    angle = _NUMBER.match(turn.strip().removesuffix("deg"))
    return Placed(
        ref,
        round(x, 6),
        round(y, 6),
        side,
        float(angle[1]) if angle else None,
        (value or "").strip()[:_NAME_CAP] or None,
        number,
    )


def _length(word: str, unit: str, *, comma: bool = False) -> float | None:
    """A place in mm; None if it is no number."""
    found = _NUMBER.match(word.replace(",", ".") if comma else word)
    if found is None:
        return None
    own = {'"': "in", "inch": "in", "mils": "mil"}.get(found[2] or "", found[2]) or unit
    value = float(found[1]) * _UNITS_MM[own]
    return value if isfinite(value) else None


def _side(word: str) -> Side | None:
    plain = re.sub(r"[^a-z0-9]", "", word.lower())
    return "top" if plain in _TOP else "bottom" if plain in _BOTTOM else None


def _side_of_name(name: str) -> Side | None:
    """What the file's name says of the side of all its parts.

    Examples
    --------
    >>> [_side_of_name(name) for name in ("a.mnt", "a-bottom.pos", "top_bottom.csv", "a.csv")]
    ['top', 'bottom', None, None]
    """
    end = ending(name)
    if end in ("mnt", "mnb"):
        return "top" if end == "mnt" else "bottom"
    words = set(re.findall(r"[a-z]+", name.rsplit("/", 1)[-1].lower()))
    top, bottom = bool(words & {"top", "front"}), bool(words & {"bottom", "bot", "back"})
    return None if top == bottom else "top" if top else "bottom"
