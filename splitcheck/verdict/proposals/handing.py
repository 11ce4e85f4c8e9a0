"""Where the return must change planes: a via beside the trace's own, or a capacitor."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import replace
from math import hypot

from splitcheck.loops.bridges import with_capacitor
from splitcheck.verdict.findings import Point, Proposal
from splitcheck.verdict.plane_changes import change_findings
from splitcheck.verdict.proposals.capacitors import mount_words, mounts_near
from splitcheck.verdict.proposals.case import Case, Worth, worth_of_findings
from splitcheck.verdict.proposals.vias import circles, met_by, spots, stitched, words
from splitcheck.verdict.scene import Scene


def return_vias(case: Case) -> Iterator[Proposal]:
    """Propose a via that joins both planes beside the hole, where they are of one net."""
    one, other = (case.island(name) for name in case.finding.islands)
    if one.net_name != other.net_name:
        return
    for start in _starts(case):
        xs, ys = circles(start)
        joined = [
            frozenset(ids) if {one.id, other.id} <= ids else frozenset()
            for ids in met_by(case, one.net_name, xs, ys)
        ]
        for spot in spots(case, one.net_name, xs, ys, joined)[:1]:
            apart = hypot(spot.at[0] - start[0], spot.at[1] - start[1])
            said = words(case, [spot], one.net_name, f"{apart:.2f} mm from the change")
            worth = _worth(case, stitched(case.scene, [spot]))
            found = case.proposal("via", [spot.at], said, worth)
            if found is not None:
                yield found


def return_capacitors(case: Case) -> Iterator[Proposal]:
    """Propose a capacitor between both planes beside the hole, where they are of two nets."""
    one, other = (case.island(name) for name in case.finding.islands)
    if one.net_name == other.net_name:
        return
    for start in _starts(case):
        for mount in mounts_near(case, start, (one, other)):
            graph = with_capacitor(
                case.scene.graph,
                one.id,
                other.id,
                *mount.down,
                mount.value_nh,
                layer=mount.layer,
                ref="a new capacitor",
            )
            worth = _worth(case, replace(case.scene, graph=graph))
            said = mount_words(case, mount, one.net_name, other.net_name)
            found = case.proposal("capacitor", mount.pads, said, worth)
            if found is not None:
                yield found


def _starts(case: Case) -> list[Point]:
    assert case.change is not None
    return list(dict.fromkeys(change.at for change in case.change.changes))


def _worth(case: Case, scene: Scene) -> Worth:
    """What the change costs in a changed scene, as it would be told."""
    assert case.change is not None
    return worth_of_findings(change_findings(scene, [case.change], defaultdict(int)))
