"""Every format against the schema that its readers publish; schemas/ORIGIN.md says from where."""

from __future__ import annotations

import csv
import gzip
import io
import json
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any
from xml.etree import ElementTree as ET

import jsonschema
import pytest
import xmlschema

from splitcheck.report import codequality, csvfile, junit, sarif
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import Report
from tests.report import made
from tests.report.compared import compared

SCHEMAS = Path(__file__).parent / "schemas"
SARIF = json.loads((SCHEMAS / "sarif-2.1.0.json").read_text(encoding="utf-8"))
JUNIT = xmlschema.XMLSchema(str(SCHEMAS / "junit-10.xsd"))

#: The fields that the host's documentation asks for (Code Quality report format).
CODE_QUALITY = {
    "type": "array",
    "items": {
        "type": "object",
        "required": ["description", "check_name", "fingerprint", "severity", "location"],
        "additionalProperties": False,
        "properties": {
            "description": {"type": "string", "minLength": 1},
            "check_name": {"type": "string", "minLength": 1},
            "fingerprint": {"type": "string", "minLength": 1},
            "severity": {"enum": ["info", "minor", "major", "critical", "blocker"]},
            "location": {
                "type": "object",
                "required": ["path", "lines"],
                "properties": {
                    "path": {"type": "string", "pattern": "^[^/]"},
                    "lines": {
                        "type": "object",
                        "required": ["begin"],
                        "properties": {"begin": {"type": "integer", "minimum": 1}},
                    },
                },
            },
        },
    },
}


def reports() -> Iterator[tuple[str, Report, Comparison | None]]:
    """The small report as it is, waived in part, empty, and against an earlier revision."""
    pump = made.pump()
    yield "plain", pump, None
    first, *rest = pump.findings
    yield "waived", replace(pump, findings=(replace(first, waived="isolation"), *rest)), None
    yield "empty", replace(pump, findings=(), nets=()), None
    yield "compared", pump, compared(pump)


CASES = [pytest.param(report, change, id=name) for name, report, change in reports()]


@pytest.mark.parametrize(("report", "comparison"), CASES)
def test_sarif_is_valid(report: Report, comparison: Comparison | None) -> None:
    """By the schema of the committee, formats of values included."""
    log = json.loads(sarif.render(report, comparison))
    validator = jsonschema.Draft7Validator(SARIF, format_checker=jsonschema.FormatChecker())
    assert list(validator.iter_errors(log)) == []


@pytest.mark.parametrize(("report", "comparison"), CASES)
def test_junit_is_valid(report: Report, comparison: Comparison | None) -> None:
    """By the schema that its readers share, and every sum in it is right."""
    text = junit.render(report, comparison)
    JUNIT.validate(text)
    root = ET.fromstring(text)
    cases = list(root.iter("testcase"))
    failures = [case for case in cases if case.find("failure") is not None]
    assert root.get("tests") == str(len(cases))
    assert root.get("failures") == str(len(failures))
    names = [(case.get("classname"), case.get("name")) for case in cases]
    assert len(set(names)) == len(names), "a host drops the second of two equal names"


@pytest.mark.parametrize(("report", "comparison"), CASES)
def test_code_quality_is_valid(report: Report, comparison: Comparison | None) -> None:
    """By the clauses of the host's documentation; equal fingerprints would collapse."""
    text = codequality.render(report, comparison)
    rows = json.loads(text)
    jsonschema.validate(rows, CODE_QUALITY)
    assert not text.startswith("\ufeff")
    prints = [row["fingerprint"] for row in rows]
    assert len(set(prints)) == len(prints)


@pytest.mark.parametrize(("report", "comparison"), CASES)
def test_csv_is_valid(report: Report, comparison: Comparison | None) -> None:
    """By RFC 4180: equal numbers of fields, CR LF at each end."""
    text = csvfile.render(report, comparison)
    rows = list(csv.reader(io.StringIO(text, newline=""), strict=True))
    assert {len(row) for row in rows} == {len(csvfile.COLUMNS)}
    assert text.count("\r\n") == len(rows)
    assert text.count("\n") == len(rows)


