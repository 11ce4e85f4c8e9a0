"""Crossings: runs of a trace where the plane that carried its return is missing."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from fnmatch import fnmatchcase
from itertools import pairwise
from typing import NamedTuple, TypeAlias

import networkx as nx
import numpy as np

from splitcheck.board.board import Board
from splitcheck.board.names import is_power
from splitcheck.board.traces import locate
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.planes.islands import Plane
from splitcheck.planes.shadows import (
    Span,
    Uncovered,
    common,
    merged,
    uncovered,
    without,
)
from splitcheck.planes.tracks import Tracks

#: How far off the rim of a gap the copper is probed, mm.
PROBE_MM = 5e-3
#: How far a trace is followed on either side of a crossing, mm.
STRETCH_MM = 10.0


@dataclass(frozen=True, slots=True)
class Crossing:
    """One run of a trace over one gap of the plane that carries its return."""

    net: int
    layer: int
    plane: int
    """Layer number of the plane."""
    gap: int
    """Index of the gap in the plane."""
    path: tuple[Point, ...]
    """Centre line of the run from entry to exit, both on the rim of the gap, mm."""
    stretch: tuple[Point, ...]
    """The run with some of the trace on either side of it, straight on where it branches, mm."""
    before: Point
    """A point of the trace on copper just before the run."""
    after: Point
    """A point of the trace on copper just after the run."""
    islands: tuple[int, int]
    """Indexes of the islands where the run starts and ends."""
    run_mm: float
    """Length of the run over the gap, mm; 0 where the gap lies beside the trace."""
    width_mm: float
    line: int
    """Line in the Gerber file of the trace's layer."""
    aside_mm: float = 0.0
    """How far beside the centre line the gap lies, mm; 0 where the trace runs over it. The path is
    then the stretch of trace that passes by, over copper."""

    @property
    def at(self) -> Point:
        """Middle of the run, mm."""
        return middle(self.path)


@dataclass(frozen=True, slots=True)
class BareTrace:
    """A connected run of one net on one layer with no reference copper above or below at all."""

    net: int
    layer: int
    bare_mm: float
    """Its length, mm."""
    at: Point
    """Middle of its longest straight stretch."""
    width_mm: float
    line: int
    spans: tuple[tuple[Point, Point], ...]
    """Its straight stretches."""
    leaves: bool = False
    """It has left the plane that carried its return and goes on over a farther one to its end."""
    rim: Point | None = None
    """Where it left that plane, mm."""
    on: Point | None = None
    """A point of the trace on the plane just before."""


#: A node of the walk along a run: what kind of place, its piece or node, and where on the piece.
Place: TypeAlias = tuple[str, int, float]


class _Bit(NamedTuple):
    """A bare stretch of a piece together with what lies at its two ends."""

    piece: int
    start: float
    stop: float
    gap: int


def middle(path: Sequence[Point]) -> Point:
    """The point half way along a path.

    Examples
    --------
    >>> middle([(0.0, 0.0), (4.0, 0.0)])
    (2.0, 0.0)
    """
    steps = [float(np.hypot(b[0] - a[0], b[1] - a[1])) for a, b in pairwise(path)]
    left = sum(steps) / 2
    for (x0, y0), (x1, y1), step in zip(path, path[1:], steps, strict=False):
        if left <= step and step > 0:
            return x0 + (x1 - x0) * left / step, y0 + (y1 - y0) * left / step
        left -= step
    return path[0]


