"""What of a trace a solve lays over a gap: its ends keep away from the rim."""

from __future__ import annotations

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.loops.stretches import trace_over
from splitcheck.loops.tasks import Task
from splitcheck.loops.ways import Route
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, plane, scene

HEIGHT_MM = 0.2
SLOT = shapely.box(29.5, 18, 30.5, 22)


def _made(rim_mm: float) -> Board:
    """A trace that ends 1.5 mm after a slot of 4 mm, in a plane that ends at x = `rim_mm`."""
    ground = shapely.box(0, 0, rim_mm, 40).difference(SLOT)
    assert isinstance(ground, shapely.Polygon)
    # the slot and the outside are one gap, by a cut too thin to matter
    ground = ground.difference(shapely.box(30.4, 21, rim_mm + 1, 21.001))
    assert isinstance(ground, shapely.Polygon)
    return board(
        Sheet(lines=(Line("CLK", ((10, 20), (32, 20))),)),
        Sheet((("GND", ground),)),
        heights_mm=[HEIGHT_MM],
        outline=shapely.box(0, 0, 60, 40),
    )


@pytest.mark.parametrize("rim_mm", [32.3, 32.51, 32.8, 33.5, 50.0])
def test_a_longer_end_keeps_a_height_away_from_the_rim(rim_mm: float) -> None:
    """A straight extension to 10 heights would end at x = 32.5, whatever lies there."""
    made = _made(rim_mm)
    (crossing,) = crossings(made)[0]
    task = Task(
        0, crossing, Route(1.0, None, None, joined=False), (crossing.path,), HEIGHT_MM, None, None
    )
    under = plane(made, 2)
    line = trace_over(task, under).line
    gap = under.gaps[crossing.gap].shape
    for end in (line.coords[0], line.coords[-1]):
        assert end == pytest.approx((32.0, 20.0)) or gap.distance(shapely.Point(end)) >= HEIGHT_MM
    expected = {32.3: 32.0, 32.51: 32.25}.get(rim_mm, 32.5)
    assert line.coords[-1][0] == pytest.approx(expected)


@pytest.mark.parametrize("rim_mm", [32.3, 32.51, 32.8])
def test_a_rim_where_the_end_would_be_changes_little(rim_mm: float) -> None:
    """The way round the slot is the same, whether the plane ends near the trace's end or not."""
    far, near = (
        next(f for f in judge(scene(made), *crossings(made)).findings if f.kind == "slot-crossing")
        for made in (_made(50.0), _made(rim_mm))
    )
    assert far.added_nh is not None
    assert near.added_nh == pytest.approx(far.added_nh, rel=0.1)
