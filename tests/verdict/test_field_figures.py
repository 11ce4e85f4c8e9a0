"""Stray field and corner frequency of findings, on boards one can draw."""

from __future__ import annotations

from math import pi

import pytest
import shapely
from shapely import Polygon

from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene

WHOLE = shapely.box(0, 0, 40, 30)
SLOT = shapely.box(19.5, 10, 20.5, 20)


def ground(hole: Polygon | None = None, plane: Polygon = WHOLE) -> Sheet:
    """A ground plane, with a hole or without."""
    left = plane if hole is None else plane.difference(hole)
    return Sheet(tuple(("GND", piece) for piece in shapely.get_parts(left)))


def found_on(
    *sheets: Sheet, heights_mm: tuple[float, ...] = (0.2,), plane: Polygon = WHOLE
) -> Finding:
    """The only finding of a board."""
    made = board(*sheets, heights_mm=heights_mm, outline=plane)
    (finding,) = judge(scene(made, 0.05), *crossings(made)).findings
    return finding


def across(y: float = 15.0, end: float = 38.0, width: float = 0.2) -> Sheet:
    """A layer with one trace along x."""
    return Sheet(lines=(Line("CLK", ((2, y), (end, y)), width),))


def test_a_solved_slot_carries_both() -> None:
    """A slot of 10 x 1 mm 0.2 mm below the trace: its detour of 10 mm over 35 um."""
    finding = found_on(across(), ground(SLOT))
    assert finding.method == "solved"
    assert finding.stray_db is not None
    # no plane at all would be heard (10 + 0.4)/0.4 times: 28 dB
    assert 3.0 < finding.stray_db < 28.3
    assert finding.added_nh is not None
    # by hand: 0.493 mohm * 2/pi ln(1 + 10/(4 * 0.2)) = 0.816 mohm
    assert finding.corner_khz == pytest.approx(816 / (2 * pi * finding.added_nh), rel=0.02)


def test_where_there_is_no_way_back_there_is_neither() -> None:
    """A split plane that nothing joins."""
    finding = found_on(across(), ground(shapely.box(19.5, -1, 20.5, 31)))
    assert finding.method == "none"
    assert finding.stray_db is None
    assert finding.corner_khz is None


def test_under_another_plane_no_probe_hears_the_slot() -> None:
    """Then the field stays between the planes, and only the corner is told."""
    finding = found_on(ground(), across(), ground(SLOT), heights_mm=(0.4, 0.2))
    assert finding.method == "solved"
    assert finding.stray_db is None
    assert finding.corner_khz is not None


def test_a_plane_beyond_is_heard_less() -> None:
    """It shields the slot; the plane of a wider slot is heard more."""
    bare = found_on(across(), ground(SLOT)).stray_db
    shielded = found_on(across(), ground(SLOT), ground(), heights_mm=(0.2, 0.2)).stray_db
    wide = found_on(across(), ground(shapely.box(18.5, 8, 21.5, 22))).stray_db
    assert bare is not None
    assert shielded is not None
    assert wide is not None
    assert shielded < bare - 3.0 < wide - 3.0


def test_a_cut_run_out_to_the_edge_costs_another_order() -> None:
    """1 mm dielectric, a trace 5 mm from the edge of its plane (common practice, no source).

    The cut stops 2 mm short of the edge, or runs out over it. At 10 mm even no plane at all would
    be heard no more than (10 + 2)/2, six times: most of that is reached.
    """
    plane = shapely.box(0, 0, 160, 100)
    trace = across(95.0, 158.0, 1.0)
    short, out = (
        found_on(
            trace,
            ground(shapely.box(79.5, 5, 80.5, end), plane),
            heights_mm=(1.0,),
            plane=plane,
        )
        for end in (98.0, 101.0)
    )
    assert short.added_nh is not None
    assert out.added_nh is not None
    assert short.stray_db is not None
    assert out.stray_db is not None
    assert short.added_nh < 3.0
    assert out.added_nh > 10 * short.added_nh
    assert abs(short.stray_db) < 1.5
    assert 9.5 < out.stray_db < 15.6