def results(report: Report, comparison: Comparison | None = None) -> list[dict[str, Any]]:
    """Results of the only run."""
    return list(json.loads(sarif.render(report, comparison))["runs"][0]["results"])


def test_sarif_has_all_that_code_hosts_ask_for(pump: Report) -> None:
    """The subset that code scanning documents: texts of rules, all four ends of a region."""
    run = json.loads(sarif.render(pump))["runs"][0]
    for rule in run["tool"]["driver"]["rules"]:
        for key in ("shortDescription", "fullDescription", "help"):
            assert rule[key]["text"]
        assert rule["properties"]["precision"] in {"very-high", "high", "medium", "low"}
        assert rule["properties"]["problem.severity"] in {"error", "warning", "recommendation"}
        assert "security-severity" not in rule["properties"], "that would be a security alert"
        assert len(rule["properties"]["tags"]) <= 10
    for row in run["results"]:
        where = row["locations"][0]["physicalLocation"]
        assert set(where["region"]) == {"startLine", "startColumn", "endLine", "endColumn"}
        assert not where["artifactLocation"]["uri"].startswith("/")
        assert row["partialFingerprints"]["primaryLocationLineHash"]
        assert run["tool"]["driver"]["rules"][row["ruleIndex"]]["id"] == row["ruleId"]


def test_sarif_stays_within_the_limits_of_hosts(pump: Report) -> None:
    """25,000 results and 10 MB packed, however many findings there are."""
    many = tuple(made.finding(n, f"N{n}", at_mm=(n * 0.01, 3.0)) for n in range(1, 26_001))
    text = sarif.render(replace(pump, findings=many))
    run = json.loads(text)["runs"][0]
    assert len(run["results"]) == 25_000
    assert run["properties"]["results_left_out"] == 1000
    assert len(gzip.compress(text.encode(), 6)) < 10_000_000


def test_sarif_ranks_in_the_order_of_the_report(pump: Report) -> None:
    """0 to 100, and never rising."""
    ranks = [row["rank"] for row in results(pump)]
    assert all(0 <= rank <= 100 for rank in ranks)
    strict = [row["rank"] for row in results(pump) if row["properties"]["noise_mv"] is not None]
    assert strict == sorted(strict, reverse=True)


def test_sarif_says_of_all_results_whether_they_are_suppressed(pump: Report) -> None:
    """Section 3.27.23: all null or none; ours are never null."""
    first, *rest = pump.findings
    told = results(replace(pump, findings=(replace(first, waived="barrier, 5 mm"), *rest)))
    assert told[0]["suppressions"] == [
        {"kind": "external", "status": "accepted", "justification": "barrier, 5 mm"}
    ]
    assert all(row["suppressions"] == [] for row in told[1:])


def test_sarif_tells_what_became_of_each_finding(pump: Report) -> None:
    """States of section 3.27.24, all or none; the run names the run before it."""
    assert all("baselineState" not in row for row in results(pump))
    comparison = compared(pump)
    states = [row["baselineState"] for row in results(pump, comparison)]
    assert states == ["new", "updated", "updated", "unchanged", "unchanged", "unchanged"]
    run = json.loads(sarif.render(pump, comparison))["runs"][0]
    before = json.loads(sarif.render(comparison.was))["runs"][0]
    assert run["baselineGuid"] == before["automationDetails"]["guid"]
    assert run["properties"]["gone"] == 1


def test_code_quality_knows_how_bad_each_is(pump: Report) -> None:
    """Blocker without a way back, critical, major, minor, and info once it is waived."""
    rows = json.loads(codequality.render(pump))
    assert [row["severity"] for row in rows] == [
        *["critical"] * 2, *["major"] * 3, "minor",
    ]  # fmt: skip
    lost = made.finding(1, "A", added_nh=None, method="none")
    waived = made.finding(2, "B", waived="known")
    rows = json.loads(codequality.render(replace(pump, findings=(lost, waived))))
    assert [row["severity"] for row in rows] == ["blocker", "info"]
