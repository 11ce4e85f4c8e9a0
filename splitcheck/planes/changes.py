"""Changes of plane: plated holes where a trace goes to a layer whose return other planes carry."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from math import hypot
from typing import NamedTuple

import numpy as np
from scipy.spatial import cKDTree

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Ints, Tracks
from splitcheck.units import Floats

#: A trace that ends this near to the wall of a plated hole ends in its pad, mm.
RING_MM = 0.4
#: The planes of a trace are looked at from so far off the hole, beyond its antipad, to so far, mm,
#: in steps of so much.
LOOK_FROM_MM = 0.7
LOOK_TO_MM = 3.0
LOOK_STEP_MM = 0.25
#: A trace that is shorter than this on one of its layers ends in a part's pad there, mm: its return
#: goes through the part, not through the plane.
STUB_MM = 1.0
#: Planes carry a return near a hole if they cover this share of the places looked at.
COVERS = 0.5
#: A move of less than this share of the return is no change.
LEAST_SHARE = 0.1
#: No more pieces of trace than this are followed from one hole on one layer.
MOST_PIECES = 12


class Carry(NamedTuple):
    """A part of a return on one island."""

    layer: int
    island: int
    """Index of the island in its plane."""
    share: float


@dataclass(frozen=True, slots=True)
class PlaneChange:
    """A place where the return of a trace must go from some islands to others."""

    net: int
    at: Point
    """Centre of the plated hole, or where the trace leaves the plane, mm."""
    hole_mm: float | None
    """Diameter of the hole; None where the trace stays in its layer."""
    layers: tuple[int, int]
    """Layers of the trace before and after, the upper one first."""
    before: tuple[Carry, ...]
    after: tuple[Carry, ...]
    line: int
    """Line in the Gerber file of the first of the two layers."""
    width_mm: float = 0.0
    """Width of the trace: of the narrower one of the two layers."""

    @property
    def moved(self) -> dict[tuple[int, int], float]:
        """By island: how much more of the return it carries after than before."""
        shares: dict[tuple[int, int], float] = defaultdict(float)
        for sign, carries in ((-1.0, self.before), (1.0, self.after)):
            for carry in carries:
                shares[carry.layer, carry.island] += sign * carry.share
        return {key: share for key, share in sorted(shares.items()) if abs(share) > 1e-9}

    @property
    def share(self) -> float:
        """How much of the return moves altogether, 0 to 1."""
        return sum(share for share in self.moved.values() if share > 0)


class _Look(NamedTuple):
    """Places along the traces that leave one hole on one layer."""

    hole: int
    layer: int
    line: int
    width_mm: float
    reach_mm: float
    """How far the traces go, at most to where looking ends."""
    places: list[Point]


def find_changes(
    board: Board, planes: Sequence[Plane], tracks: Sequence[Tracks]
) -> tuple[PlaneChange, ...]:
    """Find the plated holes where the return of a trace must change planes.

    Parameters
    ----------
    board
        The board with its holes.
    planes
        All planes.
    tracks
        The traces that are judged, layer by layer.

    Returns
    -------
    By hole and layers. Not among them are holes whose two layers lie over the two faces of one
    plane: there the return goes round the rim of the antipad.

    Notes
    -----
    (1) A hole is looked at for each two neighbours among the layers where traces of its net end in
    it. (2) On each layer the nearest plane above and below carry, with shares as between two
    planes, 1 - h1/(h1 + h2). (3) What an island carries more after than before has moved there.
    """
    looks = list(_looks(board, tracks))
    carried = _carried(board, planes, looks)
    by_hole: dict[int, list[int]] = defaultdict(list)
    for number, look in enumerate(looks):
        by_hole[look.hole].append(number)
    found = []
    for hole, numbers in sorted(by_hole.items()):
        own = sorted(numbers, key=lambda n: looks[n].layer)
        for one, other in pairwise(own):
            change = PlaneChange(
                board.holes[hole].net,
                board.holes[hole].at,
                board.holes[hole].hole.diameter_mm,
                (looks[one].layer, looks[other].layer),
                carried[one],
                carried[other],
                looks[one].line,
                min(looks[one].width_mm, looks[other].width_mm),
            )
            if carried[one] and carried[other] and change.share >= LEAST_SHARE:
                found.append(change)
    return tuple(found)


def carries_at(
    board: Board, planes: Sequence[Plane], stretches: Sequence[tuple[int, Sequence[Point]]]
) -> list[tuple[Carry, ...]]:
    """The islands that carry the return along stretches of trace, with their shares.

    Parameters
    ----------
    board, planes
        The board and all its planes.
    stretches
        Of each the layer and places along it.

    Returns
    -------
    For every stretch its islands, empty where no plane covers most of its places.
    """
    looks = [_Look(0, layer, 0, 0.0, 0.0, list(places)) for layer, places in stretches]
    return _carried(board, planes, looks)


def _looks(board: Board, tracks: Sequence[Tracks]) -> Iterator[_Look]:
    """For every hole that joins traces of several layers, where to look on each."""
    holes = [number for number, hole in enumerate(board.holes) if len(hole.layers) > 1]
    if not holes:
        return
    at = np.array([board.holes[number].at for number in holes])
    reach = np.array([board.holes[number].hole.diameter_mm / 2 + RING_MM for number in holes])
    ends: dict[int, list[tuple[Tracks, list[int]]]] = defaultdict(list)
    for layer in tracks:
        if not len(layer.net):
            continue
        places, nets = _nodes(layer)
        near = cKDTree(places).query_ball_point(at, reach)
        for number, nodes in zip(holes, near, strict=True):
            own = sorted(node for node in nodes if nets[node] == board.holes[number].net)
            if own:
                ends[number].append((layer, own))
    for number in sorted(ends):
        looks = [_look(board, number, layer, nodes) for layer, nodes in ends[number]]
        looks = [look for look in looks if look.reach_mm >= STUB_MM]
        if len(looks) > 1:
            yield from looks


def _nodes(tracks: Tracks) -> tuple[Floats, Ints]:
    """Place and net of every node of a layer's traces."""
    count = int(tracks.nodes.max()) + 1
    places, nets = np.zeros((count, 2)), np.zeros(count, dtype=np.intp)
    for end, points in ((0, tracks.start), (1, tracks.end)):
        places[tracks.nodes[:, end]] = points
        nets[tracks.nodes[:, end]] = tracks.net
    return places, nets


