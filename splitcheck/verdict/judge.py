"""From crossings and bare traces to findings: what counts, what it costs, and why, in words."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from functools import partial
from hashlib import sha256
from math import inf
from typing import Any, TypeAlias

import networkx as nx
import numpy as np
import shapely

from splitcheck.board.board import Board
from splitcheck.loops import estimate
from splitcheck.loops.bridges import IslandGraph, stitched_near
from splitcheck.loops.corner import detour_corner_khz
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.fields import Field, Fields, Task, can_solve, cluster, together_mm
from splitcheck.loops.routes import find_route
from splitcheck.loops.terrain import Terrain
from splitcheck.loops.ways import Route, Way
from splitcheck.planes.crossings import BareTrace, Crossing
from splitcheck.planes.islands import Gap, Plane
from splitcheck.planes.shadows import nearest_cover
from splitcheck.verdict.findings import (
    BridgeUse,
    Count,
    Finding,
    GapShare,
    Kind,
    Source,
)
from splitcheck.verdict.score import DEFAULT_DRIVE, Drive, level, noise_mv, worst_first

#: A net's own antipad is at most this much wider than its hole, mm; more is a field of antipads.
OWN_ANTIPAD_MM = 2.0
#: Bare trace shorter than this at a net's own pads and vias is not a finding, mm.
OWN_END_MM = 3.0
#: A run at least this long over another whole plane can be a change of plane: mm ...
CHANGE_RUN_MM = 5.0
#: ... if the two are one net and stitched this near to both ends, mm, ...
CHANGE_STITCH_MM = 3.0
#: ... or, whatever their nets, if it is this many times longer than the planes are apart.
CHANGE_RATIO = 10.0
#: So far before and after a run the plane on the trace's other side is looked for, mm.
BESIDE_MM = 3.0
#: A plane is whole under a gap if it covers this share of places in it: antipads do not count.
WHOLE = 0.6
#: A run whose middle lies this near to the same stretch of trace is on it, mm.
SAME_PLACE_MM = 1e-3
#: Findings over one gap within this distance of one another are told together, mm.
TOGETHER_MM = 6.0
#: From this ratio of length across the trace to length along it a closed gap is a slot.
SLOT_RATIO = 2.5
#: A trace this near the rim of a gap, as a share of its run, clips the gap rather than crosses it.
EDGE_RATIO = 0.25


#: Calls a function on every item and gives the results in order, as ``map`` does.
Spread: TypeAlias = Callable[[Callable[[Any], Any], Iterable[Any]], Iterable[Any]]


@dataclass(frozen=True, slots=True)
class Scene:
    """What judging a crossing needs to know beyond the crossing."""

    board: Board
    planes: dict[int, Plane]
    terrains: dict[int, Terrain]
    graph: IslandGraph
    min_nh: float
    drive: Drive = DEFAULT_DRIVE


@dataclass(frozen=True, slots=True)
class Weighed:
    """A crossing with its way round and what closed forms say of it."""

    crossing: Crossing
    route: Route
    beyond: int | None
    """Layer number of a whole plane beyond the broken one."""
    other: int | None
    """Layer number of a whole plane on the trace's other side."""
    beside: int | None
    """Layer number of the plane on the trace's other side, before and after the run."""
    share: float
    """Part of the return that the broken plane carries."""
    estimate: Inductance | None
    kind: Kind
    runs: tuple[Crossing, ...]
    """All runs that it stands for: one trace may pass over one gap several times."""

    @property
    def bare_mm(self) -> float:
        """Length of all its runs, mm."""
        return sum(crossing.run_mm for crossing in self.runs)


