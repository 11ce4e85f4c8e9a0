"""Layers whose image is the clearance: turned round into copper, whether they say so or not."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace

import shapely
from shapely import MultiPolygon, Polygon

from splitcheck.board.parts import CopperLayer
from splitcheck.copper import paint
from splitcheck.copper.holes import Hole

#: Fewer plated holes than this prove nothing.
LEAST_HOLES = 12
#: Read as drawn, an undeclared negative plane covers less than this share of the board.
MOST_DRAWN = 0.5


def turn_round(layer: CopperLayer, outline: Polygon | MultiPolygon) -> CopperLayer:
    """The layer with copper where nothing is drawn, inside the outline."""
    pieces = paint.invert(layer.pieces, outline)
    return replace(layer, pieces=pieces, names=((),) * len(pieces), lines=(), pads=())


def looks_negative(
    layer: CopperLayer, count: int, outline: Polygon | MultiPolygon, holes: Sequence[Hole]
) -> bool:
    """Whether an inner layer makes sense only if its image is taken as clearance.

    Parameters
    ----------
    layer
        The layer as drawn.
    count
        Number of copper layers.
    outline
        Outline of the board.
    holes
        Plated holes.

    Notes
    -----
    Drawn as copper it would join nothing to anything: (1) it is an inner layer, (2) it draws pads
    at most of the plated holes or lets them through bare, (3) no piece of it meets two of them, and
    (4) it covers less than half of the board.
    """
    inner = 1 < layer.number < count
    if not inner or len(holes) < LEAST_HOLES or not layer.pieces:
        return False
    if sum(piece.area for piece in layer.pieces) > MOST_DRAWN * outline.area:
        return False
    places = shapely.points([hole.path[0] for hole in holes])
    tree = shapely.STRtree(list(layer.pieces))
    met = tree.query(places, predicate="intersects")
    return max(Counter(met[1].tolist()).values(), default=0) <= 1
