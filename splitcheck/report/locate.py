"""Where a host shall show a finding: a file that it has, and a line in it."""

from __future__ import annotations

from dataclasses import replace

from splitcheck.report.words import shorten
from splitcheck.verdict.findings import Report, Source


def in_folder(report: Report, folder: str) -> Report:
    """The report with every trace's file named from the top of the repository.

    Parameters
    ----------
    folder
        Where the export lies, seen from there, with forward slashes; empty for the top itself.

    Examples
    --------
    >>> in_folder(Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ()), "out").findings
    ()
    """
    start = f"{folder}/" if folder else ""
    findings = (
        replace(f, source=Source(f"{start}{f.source.file}", f.source.line)) for f in report.findings
    )
    return replace(report, findings=tuple(findings))


def at_file(report: Report, file: str) -> Report:
    """The report with every finding at the first line of one file that the repository has.

    An export that is not part of the repository (a zip, an artefact) has no line that a host could
    show. The trace's own file and line then open the reason.
    """
    findings = (
        replace(
            f,
            source=Source(file, 1),
            reason=f"Drawn in {shorten(f.source.file, 120)}:{f.source.line}. {f.reason}",
        )
        for f in report.findings
    )
    return replace(report, findings=tuple(findings))
