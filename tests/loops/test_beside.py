"""Gaps beside a trace: which are found, and which are none."""

from __future__ import annotations

import pytest
import shapely
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.loops.beside import find_beside
from splitcheck.planes.crossings import Crossing, judged_nets
from splitcheck.planes.islands import find_planes, reference_nets
from splitcheck.planes.tracks import lay_all
from splitcheck.verdict.beside import LEAST_BESIDE_NH
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene

OUTLINE = shapely.box(0, 0, 60, 40)
#: 8 mm square, 0.5 mm beside a trace at y = 20.
VOID = shapely.box(26, 20.5, 34, 28.5)
ACROSS = ((5.0, 20.0), (55.0, 20.0))


def cut(*voids: shapely.Geometry) -> Polygon:
    """The plane with voids."""
    copper = OUTLINE.difference(shapely.union_all(voids))
    assert isinstance(copper, Polygon)
    return copper


def made(*voids: shapely.Geometry, line: tuple[tuple[float, float], ...] = ACROSS) -> Board:
    """One trace 1 mm over a plane with voids."""
    sheets = Sheet(lines=(Line("CLK", line),)), Sheet((("GND", cut(*voids)),))
    return board(*sheets, outline=OUTLINE, heights_mm=(1.0,))


def beside(given: Board, least_nh: float = LEAST_BESIDE_NH) -> tuple[Crossing, ...]:
    """Gaps beside the traces of a board."""
    planes = find_planes(given)
    nets = judged_nets(given, reference_nets(given))
    height = given.stack.height_mm
    return tuple(
        place
        for tracks in lay_all(given, nets, ())
        for place in find_beside(tracks, planes, height, least_nh)
    )


def judged(given: Board, min_nh: float = 0.0) -> tuple[Finding, ...]:
    """Findings of a board, gaps beside its traces among them."""
    over, bare = crossings(given)
    return judge(scene(given, min_nh), [*over, *beside(given)], bare).findings


def test_void_beside_a_trace() -> None:
    """It is found where the trace is within 1.5 heights of it, and over none of it."""
    (found,) = beside(made(VOID))
    assert (found.run_mm, found.aside_mm, found.islands) == (0.0, 0.5, (0, 0))
    assert found.at == pytest.approx((30.0, 20.0))
    # 1.5 from the corner at (26, 20.5): sqrt(1.5^2 - 0.5^2) = 1.414 ahead of it, corners cut off
    assert sorted(x for x, _ in found.path) == pytest.approx([24.586, 35.414], abs=0.15)
    assert crossings(made(VOID)) == ((), ())


def test_far_or_small_voids_are_none() -> None:
    """Two heights off, or smaller than the height."""
    assert beside(made(shapely.box(26, 22, 34, 30))) == ()
    assert beside(made(shapely.box(29.6, 20.1, 30.4, 20.9)), 1e-6) == ()


def test_gap_that_leads_outside_is_none() -> None:
    """Such a rim is an edge, which has a rule of its own."""
    assert beside(made(shapely.box(26, 20.5, 34, 41))) == ()


def test_trace_that_ends_beside_a_void_does_not_pass_it() -> None:
    """Its pad, and the antipad next to it."""
    assert beside(made(VOID, line=((5.0, 20.0), (30.0, 20.0)))) == ()


def test_void_that_the_trace_also_crosses_is_told_once() -> None:
    """Beside it for 8 mm, then over it: the solve of the crossing holds both."""
    turning = ((5.0, 20.0), (36.0, 20.0), (36.0, 25.0), (20.0, 25.0))
    given = made(VOID, line=turning)
    assert beside(given) == ()
    (one,) = judged(given)
    assert one.gap_mm == pytest.approx(8.0)


def test_nearer_plane_hides_what_is_beyond_it() -> None:
    """Whole copper 0.2 mm under the trace, and the void beyond it."""
    given = board(
        Sheet(lines=(Line("CLK", ACROSS),)),
        Sheet((("GND", OUTLINE),)),
        Sheet((("GND", cut(VOID)),)),
        outline=OUTLINE,
        heights_mm=(0.2, 0.8),
    )
    assert beside(given) == ()


def test_voids_on_both_sides_are_one_place() -> None:
    """One finding that adds more than twice one alone: the return has nowhere to go aside."""
    other = shapely.box(26, 11.5, 34, 19.5)
    (one,) = judged(made(VOID))
    (both,) = judged(made(VOID, other))
    assert one.kind == both.kind == "void-crossing"
    assert one.added_nh is not None
    assert both.added_nh is not None
    assert both.added_nh > 2 * one.added_nh


def test_voids_one_after_the_other_are_one_place() -> None:
    """The solve of one holds the next, 5 mm on; 25 mm on is another place.

    Together they add a little less: either shades the other (Lenz).
    """
    near = judged(made(VOID, shapely.box(39, 20.5, 47, 28.5)))
    assert len(near) == 1
    assert "in 2 places" in near[0].reason
    far = judged(made(shapely.box(8, 20.5, 16, 28.5), shapely.box(41, 20.5, 49, 28.5)))
    assert len(far) == 2
    apart = sum(finding.added_nh or 0.0 for finding in far)
    assert near[0].added_nh is not None
    assert 0.8 * apart < near[0].added_nh < apart


def test_no_threshold_brings_the_small_ones() -> None:
    """Under 0.1 nH there is no end of them."""
    assert judged(made(shapely.box(29, 20.5, 31, 22.5)), min_nh=0.0) == ()
    assert judged(made(VOID), min_nh=0.3) == ()


def test_whole_plane_beyond_shields_the_void() -> None:
    """0.3 mm beyond the void: it adds less than is told."""
    given = board(
        Sheet(lines=(Line("CLK", ACROSS),)),
        Sheet((("GND", cut(VOID)),)),
        Sheet((("GND", OUTLINE),)),
        outline=OUTLINE,
        heights_mm=(1.0, 0.3),
    )
    assert len(beside(given)) == 1
    assert judged(given) == ()
