"""What an added inductance does to a net: noise voltage, level, and the order of findings."""

from __future__ import annotations

from math import exp, inf

from splitcheck.verdict.findings import LEVELS, Finding, Level
from splitcheck.verdict.rules import Class


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


def level(noise: float | None, drive: Class) -> Level:
    """Level of a finding; without a way back for the current it is an error."""
    if noise is None or noise >= drive.error_mv:
        return "error"
    return "warning" if noise >= drive.warning_mv else "note"


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
