"""Marks to copper: the exact image of a layer, painted dark and clear in file order."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.copper.marks import Mark
from splitcheck.copper.outlines import Shapes, outlines

#: More overlaps of dark and clear boxes than this are not sorted out; runs are painted in turn.
MOST_PAIRS = 5_000_000


def paint(marks: Sequence[Mark]) -> tuple[Polygon, ...]:
    """Paint marks in file order: dark adds copper, clear takes away what stands so far.

    Parameters
    ----------
    marks
        Strokes, flashes and fills in file order.

    Returns
    -------
    Disjoint connected pieces of copper with their holes, mm, valid, sorted by place. Pieces that
    share only a corner are separate.

    Examples
    --------
    >>> from splitcheck.copper.marks import NO_TAG, Fill
    >>> square = Fill(((0, 0), (2, 0), (2, 2), (0, 2), (0, 0)), True, NO_TAG, 1)
    >>> cut = Fill(((1, 0), (3, 0), (3, 2), (1, 2), (1, 0)), False, NO_TAG, 2)
    >>> [piece.area for piece in paint([square, cut])]
    [2.0]
    """
    shapes = outlines(marks)
    dark = np.fromiter((mark.dark for mark in marks), dtype=bool, count=len(marks))
    return _sorted(_painted(shapes, dark))


def invert(pieces: Sequence[Polygon], outline: Polygon) -> tuple[Polygon, ...]:
    """Copper of a negative layer: what its image leaves of the board.

    Parameters
    ----------
    pieces
        The image as painted, mm.
    outline
        The board, holes included, mm.
    """
    if not pieces:
        return _sorted(shapely.get_parts(outline))
    image = shapely.multipolygons(np.array(pieces, dtype=object))
    return _sorted(shapely.get_parts(shapely.difference(outline, image)))


def landed(marks: Sequence[Mark], pieces: Sequence[Polygon]) -> tuple[tuple[int, ...], ...]:
    """On which pieces of copper each mark came to lie.

    Parameters
    ----------
    marks
        The marks that were painted, in file order.
    pieces
        Copper painted from them.

    Returns
    -------
    For each mark the numbers of the pieces it is part of, ascending; ``()`` for clear marks and
    for those that were cleared away. More than one only where later clears cut a mark apart.
    """
    shapes = outlines(marks)
    dark = np.fromiter((mark.dark for mark in marks), dtype=bool, count=len(marks))
    owners, points = _witnesses(shapes, dark)
    found: list[set[int]] = [set() for _ in marks]
    if len(points) and len(pieces):
        # The tree holds points, so that each piece is prepared once and asks for all of its own.
        tree = shapely.STRtree(points)
        piece, point = tree.query(np.array(pieces, dtype=object), predicate="intersects")
        for number, owner in zip(piece.tolist(), owners[point].tolist(), strict=True):
            found[owner].add(number)
    return tuple(tuple(sorted(numbers)) for numbers in found)


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
    for mark, numbers in zip(marks, landed(marks, pieces), strict=True):
        if mark.tag.net:
            for number in numbers:
                found[number].add(mark.tag.net)
    return tuple(tuple(sorted(held)) for held in found)


def _painted(shapes: Shapes, dark: NDArray[np.bool_]) -> Shapes:
    """The pieces of the image; what lies in the same layer of paint is done at once."""
    if dark.all():
        return _united(shapes)
    standing: Shapes = np.empty(0, dtype=object)
    coats = _coats(shapes, dark)
    for number in range(int(coats.max()) + 1):
        coat = shapes[coats == number]
        if number % 2 == 0:
            standing = np.concatenate((standing, coat))
        elif len(standing) and len(coat):
            standing = _cleared(_united(standing) if number > 1 else standing, coat)
    return _united(standing)


def _coats(shapes: Shapes, dark: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Give each mark a coat of paint: dark ones even, clear ones odd, in an order that counts.

    A mark must come after the earlier marks of the other polarity that it may overlap; those it
    does not overlap commute with it. So a file that changes polarity ten thousand times is
    mostly painted in two or three coats.
    """
    coats = np.zeros(len(shapes), dtype=np.int64)
    pairs = _overlaps(shapes, dark)
    if pairs is None:
        changes = np.flatnonzero(np.diff(dark.astype(np.int8)))
        coats[changes + 1] = 1
        return np.cumsum(coats) + (0 if dark[0] else 1)
    earlier, later = pairs
    starts = np.searchsorted(later, np.arange(len(shapes) + 1))
    # Clear marks with nothing before them to clear still count as odd.
    coats[~dark] = 1
    for number in np.unique(later).tolist():
        before = earlier[starts[number] : starts[number + 1]]
        coats[number] = max(coats[number], int(coats[before].max()) + 1)
    return coats


