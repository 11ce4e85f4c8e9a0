"""Ragged gaps in, whether a solve of them is worth a try out: about how many panels it needs."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from shapely import LineString, Polygon

#: Panels at a trace and their growth where they are as coarse as a solve may make them, in heights
#: and per mm of distance: what `solve` starts from, made coarser twice.
_NEAR, _SLOPE, _FAR = 1.7, 0.9, 25.0
#: Gaps with no more corners than this are always tried: they hardly ever are too many.
FEW_CORNERS = 5000
#: Of gaps with up to 12000 corners on four boards, none that asked for less than 100 failed to be
#: meshed, 11 that asked for more did, and took 0.2 to 0.5 s to fail.
_MOST = 80.0


def is_too_much(gaps: Sequence[Polygon], lines: Sequence[LineString], height_mm: float) -> bool:
    """Whether a solve is likely to need more panels than it may have, however coarse.

    Parameters
    ----------
    gaps
        Gaps as they would be solved, mm.
    lines
        Centre lines of the traces.
    height_mm
        Their height over the plane.

    Notes
    -----
    A ragged gap is channels, narrower than the panels wanted there, so that a panel is a stretch of
    channel as long as the panel wanted: half the rim over that size, summed over all of the rim.

    Examples
    --------
    >>> is_too_much([shapely.box(-0.2, -4, 0.2, 4)], [LineString([(-9, 0), (9, 0)])], 0.2)
    False
    """
    if int(shapely.get_num_coordinates(gaps).sum()) <= FEW_CORNERS:
        return False
    rings = shapely.get_rings(np.array(gaps, dtype=object))
    ends, ring = shapely.get_coordinates(rings, return_index=True)
    same = ring[1:] == ring[:-1]
    length = np.hypot(*np.diff(ends, axis=0).T)[same]
    middle = ((ends[1:] + ends[:-1]) / 2)[same]
    far = shapely.distance(shapely.multilinestrings(list(lines)), shapely.points(middle))
    near = _NEAR * height_mm
    wanted = np.maximum(near, _SLOPE * far * (1.0 + far / (_FAR * near)))
    return float((length / (2 * wanted)).sum()) > _MOST
