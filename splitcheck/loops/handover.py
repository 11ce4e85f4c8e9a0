"""What it costs a return to go from plane to plane: over vias, parts, or between the plates."""

from __future__ import annotations

from collections.abc import Sequence
from math import acosh, e, log, pi, sqrt

import numpy as np

from splitcheck.copper.marks import Point
from splitcheck.loops.share import via_matrix
from splitcheck.units import MU0

#: Permittivity of vacuum, nF/mm.
E0_NF = 8.8541878128e-6
#: Two barrels are at least this many diameters apart: nearer ones would touch.
LEAST_APART = 1.05


def line_nh(apart_mm: float, diameter_mm: float, plates_mm: float) -> float:
    """Inductance of a via and the via that its return takes, between two planes.

    Parameters
    ----------
    apart_mm, diameter_mm
        Distance of the centres and diameter of the barrels, mm, > 0.
    plates_mm
        Distance between the two planes, mm, > 0.

    Notes
    -----
    L = mu0 d/pi acosh(s/D): two-wire line between plates; textbook, H. Johnson, EDN, "Parasitic
    inductance of bypass capacitors", has its limit mu0 d/pi ln(2s/D).

    Examples
    --------
    >>> [round(line_nh(s, 0.3, 0.8), 2) for s in (1.0, 5.0, 20.0)]
    [0.6, 1.12, 1.57]
    """
    return MU0 * plates_mm / pi * acosh(max(apart_mm / diameter_mm, LEAST_APART))


def shared_nh(
    at: Point,
    diameter_mm: float,
    ways: Sequence[tuple[Point, float, float]],
    plates_mm: float,
) -> float:
    """Inductance of a via whose return takes several ways between two planes.

    Parameters
    ----------
    at, diameter_mm
        The via and its barrel, mm.
    ways
        Place, diameter in mm, and own inductance in nH (of a part as mounted; 0 for a via) of every
        way, one or more.
    plates_mm
        Distance between the two planes, mm, > 0.

    Notes
    -----
    The field between the plates is that of line currents, mu0 d/(2 pi) ln(1/r) each; the ways share
    the return so that the energy is least. For n vias on a circle of radius s this comes to
    mu0 d/(2 pi) (ln(s/r) + ln(s/(n r))/n). Pairs keep the distance (s + sqrt(s^2 - D^2))/2 at which
    one via alone gives mu0 d/pi acosh(s/D).

    Examples
    --------
    >>> one = shared_nh((0.0, 0.0), 0.3, [((1.0, 0.0), 0.3, 0.0)], 0.8)
    >>> round(one, 3) == round(line_nh(1.0, 0.3, 0.8), 3)
    True
    """
    wide = np.array([diameter_mm, *(way[1] for way in ways)])
    places = np.array([at, *(way[0] for way in ways)])
    matrix = via_matrix(places, wide.tolist(), plates_mm)
    apart = np.hypot(*(places[:, None, :] - places).transpose(2, 0, 1))
    mean = (wide[:, None] + wide) / 2
    apart = np.maximum(apart, LEAST_APART * mean)
    eased = (apart + np.sqrt(apart**2 - mean**2)) / 2
    off = ~np.eye(len(places), dtype=bool)
    matrix[off] = -MU0 * plates_mm / (2 * pi) * np.log(eased[off])
    own = np.array([way[2] for way in ways])
    inner = matrix[1:, 1:] + np.diag(own)
    # least of M + 2 m i + i K i with the currents adding up to -1
    ones = np.ones(len(ways))
    solved = np.linalg.solve(
        inner + 1e-9 * np.eye(len(ways)), np.column_stack([ones, matrix[1:, 0]])
    )
    back = solved[:, 0] * ((ones @ solved[:, 1] - 1.0) / (ones @ solved[:, 0])) - solved[:, 1]
    return float(matrix[0, 0] + 2 * matrix[1:, 0] @ back + back @ inner @ back)


def plates_nf(area_mm2: float, plates_mm: float, er: float) -> float:
    """Capacitance of two planes, nF.

    Notes
    -----
    C = e0 er A/d.

    Examples
    --------
    >>> round(1000 * plates_nf(100.0, 0.1, 4.3), 1), round(1000 * plates_nf(100.0, 1.0, 4.3), 1)
    (38.1, 3.8)
    """
    return E0_NF * er * area_mm2 / plates_mm


def between_plates_nh(
    diameter_mm: float, plates_mm: float, area_mm2: float, rise_ns: float, plates_nf_: float
) -> float:
    """What a return meets that has no other way than the capacitance between two planes.

    Parameters
    ----------
    diameter_mm
        Barrel of the via, mm, > 0.
    plates_mm, area_mm2
        Distance of the planes at the via, and the area that they share.
    rise_ns
        Rise time of the edge, ns, > 0.
    plates_nf_
        Capacitance of the planes, nF, > 0.

    Notes
    -----
    Spreading mu0 d/(2 pi) ln(R/r) out to the radius of the planes (radial plane pair), and the
    voltage that the edge leaves on C: a ramp of current I charges it to I tr/(2 C), which is what
    tr^2/(2 C) nH would show.

    Examples
    --------
    >>> round(between_plates_nh(0.3, 0.1, 5000.0, 1.0, plates_nf(5000.0, 0.1, 4.3)), 2)
    0.37
    """
    radius = max(sqrt(area_mm2 / pi), e * diameter_mm / 2)
    spread = MU0 * plates_mm / (2 * pi) * log(radius / (diameter_mm / 2))
    return spread + rise_ns**2 / (2.0 * plates_nf_)