def judge(
    scene: Scene,
    crossings: Sequence[Crossing],
    bare: Sequence[BareTrace],
    spread: Spread = map,
) -> tuple[tuple[Finding, ...], tuple[Count, ...]]:
    """Turn crossings and bare traces into findings, worst first.

    Parameters
    ----------
    scene
        The board and its planes.
    crossings, bare
        What the traces run over.
    spread
        How to call a function on many items: in turn, or on several cores.

    Returns
    -------
    Findings with their ids, and counts of what was seen and is not a finding.
    """
    dropped: dict[str, int] = defaultdict(int)
    weighed: list[Weighed] = []
    for result in spread(partial(_weigh, scene), crossings):
        if isinstance(result, str):
            dropped[result] += 1
        else:
            weighed.append(result)
    weighed = _once_a_gap(weighed)
    solved = _solve_all(scene, weighed, spread)
    findings: list[Finding] = []
    for number, item in enumerate(weighed):
        finding = _crossing_finding(scene, item, solved.get(number), weighed)
        if finding is None:
            dropped[_too_small(scene)] += 1
        else:
            findings.append(finding)
    findings.extend(_bare_findings(scene, bare, dropped))
    counts = tuple(Count(what, number) for what, number in sorted(dropped.items()))
    return _with_ids(_with_shares(_by_place(findings))), counts


def _by_place(findings: Sequence[Finding]) -> list[Finding]:
    """Tell apart the places of one gap: a gap of clearances can run all over a layer.

    Findings over one gap belong together if they lie between the same islands and in a chain of
    neighbours; the id of the gap gets a number for each such place where there are several.
    """
    groups: dict[tuple[str, frozenset[str]], list[int]] = defaultdict(list)
    for number, finding in enumerate(findings):
        groups[finding.gap, frozenset(finding.islands)].append(number)
    places: dict[str, list[list[int]]] = defaultdict(list)
    for (gap, islands), members in groups.items():
        chained = (
            _chains([findings[i] for i in members]) if islands else [list(range(len(members)))]
        )
        places[gap].extend([members[i] for i in chain] for chain in chained)
    told = list(findings)
    for gap, found in places.items():
        if len(found) < 2:
            continue
        ranked = sorted(found, key=lambda place: min(worst_first(findings[i]) for i in place))
        for rank, place in enumerate(ranked, start=1):
            for i in place:
                told[i] = replace(findings[i], gap=f"{gap}/{rank}")
    return told


def _chains(findings: Sequence[Finding]) -> list[list[int]]:
    """Indexes of findings in groups of which every member has another one near, unless alone.

    Those that were solved together as they couple are near, too.
    """
    places = shapely.points([finding.at_mm for finding in findings])
    reach = np.array([max(TOGETHER_MM, together_mm(f.detour_mm)) for f in findings])
    near: nx.Graph[int] = nx.Graph()
    near.add_nodes_from(range(len(findings)))
    one, other = shapely.STRtree(places).query(places, predicate="dwithin", distance=reach)
    close = shapely.distance(places[one], places[other]) <= reach[other]
    near.add_edges_from(np.stack([one, other], axis=1)[close].tolist())
    return [sorted(members) for members in nx.connected_components(near)]


def _once_a_gap(weighed: Sequence[Weighed]) -> list[Weighed]:
    """Join the runs of one stretch of trace over one gap of one island into the worst of them.

    The return has to go round once for all of them, or not at all where the trace comes back; the
    solve sees the whole stretch. Adding their values up would count it several times.
    """
    groups: dict[tuple[int, ...], list[Weighed]] = defaultdict(list)
    for item in weighed:
        c = item.crossing
        groups[c.net, c.layer, c.plane, c.gap, *c.islands].append(item)
    kept: list[Weighed] = []
    for key, members in sorted(groups.items()):
        left = sorted(members, key=_by_estimate)
        if key[-1] != key[-2]:
            kept.extend(left)
            continue
        while left:
            worst = left.pop(0)
            stretch = shapely.LineString(worst.crossing.stretch)
            same = [
                item
                for item in left
                if shapely.dwithin(stretch, shapely.Point(item.crossing.at), SAME_PLACE_MM)
            ]
            left = [item for item in left if item not in same]
            runs = (worst.crossing, *(item.crossing for item in same))
            kept.append(replace(worst, runs=runs))
    return kept


def _by_estimate(item: Weighed) -> tuple[float, float, tuple[float, float]]:
    added = inf if item.estimate is None else item.estimate.added_nh
    return (-added, -item.crossing.run_mm, item.crossing.at)


