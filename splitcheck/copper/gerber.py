"""Gerber (RS-274X, X2, X3): from the text of a file to its marks, in file order."""

from __future__ import annotations

import gc
import re
from collections.abc import Callable
from itertools import pairwise

import numpy as np

from splitcheck.copper import curves
from splitcheck.copper import gerber_language as language
from splitcheck.copper.gerber_attributes import Attributes
from splitcheck.copper.gerber_canvas import Canvas, check_corners
from splitcheck.copper.gerber_image import WholeImage
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.gerber_numbers import Numbers
from splitcheck.copper.gerber_region import Region
from splitcheck.copper.gerber_scan import (
    RUN,
    WORD,
    blocks,
    check_is_text,
    in_order,
    run_numbers,
)
from splitcheck.copper.gerber_tools import Tools, block_code
from splitcheck.copper.marks import Drawing, Flash, Point, Stroke
from splitcheck.units import INCH_MM

#: A coordinate beyond this is a mistake of units or format, mm.
MOST_MM = 2000.0
_LINEAR, _CLOCKWISE = 1, 2


def read(text: str, name: str) -> Drawing:
    """Read one Gerber file.

    Parameters
    ----------
    text
        The whole file.
    name
        File name, for errors and remarks.

    Returns
    -------
    Marks in file order, mm, on the 1 nm grid; step-repeat and blocks written out; arcs as chords
    within 2 um. What is odd but readable is in ``remarks``.

    Raises
    ------
    SplitcheckError
        Whatever cannot be read for sure, with file and line.

    Examples
    --------
    >>> drawing = read("%FSLAX33Y33*%%MOMM*%%ADD10C,0.2*%D10*X0Y0D02*X1000D01*M02*", "a.gbr")
    >>> drawing.marks[0].points, drawing.marks[0].width_mm
    (((0.0, 0.0), (1.0, 0.0)), 0.2)
    """
    check_is_text(text, name)
    collecting = gc.isenabled()
    # Half a million small tuples and no cycles: the collector would take half of the time.
    gc.disable()
    try:
        return _Reader(name).read(text)
    finally:
        if collecting:
            gc.enable()


