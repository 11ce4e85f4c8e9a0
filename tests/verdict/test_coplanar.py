"""Copper beside a trace, in its own layer, carries the return past a gap; or does not."""

from __future__ import annotations

from math import log

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.units import MU0
from splitcheck.verdict.around import COPLANAR
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.scene import Judged
from tests.making.hand import Line, Sheet, board, crossings, scene, via

#: A board of two layers 1.5 mm apart, its ground at the bottom cut from edge to edge under y = 20.
HEIGHT_MM = 1.5
OUTLINE = shapely.box(0, 0, 60, 40)
FAR = shapely.box(1, 1, 59, 3)
#: Ground comes together far off; what lies beside the trace is joined to it 9 mm away.
FAR_HOLES = [via(x, y) for x in (2, 28, 32, 58) for y in (2, 29)]
LEFT, RIGHT = shapely.box(0, 0, 29.5, 40), shapely.box(30.5, 0, 60, 40)


def _made(*pours: shapely.Polygon) -> Board:
    """A trace along y = 20 over the cut, and copper in its own layer."""
    return board(
        Sheet(tuple(("GND", pour) for pour in pours), (Line("CLK", ((5, 20), (55, 20))),)),
        Sheet((("GND", LEFT), ("GND", RIGHT))),
        holes=FAR_HOLES,
        heights_mm=[HEIGHT_MM],
        outline=OUTLINE,
    )


def _judged(made: Board) -> Judged:
    return judge(scene(made), *crossings(made))


def _splits(judged: Judged) -> list[Finding]:
    return [finding for finding in judged.findings if finding.kind == "split-crossing"]


def _counted(judged: Judged) -> int:
    return sum(count.number for count in judged.counts if count.what == COPLANAR)


def _beside(rim_mm: float, start: float = 1.0, stop: float = 59.0) -> shapely.Polygon:
    """Ground above the trace whose rim is so far from its centre line."""
    return shapely.box(start, 20 + rim_mm, stop, 30)


def test_ground_close_beside_the_trace_is_no_finding_and_is_counted() -> None:
    """Its rim is 0.3 mm from the centre line, which is 1.5 mm high."""
    judged = _judged(_made(FAR, _beside(0.3)))
    assert not _splits(judged)
    assert _counted(judged) == 1


@pytest.mark.parametrize(
    ("pours", "why"),
    [
        ((), "there is none"),
        ((_beside(0.9),), "it is farther than half the height of 1.5 mm"),
        ((_beside(0.3, stop=29.0), _beside(0.3, start=31.0)), "it is cut where the plane is"),
        ((_beside(0.3, start=27.0, stop=33.0),), "it neither goes on nor is joined to the plane"),
    ],
)
def test_twins_that_are_found(pours: tuple[shapely.Polygon, ...], why: str) -> None:
    """The same board where the copper beside the trace is of no use, or missing."""
    judged = _judged(_made(FAR, *pours))
    assert len(_splits(judged)) == 1, why
    assert _counted(judged) == 0


def test_copper_of_another_net_carries_nothing_past() -> None:
    """A supply beside the trace over a cut in ground: no hole joins the two."""
    made = board(
        Sheet((("GND", FAR), ("+5V", _beside(0.3))), (Line("CLK", ((5, 20), (55, 20))),)),
        Sheet((("GND", LEFT), ("GND", RIGHT))),
        holes=[via(2, 2), via(58, 2)],
        heights_mm=[HEIGHT_MM],
        outline=OUTLINE,
    )
    judged = _judged(made)
    assert _counted(judged) == 0
    assert len(_splits(judged)) == 1


def test_short_copper_counts_where_holes_join_it_to_the_plane_at_both_ends() -> None:
    """From x = 27 to 33, with plated holes 2 mm from either rim of the cut."""
    made = _made(FAR, _beside(0.3, start=27.0, stop=33.0))
    stitched = board(
        Sheet(
            (("GND", FAR), ("GND", _beside(0.3, start=27.0, stop=33.0))),
            (Line("CLK", ((5, 20), (55, 20))),),
        ),
        Sheet((("GND", LEFT), ("GND", RIGHT))),
        holes=[*FAR_HOLES, via(27.5, 21), via(32.5, 21)],
        heights_mm=[HEIGHT_MM],
        outline=OUTLINE,
    )
    assert len(_splits(_judged(made))) == 1
    judged = _judged(stitched)
    assert not _splits(judged)
    assert _counted(judged) == 1


def test_an_interruption_shorter_than_the_height_counts_for_nothing() -> None:
    """A notch of 1 mm at the trace, closed 2 mm away from it; one of 3 mm is told."""
    for long_mm, found in ((1.0, 0), (3.0, 1)):
        notch = shapely.box(30 - long_mm / 2, 19, 30 + long_mm / 2, 22)
        pour = _beside(0.3).difference(notch)
        assert isinstance(pour, shapely.Polygon)
        judged = _judged(_made(FAR, pour))
        assert len(_splits(judged)) == found


def test_turned_boards_are_judged_alike() -> None:
    """The same on the right-hand side of the trace, drawn from either end."""
    for points in (((5, 20), (55, 20)), ((55, 20), (5, 20))):
        for pour in (_beside(0.3), shapely.box(1, 10, 59, 19.7)):
            made = board(
                Sheet((("GND", FAR), ("GND", pour)), (Line("CLK", points),)),
                Sheet((("GND", LEFT), ("GND", RIGHT))),
                holes=[*FAR_HOLES, *(via(x, 11) for x in (2, 58))],
                heights_mm=[HEIGHT_MM],
                outline=OUTLINE,
            )
            assert _counted(_judged(made)) == 1


def test_half_the_height_is_where_both_loops_are_equal() -> None:
    """Wire beside the rim of a half plane, e away: image theory's (mu0 / 2 pi) ln(4 e / a).

    From the exact map w = sqrt(z) with height 0: rho = e, rho - s = 2 e, so that
    4 sqrt(rho (rho - s) / 2) = 4 e. Over a plane, h away: ln(2 h / a).
    """
    height, radius = HEIGHT_MM, 0.05
    beside = MU0 / (2 * 3.141592653589793) * log(4 * (height / 2) / radius)
    over = MU0 / (2 * 3.141592653589793) * log(2 * height / radius)
    assert beside == pytest.approx(over)


def test_thin_boards_ask_for_nearer_copper() -> None:
    """0.3 mm is beyond half of 0.2 mm."""
    thin = board(
        Sheet((("GND", FAR), ("GND", _beside(0.3))), (Line("CLK", ((5, 20), (55, 20))),)),
        Sheet((("GND", LEFT), ("GND", RIGHT))),
        holes=[*FAR_HOLES, *(via(x, 11) for x in (2, 58))],
        heights_mm=[0.2],
        outline=OUTLINE,
    )
    assert _counted(_judged(thin)) == 0
    assert len(_splits(_judged(thin))) == 1
