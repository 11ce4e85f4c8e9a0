"""A page of plain text: headings, wrapped paragraphs and columns, with or without colour."""

from __future__ import annotations

from collections.abc import Sequence
from io import StringIO
from typing import Literal, NamedTuple

from rich.cells import cell_len
from rich.console import Console
from rich.text import Text

from splitcheck.report.words import STICKY, inert, shorten

#: Narrower than this no row of numbers fits; a narrower window wraps it by itself.
NARROWEST = 80
WIDEST = 140
_NARROWEST_NAME = 10
#: A sentence longer than this carries a name that nobody wants to read to its end.
_LONGEST_SENTENCE = 700


class Column(NamedTuple):
    """How one column of a table is set."""

    title: str
    """May have two lines: the quantity over its unit."""
    side: Literal["left", "right"] = "left"
    gives: bool = False
    """Takes the width that the other columns leave, and is cut in the middle to fit it."""


class Page:
    """Collects lines of text, each no wider than the page.

    Parameters
    ----------
    width
        Columns of the terminal; kept between 80 and 140.
    color
        Whether to write the codes that colour a terminal.
    """

    def __init__(self, width: int, *, color: bool) -> None:
        self.width = min(max(width, NARROWEST), WIDEST)
        self._text = StringIO()
        # The environment is the command line's business: nothing is read from it here.
        self._console = Console(
            file=self._text,
            width=self.width,
            force_terminal=color,
            force_jupyter=False,
            color_system="standard" if color else None,
            no_color=not color,
            highlight=False,
            markup=False,
            emoji=False,
            legacy_windows=False,
            _environ={},
        )

    def __str__(self) -> str:
        return self._text.getvalue()

    def gap(self) -> None:
        """Leave a line free."""
        self._text.write("\n")

    def heading(self, words: str) -> None:
        """Begin a part of the page."""
        self.gap()
        self._put(Text(words, style="bold"))

    def say(self, sentence: str, *, indent: int = 2, lead: str = "", style: str = "") -> None:
        """Write a sentence, wrapped; lines after the first stand under its text, not its lead."""
        self.say_text(
            Text(shorten(sentence, _LONGEST_SENTENCE), style=style), indent=indent, lead=lead
        )

    def say_text(self, text: Text, *, indent: int = 2, lead: str = "") -> None:
        """Write text that is safe already, wrapped."""
        inner = indent + len(lead)
        for row, line in enumerate(text.wrap(self._console, self.width - inner)):
            line.rstrip()
            front = " " * indent + lead if row == 0 else " " * inner
            self._put(Text(front) + line)

    def widths(self, columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> list[int]:
        """Columns of the terminal each column of the table takes, two of indent apart."""
        wide = [
            max(
                cell_len(cell)
                for cell in [*column.title.split("\n"), *(row[place] for row in rows)]
            )
            for place, column in enumerate(columns)
        ]
        givers = [place for place, column in enumerate(columns) if column.gives]
        taken = sum(wide) - sum(wide[place] for place in givers)
        room = self.width - 2 - taken - 2 * (len(columns) - 1)
        # The narrowest first: what a short column does not need goes to the long ones.
        for done, place in enumerate(sorted(givers, key=lambda place: wide[place])):
            wide[place] = max(min(wide[place], room // (len(givers) - done)), _NARROWEST_NAME)
            room -= wide[place]
        return wide

    def titles(self, columns: Sequence[Column], widths: Sequence[int]) -> None:
        """Write the titles of a table, in as many lines as the tallest has."""
        split = [column.title.split("\n") for column in columns]
        for line in range(max(len(lines) for lines in split)):
            cells = [lines[line] if line < len(lines) else "" for lines in split]
            self.row(columns, widths, cells, ["bold"] * len(cells))

    def row(
        self,
        columns: Sequence[Column],
        widths: Sequence[int],
        cells: Sequence[str],
        styles: Sequence[str] = (),
    ) -> None:
        """Write one row of a table; numbers are never cut."""
        line = Text("  ")
        for place, (column, width, cell) in enumerate(zip(columns, widths, cells, strict=True)):
            shown = shorten(cell, width) if column.gives else cell
            space = " " * max(width - cell_len(shown), 0)
            style = styles[place] if place < len(styles) else ""
            if place:
                line.append("  ")
            if column.side == "right":
                line.append(space)
            line.append(shown, style=style)
            if column.side == "left" and place < len(columns) - 1:
                line.append(space)
        line.rstrip()
        self._put(line)

    def table(self, columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> None:
        """Write a table: titles, then one line a row."""
        widths = self.widths(columns, rows)
        self.titles(columns, widths)
        for row in rows:
            self.row(columns, widths, row)

    def _put(self, line: Text) -> None:
        line.plain = inert(line.plain.replace(STICKY, " "))
        self._console.print(line, no_wrap=True, overflow="ignore", crop=False, soft_wrap=True)