def find_crossings(
    tracks: Tracks, planes: Sequence[Plane]
) -> tuple[tuple[Crossing, ...], tuple[BareTrace, ...]]:
    """Walk the traces of a layer over the planes on either side.

    Parameters
    ----------
    tracks
        The judged traces of one layer.
    planes
        Every plane of the board, any order; the one on the traces' own layer is left out.

    Returns
    -------
    Crossings; and what is bare of every plane, or has left the plane that carried its return.

    Notes
    -----
    On each side planes are taken from near to far. A plane carries the return where no nearer one
    does; a run over a gap counts for it only if it starts and ends on that plane with nothing
    nearer in between.
    """
    everything = range(len(tracks.net))
    crossings: list[Crossing] = []
    crossed: dict[int, list[Span]] = defaultdict(list)
    leaving: list[BareTrace] = []
    open_spans: list[dict[int, list[Span]]] = []
    for side in (-1, 1):
        ranked = sorted(
            (plane for plane in planes if (plane.layer - tracks.layer) * side > 0),
            key=lambda plane: abs(plane.layer - tracks.layer),
        )
        still: dict[int, list[Span]] = {piece: [(0.0, 1.0)] for piece in everything}
        for plane in ranked:
            bare = uncovered(tracks, plane, sorted(still))
            further = _both(still, bare)
            for crossing, bits, rim in _crossings_over(tracks, plane, bare, still):
                if crossing is None:
                    leaving.append(_bare_trace(tracks, bits, left=rim))
                    continue
                crossings.append(crossing)
                for bit in bits:
                    crossed[bit.piece].append((bit.start, bit.stop))
            still = further
        open_spans.append(still)
    bare_everywhere = [
        _Bit(piece, start, stop, 0)
        for piece in everything
        for span in common(open_spans[0].get(piece, []), open_spans[1].get(piece, []))
        for start, stop in without(span, merged(crossed[piece]))
    ]
    traces = tuple(_bare_trace(tracks, group) for group in _groups(tracks, bare_everywhere))
    return tuple(crossings), (*traces, *_over_farther(leaving, traces))


def runs_through(tracks: Tracks, plane: Plane, zones: Uncovered) -> tuple[Crossing, ...]:
    """Runs of traces through zones of a plane, from copper outside them to copper outside them.

    Parameters
    ----------
    tracks
        The traces of one layer.
    plane
        The plane.
    zones
        Stretches of the traces by piece; stretches of one number that meet are one run.
    """
    everywhere = {piece: [(0.0, 1.0)] for piece in range(len(tracks.net))}
    found = _crossings_over(tracks, plane, zones, everywhere)
    return tuple(crossing for crossing, _, _ in found if crossing is not None)


def _both(still: dict[int, list[Span]], bare: Uncovered) -> dict[int, list[Span]]:
    left: dict[int, list[Span]] = {}
    for piece, bits in bare.items():
        spans = common(still[piece], merged((bit.start, bit.stop) for bit in bits))
        if spans:
            left[piece] = spans
    return left


def _crossings_over(
    tracks: Tracks, plane: Plane, bare: Uncovered, still: dict[int, list[Span]]
) -> list[tuple[Crossing | None, list[_Bit], _Rim | None]]:
    """Groups of bare bits with their crossing, or the rim where they leave the plane for good."""
    bits = [
        _Bit(piece, start, stop, bit.gap)
        for piece, found in bare.items()
        for bit in found
        for start, stop in common([(bit.start, bit.stop)], still[piece])
    ]
    ends = _Ends(tracks, bare, still)
    groups = _groups(tracks, bits)
    rims = [[rim for bit in group for rim in ends.of(bit)] for group in groups]
    runs = [_run(tracks, *both) for both in zip(groups, rims, strict=True)]
    places = [place for run in runs if run is not None for place in (run.entry.on, run.leave.on)]
    on = plane.island_at(*np.array(places).reshape(-1, 2).T).reshape(-1, 2).tolist()
    islands = iter(on)
    found: list[tuple[Crossing | None, list[_Bit], _Rim | None]] = []
    for group, around, run in zip(groups, rims, runs, strict=True):
        if run is not None:
            one, other = next(islands)
            if min(one, other) >= 0 and run.run_mm > 0:
                found.append((_crossing(tracks, plane, group, run, (one, other)), group, None))
        elif (left := _left_at(around)) is not None:
            found.append((None, group, left))
    return found


