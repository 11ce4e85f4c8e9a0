"""What a mounted two-pad part adds, against published figures and by laws."""

from __future__ import annotations

from math import acosh, inf, log, nan, pi

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.errors import SplitcheckError
from splitcheck.loops.mounted import mounted_nh, strip_nh_mm
from splitcheck.units import MU0

spans = st.floats(0.3, 20.0)
depths = st.floats(0.0, 2.0)


@pytest.mark.parametrize("body_nh", [0.2, 0.4])
@pytest.mark.parametrize("depth_mm", [0.2, 0.5])
@pytest.mark.parametrize("span_mm", [1.6, 2.6])
def test_usual_layouts_are_mounted_with_1_to_2_nh(
    body_nh: float, depth_mm: float, span_mm: float
) -> None:
    """S. Weir, si-list, Nov 2000: 1.5 to 2 nH; 0603 and 0402 with a hole at either pad.

    Bodies of 0.2 to 0.4 nH, as D. Brooks quotes them (si-list, 17 Mar 1999).
    """
    value = mounted_nh(span_mm, (depth_mm, depth_mm), body_nh=body_nh)
    assert 0.7 <= value <= 2.2


def test_long_ways_to_deep_planes_reach_several_nh() -> None:
    """D. Brooks, si-list, 17 Mar 1999: pad and hole 1 to 5 nH by layout, besides the body."""
    best, worst = mounted_nh(2.0, (0.2, 0.2)), mounted_nh(5.0, (1.3, 1.3))
    assert 0.5 <= best - 0.3 <= 1.5
    assert 4.0 <= worst - 0.3 <= 6.0


@pytest.mark.parametrize(
    ("width_mm", "height_mm", "nh_mm"),
    [
        # wide strip: mu0 h/w to a few percent beyond fringing, mu0 h/(w + 1.4 h) (common form)
        (20.0, 0.2, MU0 * 0.2 / (20.0 + 1.4 * 0.2)),
        # thin wire of radius w/4 over a plane: mu0/(2 pi) ln(2 h/r) (Grover)
        (0.05, 2.0, MU0 / (2 * pi) * log(2 * 2.0 / (0.05 / 4))),
        # 50 ohm in air is 50/c: w/h = 4.9 for an air microstrip (from memory)
        (4.9, 1.0, 50.0 / 299.792458),
    ],
)
def test_strip_meets_its_limits(width_mm: float, height_mm: float, nh_mm: float) -> None:
    """Wide, thin and the well known 50 ohm line."""
    assert strip_nh_mm(width_mm, height_mm) == pytest.approx(nh_mm, rel=0.03)


def test_holes_are_a_two_wire_line() -> None:
    """H. Johnson, EDN, "Parasitic inductance of bypass capacitors": mu0/pi h ln(2 s/d).

    What a deeper plane adds besides the strip is the pair of holes: s 2 mm, d 0.3 mm, h 0.8 mm
    makes 0.83 nH (via pair, same source).
    """
    strip = 2.0 * strip_nh_mm(0.5, 0.8)
    pair = mounted_nh(2.0, (0.8, 0.8), body_nh=0.0) - strip
    assert pair == pytest.approx(0.83, abs=0.01)
    assert pair == pytest.approx(MU0 / pi * 0.8 * acosh(2.0 / 0.3), rel=1e-9)


@given(spans, depths, depths, st.floats(0.1, 3.0))
def test_farther_and_deeper_is_more(span: float, one: float, other: float, more: float) -> None:
    """Never less for a longer span or a deeper plane; the sides may be swapped."""
    value = mounted_nh(span, (one, other))
    assert value > 0.0
    assert mounted_nh(span + more, (one, other)) >= value
    assert mounted_nh(span, (one + more, other)) >= value
    assert mounted_nh(span, (other, one)) == pytest.approx(value)


@given(spans, depths, st.floats(0.1, 2.0))
def test_wider_copper_and_barrels_are_less(span: float, depth: float, wider: float) -> None:
    """The usual advice."""
    value = mounted_nh(span, (depth, depth))
    assert mounted_nh(span, (depth, depth), width_mm=0.5 + wider) <= value
    assert mounted_nh(span, (depth, depth), 0.3 + wider) <= value


@pytest.mark.parametrize(
    ("span", "depth", "diameter", "width", "body", "place"),
    [
        (nan, 0.2, 0.3, 0.5, 0.3, "span_mm"),
        (-1.0, 0.2, 0.3, 0.5, 0.3, "span_mm"),
        (inf, 0.2, 0.3, 0.5, 0.3, "span_mm"),
        (1.0, -0.2, 0.3, 0.5, 0.3, "depths_mm"),
        (1.0, inf, 0.3, 0.5, 0.3, "depths_mm"),
        (1.0, 0.2, 0.0, 0.5, 0.3, "diameter_mm"),
        (1.0, 0.2, 0.3, -0.5, 0.3, "width_mm"),
        (1.0, 0.2, 0.3, 0.5, -0.3, "body_nh"),
    ],
)
def test_what_is_no_length_is_refused(
    span: float, depth: float, diameter: float, width: float, body: float, place: str
) -> None:
    """With the name of what is wrong."""
    with pytest.raises(SplitcheckError, match=place):
        mounted_nh(span, (0.2, depth), diameter, width_mm=width, body_nh=body)
