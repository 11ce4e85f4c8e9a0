"""The findings as SARIF 2.1.0, the format in which code hosts take the results of checkers."""

from __future__ import annotations

import json
import re
from typing import Any
from urllib.parse import quote
from uuid import UUID, uuid5

from splitcheck import __version__
from splitcheck.report import sentences
from splitcheck.report.identity import identities
from splitcheck.report.kinds import CAUTION, RULES
from splitcheck.report.words import quiet
from splitcheck.verdict.changes import Change, Comparison, Verdict
from splitcheck.verdict.findings import Finding, Level, Report

SCHEMA = "https://json.schemastore.org/sarif-2.1.0.json"
#: A host takes no more results of one run.
MOST_RESULTS = 25_000
_NAMESPACE = UUID("6e1c6d0a-5f0e-4c43-9a70-3b1d5a0f7c52")
_BASELINE: dict[Verdict, str] = {
    "new": "new",
    "worse": "updated",
    "better": "updated",
    "unchanged": "unchanged",
}
_SEVERITIES: dict[Level, str] = {"error": "error", "warning": "warning", "note": "recommendation"}
#: Where on the scale of 0 to 100 each level begins; noise decides within it.
_RANKS: dict[Level, float] = {"error": 67.0, "warning": 34.0, "note": 0.0}
_HALF_MV = 100.0
_BACKGROUND = (
    "The current of a trace returns in the plane beneath it, within a few heights of the trace. "
    "Where the plane is open it has to go another way, and the loop that it encloses grows."
)


def render(report: Report, comparison: Comparison | None = None) -> str:
    """Write one run with one result a finding, worst first.

    Notes
    -----
    Against an earlier revision each result has a ``baselineState``: new, unchanged, or updated
    (worse or better; ``properties.verdict`` tells which). What is gone is counted in the run's
    properties and not listed as ``absent``: hosts that do not know that state would show it as
    found. Waived results carry an accepted suppression, all others an empty list, as section
    3.27.23 asks. ``primaryLocationLineHash`` is set so that a host does not make one from the
    text of the line, which is a coordinate. Files are ASCII and the same for the same report.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> json.loads(render(empty))["version"]
    '2.1.0'
    """
    log = {"$schema": SCHEMA, "version": "2.1.0", "runs": [_run(report, comparison)]}
    return quiet(json.dumps(log, indent=1, allow_nan=False)) + "\n"


def _run(report: Report, comparison: Comparison | None) -> dict[str, Any]:
    kinds = list(RULES)
    prints = identities(report, comparison)
    changes = {} if comparison is None else comparison.by_id()
    shown = report.findings[:MOST_RESULTS]
    details: dict[str, Any] = {"id": "splitcheck/", "guid": _guid(report)}
    run: dict[str, Any] = {
        "tool": {"driver": _driver(report)},
        "automationDetails": details,
        "invocations": [{"executionSuccessful": True}],
        "columnKind": "unicodeCodePoints",
        "results": [
            _result(finding, kinds, prints[finding.id], changes.get(finding.id))
            for finding in shown
        ],
        "properties": {
            "board": report.board,
            "size_mm": [round(value, 4) for value in report.size_mm],
            "assumptions": list(report.assumptions),
            "results_left_out": len(report.findings) - len(shown),
        },
    }
    if comparison is not None:
        run["baselineGuid"] = _guid(comparison.was)
        run["properties"]["gone"] = len(comparison.of("gone"))
    return run


def _guid(report: Report) -> str:
    """The same for the same report, whenever it is made."""
    parts = [report.board, *(row.sha256 for row in report.inputs)]
    parts += [f"{f.fingerprint} {f.level} {f.added_nh}" for f in report.findings]
    return str(uuid5(_NAMESPACE, "\n".join(parts).encode("utf-8", "backslashreplace").decode()))


def _driver(report: Report) -> dict[str, Any]:
    rules = []
    for kind, rule in RULES.items():
        levels = (finding.level for finding in report.findings if finding.kind == kind)
        worst: Level = next(levels, "warning")
        words = f"{rule.what} {_BACKGROUND} {rule.help} {CAUTION}"
        rules.append(
            {
                "id": kind,
                "name": "".join(part.capitalize() for part in kind.split("-")),
                "shortDescription": {"text": rule.title},
                "fullDescription": {"text": rule.what},
                "help": {
                    "text": words,
                    "markdown": f"{rule.what} {_BACKGROUND}\n\n{rule.help}\n\n**{CAUTION}**",
                },
                "defaultConfiguration": {"level": "warning"},
                "properties": {
                    "tags": ["return-path", "signal-integrity"],
                    "precision": "high",
                    "problem.severity": _SEVERITIES[worst],
                },
            }
        )
    return {"name": "splitcheck", "semanticVersion": __version__, "rules": rules}


