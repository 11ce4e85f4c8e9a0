"""A capacitor across a split between two nets, where its pads and vias have room."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from math import hypot
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString

from splitcheck.loops.bridges import IslandGraph, with_capacitor
from splitcheck.loops.mounted import STRIP_MM, mounted_nh
from splitcheck.loops.ways import heading
from splitcheck.planes.islands import Island
from splitcheck.units import Floats
from splitcheck.verdict.findings import Miss, Point, Proposal
from splitcheck.verdict.proposals.case import Case, Shared, best_of, worth_with_neighbours
from splitcheck.verdict.proposals.room import HOLE_MM, PAD_MM
from splitcheck.verdict.proposals.vias import circles

#: Pads of an 0603 part: sides, and distance of their middles (common practice, no source).
PAD_SIDES_MM = (0.8, 0.9)
PADS_APART_MM = 1.6
#: Distance from a pad's middle to that of its via: both pads touch, and no hole is in the part's.
TO_VIA_MM = 0.8
#: Directions in which a part is laid where it need not lie along the trace.
ORIENTATIONS: tuple[Point, ...] = ((1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0))
#: So far to either side of the trace places are looked at, mm, in these steps.
FARTHEST_MM = 10.0
STEP_MM = 0.25
#: Split planes are looked for so far before and after the gap, mm.
ACROSS_MM = 4.0
#: So many free places are tried, this far from one another, mm.
TRIED = 2
PLACES_APART_MM = 3.0
#: Two parts side by side are this far apart: their pads keep the clearance, mm.
PARTS_APART_MM = 1.2


class Mount(NamedTuple):
    """A place for a capacitor."""

    layer: int
    """The outer layer that it is on."""
    pads: tuple[Point, Point]
    """Middles of its two pads."""
    down: tuple[Point, Point]
    """Where its current leaves the one plane and enters the other."""
    opened: tuple[str, ...]
    """Foreign pours that must be opened for it."""
    value_nh: float
    """Its inductance as mounted."""


def capacitors(case: Case) -> Iterator[Proposal | Miss]:
    """Propose a capacitor beside the trace, nearest places first.

    Where one leaves more than a note, two are tried: one on either side of the trace, or of all
    the traces that cross the gap side by side, where there is room.
    """
    one, other = case.islands
    if one.id == other.id or one.net_name == other.net_name:
        yield Miss("capacitor", f"both sides are one net, {one.net_name}")
        return
    left, right = _mounts(case, 1), _mounts(case, -1)
    if not left and not right:
        left = list(mounts_near(case, case.crossing.at, case.islands))
    if not left and not right:
        within = f"within {FARTHEST_MM:g} mm along the gap"
        yield Miss("capacitor", f"no room for its pads and vias {within}")
    singles = (left[:1] + _apart(left[:1], right))[:2] if left and right else left + right
    tried = [_valued(case, [mount]) for mount in singles]
    best = best_of(shared for shared, _ in tried)
    if len(singles) == 2 and (best is None or not case.is_enough(best.own)):
        shared, proposal = _valued(case, singles)
        if best is None or shared.gains_on(best):
            tried.append((shared, proposal))
    yield from (told for _, told in tried)


def _apart(left: Sequence[Mount], right: Sequence[Mount]) -> list[Mount]:
    """Those on the right that do not lie across one on the left."""
    (x0, y0), (x1, y1) = left[0].pads
    at = (x0 + x1) / 2, (y0 + y1) / 2
    return [
        mount
        for mount in right
        if hypot(
            sum(x for x, _ in mount.pads) / 2 - at[0], sum(y for _, y in mount.pads) / 2 - at[1]
        )
        >= PARTS_APART_MM
    ]


def _valued(case: Case, mounts: Sequence[Mount]) -> tuple[Shared, Proposal | Miss]:
    """Capacitors in some places: what they leave, and the proposal if they gain."""
    one, other = case.islands
    graph = with_mounts(case.scene.graph, one, other, mounts)
    shared = worth_with_neighbours(case, replace(case.scene, graph=graph))
    said = mount_words(case, mounts, one.net_name, other.net_name)
    places = [pad for mount in mounts for pad in mount.pads]
    return shared, case.proposal("capacitor", places, said + shared.words, shared.own)


def with_mounts(
    graph: IslandGraph, one: Island, other: Island, mounts: Sequence[Mount]
) -> IslandGraph:
    """The graph of islands with capacitors between two of them in some places."""
    for number, mount in enumerate(mounts, start=1):
        graph = with_capacitor(
            graph,
            one.id,
            other.id,
            *mount.down,
            mount.value_nh,
            layer=mount.layer,
            ref=f"new capacitor {number}",
        )
    return graph


def mounts_near(case: Case, start: Point, islands: tuple[Island, Island]) -> Iterator[Mount]:
    """Free places round another one for a part whose vias go down to two islands, nearest first.

    Parameters
    ----------
    start
        Where it should be, mm.
    islands
        What it joins: beside one another in one plane, or one over the other.
    """
    stack = case.scene.board.stack
    outer = [n for n in (1, len(stack.layers)) if n not in {island.layer for island in islands}]
    outer.sort(key=lambda n: (sum(abs(n - island.layer) for island in islands), n))
    xs, ys = circles(start)
    reach = PADS_APART_MM / 2 + TO_VIA_MM
    taken: list[Point] = []
    lands = {
        ahead: _lands(case, islands, xs, ys, reach * np.array(ahead)) for ahead in ORIENTATIONS
    }
    taken_by = {
        (layer, ahead): _hopeless(case, islands, layer, xs, ys, np.array(ahead))
        for layer in outer
        for ahead in ORIENTATIONS
    }
    for i, place in enumerate(zip(xs.tolist(), ys.tolist(), strict=True)):
        if any(hypot(place[0] - x, place[1] - y) < PLACES_APART_MM for x, y in taken):
            continue
        ways = [
            (layer, ahead)
            for layer in outer
            for ahead in ORIENTATIONS
            if lands[ahead][i] and not taken_by[layer, ahead][i]
        ]
        mounts = (_mount_at(case, place, layer, ahead, islands) for layer, ahead in ways)
        mount = next((mount for mount in mounts if mount is not None), None)
        if mount is not None:
            yield mount
            taken.append(place)
        if len(taken) == TRIED:
            return


def _lands(
    case: Case, islands: tuple[Island, Island], xs: Floats, ys: Floats, reach: Floats
) -> NDArray[np.bool_]:
    """For each place whether vias so far before and after it would come down on the islands."""
    on = np.ones(len(xs), dtype=np.bool_)
    for sign, island in zip((-1, 1), islands, strict=True):
        on &= ~case.room.hopeless_vias(xs + sign * reach[0], ys + sign * reach[1])
        plane = case.scene.planes[island.layer]
        found = plane.island_at(xs + sign * reach[0], ys + sign * reach[1])
        ids = np.array([each.id == island.id for each in plane.islands] + [False])
        on &= ids[found]
    return on


def _hopeless(
    case: Case, islands: tuple[Island, Island], layer: int, xs: Floats, ys: Floats, ahead: Floats
) -> NDArray[np.bool_]:
    """For each place whether other copper lies where a part's pads would: a quick look first."""
    found = np.zeros(len(xs), dtype=np.bool_)
    pad = PADS_APART_MM / 2 * ahead
    half = min(PAD_SIDES_MM) / 2
    for sign, island in zip((-1, 1), islands, strict=True):
        places = xs + sign * pad[0], ys + sign * pad[1]
        found |= case.room.hopeless(*places, layer, island.net_name, half)
    return found