def _solve_all(scene: Scene, weighed: Sequence[Weighed], spread: Spread) -> dict[int, Field]:
    """Solve for every crossing that has a way back, those over one gap together."""
    tasks = [
        Task(
            number,
            item.crossing,
            item.route,
            tuple(crossing.path for crossing in item.runs),
            scene.board.stack.height_mm(item.crossing.layer, item.crossing.plane),
            item.beyond,
            item.other,
            item.share / _share(scene, item.crossing, item.other),
        )
        for number, item in enumerate(weighed)
    ]
    solved: dict[int, Field] = {}
    fields = Fields(scene.board, scene.planes, scene.graph)
    for result in spread(fields.solve, cluster([task for task in tasks if can_solve(task)])):
        solved.update(result)
    return solved


def _too_small(scene: Scene) -> str:
    return f"crossings that add less than {scene.min_nh:g} nH"


def _with_ids(findings: Iterable[Finding]) -> tuple[Finding, ...]:
    ranked = sorted(findings, key=worst_first)
    return tuple(replace(finding, id=f"F{n}") for n, finding in enumerate(ranked, start=1))


def _with_shares(findings: Sequence[Finding]) -> list[Finding]:
    """Name every net over the same gap, also those that no solve has put together."""
    nets: dict[str, set[str]] = defaultdict(set)
    for finding in findings:
        if finding.kind != "no-plane":
            nets[finding.gap].add(finding.net)
    shared = []
    for finding in findings:
        known = {share.net for share in finding.shares_gap_with} | {finding.net}
        more = sorted(nets.get(finding.gap, set()) - known)
        shares = (*finding.shares_gap_with, *(GapShare(net, None) for net in more))
        shared.append(
            replace(finding, shares_gap_with=tuple(sorted(shares, key=lambda share: share.net)))
        )
    return shared


def _exempt(scene: Scene, crossing: Crossing) -> str | None:
    """Why a crossing is no finding, or None.

    (1) The gap is the antipad of a plated hole of the net itself.
    (2) It is too small to add what is asked for, whatever way the return takes.
    (3) A long run over another whole plane, of the same net and stitched at both ends or close
    beneath: the return changes planes there, it does not go round.
    """
    plane = scene.planes[crossing.plane]
    gap = plane.gaps[crossing.gap]
    if not gap.open and _own_antipad(scene, crossing, gap):
        return "antipads at a net's own holes"
    if not gap.open and _ceiling_nh(scene, crossing, gap) < scene.min_nh:
        return f"crossings that add less than {scene.min_nh:g} nH"
    if crossing.run_mm >= CHANGE_RUN_MM and _changes_plane(scene, crossing):
        return "long runs over another whole plane (changes of plane, not judged here)"
    return None


def _own_antipad(scene: Scene, crossing: Crossing, gap: Gap) -> bool:
    x0, y0, x1, y1 = gap.shape.bounds
    for hole in scene.board.holes:
        if hole.net != crossing.net:
            continue
        x, y = hole.at
        if (
            x0 <= x <= x1
            and y0 <= y <= y1
            and max(x1 - x0, y1 - y0) <= hole.hole.diameter_mm + OWN_ANTIPAD_MM
            and gap.shape.buffer(hole.hole.diameter_mm).contains(shapely.Point(x, y))
        ):
            return True
    return False


def _ceiling_nh(scene: Scene, crossing: Crossing, gap: Gap) -> float:
    """More than a closed gap can add: a slot as long as the gap's own diagonal, crossed midway."""
    x0, y0, x1, y1 = gap.shape.bounds
    across = float(np.hypot(x1 - x0, y1 - y0))
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    stub = estimate.stub_nh(across / 2, crossing.run_mm, height, crossing.width_mm)
    along = crossing.run_mm * estimate.beside_edge_nh_mm(-across / 2, height)
    return 1.3 * max(stub, 0.0 if across / 2 > 3 * height else along)


def _changes_plane(scene: Scene, crossing: Crossing) -> bool:
    xs, ys = np.array([*crossing.path, crossing.at]).T
    layer = nearest_cover(tuple(scene.planes.values()), _layers_beyond(scene, crossing), xs, ys)
    if layer is None:
        return False
    if crossing.run_mm >= CHANGE_RATIO * scene.board.stack.height_mm(crossing.plane, layer):
        return True
    one, other = (scene.planes[crossing.plane].islands[i] for i in crossing.islands)
    number = int(scene.planes[layer].island_at(xs[:1], ys[:1])[0])
    island = scene.planes[layer].islands[number]
    return (
        one.net == other.net == island.net
        and stitched_near(scene.graph, one.id, island.id, crossing.before, CHANGE_STITCH_MM)
        and stitched_near(scene.graph, other.id, island.id, crossing.after, CHANGE_STITCH_MM)
    )