def _look(board: Board, hole: int, tracks: Tracks, nodes: Sequence[int]) -> _Look:
    """Walk along the traces from a hole and note places at even steps."""
    x, y = board.holes[hole].at
    places: list[Point] = []
    farthest, line = 0.0, 0
    walk = [(node, 0.0) for node in nodes]
    seen: set[int] = set()
    while walk and len(seen) < MOST_PIECES:
        node, walked = walk.pop(0)
        for piece in tracks.at_node(node):
            if piece in seen:
                continue
            seen.add(piece)
            line = line or int(tracks.line[piece])
            first = int(tracks.nodes[piece, 0]) == node
            length = float(tracks.length_mm[piece])
            for step in np.arange(LOOK_STEP_MM / 2, length, LOOK_STEP_MM).tolist():
                if walked + step > LOOK_TO_MM:
                    break
                part = step / length
                place = tracks.point(piece, part if first else 1.0 - part)
                if hypot(place[0] - x, place[1] - y) >= LOOK_FROM_MM:
                    places.append(place)
            farthest = max(farthest, min(walked + length, LOOK_TO_MM))
            if walked + length < LOOK_TO_MM:
                walk.append((int(tracks.nodes[piece, 1 if first else 0]), walked + length))
    width = float(tracks.width_mm[sorted(seen)].min(initial=np.inf))
    return _Look(hole, tracks.layer, line, width, farthest, places)


def _carried(
    board: Board, planes: Sequence[Plane], looks: Sequence[_Look]
) -> list[tuple[Carry, ...]]:
    """For every look the islands that carry, nearest plane first."""
    found: list[tuple[Carry, ...]] = [()] * len(looks)
    for layer in sorted({look.layer for look in looks}):
        which = [number for number, look in enumerate(looks) if look.layer == layer]
        places = [place for number in which for place in looks[number].places]
        counts = [len(looks[number].places) for number in which]
        if not places:
            continue
        points = np.array(places)
        sides = [_nearest(planes, layer, side, points) for side in (-1, 1)]
        start = 0
        for number, count in zip(which, counts, strict=True):
            most = [_most(side[start : start + count]) for side in sides]
            found[number] = _shared(board, layer, [key for key in most if key is not None])
            start += count
    return found


def _nearest(planes: Sequence[Plane], layer: int, side: int, points: Floats) -> Ints:
    """Layer and island of the nearest plane on one side of every point, -1 where none is."""
    found = np.full((len(points), 2), -1, dtype=np.intp)
    bare = np.arange(len(points))
    on_side = [plane for plane in planes if (plane.layer - layer) * side > 0]
    for plane in sorted(on_side, key=lambda plane: abs(plane.layer - layer)):
        if not len(bare):
            break
        island = plane.island_at(points[bare, 0], points[bare, 1])
        hit = island >= 0
        found[bare[hit], 0] = plane.layer
        found[bare[hit], 1] = island[hit]
        bare = bare[~hit]
    return found


def _most(rows: Ints) -> tuple[int, int] | None:
    """The island under most of some places, if it and others cover enough of them."""
    covered = rows[rows[:, 0] >= 0]
    if not len(rows) or len(covered) < COVERS * len(rows):
        return None
    keys, counts = np.unique(covered, axis=0, return_counts=True)
    best = keys[int(np.argmax(counts))]
    return int(best[0]), int(best[1])


def _shared(board: Board, layer: int, keys: Sequence[tuple[int, int]]) -> tuple[Carry, ...]:
    """One or two islands with their shares of the return."""
    if len(keys) < 2:
        return tuple(Carry(*key, 1.0) for key in keys)
    near = [board.stack.height_mm(layer, key[0]) for key in keys]
    shares = [near[1] / sum(near), near[0] / sum(near)]
    carries = [Carry(*key, share) for key, share in zip(keys, shares, strict=True)]
    return tuple(sorted(carries, key=lambda carry: (-carry.share, carry.layer)))
