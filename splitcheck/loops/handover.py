"""What it costs a return to go from plane to plane: over vias, parts, or between the plates."""

from __future__ import annotations

from collections.abc import Sequence
from math import acosh, e, log, pi, sin, sqrt

import numpy as np

from splitcheck.copper.marks import Point
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.share import via_matrix
from splitcheck.units import MU0

#: Permittivity of vacuum, nF/mm.
E0_NF = 8.8541878128e-6
#: Two barrels are at least this many diameters apart: nearer ones would touch.
LEAST_APART = 1.05
#: How far ``over_holes`` may be off.
HOLES_ERROR = 0.35


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


def over_holes(
    ends: Sequence[tuple[Point, Sequence[tuple[Point, float]]]],
    run_mm: float,
    height_mm: float,
    width_mm: float,
    planes_mm: float,
) -> Inductance:
    """What a gap adds when the return gets past it on the plane on the trace's other side.

    Parameters
    ----------
    ends
        For either end of the run over the gap: its place on the rim, and place and diameter of the
        plated holes near it that join the two planes, one or more, mm.
    run_mm
        Length of the run, mm, > 0.
    height_mm, width_mm
        Height of the trace over the broken plane, and its width, mm, > 0.
    planes_mm
        Distance between the two planes, mm, > `height_mm`.

    Notes
    -----
    By Thomson's principle (currents in perfect conductors flow so that the energy is least;
    textbook, from memory) no way that the current can take has less energy than the true
    one, so that each is a bound. On this way the part k = 1 - h/d of the return that flows on the
    broken plane comes up at the rim, on a width of two spreads of the return, 2 (h + w/4), and
    goes between the planes to the holes: `shared_nh`. Along the run all of it flows on the other
    plane, and the loop per length is that of a trace d - h above that plane in place of a trace
    between two:

        mu0/(2 pi) ln(pi (d - h)/(d sin(pi h/d)))

    (images of a thin line between planes: ln(2 d sin(pi h/d)/(pi r)) with both, ln(2 (d - h)/r)
    with one; textbook). What the rim takes of the room between the planes is left out, so that it
    is a bound only nearly: 17 % below to 63 % above 120 of this package's own field solves of
    splits (h 0.1 to 0.3, d 0.2 to 1.3, runs of 0.5 to 8, holes within 4 mm), in the middle 8 %
    above.

    Examples
    --------
    A split of 2 mm under a trace 0.2 mm above, the other plane 0.8 mm off, two holes at each end:

    >>> one = ((-1.0, 0.0), [((-2.0, y), 0.47) for y in (-1.0, 1.0)])
    >>> other = ((1.0, 0.0), [((2.0, y), 0.47) for y in (-1.0, 1.0)])
    >>> round(over_holes([one, other], 2.0, 0.2, 0.4, 0.8).added_nh, 2)
    0.88
    """
    wide_mm = 2.0 * (height_mm + width_mm / 4.0)
    far_mm = planes_mm - height_mm
    part = far_mm / planes_mm
    between = sum(
        shared_nh(at, wide_mm, [(*hole, 0.0) for hole in holes], planes_mm) for at, holes in ends
    )
    along = log(pi * far_mm / (planes_mm * sin(pi * height_mm / planes_mm)))
    value = part**2 * between + run_mm * MU0 / (2.0 * pi) * along
    return Inductance(value, HOLES_ERROR * value + 0.01)


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
