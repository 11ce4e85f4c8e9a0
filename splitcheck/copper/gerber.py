"""Gerber (RS-274X, X2, X3): from the text of a file to its marks, in file order."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import NoReturn

from splitcheck.copper import apertures, curves
from splitcheck.copper import gerber_language as language
from splitcheck.copper.apertures import Brush, Definition, Setting
from splitcheck.copper.gerber_attributes import Attributes
from splitcheck.copper.gerber_canvas import Canvas, Copying, brush_marks
from splitcheck.copper.gerber_scan import WORD, blocks, check_is_text
from splitcheck.copper.marks import Drawing, Fill, Mark, Point, Stroke, Tag
from splitcheck.errors import SplitcheckError
from splitcheck.units import INCH_MM

#: A coordinate beyond this is a mistake of units or format, mm.
MOST_MM = 2000.0
_AGAIN = "export the file again"
_LINEAR, _CLOCKWISE, _COUNTER = 1, 2, 3
_PARTS = re.compile(r"([A-Z])([+-]?\d*\.?\d*)")


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
    return _Reader(name).read(text)


class _Reader:
    """The graphics state of one file while it is read."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.line = 1
        self.canvas = Canvas(name)
        self.attributes = Attributes()
        self.remarks: dict[str, list[int]] = {}
        self.done = False
        # Coordinates
        self.unit_mm: float | None = None
        self.format: language.Format | None = None
        self.incremental = False
        self.convert: tuple[Callable[[str], float], Callable[[str], float]] | None = None
        self.at: Point = (0.0, 0.0)
        # Objects
        self.mode = _LINEAR
        self.quadrants: bool | None = None
        """True: single quadrant (G74), False: multi (G75), ``None``: not said."""
        self.operation: int | None = None
        self.dark = True
        self.setting = apertures.PLAIN
        self.image_negative = False
        # Apertures
        self.bodies: dict[str, str] = {}
        self.definitions: dict[int, tuple[Definition, float | None, str | None, int]] = {}
        self.brushes: dict[int, Brush] = {}
        self.ready: dict[tuple[int, Setting], Brush] = {}
        self.code: int | None = None
        self.brush: Brush | None = None
        self.tag: Tag | None = None
        # Regions
        self.region_line: int | None = None
        self.region_tag: Tag | None = None
        self.contour: list[Point] = []
        self.contour_line = 0
        # Image parameters of old files
        self.image: dict[str, tuple[float, float]] = {}

    # ----------------------------------------------------------------------------- the whole file

    def read(self, text: str) -> Drawing:
        for block in blocks(text):
            self.line = block.line
            if not block.whole:
                self.cut_off(block.text, extended=block.extended)
            elif block.extended:
                self.extended(block.text)
            else:
                self.words(block.text)
            if self.done:
                break
        self.finish()
        marks = self.canvas.marks
        return Drawing(
            self.name,
            tuple(self.whole_image(marks)),
            tuple(sorted(self.attributes.file.items())),
            self.told(),
            self.image_negative or self.declared_negative(),
        )

    def finish(self) -> None:
        if not self.done:
            self.remark("the file has no end command (M02)")
        if self.region_line is not None:
            self.fail("a region (G36) is never ended (G37)", _AGAIN, self.region_line)
        opened = self.canvas.inside_block()
        if opened is not None:
            self.fail("a block aperture (AB) is never ended", _AGAIN, opened)
        while self.canvas.repeating():
            self.canvas.close_repeat()

    def cut_off(self, text: str, *, extended: bool) -> None:
        if not extended and re.fullmatch(r"M0*[02]", text):
            self.done = True
            return
        what = "an extended command (%)" if extended else f"the word {text[:30]!r}"
        self.fail(f"the file ends in the middle of {what}", "copy or export it again")

    def told(self) -> tuple[str, ...]:
        told = []
        for text, lines in self.remarks.items():
            more = f" ({len(lines)} times)" if len(lines) > 1 else ""
            told.append((lines[0], f"{self.name}:{lines[0]}: {text}{more}"))
        return tuple(text for _, text in sorted(told))

    def declared_negative(self) -> bool:
        return self.attributes.file.get(".FilePolarity", ("",))[:1] == ("Negative",)

    def remark(self, text: str) -> None:
        self.remarks.setdefault(text, []).append(self.line)

    def fail(self, wrong: str, do: str, line: int | None = None) -> NoReturn:
        raise SplitcheckError(f"{self.name}:{self.line if line is None else line}", wrong, do)

    # --------------------------------------------------------------------------------- the words

    def words(self, text: str) -> None:
        """Carry out a stretch of words: the one loop that every coordinate goes through."""
        for blank, g, x, y, i, j, d, rest in WORD.findall(text):
            if blank:
                self.line += blank.count("\n")
            if rest:
                self.odd_word(g, x, y, i, j, d, rest)
                if self.done:
                    return
                continue
            if g:
                if g in ("1", "2", "3"):
                    self.mode = int(g)
                elif self.g_code(int(g), d):
                    continue
            if d and len(d) > 1:
                self.select(int(d))
                if not (x or y):
                    continue
                d = ""
            if d == "1" or (not d and (x or y) and self.operation == 1):
                self.operation = 1
                end = self.place(x, y)
                if self.mode == _LINEAR:
                    if self.region_line is not None:
                        if not self.contour:
                            self.begin_contour()
                        self.contour.append(end)
                    else:
                        self.stroke((self.at, end))
                else:
                    self.arc(end, i, j)
                self.at = end
            elif d or x or y:
                self.move_or_flash(x, y, d)

    def place(self, x: str, y: str) -> Point:
        """Where X and Y lead; what is missing stays as it is."""
        if self.convert is None:
            self.prepare()
        assert self.convert is not None
        at_x, at_y = self.at
        if x:
            at_x = self.convert[0](x) + (at_x if self.incremental else 0.0)
        if y:
            at_y = self.convert[1](y) + (at_y if self.incremental else 0.0)
        if not (-MOST_MM < at_x < MOST_MM and -MOST_MM < at_y < MOST_MM):
            wrong = f"the coordinate ({at_x:g}, {at_y:g}) mm is beyond the limit of {MOST_MM:g} mm"
            self.fail(wrong, "check the units and the number format (MO, FS) of the export")
        if self.incremental:
            return (round(at_x, 6), round(at_y, 6))
        return (at_x, at_y)

    def move_or_flash(self, x: str, y: str, d: str) -> None:
        operation = int(d) if d else self.operation
        if operation not in (2, 3):
            if operation is None:
                self.remark("coordinates before any D01, D02 or D03 are taken as a move")
                self.at = self.place(x, y)
            else:
                self.remark(f"unknown code D{operation:02}")
            return
        self.operation = operation
        self.at = self.place(x, y) if x or y else self.at
        if self.region_line is not None:
            if operation == 3:
                self.remark("a flash inside a region is left out")
                return
            self.end_contour()
            self.begin_contour()
        elif operation == 3:
            self.flash()

    def odd_word(self, g: str, x: str, y: str, i: str, j: str, d: str, rest: str) -> None:
        """A word that is more than coordinates: comment, end, decimals, another order."""
        if g == "4" and not (x or y or i or j or d):
            self.comment(rest)
            self.line += rest.count("\n")
            return
        word = f"{g and 'G' + g}{x and 'X' + x}{y and 'Y' + y}{i and 'I' + i}{j and 'J' + j}"
        word += f"{d and 'D' + d}{rest}"
        here, self.line = self.line, self.line
        compact = "".join(word.split()).upper()
        parts = _PARTS.findall(compact)
        if "".join(a + b for a, b in parts) != compact or not parts:
            self.remark(f"unknown word {compact[:12]!r}")
        else:
            self.lettered(parts, compact)
        self.line = here + rest.count("\n")

    def lettered(self, parts: list[tuple[str, str]], word: str) -> None:
        values = dict(parts)
        if "M" in values:
            number = values["M"].lstrip("0") or "0"
            if number in "02":
                self.done = True
            elif number != "1":
                self.remark(f"unknown code M{values['M']}")
            return
        if len(values) < len(parts):
            # Several G codes in one word: each by itself, in order.
            for position, (letter, _) in enumerate(parts):
                if letter == "G" and position:
                    self.words("".join(a + b for a, b in parts[:position]) + "*")
                    self.words("".join(a + b for a, b in parts[position:]) + "*")
                    return
        if set(values) - set("GXYIJDN") or len(values) < len(parts):
            self.remark(f"unknown word {word[:12]!r}")
            return
        order = {key: values.get(key, "") for key in "GXYIJD"}
        for key in "XYIJ":
            if "." in order[key]:
                order[key] = self.from_decimal(order[key], key)
        if any(not v.lstrip("+-").isdigit() for v in order.values() if v):
            self.remark(f"unknown word {word[:12]!r}")
            return
        plain = "".join(key + value for key, value in order.items() if value)
        if plain:
            self.words(plain + "*")

    def from_decimal(self, text: str, axis: str) -> str:
        """A coordinate with a decimal point, as the digits that the file's format would have."""
        if self.convert is None:
            self.prepare()
        assert self.format is not None
        self.remark("coordinates with a decimal point, taken as file units")
        which = axis in "YJ"
        digits = round(float(text or 0) * 10 ** self.format.decimals[which])
        sign = "-" if digits < 0 else ""
        if not self.format.trailing_omitted:
            return str(digits)
        return sign + str(abs(digits)).rjust(self.format.digits[which], "0")

    def comment(self, text: str) -> None:
        content = text.strip()
        if content.startswith("#@!"):
            command = content[3:].strip()
            if command[:2] in ("TF", "TA", "TO", "TD"):
                self.attribute(command)

    def g_code(self, number: int, d: str) -> bool:
        """Carry out a G code other than G01 to G03; True if it took the D code with it."""
        if number == 36:
            self.begin_region()
        elif number == 37:
            self.end_region()
        elif number == 54:
            if d:
                self.select(int(d))
            return True
        elif number == 4:
            return True
        elif number in (70, 71):
            self.set_unit(INCH_MM if number == 70 else 1.0, f"G{number}")
        elif number in (74, 75):
            self.quadrants = number == 74
        elif number in (90, 91):
            self.incremental = number == 91
        elif number not in (0, 55):
            self.remark(f"unknown code G{number:02}")
        return False

    # --------------------------------------------------------------------------------- operations

    def stroke(self, points: tuple[Point, ...]) -> None:
        brush = self.brush or self.take()
        tag = self.tag or self.make_tag(brush)
        marks = self.canvas.marks
        if brush.diameter_mm is not None:
            marks.append(Stroke(points, brush.diameter_mm, None, self.dark, tag, self.line))
        elif brush.block is not None:
            self.remark("a line drawn with a block aperture is left out")
        else:
            for shape in brush.shapes:
                marks.append(Stroke(points, brush.width_mm, shape, self.dark, tag, self.line))

    def flash(self) -> None:
        brush = self.brush or self.take()
        tag = self.tag or self.make_tag(brush)
        if brush.block is None:
            self.canvas.marks.extend(brush_marks(brush, self.at, self.dark, tag, self.line))
        else:
            self.canvas.set_down(
                brush.block, self.setting, self.at, self.dark, tag, self.line
            )

    def arc(self, end: Point, i: str, j: str) -> None:
        assert self.convert is not None
        start = self.at
        offsets = (self.convert[0](i) if i else 0.0, self.convert[1](j) if j else 0.0)
        clockwise = self.mode == _CLOCKWISE
        centre = (start[0] + offsets[0], start[1] + offsets[1])
        if not (abs(offsets[0]) < 100 * MOST_MM and abs(offsets[1]) < 100 * MOST_MM):
            self.fail("an arc has its centre beyond 200 m", "check the number format (FS)")
        if offsets == (0.0, 0.0):
            self.remark("an arc without a centre is drawn straight")
            points = [end]
        elif self.single_quadrant(start, end, offsets, clockwise):
            centre, fits = curves.quadrant_centre(start, end, offsets, clockwise=clockwise)
            if not fits:
                self.remark("an arc of more than a quarter turn in single-quadrant mode (G74)")
            points = (
                [end] if start == end else curves.arc(start, end, centre, clockwise=clockwise)
            )
        else:
            points = curves.arc(start, end, centre, clockwise=clockwise)
        if self.region_line is None:
            self.stroke((start, *points))
            return
        if not self.contour:
            self.begin_contour()
        self.contour.extend(points)

    def single_quadrant(
        self, start: Point, end: Point, offsets: Point, clockwise: bool
    ) -> bool:
        if self.quadrants is not None:
            return self.quadrants
        self.remark("arcs without G74 or G75; each is read the way that its centre fits")
        if min(offsets) < 0 or start == end:
            return False
        _, fits = curves.quadrant_centre(start, end, offsets, clockwise=clockwise)
        return fits

    # ------------------------------------------------------------------------------------ regions

    def begin_region(self) -> None:
        if self.region_line is not None:
            self.fail("a region (G36) begins inside another", _AGAIN)
        self.region_line = self.line
        # A region takes aperture attributes from the dictionary, not from an aperture.
        self.region_tag = self.attributes.tag(self.attributes.function())
        self.contour = []

    def begin_contour(self) -> None:
        self.contour = [self.at]
        self.contour_line = self.line

    def end_contour(self) -> None:
        contour, self.contour = self.contour, []
        if len(contour) < 3:
            if len(contour) == 2:
                self.remark("a contour of fewer than three corners is left out")
            return
        if contour[0] != contour[-1]:
            self.remark("a contour that does not close is closed")
            contour.append(contour[0])
        if len(contour) > 3:
            assert self.region_tag is not None
            mark = Fill(tuple(contour), self.dark, self.region_tag, self.contour_line)
            self.canvas.marks.append(mark)

    def end_region(self) -> None:
        if self.region_line is None:
            self.remark("an end of a region (G37) without its begin")
            return
        self.end_contour()
        self.region_line = None

    # ---------------------------------------------------------------------------------- apertures

    def select(self, code: int) -> None:
        if code < 10:
            if code:
                self.remark(f"unknown code D{code:02}")
            return
        self.code = code
        self.brush = self.tag = None

    def take(self) -> Brush:
        """The aperture in hand, built at its first use and kept."""
        code = self.code
        if code is None:
            self.fail("something is drawn before any aperture is selected", _AGAIN)
        if self.region_line is None and code in self.canvas.open_codes():
            self.fail(f"block aperture D{code} is used inside its own definition", _AGAIN)
        key = (code, self.setting)
        if key not in self.ready:
            self.ready[key] = apertures.transformed(self.plain_brush(code), self.setting)
        self.brush = self.ready[key]
        return self.brush

    def plain_brush(self, code: int) -> Brush:
        if code not in self.brushes:
            if code not in self.definitions:
                wrong = f"aperture D{code} is used but never defined"
                self.fail(wrong, "export the file again with its aperture list")
            definition, unit, function, line = self.definitions[code]
            if unit is None:
                unit = self.units()
            self.brushes[code] = apertures.brush(
                definition, self.bodies, unit, function, f"{self.name}:{line}"
            )
        return self.brushes[code]

    def make_tag(self, brush: Brush) -> Tag:
        self.tag = self.attributes.tag(brush.function)
        return self.tag

    def define(self, command: str) -> None:
        definition = language.read_definition(command)
        if definition is None:
            self.fail(f"the aperture definition {command[:40]!r} cannot be read", _AGAIN)
        self.forget(definition.code)
        self.definitions[definition.code] = (
            definition,
            self.unit_mm,
            self.attributes.function(),
            self.line,
        )
        # A macro may be redefined later; this aperture keeps the one of now.
        if self.unit_mm is not None and definition.template in self.bodies:
            self.plain_brush(definition.code)

    def forget(self, code: int) -> None:
        """A code is defined anew: whatever was built for it is stale."""
        if code in self.definitions or code in self.brushes:
            self.brushes.pop(code, None)
            self.ready = {key: tool for key, tool in self.ready.items() if key[0] != code}
            if code == self.code:
                self.brush = self.tag = None

    def block(self, command: str) -> None:
        if command == "AB":
            closed = self.canvas.close_block()
            if closed is None:
                self.remark("an end of a block aperture (AB) without its begin")
                return
            code, marks = closed
            self.forget(code)
            self.brushes[code] = Brush((), None, 0.0, self.attributes.function(), marks)
            self.brush = self.tag = None
            return
        match = re.fullmatch(r"ABD0*(\d{2,9})", command)
        if match is None:
            self.fail(f"the block aperture {command[:40]!r} cannot be read", _AGAIN)
        self.canvas.open_block(int(match[1]), self.line)
        self.brush = self.tag = None

    # -------------------------------------------------------------------------- extended commands

    def extended(self, text: str) -> None:
        """Carry out what stands between two percent signs: a macro, or one command or several."""
        start = self.line
        if text.lstrip()[:2] == "AM":
            name, _, body = text.strip()[2:].partition("*")
            self.line += len(text) - len(text.lstrip()) and text[: text.index("A")].count("\n")
            self.bodies[name.strip()] = body
            return
        for part in text.split("*"):
            command = part.strip()
            if command:
                self.line += part[: part.index(command[0])].count("\n")
                self.command(command)
                self.line = start
            start += part.count("\n")
            self.line = start

    def command(self, command: str) -> None:
        kind = command[:2]
        if kind in ("TO", "TD", "TA", "TF"):
            self.attribute(command)
        elif kind == "AD":
            self.define(command)
        elif kind in _COMMANDS:
            _COMMANDS[kind](self, "".join(command.split()))
        elif command[:1] in "GDXYM":
            self.words(command + "*")
        elif kind not in ("IN", "LN", "IJ", "PF", "KO"):
            self.remark(f"unknown command {kind!r} is skipped")
        elif kind in ("KO", "PF"):
            self.remark(f"command {kind!r} of old files is skipped; the image may differ")

    def attribute(self, command: str) -> None:
        odd = self.attributes.obey(command)
        self.tag = None
        if odd:
            self.remark(odd)

    def unreadable(self, command: str) -> NoReturn:
        self.fail(f"the command {command[:40]!r} cannot be read", _AGAIN)

    def load_polarity(self, command: str) -> None:
        word = language.read_word(command, ("C", "D"))
        if word is None:
            self.unreadable(command)
        self.dark = word == "D"

    def load_mirroring(self, command: str) -> None:
        word = language.read_word(command, ("N", "X", "Y", "XY"))
        if word is None:
            self.unreadable(command)
        self.setting = self.setting._replace(mirror_x="X" in word, mirror_y="Y" in word)
        self.brush = None

    def load_rotation(self, command: str) -> None:
        degrees = language.read_number(command)
        if degrees is None or not abs(degrees) < 1e6:
            self.unreadable(command)
        self.setting = self.setting._replace(turn_deg=degrees % 360)
        self.brush = None

    def load_scaling(self, command: str) -> None:
        scale = language.read_number(command)
        if scale is None or not 0 < scale < 1e6:
            self.unreadable(command)
        self.setting = self.setting._replace(scale=scale)
        self.brush = None

    def step_repeat(self, command: str) -> None:
        if self.canvas.repeating():
            self.canvas.close_repeat()
        if command == "SR":
            return
        repeat = language.read_repeat(command)
        if repeat is None or repeat.columns < 1 or repeat.rows < 1:
            self.unreadable(command)
        unit = self.units()
        steps = {"step_x": repeat.step_x * unit, "step_y": repeat.step_y * unit}
        reach = (
            (repeat.columns - 1) * abs(repeat.step_x), (repeat.rows - 1) * abs(repeat.step_y)
        )
        if repeat.columns * repeat.rows <= 1e6 and max(reach) * unit > MOST_MM:
            self.fail(
                f"step-repeat reaches {max(reach) * unit:g} mm, limit {MOST_MM:g} mm", _AGAIN
            )
        self.canvas.open_repeat(repeat._replace(**steps), self.line)

    def load_format(self, command: str) -> None:
        found = language.read_format(command)
        if found is None:
            self.unreadable(command)
        self.format = found
        self.incremental = found.incremental
        self.convert = None

    def load_unit(self, command: str) -> None:
        unit = language.read_unit(command)
        if unit is None:
            self.unreadable(command)
        self.set_unit(unit, "MO")

    def image_polarity(self, command: str) -> None:
        word = language.read_word(command, ("POS", "NEG"))
        if word is None:
            self.unreadable(command)
        self.image_negative = word == "NEG"

    def image_parameter(self, command: str) -> None:
        """OF, MI, SF and IR of old files: they change the whole image, at its end."""
        kind = command[:2]
        neutral = 1.0 if kind == "SF" else 0.0
        if kind == "IR":
            degrees = {"IR0": 0.0, "IR90": 90.0, "IR180": 180.0, "IR270": 270.0}.get(command)
            values = None if degrees is None else (degrees, 0.0)
        else:
            values = language.read_axes(command, neutral)
        if values is None or (kind == "SF" and min(values) <= 0):
            self.unreadable(command)
        if kind == "OF":
            values = (values[0] * self.units(), values[1] * self.units())
            if not max(map(abs, values)) < MOST_MM:
                self.fail(f"the image offset {command!r} is beyond {MOST_MM:g} mm", _AGAIN)
        default = (0.0, 0.0) if kind == "IR" else (neutral, neutral)
        if values != default:
            self.remark(f"the whole image is changed by the old command {command!r}")
        self.image[kind] = values

    def axis_select(self, command: str) -> None:
        if command != "ASAXBY":
            self.remark(f"{command!r} concerns plotters only and is skipped")

    # --------------------------------------------------------------------------------- coordinates

    def set_unit(self, unit: float, by: str) -> None:
        if self.unit_mm is not None and self.unit_mm != unit:
            self.remark(f"units change to {'mm' if unit == 1 else 'inch'} ({by})")
        self.unit_mm = unit
        self.convert = None

    def units(self) -> float:
        if self.unit_mm is None:
            wrong = "the file does not say its units (MO) before they are needed"
            self.fail(wrong, "export it again with %MOMM*% or %MOIN*%")
        return self.unit_mm

    def prepare(self) -> None:
        """Make the two functions that turn digits into mm."""
        if self.format is None:
            wrong = "coordinates come before the number format (FS)"
            self.fail(wrong, "export the file again with a header")
        unit = self.units()
        how = self.format
        self.convert = (
            _converter(how.decimals[0], how.digits[0], how.trailing_omitted, unit),
            _converter(how.decimals[1], how.digits[1], how.trailing_omitted, unit),
        )

    def whole_image(self, marks: list[Mark]) -> list[Mark]:
        """Mirror, scale, offset and turn the image, in this order whatever the file's."""
        mirror = self.image.get("MI", (0.0, 0.0))
        scale = self.image.get("SF", (1.0, 1.0))
        offset = self.image.get("OF", (0.0, 0.0))
        turn = Setting(turn_deg=self.image.get("IR", (0.0, 0.0))[0]).matrix()
        if (mirror, scale, offset, turn) == ((0, 0), (1, 1), (0, 0), apertures.PLAIN.matrix()):
            return marks
        a, b, c, d = turn
        fx = scale[0] * (-1 if mirror[0] else 1)
        fy = scale[1] * (-1 if mirror[1] else 1)
        # Mirroring and scaling concern coordinates only, not apertures.
        how = Copying((a * fx, b * fy, c * fx, d * fy), turn)
        shift = (a * offset[0] + b * offset[1], c * offset[0] + d * offset[1])
        return [self.canvas.copied(mark, how, shift) for mark in marks]