def _groups(tracks: Tracks, bits: Sequence[_Bit]) -> list[list[_Bit]]:
    """Bits over one gap that hang together where pieces of trace meet."""
    above = list(range(len(bits)))

    def root(number: int) -> int:
        while above[number] != number:
            above[number] = above[above[number]]
            number = above[number]
        return number

    first: dict[tuple[int, int], int] = {}
    for number, bit in enumerate(bits):
        for node in _nodes_of(tracks, bit):
            above[root(number)] = root(first.setdefault((node, bit.gap), number))
    groups: dict[int, list[_Bit]] = defaultdict(list)
    for number, bit in enumerate(bits):
        groups[root(number)].append(bit)
    return sorted(sorted(group) for group in groups.values())


def _nodes_of(tracks: Tracks, bit: _Bit) -> list[int]:
    at = []
    if bit.start <= 0.0:
        at.append(int(tracks.nodes[bit.piece, 0]))
    if bit.stop >= 1.0:
        at.append(int(tracks.nodes[bit.piece, 1]))
    return at


class _Rim(NamedTuple):
    """An end of a group of bits where the trace is back on the plane."""

    at: Point
    on: Point
    """A point of the trace on copper beyond it."""
    key: Place
    """Its node in the walk graph."""
    piece: int
    """The piece of trace that leads away from the gap there."""
    fraction: float
    """Where on that piece the rim is."""
    toward: int
    """Which end of that piece leads away: 0 its start, 1 its end."""


class _Run(NamedTuple):
    """The way of a group of bits from the plane to the plane."""

    entry: _Rim
    leave: _Rim
    path: tuple[Point, ...]
    run_mm: float


class _Ends:
    """Where bits end: on the plane's copper, on a nearer plane, or nowhere."""

    def __init__(self, tracks: Tracks, bare: Uncovered, still: dict[int, list[Span]]) -> None:
        self.tracks = tracks
        self.bare = bare
        self.still = still
        self._at_nodes: dict[int, list[_Rim]] = {}

    def _on_plane(self, piece: int, at: float) -> bool:
        """Whether this place is on the plane's copper and no nearer plane hides it."""
        for bit in self.bare.get(piece, ()):
            if bit.start <= at <= bit.stop:
                return False
        return any(start <= at <= stop for start, stop in self.still.get(piece, ()))

    def of(self, bit: _Bit) -> list[_Rim]:
        """The rims of a bit."""
        rims: list[_Rim] = []
        for at, sign, end in ((bit.start, -1, 0), (bit.stop, 1, 1)):
            if 0.0 < at < 1.0:
                step = PROBE_MM / float(self.tracks.length_mm[bit.piece])
                beyond = at + sign * min(step, at if sign < 0 else 1 - at)
                if self._on_plane(bit.piece, beyond):
                    rims.append(
                        _Rim(
                            self.tracks.point(bit.piece, at),
                            self.tracks.point(bit.piece, beyond),
                            ("rim", bit.piece, at),
                            bit.piece,
                            at,
                            end,
                        )
                    )
                continue
            node = int(self.tracks.nodes[bit.piece, end])
            if node not in self._at_nodes:
                self._at_nodes[node] = self._rims_at_node(node)
            rims.extend(self._at_nodes[node])
        return rims

    def _rims_at_node(self, node: int) -> list[_Rim]:
        rims = []
        for other in self.tracks.at_node(node):
            first = int(self.tracks.nodes[other, 0]) == node
            step = min(PROBE_MM / float(self.tracks.length_mm[other]), 0.5)
            beyond = step if first else 1.0 - step
            if self._on_plane(other, beyond):
                at = self.tracks.point(other, 0.0 if first else 1.0)
                on = self.tracks.point(other, beyond)
                rims.append(
                    _Rim(at, on, ("node", node, 0.0), other, 0.0 if first else 1.0, int(first))
                )
        return rims


def _left_at(found: Sequence[_Rim]) -> _Rim | None:
    """Where a group of bits comes from the plane, if it never gets back to it."""
    rims = {rim.key: rim for rim in found}
    return next(iter(rims.values())) if len(rims) == 1 else None


