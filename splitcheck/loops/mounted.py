"""What a two-pad part adds as mounted: its body, the copper to its holes, and the holes down."""

from __future__ import annotations

from math import acosh, exp, isfinite, log, pi, sqrt, tau

from splitcheck.errors import SplitcheckError
from splitcheck.units import MU0

#: Inductance of a part's body beyond that of a flat strip in its place, nH: an 0603 capacitor as
#: D. Brooks quotes it (si-list, 17 Mar 1999: bodies 0.2 to 0.4 nH).
BODY_NH = 0.3
#: Width of the copper between a pad and its hole, the body counted in, mm (common practice).
STRIP_MM = 0.5
#: Barrel of a plated hole whose drill is not known, mm (common practice, no source).
BARREL_MM = 0.3
#: Part and strip lie no nearer to a plane than this, mm: half the height of a small body.
LOWEST_MM = 0.1


def strip_nh_mm(width_mm: float, height_mm: float) -> float:
    """Inductance per length of a flat strip over a plane, nH/mm.

    Parameters
    ----------
    width_mm, height_mm
        Width of the strip and its height over the plane, mm, > 0.

    Notes
    -----
    L' = mu0/(2 pi) ln(F/u + sqrt(1 + (2/u)^2)), u = w/h,
    F = 6 + (2 pi - 6) exp(-(30.666/u)^0.7528): line impedance in air over the speed of light;
    Hammerstad and Jensen, IEEE MTT-S 1980 (from memory).

    Examples
    --------
    >>> round(strip_nh_mm(0.5, 0.2), 3), round(strip_nh_mm(0.5, 1.2), 3)
    (0.261, 0.592)
    """
    u = width_mm / height_mm
    factor = 6.0 + (tau - 6.0) * exp(-((30.666 / u) ** 0.7528))
    return MU0 / tau * log(factor / u + sqrt(1.0 + (2.0 / u) ** 2))


def mounted_nh(
    span_mm: float,
    depths_mm: tuple[float, float],
    diameter_mm: float = BARREL_MM,
    *,
    width_mm: float = STRIP_MM,
    body_nh: float = BODY_NH,
) -> float:
    """Inductance of a two-pad part as mounted over its planes.

    Parameters
    ----------
    span_mm
        From where its current leaves one plane to where it enters the other: hole to hole, or pad
        where the plane lies on the part's own layer; mm, >= 0.
    depths_mm
        How far below the part either plane lies, mm, >= 0; 0 for one on its own layer.
    diameter_mm
        Barrel of the holes, mm, > 0.
    width_mm
        Width of the copper from pad to hole, mm, > 0.
    body_nh
        What the body adds beyond a flat strip in its place, nH, >= 0.

    Returns
    -------
    nH, > 0.

    Raises
    ------
    SplitcheckError
        If a length is not a number of its range.

    Notes
    -----
    L = body + s L'(w, h) + (h1 + h2)/2 mu0/pi acosh(s/D): a strip of the length of the span over
    the farther plane, and a pair of holes as a two-wire line, half of it for either side. Against
    layouts as usual 1 to 2 nH (S. Weir, si-list, Nov 2000, takes 1.5 to 2 nH).

    Examples
    --------
    An 0603 with a hole 0.5 mm beyond either pad, over a plane 0.2 mm and 0.5 mm down:

    >>> [round(mounted_nh(2.6, (h, h)), 2) for h in (0.2, 0.5)]
    [1.21, 1.97]
    """
    lengths = {"span_mm": span_mm, "depths_mm": min(depths_mm), "body_nh": body_nh}
    for name, value in lengths.items():
        if not (isfinite(value) and value >= 0.0):
            raise SplitcheckError(name, f"{value} is no length", "give 0 or more")
    for name, value in {"diameter_mm": diameter_mm, "width_mm": width_mm}.items():
        if not (isfinite(value) and value > 0.0):
            raise SplitcheckError(name, f"{value} is no width", "give millimetres greater than 0")
    if not isfinite(max(depths_mm)):
        raise SplitcheckError("depths_mm", f"{max(depths_mm)} is no depth", "give millimetres")
    strip = span_mm * strip_nh_mm(width_mm, max(*depths_mm, LOWEST_MM))
    pair = MU0 / pi * acosh(max(span_mm / diameter_mm, 1.05))
    return body_nh + strip + sum(depths_mm) / 2.0 * pair