def _layers_beyond(scene: Scene, crossing: Crossing) -> list[int]:
    step = 1 if crossing.plane > crossing.layer else -1
    last = len(scene.board.stack.layers)
    return list(range(crossing.plane + step, last + 1 if step > 0 else 0, step))


def _layers_on_other_side(scene: Scene, crossing: Crossing) -> list[int]:
    step = -1 if crossing.plane > crossing.layer else 1
    last = len(scene.board.stack.layers)
    return list(range(crossing.layer + step, last + 1 if step > 0 else 0, step))


def _other_side(scene: Scene, crossing: Crossing) -> int | None:
    """The layer on the trace's other side that carries returns along most of the run."""
    run = shapely.LineString([crossing.before, *crossing.path, crossing.after])
    points = shapely.get_coordinates(run.interpolate(np.linspace(0.0, 1.0, 13), normalized=True))
    return nearest_cover(
        tuple(scene.planes.values()),
        _layers_on_other_side(scene, crossing),
        points[:, 0],
        points[:, 1],
        WHOLE,
    )


def _beside(scene: Scene, crossing: Crossing) -> int | None:
    """The layer on the trace's other side that carries returns just before and after the run."""
    stretch = shapely.LineString(crossing.stretch)
    ends = sorted(stretch.project(shapely.Point(end)) for end in (crossing.before, crossing.after))
    steps = np.linspace(0.1, 1.0, 6) * BESIDE_MM
    along = np.concatenate([ends[0] - steps, ends[1] + steps])
    along = along[(along >= 0.0) & (along <= stretch.length)]
    points = shapely.get_coordinates(stretch.interpolate(np.append(along, ends)))
    layers = _layers_on_other_side(scene, crossing)
    xs, ys = points[:, 0], points[:, 1]
    return nearest_cover(tuple(scene.planes.values()), layers, xs, ys, WHOLE)


def _share(scene: Scene, crossing: Crossing, other: int | None) -> float:
    """Part of the return that the broken plane carries: 1 - h1/(h1 + h2) between two planes."""
    if other is None:
        return 1.0
    near = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    far = scene.board.stack.height_mm(crossing.layer, other)
    return far / (near + far)


def _beyond(scene: Scene, crossing: Crossing) -> int | None:
    """Layer number of the nearest plane beyond the broken one if it is whole under the gap.

    A nearer plane that is open there as well is passed over for the next one.
    """
    xs, ys = _places_in_gap(scene, crossing)
    return nearest_cover(
        tuple(scene.planes.values()), _layers_beyond(scene, crossing), xs, ys, WHOLE
    )


def _places_in_gap(
    scene: Scene, crossing: Crossing
) -> tuple[np.ndarray[tuple[int], np.dtype[np.float64]], ...]:
    """The run itself and places of the gap to its left and right, as far as it matters."""
    gap = scene.planes[crossing.plane].gaps[crossing.gap].shape
    dx = crossing.after[0] - crossing.before[0]
    dy = crossing.after[1] - crossing.before[1]
    length = float(np.hypot(dx, dy)) or 1.0
    reach = np.array([-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0]) * max(crossing.run_mm, 1.0)
    xs = np.append(crossing.at[0] - dy / length * reach, [p[0] for p in crossing.path])
    ys = np.append(crossing.at[1] + dx / length * reach, [p[1] for p in crossing.path])
    inside = shapely.contains_xy(gap, xs, ys) & shapely.contains_xy(scene.board.outline, xs, ys)
    if not inside.any():
        return np.array([crossing.at[0]]), np.array([crossing.at[1]])
    return xs[inside], ys[inside]


