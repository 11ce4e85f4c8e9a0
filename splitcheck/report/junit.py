"""The findings as JUnit XML: one test a finding, one suite a file, for hosts that list tests.

Valid by the schema that the readers of this format share (junit-10.xsd), which knows a file for a
suite, not for a test: so the tests are put together by file.
"""

from __future__ import annotations

from collections import Counter
from xml.sax.saxutils import escape, quoteattr

from splitcheck.report import sentences
from splitcheck.report.words import visible
from splitcheck.verdict.changes import Change, Comparison
from splitcheck.verdict.findings import Finding, Report


def render(report: Report, comparison: Comparison | None = None) -> str:
    """Write one test case a finding; a board without any passes one test that says so.

    Notes
    -----
    Errors and warnings fail; against an earlier revision only those that are new or worse.
    Waived ones are skipped, all others pass and say what they know. The text stands inside the
    element: hosts show that, not its ``message``. A test is named by kind, net and layers and not
    by its place, so that hosts see the same test in the next revision; equal names are numbered,
    because hosts drop the second. What XML 1.0 cannot hold is written as its escape.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> "no broken return path" in render(empty)
    True
    """
    changes = {} if comparison is None else comparison.by_id()
    names: Counter[str] = Counter()
    suites: dict[str, list[str]] = {}
    counts: dict[str, Counter[str]] = {}
    for finding in report.findings:
        file = finding.source.file
        outcome, lines = _case(finding, changes.get(finding.id), names)
        suites.setdefault(file, []).append(lines)
        counts.setdefault(file, Counter())[outcome] += 1
    out = ['<?xml version="1.0" encoding="UTF-8"?>']
    total = sum((counts[file] for file in suites), Counter[str]())
    tests = max(total.total(), 1)
    failures = total["failure"]
    out.append(f'<testsuites name="splitcheck" tests="{tests}" failures="{failures}" errors="0">')
    for file, cases in suites.items():
        out.append(_suite(file, counts[file]))
        out.extend([*cases, "  </testsuite>"])
    if not suites:
        out.append('  <testsuite name="splitcheck" tests="1" failures="0" errors="0" skipped="0">')
        out.append('    <testcase classname="splitcheck" name="no broken return path"/>')
        out.append("  </testsuite>")
    out.append("</testsuites>")
    return "\n".join(out) + "\n"


def _suite(file: str, counts: Counter[str]) -> str:
    name = quoteattr(visible(file))
    return (
        f'  <testsuite name={name} file={name} tests="{counts.total()}" '
        f'failures="{counts["failure"]}" errors="0" skipped="{counts["skipped"]}">'
    )


def _case(finding: Finding, change: Change | None, names: Counter[str]) -> tuple[str, str]:
    over = f" over {visible(finding.plane_layer)}" if finding.plane_layer else ""
    name = f"{visible(finding.net)}: {finding.kind} on {visible(finding.layer)}{over}"
    names[name] += 1
    if names[name] > 1:
        name += f" ({names[name]})"
    head = f'    <testcase classname="splitcheck.{finding.kind}" name={quoteattr(name)}>'
    text = escape(f"{sentences.paragraph(finding, change)} [{sentences.source(finding)}]")
    outcome = _outcome(finding, change)
    element = {"failure": f'failure type="{finding.level}"', "skipped": "skipped"}
    opening = element.get(outcome, "system-out")
    closing = opening.split(" ")[0]
    return outcome, f"{head}\n      <{opening}>{text}</{closing}>\n    </testcase>"


def _outcome(finding: Finding, change: Change | None) -> str:
    if finding.waived is not None:
        return "skipped"
    fresh = change is None or change.verdict in {"new", "worse"}
    return "failure" if fresh and finding.level != "note" else "passed"
