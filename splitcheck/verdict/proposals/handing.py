"""Where the return must change planes: a via beside the trace's own, or a capacitor."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from functools import partial
from math import hypot
from typing import TypeVar

from splitcheck.verdict.findings import Miss, Point, Proposal
from splitcheck.verdict.plane_changes import change_findings
from splitcheck.verdict.proposals.capacitors import Mount, mount_words, mounts_near, with_mounts
from splitcheck.verdict.proposals.case import LEAST_MORE, Case, Worth, worth_of_findings
from splitcheck.verdict.proposals.vias import (
    CIRCLES_MM,
    Spot,
    circles,
    met_by,
    spots,
    stitched,
    words,
)
from splitcheck.verdict.scene import Scene

T = TypeVar("T")


def return_vias(case: Case) -> Iterator[Proposal | Miss]:
    """Propose a via that joins both planes beside the hole, where they are of one net."""
    one, other = (case.island(name) for name in case.finding.islands)
    if one.net_name != other.net_name:
        yield Miss("via", f"the planes are of two nets, {one.net_name} and {other.net_name}")
        return
    for start in _starts(case):
        xs, ys = circles(start)
        joined = [
            frozenset(ids) if {one.id, other.id} <= ids else frozenset()
            for ids in met_by(case, one.net_name, xs, ys)
        ]
        free = spots(case, one.net_name, xs, ys, joined)
        if not free:
            within = f"within {CIRCLES_MM[-1]:g} mm of the change"
            why = "no room where" if any(joined) else "nowhere do"
            yield Miss("via", f"{why} both planes lie over one another {within}")
        yield from _fewest(case, free, partial(_vias, case, start))


def _vias(case: Case, start: Point, places: Sequence[Spot]) -> tuple[Worth, Proposal | Miss]:
    """Vias in some places: what they leave, and the proposal if they gain."""
    far = [f"{hypot(s.at[0] - start[0], s.at[1] - start[1]):.2f} mm" for s in places]
    said = words(case, places, places[0].net, f"{' and '.join(far)} from the change")
    worth = _worth(case, stitched(case.scene, places))
    return worth, case.proposal("via", [spot.at for spot in places], said, worth)


def return_capacitors(case: Case) -> Iterator[Proposal | Miss]:
    """Propose a capacitor between both planes beside the hole, where they are of two nets."""
    one, other = (case.island(name) for name in case.finding.islands)
    if one.net_name == other.net_name:
        yield Miss("capacitor", f"both planes are one net, {one.net_name}")
        return
    for start in _starts(case):
        free = list(mounts_near(case, start, (one, other)))
        if not free:
            within = f"within {CIRCLES_MM[-1]:g} mm of the change"
            yield Miss("capacitor", f"no room for its pads and vias {within}")
        yield from _fewest(case, free, partial(_capacitors, case))


def _capacitors(case: Case, mounts: Sequence[Mount]) -> tuple[Worth, Proposal | Miss]:
    """Capacitors in some places: what they leave, and the proposal if they gain."""
    one, other = (case.island(name) for name in case.finding.islands)
    graph = with_mounts(case.scene.graph, one, other, mounts)
    worth = _worth(case, replace(case.scene, graph=graph))
    said = mount_words(case, mounts, one.net_name, other.net_name)
    places = [pad for mount in mounts for pad in mount.pads]
    return worth, case.proposal("capacitor", places, said, worth)


def _fewest(
    case: Case, free: Sequence[T], valued: Callable[[Sequence[T]], tuple[Worth, Proposal | Miss]]
) -> Iterator[Proposal | Miss]:
    """One in each of some places, and one in two of them if one leaves more than a note."""
    tried = [valued([place]) for place in free]
    best = min((worth.added_nh for worth, _ in tried), default=0.0)
    if len(free) > 1 and not any(case.is_enough(worth) for worth, _ in tried):
        worth, proposal = valued(free[:2])
        if worth.added_nh <= (1.0 - LEAST_MORE) * best:
            tried.append((worth, proposal))
    yield from (told for _, told in tried)


def _starts(case: Case) -> list[Point]:
    assert case.change is not None
    return list(dict.fromkeys(change.at for change in case.change.changes))


def _worth(case: Case, scene: Scene) -> Worth:
    """What the change costs in a changed scene, as it would be told."""
    assert case.change is not None
    return worth_of_findings(change_findings(scene, [case.change], defaultdict(int)))
