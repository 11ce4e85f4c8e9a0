"""The rare commands of a Gerber file: plain ones at once, the rest by pygerber's grammar or ours.

What nearly every file writes (``FSLAX46Y46``, ``ADD10C,0.2``) has one reading, and a pattern finds
it in a microsecond; pygerber takes milliseconds for each and a third of a second to be imported.
"""

from __future__ import annotations

import decimal
import re
import warnings
from functools import cache, lru_cache
from typing import Any, NamedTuple

from splitcheck.copper.apertures import Definition
from splitcheck.units import INCH_MM


class Format(NamedTuple):
    """What FS says of coordinates."""

    decimals: tuple[int, int]
    digits: tuple[int, int]
    """All digits of X and of Y, needed where trailing zeros are left out."""
    trailing_omitted: bool
    incremental: bool


class Repeat(NamedTuple):
    """What SR says: numbers of copies and steps in file units."""

    columns: int
    rows: int
    step_x: float
    step_y: float


@cache
def _tokenizer() -> Any:
    """The tokenizer of pygerber: its import takes a third of a second, so it waits until needed."""
    precision = decimal.getcontext().prec
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from pygerber.gerberx3.tokenizer.tokenizer import Tokenizer  # noqa: PLC0415 - see above

        tokenizer = Tokenizer()
    # Importing it sets the precision of all decimals of the process.
    decimal.getcontext().prec = precision
    return tokenizer


@lru_cache(maxsize=4096)
def token(command: str) -> Any:
    """One extended command as pygerber's token, or ``None`` where its grammar says no.

    Examples
    --------
    >>> type(token("LPC")).__name__, token("MIA1B0")
    ('LoadPolarity', None)
    """
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import pyparsing  # noqa: PLC0415 - comes with pygerber, and as late

        try:
            for found in _tokenizer().tokenize_expressions(f"%{command}*%"):
                return found
        except (pyparsing.ParseException, RecursionError, ValueError, decimal.DecimalException):
            return None
    return None


_PLAIN_FORMAT = re.compile(r"FSLAX\d\dY\d\d", re.ASCII)
_FORMAT = re.compile(r"FS([LTD]?)([AI]?)(?:N\d+)?(?:G\d+)?X(\d)(\d)Y(\d)(\d)(?:D\d+)?(?:M\d+)?$")


def read_format(command: str) -> Format | None:
    """Read FS; ``None`` if it cannot be understood.

    Examples
    --------
    >>> read_format("FSLAX45Y45")
    Format(decimals=(5, 5), digits=(9, 9), trailing_omitted=False, incremental=False)
    """
    found = None if _PLAIN_FORMAT.fullmatch(command) else token(command)
    if found is not None:
        x, y = found.x_format, found.y_format
        return Format(
            (x.decimal, y.decimal),
            (x.integer + x.decimal, y.integer + y.decimal),
            found.zeros_mode.value == "T",
            found.coordinate_mode.value == "I",
        )
    match = _FORMAT.match(command)
    if match is None:
        return None
    zeros, mode, *numbers = match.groups()
    x_whole, x_part, y_whole, y_part = map(int, numbers)
    digits = (x_whole + x_part, y_whole + y_part)
    return Format((x_part, y_part), digits, zeros == "T", mode == "I")


def read_unit(command: str) -> float | None:
    """Read MO: one file unit in mm."""
    units = {"MM": 1.0, "IN": INCH_MM}
    if command[2:] in units:
        return units[command[2:]]
    found = token(command)
    return units.get(found.unit.value if found is not None else command[2:].strip())


_SIZE = r"\d{1,9}(?:\.\d{1,15})?"
#: A circle, rectangle or obround with or without a hole, or a macro of two letters or more.
_PLAIN_DEFINITION = re.compile(
    r"ADD(?P<code>[1-9]\d{1,8})"
    rf"(?:(?P<round>C),(?P<diameter>{_SIZE}(?:X{_SIZE})?)"
    rf"|(?P<long>[RO]),(?P<sides>{_SIZE}X{_SIZE}(?:X{_SIZE})?)"
    rf"|(?P<macro>[A-Za-z_]\w+)(?:,(?P<values>-?{_SIZE}(?:X-?{_SIZE})*))?)",
    re.ASCII,
)
_DEFINITION = re.compile(r"AD\s*D0*(\d+)\s*([^,\s][^,]*?)\s*(?:,(.*))?$", re.DOTALL)