def _result(
    finding: Finding, kinds: list[Any], fingerprint: str, change: Change | None
) -> dict[str, Any]:
    x_mm, y_mm = (round(value, 4) + 0.0 for value in finding.at_mm)
    result: dict[str, Any] = {
        "ruleId": finding.kind,
        "ruleIndex": kinds.index(finding.kind),
        "level": finding.level,
        "message": {"text": _plain(sentences.paragraph(finding, change))},
        "locations": [
            {
                "physicalLocation": {
                    "artifactLocation": {"uri": _uri(finding.source.file)},
                    "region": _region(finding.source.line),
                },
                "logicalLocations": [
                    {"name": finding.net, "fullyQualifiedName": finding.net, "kind": "net"},
                    {
                        "name": finding.layer,
                        "fullyQualifiedName": f"{finding.layer} ({x_mm}, {y_mm}) mm",
                        "kind": "layer",
                    },
                ],
            }
        ],
        "partialFingerprints": {
            "splitcheck/v1": fingerprint,
            "splitcheckPlace/v1": finding.fingerprint or fingerprint,
            "primaryLocationLineHash": f"{fingerprint}:1",
        },
        "suppressions": _suppressions(finding),
        "rank": _rank(finding),
        "properties": _numbers(finding, change),
    }
    if change is not None:
        result["baselineState"] = _BASELINE[change.verdict]
    return result


def _region(line: int) -> dict[str, int]:
    """One line as a region; hosts ask for all four, and a column of 1 to 1 is its beginning."""
    row = max(line, 1)
    return {"startLine": row, "startColumn": 1, "endLine": row, "endColumn": 1}


def _uri(file: str) -> str:
    """A file name as a relative reference (RFC 3986), all that means something there escaped.

    Examples
    --------
    >>> _uri("out/top layer#1.gbr")
    'out/top%20layer%231.gbr'
    """
    path = file.replace("\\", "/") or "unknown"
    return quote(path.encode("utf-8", "backslashreplace"), safe="/")


def _suppressions(finding: Finding) -> list[dict[str, str]]:
    if finding.waived is None:
        return []
    return [{"kind": "external", "status": "accepted", "justification": finding.waived or "waived"}]


def _rank(finding: Finding) -> float:
    """0 to 100 in the order of the report: level first, then noise.

    Without a way back there is no noise to go by: such a finding leads its level.
    """
    noise = finding.noise_mv
    share = 1.0 if noise is None else noise / (noise + _HALF_MV)
    return round(_RANKS[finding.level] + 33.0 * share, 2)


def _numbers(finding: Finding, change: Change | None) -> dict[str, Any]:
    """What has no field of its own in this format; names whole, quantities by their unit."""
    x_mm, y_mm = (round(value, 4) + 0.0 for value in finding.at_mm)
    bag: dict[str, Any] = {
        "id": finding.id,
        "net": finding.net,
        "net_class": finding.net_class,
        "layer": finding.layer,
        "plane_layer": finding.plane_layer,
        "plane_net": finding.plane_net,
        "at_mm": [x_mm, y_mm],
        "method": finding.method,
        "gap": finding.gap,
    }
    for key in ("gap_mm", "detour_mm", "added_nh", "error_nh", "noise_mv", "stray_db", "rise_ns"):
        value = getattr(finding, key)
        bag[key] = None if value is None else round(value, 4) + 0.0
    if change is not None:
        bag["verdict"] = change.verdict
        if change.was is not None:
            was = change.was.added_nh
            bag["was_level"] = change.was.level
            bag["was_added_nh"] = None if was is None else round(was, 4) + 0.0
    return bag


def _plain(text: str) -> str:
    r"""A message as this format reads it: no link and no placeholder (sections 3.11.5, 3.11.6).

    Examples
    --------
    >>> _plain("DATA[0] and ~{RST}"), _plain("[a](b)"), _plain("{0}")
    ('DATA[0] and ~{RST}', '[a] (b)', '{{0}}')
    """
    return re.sub(r"\{(\d+)\}", r"{{\1}}", text.replace("](", "] ("))
