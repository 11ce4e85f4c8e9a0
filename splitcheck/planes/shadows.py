"""Shadows of traces on the planes above and below, and the runs where a plane is missing."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from typing import NamedTuple, TypeAlias

import numpy as np
import shapely

from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Tracks
from splitcheck.units import Floats, segments

#: Stretches of uncovered trace shorter than this are noise of the polygons, mm.
LEAST_RUN_MM = 2e-3

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
    for hit, tile, overlap in zip(hits.tolist(), tiles.tolist(), overlaps, strict=True):
        piece = int(which[hit])
        for start, stop in spans_of(tracks, piece, overlap):
            found[piece][plane.tiles[tile].gap].append((start, stop))
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


def spans_of(tracks: Tracks, piece: int, overlap: shapely.Geometry) -> list[Span]:
    """Where along a piece, in fractions of it, its common part with some shape lies."""
    (x0, y0), (x1, y1) = tracks.start[piece], tracks.end[piece]
    dx, dy = x1 - x0, y1 - y0
    square = dx * dx + dy * dy
    spans: list[Span] = []
    for line in getattr(overlap, "geoms", [overlap]):
        if line.geom_type != "LineString" or line.is_empty:
            continue
        at = [((x - x0) * dx + (y - y0) * dy) / square for x, y in line.coords]
        spans.append((max(min(at), 0.0), min(max(at), 1.0)))
    return spans


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
