"""What a trace shares with a plane of finite width: the voltage along it drives cables."""

from __future__ import annotations

from math import pi

import numpy as np

from splitcheck.units import MU0, Floats


def common_nh_mm(width_mm: Floats, offset_mm: Floats, height_mm: float) -> Floats:
    """Inductance that a trace shares with its plane: what drives cables at its ends, nH/mm.

    Parameters
    ----------
    width_mm
        Widths of the plane across the trace, mm, > 0.
    offset_mm
        Distances of the trace from the middle of the plane, mm, of either sign.
    height_mm
        Its height over the plane, mm, > 0.

    Notes
    -----
    L'cm = mu0/(2 pi) ln|w0|, w0 outside the unit circle with z = (W/4)(w0 + 1/w0), z = x + jh: a
    strip of width W by Joukowski's map, exact. Same physics as Leone, IEEE Trans. EMC 43(4), 2001.
    Away from the edge it is mu0 h/(pi W) / sqrt(1 - (2x/W)^2).

    Examples
    --------
    >>> around = common_nh_mm(np.array([100.0, 100.0, 20.0]), np.array([0.0, 45.0, 9.0]), 1.0)
    >>> [round(1000 * float(x), 2) for x in around]
    [4.0, 9.13, 41.9]
    """
    z = (np.abs(offset_mm) + 1j * height_mm) / (np.asarray(width_mm, dtype=float) / 2)
    root = np.sqrt(z - 1) * np.sqrt(z + 1)
    shared: Floats = MU0 / (2 * pi) * np.log(np.abs(z + root))
    return shared
