"""The field solve as others may call it, with polygons only."""

from __future__ import annotations

import numpy as np
import pytest
from shapely import LineString, MultiPolygon, Point, box

import splitcheck
from splitcheck.errors import SplitcheckError
from splitcheck.loops.solve import ViaBridge

TRACE = LineString([(-20, 0), (20, 0)])
SLOT = box(-0.2, -4, 0.2, 4)


def test_it_is_found_at_the_top() -> None:
    """And nothing else is made up there."""
    assert splitcheck.added_inductance(SLOT, TRACE, 0.2).shape == (1, 1)
    with pytest.raises(AttributeError, match="no attribute"):
        splitcheck.no_such_thing  # noqa: B018 (the look-up is the test)


def test_one_polygon_many_or_a_multipolygon_are_the_same() -> None:
    """The gap may come in any of the forms that shapely has."""
    other = box(5, -1, 6, 1)
    several = splitcheck.added_inductance([SLOT, other], TRACE, 0.2)
    assert splitcheck.added_inductance(MultiPolygon([SLOT, other]), [TRACE], 0.2) == several


def test_odd_mode_of_a_pair_is_less_than_either_alone() -> None:
    """What couples by the gap cancels between the two of a pair."""
    pair = [LineString([(-20, y), (20, y)]) for y in (-0.2, 0.2)]
    matrix = splitcheck.added_inductance(SLOT, pair, 0.2, width_mm=0.15)
    odd = np.array([1.0, -1.0])
    assert 0 < odd @ matrix @ odd < 2 * matrix[0, 0]


def test_without_a_way_back_it_says_so_and_with_bridges_it_has_a_value() -> None:
    """A cut from edge to edge."""
    cut, board = box(-0.2, -30, 0.2, 30), box(-25, -20, 25, 20)
    with pytest.raises(SplitcheckError, match="no way back"):
        splitcheck.added_inductance(cut, TRACE, 0.2, outside=board)
    vias = [ViaBridge(Point(x, 0), 0.3) for x in (-2, 2)]
    value = splitcheck.added_inductance(cut, TRACE, 0.2, outside=board, beyond_mm=0.5, bridges=vias)
    assert 0.5 < value[0, 0] < 3
