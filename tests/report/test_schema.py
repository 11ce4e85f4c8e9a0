"""The published schema of our own report: complete, and obeyed by what is written."""

from __future__ import annotations

import json
from importlib.resources import files
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from splitcheck import road
from splitcheck.report import jsonfile
from splitcheck.verdict.compare import compare
from splitcheck.verdict.findings import Report
from tests.report import made, schema_making
from tests.report.compared import compared

SCHEMA: dict[str, Any] = json.loads(
    (files("splitcheck") / "report" / "schema.json").read_text(encoding="utf-8")
)


def strict(schema: Any) -> Any:
    """The same schema without room for keys that it does not name."""
    if isinstance(schema, list):
        return [strict(one) for one in schema]
    if not isinstance(schema, dict):
        return schema
    tight = {key: strict(value) for key, value in schema.items()}
    if tight.get("type") == "object" and "additionalProperties" not in tight:
        tight["additionalProperties"] = False
    return tight


def errors(report: dict[str, Any], schema: dict[str, Any]) -> list[str]:
    """What is wrong with a report."""
    validator = jsonschema.Draft202012Validator(schema)
    return [error.message for error in validator.iter_errors(report)]


def test_the_published_file_is_that_of_the_fields() -> None:
    """Nothing was added to a row and forgotten in the schema."""
    assert schema_making.FILE.read_text(encoding="utf-8") == schema_making.text(), (
        "run: python -m tests.report.schema_making"
    )


def test_it_is_a_schema() -> None:
    """By the schema of schemas."""
    jsonschema.Draft202012Validator.check_schema(SCHEMA)


@pytest.fixture(scope="module")
def demo() -> tuple[Report, Report]:
    """The demo board and its clean twin."""
    folder = road.fixtures_folder()
    options = road.Options(jobs=1)
    return road.rank(folder / "demo", options), road.rank(folder / "demo_clean", options)


def test_what_is_written_is_as_the_schema_says(demo: tuple[Report, Report]) -> None:
    """Every key is named in it, none is missing, every value has its type."""
    faulty, clean = demo
    pump = made.pump()
    for text in (
        jsonfile.render(pump),
        jsonfile.render(pump, compared(pump)),
        jsonfile.render(faulty),
        jsonfile.render(clean),
        jsonfile.render(faulty, compare(clean, faulty)),
        jsonfile.render(clean, compare(faulty, clean)),
    ):
        assert errors(json.loads(text), strict(SCHEMA)) == []


@pytest.mark.parametrize(
    ("path", "value"),
    [
        (("schema",), "splitcheck-report/2"),
        (("findings", 0, "level"), "fatal"),
        (("findings", 0, "added_nh"), "3"),
        (("findings", 0, "at_mm"), [1.0]),
        (("board", "size_mm"), None),
        (("summary", "by_level"), {}),
    ],
)
def test_the_schema_refuses_what_is_wrong(path: tuple[Any, ...], value: Any) -> None:
    """It can fail."""
    report = json.loads(jsonfile.render(made.pump()))
    assert errors(report, SCHEMA) == []
    inner = report
    for key in path[:-1]:
        inner = inner[key]
    inner[path[-1]] = value
    assert errors(report, SCHEMA)


def test_the_schema_ships_with_the_package() -> None:
    """It lies beside the code that writes by it."""
    assert Path(jsonfile.__file__).with_name("schema.json") == schema_making.FILE
