"""From crossings and bare traces to findings: what counts, what it costs, and why, in words."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from functools import partial
from typing import Any, TypeAlias

from splitcheck.loops.clusters import cluster
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.fields import Field, Fields
from splitcheck.loops.tasks import Task, can_solve
from splitcheck.planes.changes import PlaneChange
from splitcheck.planes.crossings import BareTrace, Crossing
from splitcheck.planes.edges import EdgeRun
from splitcheck.verdict.around import LONG_RUN, share_of
from splitcheck.verdict.bare import bare_findings
from splitcheck.verdict.beside import (
    once_a_place,
    too_small,
)
from splitcheck.verdict.by_class import listed, with_crosstalk
from splitcheck.verdict.crossed import crossing_finding, noise_of
from splitcheck.verdict.edge_runs import common_of, edge_findings, with_common
from splitcheck.verdict.findings import (
    Count,
    Finding,
)
from splitcheck.verdict.listing import worth_a_line
from splitcheck.verdict.once import once_a_gap
from splitcheck.verdict.pairs import with_pairs
from splitcheck.verdict.places import by_place, with_ids, with_shares
from splitcheck.verdict.plane_changes import (
    Case,
    change_findings,
    from_leaving,
    from_long_runs,
)
from splitcheck.verdict.scene import Judged, Scene, Weighed
from splitcheck.verdict.supplies import with_rule
from splitcheck.verdict.weighing import look_at, weigh

#: Calls a function on every item and gives the results in order, as ``map`` does.
Spread: TypeAlias = Callable[[Callable[[Any], Any], Iterable[Any]], Iterable[Any]]


def judge(
    scene: Scene,
    crossings: Sequence[Crossing],
    bare: Sequence[BareTrace],
    spread: Spread = map,
    *,
    changes: Sequence[PlaneChange] = (),
    edges: Sequence[EdgeRun] = (),
    by_rules: Sequence[Finding] = (),
) -> Judged:
    """Turn crossings and bare traces into findings, worst first.

    Parameters
    ----------
    scene
        The board and its planes.
    crossings, bare
        What the traces run over.
    spread
        How to call a function on many items: in turn, or on several cores.
    changes
        Plated holes where the return changes planes.
    edges
        Traces along the edges of planes.
    by_rules
        Findings that the rules alone make: see ``supplies.py``.

    Returns
    -------
    Findings with their ids, counts of what was seen and is not a finding, and what lies behind.
    """
    dropped: dict[str, int] = defaultdict(int)
    weighed: list[Weighed] = []
    long_runs: list[Crossing] = []
    for crossing, result in zip(crossings, spread(partial(weigh, scene), crossings), strict=True):
        if result == LONG_RUN:
            long_runs.append(crossing)
        elif isinstance(result, str):
            dropped[result] += 1
        else:
            weighed.append(result)
    weighed = once_a_place(scene, once_a_gap(scene, weighed))
    solved = _solve_all(scene, weighed, spread)
    findings: list[Finding] = []
    for number, item in enumerate(weighed):
        finding = crossing_finding(scene, item, solved.get(number), weighed)
        if finding is None:
            dropped[too_small(scene, item.crossing)] += 1
        else:
            findings.append(_with_common(scene, item, replace(finding, id=str(number))))
    findings.extend(bare_findings(scene, bare, dropped))
    crossed = [item.crossing for item in weighed]
    findings.extend(edge_findings(scene, edges, crossed, dropped))
    cases = [Case((change,), 0.0) for change in changes]
    cases += [*from_leaving(scene, bare), *from_long_runs(scene, long_runs)]
    findings.extend(change_findings(scene, cases, dropped))
    findings = with_pairs(scene, by_place(findings))
    findings = with_rule(scene, worth_a_line(scene, findings, dropped))
    findings = listed(scene, [*findings, *by_rules], dropped)
    counts = tuple(Count(what, number) for what, number in sorted(dropped.items()))
    numbered, renamed = with_ids(with_crosstalk(scene, with_shares(findings)))
    behind = {new: weighed[int(old)] for old, new in renamed.items()}
    return Judged(numbered, counts, behind)


def _solve_all(
    scene: Scene, weighed: Sequence[Weighed], spread: Spread, only: int | None = None
) -> dict[int, Field]:
    """Solve for every crossing that has a way back, or `only` one, those over one gap together."""
    tasks = [
        Task(
            number,
            item.crossing,
            item.route,
            tuple(crossing.path for crossing in item.runs),
            scene.board.stack.height_mm(item.crossing.layer, item.crossing.plane),
            item.beyond,
            item.other,
            item.share / share_of(scene, item.crossing, item.other),
            item.stitches,
        )
        for number, item in enumerate(weighed)
    ]
    solved: dict[int, Field] = {}
    fields = Fields(scene.board, scene.planes, scene.graph)
    clusters = cluster([task for task in tasks if can_solve(task)])
    wanted = [c for c in clusters if only is None or any(task.number == only for task in c)]
    for result in spread(fields.solve, wanted):
        solved.update(result)
    return solved


def value_again(
    scene: Scene,
    crossings: Sequence[Crossing],
    with_them: Sequence[Crossing] = (),
    *,
    all_of_them: bool = False,
) -> tuple[tuple[Inductance, float] | None, ...]:
    """Value crossings in a scene that was changed, as ``judge`` would.

    Parameters
    ----------
    scene
        The scene with another plane, or one more via or capacitor.
    crossings
        What the traces run over there.
    with_them
        Crossings of other traces, to be solved together with those that are near.
    all_of_them
        Also those that are no finding, and right beside a gap; by the solve alone.

    Returns
    -------
    What each adds and the noise in mV; None where there is no way back. Those that would be no
    finding are left out.
    """
    weighed = [look_at(scene, one) if all_of_them else weigh(scene, one) for one in crossings]
    beside = [item for one in with_them if not isinstance(item := weigh(scene, one), str)]
    others = once_a_gap(scene, beside)
    values: list[tuple[Inductance, float] | None] = []
    for item in once_a_gap(scene, [item for item in weighed if not isinstance(item, str)]):
        field = _solve_all(scene, [item, *others], map, only=0).get(0)
        value = item.estimate if field is None else field.value
        if all_of_them and field is None:
            continue
        if value is None:
            values.append(None)
        elif all_of_them or value.added_nh >= scene.min_nh:
            values.append((value, noise_of(scene, item, value).mv))
    return tuple(values)


def value_together(
    scene: Scene, crossings: Sequence[Crossing]
) -> tuple[tuple[Crossing, Inductance | None, float | None], ...]:
    """Value the crossings of several traces in a changed scene, those over one gap in one solve.

    Returns
    -------
    For each stretch of trace over a gap the crossing that stands for it, what it adds and its noise
    in mV, both None where there is no way back. Those that would be no finding are left out.
    """
    weighed = [item for one in crossings if not isinstance(item := weigh(scene, one), str)]
    items = once_a_gap(scene, weighed)
    solved = _solve_all(scene, items, map)
    values: list[tuple[Crossing, Inductance | None, float | None]] = []
    for number, item in enumerate(items):
        value = solved[number].value if number in solved else item.estimate
        if value is None:
            values.append((item.crossing, None, None))
        elif value.added_nh >= scene.min_nh:
            values.append((item.crossing, value, noise_of(scene, item, value).mv))
    return tuple(values)


def _with_common(scene: Scene, item: Weighed, finding: Finding) -> Finding:
    """A run beyond the edge of a plane with what it shares with the plane."""
    common = common_of(scene, item.crossing) if item.kind == "edge-run" else None
    if common is None:
        return finding
    why = f"{finding.reason}; it hangs beyond the edge: {with_common(common)}"
    return replace(finding, common_nh=common, reason=why)