def _weigh(scene: Scene, crossing: Crossing) -> Weighed | str:
    """Find the way round of a crossing and estimate it; the reason if it is no finding."""
    exempt = _exempt(scene, crossing)
    if exempt is not None:
        return exempt
    route = find_route(crossing, scene.planes, scene.terrains, scene.graph)
    other = _other_side(scene, crossing)
    beyond = _beyond(scene, crossing)
    beside = _beside(scene, crossing)
    share = _share(scene, crossing, other if beside is None else beside)
    value = _estimate(scene, crossing, route, share, beyond, other)
    if value is not None and value.added_nh + value.error_nh < scene.min_nh:
        return _too_small(scene)
    kind = _kind(crossing, scene.planes[crossing.plane].gaps[crossing.gap], route)
    if kind == "edge-run":
        return "runs beyond the rim of a plane (edge runs)"
    return Weighed(crossing, route, beyond, other, beside, share, value, kind, (crossing,))


def _crossing_finding(
    scene: Scene, item: Weighed, field: Field | None, weighed: Sequence[Weighed]
) -> Finding | None:
    """The finding of a crossing; None if it adds too little."""
    value = item.estimate if field is None else field.value
    if value is not None and value.added_nh < scene.min_nh:
        return None
    noise = None if value is None else noise_mv(value.added_nh, scene.drive)
    return _finding(scene, item, value, noise, field, weighed)


def _kind(crossing: Crossing, gap: Gap, route: Route) -> Kind:
    if crossing.islands[0] != crossing.islands[1]:
        return "split-crossing"
    left, right = (min(route.reach_mm(way), 1e3) for way in (route.left, route.right))
    if min(left, right) < EDGE_RATIO * crossing.run_mm:
        return "edge-run" if gap.open else "void-crossing"
    return "slot-crossing" if left + right >= SLOT_RATIO * crossing.run_mm else "void-crossing"


def _estimate(
    scene: Scene,
    crossing: Crossing,
    route: Route,
    share: float,
    beyond: int | None,
    other: int | None,
) -> Inductance | None:
    heights = scene.board.stack
    above = None if other is None else heights.height_mm(crossing.plane, other)
    over = None
    if above is not None and crossing.islands[0] != crossing.islands[1]:
        islands = scene.planes[crossing.plane].islands
        smaller = min(islands[i].shape.area for i in crossing.islands)
        over = estimate.handed_over(above, smaller, share)
    if not route.joined:
        return over
    round_gap = estimate.added(
        (_reach_mm(crossing, route, route.left), _reach_mm(crossing, route, route.right)),
        (_bridge_nh(scene, crossing, route.left), _bridge_nh(scene, crossing, route.right)),
        crossing.run_mm,
        heights.height_mm(crossing.layer, crossing.plane),
        crossing.width_mm,
        beyond_mm=None if beyond is None else heights.height_mm(crossing.plane, beyond),
        above_mm=above,
        share=share,
    )
    known = [value for value in (over, round_gap) if value is not None]
    return min(known, key=lambda value: value.added_nh) if known else None


def _reach_mm(crossing: Crossing, route: Route, way: Way | None) -> float:
    """How far along the gap a way goes before it crosses, mm.

    Over bridges that is where the leg between them crosses the gap: the way to them and back runs
    along the trace, over copper that is whole.
    """
    if way is None or len(way.bridges) != 2:
        return route.reach_mm(way)
    ahead = np.subtract(crossing.after, crossing.before)
    ahead = ahead / (float(np.hypot(*ahead)) or 1.0)
    (one, other) = (np.subtract(at, crossing.at) for at in way.bridges)
    before, after = float(one @ ahead), float(other @ ahead)
    part = 0.5 if before == after else min(max(-before / (after - before), 0.0), 1.0)
    x, y = one + part * (other - one)
    return abs(float(y * ahead[0] - x * ahead[1]))


def _bridge_nh(scene: Scene, crossing: Crossing, way: Way | None) -> float:
    if way is None or not way.bridges or way.bridge_layer in {0, crossing.plane}:
        return 0.0
    (x0, y0), (x1, y1) = way.bridges[0], way.bridges[-1]
    apart = float(np.hypot(x1 - x0, y1 - y0))
    return estimate.via_pair_nh(
        apart, 0.3, scene.board.stack.height_mm(crossing.plane, way.bridge_layer)
    )


