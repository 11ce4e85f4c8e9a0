"""Two gaps above one another in neighbouring planes: said, and the plane beyond is no shield."""

from __future__ import annotations

from collections.abc import Sequence

import pytest
from shapely import Polygon, box

from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene

WHOLE = box(0, 0, 60, 40)
SLOT = box(29.6, 12, 30.4, 28)
SLOTTED = Polygon(WHOLE.exterior, [SLOT.exterior])
#: A slot that is not beneath the other one.
ASIDE = Polygon(WHOLE.exterior, [box(5, 2, 21, 2.8).exterior])
TRACE = Sheet(lines=(Line("CLK", ((8.0, 20.0), (52.0, 20.0))),))


def _only(planes: Sequence[Polygon], heights_mm: Sequence[float]) -> Finding:
    """The one finding of a trace over some ground planes, nearest first."""
    made = board(
        TRACE, *(Sheet(areas=(("GND", plane),)) for plane in planes), heights_mm=heights_mm
    )
    (found,) = judge(scene(made), *crossings(made)).findings
    assert found.method == "solved"
    assert found.plane_layer == "L2"
    return found


def _nh(found: Finding) -> float:
    assert found.added_nh is not None
    return found.added_nh


def test_a_gap_in_the_next_plane_is_said_and_that_plane_is_no_shield() -> None:
    """The same slot in both: as much as if there were no second plane, and one finding."""
    alone = _only([SLOTTED], [0.2])
    both = _only([SLOTTED, SLOTTED], [0.2, 0.3])
    assert "the next plane, L3, is open here as well" in both.reason
    assert "shields" not in both.reason
    assert _nh(both) == pytest.approx(_nh(alone), rel=1e-9)


@pytest.mark.parametrize("next_plane", [WHOLE, ASIDE])
def test_a_next_plane_that_is_whole_there_shields(next_plane: Polygon) -> None:
    """Whole, or open somewhere else."""
    alone = _only([SLOTTED], [0.2])
    shielded = _only([SLOTTED, next_plane], [0.2, 0.3])
    assert "L3 is whole 0.30 mm beyond and shields the gap" in shielded.reason
    assert "open here as well" not in shielded.reason
    assert _nh(shielded) < 0.5 * _nh(alone)


def test_behind_two_gaps_the_third_plane_shields_as_far_off_as_it_is() -> None:
    """Through the slot in L3: 0.3, its 0.035 mm of copper and 0.4, as if L3 were not there."""
    three = _only([SLOTTED, SLOTTED, WHOLE], [0.2, 0.3, 0.4])
    two = _only([SLOTTED, WHOLE], [0.2, 0.735])
    assert "L4 is whole 0.73 mm beyond and shields the gap" in three.reason
    assert "the next plane, L3, is open here as well" in three.reason
    assert _nh(three) == pytest.approx(_nh(two), rel=1e-9)
    assert _nh(three) > 1.2 * _nh(_only([SLOTTED, WHOLE], [0.2, 0.3]))


@pytest.mark.parametrize("half_mm", [1.5, 3.0, 6.0])
def test_a_shorter_gap_in_the_next_plane_right_beneath_is_said_too(half_mm: float) -> None:
    """A slot of L3 that ends before that of L2: no less than with the whole of L3."""
    short = Polygon(WHOLE.exterior, [box(29.6, 20 - half_mm, 30.4, 20 + half_mm).exterior])
    found = _only([SLOTTED, short], [0.2, 0.3])
    assert "the next plane, L3, is open here as well" in found.reason
    assert _nh(found) > _nh(_only([SLOTTED, WHOLE], [0.2, 0.3]))
