"""The findings as code quality JSON, which a merge request compares with its target branch."""

from __future__ import annotations

import json

from splitcheck.report import sentences
from splitcheck.report.identity import identities
from splitcheck.report.words import quiet
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import Finding, Level, Report

_SEVERITIES: dict[Level, str] = {"error": "critical", "warning": "major", "note": "minor"}


def render(report: Report, comparison: Comparison | None = None) -> str:
    r"""Write an array of all findings, worst first, in plain ASCII, without a byte order mark.

    Notes
    -----
    All of them, also against an earlier revision: the host compares two such files by their
    fingerprints, which therefore last (see `identity`). An error without any
    way back is a blocker; other errors are critical, warnings major, notes minor, and what is
    waived is info.

    Examples
    --------
    >>> render(Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ()))
    '[]\n'
    """
    prints = identities(report, comparison)
    changes = {} if comparison is None else comparison.by_id()
    rows = [
        {
            "description": sentences.paragraph(finding, changes.get(finding.id)),
            "check_name": finding.kind,
            "fingerprint": prints[finding.id],
            "severity": _severity(finding),
            "location": {
                "path": finding.source.file,
                "lines": {"begin": max(finding.source.line, 1)},
            },
        }
        for finding in report.findings
    ]
    return quiet(json.dumps(rows, indent=2, allow_nan=False)) + "\n"


def _severity(finding: Finding) -> str:
    if finding.waived is not None:
        return "info"
    if finding.level == "error" and finding.method == "none":
        return "blocker"
    return _SEVERITIES[finding.level]
