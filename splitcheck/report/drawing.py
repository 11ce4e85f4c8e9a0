"""Shapes in mm in, SVG text out: compact paths, safe text, one palette for every figure."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from html import escape

from splitcheck.report.words import shorten
from splitcheck.verdict.views import Box, Line, Shape

#: What XML cannot hold even as an escape.
_UNFIT = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
_NAME_CELLS = 40

#: Colours by what they stand for, on light and on dark paper. Each pair that touches differs in
#: lightness and in form (fill, dash, mark) as well, so that neither print nor eyes need the hue.
LIGHT = {
    "paper": "#ffffff",
    "panel": "#f4f5f7",
    "ink": "#1b1f24",
    "muted": "#505a64",
    "rule": "#8b939c",
    "copper": "#f1e0c6",
    "copper-rim": "#a8834f",
    "foreign": "#d9d2c6",
    "void": "#ffffff",
    "hatch": "#6d747c",
    "trace": "#1c3f7c",
    "beside": "#7186b0",
    "stream": "#00677d",
    "way": "#a3195b",
    "mend": "#2f6300",
    "error": "#9b1c3c",
    "warning": "#7d5200",
    "note": "#2b5b88",
    "chosen": "#ffe08a",
}
DARK = {
    "paper": "#14181d",
    "panel": "#1d232a",
    "ink": "#e8ebef",
    "muted": "#a9b3be",
    "rule": "#6f7a86",
    "copper": "#4d3d26",
    "copper-rim": "#b9935c",
    "foreign": "#3a3833",
    "void": "#14181d",
    "hatch": "#8d96a0",
    "trace": "#a9c4ff",
    "beside": "#7389bb",
    "stream": "#63d3e8",
    "way": "#ff8fbd",
    "mend": "#a9d86b",
    "error": "#ff9aa8",
    "warning": "#f0c060",
    "note": "#8fc1ef",
    "chosen": "#473910",
}


def text(words: str, cells: int = 0) -> str:
    """Words that are safe inside markup and in an attribute, whoever wrote them.

    Examples
    --------
    >>> text('</text><script>"x"')
    '&lt;/text&gt;&lt;script&gt;&quot;x&quot;'
    """
    shown = shorten(words, cells) if cells else words
    return escape(_UNFIT.sub("\ufffd", shown))


def name(words: str, cells: int = _NAME_CELLS) -> str:
    """A name from a file: made visible, shortened, and safe inside markup."""
    return text(words, cells)


@dataclass(frozen=True, slots=True)
class Frame:
    """How mm become the whole numbers of a drawing; y points up in mm and down in the drawing."""

    box_mm: Box
    units: int
    """Length of the larger side in the drawing."""

    @property
    def scale(self) -> float:
        """Units a mm."""
        x0, y0, x1, y1 = self.box_mm
        return self.units / max(x1 - x0, y1 - y0, 1e-6)

    @property
    def size(self) -> tuple[int, int]:
        """Width and height of the drawing."""
        x0, y0, x1, y1 = self.box_mm
        return max(round((x1 - x0) * self.scale), 1), max(round((y1 - y0) * self.scale), 1)

    def at(self, x_mm: float, y_mm: float) -> tuple[int, int]:
        """A place in the drawing."""
        x0, _, _, y1 = self.box_mm
        return round((x_mm - x0) * self.scale), round((y1 - y_mm) * self.scale)

    def length(self, mm: float) -> float:
        """A length in the drawing, to a tenth."""
        return round(mm * self.scale, 1)

    def path(self, lines: Iterable[Line], *, closed: bool = False) -> str:
        """Lines as the data of one path.

        Examples
        --------
        >>> Frame((0, 0, 10, 10), 100).path([((0, 0), (5, 0), (5, 2))], closed=True)
        'M0 100l50 0 0-20z'
        """
        return "".join(self._one(line, closed=closed) for line in lines)

    def shapes(self, shapes: Iterable[Shape]) -> str:
        """Polygons with their holes as the data of one path."""
        return self.path((ring for shape in shapes for ring in shape), closed=True)

    def _one(self, line: Line, *, closed: bool) -> str:
        places = [self.at(x, y) for x, y in line]
        if not places:
            return ""
        (x, y), steps = places[0], []
        start = f"M{x} {y}"
        for right, down in places[1:]:
            if (right, down) != (x, y):
                steps.append(_pair(right - x, down - y))
                x, y = right, down
        if not steps:
            return "" if closed else f"{start}h0"
        data = steps[0] + "".join(s if s[0] == "-" else " " + s for s in steps[1:])
        return f"{start}l{data}{'z' if closed else ''}"


def _pair(x: int, y: int) -> str:
    return f"{x}{y}" if y < 0 else f"{x} {y}"


def element(tag: str, inner: str = "", /, **attributes: str | float) -> str:
    """One element; an underscore in a name of an attribute stands for a hyphen, ``cls`` for class.

    Examples
    --------
    >>> element("path", d="M0 0h0", cls="gap", stroke_width=2)
    '<path d="M0 0h0" class="gap" stroke-width="2"/>'
    """
    shown = "".join(
        f' {"class" if key == "cls" else key.replace("_", "-")}="{value}"'
        for key, value in attributes.items()
    )
    return f"<{tag}{shown}>{inner}</{tag}>" if inner else f"<{tag}{shown}/>"


def filled(data: str, cls: str) -> str:
    """A path that is filled by the even-odd rule; nothing if it has no data."""
    return element("path", d=data, cls=cls, fill_rule="evenodd") if data else ""


def variables(colours: dict[str, str]) -> str:
    """Colours as variables of a style sheet."""
    return "".join(f"--{key}:{value};" for key, value in colours.items())


def resolved(css: str, colours: dict[str, str]) -> str:
    """A style sheet with its colours written out, for readers that know no variables."""
    for key, value in colours.items():
        css = css.replace(f"var(--{key})", value)
    return css


def nice_mm(most_mm: float) -> float:
    """The largest of 1, 2 and 5 times a power of ten that is no more than a length.

    Examples
    --------
    >>> nice_mm(3.7), nice_mm(0.9), nice_mm(60.0)
    (2.0, 0.5, 50.0)
    """
    step = 1e-4
    best = step
    while step <= most_mm:
        best = max([step * k for k in (1, 2, 5) if step * k <= most_mm])
        step *= 10
    return float(f"{best:.3g}")


def rows(words: str, width: int) -> list[str]:
    """A sentence in rows of at most so many characters; a drawing cannot wrap by itself.

    Examples
    --------
    >>> rows("one two three", 8)
    ['one two', 'three']
    """
    found: list[str] = []
    for word in words.split():
        if found and len(found[-1]) + 1 + len(word) <= width:
            found[-1] += " " + word
        else:
            found.append(word[:width])
    return found


def joined(parts: Sequence[str]) -> str:
    """Markup in one piece, a part a line."""
    return "\n".join(part for part in parts if part)
