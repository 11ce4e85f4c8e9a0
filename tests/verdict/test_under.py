"""Copper of another net in a gap is told: a reader who sees it would not call the place open."""

from __future__ import annotations

import shapely

from splitcheck.board.board import Board
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene, via

OUTLINE = shapely.box(0, 0, 60, 40)


def _made(gap: shapely.Polygon, *lines: Line) -> Board:
    """A trace along y = 20 over a gap in ground, and lines in the plane's layer."""
    ground = OUTLINE.difference(gap)
    pieces = [piece for piece in shapely.get_parts(ground) if isinstance(piece, shapely.Polygon)]
    return board(
        Sheet(lines=(Line("CLK", ((5, 20), (55, 20))),)),
        Sheet(tuple(("GND", piece) for piece in pieces), lines),
        Sheet((("GND", shapely.box(0, 0, 60, 5)),)),
        holes=[via(10, 2), via(50, 2)],
        heights_mm=[0.2, 1.0],
        outline=OUTLINE,
    )


def _reason(made: Board, kind: str) -> str:
    (found,) = (f for f in judge(scene(made), *crossings(made)).findings if f.kind == kind)
    return found.reason


SLOT = shapely.box(29, 10, 31, 30)
CUT = shapely.box(29, 0, 31, 40)


def test_a_supply_in_a_slot_is_told() -> None:
    """A line of 1.4 mm in a slot of 2 mm; in the twin it is 0.4 mm wide, less than half."""
    wide, fine = (Line("+5V", ((30, 12), (30, 28)), width) for width in (1.4, 0.4))
    said = "is open for 2.00 mm under the trace"
    assert f"{said}, where copper of +5V lies; " in _reason(_made(SLOT, wide), "slot-crossing")
    assert f"{said}; " in _reason(_made(SLOT, fine), "slot-crossing")
    assert f"{said}; " in _reason(_made(SLOT), "slot-crossing")


def test_a_supply_between_two_islands_is_told() -> None:
    """The same between the sides of a split."""
    line = Line("+5V", ((30, 12), (30, 28)), 1.4)
    assert "with copper of +5V between them; " in _reason(_made(CUT, line), "split-crossing")
    assert "between them" not in _reason(_made(CUT), "split-crossing")


def test_two_boards_in_turn_are_not_taken_for_one_another() -> None:
    """What is kept from one question to the next belongs to one board."""
    with_line, without = _made(SLOT, Line("+5V", ((30, 12), (30, 28)), 1.4)), _made(SLOT)
    for _ in range(2):
        assert "+5V" in _reason(with_line, "slot-crossing")
        assert "+5V" not in _reason(without, "slot-crossing")
