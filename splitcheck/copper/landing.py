"""Which mark came to lie on which piece of copper, and what names the pieces carry by that."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import fills
from splitcheck.copper.marks import Fill, Flash, Mark, Stroke
from splitcheck.copper.outlines import Shapes, outlines
from splitcheck.units import Floats


def landed(
    marks: Sequence[Mark], pieces: Sequence[Polygon], *, named: bool = False
) -> tuple[tuple[int, ...], ...]:
    """On which pieces of copper each mark came to lie.

    Parameters
    ----------
    marks
        The marks that were painted, in file order.
    pieces
        Copper painted from them.
    named
        Ask only for marks with a net name; others get ``()``.

    Returns
    -------
    For each mark the numbers of the pieces it is part of, ascending; ``()`` for clear marks and
    for those that were cleared away. More than one only where later clears cut a mark apart.
    """
    asked = [
        number for number, mark in enumerate(marks) if mark.dark and (mark.tag.net or not named)
    ]
    found: list[tuple[int, ...]] = [()] * len(marks)
    owner, piece = _landings(marks, pieces, asked)
    starts = np.flatnonzero(np.diff(owner, prepend=-1)).tolist()
    whole = tuple((number,) for number in range(len(pieces)))
    owners, on = owner.tolist(), piece.tolist()
    for start, stop in pairwise([*starts, len(owners)]):
        found[owners[start]] = whole[on[start]] if stop - start == 1 else tuple(on[start:stop])
    return tuple(found)


def _landings(
    marks: Sequence[Mark], pieces: Sequence[Polygon], asked: list[int]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Pairs of a mark and a piece it lies on, each once, sorted."""
    owners, points = _witnesses(marks, asked)
    if not len(points) or not len(pieces):
        return np.empty(0, dtype=np.int64), np.empty(0, dtype=np.int64)
    # The tree holds points, so that each piece is prepared once and asks for all of its own.
    tree = shapely.STRtree(points)
    piece, point = tree.query(np.array(pieces, dtype=object), predicate="intersects")
    pairs = np.unique(owners[point] * len(pieces) + piece)
    return pairs // len(pieces), pairs % len(pieces)


def names(marks: Sequence[Mark], pieces: Sequence[Polygon]) -> tuple[tuple[str, ...], ...]:
    """Net names that each piece of copper carries.

    Parameters
    ----------
    marks
        The marks that were painted, in file order.
    pieces
        Copper painted from them.

    Returns
    -------
    For each piece the distinct names of the dark marks that still lie on it, sorted; unknown
    (``None``) and none (``""``) do not count.
    """
    found: list[set[str]] = [set() for _ in pieces]
    asked = [number for number, mark in enumerate(marks) if mark.dark and mark.tag.net]
    for number, piece in zip(*map(np.ndarray.tolist, _landings(marks, pieces, asked)), strict=True):
        net = marks[number].tag.net
        assert net is not None
        found[piece].add(net)
    return tuple(tuple(sorted(held)) for held in found)


def _witnesses(marks: Sequence[Mark], asked: list[int]) -> tuple[NDArray[np.int64], Shapes]:
    """Points that stand for marks: one inside each, or one in each part that clears leave."""
    clear_at = np.array([n for n, mark in enumerate(marks) if not mark.dark], dtype=np.int64)
    if not len(clear_at) or not asked:
        return _quick_witnesses(marks, asked)
    chosen = np.array(asked, dtype=np.int64)
    shapes = outlines([marks[n] for n in asked])
    clear = outlines([marks[n] for n in clear_at.tolist()])
    mark, hit = shapely.STRtree(clear).query(shapes, predicate="intersects")
    later = clear_at[hit] > chosen[mark]
    mark, hit = mark[later], hit[later]
    cut = np.unique(mark)
    starts = np.searchsorted(mark, np.arange(len(chosen) + 1))
    parts: list[BaseGeometry] = []
    held: list[int] = []
    for number in cut.tolist():
        cutter = shapely.union_all(clear[hit[starts[number] : starts[number + 1]]])
        for part in shapely.get_parts(shapely.difference(shapes[number], cutter)):
            if isinstance(part, Polygon) and not part.is_empty:
                parts.append(part)
                held.append(asked[number])
    kept = np.setdiff1d(np.flatnonzero(~shapely.is_empty(shapes)), cut)
    whole = np.concatenate((shapes[kept], np.array(parts, dtype=object)))
    owners = np.concatenate((chosen[kept], np.array(held, dtype=np.int64)))
    return owners, shapely.point_on_surface(whole)


def _quick_witnesses(marks: Sequence[Mark], asked: list[int]) -> tuple[NDArray[np.int64], Shapes]:
    """Where nothing is cleared: a point inside each mark, without drawing its outline."""
    inside: dict[int, tuple[float, float]] = {}
    owners: list[int] = []
    points: list[tuple[float, float]] = []
    slow: list[int] = []
    for number in asked:
        mark = marks[number]
        if isinstance(mark, Stroke) and mark.shape is None:
            if mark.width_mm > 0:
                (ax, ay), (bx, by) = mark.points[:2]
                owners.append(number)
                points.append(((ax + bx) / 2, (ay + by) / 2))
        elif isinstance(mark, Flash):
            if id(mark.shape) not in inside:
                spot = mark.shape.point_on_surface()
                inside[id(mark.shape)] = (spot.x, spot.y)
            dx, dy = inside[id(mark.shape)]
            owners.append(number)
            points.append((mark.at[0] + dx, mark.at[1] + dy))
        elif isinstance(mark, Fill) and (at := fills.inside(np.array(mark.ring))) is not None:
            owners.append(number)
            points.append(at)
        else:
            slow.append(number)
    shapes = outlines([marks[n] for n in slow])
    solid = ~shapely.is_empty(shapes)
    rest = shapely.point_on_surface(shapes[solid])
    corners: Floats = np.array(points).reshape(-1, 2)
    return (
        np.concatenate((owners, np.array(slow, dtype=np.int64)[solid])).astype(np.int64),
        np.concatenate((np.asarray(shapely.points(corners), dtype=object), rest)),
    )
