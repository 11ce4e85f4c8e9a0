"""Centre lines of traces: the strokes of a copper layer that are not the paint of a pour."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import shapely
from shapely import Polygon

from splitcheck.copper.marks import Mark, Point, Stroke
from splitcheck.units import Floats, runs

#: A trace is bare this far beyond its edge, mm; paint is not (narrower clearances are not made).
BESIDE_MM = 0.02
#: Places along a stroke at which its sides are looked at, as fractions of its length.
LOOK_AT = (0.1, 0.3, 0.5, 0.7, 0.9)
MIDDLE = 2


class CentreLine(NamedTuple):
    """One stroke of a trace."""

    points: tuple[Point, ...]
    width_mm: float
    piece: int
    """Index of the piece of copper it lies in, in the order of the layer's pieces."""
    line: int
    """Line in the Gerber file."""


def centre_lines(marks: Sequence[Mark], pieces: Sequence[Polygon]) -> tuple[CentreLine, ...]:
    """Pick the strokes that are traces.

    Parameters
    ----------
    marks
        Marks of one copper layer in file order.
    pieces
        Its painted copper, disjoint polygons.

    Returns
    -------
    Strokes that (1) draw dark, (2) are longer than nothing, (3) lie on copper that was not
    cleared later, and (4) are bare on both sides along most of their length.

    Notes
    -----
    Rule 4 tells a trace from the paint of a pour: the strokes that fill a pour have copper on both
    sides, those along its rim on one. A trace that runs inside copper of its own net carries its
    return nowhere else and is rightly left out with them.
    """
    strokes = _drawn(marks)
    if not strokes or not pieces:
        return ()
    centre, left, right = _looks(strokes)
    if all(mark.dark for mark in marks):  # nothing parts a stroke: one look says where it lies
        piece = np.repeat(
            _piece_under(centre[:, MIDDLE : MIDDLE + 1], pieces), len(LOOK_AT), axis=1
        )
    else:
        piece = _piece_under(centre, pieces)
    first_look = np.full(len(strokes), -1)
    inside = piece >= 0
    first_look[np.arange(len(strokes))[inside.any(axis=1)]] = piece[
        inside.any(axis=1), inside.argmax(axis=1)[inside.any(axis=1)]
    ]
    free = _free(inside, (left, right), first_look, pieces)
    return tuple(
        CentreLine(strokes[i].points, strokes[i].width_mm, int(first_look[i]), strokes[i].line)
        for i in np.flatnonzero(free & (first_look >= 0)).tolist()
    )


def _drawn(marks: Sequence[Mark]) -> list[Stroke]:
    """Dark strokes longer than nothing."""
    drawn = [mark for mark in marks if type(mark) is Stroke and mark.dark and mark.width_mm > 0]
    ends = np.array([(*mark.points[0], *mark.points[-1]) for mark in drawn]).reshape(-1, 4)
    lengths = np.hypot(ends[:, 2] - ends[:, 0], ends[:, 3] - ends[:, 1])
    for number, mark in enumerate(drawn):
        if len(mark.points) > 2:
            lengths[number] = shapely.length(shapely.linestrings(mark.points))
    return [drawn[number] for number in np.flatnonzero(lengths > 1e-6).tolist()]


def _looks(strokes: Sequence[Stroke]) -> tuple[Floats, Floats, Floats]:
    """Points on, left and right of every stroke, each of shape (strokes, looks, 2)."""
    on = np.empty((len(strokes), len(LOOK_AT), 2))
    along = np.empty_like(on)
    plain = np.array([len(stroke.points) == 2 for stroke in strokes])
    fractions = np.array(LOOK_AT)
    if plain.any():
        ends = np.array([stroke.points for stroke in strokes if len(stroke.points) == 2])
        step = ends[:, 1] - ends[:, 0]
        on[plain] = ends[:, None, 0] + fractions[None, :, None] * step[:, None, :]
        along[plain] = (step / np.hypot(step[:, 0], step[:, 1])[:, None])[:, None, :]
    for i in np.flatnonzero(~plain).tolist():
        on[i], along[i] = _looks_along(np.array(strokes[i].points))
    half = np.array([stroke.width_mm / 2 + BESIDE_MM for stroke in strokes])[:, None, None]
    aside = half * np.stack([-along[..., 1], along[..., 0]], axis=-1)
    return on, on + aside, on - aside


