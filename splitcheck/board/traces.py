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
    strokes = [
        mark
        for mark in marks
        if isinstance(mark, Stroke) and mark.dark and mark.width_mm > 0 and _length_mm(mark) > 1e-6
    ]
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
    bare = ~_on_piece(left, first_look, pieces) & ~_on_piece(right, first_look, pieces)
    free = (inside & bare).sum(axis=1) * 2 > len(LOOK_AT)
    return tuple(
        CentreLine(strokes[i].points, strokes[i].width_mm, int(first_look[i]), strokes[i].line)
        for i in np.flatnonzero(free & (first_look >= 0)).tolist()
    )


def _length_mm(stroke: Stroke) -> float:
    (x0, y0), (x1, y1) = stroke.points[0], stroke.points[-1]
    if len(stroke.points) > 2:
        return float(shapely.length(shapely.linestrings(stroke.points)))
    return float(np.hypot(x1 - x0, y1 - y0))


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
    found = np.full(len(xs), -1, dtype=np.intp)
    if not len(xs) or not pieces:
        return found
    tree = shapely.STRtree(list(pieces))
    points, hits = tree.query(shapely.points(xs, ys))
    order = np.argsort(hits, kind="stable")
    points, hits = points[order], hits[order]
    for start, stop in runs(hits):
        polygon, which = pieces[hits[start]], points[start:stop]
        if len(which) > 8:  # preparing costs more than a few plain tests
            shapely.prepare(polygon)
        inside = shapely.contains_xy(polygon, xs[which], ys[which])
        found[which[inside]] = hits[start]
    return found


def _on_piece(
    points: Floats,
    piece: np.ndarray[tuple[int], np.dtype[np.intp]],
    pieces: Sequence[Polygon],
) -> np.ndarray[tuple[int, int], np.dtype[np.bool_]]:
    """Whether each point lies on the piece that its stroke belongs to."""
    on = np.zeros(points.shape[:-1], dtype=np.bool_)
    order = np.argsort(piece, kind="stable")
    ranked = piece[order]
    for start, stop in runs(ranked):
        if ranked[start] < 0:
            continue
        rows = order[start:stop]
        polygon = pieces[ranked[start]]
        if len(rows) > 1:
            shapely.prepare(polygon)
        at = points[rows]
        on[rows] = shapely.contains_xy(polygon, at[..., 0], at[..., 1])
    return on  # type: ignore[return-value]
