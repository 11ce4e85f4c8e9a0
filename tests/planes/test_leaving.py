"""Traces that leave their plane for good: counted where they go on over a farther one."""

from __future__ import annotations

import pytest
import shapely

from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene

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


def test_leaving_is_counted_and_is_no_finding() -> None:
    """Changes of plane are told as a number; a whole near plane counts none."""
    split, whole = board(SIGNAL, HALF, WHOLE), board(SIGNAL, WHOLE, WHOLE)
    judged = judge(scene(split), *crossings(split))
    findings, counts = judged.findings, judged.counts
    assert findings == ()
    told = {count.what: count.number for count in counts}
    assert told == {"traces that leave a plane for a farther one (changes of plane)": 1}
    judged = judge(scene(whole), *crossings(whole))
    assert (judged.findings, judged.counts) == ((), ())
