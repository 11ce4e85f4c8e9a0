"""Marks to copper: the exact image of a layer, painted dark and clear in file order."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from shapely import MultiPolygon, Polygon

from splitcheck.copper.coats import coats
from splitcheck.copper.landing import landed, names
from splitcheck.copper.marks import Mark
from splitcheck.copper.outlines import Shapes, outlines
from splitcheck.copper.pens import outlines_to_unite
from splitcheck.copper.union import added, cleared, united

__all__ = ["invert", "landed", "names", "paint"]


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
    if all(mark.dark for mark in marks):
        return _sorted(united(outlines_to_unite(marks)))
    shapes = outlines(marks)
    dark = np.array([mark.dark for mark in marks])
    coat = coats(shapes, dark)
    standing: Shapes = np.empty(0, dtype=object)
    for number in range(int(coat.max()) + 1):
        fresh = shapes[coat == number]
        even = number % 2 == 0
        standing = added(standing, united(fresh)) if even else cleared(standing, fresh)
    return _sorted(standing)


def invert(pieces: Sequence[Polygon], outline: Polygon | MultiPolygon) -> tuple[Polygon, ...]:
    """Copper of a negative layer: what its image leaves of the board.

    Parameters
    ----------
    pieces
        The image as painted, mm.
    outline
        The board, holes included, mm.
    """
    image = shapely.MultiPolygon(list(pieces))
    return _sorted(shapely.get_parts(shapely.difference(outline, image)))


def _sorted(parts: Shapes) -> tuple[Polygon, ...]:
    solid = [part for part in parts if isinstance(part, Polygon) and part.area > 0]
    return tuple(sorted(solid, key=lambda part: (part.bounds, part.area)))
