"""What an added inductance does to a net: noise voltage, level, and the order of findings."""

from __future__ import annotations

from collections.abc import Iterable
from math import exp, inf, pi, sqrt
from typing import NamedTuple

from splitcheck.units import C0
from splitcheck.verdict.findings import LEVELS, Finding, Level
from splitcheck.verdict.rules import Class

#: Impedance of a gap as a line, seen from the trace that crosses it: two stubs of some 90 ohm, one
#: on either side, in parallel.
SLOT_LINE_OHM = 45.0
#: A gap is a lumped inductance while a wave runs along it in less than this share of the rise time.
LUMPED_SHARE = 0.25


def noise_mv(added_nh: float, drive: Class) -> float:
    """Peak voltage across an added inductance in a matched line.

    Parameters
    ----------
    added_nh
        Added loop inductance, nH, >= 0.
    drive
        Rise time, amplitude and line.

    Returns
    -------
    mV; at most twice the wave.

    Notes
    -----
    v = 2 V (tau/tr) (1 - exp(-tr/tau)), tau = L / (2 Z0): a ramp into a series inductance between
    two matched halves of a line. Textbook; for tr >> tau it is L dI/dt.

    Examples
    --------
    >>> from splitcheck.verdict.rules import DEFAULT_CLASS
    >>> round(noise_mv(3.0, DEFAULT_CLASS))
    99
    """
    if added_nh < 1e-12:  # so small that tr / tau may not be a number
        return 0.0
    tau_ns = added_nh / (2.0 * drive.line_ohm)
    return 2.0 * drive.wave_mv * tau_ns / drive.rise_ns * (1.0 - exp(-drive.rise_ns / tau_ns))


class Noise(NamedTuple):
    """A noise voltage, and whether it stands at the limit of the gap as a line."""

    mv: float
    capped: bool


def noise_over_gap(added_nh: float, drive: Class, along_ns: float) -> Noise:
    """Peak voltage across a gap that may be too long for the rise time to be one inductance.

    Parameters
    ----------
    added_nh
        Added loop inductance, nH, >= 0.
    drive
        Rise time, amplitude and line.
    along_ns
        How long a wave runs along the gap, from the trace to where the return gets round, ns: on
        the longer side.

    Notes
    -----
    The gap is two stubs of slot line, one on either side of the trace, in series with it. Until
    the end of a stub answers, after 2 along_ns, it is a resistor; both in parallel are Zs = 45 ohm,
    and between two matched halves of a line they see

        v = 2 V Zs / (Zs + 2 Z0)

    which is a limit however fast the edge. While a wave runs along the stub in less than a quarter
    of the rise time the lumped formula of ``noise_mv`` holds. Between the two it is taken up to
    this limit, but never less than it gives where it still holds, at a rise of 4 along_ns: a faster
    edge makes no less noise.

    A break of 50 mm, crossed 20 mm from its open end by a step of 300 mV in 0.3 ns at 50 ohm, made
    almost 100 mV (D. C. Smith, Technical Tidbit, December 2002); with 12.5 nH the lumped formula
    has 227 mV there, this one 186 mV.

    Examples
    --------
    >>> from splitcheck.verdict.rules import Class
    >>> step = Class("step", 0.3, 300.0, 50.0, 18.0, 6.0)
    >>> mv, capped = noise_over_gap(12.5, step, 30 * slot_ns_mm(4.3, 1.0))
    >>> round(mv), capped, round(noise_mv(12.5, step))
    (186, True, 227)
    """
    lumped = noise_mv(added_nh, drive)
    if along_ns <= LUMPED_SHARE * drive.rise_ns:
        return Noise(lumped, False)
    slowest = along_ns / LUMPED_SHARE
    held = noise_mv(added_nh, _slower(drive, slowest))
    limit = max(slot_limit_mv(drive), held)
    return Noise(min(lumped, limit), lumped > limit)


def _slower(drive: Class, rise_ns: float) -> Class:
    return Class(drive.name, rise_ns, drive.wave_mv, drive.line_ohm, 0.0, 0.0)