def read_definition(command: str) -> Definition | None:
    """Read AD; ``None`` if it cannot be understood.

    Examples
    --------
    >>> read_definition("ADD10R,1X2")
    Definition(code=10, template='R', parameters=(1.0, 2.0))
    >>> read_definition("ADD11A-B,.5X")
    Definition(code=11, template='A-B', parameters=(0.5,))
    """
    plain = _PLAIN_DEFINITION.fullmatch(command)
    if plain is not None:
        template = plain["round"] or plain["long"] or plain["macro"]
        values = plain["diameter"] or plain["sides"] or plain["values"]
        numbers = tuple(map(float, values.split("X"))) if values else ()
        return Definition(int(plain["code"]), template, numbers)
    found = token(command)
    if found is not None:
        return _definition(found)
    match = _DEFINITION.match(command)
    if match is None:
        return None
    code, template, values = match.groups()
    try:
        numbers = tuple(float(v) for v in re.split("[Xx]", values or "") if v.strip())
    except ValueError:
        return None
    return Definition(int(code), template, numbers) if int(code) >= 10 else None


def _definition(found: Any) -> Definition | None:
    code = int(found.aperture_id[1:])
    values: list[Any]
    match type(found).__name__:
        case "DefineCircle":
            template, values = "C", [found.diameter, found.hole_diameter]
        case "DefineRectangle":
            template, values = "R", [found.x_size, found.y_size, found.hole_diameter]
        case "DefineObround":
            template, values = "O", [found.x_size, found.y_size, found.hole_diameter]
        case "DefinePolygon":
            turn = 0 if found.rotation is None else found.rotation
            values = [found.outer_diameter, found.number_of_vertices, turn, found.hole_diameter]
            template = "P"
        case "DefineMacro":
            template, values = found.aperture_type, found.am_param
        case _:
            return None
    return Definition(code, template, tuple(float(v) for v in values if v is not None))


def read_repeat(command: str) -> Repeat | None:
    """Read SR with its counts; ``None`` if it cannot be understood."""
    found = token(command)
    if found is not None and type(found).__name__ == "StepRepeatBegin":
        return Repeat(found.x_repeat, found.y_repeat, float(found.x_step), float(found.y_step))
    # Every part may be missing in old files.
    number = r"([+-]?\d*\.?\d*)"
    match = re.match(rf"SR(?:X(\d+))?(?:Y(\d+))?(?:I{number})?(?:J{number})?$", command)
    if match is None:
        return None
    try:
        return Repeat(
            int(match[1] or 1), int(match[2] or 1), float(match[3] or 0), float(match[4] or 0)
        )
    except ValueError:
        return None


_PLAIN_NUMBER = re.compile(r"-?\d{1,9}(?:\.\d{1,15})?", re.ASCII)


def read_number(command: str) -> float | None:
    """Read the number of LR or LS."""
    found = None if _PLAIN_NUMBER.fullmatch(command[2:]) else token(command)
    if found is not None:
        return float(found.rotation if command[:2] == "LR" else found.scaling)
    try:
        return float(command[2:])
    except ValueError:
        return None


def read_word(command: str, words: tuple[str, ...]) -> str | None:
    """Read the one word of LP, LM or IP; ``None`` if it is none of those allowed."""
    if command[2:] in words:
        return command[2:]
    found = token(command)
    if found is not None:
        value = getattr(
            found, {"LP": "polarity", "LM": "mirroring"}.get(command[:2], "image_polarity")
        )
        word = str(value.value)
    else:
        word = command[2:].strip()
    return word if word in words else None


_AXES = re.compile(r"[A-Z]{2}(?:A([+-]?\d*\.?\d*))?(?:B([+-]?\d*\.?\d*))?$")


def read_axes(command: str, default: float) -> tuple[float, float] | None:
    """Read OF, MI or SF: a number for A and one for B."""
    match = _AXES.match(command)
    if match is None:
        return None
    try:
        a, b = (float(v) if v else default for v in match.groups())
    except ValueError:
        return None
    return a, b