def _finding(
    scene: Scene,
    item: Weighed,
    value: Inductance | None,
    noise: float | None,
    field: Field | None,
    weighed: Sequence[Weighed],
) -> Finding:
    crossing, route = item.crossing, item.route
    plane = scene.planes[crossing.plane]
    layers = scene.board.stack.layers
    islands = [plane.islands[i] for i in crossing.islands]
    net = scene.board.nets[crossing.net].name
    at = (round(crossing.at[0], 4), round(crossing.at[1], 4))
    return Finding(
        id="",
        kind=item.kind,
        level=level(noise, scene.drive),
        net=net,
        net_class=scene.drive.name,
        layer=layers[crossing.layer - 1].name,
        plane_layer=layers[crossing.plane - 1].name,
        plane_net=" to ".join(dict.fromkeys(island.net_name for island in islands)),
        at_mm=at,
        gap_mm=item.bare_mm,
        detour_mm=route.detour_mm if route.joined else None,
        added_nh=None if value is None else value.added_nh,
        error_nh=None if value is None else value.error_nh,
        method="solved" if field is not None else "none" if value is None else "estimated",
        noise_mv=noise,
        rise_ns=scene.drive.rise_ns,
        corner_khz=_corner_khz(scene, item, field),
        stray_db=None if field is None else field.stray_db,
        islands=(islands[0].id, islands[1].id),
        bridges=_bridges(route.best),
        gap=plane.gaps[crossing.gap].id,
        shares_gap_with=_mutual(scene, crossing.net, field, weighed),
        pair=None,
        source=Source(scene.board.layers[crossing.layer - 1].file, crossing.line),
        waived=None,
        fingerprint=_fingerprint(item.kind, net, layers[crossing.layer - 1].name, at),
        reason=_reason(scene, item),
        **_disagreement(item.estimate, field),
    )


def _corner_khz(scene: Scene, item: Weighed, field: Field | None) -> float | None:
    """From where on the return follows inductance; None if nothing was solved."""
    detour_mm = item.route.detour_mm
    if field is None or detour_mm is None:
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


def _disagreement(first: Inductance | None, field: Field | None) -> dict[str, float]:
    """The closed-form value, to be kept beside a solved one that it does not agree with."""
    if first is None or field is None:
        return {}
    if abs(first.added_nh - field.value.added_nh) <= first.error_nh + field.value.error_nh:
        return {}
    return {"estimated_nh": first.added_nh, "estimated_error_nh": first.error_nh}


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


def _bridges(way: Way | None) -> tuple[BridgeUse, ...]:
    if way is None:
        return ()
    return tuple(
        BridgeUse("via", (round(x, 4), round(y, 4)), way.bridge_net) for x, y in way.bridges
    )


def _fingerprint(kind: str, net: str, layer: str, at: tuple[float, float]) -> str:
    """A hash of what, on which net and roughly where (to 1 mm)."""
    text = f"{kind}|{net}|{layer}|{round(at[0])}|{round(at[1])}"
    return sha256(text.encode()).hexdigest()[:16]


def _reason(scene: Scene, item: Weighed) -> str:
    crossing = item.crossing
    plane = scene.planes[crossing.plane]
    one, other = (plane.islands[i] for i in crossing.islands)
    name = scene.board.stack.layers[crossing.plane - 1].name
    if item.kind == "split-crossing":
        start = (
            f"{name} is split here between {one.net_name} ({one.id}) and "
            f"{other.net_name} ({other.id})"
        )
    else:
        start = f"{name} ({one.net_name}) is open for {item.bare_mm:.2f} mm under the trace"
        if len(item.runs) > 1:
            start += f", in {len(item.runs)} places"
    way = _way_in_words(scene, item.route, item.share)
    return "; ".join([start, way, *_extras(scene, item)])


def _way_in_words(scene: Scene, route: Route, share: float) -> str:
    best = route.best
    if not route.joined or best is None:
        if share < 1.0:
            return (
                "neither copper nor a plated hole joins the two sides: the return must leave for "
                "the plane on the trace's other side"
            )
        return "neither copper nor a plated hole joins the two sides: no galvanic way back"
    detour = route.detour_mm or 0.0
    if not best.bridges:
        return f"the return walks {detour:.1f} mm more round the gap"
    x, y = best.bridges[0]
    via = f"plated holes from ({x:.2f}, {y:.2f}) over {best.bridge_net}"
    if best.bridge_layer:
        via += f" on {scene.board.stack.layers[best.bridge_layer - 1].name}"
    return f"the return walks {detour:.1f} mm more through {via}"


