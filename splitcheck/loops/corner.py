"""Two ways for a return current in, their impedance and the frequency they swap at out."""

from __future__ import annotations

from collections.abc import Sequence
from math import cos, exp, hypot, inf, log, log1p, pi, sin, sqrt, tan, tanh
from typing import NamedTuple

from splitcheck.units import MU0

#: Resistivity of annealed copper at 20 C, ohm mm (IEC 60028: 1/58 ohm mm^2/m).
COPPER_OHM_MM = 1.0 / 58e3
#: From this many skin depths on, the far side of a foil does not matter.
_THICK = 20.0
#: Steps in which the frequency is set against the skin effect.
_STEPS = 60


class Way(NamedTuple):
    """One way a current can take."""

    resistance_mohm: float
    """At low frequency."""
    inductance_nh: float


def skin_depth_um(frequency_ghz: float) -> float:
    """Depth at which the current density in copper has fallen by e.

    Parameters
    ----------
    frequency_ghz
        GHz, > 0.

    Returns
    -------
    sqrt(rho/(pi f mu0)), micrometres.

    Examples
    --------
    >>> round(skin_depth_um(0.001))
    66
    """
    return 1e3 * sqrt(COPPER_OHM_MM / (pi * frequency_ghz * MU0))


def sheet_mohm(copper_um: float, frequency_ghz: float = 0.0) -> float:
    """Resistance of a square of copper foil that has the field on one of its faces.

    Parameters
    ----------
    copper_um
        Thickness t of the foil, micrometres, > 0.
    frequency_ghz
        GHz, >= 0.

    Returns
    -------
    mohm per square: rho/t at low frequency, rho/delta at high.

    Notes
    -----
    The real part of the surface impedance (1 + j) rho/delta coth((1 + j) t/delta), which is
    rho/delta (sinh 2u + sin 2u)/(cosh 2u - cos 2u) with u = t/delta.

    References
    ----------
    Ramo, Whinnery, Van Duzer, "Fields and Waves in Communication Electronics", the chapter on
    skin effect (from memory).

    Examples
    --------
    35 um is copper of one ounce:

    >>> round(sheet_mohm(35.0), 2), round(sheet_mohm(35.0, 0.1), 1)
    (0.49, 2.6)
    """
    thickness_mm = copper_um / 1e3
    still = 1e3 * COPPER_OHM_MM / thickness_mm
    if frequency_ghz <= 0.0:
        return still
    depth_mm = skin_depth_um(frequency_ghz) / 1e3
    u = thickness_mm / depth_mm
    if u > _THICK:
        return 1e3 * COPPER_OHM_MM / depth_mm
    if u < 1e-2:  # 0/0; the next term of the series is u^4/11
        return still
    # divided by cosh 2u, so that nothing grows without bound
    over = 1.0 / (0.5 * (exp(2 * u) + exp(-2 * u)))
    ratio = (tanh(2 * u) + sin(2 * u) * over) / (1.0 - cos(2 * u) * over)
    return 1e3 * COPPER_OHM_MM / depth_mm * ratio


def return_width_mm(height_mm: float, above_mm: float | None = None) -> float:
    """Width of a strip with the resistance that the return under a trace meets.

    Parameters
    ----------
    height_mm
        Height h of the trace over the plane, > 0.
    above_mm
        Distance b > h to a second plane on the trace's side, or None.

    Returns
    -------
    (integral of K)^2 / integral of K^2, mm, with K the density of the return in the plane.

    Notes
    -----
    Under a trace K = 1/(pi h) / (1 + (x/h)^2), which gives 2 pi h. Between two planes
    K = sin a/(2b) / (cosh(pi x/b) - cos a) with a = pi h/b (both by images), which gives
    2 b/pi (pi - a)^2 / (1 + (pi - a) cot a): pi h in the middle, 2 pi h for b >> h.

    Examples
    --------
    >>> round(return_width_mm(0.2), 2), round(return_width_mm(0.2, above_mm=0.4), 2)
    (1.26, 0.63)
    """
    if above_mm is None:
        return 2 * pi * height_mm
    angle = pi * height_mm / above_mm
    left = pi - angle
    return 2 * above_mm / pi * left**2 / (1.0 + left / tan(angle))


