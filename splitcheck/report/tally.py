"""Findings counted and grouped: which still stand, and which lie over one gap."""

from __future__ import annotations

from collections.abc import Sequence

from splitcheck.verdict.findings import LEVELS, Finding, Level, Report


def standing(findings: Sequence[Finding]) -> tuple[Finding, ...]:
    """Those that nobody has waived, in the order given.

    Examples
    --------
    >>> standing(())
    ()
    """
    return tuple(finding for finding in findings if finding.waived is None)


def over_one_gap(findings: Sequence[Finding]) -> tuple[tuple[Finding, ...], ...]:
    """Findings put together by the gap they cross; groups and members keep the order given.

    A finding that names no gap stands alone.

    Examples
    --------
    >>> over_one_gap(())
    ()
    """
    groups: dict[str, list[Finding]] = {}
    for finding in findings:
        groups.setdefault(finding.gap or f"\0{finding.id}", []).append(finding)
    return tuple(tuple(group) for group in groups.values())


def worst_ids(report: Report, gaps: int) -> tuple[str, ...]:
    """Ids of the worst standing findings of so many gaps, worst first."""
    return tuple(group[0].id for group in over_one_gap(standing(report.findings))[:gaps])


def nets_of(findings: Sequence[Finding]) -> tuple[str, ...]:
    """Names of the nets, each once, worst first."""
    return tuple(dict.fromkeys(finding.net for finding in findings))


def by_level(findings: Sequence[Finding]) -> tuple[tuple[Level, int], ...]:
    """How many there are of each level that occurs, worst first."""
    counts = ((level, sum(f.level == level for f in findings)) for level in LEVELS)
    return tuple((level, number) for level, number in counts if number)