def _run(tracks: Tracks, group: Sequence[_Bit], found: Sequence[_Rim]) -> _Run | None:
    """The longest way through a group from one of its rims to another; else None."""
    rims: dict[Place, _Rim] = {}
    for rim in found:
        rims.setdefault(rim.key, rim)
    if len(rims) < 2:
        return None
    if len(group) == 1 and len(rims) == 2:
        # Most runs are one straight stretch: there is one way, and nothing to compare.
        (bit,) = group
        (one, entry), (_, leave) = sorted(rims.items())
        ends = tracks.point(bit.piece, bit.start), tracks.point(bit.piece, bit.stop)
        ahead = one == _key(tracks, bit, 0)
        run_mm = (bit.stop - bit.start) * float(tracks.length_mm[bit.piece])
        return _Run(entry, leave, ends if ahead else ends[::-1], run_mm)
    graph = _walk(tracks, group)
    best = _farthest(graph, sorted(rims))
    if best is None:
        return None
    first, last, keys, run_mm = best
    return _Run(rims[first], rims[last], tuple(graph.nodes[key]["at"] for key in keys), run_mm)


def _crossing(
    tracks: Tracks, plane: Plane, group: Sequence[_Bit], run: _Run, islands: tuple[int, int]
) -> Crossing:
    first = max(group, key=lambda bit: (bit.stop - bit.start) * float(tracks.length_mm[bit.piece]))
    return Crossing(
        net=int(tracks.net[first.piece]),
        layer=tracks.layer,
        plane=plane.layer,
        gap=first.gap,
        path=run.path,
        stretch=(
            *reversed(_followed(tracks, run.entry)),
            *run.path,
            *_followed(tracks, run.leave),
        ),
        before=run.entry.on,
        after=run.leave.on,
        islands=islands,
        run_mm=run.run_mm,
        width_mm=float(tracks.width_mm[first.piece]),
        line=int(tracks.line[first.piece]),
    )


def _followed(tracks: Tracks, rim: _Rim) -> list[Point]:
    """Points of a trace from the rim of a gap outwards; where it branches, straight on."""
    points: list[Point] = []
    piece, fraction, toward = rim.piece, rim.fraction, rim.toward
    left = STRETCH_MM
    while True:
        ahead = abs(toward - fraction) * float(tracks.length_mm[piece])
        if ahead >= left:
            step = left / float(tracks.length_mm[piece])
            points.append(tracks.point(piece, fraction + (step if toward else -step)))
            return points
        points.append(tracks.point(piece, float(toward)))
        left -= ahead
        node = int(tracks.nodes[piece, toward])
        others = [other for other in tracks.at_node(node) if other != piece]
        if not others:
            return points
        piece = min(others, key=lambda other: _turn(tracks, piece, toward, other, node))
        first = int(tracks.nodes[piece, 0]) == node
        fraction, toward = (0.0, 1) if first else (1.0, 0)


def _turn(tracks: Tracks, piece: int, toward: int, other: int, node: int) -> tuple[float, int]:
    """How sharply a trace turns from one piece into another at a node; 0 is straight on."""
    ahead = (tracks.end[piece] - tracks.start[piece]) * (1 if toward else -1)
    leads = tracks.end[other] - tracks.start[other]
    if int(tracks.nodes[other, 0]) != node:
        leads = -leads
    along = float(ahead @ leads) / float(tracks.length_mm[piece] * tracks.length_mm[other])
    return round(1.0 - along, 9), other


def _key(tracks: Tracks, bit: _Bit, end: int) -> Place:
    """The node of an end of a bit in the walk graph: 0 its start, 1 its stop."""
    at = bit.stop if end else bit.start
    if 0.0 < at < 1.0:
        return "rim", bit.piece, at
    return "node", int(tracks.nodes[bit.piece, end]), 0.0