def spread_mohm(detour_mm: float, start_mm: float, copper_um: float) -> float:
    """Resistance that a way round a gap adds, to a current that spreads as it likes.

    Parameters
    ----------
    detour_mm
        What the way round is longer by, >= 0.
    start_mm
        Width of the return where it leaves the trace, `return_width_mm`, > 0.
    copper_um
        Thickness of the plane, > 0.

    Returns
    -------
    mohm, at low frequency.

    Notes
    -----
    On either side of the gap the return has half a plane: at a distance s from the trace it is
    w + pi s wide. Out on one side and back on the other, half the detour each, that makes
    2/pi ln(1 + pi detour/(2 w)) squares: detour/w for a short detour; for a long one the spreading
    resistance of contacts on the rim of a sheet, which grows as a logarithm only. Necks in the
    plane add to it.

    Examples
    --------
    >>> round(spread_mohm(20.0, return_width_mm(0.2), 35.0), 2)
    1.02
    """
    return sheet_mohm(copper_um) * 2 / pi * log1p(pi * detour_mm / (2 * start_mm))


def loop_nh_mm(height_mm: float, width_mm: float) -> float:
    """Loop inductance per length of a strip over a whole plane.

    Parameters
    ----------
    height_mm
        Height of the strip over the plane, > 0.
    width_mm
        Width of the strip, > 0.

    Returns
    -------
    nH/mm: the impedance of the line in air over the speed of light.

    References
    ----------
    Hammerstad and Jensen, "Accurate models for microstrip computer-aided design", IEEE MTT-S
    Digest 1980, p. 407, equations 1 and 2 (from memory).

    Examples
    --------
    >>> round(loop_nh_mm(0.2, 0.36), 3)
    0.315
    """
    u = width_mm / height_mm
    f = 6.0 + (2 * pi - 6.0) * exp(-((30.666 / u) ** 0.7528))
    return MU0 / (2 * pi) * log(f / u + hypot(1.0, 2.0 / u))


def ways(
    straight_mm: float,
    detour_mm: float,
    added_nh: float,
    *,
    height_mm: float,
    width_mm: float,
    copper_um: float,
) -> tuple[Way, Way]:
    """The direct way under a trace, were the plane whole, and the way round its gap.

    Parameters
    ----------
    straight_mm
        Length of the direct way, >= 0.
    detour_mm
        What the way round is longer by, >= 0.
    added_nh
        What the way round adds to the loop, >= 0.
    height_mm, width_mm
        The trace, > 0.
    copper_um
        Thickness of the plane, > 0.

    Returns
    -------
    Both ways with the inductance of their whole loop with the trace.

    Notes
    -----
    Under the trace R = sheet resistance * length / (2 pi h); the way round adds `spread_mohm`.

    Examples
    --------
    >>> direct, detour = ways(5, 20, 3.3, height_mm=0.2, width_mm=0.36, copper_um=35.0)
    >>> [round(value, 1) for value in (*direct, *detour)]
    [2.0, 1.6, 3.0, 4.9]
    """
    under_mm = return_width_mm(height_mm)
    own_mohm = sheet_mohm(copper_um) * straight_mm / under_mm
    own_nh = straight_mm * loop_nh_mm(height_mm, width_mm)
    more_mohm = spread_mohm(detour_mm, under_mm, copper_um)
    return Way(own_mohm, own_nh), Way(own_mohm + more_mohm, own_nh + added_nh)


def impedance_ohm(
    way: Way, frequencies_ghz: Sequence[float], copper_um: float | None = None
) -> tuple[float, ...]:
    """Magnitude of the impedance of a way against frequency.

    Parameters
    ----------
    way
        The way.
    frequencies_ghz
        GHz, each >= 0.
    copper_um
        Thickness of the copper the way runs in, whose resistance rises by the skin effect. None:
        the resistance stays as it is.

    Returns
    -------
    |R + j 2 pi f L| for each frequency, ohm.

    Examples
    --------
    >>> [round(z, 2) for z in impedance_ohm(Way(10.0, 230.0), [0.0, 0.001])]
    [0.01, 1.45]
    """
    return tuple(
        hypot(way.resistance_mohm / 1e3 * _rise(copper_um, f), 2 * pi * f * way.inductance_nh)
        for f in frequencies_ghz
    )


