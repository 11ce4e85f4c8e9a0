"""Changes of plane as findings: what way the return finds from one plane to the other."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely

from splitcheck.board.names import in_words
from splitcheck.copper.marks import Point
from splitcheck.loops.handover import plates_nf
from splitcheck.planes.changes import LOOK_STEP_MM, LOOK_TO_MM, Carry, PlaneChange, carries_at
from splitcheck.planes.crossings import BareTrace, Crossing
from splitcheck.verdict.around import SUPPLY_RATIO
from splitcheck.verdict.findings import LEVELS, BridgeUse, Finding, Source
from splitcheck.verdict.listing import gathered, near_enough, worth_listing
from splitcheck.verdict.places import fingerprint
from splitcheck.verdict.return_ways import Nets, ReturnWay, cavities, cheapest_way
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import level, noise_mv

#: Changes between the same islands within this distance of the worst of them are one place, mm.
TOGETHER_MM = 3.0
#: How far the closed forms may be off: over vias, over parts, between the plates alone.
ERRORS = {"via": 0.3, "capacitor": 0.5, "plates": 1.0}
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
    nets = Nets(scene)
    judged = [
        (case, way) for case in cases if (way := _judge(scene, case, nets, dropped)) is not None
    ]
    findings = [_finding(scene, case, ways, nets) for case, ways in judged]
    return gathered(findings, lambda f: f"change {f.islands[0]} to {f.islands[1]}", TOGETHER_MM)


def _judge(scene: Scene, case: Case, nets: Nets, dropped: dict[str, int]) -> list[ReturnWay] | None:
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
        cheapest_way(scene, change, cavity, nets, drive)
        for change in case.changes
        for cavity in cavities(scene, change)
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


def _is_unknown(way: ReturnWay, nets: Nets) -> bool:
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


def _finding(scene: Scene, case: Case, ways: Sequence[ReturnWay], nets: Nets) -> Finding:
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


def _bridge(way: ReturnWay) -> BridgeUse:
    assert way.at is not None
    at = (round(way.at[0], 4), round(way.at[1], 4))
    return BridgeUse("capacitor" if way.kind == "capacitor" else "via", at, way.net)


def _reason(scene: Scene, case: Case, way: ReturnWay, nets: Nets) -> str:
    names = [layer.name for layer in scene.board.stack.layers]
    first, cavity = case.changes[0], way.cavity
    one, other = cavity.one, cavity.other
    if first.hole_mm is None:
        start = f"for {case.gap_mm:.1f} mm"
        ends = "" if len(case.changes) < 2 else " and back"
        start = f"the trace leaves its plane {start}{ends} while another one goes on"
    else:
        start = f"the trace goes from {names[first.layers[0] - 1]} to {names[first.layers[1] - 1]}"
    if one.layer == other.layer:
        start += (
            f"; its return must change on {names[one.layer - 1]} from {in_words(one.net_name)} to "
            f"{in_words(other.net_name)}"
        )
    else:
        start += (
            f"; its return must change between {names[one.layer - 1]} ({in_words(one.net_name)}) "
            f"and {names[other.layer - 1]} ({in_words(other.net_name)}), "
            f"{cavity.plates_mm:.2f} mm apart"
        )
    if cavity.current < 0.995:
        start += f", {100 * cavity.current:.0f} % of it"
    return f"{start}; {_way_in_words(way, nets)}"


def _way_in_words(way: ReturnWay, nets: Nets) -> str:
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
    if " and " in way.net:
        return f"the nearest capacitors that join them, {way.net}, are {where}"
    return f"the nearest capacitor that joins them, {way.net}, is {where}"