def _looks_along(points: Floats) -> tuple[Floats, Floats]:
    steps = np.diff(points, axis=0)
    lengths = np.hypot(steps[:, 0], steps[:, 1])
    steps, lengths, starts = steps[lengths > 0], lengths[lengths > 0], points[:-1][lengths > 0]
    reached = np.concatenate([[0.0], np.cumsum(lengths)])
    at = np.array(LOOK_AT) * reached[-1]
    which = np.clip(np.searchsorted(reached, at, side="right") - 1, 0, len(steps) - 1)
    along = steps[which] / lengths[which, None]
    return starts[which] + along * (at - reached[which])[:, None], along


def _piece_under(
    points: Floats, pieces: Sequence[Polygon]
) -> np.ndarray[tuple[int, int], np.dtype[np.intp]]:
    """Index of the piece under each point, -1 where there is none; shape of ``points[..., 0]``."""
    flat = points.reshape(-1, 2)
    found = locate(flat[:, 0], flat[:, 1], pieces)
    return found.reshape(points.shape[:-1])  # type: ignore[return-value]


def locate(
    xs: Floats, ys: Floats, pieces: Sequence[Polygon]
) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
    """Index of the piece that contains each point, -1 where none does.

    Parameters
    ----------
    xs, ys
        Coordinates, shape (n,), mm.
    pieces
        Disjoint polygons.

    Returns
    -------
    Indexes into ``pieces``, shape (n,).

    Examples
    --------
    >>> locate(np.array([0.5, 5.0]), np.array([0.5, 5.0]), [shapely.box(0, 0, 1, 1)])
    array([ 0, -1])
    """
    return Pieces(pieces).at(xs, ys)


class Pieces:
    """Disjoint polygons that are asked more than once what lies at some points."""

    def __init__(self, pieces: Sequence[Polygon]) -> None:
        self._pieces = pieces
        self._tree = shapely.STRtree(list(pieces))

    def at(self, xs: Floats, ys: Floats) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
        """Index of the piece that contains each point, -1 where none does; as ``locate``."""
        found = np.full(len(xs), -1, dtype=np.intp)
        if not len(xs) or not len(self._pieces):
            return found
        points, hits = self._tree.query(shapely.points(xs, ys))
        order = np.argsort(hits, kind="stable")
        points, hits = points[order], hits[order]
        for start, stop in runs(hits):
            polygon, which = self._pieces[hits[start]], points[start:stop]
            if len(which) > 8:  # preparing costs more than a few plain tests
                shapely.prepare(polygon)
            inside = shapely.contains_xy(polygon, xs[which], ys[which])
            found[which[inside]] = hits[start]
        return found


def _free(
    inside: np.ndarray[tuple[int, int], np.dtype[np.bool_]],
    sides: tuple[Floats, Floats],
    piece: np.ndarray[tuple[int], np.dtype[np.intp]],
    pieces: Sequence[Polygon],
) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Which strokes are bare on both sides at most looks; asks only until that is settled."""
    rank = np.argsort(piece, kind="stable")
    bare = np.zeros(len(piece), dtype=np.intp)
    left = np.full(len(piece), len(LOOK_AT))
    for look in range(len(LOOK_AT)):
        # Neither settled as free, nor beyond reach of it.
        open_ = (bare * 2 <= len(LOOK_AT)) & ((bare + left) * 2 > len(LOOK_AT))
        rows = rank[(open_ & inside[:, look] & (piece >= 0))[rank]]
        for side in sides:
            rows = rows[~_on_own(side[rows, look], piece[rows], pieces)]
        bare[rows] += 1
        left -= 1
    return bare * 2 > len(LOOK_AT)


def _on_own(
    points: Floats, piece: np.ndarray[tuple[int], np.dtype[np.intp]], pieces: Sequence[Polygon]
) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Whether each point lies on its piece; sorted by piece."""
    on = np.zeros(len(points), dtype=np.bool_)
    for start, stop in runs(piece):
        polygon = pieces[piece[start]]
        if stop - start > 1:
            shapely.prepare(polygon)
        on[start:stop] = shapely.contains_xy(polygon, points[start:stop, 0], points[start:stop, 1])
    return on
