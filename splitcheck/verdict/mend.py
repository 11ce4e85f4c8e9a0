"""Mend: what could be done about findings, each proposal valued by the road itself, best first."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import replace
from math import dist, floor

import numpy as np

from splitcheck.errors import SplitcheckError
from splitcheck.loops.clusters import TOGETHER_MOST_MM
from splitcheck.planes.changes import find_changes
from splitcheck.planes.crossings import Crossing, find_crossings
from splitcheck.planes.tracks import Tracks, redrawn
from splitcheck.verdict.around import LONG_RUN, exempt
from splitcheck.verdict.findings import Finding, Miss, Proposal, Report
from splitcheck.verdict.plane_changes import Case as Change
from splitcheck.verdict.plane_changes import change_findings, from_leaving, from_long_runs
from splitcheck.verdict.proposals.capacitors import capacitors
from splitcheck.verdict.proposals.case import Case
from splitcheck.verdict.proposals.copper import copper, copper_for_all
from splitcheck.verdict.proposals.edges import find_edges, inwards, widened
from splitcheck.verdict.proposals.handing import return_capacitors, return_vias
from splitcheck.verdict.proposals.moves import moves
from splitcheck.verdict.proposals.room import Room
from splitcheck.verdict.proposals.vias import vias
from splitcheck.verdict.scene import Judged, Scene, Weighed

#: No more proposals of one kind are kept for a finding.
MOST_OF_A_KIND = 2


def mend(
    report: Report,
    tracks: Sequence[Tracks],
    scene: Scene,
    judged: Judged,
    ids: Iterable[str],
) -> Report:
    """Fill in what would mend some findings.

    Parameters
    ----------
    report
        The report; it is left as it is.
    tracks, scene, judged
        What lies behind it.
    ids
        Ids of findings.

    Returns
    -------
    The report with proposals, those that leave least first; a finding that nothing here helps
    keeps none, and says of each way why.

    Raises
    ------
    SplitcheckError
        If there is no finding of such an id.

    Notes
    -----
    Nothing is proposed that does not gain, by the same search and solve in the changed board.
    """
    wanted = _known(report, ids)
    room = Room(scene.board, scene.planes)
    findings = tuple(
        mended(finding, tracks, scene, judged, room) if finding.id in wanted else finding
        for finding in report.findings
    )
    return replace(report, findings=findings)


def _known(report: Report, ids: Iterable[str]) -> frozenset[str]:
    wanted = frozenset(ids)
    strangers = sorted(wanted - {finding.id for finding in report.findings})
    if strangers:
        count = len(report.findings)
        known = f"this report has F1 to F{count}" if count else "this report has no findings"
        wrong = "there is no such finding"
        raise SplitcheckError(f"finding {strangers[0]}", wrong, f"{known}; `rank` lists them")
    return wanted


def mended(
    finding: Finding, tracks: Sequence[Tracks], scene: Scene, judged: Judged, room: Room
) -> Finding:
    """One finding with what would mend it, best first, or with why each way fails.

    Both are empty for kinds that nothing here helps.
    """
    case = _case(finding, tracks, scene, judged, room)
    if case is None:
        return finding
    kept: list[Proposal] = []
    misses: list[Miss] = []
    for way in _ways(case):
        found = tuple(way(case))
        proposals = (each for each in found if isinstance(each, Proposal))
        kept.extend(sorted(proposals, key=_best_first)[:MOST_OF_A_KIND])
        misses.extend(each for each in found if isinstance(each, Miss))
    if kept:
        return replace(finding, proposals=tuple(sorted(kept, key=_best_first)))
    kinds = dict.fromkeys(miss.what for miss in misses)
    told = tuple(_told([miss for miss in misses if miss.what == kind]) for kind in kinds)
    return replace(finding, misses=told)


def _told(misses: Sequence[Miss]) -> Miss:
    """All misses of one kind in one: the best that was valued, else what was in the way."""
    shares = [miss.share for miss in misses if miss.share is not None]
    what, best = misses[0].what, max(shares, default=None)
    if best is None:
        return Miss(what, " and ".join(dict.fromkeys(miss.words for miss in misses)))
    # rounded down: what is not proposed must not read as much as what is
    percent = floor(best * 1000) / 10
    if len(shares) == 1:
        few = "the one tried takes away only"
        none = "the one tried takes away less than 0.1 %"
    else:
        few = f"{len(shares)} tried, the best takes away only"
        none = f"{len(shares)} tried, each takes away less than 0.1 %"
    return Miss(what, f"{few} {percent:g} %" if percent > 0 else none, best)


def _ways(case: Case) -> tuple[Callable[[Case], Iterator[Proposal | Miss]], ...]:
    if case.item is not None and case.item.crossing.aside_mm:
        return (copper,)
    if case.item is not None:
        return vias, capacitors, copper, copper_for_all, moves
    if case.edges:
        return inwards, widened
    return (return_vias, return_capacitors) if case.change is not None else (copper,)


def _best_first(proposal: Proposal) -> tuple[float, int, str]:
    """What leaves least; of equals what touches fewer places."""
    return round(proposal.added_nh, 4), len(proposal.at_mm), proposal.words


def _case(
    finding: Finding, tracks: Sequence[Tracks], scene: Scene, judged: Judged, room: Room
) -> Case | None:
    item = judged.weighed.get(finding.id)
    numbers = {layer.name: layer.number for layer in scene.board.stack.layers}
    own = next((t for t in tracks if t.layer == numbers[finding.layer]), None)
    if own is None:
        return None
    nets = {net.number for net in scene.board.nets if net.name == finding.net}
    net = _net_at(own, nets, finding) if item is None else item.crossing.net
    if item is None and finding.kind == "plane-change":
        change = _change(scene, tracks, net, finding)
        return None if change is None else Case(scene, room, finding, net, own, None, change)
    if item is None and finding.kind not in {"no-plane", "edge-run"}:
        return None
    others = {} if item is None else _others(judged, item)
    beside = tuple(run for runs in others.values() for run in runs)
    neighbours = tuple((f, judged.weighed[f.id]) for f in judged.findings if f.id in others)
    alone = redrawn(own, net)
    before = find_crossings(alone, tuple(scene.planes.values()))
    edges = find_edges(scene, alone) if item is None and finding.kind == "edge-run" else ()
    return Case(
        scene, room, finding, net, alone, item, None, beside, neighbours, own, before, edges
    )


def _others(judged: Judged, item: Weighed) -> dict[str, tuple[Crossing, ...]]:
    """By id of the finding, crossings of the same gap from the same layer that are near.

    Those near enough to be solved together with one.
    """
    own = item.crossing
    found = {
        name: tuple(
            run
            for run in other.runs
            if (run.plane, run.gap, run.layer) == (own.plane, own.gap, own.layer)
            and dist(run.at, own.at) <= TOGETHER_MOST_MM
        )
        for name, other in judged.weighed.items()
        if other is not item
    }
    return {name: runs for name, runs in found.items() if runs}


def _change(scene: Scene, tracks: Sequence[Tracks], net: int, finding: Finding) -> Change | None:
    """The change of planes behind a finding: the one that is told in the same words."""
    own = [redrawn(t, net) for t in tracks if (t.net == net).any()]
    planes = tuple(scene.planes.values())
    cases = [Change((change,), 0.0) for change in find_changes(scene.board, planes, own)]
    walked = [find_crossings(t, planes) for t in own]
    runs = [c for found, _ in walked for c in found if exempt(scene, c) == LONG_RUN]
    leaving = [trace for _, bare in walked for trace in bare]
    cases += [*from_leaving(scene, leaving), *from_long_runs(scene, runs)]
    for case in cases:
        for told in change_findings(scene, [case], defaultdict(int)):
            if (told.at_mm, told.reason) == (finding.at_mm, finding.reason):
                return case
    return None


def _net_at(tracks: Tracks, nets: set[int], finding: Finding) -> int:
    """Which of several nets of one name a finding is on."""
    pieces = np.flatnonzero(np.isin(tracks.net, sorted(nets)))
    middles = (tracks.start[pieces] + tracks.end[pieces]) / 2
    far = np.hypot(*(middles - np.asarray(finding.at_mm)).T)
    return int(tracks.net[pieces[int(np.argmin(far))]])
