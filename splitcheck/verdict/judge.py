"""From crossings and bare traces to findings: what counts, what it costs, and why, in words."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from functools import partial
from typing import Any, TypeAlias

from splitcheck.loops.clusters import cluster
from splitcheck.loops.corner import detour_corner_khz
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.fields import Field, Fields
from splitcheck.loops.tasks import Task, can_solve
from splitcheck.loops.ways import Way
from splitcheck.planes.changes import PlaneChange
from splitcheck.planes.crossings import BareTrace, Crossing
from splitcheck.planes.edges import EdgeRun
from splitcheck.verdict.around import LONG_RUN, share_of
from splitcheck.verdict.bare import bare_findings
from splitcheck.verdict.beside import (
    least_nh,
    once_a_place,
    too_small,
)
from splitcheck.verdict.by_class import listed, with_crosstalk
from splitcheck.verdict.edge_runs import common_of, edge_findings, with_common
from splitcheck.verdict.findings import (
    BridgeUse,
    Count,
    Finding,
    GapShare,
    Source,
)
from splitcheck.verdict.listing import worth_a_line
from splitcheck.verdict.once import once_a_gap
from splitcheck.verdict.pairs import with_pairs
from splitcheck.verdict.places import by_place, fingerprint, with_ids, with_shares
from splitcheck.verdict.plane_changes import (
    Case,
    change_findings,
    from_leaving,
    from_long_runs,
)
from splitcheck.verdict.reason import reason
from splitcheck.verdict.scene import Judged, Scene, Weighed
from splitcheck.verdict.score import Noise, level, noise_over_gap, slot_ns_mm
from splitcheck.verdict.supplies import with_rule
from splitcheck.verdict.weighing import look_at, reach_mm, weigh

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
        finding = _crossing_finding(scene, item, solved.get(number), weighed)
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
            values.append((value, _noise(scene, item, value).mv))
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
            values.append((item.crossing, value, _noise(scene, item, value).mv))
    return tuple(values)


def _noise(scene: Scene, item: Weighed, value: Inductance) -> Noise:
    drive = scene.drive_of(item.crossing.net)
    return noise_over_gap(value.added_nh, drive, _along_ns(scene, item))


def _crossing_finding(
    scene: Scene, item: Weighed, field: Field | None, weighed: Sequence[Weighed]
) -> Finding | None:
    """The finding of a crossing; None if it adds too little."""
    value = item.estimate if field is None else field.value
    if value is not None and value.added_nh < least_nh(scene, item.crossing):
        return None
    drive = scene.drive_of(item.crossing.net)
    noise = None
    if value is not None:
        noise = noise_over_gap(value.added_nh, drive, _along_ns(scene, item))
    return _finding(scene, item, value, noise, field, weighed)


def _with_common(scene: Scene, item: Weighed, finding: Finding) -> Finding:
    """A run beyond the edge of a plane with what it shares with the plane."""
    common = common_of(scene, item.crossing) if item.kind == "edge-run" else None
    if common is None:
        return finding
    why = f"{finding.reason}; it hangs beyond the edge: {with_common(common)}"
    return replace(finding, common_nh=common, reason=why)


def _along_ns(scene: Scene, item: Weighed) -> float:
    """How long a wave runs along the gap to where the return gets round, on the longer side, ns."""
    crossing, route = item.crossing, item.route
    ways = [way for way in (route.left, route.right) if way is not None]
    layers = scene.board.stack.layers
    below = layers[crossing.plane - 1].er_below if crossing.plane < len(layers) else 1.0
    above = layers[crossing.plane - 2].er_below if crossing.plane > 1 else 1.0
    along_mm = max((reach_mm(crossing, route, way) for way in ways), default=0.0)
    return along_mm * slot_ns_mm(above, below)


def _finding(
    scene: Scene,
    item: Weighed,
    value: Inductance | None,
    noise: Noise | None,
    field: Field | None,
    weighed: Sequence[Weighed],
) -> Finding:
    crossing, route = item.crossing, item.route
    drive = scene.drive_of(crossing.net)
    plane = scene.planes[crossing.plane]
    layers = scene.board.stack.layers
    islands = [plane.islands[i] for i in crossing.islands]
    net = scene.board.nets[crossing.net].name
    at = (round(crossing.at[0], 4), round(crossing.at[1], 4))
    apart = _disagreement(item.estimate, field)
    mv, capped = (None, False) if noise is None else noise
    return Finding(
        id="",
        kind=item.kind,
        level=level(mv, drive, None if value is None else value.added_nh),
        net=net,
        net_class=drive.name,
        layer=layers[crossing.layer - 1].name,
        plane_layer=layers[crossing.plane - 1].name,
        plane_net=" to ".join(dict.fromkeys(island.net_name for island in islands)),
        at_mm=at,
        gap_mm=item.bare_mm,
        detour_mm=route.detour_mm if route.joined else None,
        added_nh=None if value is None else value.added_nh,
        error_nh=None if value is None else value.error_nh,
        method="solved" if field is not None else "none" if value is None else "estimated",
        noise_mv=mv,
        rise_ns=drive.rise_ns,
        corner_khz=_corner_khz(scene, item, field),
        stray_db=None if field is None else field.stray_db,
        islands=(islands[0].id, islands[1].id),
        bridges=_bridges(scene, route.best),
        gap=plane.gaps[crossing.gap].id,
        shares_gap_with=_mutual(scene, crossing.net, field, weighed),
        pair=None,
        source=Source(scene.board.layers[crossing.layer - 1].file, crossing.line),
        waived=None,
        fingerprint=fingerprint(item.kind, net, layers[crossing.layer - 1].name, at),
        reason=reason(scene, item, _handed_over(item, field)),
        estimated_nh=None if apart is None else apart.added_nh,
        estimated_error_nh=None if apart is None else apart.error_nh,
        capped=capped,
    )


def _corner_khz(scene: Scene, item: Weighed, field: Field | None) -> float | None:
    """From where on the return follows inductance; None if nothing was solved."""
    detour_mm = item.route.detour_mm
    if field is None or detour_mm is None or item.crossing.aside_mm:
        return None
    stack, crossing = scene.board.stack, item.crossing
    layer = item.other if item.beside is None else item.beside
    return detour_corner_khz(
        detour_mm,
        field.value.added_nh,
        height_mm=stack.height_mm(crossing.layer, crossing.plane),
        copper_um=stack.layers[crossing.plane - 1].copper_um,
        above_mm=None if layer is None else stack.height_mm(crossing.plane, layer),
    )


def _handed_over(item: Weighed, field: Field | None) -> float:
    """Part of the return on the broken plane that gets past the gap on the other plane."""
    if field is None:
        return 1.0 if item.by_holes else 0.0
    return min(field.handed_over / item.share, 1.0)


def _disagreement(first: Inductance | None, field: Field | None) -> Inductance | None:
    """The closed-form value, to be kept beside a solved one that it does not agree with."""
    if first is None or field is None:
        return None
    agree = abs(first.added_nh - field.value.added_nh) <= first.error_nh + field.value.error_nh
    return None if agree else first


def _mutual(
    scene: Scene, own: int, field: Field | None, weighed: Sequence[Weighed]
) -> tuple[GapShare, ...]:
    """The largest mutual inductance with every other net that shares the gap."""
    best: dict[str, float] = {}
    for number, mutual in field.mutual_nh if field is not None else ():
        net = weighed[number].crossing.net
        name = scene.board.nets[net].name
        if net != own and abs(mutual) > abs(best.get(name, 0.0)):
            best[name] = mutual
    return tuple(GapShare(name, mutual) for name, mutual in sorted(best.items()))


def _bridges(scene: Scene, way: Way | None) -> tuple[BridgeUse, ...]:
    if way is None:
        return ()
    holes = (BridgeUse("via", (round(x, 4), round(y, 4)), way.bridge_net) for x, y in way.bridges)
    parts = (
        BridgeUse(
            part.kind,
            (round(part.at[0], 4), round(part.at[1], 4)),
            " to ".join(
                scene.graph.nodes[end]["island"].net_name for end in (part.one, part.other)
            ),
        )
        for part in way.capacitors
    )
    return (*holes, *parts)
