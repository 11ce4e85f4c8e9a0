"""Traces that leave their plane for good, and go on over a farther one or over none."""

from __future__ import annotations

import pytest
import shapely

from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene, via

SIGNAL = Sheet(lines=(Line("CLK", ((2.0, 10.0), (38.0, 10.0))),))
HALF = Sheet(areas=(("GND", shapely.box(0, 0, 20, 20)),))
WHOLE = Sheet(areas=(("GND", shapely.box(0, 0, 40, 20)),))


def test_trace_that_goes_on_over_a_farther_plane_leaves_the_nearer_one() -> None:
    """18 mm of it lie beyond the edge of the near plane, over the far one; nothing is crossed."""
    found, (leaving,) = crossings(board(SIGNAL, HALF, WHOLE))
    assert found == ()
    assert leaving.leaves
    assert leaving.bare_mm == pytest.approx(18.0, abs=1e-3)


def test_trace_without_a_farther_plane_is_bare_instead() -> None:
    """The same trace with nothing beneath its second half has no plane there."""
    _, (bare,) = crossings(board(SIGNAL, HALF))
    assert not bare.leaves
    assert bare.bare_mm == pytest.approx(18.0, abs=1e-3)


def test_leaving_is_judged_as_a_change_of_plane() -> None:
    """Two planes that nothing joins have their capacitance alone; a whole plane gives nothing."""
    split, whole = board(SIGNAL, HALF, WHOLE), board(SIGNAL, WHOLE, WHOLE)
    (found,) = judge(scene(split), *crossings(split)).findings
    assert (found.kind, found.plane_layer) == ("plane-change", "L2")
    assert found.gap_mm == pytest.approx(18.0)
    judged = judge(scene(whole), *crossings(whole))
    assert (judged.findings, judged.counts) == ((), ())


def test_leaving_beside_a_hole_that_joins_the_planes_is_counted() -> None:
    """A hole 1 mm from where the trace leaves: the return changes planes there."""
    made = board(SIGNAL, HALF, WHOLE, holes=[via(19.0, 10.6)])
    judged = judge(scene(made), *crossings(made))
    assert judged.findings == ()
    assert [count.number for count in judged.counts] == [1]
    assert "near enough" in judged.counts[0].what
