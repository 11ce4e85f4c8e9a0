"""Digits to mm: units (MO, G70, G71) and number format (FS) of a Gerber file."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from splitcheck.copper import gerber_language as language
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.marks import Point
from splitcheck.units import Floats

#: A coordinate beyond this is a mistake of units or format, mm.
MOST_MM = 2000.0

Convert: TypeAlias = Callable[[str], float]


class Numbers:
    """Units and format in force, and the two functions that turn digits of X and Y into mm."""

    def __init__(self, log: Log) -> None:
        self.log = log
        self.unit_mm: float | None = None
        self.format: language.Format | None = None
        self.incremental = False
        self._convert: tuple[Convert, Convert] | None = None

    def load_format(self, command: str) -> None:
        """Carry out FS."""
        found = language.read_format(command)
        if found is None:
            self.log.unreadable(command)
        self.format = found
        self.incremental = found.incremental
        self._convert = None

    def load_unit(self, command: str) -> None:
        """Carry out MO."""
        unit = language.read_unit(command)
        if unit is None:
            self.log.unreadable(command)
        self.set_unit(unit, "MO")

    def set_unit(self, unit_mm: float, by: str) -> None:
        """Change units; saying the same again is common, changing them is odd."""
        if self.unit_mm is not None and self.unit_mm != unit_mm:
            self.log.remark(f"units change to {'mm' if unit_mm == 1 else 'inch'} ({by})")
        self.unit_mm = unit_mm
        self._convert = None

    def units(self) -> float:
        """One file unit in mm; an error if the file has not said it yet."""
        if self.unit_mm is None:
            wrong = "the file does not say its units (MO) before they are needed"
            self.log.fail(wrong, "export it again with %MOMM*% or %MOIN*% in its header")
        return self.unit_mm

    def converters(self) -> tuple[Convert, Convert]:
        """The functions for X (and I) and for Y (and J)."""
        if self._convert is None:
            if self.format is None:
                wrong = "coordinates come before the number format (FS)"
                self.log.fail(wrong, "export the file again with a header")
            how, unit = self.format, self.units()
            self._convert = (
                converter(how.decimals[0], how.digits[0], unit, trailing=how.trailing_omitted),
                converter(how.decimals[1], how.digits[1], unit, trailing=how.trailing_omitted),
            )
        return self._convert

    def place(self, at: Point, x: str, y: str) -> Point:
        """Where X and Y lead; what is missing stays as it is."""
        to_x, to_y = self.converters()
        at_x, at_y = at
        if self.incremental:
            at_x = round(at_x + to_x(x or "0"), 6)
            at_y = round(at_y + to_y(y or "0"), 6)
        else:
            if x:
                at_x = to_x(x)
            if y:
                at_y = to_y(y)
        if not (-MOST_MM < at_x < MOST_MM and -MOST_MM < at_y < MOST_MM):
            wrong = f"the coordinate ({at_x:g}, {at_y:g}) mm is beyond the limit of {MOST_MM:g} mm"
            self.log.fail(wrong, "check the units and the number format (MO, FS) of the export")
        return (at_x, at_y)

    def offset(self, i: str, j: str) -> Point:
        """I and J, from the start of an arc to its centre, mm; what is missing is 0."""
        to_x, to_y = self.converters()
        offset = (to_x(i) if i else 0.0, to_y(j) if j else 0.0)
        if not max(abs(offset[0]), abs(offset[1])) < 100 * MOST_MM:
            self.log.fail("an arc has its centre beyond 200 m", "check the number format (FS)")
        return offset

    def points(self, digits: NDArray[np.int64]) -> Floats | None:
        """Many coordinates at once, shape (n, 2), mm; ``None`` where it must go one by one."""
        self.converters()
        assert self.format is not None
        assert self.unit_mm is not None
        if self.incremental or self.format.trailing_omitted:
            return None
        divisor = np.array([10**decimals for decimals in self.format.decimals])
        if self.unit_mm == 1.0 and max(self.format.decimals) <= 6:
            mm: Floats = digits / divisor
        else:
            nm = (digits * round(self.unit_mm * 1_000_000) + divisor // 2) // divisor
            mm = nm / 1_000_000
        return mm if np.abs(mm).max() < MOST_MM else None

    def digits(self, text: str, axis: str) -> str:
        """A coordinate with a decimal point, as the digits that the file's format would have."""
        self.converters()
        assert self.format is not None
        self.log.remark("coordinates with a decimal point, taken as file units")
        which = axis in "YJ"
        if sum(c.isdigit() for c in text) > 20:
            self.log.unreadable(axis + text)
        whole = round(float(text.rstrip("+-.") and text) * 10 ** self.format.decimals[which])
        sign = "-" if whole < 0 else ""
        if not self.format.trailing_omitted:
            return str(whole)
        return sign + str(abs(whole)).rjust(self.format.digits[which], "0")


def converter(decimals: int, digits: int, unit_mm: float, *, trailing: bool) -> Convert:
    """From the digits of a coordinate to mm, rounded once to 1 nm.

    Parameters
    ----------
    decimals, digits
        Digits after the point, and all digits.
    unit_mm
        One file unit, mm: 1 or 25.4.
    trailing
        Trailing zeros are left out, so digits count from the left.

    Examples
    --------
    >>> converter(4, 6, 25.4, trailing=True)("01"), converter(5, 9, 1.0, trailing=False)("-1")
    (25.4, -1e-05)
    """
    divisor: int = 10**decimals
    if unit_mm == 1.0 and decimals <= 6:
        # An integer over a power of ten is the nearest float to the decimal: on the grid as is.
        def plain(text: str) -> float:
            return int(text) / divisor
    else:
        unit_nm = round(unit_mm * 1_000_000)
        half = divisor // 2

        def plain(text: str) -> float:
            return (int(text) * unit_nm + half) // divisor / 1_000_000

    if not trailing:
        return plain

    def padded(text: str) -> float:
        sign = text[0] if text[0] in "+-" else ""
        return plain(sign + text.lstrip("+-").ljust(digits, "0"))

    return padded
