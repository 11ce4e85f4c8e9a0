"""Runs along a slot or a rim: how much of them lies across the gap (hand-made boards)."""

from __future__ import annotations

import pytest
import shapely
from shapely import Polygon

from splitcheck.planes.crossings import Crossing
from splitcheck.verdict.lengthwise import opened
from splitcheck.verdict.scene import Scene
from tests.making.hand import Line, Sheet, board, crossings, scene

WHOLE = shapely.box(0, 0, 40, 20)
HEIGHT_MM = 1.5


def _run(wide_mm: float, *more: Polygon) -> tuple[Scene, Crossing]:
    """A trace along 20 mm of a split that comes from below at x = 10 and leaves above at x = 30."""
    half = wide_mm / 2
    split = [
        shapely.box(10 - half, -1, 10 + half, 10 + half),
        shapely.box(10 - half, 10 - half, 30 + half, 10 + half),
        shapely.box(30 - half, 10 - half, 30 + half, 21),
    ]
    left = WHOLE.difference(shapely.union_all([*split, *more]))
    made = board(
        Sheet(lines=(Line("CLK", ((2, 10), (38, 10))),)),
        Sheet(tuple(("GND", piece) for piece in shapely.get_parts(left))),
        heights_mm=(HEIGHT_MM,),
        outline=WHOLE,
    )
    found, _ = crossings(made)
    return scene(made), max(found, key=lambda one: one.run_mm)


def test_along_a_narrow_slot_only_its_width_lies_across() -> None:
    """0.8 mm of slot under a trace 1.5 mm high: both rims carry the return all along."""
    board_scene, crossing = _run(0.8)
    assert crossing.islands[0] != crossing.islands[1]
    assert crossing.run_mm == pytest.approx(20.8, abs=0.01)
    across_mm, along_nh = opened(board_scene, crossing)
    assert across_mm == pytest.approx(0.8, abs=0.45)  # at the corners the slot is seen aslant
    assert along_nh < 0.2  # at the corners one rim is missing for a bit


def test_along_a_wide_slot_all_of_the_run_lies_across() -> None:
    """4 mm of slot under the same trace: nothing beside it carries the return."""
    board_scene, crossing = _run(4.0)
    assert opened(board_scene, crossing) == (crossing.run_mm, 0.0)


def test_beside_one_rim_each_mm_costs_what_an_edge_does() -> None:
    """Half of the slot has lost its upper rim: 10 mm beyond an edge that is 0.4 mm off.

    mu0/(2 pi) ln(2 sqrt(rho (rho - s)/2) / h) at s = -0.4 mm, h = 1.5 mm: 0.0991 nH/mm (half-plane
    by the conformal map w = sqrt(z)).
    """
    board_scene, crossing = _run(0.8, shapely.box(20, 9.9, 30, 21))
    across_mm, along_nh = opened(board_scene, crossing)
    assert across_mm < HEIGHT_MM
    corners_nh = opened(*_run(0.8)).along_nh
    assert along_nh - corners_nh == pytest.approx(10 * 0.0991, rel=0.1)


def test_a_short_run_is_taken_as_it_is() -> None:
    """Straight over a slot there is nothing to tell."""
    left = WHOLE.difference(shapely.box(19.6, -1, 20.4, 15))
    made = board(
        Sheet(lines=(Line("CLK", ((2, 10), (38, 10))),)),
        Sheet(tuple(("GND", piece) for piece in shapely.get_parts(left))),
        heights_mm=(HEIGHT_MM,),
        outline=WHOLE,
    )
    (crossing,), _ = crossings(made)
    assert opened(scene(made), crossing) == (crossing.run_mm, 0.0)