def _mount_at(
    case: Case, middle: Point, layer: int, ahead: Point, islands: tuple[Island, Island]
) -> Mount | None:
    """A part in one place and direction, if all of it has room."""
    half, reach = PADS_APART_MM / 2, PADS_APART_MM / 2 + TO_VIA_MM
    at, along = np.array(middle), np.array(ahead)
    pads = (_place(at - half * along), _place(at + half * along))
    down = (_place(at - reach * along), _place(at + reach * along))
    opened: list[str] = []
    for end, island in enumerate(islands):
        found = room_for_end(case, layer, island.net_name, pads[end], down[end], ahead)
        if found is None:
            return None
        opened.extend(found)
    # what a hole runs on between two planes is the spreading between them, counted there
    depth = min(case.scene.board.stack.height_mm(layer, island.layer) for island in islands)
    value = mounted_nh(2 * reach, (depth, depth), HOLE_MM)
    return Mount(layer, pads, down, tuple(sorted(set(opened))), value)


def _mounts(case: Case, side: int) -> list[Mount]:
    """Free places for a capacitor on one side of the trace (1 left, -1 right), nearest first.

    They are looked for so far beyond the outermost trace that crosses the gap nearby.
    """
    outer = (1, len(case.scene.board.stack.layers))
    layers = sorted(outer, key=lambda n: (abs(n - case.crossing.plane), n))
    found: list[Mount] = []
    last = -PLACES_APART_MM
    farthest = _bus_mm(case, side) + FARTHEST_MM
    for aside in np.arange(0.0 if side > 0 else STEP_MM, farthest + STEP_MM / 2, STEP_MM).tolist():
        if aside - last < PLACES_APART_MM:
            continue
        across = _across(case, side * aside)
        if across is None:
            continue
        mounts = (_mount(case, layer, *across) for layer in layers)
        mount = next((mount for mount in mounts if mount is not None), None)
        if mount is not None:
            found.append(mount)
            last = aside
        if len(found) == TRIED:
            break
    return found


def _bus_mm(case: Case, side: int) -> float:
    """How far the other crossings of the gap reach to one side of the trace, mm."""
    (dx, dy), (x, y) = heading(case.crossing), case.crossing.at
    off = [((c.at[1] - y) * dx - (c.at[0] - x) * dy) * side for c in case.beside]
    return max(0.0, *off) if off else 0.0


