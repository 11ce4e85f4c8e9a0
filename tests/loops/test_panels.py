"""Panels: they cover their gap, are finest where the field is, and stay few."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Point, Polygon, box
from shapely.affinity import rotate

from splitcheck.loops.grading import Grading, TooManyPanelsError
from splitcheck.loops.panels import Panels, cut

TRACE = LineString([(-20, 0), (20, 0)])
BENT = LineString([(0, -6), (0, 1), (4, 3)]).buffer(0.4, cap_style="flat")
RING = Polygon(Point(0, 0).buffer(2).exterior, [Point(0, 0).buffer(1.5).exterior])
FIELD = Polygon(
    box(-8, -8, 8, 8).exterior,
    [Point(x, y).buffer(0.4).exterior for x in range(-7, 8, 2) for y in range(-7, 8, 2)],
)
SHAPES = {"slot": box(-0.2, -6, 0.2, 6), "void": box(-2, -2, 2, 2), "bent": BENT, "ring": RING}


def grading(near: float = 0.15) -> Grading:
    """As the solve uses it for a trace 0.25 mm high."""
    return Grading((TRACE,), near, slope=0.4, far_mm=25 * near)


def covered(panels: Panels, gap: Polygon) -> float:
    """Area of the panels without the widening at the rim, over that of the gap."""
    rings = [
        Polygon([*edge[:, :2][np.hypot(*(edge[:, 2:] - edge[:, :2]).T) > 0]])
        for edge in panels.edges
    ]
    return float(shapely.union_all(rings, grid_size=1e-6).intersection(gap).area / gap.area)


@pytest.mark.parametrize("shape", SHAPES.values(), ids=SHAPES.keys())
@pytest.mark.parametrize("degrees", [0, 17, 45, 90, 121])
def test_panels_cover_a_gap_at_any_angle(shape: Polygon, degrees: float) -> None:
    """Nothing is lost but slivers, and the widening at the rim stays the share it is."""
    gap = rotate(shape, degrees, origin=(0, 0))
    assert isinstance(gap, Polygon)
    panels = cut([gap], grading(), [8.4])
    assert covered(panels, gap) > 0.985
    assert gap.area < panels.area.sum() < 1.14 * gap.area
    assert len(panels) < 900


def test_a_straight_slot_is_one_panel_wide_far_away_at_any_angle() -> None:
    """Cells lie along it; turned, the trace only runs over it for longer."""
    counts = []
    for degrees in (0, 30, 71):
        gap = rotate(SHAPES["slot"], degrees, origin=(0, 0))
        assert isinstance(gap, Polygon)
        counts.append(len(cut([gap], grading(), [8.4])))
    assert max(counts) < 2.5 * min(counts)
    assert max(counts) < 120


def test_panels_are_finest_at_the_trace() -> None:
    """Twice as far they may be twice as large, and larger still further out."""
    panels = cut([box(-8, -8, 8, 8)], grading(), [8.4])
    size, away = panels.sides.max(axis=1), np.abs(panels.centre[:, 1])
    assert size[away < 0.1].max() < 1.2
    assert size[(away > 2) & (away < 4)].min() > 0.4
    assert size[away > 6].min() > 1.0


def test_points_and_sides_have_the_moments_of_the_outline() -> None:
    """Four points of equal weight stand for each panel up to second order."""
    panels = cut([BENT, RING], grading(), [8.4, 8.4])
    off = panels.points - panels.centre[:, None, :]
    xx, yy = (off[:, :, 0] ** 2).mean(axis=1), (off[:, :, 1] ** 2).mean(axis=1)
    xy = (off[:, :, 0] * off[:, :, 1]).mean(axis=1)
    assert np.stack([xx, xy, yy], axis=1) == pytest.approx(panels.spread, abs=1e-9)
    assert (panels.sides**2).sum(axis=1) / 12 == pytest.approx(xx + yy)


def test_a_gap_far_away_is_cut_in_four() -> None:
    """Together they have the second moments of the gap, somewhat enlarged."""
    far = Point(3, 9).buffer(0.5)
    panels = cut([far], grading(), [2.1])
    assert len(panels) == 4
    middle = (panels.centre * panels.area[:, None]).sum(axis=0) / panels.area.sum()
    assert middle == pytest.approx([3.0, 9.0], abs=1e-6)


def test_an_antipad_field_does_not_explode() -> None:
    """A large gap with 64 islands takes hundreds of panels, not thousands."""
    panels = cut([FIELD], grading(), [8.4])
    assert 100 < len(panels) < 1500
    assert panels.area.sum() > 0.95 * FIELD.area


def test_more_panels_than_allowed_are_not_made() -> None:
    """The caller learns of it early and can ask for coarser ones."""
    fine = Grading((TRACE,), 0.001, slope=0.01, most=500)
    with pytest.raises(TooManyPanelsError):
        cut([box(-8, -8, 8, 8)], fine, [8.4])


@settings(max_examples=15)
@given(st.lists(st.tuples(st.floats(-3, 3), st.floats(-3, 3)), min_size=3, max_size=9))
def test_any_polygon_gives_sound_panels(points: list[tuple[float, float]]) -> None:
    """Whatever the corners, areas are positive and every panel has a point of the gap in it."""
    shapes = shapely.get_parts(shapely.make_valid(Polygon(np.round(points, 6))))
    gaps = [s for s in shapes if isinstance(s, Polygon) and s.area > 1e-3 * s.length]
    panels = cut(gaps, grading(), [8.4] * len(gaps))
    assert np.isfinite(panels.edges).all()
    assert (panels.area > 0).all()
    for number, gap in enumerate(gaps):
        inside = panels.inside[panels.gap == number]
        assert len(inside) > 0
        assert shapely.distance(shapely.points(inside), gap).max() < 1e-6
