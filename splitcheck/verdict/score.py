"""What an added inductance does to a net: noise voltage, level, and the order of findings."""

from __future__ import annotations

from dataclasses import dataclass
from math import exp, inf

from splitcheck.verdict.findings import LEVELS, Finding, Level


@dataclass(frozen=True, slots=True)
class Drive:
    """What is assumed of a driver while nothing is known of the net."""

    name: str
    rise_ns: float
    """10 to 90 %."""
    wave_mv: float
    """Amplitude of the wave it launches."""
    line_ohm: float
    error_mv: float
    """Noise from which a finding is an error."""
    warning_mv: float
    """Noise from which a finding is a warning."""


#: 3.3 V logic behind a series termination into 50 ohm, 1 ns; thresholds of 6 % and 2 % of the
#: launched wave. Common practice, no source.
DEFAULT_DRIVE = Drive("default", 1.0, 1650.0, 50.0, 100.0, 33.0)


def noise_mv(added_nh: float, drive: Drive) -> float:
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
    >>> round(noise_mv(3.0, DEFAULT_DRIVE))
    99
    """
    if added_nh < 1e-12:  # so small that tr / tau may not be a number
        return 0.0
    tau_ns = added_nh / (2.0 * drive.line_ohm)
    return 2.0 * drive.wave_mv * tau_ns / drive.rise_ns * (1.0 - exp(-drive.rise_ns / tau_ns))


def level(noise: float | None, drive: Drive) -> Level:
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