def slot_limit_mv(drive: Class) -> float:
    """The most that a gap as a line makes of a wave, mV: 2 V Zs / (Zs + 2 Z0).

    Examples
    --------
    >>> from splitcheck.verdict.rules import DEFAULT_CLASS
    >>> round(slot_limit_mv(DEFAULT_CLASS))
    1024
    """
    return 2.0 * drive.wave_mv * SLOT_LINE_OHM / (SLOT_LINE_OHM + 2.0 * drive.line_ohm)


def slot_ns_mm(er_above: float, er_below: float) -> float:
    """How long a wave runs along a gap, ns for each mm.

    Notes
    -----
    sqrt(e) / c with the mean of the two dielectrics: 5.4 ps/mm between woven glass and air, 6.9
    inside the board.

    Examples
    --------
    >>> round(1000 * slot_ns_mm(4.3, 1.0), 2), round(1000 * slot_ns_mm(4.3, 4.3), 2)
    (5.43, 6.92)
    """
    return sqrt((er_above + er_below) / 2.0) / C0


def crosstalk_mv(mutual_nh: Iterable[tuple[float, Class]]) -> float:
    """What other nets over a gap induce in one when they switch together, mV.

    Parameters
    ----------
    mutual_nh
        For each other net the mutual inductance over the gap, nH, of either sign, and its class.

    Notes
    -----
    The sum of |M| dI/dt with dI = V / Z0 in the rise time of each aggressor, each one limited as
    in ``noise_mv``. Nets of an exempt class do not switch.

    Examples
    --------
    >>> from splitcheck.verdict.rules import DEFAULT_CLASS
    >>> round(crosstalk_mv([(1.8, DEFAULT_CLASS), (-1.8, DEFAULT_CLASS)]))
    119
    """
    return sum(noise_mv(abs(mutual), drive) for mutual, drive in mutual_nh if not drive.exempt)


def bandwidth_ghz(rise_ns: float) -> float:
    """Where an edge's spectrum is 3 dB down: 0.35 / tr, tr from 10 to 90 % of a single pole.

    Examples
    --------
    >>> bandwidth_ghz(1.0)
    0.35
    """
    return 0.35 / rise_ns


def corner_ghz(rise_ns: float) -> float:
    """Where the envelope of a trapezoid's harmonics turns to 40 dB a decade: 1 / (pi tr).

    ``tr`` is from 0 to 100 % (Ott, Electromagnetic Compatibility Engineering, 2009; Paul,
    Introduction to Electromagnetic Compatibility, ch. 3; from memory).

    Examples
    --------
    >>> round(corner_ghz(1.0), 3)
    0.318
    """
    return 1.0 / (pi * rise_ns)


def knee_ghz(rise_ns: float) -> float:
    """The knee frequency 0.5 / tr, 6.8 dB below the line of 20 dB a decade.

    Johnson and Graham, High-Speed Digital Design, 1993, ch. 1; from memory.

    Examples
    --------
    >>> knee_ghz(1.0)
    0.5
    """
    return 0.5 / rise_ns


def level(noise: float | None, drive: Class, added_nh: float | None = None) -> Level:
    """Level of a finding; without a way back for the current it is an error.

    Parameters
    ----------
    noise
        mV; None: no way back.
    drive
        The class with its thresholds, which belong to the worse level.
    added_nh
        Added inductance, nH, for thresholds in nH, if the class has any.

    Examples
    --------
    >>> from splitcheck.verdict.rules import DEFAULT_CLASS
    >>> [level(mv, DEFAULT_CLASS) for mv in (None, 100.0, 40.0, 1.0)]
    ['error', 'error', 'warning', 'note']
    """
    added = added_nh or 0.0
    if noise is None or noise >= drive.error_mv or added >= _or_never(drive.error_nh):
        return "error"
    if noise >= drive.warning_mv or added >= _or_never(drive.warning_nh):
        return "warning"
    return "note"


def _or_never(threshold: float | None) -> float:
    return inf if threshold is None else threshold


def worst_first(finding: Finding) -> tuple[object, ...]:
    """Sort key: level, then noise, then nH, then what and where it is."""
    noise = inf if finding.noise_mv is None else finding.noise_mv
    added = inf if finding.added_nh is None else finding.added_nh
    return (
        LEVELS.index(finding.level),
        -round(noise, 6),
        -round(added, 6),
        finding.net,
        finding.layer,
        finding.plane_layer,
        finding.at_mm,
    )
