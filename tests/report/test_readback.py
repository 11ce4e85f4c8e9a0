"""A report read back: the same as before, or one clear sentence, whatever was done to the file."""

from __future__ import annotations

import copy
import json
from contextlib import suppress
from dataclasses import replace
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from splitcheck.errors import SplitcheckError
from splitcheck.report import jsonfile, readback
from splitcheck.verdict.findings import Finding, Miss, Report
from tests.report import made
from tests.report.compared import compared

WRITTEN: dict[str, Any] = json.loads(jsonfile.render(made.pump()))


def complaint(text: str) -> str:
    """What is said of a file that cannot be read."""
    with pytest.raises(SplitcheckError) as caught:
        readback.load(text, "old.json")
    return str(caught.value)


def test_what_was_written_is_read_back(pump: Report) -> None:
    """To the digit that is written, so that writing it again gives the same bytes."""
    misses = Miss("via", "2 tried", -0.0132), Miss("move", "no free room")
    missed = replace(pump.findings[0], misses=misses)
    text = jsonfile.render(replace(pump, findings=(missed, *pump.findings[1:])))
    again = readback.load(text, "old.json")
    assert jsonfile.render(again) == text
    assert again.findings[0].misses == misses


def test_a_report_of_a_gate_can_be_a_baseline(pump: Report) -> None:
    """What became of the revision before it is passed over."""
    text = jsonfile.render(pump, compared(pump))
    assert jsonfile.render(readback.load(text, "old.json")) == jsonfile.render(pump)


@given(st.text(st.characters(codec=None), max_size=30), st.floats(0, 1e6))
def test_any_finding_is_read_back(name: str, value: float) -> None:
    """Whatever its net is called."""
    finding: Finding = made.finding(1, name, added_nh=value, waived=name, at_mm=(value, -value))
    report = replace(made.pump(), board=name, findings=(finding,))
    text = jsonfile.render(report)
    assert jsonfile.render(readback.load(text, "old.json")) == text


def test_files_of_older_and_newer_versions_are_read(pump: Report) -> None:
    """Keys that came later may be missing; keys that are not known are passed over."""
    older, newer = copy.deepcopy(WRITTEN), copy.deepcopy(WRITTEN)
    for key in ("classes", "pairs", "waivers"):
        del older[key]
    del older["board"]["corner_mm"]
    for finding in older["findings"]:
        for key in ("odd_nh", "common_nh", "capped", "proposals", "misses"):
            del finding[key]
    assert len(readback.load(json.dumps(older), "old.json").findings) == 6
    newer["more"] = {"a": 1}
    newer["findings"][0]["colour"] = "red"
    assert readback.load(json.dumps(newer), "old.json") == readback.load(
        jsonfile.render(pump), "old.json"
    )


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "old.json:1: this is no JSON"),
        ("{\n\n,", "old.json:3: this is no JSON"),
        ("[1]", "this is no report of splitcheck"),
        ('{"schema": "other/1"}', "its schema is 'other/1', not 'splitcheck-report/1'"),
        ('{"schema": "splitcheck-report/1"}', "old.json: board: None is no object"),
        ("[" * 100_000, "nested too deep"),
        ('{"schema": NaN}', "a number that is none"),
        ('{"schema": ' + "9" * 5000 + "}", "a number that is none"),
    ],
)
def test_what_is_no_report_is_said(text: str, said: str) -> None:
    """One sentence with a place and what to do."""
    message = complaint(text)
    assert said in message
    assert message.endswith("; write it with splitcheck rank PATH --out json=FILE") or (
        "version of splitcheck" in message
    )


@pytest.mark.parametrize(
    ("path", "value", "said"),
    [
        (("findings", 1, "level"), "fatal", "findings[1].level: 'fatal' is none of error, warning"),
        (("findings", 0, "added_nh"), "3", "findings[0].added_nh: '3' is no number"),
        (("findings", 0, "added_nh"), True, "findings[0].added_nh: True is no number"),
        (("findings", 0, "gap_mm"), 10**400, "findings[0].gap_mm: 1000"),
        (("findings", 0, "at_mm"), [1.0], "findings[0].at_mm: has 1 entries, not 2"),
        (("findings", 0, "net"), None, "findings[0].net: None is no text"),
        (("findings", 0, "net"), "n" * 100_001, "has 100001 characters"),
        (("findings", 0, "source", "line"), 1.5, "source.line: 1.5 is no whole number"),
        (("findings", 2, "id"), "F1", "two of them have the same id"),
        (("findings",), {}, "findings: dict is no list"),
        (("board", "layers", 0), 7, "layers[0]: 7 is no object"),
        (("summary", "seconds"), [], "summary.seconds: list is no object"),
    ],
)
def test_a_wrong_value_is_named_by_its_place(path: tuple[Any, ...], value: Any, said: str) -> None:
    """The key, the row, and the value."""
    spoiled = copy.deepcopy(WRITTEN)
    inner: Any = spoiled
    for key in path[:-1]:
        inner = inner[key]
    inner[path[-1]] = value
    assert said in complaint(json.dumps(spoiled))


def test_too_much_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    """Characters and rows have limits."""
    monkeypatch.setattr(readback, "MOST_ROWS", 3)
    assert "has 4 rows, more than 3" in complaint(json.dumps(WRITTEN))
    monkeypatch.setattr(readback, "LARGEST_CHARACTERS", 10)
    assert "more than 10" in complaint(json.dumps(WRITTEN))


def places(value: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Paths to everything in the file."""
    found = [path] if path else []
    if isinstance(value, dict | list):
        pairs = value.items() if isinstance(value, dict) else enumerate(value)
        for key, inner in pairs:
            found += places(inner, (*path, key))
    return found


JSON = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats(allow_nan=False) | st.text(max_size=5),
    lambda inner: (
        st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=5), inner, max_size=3)
    ),
    max_leaves=5,
)


@given(st.sampled_from(places(WRITTEN)), JSON)
@settings(max_examples=300)
def test_nothing_but_our_own_error_comes_of_a_spoiled_file(
    path: tuple[Any, ...], value: Any
) -> None:
    """Any value put anywhere is read or refused."""
    spoiled = copy.deepcopy(WRITTEN)
    inner: Any = spoiled
    for key in path[:-1]:
        inner = inner[key]
    inner[path[-1]] = value
    with suppress(SplitcheckError):
        assert jsonfile.render(readback.load(json.dumps(spoiled), "old.json"))


@given(st.text(max_size=200))
def test_nothing_but_our_own_error_comes_of_any_text(text: str) -> None:
    """It is refused."""
    assert complaint(text).startswith("old.json")
