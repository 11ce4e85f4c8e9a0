"""The findings as CSV (RFC 4180) for spreadsheets: one header, one row a finding."""

from __future__ import annotations

import csv
import re
from io import StringIO

from splitcheck.report.words import visible
from splitcheck.verdict.changes import Change, Comparison
from splitcheck.verdict.findings import Finding, Report

COLUMNS = (
    "verdict",
    "id",
    "level",
    "kind",
    "net",
    "net_class",
    "layer",
    "plane_layer",
    "plane_net",
    "x_mm",
    "y_mm",
    "gap_mm",
    "detour_mm",
    "added_nh",
    "error_nh",
    "method",
    "noise_mv",
    "rise_ns",
    "stray_db",
    "corner_khz",
    "gap",
    "pair",
    "waived",
    "file",
    "line",
    "was_level",
    "was_added_nh",
    "why",
    "reason",
)
#: What makes a spreadsheet take a cell for a formula, at its start or behind a semicolon that some
#: take for the end of a cell; and the apostrophe itself, so that guarding can be undone.
_FORMULA = re.compile(r"(^|;)(?=\s*[=+\-@'\uFF1D\uFF0B\uFF0D\uFF20])")


def render(report: Report, comparison: Comparison | None = None) -> str:
    """Write the findings as CSV text with a header, worst first, those that are gone at the end.

    Notes
    -----
    Rows end in CR LF, as RFC 4180 asks. A text that a spreadsheet would take for a formula begins
    with an apostrophe, which spreadsheets show as text; one that begins with an apostrophe gets a
    second. What cannot be seen is written as its escape. Names are not shortened.

    Examples
    --------
    >>> render(Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())).split(",")[:3]
    ['verdict', 'id', 'level']
    """
    text = StringIO(newline="")
    writer = csv.writer(text, lineterminator="\r\n")
    writer.writerow(COLUMNS)
    changes = {} if comparison is None else comparison.by_id()
    for finding in report.findings:
        writer.writerow(_row(finding, changes.get(finding.id)))
    for change in () if comparison is None else comparison.of("gone"):
        writer.writerow(_row(change.finding, change))
    return text.getvalue()


def _row(finding: Finding, change: Change | None) -> list[str]:
    was = None if change is None else change.was
    return [
        "" if change is None else change.verdict,
        finding.id if change is None or change.now is not None else "",
        finding.level,
        finding.kind,
        cell(finding.net),
        cell(finding.net_class),
        cell(finding.layer),
        cell(finding.plane_layer),
        cell(finding.plane_net),
        *(_number(value) for value in (*finding.at_mm, finding.gap_mm, finding.detour_mm)),
        _number(finding.added_nh),
        _number(finding.error_nh),
        finding.method,
        *(_number(v) for v in (finding.noise_mv, finding.rise_ns, finding.stray_db)),
        _number(finding.corner_khz),
        cell(finding.gap),
        cell(finding.pair or ""),
        cell(finding.waived or ""),
        cell(finding.source.file),
        str(finding.source.line),
        "" if was is None else was.level,
        _number(None if was is None else was.added_nh),
        "" if change is None else cell(change.why),
        cell(finding.reason),
    ]


def cell(text: str) -> str:
    """A text as no spreadsheet takes it for a formula.

    Examples
    --------
    >>> cell("=1+1"), cell("+3V3"), cell("SDA"), cell("a;@b"), cell("'x")
    ("'=1+1", "'+3V3", 'SDA', "a;'@b", "''x")
    """
    return _FORMULA.sub(r"\1'", visible(text))


def _number(value: float | None) -> str:
    """To 4 decimals; nothing where there is no number."""
    return "" if value is None else repr(round(float(value), 4) + 0.0)
