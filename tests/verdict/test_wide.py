"""Wide lines of nets whose names say nothing are supplies; others keep their class."""

from __future__ import annotations

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.verdict.class_rows import class_sentences, exempt_counts
from splitcheck.verdict.classes import Known, know
from splitcheck.verdict.packs import shipped_rules
from splitcheck.verdict.wide import wide_nets
from tests.making.hand import Line, Sheet, board

GROUND = shapely.box(0, 0, 60, 60)


def _made(*lines: Line, height_mm: float = 0.2) -> Board:
    """Six lines of 0.2 mm, and these."""
    usual = [Line("", ((5, 5 + y), (55, 5 + y)), 0.2) for y in range(6)]
    return board(Sheet(lines=(*usual, *lines)), Sheet((("GND", GROUND),)), heights_mm=[height_mm])


def _known(made: Board) -> Known:
    return know(made, shipped_rules())


def _class_at(made: Board, y: float) -> str:
    known = _known(made)
    part = next(p for p in made.parts if p.shape.intersects(shapely.Point(30, y)) and p.layer == 1)
    return known.drive_of(made.net_of[part.id]).name


@pytest.mark.parametrize(
    ("line", "height_mm", "expected"),
    [
        (Line("", ((5, 40), (55, 40)), 0.8), 0.2, "wide"),  # four times as wide, 27 ohm
        (Line("", ((5, 40), (55, 40)), 0.8), 1.5, "wide"),  # 85 ohm: no line that is asked for
        (Line("", ((5, 40), (55, 40)), 0.5), 0.2, "default"),  # two and a half times
        (Line("", ((5, 40), (55, 40)), 2.9), 1.5, "default"),  # 50 ohm: perhaps an antenna's
        (Line("RADIO", ((5, 40), (55, 40)), 0.8), 0.2, "default"),  # its name may say what it is
        (Line("Net-(C4-Pad1)", ((5, 40), (55, 40)), 0.8), 0.2, "wide"),  # this one says nothing
        (Line("SPI_SCK", ((5, 40), (55, 40)), 0.8), 0.2, "spi"),
    ],
)
def test_wide_lines_and_their_twins(line: Line, height_mm: float, expected: str) -> None:
    """The usual line is 0.2 mm wide; common practice, no source."""
    assert _class_at(_made(line, height_mm=height_mm), 40) == expected


def test_a_wide_end_makes_no_supply() -> None:
    """A signal with 10 mm of 0.8 mm among 50 mm, as at a pad, and a supply with a fine end."""
    signal = [Line("", ((5, 40), (45, 40)), 0.2), Line("", ((45, 40), (55, 40)), 0.8)]
    supply = [Line("", ((5, 50), (15, 50)), 0.2), Line("", ((15, 50), (55, 50)), 0.8)]
    made = _made(*signal, *supply)
    assert (_class_at(made, 40), _class_at(made, 50)) == ("default", "wide")


def test_they_are_counted_and_said() -> None:
    """Never silently."""
    made = _made(Line("", ((5, 40), (55, 40)), 0.8))
    judged = {net.number for net in made.nets if net.name != "GND"}
    known = _known(made)
    assert [(c.what, c.number) for c in exempt_counts(known, judged)] == [
        ("nets exempt by class: wide", 1)
    ]
    assert "known by the width of their lines (1): 1 wide" in class_sentences(known, judged)[1]


def test_without_lines_nothing_is_wide() -> None:
    """No median, no answer."""
    assert wide_nets(board(Sheet((("GND", GROUND),)), Sheet((("GND", GROUND),)))) == frozenset()


def test_the_nearest_layer_says_whether_it_is_a_line() -> None:
    """2.3 mm, 1.06 mm under one layer and 0.2 mm over another: no line of 50 ohm to the latter."""
    made = board(
        Sheet((("GND", GROUND),)),
        Sheet(lines=(Line("", ((5, 40), (55, 40)), 2.3),)),
        Sheet(lines=tuple(Line("", ((5, 5 + y), (55, 5 + y)), 0.2) for y in range(6))),
        heights_mm=(1.06, 0.2),
    )
    known = _known(made)
    assert [known.drive_of(net).name for net in wide_nets(made)] == ["wide"]
