"""Changes of plane as findings: what way the return finds from one plane to the other."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from math import hypot
from typing import NamedTuple

import networkx as nx
import numpy as np
import shapely

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import all_parts, bridges_between
from splitcheck.loops.handover import between_plates_nh, line_nh, plates_nf, shared_nh
from splitcheck.planes.changes import LOOK_STEP_MM, LOOK_TO_MM, Carry, PlaneChange, carries_at
from splitcheck.planes.crossings import BareTrace, Crossing
from splitcheck.planes.islands import Island
from splitcheck.units import INCH_MM
from splitcheck.verdict.around import SUPPLY_RATIO
from splitcheck.verdict.findings import LEVELS, BridgeUse, Finding, Source
from splitcheck.verdict.listing import gathered, near_enough, worth_listing
from splitcheck.verdict.places import fingerprint
from splitcheck.verdict.rules import Class
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import level, noise_mv

#: So many of the nearest holes, or of the nearest parts, share a return.
MOST_HOLES = 8
MOST_PARTS = 12
#: Capacitors farther away than this, mm for each ns of rise time, come too late (S. Weir, si-list,
#: 16 Oct 2008: 1 inch a ns).
PARTS_MM_NS = INCH_MM
#: Changes between the same islands within this distance of the worst of them are one place, mm.
TOGETHER_MM = 3.0
#: How far the closed forms may be off: over vias, over parts, between the plates alone.
ERRORS = {"via": 0.3, "capacitor": 0.5, "plates": 1.0}
#: A change of less than this share of the return counts for nothing.
LEAST_SHARE = 0.1
#: Barrel of a part's hole, mm (common practice, no source).
PART_HOLE_MM = 0.3
#: A board without capacitors is hardly one; where no file tells them there is nothing to judge by.
UNKNOWN = "changes of plane between two nets, not judged: no file tells where capacitors are"
SUPPLY_LINES = (
    f"changes of plane of lines wider than {SUPPLY_RATIO:g} times their height (supply lines)"
)
#: Traces that leave a plane for less than this go to their own pad there, mm.
OWN_END_MM = 3.0


@dataclass(frozen=True, slots=True)
class Case:
    """Changes of plane that are one finding: at a hole, or at one or both ends of a run."""

    changes: tuple[PlaneChange, ...]
    gap_mm: float
    """Length of the trace without its first plane; 0 at a hole."""


#: Layer of a plane and index of an island in it.
_Key = tuple[int, int]


class _Cavity(NamedTuple):
    """Two islands, one over the other, between which a part of the return must go."""

    one: Island
    other: Island
    current: float
    plates_mm: float


class _Way(NamedTuple):
    """What one cavity costs, and the way that is taken."""

    cavity: _Cavity
    added_nh: float
    """Above what a return via at the distance of the rules would cost."""
    kind: str
    """``via``, ``capacitor`` or ``plates``."""
    at: Point | None
    far_mm: float | None
    net: str


def from_leaving(scene: Scene, bare: Sequence[BareTrace]) -> list[Case]:
    """Cases of traces that leave the plane that carried their return for another one, for good."""
    traces = [
        trace
        for trace in bare
        if trace.rim is not None and trace.on is not None and trace.bare_mm >= OWN_END_MM
    ]
    stretches: list[tuple[int, Sequence[Point]]] = []
    for trace in traces:
        assert trace.on is not None
        stretches.append((trace.layer, (trace.on,)))
        stretches.append((trace.layer, _beyond_rim(trace)))
    carried = carries_at(scene.board, tuple(scene.planes.values()), stretches)
    cases = []
    for number, trace in enumerate(traces):
        assert trace.rim is not None
        before, after = carried[2 * number : 2 * number + 2]
        change = _in_layer(
            trace.net, trace.rim, trace.layer, before, after, trace.line, trace.width_mm
        )
        cases.append(Case((change,), trace.bare_mm))
    return cases


def _beyond_rim(trace: BareTrace) -> list[Point]:
    """Places along a trace that has left its plane, near where it did."""
    assert trace.rim is not None
    places = []
    for start, stop in trace.spans:
        line = shapely.LineString([start, stop])
        along = np.arange(LOOK_STEP_MM / 2, line.length, LOOK_STEP_MM)
        places.extend(shapely.get_coordinates(line.interpolate(along)).tolist())
    if not places:
        return [trace.at]
    far = np.hypot(*(np.array(places) - trace.rim).T)
    near = [place for place, mm in zip(places, far, strict=True) if mm <= LOOK_TO_MM]
    return [(x, y) for x, y in near or [places[int(np.argmin(far))]]]


def from_long_runs(scene: Scene, crossings: Sequence[Crossing]) -> list[Case]:
    """Cases of traces that leave a plane for another one and come back after a long run."""
    stretches: list[tuple[int, Sequence[Point]]] = []
    for crossing in crossings:
        run = shapely.LineString([crossing.before, *crossing.path, crossing.after])
        ends = min(LOOK_TO_MM, run.length / 2)
        along = np.arange(LOOK_STEP_MM, ends + LOOK_STEP_MM, LOOK_STEP_MM)
        for place, steps in ((crossing.before, along), (crossing.after, run.length - along)):
            inner = shapely.get_coordinates(run.interpolate(steps)).tolist()
            stretches.append((crossing.layer, (place,)))
            stretches.append((crossing.layer, [(x, y) for x, y in inner]))
    carried = carries_at(scene.board, tuple(scene.planes.values()), stretches)
    cases = []
    for number, c in enumerate(crossings):
        before, entered, after, left = carried[4 * number : 4 * number + 4]
        changes = (
            _in_layer(c.net, c.path[0], c.layer, before, entered, c.line, c.width_mm),
            _in_layer(c.net, c.path[-1], c.layer, after, left, c.line, c.width_mm),
        )
        cases.append(Case(changes, c.run_mm))
    return cases


def _in_layer(
    net: int,
    at: Point,
    layer: int,
    before: tuple[Carry, ...],
    after: tuple[Carry, ...],
    line: int,
    width_mm: float,
) -> PlaneChange:
    return PlaneChange(net, at, None, (layer, layer), before, after, line, width_mm)


def change_findings(scene: Scene, cases: Sequence[Case], dropped: dict[str, int]) -> list[Finding]:
    """Judge changes of plane.

    Parameters
    ----------
    scene
        The board, its planes, its island graph and its rules.
    cases
        Changes that are one finding each.
    dropped
        Counts of what is no finding; added to.

    Returns
    -------
    Findings, with ``gap`` telling which belong to one place.

    Notes
    -----
    (1) Between every two neighbours of the planes concerned a part of the return goes, the sum of
    what the planes above it lose. (2) Islands of one net are joined by plated holes, those nearest
    share the current; islands of two nets by capacitors; else there is the capacitance of the two
    planes alone. (3) A change costs something in any case: what counts is what it costs more than
    with one return via at ``Rules.change_mm``, the distance that layout guides ask for (TI SNLA426,
    AMD UG863: 50 mil). (4) Energies of parts of a return go with the square of the part. (5) The
    level is that of the noise; where a return via is missing between planes of one net, it is a
    warning from ``Rules.change_warning_nh`` on, unless the net is too slow for a note.
    """
    nets = _Nets(scene)
    judged = [
        (case, way) for case in cases if (way := _judge(scene, case, nets, dropped)) is not None
    ]
    findings = [_finding(scene, case, ways, nets) for case, ways in judged]
    return gathered(findings, lambda f: f"change {f.islands[0]} to {f.islands[1]}", TOGETHER_MM)


def _judge(scene: Scene, case: Case, nets: _Nets, dropped: dict[str, int]) -> list[_Way] | None:
    """The ways of a case, worst first; None if it is no finding."""
    drive = scene.drive_of(case.changes[0].net)
    if any(not change.before or not change.after for change in case.changes):
        dropped["changes to where no plane covers most of the trace, not judged as such"] += 1
        return None
    if any(_is_supply(scene, change) for change in case.changes):
        dropped[SUPPLY_LINES] += 1
        return None
    if all(_has_coplanar(scene, change) for change in case.changes):
        dropped["changes of plane beside reference copper of the trace's own layer"] += 1
        return None
    ways = [
        _way(scene, change, cavity, nets, drive)
        for change in case.changes
        for cavity in _cavities(scene, change)
    ]
    if not ways:
        dropped["changes of plane that move less than a tenth of the return"] += 1
        return None
    ways.sort(key=lambda way: -way.added_nh)
    added = sum(way.added_nh for way in ways)
    if added < scene.min_nh:
        dropped[near_enough("plane-change")] += 1
        return None
    known = [way for way in ways if not _is_unknown(way, nets)]
    if sum(way.added_nh for way in known) < scene.min_nh:
        dropped[UNKNOWN] += 1
        return None
    return known


def _is_unknown(way: _Way, nets: _Nets) -> bool:
    """Whether the planes are of two nets and nobody knows of any capacitor on the board."""
    return (
        way.kind == "plates"
        and not nets.parts
        and way.cavity.one.net_name != way.cavity.other.net_name
    )


def _is_supply(scene: Scene, change: PlaneChange) -> bool:
    """Whether the line is so wide for its height that it carries supply, not signals."""
    height = min(
        scene.board.stack.height_mm(layer, carry.layer)
        for layer, carries in zip(change.layers, (change.before, change.after), strict=True)
        for carry in carries
    )
    return change.width_mm > SUPPLY_RATIO * height


def _has_coplanar(scene: Scene, change: PlaneChange) -> bool:
    """Whether copper beside a trace that stays in its layer is nearer than the farther plane.

    It carries the return then, before and after.
    """
    layer = change.layers[0]
    own = scene.planes.get(layer)
    if change.hole_mm is not None or own is None or not change.moved:
        return False
    farthest = max(scene.board.stack.height_mm(layer, key[0]) for key in change.moved)
    at = shapely.Point(change.at)
    return any(shapely.dwithin(island.shape, at, farthest / 2) for island in own.islands)


def _cavities(scene: Scene, change: PlaneChange) -> Iterator[_Cavity]:
    """Between which islands how much of the return must go.

    What islands of one net lose goes to islands of that net first, past planes of other nets in
    between; only what is left goes from net to net.
    """
    islands = {key: scene.planes[key[0]].islands[key[1]] for key in change.moved}
    left = dict(change.moved)
    for net in sorted({island.net for island in islands.values()}):
        own = {key: share for key, share in left.items() if islands[key].net == net}
        lost = -sum(share for share in own.values() if share < 0)
        gained = sum(share for share in own.values() if share > 0)
        both = min(lost, gained)
        if both <= 0:
            continue
        part = {key: share * both / (gained if share > 0 else lost) for key, share in own.items()}
        yield from _stacked(scene, change, islands, part)
        left.update({key: left[key] - share for key, share in part.items()})
    yield from _stacked(scene, change, islands, left)


def _stacked(
    scene: Scene,
    change: PlaneChange,
    islands: dict[_Key, Island],
    moved: dict[_Key, float],
) -> Iterator[_Cavity]:
    """What a plane loses goes to its neighbours, plate by plate: the cumulated sum from the top."""
    stack, carried = scene.board.stack, 0.0
    by_layer: dict[int, dict[_Key, float]] = defaultdict(dict)
    for key, share in sorted(moved.items()):
        if abs(share) > 1e-9:
            by_layer[key[0]][key] = share
    layers = sorted(by_layer)
    for number, layer in enumerate(layers):
        here = by_layer[layer]
        lost = -sum(share for share in here.values() if share < 0)
        gained = sum(share for share in here.values() if share > 0)
        if min(lost, gained) >= LEAST_SHARE:
            height = min(stack.height_mm(layer, t) for t in change.layers if t != layer)
            one, other = min(here, key=here.__getitem__), max(here, key=here.__getitem__)
            yield _Cavity(islands[one], islands[other], min(lost, gained), height)
        carried += gained - lost
        if number + 1 < len(layers) and abs(carried) >= LEAST_SHARE:
            below = by_layer[layers[number + 1]]
            one, other = (max(some, key=lambda key: abs(some[key])) for some in (here, below))
            apart = stack.height_mm(layer, layers[number + 1])
            yield _Cavity(islands[one], islands[other], abs(carried), apart)


class _Part(NamedTuple):
    """A part between two nets, or two parts over a third net."""

    at: Point
    ref: str
    mounted_nh: float


class _Nets:
    """What joins two nets besides holes: parts, and the capacitance of their planes."""

    def __init__(self, scene: Scene) -> None:
        self.scene = scene
        self.islands: dict[int, list[Island]] = defaultdict(list)
        nets: dict[str, int] = {}
        for plane in scene.planes.values():
            for island in plane.islands:
                self.islands[island.net].append(island)
                nets[island.id] = island.net
        found: dict[tuple[int, int], dict[str, _Part]] = defaultdict(dict)
        for bridge in all_parts(scene.graph):
            one, other = sorted((nets[bridge.one], nets[bridge.other]))
            part = _Part(bridge.at, bridge.ref, bridge.mounted_nh)
            known = found[one, other].get(bridge.ref)
            if one != other and (known is None or part.mounted_nh < known.mounted_nh):
                found[one, other][bridge.ref] = part
        self.parts = {
            key: tuple(parts[ref] for ref in sorted(parts)) for key, parts in found.items()
        }
        self._facing: dict[tuple[int, int], tuple[float, float, float]] = {}

    def between(self, one: int, other: int) -> tuple[_Part, ...]:
        """Parts that join two nets."""
        return self.parts.get((min(one, other), max(one, other)), ())

    def facing(self, one: int, other: int) -> tuple[float, float, float]:
        """Area, distance and permittivity of the two islands with the most capacitance, mm2, mm.

        A small piece of a net that holes join to its planes has their capacitance.
        """
        key = (min(one, other), max(one, other))
        if key not in self._facing:
            stack = self.scene.board.stack
            self._facing[key] = max(
                (
                    (
                        min(a.shape.area, b.shape.area),
                        stack.height_mm(a.layer, b.layer),
                        stack.layers[min(a.layer, b.layer) - 1].er_below,
                    )
                    for a in self.islands[one]
                    for b in self.islands[other]
                    if a.layer != b.layer
                ),
                key=lambda pair: plates_nf(*pair),
                default=(1.0, 1.0, 1.0),
            )
        return self._facing[key]


def _parts_between(nets: _Nets, one: int, other: int, at: Point) -> list[_Part]:
    """Parts from one net to another, or else the nearest two over a third net as one."""
    direct = nets.between(one, other)
    if direct:
        return list(direct)
    over = []
    for third in sorted({net for key in nets.parts for net in key} - {one, other}):
        legs = [nets.between(net, third) for net in (one, other)]
        if legs[0] and legs[1]:
            first, second = (min(leg, key=lambda part: _far_mm(at, part.at)) for leg in legs)
            farther = max(first, second, key=lambda part: _far_mm(at, part.at))
            both = first.mounted_nh + second.mounted_nh
            over.append(_Part(farther.at, f"{first.ref} and {second.ref}", both))
    return over


def _far_mm(one: Point, other: Point) -> float:
    return hypot(one[0] - other[0], one[1] - other[1])


def _way(scene: Scene, change: PlaneChange, cavity: _Cavity, nets: _Nets, drive: Class) -> _Way:
    """The cheapest way between the two islands of a cavity."""
    wide = change.hole_mm or 2.0 * min(
        scene.board.stack.height_mm(change.layers[0], layer)
        for layer in (cavity.one.layer, cavity.other.layer)
        if layer != change.layers[0]
    )
    square = cavity.current**2
    base = line_nh(scene.rules.change_mm_of(drive), wide, cavity.plates_mm)
    if cavity.one.net == cavity.other.net:
        holes = _holes(scene, cavity, change.at)
        if holes:
            value = shared_nh(change.at, wide, holes, cavity.plates_mm)
            at = holes[0][0]
            added = square * max(value - base, 0.0)
            return _Way(cavity, added, "via", at, _far_mm(change.at, at), cavity.one.net_name)
    area_mm2, facing_mm, er = nets.facing(cavity.one.net, cavity.other.net)
    plates = between_plates_nh(
        wide, cavity.plates_mm, area_mm2, drive.rise_ns, plates_nf(area_mm2, facing_mm, er)
    )
    best = _Way(cavity, square * max(plates - base, 0.0), "plates", None, None, "")
    near = sorted(
        (_far_mm(change.at, part.at), part)
        for part in _parts_between(nets, cavity.one.net, cavity.other.net, change.at)
    )[:MOST_PARTS]
    near = [(far, part) for far, part in near if far <= PARTS_MM_NS * drive.rise_ns]
    if near:
        ways = [(part.at, PART_HOLE_MM, part.mounted_nh) for _, part in near]
        value = shared_nh(change.at, wide, ways, cavity.plates_mm)
        added = square * max(value - base, 0.0)
        far, part = near[0]
        if added <= best.added_nh:
            return _Way(cavity, added, "capacitor", part.at, far, part.ref)
        best = best._replace(net=part.ref, far_mm=far)
    return best


def _holes(scene: Scene, cavity: _Cavity, at: Point) -> list[tuple[Point, float, float]]:
    """Plated holes that join two islands of one net, nearest first; over others if none does."""
    graph = scene.graph
    places = bridges_between(graph, cavity.one.id, cavity.other.id)
    if len(places):
        wide_mm = graph.edges[cavity.one.id, cavity.other.id]["wide_mm"]
        far = np.hypot(*(places - np.asarray(at)).T)
        order = np.argsort(far, kind="stable")[:MOST_HOLES].tolist()
        return [
            ((float(places[i, 0]), float(places[i, 1])), max(float(wide_mm[i]), 0.05), 0.0)
            for i in order
        ]
    if cavity.one.id == cavity.other.id or not nx.has_path(graph, cavity.one.id, cavity.other.id):
        return []
    # over other islands: as far as the farthest of the holes on the way
    steps = nx.shortest_path(graph, cavity.one.id, cavity.other.id)
    nearest = []
    for one, other in pairwise(steps):
        places = bridges_between(graph, one, other)
        far = np.hypot(*(places - np.asarray(at)).T)
        best = int(np.argmin(far))
        nearest.append((float(far[best]), (float(places[best, 0]), float(places[best, 1]))))
    return [(max(nearest)[1], PART_HOLE_MM, 0.0)]


def _finding(scene: Scene, case: Case, ways: Sequence[_Way], nets: _Nets) -> Finding:
    first, worst = case.changes[0], ways[0]
    drive = scene.drive_of(first.net)
    added = sum(way.added_nh for way in ways)
    noise = noise_mv(added, drive)
    how = level(noise, drive, added)
    stitched = sum(way.added_nh for way in ways if way.kind == "via")
    if stitched >= scene.rules.change_warning_nh_of(drive) and worth_listing(noise, drive):
        how = min(how, "warning", key=LEVELS.index)
    layers = scene.board.stack.layers
    net = scene.board.nets[first.net].name
    name = layers[first.layers[0] - 1].name
    at = (round(first.at[0], 4), round(first.at[1], 4))
    islands = (worst.cavity.one, worst.cavity.other)
    names = dict.fromkeys(island.net_name for island in islands)
    return Finding(
        id="",
        kind="plane-change",
        level=how,
        net=net,
        net_class=drive.name,
        layer=name,
        plane_layer=layers[islands[0].layer - 1].name,
        plane_net=" to ".join(names),
        at_mm=at,
        gap_mm=case.gap_mm,
        detour_mm=None if worst.at is None else 2.0 * (worst.far_mm or 0.0),
        added_nh=added,
        error_nh=sum(ERRORS[way.kind] * way.added_nh for way in ways) + 0.01,
        method="estimated",
        noise_mv=noise,
        rise_ns=drive.rise_ns,
        corner_khz=None,
        stray_db=None,
        islands=(islands[0].id, islands[1].id),
        bridges=tuple(_bridge(way) for way in ways[:1] if way.at is not None),
        gap="",
        shares_gap_with=(),
        pair=None,
        source=Source(scene.board.layers[first.layers[0] - 1].file, first.line),
        waived=None,
        fingerprint=fingerprint("plane-change", net, name, at),
        reason=_reason(scene, case, worst, nets),
    )


def _bridge(way: _Way) -> BridgeUse:
    assert way.at is not None
    at = (round(way.at[0], 4), round(way.at[1], 4))
    return BridgeUse("capacitor" if way.kind == "capacitor" else "via", at, way.net)


def _reason(scene: Scene, case: Case, way: _Way, nets: _Nets) -> str:
    names = [layer.name for layer in scene.board.stack.layers]
    first, cavity = case.changes[0], way.cavity
    one, other = cavity.one, cavity.other
    if first.hole_mm is None:
        start = f"for {case.gap_mm:.1f} mm"
        ends = "" if len(case.changes) < 2 else " and back"
        start = f"the trace leaves its plane {start}{ends} while another one goes on"
    else:
        start = f"the trace goes from {names[first.layers[0] - 1]} to {names[first.layers[1] - 1]}"
    start += (
        f"; its return must change between {names[one.layer - 1]} ({one.net_name}) and "
        f"{names[other.layer - 1]} ({other.net_name}), {cavity.plates_mm:.2f} mm apart"
    )
    if cavity.current < 0.995:
        start += f", {100 * cavity.current:.0f} % of it"
    return f"{start}; {_way_in_words(way, nets)}"


def _way_in_words(way: _Way, nets: _Nets) -> str:
    if way.kind == "plates":
        one, other = way.cavity.one.net, way.cavity.other.net
        farads = f"the {1000 * plates_nf(*nets.facing(one, other)):.0f} pF of the two planes"
        if one == other or way.cavity.one.net_name == way.cavity.other.net_name:
            return f"no plated hole joins the two: {farads} alone do"
        if way.far_mm is None:
            return f"no capacitor joins them near enough: {farads} alone do"
        return (
            f"{farads} serve better than the nearest capacitor, {way.net}, {way.far_mm:.1f} mm away"
        )
    assert way.at is not None
    where = f"{way.far_mm:.1f} mm away at ({way.at[0]:.2f}, {way.at[1]:.2f})"
    if way.kind == "via":
        return f"the nearest plated hole that joins them is {where}"
    return f"the nearest capacitor that joins them, {way.net}, is {where}"
