"""Shadows of traces on the planes above and below, and the runs where a plane is missing."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from typing import NamedTuple, TypeAlias

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Ints, Tracks
from splitcheck.units import Floats, segments

#: Stretches of uncovered trace shorter than this are noise of the polygons, mm.
LEAST_RUN_MM = 2e-3

_LINE_STRING = 1
"""Number of that kind of geometry in shapely."""

Span: TypeAlias = tuple[float, float]


class Bare(NamedTuple):
    """A stretch of one straight piece with no copper of one plane over or under it."""

    start: float
    """Fractions of the piece, 0 to 1."""
    stop: float
    gap: int
    """Index of the gap in the plane."""


Uncovered: TypeAlias = dict[int, tuple[Bare, ...]]
"""By index of the piece; pieces that are fully covered are not in it."""


def uncovered(tracks: Tracks, plane: Plane, pieces: Sequence[int]) -> Uncovered:
    """Find where pieces of trace run over gaps of a plane.

    Parameters
    ----------
    tracks
        Straight pieces of one layer.
    plane
        Reference copper of another layer.
    pieces
        Indexes of the pieces to look at.

    Returns
    -------
    For each piece not fully covered its bare stretches, in order, one gap each.
    """
    which = np.asarray(pieces, dtype=np.intp)
    if not len(which) or not plane.tiles:
        return {}
    lines = segments(np.stack([tracks.start[which], tracks.end[which]], axis=1))
    hits, tiles = plane.tiles_over(lines)
    shapes = np.array([plane.tiles[tile].shape for tile in tiles], dtype=object)
    overlaps = shapely.intersection(lines[hits], shapes)
    found: dict[int, dict[int, list[Span]]] = defaultdict(lambda: defaultdict(list))
    owner, starts, stops = spans_of(tracks, which[hits], overlaps)
    gaps = np.array([tile.gap for tile in plane.tiles], dtype=np.intp)[tiles]
    for piece, gap, start, stop in zip(
        which[hits][owner].tolist(),
        gaps[owner].tolist(),
        starts.tolist(),
        stops.tolist(),
        strict=True,
    ):
        found[piece][gap].append((start, stop))
    result: Uncovered = {}
    for piece, by_gap in sorted(found.items()):
        slack = LEAST_RUN_MM / float(tracks.length_mm[piece])
        bare = [
            Bare(start, stop, gap)
            for gap, spans in by_gap.items()
            for start, stop in merged(spans, slack)
            if stop - start > min(slack, 0.5)
        ]
        if bare:
            result[piece] = tuple(sorted(bare))
    return result


def spans_of(
    tracks: Tracks, pieces: Ints, overlaps: NDArray[np.object_]
) -> tuple[Ints, Floats, Floats]:
    """Where along pieces, in fractions of them, their common parts with some shapes lie.

    Parameters
    ----------
    tracks
        Straight pieces of one layer.
    pieces
        Index of the piece that each overlap is part of, shape (n,).
    overlaps
        Geometries, shape (n,); points among them do not count.

    Returns
    -------
    For each straight part the number of its overlap, and the fractions of the piece where it
    starts and stops, shape (m,) each; in the order of the overlaps.
    """
    parts, owner = shapely.get_parts(overlaps, return_index=True)
    lines = (shapely.get_type_id(parts) == _LINE_STRING) & ~shapely.is_empty(parts)
    parts, owner = parts[lines], owner[lines]
    corners, part = shapely.get_coordinates(parts, return_index=True)
    if not len(parts):
        return owner, np.empty(0), np.empty(0)
    along = tracks.end[pieces] - tracks.start[pieces]
    square = along[:, 0] * along[:, 0] + along[:, 1] * along[:, 1]
    whose = owner[part]
    off, ahead = corners - tracks.start[pieces[whose]], along[whose]
    at = (off[:, 0] * ahead[:, 0] + off[:, 1] * ahead[:, 1]) / square[whose]
    first = np.searchsorted(part, np.arange(len(parts)))
    return (
        owner,
        np.maximum(np.minimum.reduceat(at, first), 0.0),
        np.minimum(np.maximum.reduceat(at, first), 1.0),
    )


def merged(spans: Iterable[Span], slack: float = 0.0) -> list[Span]:
    """Join spans that touch or lie within ``slack`` of each other, in order.

    Examples
    --------
    >>> merged([(0.5, 0.75), (0.0, 0.25), (0.25, 0.5), (0.9, 1.0)])
    [(0.0, 0.75), (0.9, 1.0)]
    """
    joined: list[Span] = []
    for start, stop in sorted(spans):
        if joined and start <= joined[-1][1] + slack:
            joined[-1] = (joined[-1][0], max(joined[-1][1], stop))
        else:
            joined.append((start, stop))
    return joined


def common(one: Sequence[Span], other: Sequence[Span]) -> list[Span]:
    """What two ordered lists of spans have in common.

    Examples
    --------
    >>> common([(0.0, 0.5)], [(0.25, 1.0)])
    [(0.25, 0.5)]
    """
    return [(max(a, c), min(b, d)) for a, b in one for c, d in other if min(b, d) > max(a, c)]


def without(span: Span, taken: Sequence[Span]) -> list[Span]:
    """What is left of a span when ordered spans are taken away.

    Examples
    --------
    >>> without((0.0, 1.0), [(0.25, 0.5)])
    [(0.0, 0.25), (0.5, 1.0)]
    """
    left: list[Span] = []
    start, stop = span
    for a, b in taken:
        if b <= start or a >= stop:
            continue
        if a > start:
            left.append((start, a))
        start = max(start, b)
    if start < stop:
        left.append((start, stop))
    return left


def nearest_cover(
    planes: Sequence[Plane], layers: Sequence[int], xs: Floats, ys: Floats, least: float = 1.0
) -> int | None:
    """The first of some layers whose reference copper covers most of some points.

    Parameters
    ----------
    planes
        All planes.
    layers
        Layer numbers, nearest first.
    xs, ys
        Points, shape (n,), mm.
    least
        Share of the points that must be covered, 0 to 1.
    """
    by_layer = {plane.layer: plane for plane in planes}
    for layer in layers:
        plane = by_layer.get(layer)
        if plane is not None and float((plane.island_at(xs, ys) >= 0).mean()) >= least:
            return layer
    return None
