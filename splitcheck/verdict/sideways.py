"""Places along a line, and which way its left is there."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import LineString

from splitcheck.units import Floats

#: How far apart the places are, mm, ...
STEP_MM = 0.25
#: ... and how many there are at most.
MOST_STEPS = 400


def steps_along(start_mm: float, stop_mm: float) -> Floats:
    """Lengths along a line, both ends among them.

    Examples
    --------
    >>> steps_along(1.0, 1.5).tolist()
    [1.0, 1.1666666666666667, 1.3333333333333333, 1.5]
    """
    count = min(int((stop_mm - start_mm) / STEP_MM) + 2, MOST_STEPS)
    return np.linspace(start_mm, stop_mm, count)


def to_the_left(line: LineString, along_mm: Floats) -> tuple[Floats, Floats]:
    """The places at these lengths along a line, and unit vectors to its left there, mm.

    Both have the shape (n, 2). Where a line turns back on itself there is no left: zeros.

    Examples
    --------
    >>> places, left = to_the_left(LineString([(0, 0), (2, 0)]), np.array([0.0, 1.5]))
    >>> places.tolist(), left.tolist()
    ([[0.0, 0.0], [1.5, 0.0]], [[0.0, 1.0], [0.0, 1.0]])
    """
    eye = min(STEP_MM / 2, line.length / 4)
    places, ahead, behind = (
        shapely.get_coordinates(line.interpolate(at))
        for at in (
            along_mm,
            np.minimum(along_mm + eye, line.length),
            np.maximum(along_mm - eye, 0.0),
        )
    )
    way = ahead - behind
    length = np.hypot(way[:, 0], way[:, 1])
    length[length == 0.0] = 1.0
    return places, np.stack([-way[:, 1], way[:, 0]], axis=1) / length[:, None] + 0.0
