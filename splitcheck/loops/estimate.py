"""Closed-form estimate of the loop inductance a gap adds, with how far it may be off."""

from __future__ import annotations

from dataclasses import dataclass
from math import acosh, e, hypot, inf, log, log1p, pi, sqrt

from splitcheck.units import MU0

#: Slot stub fit, nH/mm: see ``stub_nh``.
STUB_NH_MM = 0.987
#: A run this many times longer than the nearest copper is away goes along the gap.
LONG_RUN = 3.0


@dataclass(frozen=True, slots=True)
class Inductance:
    """Added loop inductance and how sure it is."""

    added_nh: float
    error_nh: float


def stub_nh(reach_mm: float, gap_mm: float, height_mm: float, width_mm: float) -> float:
    """Half the inductance of a slot stub seen from the trace that crosses it.

    Parameters
    ----------
    reach_mm
        From the trace's centre line along the slot to its end, mm, >= 0.
    gap_mm
        Width of the slot, mm, > 0.
    height_mm
        Dielectric between trace and plane, mm, > 0.
    width_mm
        Width of the trace, mm, > 0.

    Returns
    -------
    nH, >= 0.

    Notes
    -----
    With he = h + w/4:  g = 0.987 nH/mm (a - 4 he/pi ln(1 + a/he)) / ln(4 a/(e s) + 1/(1 + a/(5 s)))

    The leading factor is pi mu0/4; the logarithm is that of a static slot, and the bracket takes
    off what the return has spread by already at height h. Fitted to a voxel field solver's closed
    slots of 4 to 24 mm; not a law.

    Examples
    --------
    >>> round(stub_nh(8.0, 0.4, 0.2, 0.4), 2)
    1.96
    """
    if reach_mm <= 0.0:
        return 0.0
    spread = height_mm + width_mm / 4.0
    length = max(reach_mm - 4.0 * spread / pi * log1p(reach_mm / spread), 0.0)
    logarithm = log(4.0 * reach_mm / (e * gap_mm) + 1.0 / (1.0 + reach_mm / (5.0 * gap_mm)))
    return STUB_NH_MM * length / max(logarithm, 0.3)


def beside_edge_nh_mm(inside_mm: float, height_mm: float) -> float:
    """What a straight plane edge adds per length to a trace along it, nH/mm.

    Parameters
    ----------
    inside_mm
        How far inside the edge the trace runs, mm; negative: outside the copper.
    height_mm
        Height above the plane, mm, > 0.

    Notes
    -----
    dL' = mu0/(2 pi) ln(2 sqrt(rho (rho - s)/2) / h), rho = sqrt(s^2 + h^2): half-plane by the
    conformal map w = sqrt(z), exact.

    Examples
    --------
    >>> [round(1000 * beside_edge_nh_mm(s, 1.0), 1) for s in (3.0, 1.0, 0.0, -3.0)]
    [2.6, 15.8, 69.3, 366.3]
    """
    rho = hypot(inside_mm, height_mm)
    # rho - s loses all its digits deep inside; there it equals h^2 / (rho + s)
    less = height_mm**2 / (rho + inside_mm) if inside_mm > 0 else rho - inside_mm
    return MU0 / (2.0 * pi) * log(2.0 * sqrt(rho * less / 2.0) / height_mm)


def beside_void_nh(edge_nh: float, aside_mm: float, deep_mm: float, height_mm: float) -> float:
    """What a closed gap beside a trace adds, nH.

    Parameters
    ----------
    edge_nh
        What the rim along the trace would add were it the edge of the plane: the sum of
        ``beside_edge_nh_mm`` along it, nH.
    aside_mm
        Distance of the rim from the centre line, mm, >= 0.
    deep_mm
        How far the gap reaches away from the trace, mm, > 0.
    height_mm
        Height of the trace, mm, > 0.

    Notes
    -----
    (E + 0.31 h (B/h)^0.47 e) / (1 + 3.4 (h/B)^1.7), e the edge's nH/mm at the nearest place: a deep
    gap is an edge, its corners let through some more, and a shallow one fades. Fitted to 36 runs of
    this package's own field solve (rectangles of 0.3 to 8 by 1 to 8 heights, 0.1 to 1 h off): 8 %
    low to 69 % high, the latter where little is added; not a law.

    Examples
    --------
    >>> round(beside_void_nh(8.0 * beside_edge_nh_mm(0.5, 1.0), 0.5, 8.0, 1.0), 3)
    0.26
    """
    corners = 0.31 * height_mm * (deep_mm / height_mm) ** 0.47
    whole = edge_nh + corners * beside_edge_nh_mm(aside_mm, height_mm)
    return float(whole / (1.0 + 3.4 * (height_mm / deep_mm) ** 1.7))


def shielding(beyond_mm: float | None, gap_mm: float, reach_mm: float, height_mm: float) -> float:
    """Share of a gap's inductance that is left with a whole plane beyond it at some distance.

    Parameters
    ----------
    beyond_mm
        Distance from the broken plane to the whole one, mm, > 0; None: there is none.
    gap_mm, reach_mm
        Width of the gap along the trace and how far it reaches on either side, mm, > 0.
    height_mm
        Height of the trace over the broken plane, mm, > 0.

    Notes
    -----
    1/(1 + (l/d)^1.15) with l = 0.215 s^0.17 a^0.62 h^0.21: the field of a gap fades at a
    distance that grows with its length and hardly with its width. Fitted to 345 runs of this
    package's own field solve (s 0.2 to 8, a 1 to 8, h 0.1 to 0.5, d 0.1 to 2 mm): 6.5 % rms, 38 %
    at worst; not a law.

    Examples
    --------
    >>> shielding(None, 1.0, 10.0, 0.2), round(shielding(0.5, 1.0, 10.0, 0.2), 2)
    (1.0, 0.43)
    """
    if beyond_mm is None:
        return 1.0
    fades_mm = 0.215 * gap_mm**0.17 * reach_mm**0.62 * height_mm**0.21
    return 1.0 / (1.0 + float((fades_mm / beyond_mm) ** 1.15))


