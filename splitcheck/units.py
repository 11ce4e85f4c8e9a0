"""Units and constants: mm, ns, nH, ohm, mV, A, GHz throughout; inch only where a file is read.

The set is coherent (1 V = 1 nH A/ns), so textbook formulas are typed as printed.
"""

from __future__ import annotations

from math import pi

import numpy as np
import shapely
from numpy.typing import NDArray

Floats = NDArray[np.float64]

#: Vacuum permeability, nH/mm.
MU0 = 0.4 * pi
#: Speed of light, mm/ns.
C0 = 299.792458
#: Coordinates are rounded once to this on reading, mm (1 nm: exact for metric 4.6).
GRID_MM = 1e-6
#: One inch, mm.
INCH_MM = 25.4


def on_grid(value_mm: float) -> float:
    """Round a coordinate to the 1 nm grid, so that equal points compare equal.

    Examples
    --------
    >>> on_grid(0.1 + 0.2)
    0.3
    """
    return round(value_mm, 6)


def segments(ends: Floats) -> NDArray[np.object_]:
    """Straight lines from an array of shape (n, 2, 2); always an array, of shape (n,)."""
    lines: NDArray[np.object_] = np.atleast_1d(np.asarray(shapely.linestrings(ends), dtype=object))
    return lines


def runs(ranked: NDArray[np.intp]) -> list[tuple[int, int]]:
    """Start and stop of every run of equal values in a sorted array.

    Examples
    --------
    >>> runs(np.array([2, 2, 5])), runs(np.array([], dtype=np.intp))
    ([(0, 2), (2, 3)], [])
    """
    if not len(ranked):
        return []
    starts = [0, *(np.flatnonzero(np.diff(ranked)) + 1).tolist()]
    return list(zip(starts, [*starts[1:], len(ranked)], strict=True))
