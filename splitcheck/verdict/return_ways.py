"""Ways of a return from plane to plane: over holes, over parts, or between the plates."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from itertools import pairwise
from math import hypot
from typing import NamedTuple

import networkx as nx
import numpy as np

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import all_parts, bridges_between
from splitcheck.loops.handover import between_plates_nh, line_nh, plates_nf, shared_nh
from splitcheck.planes.changes import PlaneChange
from splitcheck.planes.islands import Island
from splitcheck.units import INCH_MM
from splitcheck.verdict.rules import Class
from splitcheck.verdict.scene import Scene

#: So many of the nearest holes, or of the nearest parts, share a return.
MOST_HOLES = 8
MOST_PARTS = 12
#: Capacitors farther away than this, mm for each ns of rise time, come too late (S. Weir, si-list,
#: 16 Oct 2008: 1 inch a ns).
PARTS_MM_NS = INCH_MM
#: A change of less than this share of the return counts for nothing.
LEAST_SHARE = 0.1
#: Barrel of a part's hole, mm (common practice, no source).
PART_HOLE_MM = 0.3

#: Layer of a plane and index of an island in it.
_Key = tuple[int, int]


class Cavity(NamedTuple):
    """Two islands, one over the other, between which a part of the return must go."""

    one: Island
    other: Island
    current: float
    plates_mm: float


class ReturnWay(NamedTuple):
    """What one cavity costs, and the way that is taken."""

    cavity: Cavity
    added_nh: float
    """Above what a return via at the distance of the rules would cost."""
    kind: str
    """``via``, ``capacitor`` or ``plates``."""
    at: Point | None
    far_mm: float | None
    net: str


def cavities(scene: Scene, change: PlaneChange) -> Iterator[Cavity]:
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
) -> Iterator[Cavity]:
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
            yield Cavity(islands[one], islands[other], min(lost, gained), height)
        carried += gained - lost
        if number + 1 < len(layers) and abs(carried) >= LEAST_SHARE:
            below = by_layer[layers[number + 1]]
            one, other = (max(some, key=lambda key: abs(some[key])) for some in (here, below))
            apart = stack.height_mm(layer, layers[number + 1])
            yield Cavity(islands[one], islands[other], abs(carried), apart)


class _Part(NamedTuple):
    """A part between two nets, or two parts over a third net."""

    at: Point
    ref: str
    mounted_nh: float


class Nets:
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


def _parts_between(nets: Nets, one: int, other: int, at: Point) -> list[_Part]:
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


def cheapest_way(
    scene: Scene, change: PlaneChange, cavity: Cavity, nets: Nets, drive: Class
) -> ReturnWay:
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
            return ReturnWay(cavity, added, "via", at, _far_mm(change.at, at), cavity.one.net_name)
    area_mm2, facing_mm, er = nets.facing(cavity.one.net, cavity.other.net)
    plates = between_plates_nh(
        wide, cavity.plates_mm, area_mm2, drive.rise_ns, plates_nf(area_mm2, facing_mm, er)
    )
    best = ReturnWay(cavity, square * max(plates - base, 0.0), "plates", None, None, "")
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
            return ReturnWay(cavity, added, "capacitor", part.at, far, part.ref)
        best = best._replace(net=part.ref, far_mm=far)
    return best


def _holes(scene: Scene, cavity: Cavity, at: Point) -> list[tuple[Point, float, float]]:
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
