"""What is said of capacitors between planes: how many, from what, and whether they are near."""

from __future__ import annotations

from dataclasses import replace

import pytest
import shapely

from splitcheck.board.board import Board
from splitcheck.loops.bridges import all_parts, with_capacitor
from splitcheck.planes.islands import find_planes
from splitcheck.verdict.coupling import coupling_facts, coupling_unknown
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.reason import MM_PER_NS
from tests.making.hand import Line, Sheet, board, crossings, islands_joined, mounted, scene

LEFT, RIGHT = shapely.box(0, 0, 59.8, 120), shapely.box(60.2, 0, 120, 120)


def _board(*refs: tuple[str, str | None]) -> Board:
    """Two islands on the bottom, a trace over the split, and parts from one to the other."""
    made = board(
        Sheet((), (Line("SIG", ((20, 60), (100, 60)), 0.3),)), Sheet((("A", LEFT), ("B", RIGHT)))
    )
    parts = [
        (ref, 2, (59.5 - i, 70.0 + i), (60.5 + i, 70.0 + i), value)
        for i, (ref, value) in enumerate(refs)
    ]
    return mounted(made, *parts)


def _facts(made: Board) -> tuple[str, ...]:
    return coupling_facts(made, tuple(all_parts(islands_joined(made))))


def test_capacitors_are_counted_with_their_source_and_inductance() -> None:
    """The span is that of the least each adds."""
    made = _board(("C1", None), ("C2", None), ("R1", "0R"), ("R2", "10k"))
    parts = {part.ref: part.mounted_nh for part in all_parts(islands_joined(made))}
    assert sorted(parts) == ["C1", "C2", "R1"]
    low, high = sorted((parts["C1"], parts["C2"]))
    (sentence,) = _facts(made)
    assert sentence == (
        f"2 capacitors between planes, {low:.1f} to {high:.1f} nH as mounted; "
        f"1 link of 0 ohm between planes, {parts['R1']:.1f} nH as mounted; "
        "parts from X2 attributes of pads"
    )


def test_none_between_planes_is_said_too() -> None:
    """So that nobody takes silence for not having looked."""
    assert _facts(_board(("R2", "10k"))) == (
        "No capacitor between planes among 1 parts, from X2 attributes of pads",
    )


def test_unknown_components_are_an_assumption_where_planes_are_of_several_nets() -> None:
    """With one net alone no capacitor between planes can be missed."""
    made = _board()
    assert _facts(made) == ()
    (sentence,) = coupling_unknown(made, find_planes(made))
    assert "capacitors between planes are unknown" in sentence
    known = _board(("C1", None))
    assert coupling_unknown(known, find_planes(known)) == ()
    plain = board(Sheet((("GND", LEFT), ("GND", RIGHT))))
    alone = replace(plain, nets=plain.nets[:1], net_of=(0, 0))
    assert coupling_unknown(alone, find_planes(alone)) == ()


def _finding(off_mm: float) -> Finding:
    made = _board()
    seen = scene(made)
    graph = with_capacitor(
        seen.graph, "L2.1", "L2.2", (59.5, 60 + off_mm), (60.5, 60 + off_mm), 1.5, layer=2, ref="C7"
    )
    (finding,) = judge(replace(seen, graph=graph), *crossings(made)).findings
    return finding


@pytest.mark.parametrize(("share", "said"), [(0.9, False), (1.1, True)])
def test_a_capacitor_too_far_for_the_rise_time_is_kept_and_said(
    share: float, *, said: bool
) -> None:
    """25 mm per ns (S. Weir, si-list, 16 Oct 2008), for the rise time of the net itself."""
    rise_ns = _finding(1.0).rise_ns
    finding = _finding(share * MM_PER_NS * rise_ns)
    assert [bridge.kind for bridge in finding.bridges] == ["capacitor"]
    assert finding.added_nh is not None
    assert ("too far to help in time" in finding.reason) is said


def test_farther_off_adds_more() -> None:
    """About 0.5 to 0.7 nH a mm on one side, as for any bridge of a gap open on the other."""
    near, far = _finding(2.0), _finding(8.0)
    assert near.added_nh is not None
    assert far.added_nh is not None
    assert 0.3 * 6 < far.added_nh - near.added_nh < 1.0 * 6
