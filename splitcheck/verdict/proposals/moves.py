"""Moving the trace aside, past the end of the gap."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import pairwise
from math import ceil, inf
from typing import NamedTuple

import networkx as nx
import numpy as np
import shapely
from shapely import LineString
from shapely.ops import substring

from splitcheck.loops.ways import heading
from splitcheck.planes.tracks import Tracks, redrawn
from splitcheck.units import Floats, segments
from splitcheck.verdict.findings import Miss, Point, Proposal
from splitcheck.verdict.proposals.case import Case, telling, worth_after

#: A trace is not moved farther than this, mm.
FARTHEST_MM = 10.0
#: Edges of a moved trace are kept so many heights beyond the gap's end, if there is room: the
#: first is a maker's rule for impedance, the last where added inductance ends.
HEIGHTS_BEYOND = (5.0, 2.0, 1.0)
#: The piece that is moved begins and ends one of these far beyond the gap, mm.
ROOMS_MM = (1.0, 1.5, 2.0, 3.0, 4.0)
#: Room for a move is looked at in steps of this, mm.
ROOM_STEP_MM = 0.25
#: A direction is along one axis alone if less than this is along the other: sin 22.5 degrees.
SIN_EIGHTH = 0.383
#: A path lies along a piece of trace from this much in common on, mm.
ALONG_MM = 5e-3
#: Lengths are rounded up to this, mm.
GRID_MM = 0.05


def moves(case: Case) -> Iterator[Proposal | Miss]:
    """Propose the shortest move to either side that leaves the gap behind and has room."""
    if case.islands[0].id != case.islands[1].id:
        yield Miss("move", "the gap parts its plane in two, there is no end to go round")
        return
    chain = chain_over(case.tracks, LineString(case.crossing.path))
    if chain is None:
        yield Miss("move", "the trace branches or ends over the gap")
        return
    if _ends(case, chain.line, (ROOMS_MM[0], ROOMS_MM[0])) is None:
        near = f"within {ROOMS_MM[0]:g} mm of the gap"
        yield Miss("move", f"the trace bends, branches or ends {near}")
        return
    for side in (1, -1):
        yield from _moved(case, chain, side)


class Chain(NamedTuple):
    """Pieces of trace in a row, without a branch between its ends."""

    line: LineString
    pieces: tuple[int, ...]


def chain_over(tracks: Tracks, path: LineString) -> Chain | None:
    """The pieces of trace in a row that a path runs along; None if it branches off or ends there.

    Parameters
    ----------
    tracks
        The traces of one net on one layer.
    path
        A path along them, mm.
    """
    lines = segments(np.stack([tracks.start, tracks.end], axis=1))
    thin = path.buffer(1e-3)
    along = shapely.length(shapely.intersection(lines, thin))
    on = np.flatnonzero(along > ALONG_MM).tolist()
    if not on or not shapely.union_all(lines[on]).buffer(2e-3).covers(path):
        return None
    graph: nx.Graph[int] = nx.Graph([(*tracks.nodes[i].tolist(), {"piece": i}) for i in on])
    ends = sorted(node for node, degree in graph.degree() if degree == 1)
    if len(ends) != 2 or len(graph.edges) != len(on) or not nx.is_connected(graph):
        return None
    nodes = nx.shortest_path(graph, ends[0], ends[1])
    if len(nodes) != len(on) + 1:
        return None
    inner = nodes[1:-1]
    if any(len(tracks.at_node(node)) != 2 for node in inner):
        return None  # something branches off
    pieces = tuple(graph.edges[pair]["piece"] for pair in pairwise(nodes))
    points = [_node_at(tracks, piece, node) for piece, node in zip(pieces, nodes, strict=False)]
    points.append(_node_at(tracks, pieces[-1], nodes[-1]))
    return Chain(LineString(points), pieces)


def _node_at(tracks: Tracks, piece: int, node: int) -> Point:
    ends = tracks.start, tracks.end
    return _place(ends[int(tracks.nodes[piece, 1] == node)][piece])


def _moved(case: Case, chain: Chain, side: int) -> Sequence[Proposal | Miss]:
    crossing = case.crossing
    height = case.scene.board.stack.height_mm(crossing.layer, crossing.plane)
    ahead = _ahead(case, chain.line)
    aside = np.array([-ahead[1] * side, ahead[0] * side])
    misses: list[Miss] = []
    for heights in HEIGHTS_BEYOND:
        beyond = heights * height + crossing.width_mm / 2
        shift = _shift_mm(case, ahead, aside, beyond)
        if shift > FARTHEST_MM:
            where = f"more than {FARTHEST_MM:g} mm {towards(aside)}"
            misses.append(Miss("move", f"needs {where}"))
            continue
        free = _free(case, chain, aside * shift)
        if free is None:
            room = _room_mm(case, chain, aside, shift)
            needed = f"needs {shift:.2f} mm {towards(aside)}"
            free_room = f"free room {room:.2f} mm" if room else "no free room"
            misses.append(Miss("move", f"{needed}, {free_room}"))
            continue
        found = _valued(case, chain, shift, *free)
        if isinstance(found, Proposal):
            return [found]
        misses.append(found)
    return telling(misses)


def _room_mm(case: Case, chain: Chain, aside: Floats, most_mm: float) -> float:
    """How far aside there is room, up to where there is none, in steps; mm."""
    room = 0.0
    for shift in np.arange(ROOM_STEP_MM, most_mm, ROOM_STEP_MM).tolist():
        if _free(case, chain, aside * shift) is None:
            break
        room = shift
    return room


def towards(aside: Floats) -> str:
    """A direction as the board's axes have it, to an eighth of a turn.

    Examples
    --------
    >>> towards(np.array([0.0, -1.0])), towards(np.array([-0.7, 0.7]))
    ('towards -y', 'towards -x +y')
    """
    named = zip("xy", aside.tolist(), strict=True)
    axes = [f"{'+' if part > 0 else '-'}{axis}" for axis, part in named if abs(part) > SIN_EIGHTH]
    return f"towards {' '.join(axes)}"


def _ahead(case: Case, line: LineString) -> Floats:
    """The direction in which the trace goes past the gap, its bends over it left out."""
    rims = sorted(line.project(shapely.Point(rim)) for rim in case.crossing.path)
    ends = [line.interpolate(s) for s in (rims[0] - ROOMS_MM[-1], rims[-1] + ROOMS_MM[-1])]
    if rims[0] < ROOMS_MM[-1]:
        ends[0] = line.interpolate(0.0)
    way = np.array([ends[1].x - ends[0].x, ends[1].y - ends[0].y])
    length = float(np.hypot(*way))
    return way / length if length > 0 else np.array(heading(case.crossing))


def _free(
    case: Case, chain: Chain, shift: Floats
) -> tuple[tuple[Point, ...], tuple[str, ...]] | None:
    """The shortest moved way that has room, and the pours it opens."""
    pairs = [(one, other) for one in ROOMS_MM for other in ROOMS_MM]
    for rooms in sorted(pairs, key=lambda pair: (sum(pair), pair)):
        ends = _ends(case, chain.line, rooms)
        if ends is None:
            continue
        there = carried(chain.line, ends, shift)
        shape = LineString(there).buffer(case.crossing.width_mm / 2, quad_segs=4)
        if not LineString(there).is_simple:
            continue
        opened = case.room.openings(shape, case.crossing.layer, case.finding.net)
        if opened is not None:
            return there, opened
    return None


def carried(line: LineString, ends: tuple[float, float], shift: Floats) -> tuple[Point, ...]:
    """The way that leaves a line at one place along it, runs beside it and comes back.

    Examples
    --------
    >>> carried(LineString([(0, 0), (9, 0)]), (2.0, 5.0), np.array([0.0, 1.0]))
    ((2.0, 0.0), (2.0, 1.0), (5.0, 1.0), (5.0, 0.0))
    """
    part = substring(line, *ends)
    inner = [(round(x, 4), round(y, 4)) for x, y in part.coords]
    moved = [(round(x + shift[0].item(), 4), round(y + shift[1].item(), 4)) for x, y in inner]
    return (inner[0], *moved, inner[-1])


def _shift_mm(case: Case, ahead: Floats, aside: Floats, beyond: float) -> float:
    """How far aside the gap ends, for a band as long as the run, and the distance beyond; mm."""
    crossing = case.crossing
    gap = case.plane.gaps[crossing.gap].shape
    at = np.array(crossing.at)
    along = (np.array(crossing.path) - at) @ ahead
    far = aside * (FARTHEST_MM + 1.0)
    start, stop = (
        at + ahead * (float(s) + sign * ROOMS_MM[0])
        for s, sign in ((along.min(), -1.0), (along.max(), 1.0))
    )
    back = float(((np.array(crossing.path) - at) @ aside).min()) * aside
    band = shapely.Polygon([start + back, stop + back, stop + far, start + far])
    inside = [
        piece
        for piece in shapely.get_parts(shapely.intersection(gap, band))
        if piece.distance(LineString(crossing.path)) < 1e-3
    ]
    if not inside:
        return inf
    rims = shapely.get_coordinates(inside) - np.array(crossing.at)
    reach = float((rims @ aside).max()) - float(back @ aside)
    return on_grid(reach + beyond)


def on_grid(length_mm: float) -> float:
    """A length rounded up to what one draws, mm.

    Examples
    --------
    >>> on_grid(0.91), on_grid(1.0 - 0.1)
    (0.95, 0.9)
    """
    return round(ceil(round(length_mm / GRID_MM, 6)) * GRID_MM, 4)


def _ends(case: Case, line: LineString, rooms: tuple[float, float]) -> tuple[float, float] | None:
    """How far along its pieces the trace leaves its old way and comes back, mm."""
    rims = sorted(line.project(shapely.Point(rim)) for rim in case.crossing.path)
    start, stop = rims[0] - rooms[0], rims[-1] + rooms[1]
    return None if start < 0.0 or stop > line.length else (start, stop)


def _valued(
    case: Case, chain: Chain, shift_mm: float, there: tuple[Point, ...], opened: tuple[str, ...]
) -> Proposal | Miss:
    """The trace moved, if it gains."""
    tracks = moved_tracks(case, chain, there)
    worth = worth_after(case, case.scene, tracks, LineString(there[1:-1]))
    words = (
        f"move the trace on {case.layer_name(case.crossing.layer)} by {shift_mm:.2f} mm, "
        f"past the end of the gap: {way_in_words(there)}"
    )
    if opened:
        words += f"; opens {', '.join(opened)}"
    return case.proposal("move", (there[0], there[-1]), words, worth)


def moved_tracks(case: Case, chain: Chain, there: tuple[Point, ...]) -> Tracks:
    """The traces of the net with a chain of pieces on another way between two of its places."""
    line = chain.line
    start, stop = (line.project(shapely.Point(at)) for at in (there[0], there[-1]))
    before, after = substring(line, 0.0, start), substring(line, stop, line.length)
    rest = [corners(part) for part in (before, after) if part.length > 0]
    return redrawn(case.tracks, case.net, (*rest, there), chain.pieces)


def corners(line: shapely.Geometry) -> tuple[Point, ...]:
    """The corners of a line, mm."""
    return tuple((round(x, 4), round(y, 4)) for x, y in shapely.get_coordinates(line).tolist())


def way_in_words(there: Sequence[Point]) -> str:
    """The corners of a way, from end to end.

    Examples
    --------
    >>> way_in_words([(0.0, 1.0), (2.5, 1.0)])
    'x 0.00 y 1.00, x 2.50 y 1.00'
    """
    return ", ".join(f"x {x:.2f} y {y:.2f}" for x, y in there)


def _place(row: Floats) -> Point:
    return float(row[0]), float(row[1])
