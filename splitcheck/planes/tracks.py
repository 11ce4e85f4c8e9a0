"""Centre lines of one layer as straight pieces in arrays, joined at their ends."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.board.board import Board
from splitcheck.board.parts import CopperLayer
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.units import Floats, segments

#: Ends closer than this are one, mm.
JOIN_MM = 1e-3

Ints = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Tracks:
    """Straight pieces of trace on one layer; index arrays of shape (n,)."""

    layer: int
    start: Floats
    """Shape (n, 2), mm."""
    end: Floats
    length_mm: Floats
    width_mm: Floats
    net: Ints
    line: Ints
    """Line in the Gerber file."""
    nodes: Ints
    """Number of the node at either end, shape (n, 2)."""
    node_order: Ints
    """Positions in ``nodes.ravel()`` sorted by node, shape (2 n,)."""
    node_start: Ints
    """Where each node's run in ``node_order`` starts, with a last one past the end."""

    def point(self, piece: int, fraction: float) -> tuple[float, float]:
        """The point at a fraction (0 to 1) of a piece, mm."""
        if fraction <= 0.0:
            return float(self.start[piece, 0]), float(self.start[piece, 1])
        if fraction >= 1.0:
            return float(self.end[piece, 0]), float(self.end[piece, 1])
        x, y = self.start[piece] + fraction * (self.end[piece] - self.start[piece])
        return float(x), float(y)

    def at_node(self, node: int) -> list[int]:
        """Indexes of the pieces that end at a node."""
        first, last = self.node_start[node : node + 2].tolist()
        return sorted({position // 2 for position in self.node_order[first:last].tolist()})


def lay(board: Board, layer: CopperLayer, first_part: int, nets: frozenset[int]) -> Tracks:
    """Lay out the traces of some nets on one layer.

    Parameters
    ----------
    board
        The board.
    layer
        The layer whose centre lines are wanted.
    first_part
        Id of the first part of the layer (its pieces are numbered on from there).
    nets
        Numbers of the nets to keep.
    """
    rows: list[tuple[float, float, float, float, float, int, int]] = []
    for stroke in layer.lines:
        net = board.net_of[first_part + stroke.piece]
        if net not in nets:
            continue
        for (x0, y0), (x1, y1) in zip(stroke.points, stroke.points[1:], strict=False):
            if (x0, y0) != (x1, y1):
                rows.append((x0, y0, x1, y1, stroke.width_mm, net, stroke.line))
    return _laid(layer.number, np.array(sorted(set(rows)), dtype=float).reshape(-1, 7))


def redrawn(
    tracks: Tracks, net: int, lines: Sequence[tuple[Point, ...]] = (), gone: Sequence[int] = ()
) -> Tracks:
    """The traces of one net alone, with some pieces of them drawn elsewhere.

    Parameters
    ----------
    tracks
        The traces of a layer.
    net
        Number of the net to keep.
    lines
        Centre lines to add, mm; as wide as the first piece that they stand for, or as the first.
    gone
        Indexes of the pieces to leave out.
    """
    keep = np.flatnonzero(tracks.net == net)
    like = gone[0] if gone else int(keep[0])
    more = [
        (*one, *other, float(tracks.width_mm[like]), net, float(tracks.line[like]))
        for line in lines
        for one, other in pairwise(line)
        if one != other
    ]
    keep = keep[~np.isin(keep, list(gone))]
    columns = tracks.start, tracks.end, tracks.width_mm, tracks.net, tracks.line
    old = np.column_stack([column[keep] for column in columns])
    return _laid(tracks.layer, np.concatenate([old, np.array(more).reshape(-1, 7)]))


def _laid(layer: int, table: Floats) -> Tracks:
    """Tracks from rows of start, end, width, net and line."""
    table = _once(_split_where_others_end(table))
    start, end = table[:, 0:2], table[:, 2:4]
    nodes = _nodes(start, end, table[:, 5])
    order = np.argsort(nodes.ravel(), kind="stable")
    return Tracks(
        layer,
        start,
        end,
        np.hypot(*(end - start).T),
        table[:, 4],
        table[:, 5].astype(np.intp),
        table[:, 6].astype(np.intp),
        nodes,
        order,
        np.searchsorted(nodes.ravel()[order], np.arange(nodes.max(initial=-1) + 2)),
    )


def _split_where_others_end(table: Floats) -> Floats:
    """Cut pieces where a piece of the same net ends in their middle (a T of two strokes)."""
    if len(table) < 2:
        return table
    lines = segments(table[:, :4].reshape(-1, 2, 2))
    ends = np.concatenate([table[:, 0:2], table[:, 2:4]])
    owner = np.concatenate([table[:, 5], table[:, 5]])
    points, hits = shapely.STRtree(lines).query(
        shapely.points(ends), predicate="dwithin", distance=JOIN_MM
    )
    cuts: dict[int, list[float]] = defaultdict(list)
    same = owner[points] == table[hits, 5]
    at = shapely.line_locate_point(lines[hits], shapely.points(ends[points]))
    length = np.hypot(table[hits, 2] - table[hits, 0], table[hits, 3] - table[hits, 1])
    for hit, where in zip(
        hits[same & (at > JOIN_MM) & (at < length - JOIN_MM)],
        (at / np.maximum(length, 1e-12))[same & (at > JOIN_MM) & (at < length - JOIN_MM)],
        strict=True,
    ):
        cuts[int(hit)].append(float(where))
    if not cuts:
        return table
    rows = [row for i, row in enumerate(table) if i not in cuts]
    for i, fractions in sorted(cuts.items()):
        x0, y0, x1, y1, *rest = table[i]
        marks = [0.0, *sorted(set(fractions)), 1.0]
        for a, b in pairwise(marks):
            if (b - a) * np.hypot(x1 - x0, y1 - y0) > JOIN_MM:
                rows.append(
                    np.array(
                        [
                            x0 + a * (x1 - x0),
                            y0 + a * (y1 - y0),
                            x0 + b * (x1 - x0),
                            y0 + b * (y1 - y0),
                            *rest,
                        ]
                    )
                )
    return np.array(rows)


def _once(table: Floats) -> Floats:
    """Pieces drawn over one another, in whole or in part, once: the widest, and of those the first.

    A trace followed along both of them would come back over itself and add nothing anywhere.
    """
    ends = np.sort(_nodes(table[:, 0:2], table[:, 2:4], table[:, 5]), axis=1)
    order = np.lexsort((table[:, 6], -table[:, 4], ends[:, 1], ends[:, 0]))
    same = (ends[order][1:] == ends[order][:-1]).all(axis=1)
    again = order[1:][same]
    return table if not len(again) else np.delete(table, again, axis=0)


def _nodes(start: Floats, end: Floats, net: Floats) -> Ints:
    """Number the places where pieces of one net meet; shape (n, 2)."""
    ends = np.concatenate([start, end])
    keys = np.column_stack([np.round(ends / JOIN_MM), np.concatenate([net, net])]).astype(np.int64)
    _, numbers = np.unique(keys, axis=0, return_inverse=True)
    return numbers.reshape(2, -1).T.astype(np.intp)


def lay_all(board: Board, nets: frozenset[int], layers: Sequence[str]) -> tuple[Tracks, ...]:
    """Lay out the traces of some nets on all layers, or on those named.

    Parameters
    ----------
    board
        The board.
    nets
        Numbers of the nets to keep.
    layers
        Names of layers; empty: all.
    """
    laid = []
    first_part = 0
    for layer in board.layers:
        if not layers or layer.name in layers or layer.file in layers:
            laid.append(lay(board, layer, first_part, nets))
        first_part += len(layer.pieces)
    if layers and len(laid) < len(set(layers)):
        known = {name for layer in board.layers for name in (layer.name, layer.file)}
        unknown = sorted(set(layers) - known)
        if unknown:
            raise SplitcheckError(
                f"--layer {unknown[0]}",
                "there is no such copper layer",
                f"the layers are {', '.join(layer.name for layer in board.layers)}",
            )
    return tuple(laid)
