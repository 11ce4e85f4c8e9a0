"""Carriers: which planes carry the return current of a trace, place by place along it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from splitcheck.board.board import Board
from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Ints, Tracks

#: Traces are looked at every so many mm: what is shorter is an antipad, or a finding.
LOOK_MM = 0.5
#: A plane that carries less than this share of a return, beside another one, is not told.
LEAST_SHARE = 0.1


class Carrier(NamedTuple):
    """A plane that carries a return, or a share of it."""

    layer: int
    net: int


@dataclass(frozen=True, slots=True)
class Carried:
    """What carries the returns of one layer's traces."""

    first: Ints
    """Where each piece's looks begin, with a last one past the end; shape (pieces + 1,)."""
    state: Ints
    """For every look, evenly spread along its piece, the index of its carriers."""
    carriers: tuple[tuple[Carrier, ...], ...]
    """Distinct sets of carriers, nearest plane first; an empty one where there is no plane."""


def carried(board: Board, planes: Sequence[Plane], tracks: Tracks) -> Carried:
    """Find the planes that carry the returns of a layer's traces.

    Parameters
    ----------
    board
        The board, for the distances of its layers.
    planes
        All planes.
    tracks
        The traces of one layer.

    Notes
    -----
    On each side the nearest plane with copper there carries; between two planes at h1 and h2 the
    share of the first is 1 - h1 / (h1 + h2), which follows from the images of a thin line.
    """
    looks = np.maximum(np.ceil(tracks.length_mm / LOOK_MM), 1).astype(np.intp)
    first = np.concatenate([[0], np.cumsum(looks)]).astype(np.intp)
    piece = np.repeat(np.arange(len(looks)), looks)
    at = (np.arange(len(piece)) - first[piece] + 0.5) / looks[piece]
    points = tracks.start[piece] + at[:, None] * (tracks.end[piece] - tracks.start[piece])
    xs, ys = points[:, 0], points[:, 1]
    columns = [_nearest(board, planes, tracks.layer, side, xs, ys) for side in (-1, 1)]
    _keep_shares(board, tracks.layer, columns)
    table, state = np.unique(np.concatenate(columns, axis=1), axis=0, return_inverse=True)
    return Carried(
        first,
        state.reshape(-1).astype(np.intp),
        tuple(_carriers(board, tracks.layer, row) for row in table.tolist()),
    )


def _nearest(
    board: Board, planes: Sequence[Plane], layer: int, side: int, xs: np.ndarray, ys: np.ndarray
) -> Ints:
    """Layer and net of the nearest plane on one side of every point, 0 and -1 where none is."""
    found = np.zeros((len(xs), 2), dtype=np.intp)
    found[:, 1] = -1
    bare = np.arange(len(xs))
    on_side = [plane for plane in planes if (plane.layer - layer) * side > 0]
    for plane in sorted(on_side, key=lambda plane: abs(plane.layer - layer)):
        if not len(bare):
            break
        island = plane.island_at(xs[bare], ys[bare])
        nets = np.array([island.net for island in plane.islands], dtype=np.intp)
        hit = island >= 0
        found[bare[hit], 0] = plane.layer
        found[bare[hit], 1] = nets[island[hit]]
        bare = bare[~hit]
    return found


def _keep_shares(board: Board, layer: int, columns: Sequence[Ints]) -> None:
    """Take out planes whose share beside the other one is too small to be told."""
    far = np.array(
        [
            0.0 if number in {0, layer} else board.stack.height_mm(layer, number)
            for number in range(len(board.stack.layers) + 1)
        ]
    )
    one, other = far[columns[0][:, 0]], far[columns[1][:, 0]]
    both = (columns[0][:, 0] > 0) & (columns[1][:, 0] > 0)
    share = np.where(both, other / np.maximum(one + other, 1e-9), 0.5)
    for column, gone in zip(columns, (share < LEAST_SHARE, share > 1 - LEAST_SHARE), strict=True):
        column[gone & both] = (0, -1)


def _carriers(board: Board, layer: int, row: Sequence[int]) -> tuple[Carrier, ...]:
    found = [Carrier(row[i], row[i + 1]) for i in (0, 2) if row[i] > 0]
    return tuple(sorted(found, key=lambda c: (board.stack.height_mm(layer, c.layer), c.layer)))
