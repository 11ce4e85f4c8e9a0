"""Painting: order, cut-ins, crossings, negative layers, and which mark lies on which piece."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from itertools import pairwise
from math import pi

import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from shapely import Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import coats, curves, fills, outlines, paint, union
from splitcheck.copper.marks import NO_TAG, Fill, Flash, Mark, Point, Stroke, Tag

GND, VCC, CLK = Tag("GND"), Tag("VCC"), Tag("CLK")


def box(x: float, y: float, w: float, h: float, tag: Tag = NO_TAG, *, dark: bool = True) -> Fill:
    """A rectangular fill."""
    ring = ((x, y), (x + w, y), (x + w, y + h), (x, y + h), (x, y))
    return Fill(ring, dark, tag, 1)


def line(start: Point, end: Point, width: float, tag: Tag = NO_TAG, *, dark: bool = True) -> Stroke:
    """A straight stroke."""
    return Stroke((start, end), width, None, dark, tag, 1)


def dot(at: Point, diameter: float, tag: Tag = NO_TAG, *, dark: bool = True) -> Flash:
    """A round flash."""
    return Flash(at, Polygon(curves.circle(diameter)), dark, tag, 1, diameter)


def area_mm2(marks: list[Mark]) -> float:
    """Area of the painted marks."""
    return sum(piece.area for piece in paint.paint(marks))


class TestPaint:
    """Marks to pieces."""

    def test_nothing_gives_nothing(self) -> None:
        """No marks, only clear marks, or marks of no size."""
        assert paint.paint([]) == ()
        assert paint.paint([box(0, 0, 1, 1, dark=False)]) == ()
        assert paint.paint([line((0, 0), (1, 0), 0.0)]) == ()

    def test_overlapping_marks_are_one_piece(self) -> None:
        """A cross of two bars."""
        (piece,) = paint.paint([box(0, 4, 9, 1), box(4, 0, 1, 9)])
        assert piece.area == pytest.approx(17)

    def test_pieces_come_sorted_by_place(self) -> None:
        """Whatever the order of the marks."""
        marks = [box(5, 0, 1, 1), box(0, 5, 1, 1), box(0, 0, 1, 1)]
        expected = [(0, 0, 1, 1), (0, 5, 1, 6), (5, 0, 6, 1)]
        assert [piece.bounds for piece in paint.paint(marks)] == expected
        assert paint.paint(marks) == paint.paint(marks[::-1])

    def test_plane_with_antipads_and_pads(self) -> None:
        """One region, a thousand clear dots, a pad in each: counted and measured."""
        places = [(float(x), float(y)) for x in range(40) for y in range(25)]
        marks: list[Mark] = [box(-1, -1, 41, 26)]
        marks += [dot(at, 0.6, dark=False) for at in places]
        marks += [dot(at, 0.3) for at in places]
        pieces = paint.paint(marks)
        assert len(pieces) == 1001
        whole = 41 * 26 - 1000 * pi / 4 * (0.36 - 0.09)
        assert sum(piece.area for piece in pieces) == pytest.approx(whole, rel=1e-6)

    def test_polarity_that_changes_with_every_mark(self) -> None:
        """Nested squares, dark and clear by turns: rings, in file order."""
        marks: list[Mark] = [box(n, n, 40 - 2 * n, 40 - 2 * n, dark=n % 2 == 0) for n in range(20)]
        pieces = paint.paint(marks)
        assert len(pieces) == 10
        squares = [(40 - 2 * n) ** 2 for n in range(20)]
        assert sum(p.area for p in pieces) == sum(squares[::2]) - sum(squares[1::2])

    def test_many_overlaps_are_painted_in_runs(self, monkeypatch: pytest.MonkeyPatch) -> None:
        """The way out where too many boxes overlap gives the same image."""
        marks: list[Mark] = [
            box(n % 7, n % 5, 3 + n % 4, 2 + n % 3, dark=n % 3 > 0) for n in range(60)
        ]
        sorted_out = paint.paint(marks)
        monkeypatch.setattr(paint, "coats", partial(coats.coats, most_pairs=3))
        in_runs = paint.paint(marks)
        one, other = (
            shapely.union_all(np.array(pieces, dtype=object)) for pieces in (sorted_out, in_runs)
        )
        assert shapely.symmetric_difference(one, other).area < 1e-9

    def test_stroke_that_is_not_round_follows_its_path(self) -> None:
        """A frame dragged along: its hole is swept too."""
        frame = Polygon(
            [(-1, -1), (1, -1), (1, 1), (-1, 1)],
            [[(-0.5, -0.5), (-0.5, 0.5), (0.5, 0.5), (0.5, -0.5)]],
        )
        mark = Stroke(((0.0, 0.0), (0.5, 0.0)), 2.0, frame, True, Tag(), 1)
        # 2.5 x 2 without what no edge passed over: 0.5 x 1.
        assert area_mm2([mark]) == pytest.approx(5 - 0.5)

    def test_bent_stroke_is_one_piece(self) -> None:
        """A flattened arc has no seams."""
        path = (0.0, 0.0), *curves.arc((0, 0), (2, 0), (1, 0), clockwise=True)
        (piece,) = paint.paint([Stroke(tuple(path), 0.2, None, True, Tag(), 1)])
        assert piece.area == pytest.approx(pi * 0.2 + pi * 0.01, rel=2e-3)


class TestPens:
    """Runs of strokes painted as few shapes."""

    @staticmethod
    def run(points: list[Point], width: float) -> list[Mark]:
        """The pen led along points, one stroke from each to the next."""
        return [line(a, b, width) for a, b in pairwise(points)]

    def assert_as_stroke_by_stroke(self, marks: list[Mark]) -> None:
        """The same copper, but for chords of round corners, as uniting every stroke."""
        plain = shapely.union_all(outlines.outlines(marks))
        painted = shapely.MultiPolygon(paint.paint(marks))
        off = shapely.symmetric_difference(plain, painted)
        assert off.area < 0.004 * plain.length
        # Slivers as thin as chords may be off, a little more where edges meet at small angles.
        assert shapely.buffer(off, -0.006).area == 0

    def test_serpentine(self) -> None:
        """A pour drawn line by line, longer than one piece of a run."""
        points = [
            (float(x), y)
            for k in range(90)
            for x, y in ((5 * (k % 2), 0.3 * k), (5 * ((k + 1) % 2), 0.3 * k))
        ]
        self.assert_as_stroke_by_stroke(self.run(points, 0.4))

    def test_pen_round_a_pour(self) -> None:
        """A contour filled and drawn: the fill grown by half the pen, with its hole."""
        outside = [(0, 0), (20, 0), (20, 20), (0, 20), (0, 10)]
        hole = [(5, 10), (5, 15), (12, 15), (12, 5), (5, 5), (5, 10), (0, 10), (0, 0)]
        ring = tuple((float(x), float(y)) for x, y in outside + hole)
        marks = [Fill(ring, True, Tag(), 1), *self.run(list(ring), 1.0)]
        self.assert_as_stroke_by_stroke(marks)
        (piece,) = paint.paint(marks)
        # 21 x 21 with round corners of 0.5, less a hole of 6 x 9 with sharp ones.
        assert piece.area == pytest.approx(441 - (4 - pi) * 0.25 - 6 * 9, rel=1e-4)

    def test_pen_that_strays_from_its_pour(self) -> None:
        """Two islands in one contour, joined by a line there and back: the pen bridges them."""
        ring = (
            (0.0, 0.0), (4.0, 0.0), (4.0, 2.0), (10.0, 2.0), (10.0, 0.0), (14.0, 0.0),
            (14.0, 4.0), (10.0, 4.0), (10.0, 2.0), (4.0, 2.0), (4.0, 4.0), (0.0, 4.0), (0.0, 0.0),
        )  # fmt: skip
        fill = Fill(ring, True, Tag(), 1)
        assert len(paint.paint([fill])) == 2
        marks = [fill, *self.run(list(ring), 0.5)]
        assert len(paint.paint(marks)) == 1
        self.assert_as_stroke_by_stroke(marks)

    @given(
        st.lists(st.tuples(st.integers(0, 12), st.integers(0, 12)), min_size=9, max_size=30),
        st.booleans(),
    )
    def test_any_run(self, corners: list[tuple[int, int]], filled: bool) -> None:
        """Crossing itself, standing still, filled or not."""
        points = [(x / 2, y / 2) for x, y in corners]
        marks = self.run(points, 0.3)
        if filled:
            points.append(points[0])
            marks = [Fill(tuple(points), True, Tag(), 1), *self.run(points, 0.3)]
        self.assert_as_stroke_by_stroke(marks)


class TestOverlays:
    """Overlays that go wrong in floating numbers."""

    def test_areas_that_do_not_add_up_are_done_again_on_the_grid(
        self, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        """An overlay that lies is found out and corrected."""
        one, other = shapely.box(0, 0, 4, 4), shapely.box(2, 0, 6, 4)
        honest_union, honest_difference = shapely.union, shapely.difference

        def lying(honest: Callable[..., BaseGeometry]) -> Callable[..., BaseGeometry]:
            def overlay(a: BaseGeometry, b: BaseGeometry, **grid: float) -> BaseGeometry:
                return honest(a, b, **grid) if grid else shapely.box(0, 0, 5, 5)

            return overlay

        monkeypatch.setattr(shapely, "union", lying(honest_union))
        monkeypatch.setattr(shapely, "difference", lying(honest_difference))
        both = union.added(np.array([one], dtype=object), np.array([other], dtype=object))
        left = union.cleared(np.array([one], dtype=object), np.array([other], dtype=object))
        assert [p.area for p in both] == [24]
        assert [p.area for p in left] == [8]


class TestFills:
    """Contours that are not simple."""

    def test_figure_of_eight_keeps_both_loops(self) -> None:
        """Wound once each, one way and the other."""
        ring = np.array([(0, 0), (2, 2), (2, 0), (0, 2), (0, 0)], dtype=float)
        assert fills.filled(ring).area == pytest.approx(2.0)

    def test_what_is_wound_twice_is_copper(self) -> None:
        """A spiral that covers its middle twice leaves no hole there, only its notch of 0.5."""
        outer = [(0, 0), (4, 0), (4, 4), (0, 4), (0, 1)]
        inner = [(3, 1), (3, 3), (1, 3), (1, 0.5), (0, 0.5), (0, 0)]
        assert fills.filled(np.array(outer + inner, dtype=float)).area == pytest.approx(15.5)

    def test_hole_against_and_with_the_outside(self) -> None:
        """A cut-in hole runs against its outside; run the same way it is filled."""
        outside = [(0, 0), (9, 0), (9, 9), (0, 9), (0, 5)]
        against = [(3, 5), (3, 6), (6, 6), (6, 3), (3, 3), (3, 5), (0, 5), (0, 0)]
        same = [(3, 5), (3, 3), (6, 3), (6, 6), (3, 6), (3, 5), (0, 5), (0, 0)]
        assert fills.filled(np.array(outside + against, dtype=float)).area == pytest.approx(72)
        assert fills.filled(np.array(outside + same, dtype=float)).area == pytest.approx(81)

    def test_contours_of_no_area(self) -> None:
        """A line there and back, or a single point."""
        assert fills.filled(np.array([(0, 0), (5, 0), (0, 0)], dtype=float)).area == 0
        assert fills.filled(np.zeros((4, 2))).area == 0

    @given(st.lists(st.tuples(st.integers(0, 6), st.integers(0, 6)), min_size=3, max_size=9))
    def test_area_is_where_the_winding_number_is_not_zero(
        self, corners: list[tuple[int, int]]
    ) -> None:
        """Against the winding number summed at every point of a fine grid off the lines."""
        ring = np.array([*corners, corners[0]], dtype=float)
        shape = fills.filled(ring)
        assert shape.is_valid
        steps = np.arange(0.013, 6, 0.173)
        x, y = (part.ravel() for part in np.meshgrid(steps, steps * 0.991 + 0.0071))
        winding = np.zeros(len(x), dtype=int)
        for (ax, ay), (bx, by) in pairwise(ring):
            side = (bx - ax) * (y - ay) - (by - ay) * (x - ax)
            winding += (ay <= y) & (by > y) & (side > 0)
            winding -= (ay > y) & (by <= y) & (side < 0)
        points = shapely.points(x, y)
        near = shapely.distance(shapely.LineString(ring), points) < 1e-6
        inside = shapely.contains(shape, points)
        assert np.array_equal(inside[~near], (winding != 0)[~near])

    @given(st.lists(st.tuples(st.integers(0, 6), st.integers(0, 6)), min_size=3, max_size=9))
    def test_inside_is_inside(self, corners: list[tuple[int, int]]) -> None:
        """The point found without mending lies in the mended area, or there is none."""
        ring = np.array([*corners, corners[0]], dtype=float)
        point = fills.inside(ring)
        if point is None:
            # One level line found nothing: allowed only where a contour is no simple polygon.
            assert not Polygon(ring).is_valid
        else:
            assert shapely.contains_xy(fills.filled(ring), *point)


class TestInvert:
    """Negative layers."""

    def test_what_the_image_leaves_of_the_board(self) -> None:
        """Two clearances, one across the edge."""
        image = paint.paint([dot((5, 5), 2.0), box(9, 0, 3, 1)])
        (copper,) = paint.invert(image, shapely.box(0, 0, 10, 10))
        assert copper.area == pytest.approx(100 - pi - 1, rel=1e-6)

    def test_no_image_leaves_the_whole_board(self) -> None:
        """And an image over all of it leaves nothing."""
        assert [p.area for p in paint.invert((), shapely.box(0, 0, 3, 3))] == [9]
        assert paint.invert((shapely.box(-1, -1, 4, 4),), shapely.box(0, 0, 3, 3)) == ()

    def test_moat_cuts_the_plane_apart(self) -> None:
        """A drawn line across a negative plane makes two islands."""
        image = paint.paint([line((5, -1), (5, 11), 1.0)])
        assert [p.area for p in paint.invert(image, shapely.box(0, 0, 10, 10))] == [45, 45]


class TestNames:
    """Whose copper is whose."""

    def test_each_piece_has_the_names_of_its_marks(self) -> None:
        """Unknown and no net do not count; two names on one piece are both told."""
        marks: list[Mark] = [
            line((0, 0), (5, 0), 0.2, GND),
            line((5, 0), (5, 5), 0.2, GND),
            line((0, 9), (5, 9), 0.2, VCC),
            line((2, 9), (2, 12), 0.2, CLK),
            line((20, 0), (25, 0), 0.2, Tag("")),
            line((30, 0), (35, 0), 0.2),
        ]
        assert paint.names(marks, paint.paint(marks)) == (("GND",), ("CLK", "VCC"), (), ())

    def test_cleared_mark_does_not_name_the_copper_painted_there_later(self) -> None:
        """A plane, its antipad, and another net's pad inside it."""
        marks: list[Mark] = [
            box(0, 0, 10, 10, GND),
            line((2, 5), (8, 5), 0.2, GND),
            dot((2, 5), 2.0, dark=False),
            dot((2, 5), 1.0, CLK),
        ]
        assert paint.names(marks, paint.paint(marks)) == (("GND",), ("CLK",))
        assert paint.landed(marks, paint.paint(marks)) == ((0,), (0,), (), (1,))

    def test_mark_cut_apart_lies_on_both_pieces(self) -> None:
        """A line through a moat names both sides."""
        marks: list[Mark] = [line((0, 0), (10, 0), 1.0, GND), box(4, -2, 2, 4, dark=False)]
        pieces = paint.paint(marks)
        assert paint.landed(marks, pieces) == ((0, 1), ())
        assert paint.names(marks, pieces) == (("GND",), ("GND",))

    def test_clear_before_a_mark_does_not_touch_it(self) -> None:
        """Order counts."""
        marks: list[Mark] = [box(0, 0, 9, 9, dark=False), box(1, 1, 2, 2, VCC)]
        assert paint.names(marks, paint.paint(marks)) == (("VCC",),)

    def test_ring_is_named_though_its_middle_is_bare(self) -> None:
        """The witness of a shape with a hole lies on its copper."""
        ring = Polygon(curves.circle(4.0), [curves.circle(2.0)[::-1]])
        marks: list[Mark] = [Flash((0, 0), ring, True, GND, 1), dot((0, 0), 1.0, CLK)]
        assert paint.names(marks, paint.paint(marks)) == (("GND",), ("CLK",))
