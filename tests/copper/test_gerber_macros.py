"""Aperture macros: every primitive and the arithmetic, against areas worked out by hand."""

from __future__ import annotations

from math import asin, pi, sqrt

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import macros
from splitcheck.copper.macros import evaluate, instantiate
from splitcheck.errors import SplitcheckError

AT = "it.gbr:7"


def area_mm2(body: str, *parameters: float, unit_mm: float = 1.0) -> float:
    """Area that the macro covers."""
    return sum(p.area for p in instantiate(body, parameters, unit_mm, AT))


def bounds_mm(body: str, *parameters: float, unit_mm: float = 1.0) -> tuple[float, ...]:
    """Box round what it covers."""
    found = shapely.total_bounds(instantiate(body, parameters, unit_mm, AT))
    return tuple(round(float(value), 5) for value in found)


def cross_in_disc_mm2(diameter: float, gap: float) -> float:
    """Area of a cross of two bars of width ``gap`` inside a disc.

    A bar through a disc: 2 (r^2 asin(g/2r) + g/2 sqrt(r^2 - g^2/4)), twice, less the square.
    """
    r, g = diameter / 2, gap / 2
    return 4 * (r * r * asin(g / r) + g * sqrt(r * r - g * g)) - gap * gap


class TestPrimitives:
    """Codes 1, 2, 4, 5, 6, 7, 20, 21 and 22."""

    @pytest.mark.parametrize(
        ("body", "area"),
        [
            ("1,1,2,5,5*", pi),
            ("1,1,2,5,5,30*", pi),
            ("20,1,0.5,0,0,4,3,0*", 2.5),
            ("2,1,0.5,0,0,4,3,0*", 2.5),
            ("21,1,3,2,1,1,45*", 6.0),
            ("22,1,3,2,1,1,45*", 6.0),
            ("4,1,3,0,0,2,0,0,1,0,0,15*", 1.0),
            ("5,1,6,0,0,2,10*", 1.5 * sqrt(3)),
            ("5,1,8,3,1,2,0*", 2 * sqrt(2)),
            ("7,0,0,4,2,0.5,0*", 3 * pi - cross_in_disc_mm2(4, 0.5) + cross_in_disc_mm2(2, 0.5)),
            ("7,0,0,4,2,0.5,45*", 3 * pi - cross_in_disc_mm2(4, 0.5) + cross_in_disc_mm2(2, 0.5)),
            ("6,0,0,6,0.5,0.5,1,0,0,0*", pi * (9 - 6.25)),
            ("6,0,0,6,0.5,0.5,2,0,0,0*", pi * (9 - 6.25 + 4 - 2.25)),
            ("6,0,0,2,1,1,5,0,0,0*", pi),
            ("6,0,0,0,0,0,0,0.5,3,0*", 3 - 0.25),
        ],
    )
    def test_area(self, body: str, area: float) -> None:
        """Closed forms; circles have their exact area."""
        assert area_mm2(body) == pytest.approx(area, rel=1e-4)
        assert area_mm2(body, unit_mm=25.4) == pytest.approx(area * 25.4**2, rel=1e-4)

    @pytest.mark.parametrize(
        ("body", "bounds"),
        [
            ("21,1,2,1,3,0,0*", (2, -0.5, 4, 0.5)),
            ("21,1,2,1,3,0,90*", (-0.5, 2, 0.5, 4)),
            ("21,1,2,1,3,0,180*", (-4, -0.5, -2, 0.5)),
            ("22,1,2,1,3,0,0*", (3, 0, 5, 1)),
            ("22,1,2,1,3,0,90*", (-1, 3, 0, 5)),
            ("20,1,1,1,0,3,0,90*", (-0.5, 1, 0.5, 3)),
            ("4,1,3,1,0,3,0,1,1,1,0,270*", (0, -3, 1, -1)),
            ("5,1,4,3,0,2,0*", (2, -1, 4, 1)),
            ("5,1,4,3,0,2,90*", (-1, 2, 1, 4)),
            ("6,4,0,0,0,0,0,1,2,90*", (-1, 3, 1, 5)),
        ],
    )
    def test_rotation_is_round_the_origin_of_the_macro(
        self, body: str, bounds: tuple[float, ...]
    ) -> None:
        """Counter-clockwise, in degrees, wherever the primitive lies."""
        assert bounds_mm(body) == bounds

    def test_circle_off_the_origin_turns_round_it(self) -> None:
        """A circle at (3, 0) turned by 90 degrees lies at (0, 3)."""
        low_x, low_y, high_x, high_y = bounds_mm("1,1,2,3,0,90*")
        assert (low_x + high_x, low_y + high_y) == pytest.approx((0, 6), abs=1e-5)

    def test_thermal_falls_apart_into_four(self) -> None:
        """And a gap as wide as the square inside the disc leaves nothing."""
        assert len(instantiate("7,0,0,4,2,0.5,0*", (), 1.0, AT)) == 4
        assert instantiate("7,0,0,4,2,2.9,0*", (), 1.0, AT) == ()

    def test_exposure_off_cuts_what_came_before_only(self) -> None:
        """A hole, and a dot set into it afterwards."""
        assert area_mm2("1,1,4,0,0*1,0,2,0,0*") == pytest.approx(3 * pi, rel=1e-5)
        assert area_mm2("1,0,2,0,0*1,1,4,0,0*") == pytest.approx(4 * pi, rel=1e-5)
        assert area_mm2("1,1,4,0,0*1,0,2,0,0*1,1,1,0,0*") == pytest.approx(3.25 * pi, rel=1e-5)

    def test_exposure_may_be_an_expression(self) -> None:
        """On is anything but zero."""
        body = "21,1,4,4,0,0,0*21,$1,2,2,0,0,0*"
        assert area_mm2(body, 0.0) == pytest.approx(12)
        assert area_mm2(body, 1.0) == pytest.approx(16)

    def test_overlapping_primitives_are_one(self) -> None:
        """A rounded rectangle as common exporters write it: 2 x 1 mm, radius 0.25."""
        body = (
            "0 Rectangle with rounded corners*\n0 $1 radius, $2 to $9 corners*\n"
            "4,1,4,$2,$3,$4,$5,$6,$7,$8,$9,$2,$3,0*\n"
            "1,1,$1+$1,$2,$3*\n1,1,$1+$1,$4,$5*\n1,1,$1+$1,$6,$7*\n1,1,$1+$1,$8,$9*\n"
            "20,1,$1+$1,$2,$3,$4,$5,0*\n20,1,$1+$1,$4,$5,$6,$7,0*\n"
            "20,1,$1+$1,$6,$7,$8,$9,0*\n20,1,$1+$1,$8,$9,$2,$3,0*\n"
        )
        corners = (-0.75, -0.25, 0.75, -0.25, 0.75, 0.25, -0.75, 0.25)
        (shape,) = instantiate(body, (0.25, *corners), 1.0, AT)
        assert shape.area == pytest.approx(2 - (4 - pi) * 0.25**2, rel=1e-4)