def _converter(
    decimals: int, digits: int, trailing_omitted: bool, unit: float
) -> Callable[[str], float]:
    """From the digits of a coordinate to mm, rounded once to 1 nm."""
    if unit == 1.0 and decimals <= 6 and not trailing_omitted:
        divisor = 10**decimals
        # An integer over a power of ten is the nearest float to the decimal: on the grid as is.
        return lambda text: int(text) / divisor
    nm = 1_000_000 if unit == 1.0 else 25_400_000
    divisor = 10**decimals
    half = divisor // 2

    def whole(text: str) -> float:
        return (int(text) * nm + half) // divisor / 1_000_000

    if not trailing_omitted:
        return whole

    def padded(text: str) -> float:
        sign = text[0] if text[0] in "+-" else ""
        return whole(sign + text.lstrip("+-").ljust(digits, "0"))

    return padded


_COMMANDS: dict[str, Callable[[_Reader, str], None]] = {
    "FS": _Reader.load_format,
    "MO": _Reader.load_unit,
    "LP": _Reader.load_polarity,
    "LM": _Reader.load_mirroring,
    "LR": _Reader.load_rotation,
    "LS": _Reader.load_scaling,
    "SR": _Reader.step_repeat,
    "AB": _Reader.block,
    "IP": _Reader.image_polarity,
    "IR": _Reader.image_parameter,
    "OF": _Reader.image_parameter,
    "MI": _Reader.image_parameter,
    "SF": _Reader.image_parameter,
    "AS": _Reader.axis_select,
}