class _Reader:
    """The graphics state of one file while it is read."""

    def __init__(self, name: str) -> None:
        self.log = Log(name)
        self.numbers = Numbers(self.log)
        self.attributes = Attributes()
        self.tools = Tools(self.log, self.numbers, self.attributes)
        self.canvas = Canvas(name)
        self.region = Region(self.log, self.attributes)
        self.image = WholeImage(self.log, self.numbers)
        self.done = False
        self.at: Point = (0.0, 0.0)
        self.dark = True
        self.mode = _LINEAR
        self.quadrant: bool | None = None
        """True: single quadrant (G74), False: multi (G75), ``None``: not said."""
        self.operation: int | None = None
        """The last of D01, D02, D03, for old files that do not repeat it."""

    def read(self, text: str) -> Drawing:
        for block in blocks(text):
            self.log.line = block.line
            if block.last:
                self.cut_off(block.text, extended=block.extended)
            elif not block.whole:
                self.log.remark("a word without its star before a percent sign")
                self.words(block.text + "*")
            elif block.extended:
                self.extended(block.text)
            else:
                self.words(block.text)
            if self.done:
                break
        self.finish()
        check_corners(self.canvas.marks, self.log.name)
        negative = self.attributes.file.get(".FilePolarity", ())[:1] == ("Negative",)
        return Drawing(
            self.log.name,
            tuple(self.image.applied(self.canvas.marks, self.canvas)),
            tuple(sorted(self.attributes.file.items())),
            self.log.told(),
            self.image.negative or negative,
        )

    def finish(self) -> None:
        if not self.done:
            self.log.remark("the file has no end command (M02); it may have been cut off")
        self.region.check_ended()
        opened = self.canvas.inside_block()
        if opened is not None:
            self.log.fail("a block aperture (AB) is never ended", line=opened)
        while self.canvas.repeating():
            self.canvas.close_repeat()

    def cut_off(self, text: str, *, extended: bool) -> None:
        if not extended and re.fullmatch(r"M0*[02]?", text):
            self.done = True
            return
        what = "an extended command (%)" if extended else f"the word {text[:30]!r}"
        self.log.fail(f"the file ends in the middle of {what}", "copy or export it again")

    # ---------------------------------------------------------------------------------- the words

    def words(self, text: str) -> None:
        """Carry out a stretch of words: long runs of straight draws at once, the rest singly."""
        at = 0
        for run in RUN.finditer(text):
            before = text[at : run.start()]
            self.each_word(before)
            # Blank after the last star, which no word takes.
            self.log.line += before.count("\n", before.rfind("*") + 1)
            if self.done:
                return
            if self.mode != _LINEAR or not self.drawn_at_once(run[0]):
                self.each_word(run[0])
            at = run.end()
        self.each_word(text[at:])

    def drawn_at_once(self, run: str) -> bool:
        """Draw a run of straight lines; False if it must go word by word."""
        corners = self.region.corners
        digits = run_numbers(run)
        ends = run.count("*\n") + run.count("*\r\n")
        if corners is None and not len(digits) - 1 == ends == run.count("\n"):
            # Strokes need their line each: one word a line, or nothing.
            return False
        found = self.numbers.points(digits)
        if found is None or not np.abs(found).max() < MOST_MM:
            return False
        points: list[Point] = [(x, y) for x, y in found.tolist()]
        if corners is not None:
            self.region.draw(self.at, points)
            self.log.line += run.count("\n")
        else:
            for start, end in pairwise((self.at, *points)):
                self.stroke((start, end))
                self.log.line += 1
            self.log.line -= 1
        self.at = points[-1]
        self.operation = 1
        return True

    def each_word(self, text: str) -> None:
        """Carry out words one by one."""
        log, region = self.log, self.region
        for blank, g, x, y, i, j, d, rest in WORD.findall(text):
            if blank:
                log.line += blank.count("\n")
            if rest or g == "4":
                self.odd_word((g, x, y, i, j, d), rest)
                if self.done:
                    return
                continue
            if g:
                if g in ("1", "2", "3"):
                    self.mode = int(g)
                else:
                    self.g_code(int(g))
            if d == "1" or (not d and (x or y) and self.operation == 1):
                self.operation = 1
                end = self.place(x, y)
                if self.mode != _LINEAR:
                    self.arc(end, i, j)
                elif not region.corners:
                    self.line_to(end)
                else:
                    region.corners.append(end)
                self.at = end
            elif d or x or y:
                self.other_operation(x, y, d)

    def other_operation(self, x: str, y: str, d: str) -> None:
        """D02 and D03, an aperture code, or coordinates alone."""
        code = int(d) if d else self.operation
        if code not in (1, 2, 3, None):
            self.tools.select(int(d))
            if x or y:
                self.log.remark("coordinates together with an aperture code are left out")
            return
        if code is None:
            self.log.remark("coordinates before any D01, D02 or D03 are taken as a move")
            code = 2
        else:
            self.operation = code
        self.at = self.place(x, y)
        if self.region.corners is None:
            if code == 3:
                self.flash()
        elif code == 3:
            self.log.remark("a flash inside a region is left out")
        else:
            self.canvas.marks += self.region.ended_contour(dark=self.dark)
            self.region.move(self.at)

    def place(self, x: str, y: str) -> Point:
        """Where X and Y lead; what is missing stays as it is."""
        to_x, to_y = self.numbers.converters()
        at_x, at_y = self.at
        if self.numbers.incremental:
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

    def odd_word(self, known: tuple[str, ...], rest: str) -> None:
        """A word that is more than plain coordinates: comment, end, decimals, another order."""
        line = self.log.line
        word = "".join(a + b for a, b in zip("GXYIJD", known, strict=True) if b) + rest
        parts = in_order(word)
        if known[0] == "4":
            self.comment(rest)
        elif parts is None:
            self.strange(" ".join(word.split()))
        else:
            for part in parts:
                self.ordered(part)
        self.log.line = line + rest.count("\n")

    def ordered(self, part: dict[str, str]) -> None:
        if "M" in part:
            self.ended(part["M"])
        if self.done:
            return
        for axis in "XYIJ":
            if "." in part.get(axis, ""):
                part[axis] = self.numbers.digits(part[axis], axis)
        self.words("".join(key + part[key] for key in "GXYIJD" if key in part) + "*")

    def strange(self, word: str) -> None:
        """A word that is none: skipped if it can hardly be copper, else an error."""
        if word[:2] in _COMMANDS or word[:2] in _ATTRIBUTES:
            self.log.remark(f"command {word[:2]!r} stands outside of percent signs")
            self.command(word)
        elif word[:1] in ("X", "Y", "D"):
            self.log.unreadable(word)
        else:
            self.log.remark(f"unknown word {word[:12]!r} is skipped")

    def ended(self, number: str) -> None:
        if number.strip("0") in ("", "2"):
            self.done = True
        elif number.strip("0") != "1":
            self.log.remark(f"unknown code M{number[:12]}")

    def comment(self, text: str) -> None:
        content = text.strip()
        if content.startswith("#@!"):
            command = content[3:].strip(" %")
            if command[:2] in _ATTRIBUTES:
                self.attribute(command)

    def g_code(self, number: int) -> None:
        """A G code other than G01 to G03."""
        match number:
            case 36:
                self.region.begin()
            case 37:
                self.end_region()
            case 70 | 71:
                self.numbers.set_unit(INCH_MM if number == 70 else 1.0, f"G{number}")
            case 74 | 75:
                self.quadrant = number == 74
            case 90 | 91:
                self.numbers.incremental = number == 91
            # G54 and G55 only announce the D code that follows; G00 is the old move.
            case 0 | 4 | 54 | 55:
                pass
            case _:
                self.log.remark(f"unknown code G{number:02}")

    # --------------------------------------------------------------------------------- operations

    def line_to(self, end: Point) -> None:
        if self.region.corners is None:
            self.stroke((self.at, end))
        else:
            self.region.draw(self.at, (end,))

    def stroke(self, points: tuple[Point, ...]) -> None:
        tools = self.tools
        brush = tools.brush or tools.take()
        tag = tools.tag or tools.make_tag()
        marks, line = self.canvas.marks, self.log.line
        if brush.diameter_mm is not None:
            marks.append(Stroke(points, brush.diameter_mm, None, self.dark, tag, line))
        elif brush.block is not None:
            self.log.remark("a line drawn with a block aperture is left out")
        else:
            for shape in brush.shapes:
                marks.append(Stroke(points, brush.width_mm, shape, self.dark, tag, line))

    def flash(self) -> None:
        tools = self.tools
        brush = tools.brush or tools.take()
        tag = tools.tag or tools.make_tag()
        at, dark, line = self.at, self.dark, self.log.line
        if brush.block is not None:
            self.canvas.set_down(brush.block, tools.setting, at, tag, line, dark=dark)
            return
        for shape in brush.shapes:
            self.canvas.marks.append(Flash(at, shape, dark, tag, line, brush.diameter_mm))

    def arc(self, end: Point, i: str, j: str) -> None:
        to_x, to_y = self.numbers.converters()
        start = self.at
        offset = (to_x(i) if i else 0.0, to_y(j) if j else 0.0)
        clockwise = self.mode == _CLOCKWISE
        if not max(abs(offset[0]), abs(offset[1])) < 100 * MOST_MM:
            self.log.fail("an arc has its centre beyond 200 m", "check the number format (FS)")
        if offset == (0.0, 0.0):
            self.log.remark("an arc without a centre is drawn straight")
            points = [end]
        elif self.single_quadrant(start, end, offset, clockwise=clockwise):
            centre, fits = curves.quadrant_centre(start, end, offset, clockwise=clockwise)
            if not fits:
                self.log.remark("an arc of more than a quarter turn in single-quadrant mode (G74)")
            # In this mode an arc between equal points has no length, and is no circle.
            points = [end] if start == end else curves.arc(start, end, centre, clockwise=clockwise)
        else:
            centre = (start[0] + offset[0], start[1] + offset[1])
            points = curves.arc(start, end, centre, clockwise=clockwise)
        if self.region.corners is None:
            self.stroke((start, *points))
        else:
            self.region.draw(start, points)

    def single_quadrant(self, start: Point, end: Point, offset: Point, *, clockwise: bool) -> bool:
        if self.quadrant is not None:
            return self.quadrant
        self.log.remark("arcs without G74 or G75; each is read the way that its centre fits")
        if min(offset) < 0 or start == end:
            return False
        return curves.quadrant_centre(start, end, offset, clockwise=clockwise)[1]

    def end_region(self) -> None:
        if self.region.corners is None:
            self.log.remark("an end of a region (G37) without its begin")
            return
        self.canvas.marks += self.region.ended_contour(dark=self.dark)
        self.region.end()

    # -------------------------------------------------------------------------- extended commands

    def extended(self, text: str) -> None:
        """Carry out what stands between two percent signs: a macro, or commands one by one."""
        line = self.log.line
        if text.lstrip()[:2] == "AM":
            self.log.line += _newlines_before(text)
            self.tools.define_macro(text)
            return
        for part in text.split("*"):
            command = part.strip()
            if command:
                self.log.line = line + _newlines_before(part)
                self.command(command)
            line += part.count("\n")

    def command(self, command: str) -> None:
        kind = command[:2]
        if kind in _ATTRIBUTES:
            self.attribute(command)
        elif kind in _COMMANDS:
            _COMMANDS[kind](self, "".join(command.split()))
        elif command[0] in "GDXYM":
            self.words(command + "*")
        # Names of the image and of layers say nothing of it.
        elif kind not in ("IN", "LN"):
            self.log.remark(f"unknown command {kind!r} is skipped")

    def attribute(self, command: str) -> None:
        self.tools.tag = None
        odd = self.attributes.obey(command)
        if odd:
            self.log.remark(odd)

    def load_polarity(self, command: str) -> None:
        word = language.read_word(command, ("C", "D"))
        if word is None:
            self.log.unreadable(command)
        self.dark = word == "D"

    def step_repeat(self, command: str) -> None:
        if self.canvas.repeating():
            self.canvas.close_repeat()
        if command == "SR":
            return
        repeat = language.read_repeat(command)
        if repeat is None or repeat.columns < 1 or repeat.rows < 1:
            self.log.unreadable(command)
        if repeat.columns == repeat.rows == 1:
            # The old way to say that nothing is repeated; some headers do.
            return
        unit = self.numbers.units()
        repeat = repeat._replace(step_x=repeat.step_x * unit, step_y=repeat.step_y * unit)
        self.canvas.open_repeat(repeat, self.log.line)

    def block(self, command: str) -> None:
        code = block_code(command)
        if command == "AB":
            closed = self.canvas.close_block()
            if closed is None:
                self.log.remark("an end of a block aperture (AB) without its begin")
            else:
                self.tools.define_block(*closed)
        elif code is None:
            self.log.unreadable(command)
        else:
            self.canvas.open_block(code, self.log.line)
        self.tools.open_codes = self.canvas.open_codes()
        self.tools.brush = None


def _newlines_before(text: str) -> int:
    """Line ends before the first character that is more than blank."""
    return text[: len(text) - len(text.lstrip())].count("\n")


_ATTRIBUTES = ("TF", "TA", "TO", "TD")
_COMMANDS: dict[str, Callable[[_Reader, str], None]] = {
    "FS": lambda reader, command: reader.numbers.load_format(command),
    "MO": lambda reader, command: reader.numbers.load_unit(command),
    "AD": lambda reader, command: reader.tools.define(command),
    "LP": _Reader.load_polarity,
    "LM": lambda reader, command: reader.tools.load_mirroring(command),
    "LR": lambda reader, command: reader.tools.load_rotation(command),
    "LS": lambda reader, command: reader.tools.load_scaling(command),
    "SR": _Reader.step_repeat,
    "AB": _Reader.block,
    "IP": lambda reader, command: reader.image.polarity(command),
    "IR": lambda reader, command: reader.image.turn(command),
    "OF": lambda reader, command: reader.image.offset(command),
    "MI": lambda reader, command: reader.image.mirror(command),
    "SF": lambda reader, command: reader.image.scale(command),
    "AS": lambda reader, command: reader.image.axes(command),
}
