"""Boxes in, halved ones or what polygons leave of them out."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.loops.outlines import Ints
from splitcheck.units import Floats


def halved(boxes: Floats, middle: Floats, over: NDArray[np.bool_]) -> tuple[Floats, Ints]:
    """Halve boxes along the axes that are too long.

    Parameters
    ----------
    boxes
        West, south, east, north, shape (n, 4).
    middle
        Where to part them, shape (n, 2).
    over
        Which axes are too long, shape (n, 2).

    Returns
    -------
    The parts, and the number of the box each is of.
    """
    owner = np.arange(len(boxes))
    for axis in (0, 1):
        split = np.flatnonzero(over[owner, axis])
        low, high = boxes.copy(), boxes[split]
        low[split, 2 + axis] = high[:, axis] = middle[owner[split], axis]
        boxes, owner = np.concatenate([low, high]), np.concatenate([owner, owner[split]])
    return boxes, owner


def clips(shapes: NDArray[np.object_], boxes: Floats) -> NDArray[np.object_]:
    """Clip polygons to boxes; by far faster than an intersection where they are intricate.

    Parameters
    ----------
    shapes
        Polygons, or what is left of them in larger boxes, shape (n,).
    boxes
        West, south, east, north, shape (n, 4).

    Returns
    -------
    What of each lies in its box, shape (n,).

    Examples
    --------
    >>> corner = shapely.box(0, 0, 2, 2)
    >>> pieces = clips(np.array([corner] * 4), np.array([[1.0, 1.0, 3.0, 3.0]] * 4))
    >>> float(pieces[0].area)
    1.0
    """
    out = np.empty(len(shapes), dtype=object)
    for k, (shape, box) in enumerate(zip(shapes, boxes.tolist(), strict=True)):
        # each clip takes as long as the checks of `shapely.clip_by_rect`, which takes one at a time
        out[k] = shapely.lib.clip_by_rect(shape, *box)
    bad = ~shapely.is_valid(out)
    if bad.any():
        out[bad] = shapely.intersection(shapes[bad], shapely.box(*boxes[bad].T))
    return out
