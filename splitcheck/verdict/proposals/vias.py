"""Stitching vias beside a crossing, where both planes have copper of the net and there is room."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from math import hypot

import numpy as np

from splitcheck.loops.bridges import with_via
from splitcheck.loops.ways import heading
from splitcheck.units import Floats
from splitcheck.verdict.findings import Miss, Point, Proposal
from splitcheck.verdict.proposals.case import Case, Shared, best_of, worth_with_neighbours
from splitcheck.verdict.proposals.room import ANTIPAD_MM, HOLE_MM, PAD_MM
from splitcheck.verdict.scene import Scene

#: Places are looked at on circles of these radii round either end of a crossing, mm, ...
CIRCLES_MM = (0.5, 0.75, 1.0, 1.25, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0)
#: ... so many on each, ...
ON_CIRCLE = 16
#: ... and set on this grid, mm.
GRID_MM = 0.05
#: So many free places are tried at either end, this far from one another, mm.
TRIED = 2
PLACES_APART_MM = 0.8
COUNTS = {2: "two", 4: "four"}


class Spot:
    """A free place for a via: which islands it joins, and which pours it opens."""

    def __init__(
        self, at: Point, net: str, islands: frozenset[str], opened: tuple[str, ...]
    ) -> None:
        self.at = at
        self.net = net
        self.islands = islands
        self.opened = opened


def vias(case: Case) -> Iterator[Proposal | Miss]:
    """Propose a via at either end of a crossing, on one side of it or on both, or at one end.

    Four, on both sides at both ends, are tried where two leave more than a note.
    """
    sides = [[_at_end(case, end, side)[:1] for end in (0, 1)] for side in (1, -1)]
    pairs = [[*one, *other] for one, other in sides if one and other]
    if not pairs:
        ends = [(*one, *other) for one, other in zip(*sides, strict=True)]
        pairs = [[one[0], other[0]] for one, other in [ends] if one and other]
    tried = [_valued(case, places) for places in pairs]
    helping = [each for each in tried if isinstance(each[1], Proposal)]
    yield from (told for _, told in tried if isinstance(told, Miss))
    # where two do not help, one of them does not, and of two pairs that do one via leaves more
    if len(helping) == 1 or not pairs:
        free = [(*one, *other) for one, other in zip(*sides, strict=True)]
        helping += [_valued(case, [spots[0]]) for spots in free if spots]
        if not any(free):
            yield _no_place(case)
    best = best_of(shared for shared, _ in helping)
    if len(pairs) == 2 and best is not None and not case.is_enough(best.own):
        shared, proposal = _valued(case, [spot for pair in pairs for spot in pair])
        if shared.gains_on(best):
            helping.append((shared, proposal))
    yield from (told for _, told in helping)


def _no_place(case: Case) -> Miss:
    """Why there is no place for a via at either end: nothing to join, or no room."""
    nets = " or ".join(dict.fromkeys(island.net_name for island in case.islands))
    within = f"within {CIRCLES_MM[-1]:g} mm"
    for end, start in enumerate((case.crossing.before, case.crossing.after)):
        if any(len(ids) > 1 for ids in _joined(case, end, *circles(start))):
            return Miss("via", f"no room {within} where planes of {nets} lie over one another")
    return Miss("via", f"no other plane of {nets} {within} that the return could use")


def _valued(case: Case, places: list[Spot]) -> tuple[Shared, Proposal | Miss]:
    """Vias in some places: what they leave, and the proposal if they gain."""
    shared = worth_with_neighbours(case, stitched(case.scene, places))
    nets = " and ".join(dict.fromkeys(spot.net for spot in places))
    said = words(case, places, nets, "beside the crossing") + shared.words
    return shared, case.proposal("via", [spot.at for spot in places], said, shared.own)


def _at_end(case: Case, end: int, side: int) -> list[Spot]:
    """Free places at one end of the crossing, on one side (1 left, -1 right), nearest first."""
    crossing = case.crossing
    start = crossing.after if end else crossing.before
    (dx, dy), (x, y) = heading(crossing), crossing.at
    xs, ys = circles(start)
    wanted = ((xs - x) * dx + (ys - y) * dy) * (1 if end else -1) > 0
    wanted &= ((ys - y) * dx - (xs - x) * dy) * side > 0
    xs, ys = xs[wanted], ys[wanted]
    return spots(case, case.islands[end].net_name, xs, ys, _joined(case, end, xs, ys))


def circles(start: Point) -> tuple[Floats, Floats]:
    """Places round another one on the grid, nearest first, shape (n,) each."""
    angles = np.arange(ON_CIRCLE) * (2 * np.pi / ON_CIRCLE)
    radii = np.array(CIRCLES_MM)[:, None]
    xs = start[0] + (radii * np.cos(angles)).ravel()
    ys = start[1] + (radii * np.sin(angles)).ravel()
    xs, ys = (np.round(values / GRID_MM) * GRID_MM for values in (xs, ys))
    order = np.argsort(np.hypot(xs - start[0], ys - start[1]), kind="stable")
    return xs[order], ys[order]


def spots(
    case: Case, net: str, xs: Floats, ys: Floats, joined: Sequence[frozenset[str]]
) -> list[Spot]:
    """The first free places for a via of a net among some that join islands."""
    found: list[Spot] = []
    hopeless = case.room.hopeless_vias(xs, ys).tolist()
    for x, y, islands, no in zip(xs.tolist(), ys.tolist(), joined, hopeless, strict=True):
        at = (round(x, 4), round(y, 4))
        near = any(hypot(x - spot.at[0], y - spot.at[1]) < PLACES_APART_MM for spot in found)
        if len(islands) < 2 or near or no:
            continue
        opened = case.room.via(at, net)
        if opened is not None:
            found.append(Spot(at, net, islands, opened))
        if len(found) == TRIED:
            break
    return found


def stitched(scene: Scene, chosen: Sequence[Spot]) -> Scene:
    """The scene with vias in some places."""
    graph = scene.graph
    for spot in chosen:
        graph = with_via(graph, sorted(spot.islands), spot.at, HOLE_MM)
    return replace(scene, graph=graph)


def met_by(case: Case, net: str, xs: Floats, ys: Floats) -> list[set[str]]:
    """Ids of the islands of a net that a via at each place would touch."""
    met: list[set[str]] = [set() for _ in xs]
    for plane in case.scene.planes.values():
        for i, number in enumerate(plane.island_at(xs, ys).tolist()):
            if number >= 0 and plane.islands[number].net_name == net:
                met[i].add(plane.islands[number].id)
    return met


def _joined(case: Case, end: int, xs: Floats, ys: Floats) -> list[frozenset[str]]:
    """Ids of the islands that a via at each place would join; none where that is of no use."""
    own = case.islands[end]
    return [
        frozenset(ids)
        if own.id in ids and any(_helps(case, case.island(name).layer) for name in ids)
        else frozenset()
        for ids in met_by(case, own.net_name, xs, ys)
    ]


def _helps(case: Case, layer: int) -> bool:
    """Whether the solve sees a way over a layer: the whole plane beyond, or the trace's own side.

    The plane on the trace's other side carries its share as it is, and what lies farther off is
    behind another plane.
    """
    item, plane = case.item, case.crossing.plane
    assert item is not None
    if layer in {plane, item.other}:
        return False
    return layer == item.beyond or (layer > plane) == (case.crossing.layer > plane)


def words(case: Case, chosen: Sequence[Spot], net: str, why: str) -> str:
    """What to put where, in one sentence."""
    islands = {island for spot in chosen for island in spot.islands}
    layers = sorted({case.island(island).layer for island in islands})
    joined = " and ".join(case.layer_name(layer) for layer in layers)
    places = " and ".join(f"x {spot.at[0]:.2f} y {spot.at[1]:.2f}" for spot in chosen)
    count = "one stitching via" if len(chosen) == 1 else f"{COUNTS[len(chosen)]} stitching vias"
    said = (
        f"{count} of {net} ({HOLE_MM:g} mm hole, {PAD_MM:g} mm pad) at {places}, "
        f"joining {joined} {why}"
    )
    opened = sorted({name for spot in chosen for name in spot.opened})
    if opened:
        said += f"; opens {', '.join(opened)} by {ANTIPAD_MM:g} mm"
    return said
