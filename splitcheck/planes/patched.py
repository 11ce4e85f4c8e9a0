"""A plane with more copper: what it would be after a mend."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import shapely
from shapely import Polygon

from splitcheck.planes.islands import Plane


def patched(plane: Plane, islands: Sequence[int], copper: shapely.Geometry) -> Plane | None:
    """The plane with copper added to an island, or joining several to the first of them.

    Parameters
    ----------
    plane
        The plane; it is left as it is.
    islands
        Indexes of the islands that the copper joins, one or more; they become one with the id of
        the first.
    copper
        What is added. Pieces of it that touch none of these islands are left out.

    Returns
    -------
    The new plane; None if the islands do not become one, or nothing was added.
    """
    own = [plane.islands[number].shape for number in islands]
    pieces = [
        piece
        for piece in shapely.get_parts(copper)
        if isinstance(piece, Polygon) and any(piece.distance(shape) < 1e-6 for shape in own)
    ]
    # a little overlap, for pieces that meet an island along a line
    grown = [piece.buffer(1e-4, join_style="mitre") for piece in pieces]
    whole = shapely.union_all([*own, *grown])
    if not pieces or not isinstance(whole, Polygon):
        return None
    first = islands[0]
    made = tuple(
        replace(island, shape=whole) if number == first else island
        for number, island in enumerate(plane.islands)
        if number == first or number not in islands
    )
    return Plane(plane.layer, made, Polygon(plane.gaps[0].shape.exterior))
