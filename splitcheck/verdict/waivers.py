"""Findings and waivers in, the findings with what is waived out, and what became of each waiver."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import date
from math import dist
from typing import Literal, TypeAlias

from splitcheck.verdict.findings import Finding, WaiverRow
from splitcheck.verdict.patterns import Names
from splitcheck.verdict.rules import Waiver

_State: TypeAlias = Literal["used", "expired", "unmatched"]


def waive(
    findings: Sequence[Finding], waivers: Sequence[Waiver], today: date | None
) -> tuple[tuple[Finding, ...], tuple[WaiverRow, ...]]:
    """Mark the findings that somebody answers for.

    Parameters
    ----------
    findings
        All findings, with their fingerprints.
    waivers
        In the order of their file; the first that fits a finding gives it its reason.
    today
        The day it is, for waivers that end; None: none has ended.

    Returns
    -------
    The findings in the same order, and one row for each waiver.

    Notes
    -----
    A waiver fits a finding if everything it says holds: the pattern of the net, the kind, the place
    within its radius, the fingerprint.

    Examples
    --------
    >>> waive((), (), None)
    ((), ())
    """
    waived = list(findings)
    rows = []
    for waiver in waivers:
        expired = today is not None and waiver.until is not None and today > waiver.until
        fitting = [] if expired else [i for i, one in enumerate(findings) if fits(waiver, one)]
        for i in fitting:
            if waived[i].waived is None:
                waived[i] = replace(waived[i], waived=waiver.reason)
        until = None if waiver.until is None else waiver.until.isoformat()
        state: _State = "expired" if expired else "used" if fitting else "unmatched"
        rows.append(WaiverRow(waiver.reason, until, len(fitting), state, waiver.source))
    return tuple(waived), tuple(rows)


def fits(waiver: Waiver, finding: Finding) -> bool:
    """Whether everything that a waiver says holds for a finding."""
    return (
        (waiver.net is None or Names([waiver.net]).match(finding.net))
        and (waiver.kind is None or waiver.kind == finding.kind)
        and (waiver.at_mm is None or dist(waiver.at_mm, finding.at_mm) <= waiver.radius_mm)
        and (waiver.fingerprint is None or waiver.fingerprint == finding.fingerprint)
    )
