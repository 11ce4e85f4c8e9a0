"""Copper of another net in a gap is told: a reader who sees it would not call the place open."""

from __future__ import annotations

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.verdict.judge import judge
from splitcheck.verdict.under import ALONG_SUPPLY
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


def _along(width_mm: float, net: str = "+5V", long_mm: float = 20.0) -> Board:
    """A trace for so long over a gap in ground in which a line of another net runs along it."""
    gap = shapely.box(30 - long_mm / 2, 15, 30 + long_mm / 2, 25)
    line = Line(net, ((31.2 - long_mm / 2, 20), (28.8 + long_mm / 2, 20)), width_mm)
    return _made(gap, line)


def _counted(made: Board) -> int:
    counts = judge(scene(made), *crossings(made)).counts
    return sum(count.number for count in counts if count.what == ALONG_SUPPLY)


def test_a_long_run_along_a_supply_is_counted_not_listed() -> None:
    """A line of 2 mm under a trace 0.2 mm high, for 20 mm."""
    assert _counted(_along(2.0)) == 1
    assert not judge(scene(_along(2.0)), *crossings(_along(2.0))).findings


@pytest.mark.parametrize(
    "made",
    [
        _along(0.2),  # no wider than the trace
        _along(2.0, net="DATA"),  # a signal
        _along(2.0, long_mm=4.0),  # a short way, as of a crossing
        _made(shapely.box(20, 15, 40, 25)),  # nothing there
        # across the trace, not along it
        _made(shapely.box(20, 15, 40, 25), Line("+5V", ((30, 16), (30, 24)), 2.0)),
    ],
)
def test_its_twins_are_found(made: Board) -> None:
    """What carries no return leaves the place as it is."""
    assert _counted(made) == 0
    assert judge(scene(made), *crossings(made)).findings


def _nearer(start: float, stop: float) -> Board:
    """A trace over a slot of a farther plane, and a supply's line on the layer between."""
    ground = OUTLINE.difference(SLOT)
    assert isinstance(ground, shapely.Polygon)
    return board(
        Sheet(lines=(Line("CLK", ((5, 20), (55, 20))),)),
        Sheet(lines=(Line("+5V", ((start, 20), (stop, 20)), 2.0),)),
        Sheet((("GND", ground),)),
        heights_mm=[0.2, 1.0],
        outline=OUTLINE,
    )


def test_a_supply_nearer_than_the_broken_plane_carries_the_return_past_it() -> None:
    """From 9 mm before the slot to 9 mm after it; and ending right at its rims, which does not."""
    assert _counted(_nearer(20, 40)) == 1
    assert _counted(_nearer(30, 30.5)) == 0


def test_a_trace_without_a_plane_along_a_supply_is_counted() -> None:
    """40 mm with no ground, over a line of 2 mm; over a line of 0.2 mm it is told."""
    for width, counted in ((2.0, 1), (0.2, 0)):
        made = board(
            Sheet(lines=(Line("CLK", ((10, 30), (50, 30))),)),
            Sheet(
                (("GND", shapely.box(0, 0, 60, 20)),), (Line("+5V", ((5, 30), (55, 30)), width),)
            ),
            heights_mm=[0.2],
            outline=OUTLINE,
        )
        judged = judge(scene(made), *crossings(made))
        assert sum(c.number for c in judged.counts if c.what == ALONG_SUPPLY) == counted
        assert len([f for f in judged.findings if f.kind == "no-plane"]) == 1 - counted
