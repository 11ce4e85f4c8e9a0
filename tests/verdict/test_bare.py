"""Traces without a plane: copper beside them, in their own layer, carries the return."""

from __future__ import annotations

from math import log

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.loops.estimate import beside_edge_nh_mm
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene, via

HEIGHT_MM = 1.5
OUTLINE = shapely.box(0, 0, 60, 40)


def _made(*pours: shapely.Polygon) -> Board:
    """A trace of 40 mm along y = 30 on the top; ground on the bottom ends 10 mm away from it."""
    return board(
        Sheet(tuple(("GND", pour) for pour in pours), (Line("CLK", ((10, 30), (50, 30))),)),
        Sheet((("GND", shapely.box(0, 0, 60, 20)),)),
        holes=[via(2, 19), via(58, 19)],
        heights_mm=[HEIGHT_MM],
        outline=OUTLINE,
    )


def _bare(made: Board) -> list[Finding]:
    return [f for f in judge(scene(made), *crossings(made)).findings if f.kind == "no-plane"]


def _pour(rim_mm: float, start: float = 0.0, stop: float = 60.0) -> shapely.Polygon:
    """Ground from below the trace up to so far from its centre line."""
    return shapely.box(start, 18, stop, 30 - rim_mm)


def test_without_any_copper_near_it_is_told() -> None:
    """40 mm, 10 mm beyond the rim of a plane 1.5 mm below: half plane, exact."""
    (found,) = _bare(_made())
    assert found.added_nh == pytest.approx(40 * beside_edge_nh_mm(-10.0, HEIGHT_MM), rel=0.01)


@pytest.mark.parametrize("rim_mm", [0.3, 0.7])
def test_ground_within_half_the_height_beside_it_is_no_finding(rim_mm: float) -> None:
    """As good as a plane beneath."""
    assert _bare(_made(_pour(rim_mm))) == []


@pytest.mark.parametrize("rim_mm", [1.5, 3.0, 6.0])
def test_ground_farther_off_costs_the_difference(rim_mm: float) -> None:
    """0.2 nH/mm ln(2 e / h), for as long as the trace is."""
    (found,) = _bare(_made(_pour(rim_mm)))
    assert found.added_nh == pytest.approx(40 * 0.2 * log(2 * rim_mm / HEIGHT_MM), rel=0.01)


def test_ground_along_half_of_it_leaves_the_other_half() -> None:
    """Less than without it, more than with all of it."""
    (half,) = _bare(_made(_pour(0.3, stop=30.0)))
    (none,) = _bare(_made())
    assert half.added_nh is not None
    assert none.added_nh is not None
    assert 0.2 * none.added_nh < half.added_nh < 0.8 * none.added_nh
