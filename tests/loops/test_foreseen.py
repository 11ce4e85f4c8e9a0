"""Which ragged gaps are worth a try: laws, a comb of channels, and a long rim far off."""

from __future__ import annotations

from functools import cache

import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Polygon, box
from shapely.affinity import scale, translate

from splitcheck.loops.foreseen import FEW_CORNERS, is_too_much

TRACE = LineString([(-15, 0), (15, 0)])


@cache
def _comb(teeth: int, wide_mm: float = 0.1, long_mm: float = 20.0) -> Polygon:
    """Channels every 0.3 mm beside one another, joined at one end, with a corner each 0.05 mm."""
    back = box(-0.15 * teeth, long_mm / 2, 0.15 * teeth, long_mm / 2 + wide_mm)
    at = [-0.15 * teeth + 0.3 * k for k in range(teeth)]
    channels = [box(x, -long_mm / 2, x + wide_mm, long_mm / 2 + wide_mm) for x in at]
    comb = shapely.union_all([back, *channels])
    assert isinstance(comb, Polygon)
    fine = comb.segmentize(0.05)
    assert int(shapely.get_num_coordinates(fine)) > FEW_CORNERS
    return fine


def test_a_comb_of_channels_under_a_trace_is_too_much() -> None:
    """60 channels of 20 mm are 1200 mm to be cut into stretches of 0.3 mm to some mm."""
    assert is_too_much([_comb(60)], [TRACE], 0.2)


def test_as_many_corners_of_few_channels_are_not() -> None:
    """Seven channels with corners every 0.05 mm: what counts is the length of the rim."""
    assert not is_too_much([_comb(7)], [TRACE], 0.2)


def test_the_same_comb_far_off_is_not() -> None:
    """Beyond 100 mm panels are as large as the comb."""
    far = translate(_comb(60), 0.0, 150.0)
    assert not is_too_much([far], [TRACE], 0.2)


@settings(max_examples=20, deadline=None)
@given(st.floats(0.05, 20.0), st.sampled_from([7, 15, 30, 60]))
def test_all_lengths_times_the_same_change_nothing(times: float, teeth: int) -> None:
    """A board twice as large in all three directions has as many panels."""
    gap = _comb(teeth)
    larger = scale(gap, times, times, origin=(0, 0))
    trace = scale(TRACE, times, times, origin=(0, 0))
    plain = is_too_much([gap], [TRACE], 0.2)
    assert is_too_much([larger], [trace], 0.2 * times) == plain


@pytest.mark.parametrize("teeth", [7, 15, 30])
def test_another_gap_never_makes_it_less(teeth: int) -> None:
    """More rim, more panels."""
    more = box(-14, 11, 14, 12)
    if is_too_much([_comb(teeth)], [TRACE], 0.2):
        assert is_too_much([_comb(teeth), more], [TRACE], 0.2)
    else:
        assert not is_too_much([more], [TRACE], 0.2)