def _extras(scene: Scene, item: Weighed) -> list[str]:
    extras = []
    names = [layer.name for layer in scene.board.stack.layers]
    if item.share < 1.0:
        extras.append(f"{100 * item.share:.0f} % of the return flows on this plane")
    if item.beyond is not None:
        apart = scene.board.stack.height_mm(item.crossing.plane, item.beyond)
        extras.append(
            f"{names[item.beyond - 1]} is whole {apart:.2f} mm beyond and shields the gap"
        )
    if item.beside is not None and item.beside != item.other:
        extras.append(f"{names[item.beside - 1]} on the trace's other side is open here as well")
    passed = [layer for layer in _layers_beyond(scene, item.crossing) if layer in scene.planes]
    if passed and passed[0] != item.beyond:
        extras.append(f"the next plane, {names[passed[0] - 1]}, is open here as well")
    return extras


def _bare_findings(
    scene: Scene, bare: Sequence[BareTrace], dropped: dict[str, int]
) -> list[Finding]:
    """One finding for each net and layer that runs over no plane at all."""
    groups: dict[tuple[int, int], list[BareTrace]] = defaultdict(list)
    for trace in bare:
        if trace.bare_mm < OWN_END_MM:
            dropped[f"ends of traces without a plane, shorter than {OWN_END_MM:g} mm"] += 1
        else:
            groups[trace.layer, trace.net].append(trace)
    found = (_bare_finding(scene, traces) for _, traces in sorted(groups.items()))
    return [finding for finding in found if finding is not None]


def _bare_finding(scene: Scene, traces: Sequence[BareTrace]) -> Finding | None:
    longest = max(traces, key=lambda trace: trace.bare_mm)
    total = sum(trace.bare_mm for trace in traces)
    value = _bare_estimate(scene, traces)
    if value is not None and value.added_nh < scene.min_nh:
        return None
    noise = None if value is None else noise_mv(value.added_nh, scene.drive)
    net = scene.board.nets[longest.net].name
    layer = scene.board.stack.layers[longest.layer - 1].name
    at = (round(longest.at[0], 4), round(longest.at[1], 4))
    where = (
        ""
        if len(traces) == 1
        else f" in {len(traces)} places, the longest {longest.bare_mm:.1f} mm"
    )
    return Finding(
        id="",
        kind="no-plane",
        level=level(noise, scene.drive),
        net=net,
        net_class=scene.drive.name,
        layer=layer,
        plane_layer="",
        plane_net="",
        at_mm=at,
        gap_mm=total,
        detour_mm=None,
        added_nh=None if value is None else value.added_nh,
        error_nh=None if value is None else value.error_nh,
        method="none" if value is None else "estimated",
        noise_mv=noise,
        rise_ns=scene.drive.rise_ns,
        corner_khz=None,
        stray_db=None,
        islands=(),
        bridges=(),
        gap=f"bare {layer}",
        shares_gap_with=(),
        pair=None,
        source=Source(scene.board.layers[longest.layer - 1].file, longest.line),
        waived=None,
        fingerprint=_fingerprint("no-plane", net, layer, at),
        reason=f"{total:.1f} mm of the trace have no reference copper above or below{where}",
    )


def _bare_estimate(scene: Scene, traces: Sequence[BareTrace]) -> Inductance | None:
    """What running past the rim of the nearest plane costs; None if the board has no plane.

    The rim is taken as straight and as far away as the nearest reference copper of any layer.
    """
    total = 0.0
    for trace in traces:
        for start, stop in trace.spans:
            line = shapely.LineString([start, stop])
            best = inf
            for plane in scene.planes.values():
                if plane.layer == trace.layer:
                    continue
                height = scene.board.stack.height_mm(trace.layer, plane.layer)
                away = min(island.shape.distance(line) for island in plane.islands)
                best = min(best, estimate.beside_edge_nh_mm(-away, height))
            if best == inf:
                return None
            total += best * line.length
    return Inductance(total, 0.6 * total)