def swap_khz(one: Way, other: Way) -> float | None:
    """Frequency at which two ways have the same impedance.

    Parameters
    ----------
    one, other
        The ways.

    Returns
    -------
    kHz; below it most of the current takes the way of less resistance, above it the way of less
    inductance. None if one way has less of both.

    Notes
    -----
    |R1 + j w L1| = |R2 + j w L2| at w^2 = (R2^2 - R1^2)/(L1^2 - L2^2).

    Examples
    --------
    >>> round(swap_khz(Way(10.0, 230.0), Way(36.0, 70.0)), 1)
    25.1
    """
    more = other.resistance_mohm**2 - one.resistance_mohm**2
    less = one.inductance_nh**2 - other.inductance_nh**2
    if less == 0.0 or more / less <= 0.0:
        return None
    return 1e3 * sqrt(more / less) / (2 * pi)


def corner_khz(extra_mohm: float, added_nh: float, copper_um: float | None = None) -> float | None:
    """Frequency above which what a detour adds is inductance rather than resistance.

    Parameters
    ----------
    extra_mohm
        What the detour has more resistance than the direct way, at low frequency.
    added_nh
        What it has more inductance.
    copper_um
        Thickness of the copper, for the skin effect; None: leave it out.

    Returns
    -------
    The f in kHz at which extra R = 2 pi f L; None if the detour adds none of one or the other.

    Notes
    -----
    f = R/(2 pi L), the corner of any R and L in series. By the skin effect R rises at most as the
    root of f, so that there is one such f; it is found by halving its logarithm.

    Examples
    --------
    >>> round(corner_khz(2.46, 20.0), 1)
    19.6
    """
    if not (0.0 < extra_mohm < inf and 0.0 < added_nh < inf):
        return None
    plain_ghz = extra_mohm / 1e3 / (2 * pi * added_nh)
    low, high = 1.0, 2.0
    while _rise(copper_um, high * plain_ghz) > high:
        low, high = high, 2.0 * high
    for _ in range(_STEPS):
        middle = sqrt(low * high)
        low, high = (
            (middle, high) if _rise(copper_um, middle * plain_ghz) > middle else (low, middle)
        )
    return 1e6 * plain_ghz * sqrt(low * high)


def _rise(copper_um: float | None, frequency_ghz: float) -> float:
    """How many times its resistance at low frequency a foil has."""
    if copper_um is None:
        return 1.0
    return sheet_mohm(copper_um, frequency_ghz) / sheet_mohm(copper_um)


def detour_corner_khz(
    detour_mm: float,
    added_nh: float,
    *,
    height_mm: float,
    copper_um: float,
    above_mm: float | None = None,
) -> float | None:
    """Frequency above which the return round a gap follows inductance, not resistance.

    Parameters
    ----------
    detour_mm
        What the way round is longer by.
    added_nh
        What it adds to the loop inductance.
    height_mm
        Height of the trace over the plane, > 0.
    copper_um
        Thickness of the plane, > 0.
    above_mm
        Distance to a second plane on the trace's side, or None. This plane then carries the share
        1 - h/b of the return and adds the square of it to the resistance of the loop.

    Returns
    -------
    kHz, or None where there is no detour or nothing added.

    Notes
    -----
    `corner_khz` of `spread_mohm`, which starts `return_width_mm` wide. It is a screening value:
    the change from one regime to the other takes two or three decades.

    Examples
    --------
    >>> round(detour_corner_khz(20.0, 3.3, height_mm=0.2, copper_um=35.0))
    49
    """
    share = 1.0 if above_mm is None else 1.0 - height_mm / above_mm
    extra_mohm = spread_mohm(detour_mm, return_width_mm(height_mm, above_mm), copper_um)
    return corner_khz(share**2 * extra_mohm, added_nh, copper_um)