def _across(case: Case, aside: float) -> tuple[Floats, Floats] | None:
    """Where both planes begin, so far aside of the trace; None if they do not face each other."""
    (dx, dy), at = heading(case.crossing), np.array(case.crossing.at)
    ahead, left = np.array([dx, dy]), np.array([-dy, dx])
    steps = np.linspace(-ACROSS_MM, ACROSS_MM, 161)
    places = at + aside * left + steps[:, None] * ahead
    islands = case.plane.island_at(places[:, 0], places[:, 1])
    one, other = case.crossing.islands
    start = np.flatnonzero(islands == one)
    stop = np.flatnonzero(islands == other)
    stop = stop[stop > start.max(initial=-1)]
    if not len(start) or not len(stop):
        return None
    start = start[start < stop[0]]
    return places[start[-1]], places[stop[0]]


def _mount(case: Case, layer: int, start: Floats, stop: Floats) -> Mount | None:
    """A part across the gap on one outer layer, if all of it has room."""
    gap = float(np.hypot(*(stop - start)))
    ahead = np.array(heading(case.crossing))
    middle = (start + stop) / 2
    on_layer = layer == case.crossing.plane
    half = PADS_APART_MM / 2
    if on_layer and gap / 2 + PAD_SIDES_MM[0] / 2 > half + PAD_SIDES_MM[0] / 4:
        return None  # the pads would not land on the planes
    reach = half if on_layer else max(half + TO_VIA_MM, gap / 2 + PAD_MM)
    pads = tuple(_place(middle + sign * half * ahead) for sign in (-1, 1))
    down = tuple(_place(middle + sign * reach * ahead) for sign in (-1, 1))
    opened: list[str] = []
    for end in (0, 1):
        found = _room(case, layer, end, pads[end], down[end], on_layer=on_layer)
        if found is None:
            return None
        opened.extend(found)
    stack = case.scene.board.stack
    depth = 0.0 if on_layer else stack.height_mm(layer, case.crossing.plane)
    value = mounted_nh(2 * reach, (depth, depth), HOLE_MM)
    return Mount(layer, (pads[0], pads[1]), (down[0], down[1]), tuple(sorted(set(opened))), value)


def _room(
    case: Case, layer: int, end: int, pad: Point, down: Point, *, on_layer: bool
) -> tuple[str, ...] | None:
    """Pours that one end of a capacitor opens; None where it has no room."""
    number = int(case.plane.island_at(np.array([down[0]]), np.array([down[1]]))[0])
    if number != case.crossing.islands[end]:
        return None
    ahead = heading(case.crossing)
    return room_for_end(
        case, layer, case.islands[end].net_name, pad, None if on_layer else down, ahead
    )


def room_for_end(
    case: Case, layer: int, net: str, pad: Point, down: Point | None, ahead: Point
) -> tuple[str, ...] | None:
    """Pours that a pad of a net, its via and the strip between them open; None: no room.

    Parameters
    ----------
    layer
        The outer layer that the part is on.
    pad, down
        Middle of the pad, and the via that leads on from it, if one does, mm.
    ahead
        Unit vector along the part.
    """
    wide, high = PAD_SIDES_MM
    half = np.array(ahead) * wide / 2
    copper = LineString([pad - half, pad + half]).buffer(high / 2, cap_style="flat")
    if down is None:
        return case.room.openings(copper, layer, net)
    strip = LineString([pad, down]).buffer(STRIP_MM / 2)
    found = case.room.openings(shapely.union(copper, strip), layer, net)
    if found is None:
        return None
    through = case.room.via(down, net)
    return None if through is None else (*found, *through)


def _place(at: Floats) -> Point:
    return round(float(at[0]), 3), round(float(at[1]), 3)


def mount_words(case: Case, mounts: Sequence[Mount], one: str, other: str) -> str:
    """What to put where, in one sentence."""
    placed = [_place_words(case, mount, one, other) for mount in mounts]
    said = "a capacitor (0603) " + ", and another ".join(placed)
    values = " and ".join(dict.fromkeys(f"{mount.value_nh:.2f} nH" for mount in mounts))
    said += f"; taken as {values}{' each' if len(mounts) > 1 else ''} as mounted"
    opened = sorted({name for mount in mounts for name in mount.opened})
    return f"{said}; opens {', '.join(opened)}" if opened else said


def _place_words(case: Case, mount: Mount, one: str, other: str) -> str:
    (x0, y0), (x1, y1) = mount.pads
    said = (
        f"on {case.layer_name(mount.layer)} from {one} at "
        f"x {x0:.2f} y {y0:.2f} to {other} at x {x1:.2f} y {y1:.2f}"
    )
    if mount.down != mount.pads:
        (x0, y0), (x1, y1) = mount.down
        said += f", its vias at x {x0:.2f} y {y0:.2f} and x {x1:.2f} y {y1:.2f}"
    return said