class TestArithmetic:
    """Expressions and variables."""

    @pytest.mark.parametrize(
        ("text", "value"),
        [
            ("5-2-1", 2),
            ("8/2/2", 2),
            ("8/2x2", 8),
            ("2+3x4", 14),
            ("(2+3)x4", 20),
            ("-2--3", 1),
            ("-(1+2)X$1", -30),
            ("$1/4", 2.5),
            ("$7", 0),
            ("+.5", 0.5),
            ("1.+1", 2),
            (" 1 + 2 ", 3),
            ("1-$2x(3-1)-1", -6),
        ],
    )
    def test_value(self, text: str, value: float) -> None:
        """Left to right, multiplication first; what has no value is 0."""
        assert evaluate(text, {1: 10.0, 2: 3.0}, AT) == value

    @given(st.lists(st.tuples(st.sampled_from("+-x/"), st.integers(1, 50)), min_size=1, max_size=8))
    def test_agrees_with_python(self, steps: list[tuple[str, int]]) -> None:
        """Python's own rules of precedence and order are the same."""
        text = "7" + "".join(f"{sign}{number}" for sign, number in steps)
        truth = float(eval(text.replace("x", "*")))
        assert evaluate(text, {}, AT) == pytest.approx(truth)

    def test_variables_are_set_in_order(self) -> None:
        """A variable may be set from others, and set anew."""
        assert area_mm2("$3=$1x2*21,1,$3,1,0,0,0*$3=$3+10*1,0,$4,0,0*", 2.0) == pytest.approx(4.0)


class TestErrors:
    """Macros at fault."""

    @pytest.mark.parametrize(
        ("body", "words"),
        [
            ("21,1,1,1,0*21,1*", "21 (centre line) with 4 values where 6 belong"),
            ("8,1,1*", "unknown primitive '8'"),
            ("1,1,1/0,0,0*", "'1/0', which divides by zero"),
            ("1,1,1+,0,0*", "'1+', which is no expression"),
            ("1,1,import,0,0*", "'import', which is no expression"),
            ("1,1,(1,0,0*", "'(1', which is no expression"),
            ("1,1,nan,0,0*", "'nan', which is not a number"),
            ("1,1," + "(" * 60 + "1" + ")" * 60 + ",0,0*", "brackets more than 50 deep"),
            ("4,1,99999,0,0,0*", "an outline of 99999.0 corners, limit 50000"),
            ("4,1,1.5,0,0,0*", "an outline of 1.5 corners"),
            ("5,1,2,0,0,1,0*", "a polygon of 2 corners"),
            ("6,0,0,9,0,0,1000000000,0,0,0*", "a moire of 1e+09 rings, limit 1000"),
            ("$x=1*", "the statement '$x=1'"),
        ],
    )
    def test_wrong_macros_are_refused_in_words(self, body: str, words: str) -> None:
        """With the place of the definition."""
        with pytest.raises(SplitcheckError) as caught:
            instantiate(body, (), 1.0, AT)
        assert caught.value.place == AT
        assert words in caught.value.wrong

    def test_absurdly_many_statements(self) -> None:
        """Refused before anything is drawn, with both numbers."""
        with pytest.raises(SplitcheckError, match="10001 statements, more than the limit of 10000"):
            macros.check_size("1,1,1,0,0*" * 10_001, AT)
