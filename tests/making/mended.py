"""A board plan with a proposal carried out, as a person would from its words and places alone."""

from __future__ import annotations

import re
from dataclasses import replace
from math import dist

import shapely
from shapely import LineString

from fixtures.making.plan import BoardPlan, Hole, Pad, Point, Pour, Ring, Trace
from splitcheck.verdict.findings import Finding, Proposal

#: Pad and opening of a stitching via, sides of a capacitor's pads and width of its copper, mm.
PAD_MM, ANTIPAD_MM, SIDES_MM, STRIP_MM = 0.6, 1.0, (0.8, 0.9), 0.5
CLEAR_MM = 0.2
NUMBER = r"(-?\d+\.?\d*)"
PLACE = rf"x {NUMBER} y {NUMBER}"


def mended(plan: BoardPlan, finding: Finding, proposal: Proposal) -> BoardPlan:
    """The plan with one proposal carried out."""
    layers = {sheet.name: number for number, sheet in enumerate(plan.sheets, start=1)}
    match proposal.what:
        case "via":
            return _vias(plan, proposal)
        case "capacitor":
            return _capacitor(plan, proposal, layers)
        case "move":
            return _moved(plan, finding, proposal, layers)
        case "copper":
            return _copper(plan, finding, proposal, layers)


def _places(words: str) -> list[Point]:
    return [(float(x), float(y)) for x, y in re.findall(PLACE, words)]


def _word(pattern: str, words: str) -> str:
    found = re.search(pattern, words)
    assert found is not None, words
    return found[1]


def _via(net: str, at: Point) -> Hole:
    return Hole(at, net, 0.3, PAD_MM, ANTIPAD_MM)


def _vias(plan: BoardPlan, proposal: Proposal) -> BoardPlan:
    net = _word(r"stitching vias? of (\S+) \(", proposal.words)
    places = _places(proposal.words)
    assert [tuple(at) for at in proposal.at_mm] == places
    return replace(plan, holes=(*plan.holes, *(_via(net, at) for at in places)))


def _capacitor(plan: BoardPlan, proposal: Proposal, layers: dict[str, int]) -> BoardPlan:
    """Each capacitor with its pads, its vias and the copper between them."""
    said = rf"on (\S+) from (\S+) at {PLACE} to (\S+) at {PLACE}, its vias at {PLACE} and {PLACE}"
    found = re.findall(said, proposal.words)
    assert 2 * len(found) == len(proposal.at_mm), proposal.words
    for number, (name, one, x0, y0, other, x1, y1, *down) in enumerate(found):
        layer, ref = layers[name], f"C{99 - number}"
        ends = ((one, x0, y0, *down[:2]), (other, x1, y1, *down[2:]))
        for pin, (net, *numbers) in zip("12", ends, strict=True):
            x, y, via_x, via_y = map(float, numbers)
            plan = replace(
                plan,
                pads=(*plan.pads, Pad(layer, net, (x, y), SIDES_MM, ref, pin)),
                holes=(*plan.holes, _via(net, (via_x, via_y))),
                traces=(*plan.traces, Trace(layer, net, ((x, y), (via_x, via_y)), STRIP_MM)),
            )
    return plan


def _moved(
    plan: BoardPlan, finding: Finding, proposal: Proposal, layers: dict[str, int]
) -> BoardPlan:
    way = _places(proposal.words)
    traces = []
    for trace in plan.traces:
        line = LineString(trace.points)
        own = trace.net == finding.net and trace.layer == layers[finding.layer]
        ends = [line.project(shapely.Point(at)) for at in (way[0], way[-1])]
        if not own or line.distance(shapely.Point(finding.at_mm)) > 1e-3:
            traces.append(trace)
            continue
        inner = way if ends[0] < ends[1] else way[::-1]
        corners = [(line.project(shapely.Point(point)), point) for point in trace.points]
        before = [point for along, point in corners if along < min(ends)]
        after = [point for along, point in corners if along > max(ends)]
        traces.append(trace._replace(points=(*before, *inner, *after)))
    return replace(plan, traces=tuple(traces))


def _copper(
    plan: BoardPlan, finding: Finding, proposal: Proposal, layers: dict[str, int]
) -> BoardPlan:
    net = _word(r"of (\S+) on", proposal.words)
    layer = layers[_word(r" on (\S+?),? ", proposal.words)]
    if "to either side" in proposal.words:
        half = float(_word(rf"{NUMBER} mm to either side", proposal.words))
        (x0, y0), (x1, y1) = _places(proposal.words)
        box = shapely.box(x0, y0, x1, y1)
        own = [
            LineString(trace.points).intersection(box.buffer(0.01))
            for trace in plan.traces
            if trace.net == finding.net and layers[finding.layer] == trace.layer
        ]
        area = shapely.union_all(own).buffer(half, quad_segs=4, join_style="mitre")
    else:
        wide = float(_word(rf"{NUMBER} mm wide", proposal.words))
        area = LineString(_places(proposal.words)).buffer(wide / 2, cap_style="flat")
    ring: Ring = tuple((x, y) for x, y in shapely.get_coordinates(area).tolist())
    holes = tuple(
        hole._replace(antipad_mm=min(hole.antipad_mm, hole.pad_mm + 2 * CLEAR_MM))
        if hole.net != net and area.distance(shapely.Point(hole.at)) < hole.antipad_mm / 2
        else hole
        for hole in plan.holes
    )
    return replace(plan, pours=(*plan.pours, Pour(layer, net, ring)), holes=holes)


def nearest(findings: tuple[Finding, ...], like: Finding, within_mm: float) -> Finding | None:
    """The finding of the same net that lies nearest to where one was."""
    own = [f for f in findings if f.net == like.net and f.layer == like.layer]
    near = [f for f in own if dist(f.at_mm, like.at_mm) <= within_mm]
    return min(near, key=lambda f: dist(f.at_mm, like.at_mm), default=None)
