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
    found = []
    ends = _Ends(tracks, bare, still)
    for group in _groups(tracks, bits):
        crossing = _crossing(tracks, plane, group, ends)
        rim = None if crossing is not None else ends.left_at(group)
        if crossing is not None or rim is not None:
            found.append((crossing, group, rim))
    return found


def _groups(tracks: Tracks, bits: Sequence[_Bit]) -> list[list[_Bit]]:
    """Bits over one gap that hang together where pieces of trace meet."""
    graph: nx.Graph[tuple[str, int, int]] = nx.Graph()
    for number, bit in enumerate(bits):
        graph.add_node(("bit", number, 0))
        for node in _nodes_of(tracks, bit):
            graph.add_edge(("bit", number, 0), ("node", node, bit.gap))
    groups = [
        sorted(bits[number] for kind, number, _ in members if kind == "bit")
        for members in nx.connected_components(graph)
    ]
    return sorted(groups)


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


class _Ends:
    """Where groups of bits end: on the plane's copper, on a nearer plane, or nowhere."""

    def __init__(self, tracks: Tracks, bare: Uncovered, still: dict[int, list[Span]]) -> None:
        self.tracks = tracks
        self.bare = bare
        self.still = still

    def _seen(self, piece: int, at: float) -> bool:
        """Whether no nearer plane hides this place."""
        return any(start <= at <= stop for start, stop in self.still.get(piece, ()))

    def _covered(self, piece: int, at: float) -> bool:
        return not any(bit.start <= at <= bit.stop for bit in self.bare.get(piece, ()))

    def of(self, bit: _Bit) -> list[_Rim]:
        """The rims of a bit."""
        rims = []
        step = PROBE_MM / float(self.tracks.length_mm[bit.piece])
        for at, sign, end in ((bit.start, -1, 0), (bit.stop, 1, 1)):
            beyond = at + sign * min(step, at if sign < 0 else 1 - at)
            if 0.0 < at < 1.0:
                if self._covered(bit.piece, beyond) and self._seen(bit.piece, beyond):
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
            rims.extend(self._rims_at_node(int(self.tracks.nodes[bit.piece, end])))
        return rims

    def left_at(self, group: Sequence[_Bit]) -> _Rim | None:
        """Where a group of bits comes from the plane, if it never gets back to it."""
        rims = {rim.key: rim for bit in group for rim in self.of(bit)}
        return next(iter(rims.values())) if len(rims) == 1 else None

    def _rims_at_node(self, node: int) -> list[_Rim]:
        rims = []
        for other in self.tracks.at_node(node):
            first = int(self.tracks.nodes[other, 0]) == node
            step = min(PROBE_MM / float(self.tracks.length_mm[other]), 0.5)
            beyond = step if first else 1.0 - step
            if self._covered(other, beyond) and self._seen(other, beyond):
                at = self.tracks.point(other, 0.0 if first else 1.0)
                on = self.tracks.point(other, beyond)
                rims.append(
                    _Rim(at, on, ("node", node, 0.0), other, 0.0 if first else 1.0, int(first))
                )
        return rims


def _crossing(tracks: Tracks, plane: Plane, group: Sequence[_Bit], ends: _Ends) -> Crossing | None:
    """Make a crossing of a group that starts and ends on the plane; else None."""
    rims: dict[Place, _Rim] = {}
    for bit in group:
        for rim in ends.of(bit):
            rims.setdefault(rim.key, rim)
    if len(rims) < 2:
        return None
    graph = _walk(tracks, group)
    best = _farthest(graph, sorted(rims))
    if best is None:
        return None
    entry, leave, keys, run_mm = best
    path = tuple(graph.nodes[key]["at"] for key in keys)
    before, after = rims[entry].on, rims[leave].on
    islands = plane.island_at(np.array([before[0], after[0]]), np.array([before[1], after[1]]))
    if islands.min() < 0 or run_mm <= 0:
        return None
    first = max(group, key=lambda bit: (bit.stop - bit.start) * float(tracks.length_mm[bit.piece]))
    return Crossing(
        net=int(tracks.net[first.piece]),
        layer=tracks.layer,
        plane=plane.layer,
        gap=first.gap,
        path=path,
        stretch=(
            *reversed(_followed(tracks, rims[entry])),
            *path,
            *_followed(tracks, rims[leave]),
        ),
        before=before,
        after=after,
        islands=(int(islands[0]), int(islands[1])),
        run_mm=run_mm,
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


def _walk(tracks: Tracks, group: Sequence[_Bit]) -> nx.Graph[Place]:
    """The bits of a group as a graph of places, edges weighted by length in mm."""
    graph: nx.Graph[Place] = nx.Graph()
    for bit in group:
        keys = []
        for at, end in ((bit.start, 0), (bit.stop, 1)):
            inside = 0.0 < at < 1.0
            key = (
                ("rim", bit.piece, at)
                if inside
                else ("node", int(tracks.nodes[bit.piece, end]), 0.0)
            )
            graph.add_node(key, at=tracks.point(bit.piece, at))
            keys.append(key)
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
