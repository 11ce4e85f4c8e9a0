"""The JSON report: whole, complete, rounded, and the same each run."""

from __future__ import annotations

import json
from dataclasses import fields, replace
from math import inf, nan
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck import __version__
from splitcheck.report import jsonfile
from splitcheck.verdict.findings import (
    Finding,
    InputRow,
    IslandRow,
    LayerRow,
    NetRow,
    Report,
)
from tests.report import made

TEXTS = Path(__file__).parent / "texts"


def test_the_whole_file(pump: Report) -> None:
    """Every byte of it."""
    expected = (TEXTS / "rank.json").read_text(encoding="utf-8").replace("VERSION", __version__)
    assert jsonfile.render(pump) == expected


def test_every_field_of_the_report_is_in_the_file(pump: Report) -> None:
    """A field added to a finding or a row cannot be forgotten here."""
    read = json.loads(jsonfile.render(pump))
    rows: list[tuple[type, dict[str, object]]] = [
        (Finding, read["findings"][0]),
        (LayerRow, read["board"]["layers"][0]),
        (InputRow, read["inputs"][0]),
        (IslandRow, read["islands"][0]),
    ]
    for kind, row in rows:
        assert set(row) == {field.name for field in fields(kind)}
    renamed = {"net_class": "class"}
    names = {renamed.get(field.name, field.name) for field in fields(NetRow)}
    assert set(read["nets"][0]) == names


def test_only_the_seconds_differ_between_two_runs(pump: Report) -> None:
    """Everything else is the same byte for byte."""
    first = json.loads(jsonfile.render(pump))
    second = json.loads(jsonfile.render(replace(pump, seconds=(("read", 9.0),))))
    assert first["summary"].pop("seconds") != second["summary"].pop("seconds")
    assert first == second


def test_no_negative_zero(pump: Report) -> None:
    """A mirrored board must not differ from its twin by a sign of nothing."""
    assert "-0.0" not in jsonfile.render(pump)


@pytest.mark.parametrize("bad", [nan, inf])
@pytest.mark.parametrize("name", ["added_nh", "detour_mm", "gap_mm", "noise_mv"])
def test_what_is_not_finite_is_a_fault_of_ours(pump: Report, name: str, bad: float) -> None:
    """JSON has no NaN (RFC 8259, section 6), and no result may be one."""
    broken = made.finding(1, "CLK", **{name: bad})
    with pytest.raises(ValueError, match="not a quantity"):
        jsonfile.render(replace(pump, findings=(broken,)))


def test_waived_findings_are_listed_and_counted_apart(pump: Report) -> None:
    """The counts by level and kind are of those that stand."""
    waived = tuple(replace(f, waived="isolation") for f in pump.findings[:4])
    read = json.loads(jsonfile.render(replace(pump, findings=(*waived, *pump.findings[4:]))))
    assert read["summary"]["waived"] == 4
    assert read["summary"]["by_level"] == {"error": 0, "warning": 1, "note": 1}
    assert read["summary"]["by_kind"]["slot-crossing"] == 0
    assert read["summary"]["worst"] == "F5"
    assert len(read["findings"]) == 6


@given(st.text(st.characters(codec=None), max_size=50))
def test_any_name_comes_back_as_it_was(name: str) -> None:
    """Names travel unchanged, in plain ASCII bytes, whatever they hold."""
    pump = made.pump()
    text = jsonfile.render(replace(pump, findings=(made.finding(1, name),)))
    assert text.isascii()
    assert json.loads(text)["findings"][0]["net"] == name