def _walk(tracks: Tracks, group: Sequence[_Bit]) -> nx.Graph[Place]:
    """The bits of a group as a graph of places, edges weighted by length in mm."""
    graph: nx.Graph[Place] = nx.Graph()
    for bit in group:
        keys = [_key(tracks, bit, 0), _key(tracks, bit, 1)]
        graph.add_node(keys[0], at=tracks.point(bit.piece, bit.start))
        graph.add_node(keys[1], at=tracks.point(bit.piece, bit.stop))
        length = (bit.stop - bit.start) * float(tracks.length_mm[bit.piece])
        graph.add_edge(keys[0], keys[1], weight=length)
    return graph


def _farthest(
    graph: nx.Graph[Place], rims: Sequence[Place]
) -> tuple[Place, Place, list[Place], float] | None:
    """The two rims farthest apart along the run, with the way between them."""
    best = None
    for number, one in enumerate(rims[:8]):
        if one not in graph:
            continue
        lengths: dict[Place, float]
        paths: dict[Place, list[Place]]
        # the stubs leave open whether a target was given
        lengths, paths = nx.single_source_dijkstra(graph, one, weight="weight")  # type: ignore[assignment]
        for other in rims[number + 1 :]:
            if other in lengths and (best is None or lengths[other] > best[3]):
                best = (one, other, paths[other], float(lengths[other]))
    return best


def _bare_trace(tracks: Tracks, group: Sequence[_Bit], *, left: _Rim | None = None) -> BareTrace:
    lengths = [(bit.stop - bit.start) * float(tracks.length_mm[bit.piece]) for bit in group]
    longest = group[int(np.argmax(lengths))]
    return BareTrace(
        int(tracks.net[longest.piece]),
        tracks.layer,
        float(sum(lengths)),
        tracks.point(longest.piece, (longest.start + longest.stop) / 2),
        float(tracks.width_mm[longest.piece]),
        int(tracks.line[longest.piece]),
        tuple(
            (tracks.point(bit.piece, bit.start), tracks.point(bit.piece, bit.stop)) for bit in group
        ),
        left is not None,
        None if left is None else left.at,
        None if left is None else left.on,
    )


def _over_farther(leaving: Sequence[BareTrace], bare: Sequence[BareTrace]) -> list[BareTrace]:
    """Those that leave a plane for another one, not those that are bare of every plane then."""
    nowhere = {span for trace in bare for span in trace.spans}
    return [trace for trace in leaving if not nowhere.intersection(trace.spans)]


def judged_nets(
    board: Board, carriers: frozenset[int], patterns: Sequence[str] = ()
) -> frozenset[int]:
    """Nets whose traces are judged: those that neither carry returns nor are supplies by name.

    Parameters
    ----------
    board
        The board.
    carriers
        Numbers of the nets that carry returns.
    patterns
        Patterns of names, ``*`` and ``?`` standing for any text; empty: all.

    Raises
    ------
    SplitcheckError
        If a pattern matches no net.
    """
    joined = connected_nets(board)
    signals = frozenset(
        net.number
        for net in board.nets
        if net.number not in carriers
        and (net.given or net.number in joined)
        and not (is_power(net.name) or net.number in board.references)
    )
    if not patterns:
        return signals
    wanted: set[int] = set()
    for pattern in patterns:
        matched = [
            net for net in board.nets if net.name == pattern or fnmatchcase(net.name, pattern)
        ]
        if not matched:
            near = get_close_matches(pattern, sorted({net.name for net in board.nets}), 3, 0.5)
            raise SplitcheckError(
                f"--net {pattern}",
                "no net has such a name",
                f"did you mean {', '.join(near)}" if near else "splitcheck read lists the nets",
            )
        wanted.update(net.number for net in matched)
    return frozenset(wanted & signals)


def connected_nets(board: Board) -> frozenset[int]:
    """Nets with a pad or a plated hole; what has neither is text or a drawing in copper."""
    found = {hole.net for hole in board.holes}
    first = 0
    for layer in board.layers:
        if layer.pads:
            xs, ys = np.array([pad.at for pad in layer.pads]).T
            pieces = np.unique(locate(xs, ys, layer.pieces))
            found.update(board.net_of[first + int(piece)] for piece in pieces if piece >= 0)
        first += len(layer.pieces)
    return frozenset(found)
