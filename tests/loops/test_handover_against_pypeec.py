"""A slot under a stripline, its planes stitched close by: against PyPEEC, a general field solver.

PyPEEC (package ``pypeec``, 5.8) fills the copper with voxels. The values below were solved with it
by the functions of this file; a smaller case runs live where it is installed (about 20 s).
"""

from __future__ import annotations

import logging
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import pytest
from numpy.typing import NDArray
from shapely import LineString, Point, box

from splitcheck.copper.marks import Point as Place
from splitcheck.loops.handover import over_holes
from splitcheck.loops.solve import TraceOver, ViaBridge, added

#: Width and height of the trace, distance of the planes, thickness of all sheets, mm.
WIDE, HIGH, APART, THICK = 0.4, 0.2, 0.8, 0.05
#: Length of the slot along and across the trace, mm; and where the square posts stand, which are
#: this wide: a round hole 1.18 times as wide is as much in the way of a field.
SLOT, POSTS, POST, ROUND = (
    (2.0, 8.0),
    [(-2.0, -1.0), (-2.0, 1.0), (2.0, -1.0), (2.0, 1.0)],
    0.4,
    1.18,
)


class Case(NamedTuple):
    """Two square planes and a trace between them that ends in a post to both."""

    half_mm: float
    """Half a side of the planes."""
    reach_mm: float
    """Half the length of the trace."""
    voxel_mm: float
    slotted: bool
    posts: Sequence[Place] = ()


def layout(case: Case) -> NDArray[np.int8]:
    """Voxels of copper (1), source (2), sink (3)."""
    across, up, top = (
        round(mm / size)
        for mm, size in ((2 * case.half_mm, case.voxel_mm), (HIGH, THICK), (APART, THICK))
    )
    middle = -case.half_mm + case.voxel_mm * (np.arange(across) + 0.5)
    x, y = np.meshgrid(middle, middle, indexing="ij")
    cells = np.zeros((across, across, top + 1), dtype=np.int8)
    cells[:, :, [0, top]] = 1
    if case.slotted:
        cells[(abs(x) < SLOT[0] / 2) & (abs(y) < SLOT[1] / 2), 0] = 0
    trace = (abs(x) < case.reach_mm) & (abs(y) < WIDE / 2)
    cells[trace, up] = 1
    cells[trace & (x > case.reach_mm - WIDE), :] = 1
    port = trace & (x < -case.reach_mm + case.voxel_mm)
    cells[port, up], cells[port, 0], cells[port, top] = 2, 3, 3
    for at in case.posts:
        cells[(abs(x - at[0]) < POST / 2) & (abs(y - at[1]) < POST / 2), :] = 1
    return cells


def loop_nh(case: Case) -> float:
    """Loop inductance from the magnetic energy: its mean over time is L |I|^2 / 4."""
    from pypeec.run import mesher, solver  # noqa: PLC0415 (only where it is installed)

    from tests.loops import test_solve_against_pypeec as driven  # noqa: PLC0415

    cells = layout(case)
    logging.disable(logging.CRITICAL)
    try:
        mesh = mesher.run(driven.geometry(cells, case.voxel_mm))
        problem = driven.problem(int((cells == 2).sum()))
        found = solver.run(mesh, problem, driven.tolerances())
    finally:
        logging.disable(logging.NOTSET)
    answer = found["data_sweep"]["fast"]
    assert answer["solver_ok"]
    current = abs(answer["source_values"]["in"]["I"])
    return float(4e9 * answer["integral_total"]["W_total"] / current**2)


def solved_nh(half_mm: float, reach_mm: float, posts: Sequence[Place]) -> float:
    """The same case by splitcheck: the ends of the trace join the planes as well."""
    ends = (-reach_mm + 0.1, reach_mm - WIDE / 2)
    trace = TraceOver(LineString([(x, 0) for x in ends]), WIDE)
    vias = [ViaBridge(Point(at), POST * ROUND, above=True) for at in posts]
    vias += [ViaBridge(Point(x, 0), POST * ROUND, above=True) for x in ends]
    slot = box(-SLOT[0] / 2, -SLOT[1] / 2, SLOT[0] / 2, SLOT[1] / 2)
    board = box(-half_mm, -half_mm, half_mm, half_mm)
    value = added([slot], [trace], HIGH, above_mm=APART, bridges=vias, outside=board).of(0)
    assert value is not None
    return value


#: What the slot adds between planes of 16 by 16 mm, to a trace of 12 mm, nH: PyPEEC with voxels of
#: 0.2 and 0.1 mm, whose error goes with the voxel. Without a slot it has 3.037 and 2.926 nH, and
#: the posts change that by 0.0003 nH only, as they should.
SEEN = [([], 1.0291, 1.0081), (POSTS, 0.7822, 0.7577)]


@pytest.mark.parametrize(("posts", "coarse_nh", "fine_nh"), SEEN, ids=["bare", "stitched"])
def test_a_slot_adds_what_pypeec_said(
    posts: Sequence[Place], coarse_nh: float, fine_nh: float
) -> None:
    """Within 5 % of the limit of both sizes."""
    assert solved_nh(8.0, 6.0, posts) == pytest.approx(2 * fine_nh - coarse_nh, rel=0.05)


def test_the_closed_form_is_a_bound_within_its_error() -> None:
    """It knows the way over the posts alone: more than both together, and not by much."""
    ends = [
        ((side, 0.0), [(at, POST * ROUND) for at in POSTS if at[0] * side > 0])
        for side in (-1.0, 1.0)
    ]
    value = over_holes(ends, SLOT[0], HIGH, WIDE, APART)
    _, coarse_nh, fine_nh = SEEN[1]
    assert 0 < value.added_nh - (2 * fine_nh - coarse_nh) < value.error_nh


@pytest.mark.slow
@pytest.mark.filterwarnings("ignore")
def test_posts_take_off_what_pypeec_says() -> None:
    """Live, smaller and with coarse voxels: the ratio is hardly touched by them, within 4 %."""
    pytest.importorskip(
        "pypeec.run.solver",
        exc_type=ImportError,
        reason="pypeec is not installed: nothing to compare with live",
    )
    half, reach = 6.0, 4.6
    whole, bare, stitched = (
        loop_nh(Case(half, reach, 0.2, slotted, posts))
        for slotted, posts in ((False, []), (True, []), (True, POSTS))
    )
    ratio = solved_nh(half, reach, POSTS) / solved_nh(half, reach, [])
    assert (stitched - whole) / (bare - whole) == pytest.approx(ratio, rel=0.04)
    assert ratio < 0.9
