"""Gerber (RS-274X, X2, X3): from the text of a file to its marks, in file order."""

from __future__ import annotations

import gc
import re
from collections.abc import Callable

from splitcheck.copper import gerber_language as language
from splitcheck.copper.gerber_attributes import Attributes
from splitcheck.copper.gerber_canvas import Canvas, check_corners
from splitcheck.copper.gerber_image import WholeImage
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.gerber_numbers import Numbers
from splitcheck.copper.gerber_pen import Pen
from splitcheck.copper.gerber_scan import (
    RUN,
    WORD,
    blocks,
    check_is_text,
    in_order,
    run_numbers,
)
from splitcheck.copper.gerber_tools import Tools, block_code
from splitcheck.copper.marks import Drawing
from splitcheck.units import INCH_MM

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
        self.pen = Pen(self.log, self.tools, self.canvas, self.attributes)
        self.image = WholeImage(self.log, self.numbers)
        self.done = False
        self.mode = _LINEAR
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
        self.pen.region.check_ended()
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
        digits = run_numbers(run)
        newlines = run.count("\n")
        ends = run.count("*\n") + run.count("*\r\n")
        if self.pen.region.corners is None and not len(digits) - 1 == ends == newlines:
            # Strokes need their line each: one word a line, or nothing.
            return False
        found = self.numbers.points(digits)
        if found is None:
            return False
        self.pen.lines_to(list(map(tuple, found.tolist())), newlines)
        self.operation = 1
        return True

    def each_word(self, text: str) -> None:
        """Carry out words one by one."""
        log, pen = self.log, self.pen
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
                end = self.numbers.place(pen.at, x, y)
                if self.mode == _LINEAR:
                    pen.line_to(end)
                else:
                    offset = self.numbers.offset(i, j)
                    pen.arc_to(end, offset, clockwise=self.mode == _CLOCKWISE)
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
        end = self.numbers.place(self.pen.at, x, y)
        if code == 3:
            self.pen.flash_at(end)
        else:
            self.pen.move_to(end)

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
        if number.lstrip("0") in ("", "2"):
            self.done = True
        elif number.lstrip("0") != "1":
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
                self.pen.region.begin()
            case 37:
                self.pen.end_region()
            case 70 | 71:
                self.numbers.set_unit(INCH_MM if number == 70 else 1.0, f"G{number}")
            case 74 | 75:
                self.pen.quadrant = number == 74
            case 90 | 91:
                self.numbers.incremental = number == 91
            # G54 and G55 only announce the D code that follows; G00 is the old move.
            case 0 | 4 | 54 | 55:
                pass
            case _:
                self.log.remark(f"unknown code G{number:02}")

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
        self.pen.dark = word == "D"

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
