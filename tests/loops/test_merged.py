"""Merged panels: what they hold together, and that merging never adds to the solve."""

from __future__ import annotations

import numpy as np
import pytest
from shapely import LineString, box

from splitcheck.loops.grading import Grading
from splitcheck.loops.matrix import interaction
from splitcheck.loops.merged import merged, on_merged
from splitcheck.loops.panels import cut

TRACE = LineString([(-9, 0), (9, 0)])
GAPS = [box(-0.2, -4, 0.2, 4), box(1.0, -1, 1.6, 3), box(-2.0, 2, -1.9, 2.1)]


def test_up_to_four_panels_of_one_gap_become_one() -> None:
    """None is left out, and gaps are not joined."""
    panels = cut(GAPS, Grading((TRACE,), near_mm=0.1))
    group = merged(panels)
    count = np.bincount(group)
    assert count.min() >= 1
    assert count.max() <= 4
    assert len(count) < 0.5 * len(panels)
    for number in range(len(count)):
        assert len(set(panels.gap[group == number].tolist())) == 1


@pytest.mark.parametrize("plates", [(), (0.3,)])
def test_merging_takes_from_the_energy_and_never_adds(plates: tuple[float, ...]) -> None:
    """The solve is a largest value over all densities; merged panels have fewer of them."""
    panels = cut(GAPS, Grading((TRACE,), near_mm=0.1))
    matrix = interaction(panels, plates)
    sources = np.stack([np.sign(panels.centre[:, 1]), panels.centre[:, 0]], axis=1)
    rough, means, gap = on_merged(panels, merged(panels), matrix, sources)
    fine = np.einsum("ns,ns->s", sources, np.linalg.solve(matrix, sources))
    less = np.einsum("ns,ns->s", means, np.linalg.solve(rough, means))
    assert len(gap) == len(rough)
    assert (less < fine).all()
    assert (less > 0.7 * fine).all()


def test_one_panel_each_stays_as_it_is() -> None:
    """Merging panels that are alone in their gaps changes nothing."""
    panels = cut(GAPS, Grading((TRACE,), near_mm=0.1))
    alone = np.arange(len(panels))
    matrix = interaction(panels, ())
    same, means, gap = on_merged(panels, alone, matrix, panels.centre)
    assert np.allclose(same, matrix)
    assert np.allclose(means, panels.centre)
    assert (gap == panels.gap).all()