def _overlaps(
    shapes: Shapes, dark: NDArray[np.bool_]
) -> tuple[NDArray[np.int64], NDArray[np.int64]] | None:
    """Pairs (earlier, later) of opposite polarity whose boxes meet, sorted by the later one."""
    dark_at, clear_at = np.flatnonzero(dark), np.flatnonzero(~dark)
    tree = shapely.STRtree(shapes[dark_at])
    found: list[NDArray[np.int64]] = []
    total = 0
    for chunk in np.array_split(clear_at, max(1, len(clear_at) // 256)):
        clear, hit = tree.query(shapes[chunk])
        total += len(hit)
        if total > MOST_PAIRS:
            return None
        found.append(np.stack((chunk[clear], dark_at[hit])))
    earlier, later = np.sort(np.concatenate(found, axis=1), axis=0)
    order = np.argsort(later, kind="stable")
    return earlier[order], later[order]


def _cleared(standing: Shapes, clear: Shapes) -> Shapes:
    """What clear shapes leave: only pieces that one of them meets are touched."""
    tree = shapely.STRtree(clear)
    piece, hit = tree.query(standing, predicate="intersects")
    left = standing.copy()
    starts = np.searchsorted(piece, np.arange(len(standing) + 1))
    for number in np.unique(piece).tolist():
        cutters = clear[hit[starts[number] : starts[number + 1]]]
        cutter = cutters[0] if len(cutters) == 1 else shapely.union_all(cutters)
        left[number] = shapely.difference(standing[number], cutter)
    return left


def _united(shapes: Shapes) -> Shapes:
    """Connected pieces of the union."""
    whole = shapely.disjoint_subset_union_all(shapes)
    parts: Shapes = shapely.get_parts(whole)
    return parts


def _sorted(parts: Shapes) -> tuple[Polygon, ...]:
    solid = [part for part in parts if isinstance(part, Polygon) and part.area > 0]
    return tuple(sorted(solid, key=lambda part: (part.bounds, part.area)))


def _witnesses(shapes: Shapes, dark: NDArray[np.bool_]) -> tuple[NDArray[np.int64], Shapes]:
    """Points that stand for dark marks: one inside each, or one in each part that is left."""
    owners = np.flatnonzero(dark & ~shapely.is_empty(shapes))
    whole = shapes[owners]
    if dark.all():
        return owners, shapely.point_on_surface(whole)
    clear_at = np.flatnonzero(~dark)
    tree = shapely.STRtree(shapes[clear_at])
    mark, hit = tree.query(whole, predicate="intersects")
    later = clear_at[hit] > owners[mark]
    mark, hit = mark[later], clear_at[hit[later]]
    cut = np.unique(mark)
    starts = np.searchsorted(mark, np.arange(len(owners) + 1))
    parts: list[BaseGeometry] = []
    held: list[int] = []
    for number in cut.tolist():
        cutter = shapely.union_all(shapes[hit[starts[number] : starts[number + 1]]])
        for part in shapely.get_parts(shapely.difference(whole[number], cutter)):
            if isinstance(part, Polygon) and not part.is_empty:
                parts.append(part)
                held.append(int(owners[number]))
    kept = np.setdiff1d(np.arange(len(owners)), cut)
    return (
        np.concatenate((owners[kept], np.array(held, dtype=np.int64))),
        shapely.point_on_surface(np.concatenate((whole[kept], np.array(parts, dtype=object)))),
    )