def between(below: float, above: float) -> float:
    """Share of a slot's inductance left with whole planes on both sides.

    Notes
    -----
    The two half spaces of a slot are in parallel. One of them shielded by a share s has the
    conductance 1/s - 1/2 of the whole; both add up.

    Examples
    --------
    >>> between(1.0, 1.0), round(between(0.4, 1.0), 3), round(between(0.4, 0.4), 3)
    (1.0, 0.4, 0.25)
    """
    return 1.0 / (1.0 / below + 1.0 / above - 1.0)


def handed_over(planes_mm: float, island_mm2: float, share: float) -> Inductance:
    """What it costs when a plane's share of the return must leave it for the other plane.

    Parameters
    ----------
    planes_mm
        Distance between the two planes, mm, > 0.
    island_mm2
        Area of the smaller of the islands that are cut apart, mm2, > 0.
    share
        Part of the return that the broken plane carries, 0 to 1.

    Notes
    -----
    On either side of the gap the current spreads between the two planes out to the size of the
    island: L = 2 mu0 d/(2 pi) ln(R/d), radial spreading in a plane pair. A bound in kind; the
    error is as large as the value.
    """
    size = max(sqrt(island_mm2 / pi) / planes_mm, e)
    value = share**2 * MU0 * planes_mm / pi * log(size)
    return Inductance(value, value + 0.01)


def via_pair_nh(apart_mm: float, diameter_mm: float, plane_gap_mm: float) -> float:
    """Loop inductance of two vias between two planes: down on one side of a gap, up on the other.

    Notes
    -----
    L = mu0 d/pi acosh(s/D), s centre distance, D barrel diameter (two-wire line).

    Examples
    --------
    >>> round(via_pair_nh(1.0, 0.3, 0.8), 2)
    0.6
    """
    return MU0 * plane_gap_mm / pi * acosh(max(apart_mm / diameter_mm, 1.05))


def added(
    reach_mm: tuple[float, float],
    bridge_nh: tuple[float, float],
    gap_mm: float,
    height_mm: float,
    width_mm: float,
    *,
    beyond_mm: float | None,
    above_mm: float | None,
    share: float,
) -> Inductance | None:
    """Added loop inductance of a crossing by closed forms.

    Parameters
    ----------
    reach_mm
        How far along the gap the return must go on the left and on the right, mm; inf: no way.
    bridge_nh
        What the bridge taken on either side adds, nH; 0 for plane copper.
    gap_mm
        Length of trace over the gap, mm, > 0.
    height_mm, width_mm
        Height over the plane and width of the trace, mm, > 0.
    beyond_mm
        Distance from the plane to a whole plane beyond it, mm; None without one.
    above_mm
        Distance from the plane to a whole plane on the trace's other side, mm; None without one.
    share
        Part of the return that this plane carries, 0 to 1.

    Returns
    -------
    The estimate, or None if there is no way on either side.

    Notes
    -----
    The stubs on the two sides of the trace are in parallel, L = 2 g1 g2 / (g1 + g2); with one side
    open the other carries all, L = 2 g. A run much longer than the way to the nearest copper goes
    along the gap, not across it: there it costs what a plane edge that far off costs per length.
    A plane with a share k of the return adds k^2 of the whole.
    """
    reach = _both_sides_mm(reach_mm)
    left = between(
        shielding(beyond_mm, gap_mm, reach, height_mm),
        shielding(above_mm, gap_mm, reach, height_mm),
    )
    stubs = [
        # what a bridge adds lies between the planes: the plane beyond does not shield it
        2.0 * stub_nh(side, gap_mm, height_mm, width_mm) * left + bridge
        for side, bridge in zip(reach_mm, bridge_nh, strict=True)
        if side < inf
    ]
    if not stubs:
        return None
    value = stubs[0] if len(stubs) == 1 else stubs[0] * stubs[1] / max(sum(stubs), 1e-12)
    error = 0.2 + (0.1 if any(bridge_nh) else 0.0)
    nearest = min(reach_mm)
    spread = height_mm + width_mm / 4.0
    if gap_mm > LONG_RUN * nearest or nearest < spread:
        # along a gap rather than across it: copper that ends as far off as the return is
        value = gap_mm * beside_edge_nh_mm(-nearest, height_mm) * left
        value += bridge_nh[reach_mm.index(nearest)]
        error += 0.4
    elif nearest < 3.0 * spread:
        error += 0.4
    if len(stubs) == 1 and nearest < 6.0 * spread and not any(bridge_nh):
        error += 0.2  # on one side only the return spreads less than the stub's formula has it
    if beyond_mm is not None or above_mm is not None:
        error += 0.2
    value *= share**2
    return Inductance(value, error * value + 0.01)


def _both_sides_mm(reach_mm: tuple[float, float]) -> float:
    """Reach of the even gap that adds as much: the two sides are in parallel."""
    one, other = (max(reach, 1e-3) for reach in reach_mm)
    return 2.0 * min(one, other) if inf in (one, other) else 2.0 * one * other / (one + other)
