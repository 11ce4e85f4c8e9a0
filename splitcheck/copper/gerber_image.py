"""Parameters of old files that change the whole image: MI, SF, OF, IR, IP and AS."""

from __future__ import annotations

from splitcheck.copper import gerber_language as language
from splitcheck.copper.apertures import Setting
from splitcheck.copper.gerber_canvas import SAME, Canvas, Copying
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.gerber_numbers import Numbers
from splitcheck.copper.marks import Mark

#: An offset beyond this is a mistake, mm.
MOST_MM = 2000.0


class WholeImage:
    """Image parameters, carried out at the end in the order MI, SF, OF, IR (clause 8.1)."""

    def __init__(self, log: Log, numbers: Numbers) -> None:
        self.log = log
        self.numbers = numbers
        self.negative = False
        self._mirror = (0.0, 0.0)
        self._scale = (1.0, 1.0)
        self._offset = (0.0, 0.0)
        self._turn_deg = 0.0

    def polarity(self, command: str) -> None:
        """Carry out IP."""
        word = language.read_word(command, ("POS", "NEG"))
        if word is None:
            self.log.unreadable(command)
        self.negative = word == "NEG"

    def mirror(self, command: str) -> None:
        """Carry out MI: a 1 turns the sign of that coordinate; apertures keep their shape."""
        self._mirror = self._axes(command, 0.0)

    def scale(self, command: str) -> None:
        """Carry out SF: coordinates are scaled, apertures are not."""
        self._scale = self._axes(command, 1.0)
        if not 0 < min(self._scale) <= max(self._scale) < 1e6:
            self.log.unreadable(command)

    def offset(self, command: str) -> None:
        """Carry out OF, in file units."""
        a, b = self._axes(command, 0.0)
        unit = self.numbers.units() if a or b else 1.0
        if not max(abs(a), abs(b)) * unit < MOST_MM:
            self.log.fail(f"the image offset {command[:40]!r} is beyond {MOST_MM:g} mm")
        self._offset = (a * unit, b * unit)

    def turn(self, command: str) -> None:
        """Carry out IR: the whole image, apertures too, by quarter turns."""
        degrees = {"IR0": 0.0, "IR90": 90.0, "IR180": 180.0, "IR270": 270.0}.get(command)
        if degrees is None:
            self.log.unreadable(command)
        self._turn_deg = degrees
        if degrees:
            self._told(command)

    def axes(self, command: str) -> None:
        """AS concerns plotters only: by the format it does not change the image."""
        if command != "ASAXBY":
            self.log.remark(f"{command[:12]!r} concerns plotters only and is skipped")

    def _axes(self, command: str, neutral: float) -> tuple[float, float]:
        values = language.read_axes(command, neutral)
        if values is None:
            self.log.unreadable(command)
        if values != (neutral, neutral):
            self._told(command)
        return values

    def _told(self, command: str) -> None:
        self.log.remark(f"the whole image is changed by the old command {command[:40]!r}")

    def applied(self, marks: list[Mark], canvas: Canvas) -> list[Mark]:
        """Marks of the finished image."""
        fx = self._scale[0] * (-1 if self._mirror[0] else 1)
        fy = self._scale[1] * (-1 if self._mirror[1] else 1)
        turn = a, b, c, d = Setting(turn_deg=self._turn_deg).matrix()
        points = (a * fx, b * fy, c * fx, d * fy)
        if points == SAME and turn == SAME and self._offset == (0.0, 0.0):
            return marks
        east, north = self._offset
        shift = (a * east + b * north, c * east + d * north)
        return [canvas.copied(mark, Copying(points, turn), shift) for mark in marks]
