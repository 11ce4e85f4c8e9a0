"""Apertures of a file by their D codes, and the one in hand with its tag."""

from __future__ import annotations

import re
from typing import NamedTuple

from splitcheck.copper import apertures, macros
from splitcheck.copper import gerber_language as language
from splitcheck.copper.apertures import Brush, Definition, Setting
from splitcheck.copper.gerber_attributes import Attributes
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.gerber_numbers import Numbers
from splitcheck.copper.marks import Mark, Tag

#: Most macro statements that a whole file may have drawn, all its apertures together.
MOST_DRAWN = 100_000


class _Entry(NamedTuple):
    """A definition that is built at its first use: many files define more than they use."""

    definition: Definition
    body: str | None
    unit_mm: float | None
    function: str | None
    line: int


class Tools:
    """The aperture list, the transformation (LM, LR, LS) and the aperture in hand."""

    def __init__(self, log: Log, numbers: Numbers, attributes: Attributes) -> None:
        self.log = log
        self.numbers = numbers
        self.attributes = attributes
        self.setting = apertures.PLAIN
        self.brush: Brush | None = None
        """The aperture in hand as it is drawn with; ``None``: ask ``take``."""
        self.tag: Tag | None = None
        """The tag of marks drawn with it now; ``None``: ask ``make_tag``."""
        self.code: int | None = None
        self.open_codes: set[int] = set()
        """Blocks being defined now: none of them can be used yet."""
        self._bodies: dict[str, str] = {}
        self._entries: dict[int, _Entry] = {}
        self._brushes: dict[int, Brush] = {}
        self._ready: dict[tuple[int, Setting], Brush] = {}
        self._drawn = 0

    def select(self, code: int) -> None:
        """Carry out Dnn: take an aperture in hand."""
        if code < 10:
            self.log.remark(f"unknown code D{code:02}")
            return
        self.code = code
        self.brush = self.tag = None

    def take(self) -> Brush:
        """The aperture in hand, built at its first use and kept."""
        code = self.code
        if code is None:
            self.log.fail("something is drawn before any aperture is selected")
        if code in self.open_codes:
            self.log.fail(f"block aperture D{code} is used inside its own definition")
        key = (code, self.setting)
        if key not in self._ready:
            self._ready[key] = apertures.transformed(self._plain(code), self.setting)
        self.brush = self._ready[key]
        return self.brush

    def make_tag(self) -> Tag:
        """The tag of what is drawn now with the aperture in hand."""
        brush = self.brush or self.take()
        self.tag = self.attributes.tag(brush.function)
        return self.tag

    def _plain(self, code: int) -> Brush:
        if code in self._brushes:
            return self._brushes[code]
        if code not in self._entries:
            wrong = f"aperture D{code} is used but never defined"
            self.log.fail(wrong, "export the file again with its aperture list")
        definition, body, unit, function, line = self._entries[code]
        unit = self.numbers.units() if unit is None else unit
        place = self.log.place(line)
        if body is not None:
            self._drawn += body.count("*")
            if self._drawn > MOST_DRAWN:
                wrong = f"its macros draw {self._drawn} primitives, limit {MOST_DRAWN}"
                self.log.fail(wrong, line=line)
        made = apertures.brush(definition, body, unit, function, place)
        self._brushes[code] = made
        return made

    def define_macro(self, text: str) -> None:
        """Carry out AM: keep its body for later definitions."""
        name, _, body = text.strip()[2:].partition("*")
        macros.check_size(body, self.log.place())
        self._bodies[name.strip()] = body

    def define(self, command: str) -> None:
        """Carry out AD."""
        definition = language.read_definition(command)
        if definition is None:
            self.log.fail(f"the aperture definition {command[:40]!r} cannot be read")
        self._forget(definition.code)
        self._entries[definition.code] = _Entry(
            definition,
            None if definition.template in apertures.STANDARD else self._body(definition),
            self.numbers.unit_mm,
            self.attributes.function(),
            self.log.line,
        )

    def _body(self, definition: Definition) -> str:
        body = self._bodies.get(definition.template)
        if body is None:
            name = definition.template[:40]
            wrong = f"aperture D{definition.code} uses the macro {name!r}, not defined before it"
            self.log.fail(wrong, "export the file again with its aperture macros")
        return body

    def define_block(self, code: int, marks: tuple[Mark, ...]) -> None:
        """Keep a block aperture that was just ended."""
        self._forget(code)
        self._brushes[code] = Brush((), None, 0.0, self.attributes.function(), marks)
        self.brush = self.tag = None

    def _forget(self, code: int) -> None:
        """A code is defined anew: whatever was built for it is stale."""
        if code in self._entries or code in self._brushes:
            self._brushes.pop(code, None)
            self._ready = {key: tool for key, tool in self._ready.items() if key[0] != code}
            if code == self.code:
                self.brush = self.tag = None

    def load_mirroring(self, command: str) -> None:
        """Carry out LM."""
        word = language.read_word(command, ("N", "X", "Y", "XY"))
        if word is None:
            self.log.unreadable(command)
        self._set(self.setting._replace(mirror_x="X" in word, mirror_y="Y" in word))

    def load_rotation(self, command: str) -> None:
        """Carry out LR."""
        degrees = language.read_number(command)
        if degrees is None or not abs(degrees) < 1e6:
            self.log.unreadable(command)
        self._set(self.setting._replace(turn_deg=degrees % 360))

    def load_scaling(self, command: str) -> None:
        """Carry out LS."""
        scale = language.read_number(command)
        if scale is None or not 0 < scale < 1e6:
            self.log.unreadable(command)
        self._set(self.setting._replace(scale=scale))

    def _set(self, setting: Setting) -> None:
        self.setting = setting
        self.brush = None


def block_code(command: str) -> int | None:
    """The D code of an AB command."""
    match = re.fullmatch(r"ABD0*(\d{2,9})", command)
    return int(match[1]) if match else None
