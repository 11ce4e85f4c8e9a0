"""Writes the published JSON Schema of the report: ``python -m tests.report.schema_making``.

Types and words come from the data classes, so that a field cannot be added and not described.
"""

from __future__ import annotations

import ast
import inspect
import json
from dataclasses import MISSING, fields, is_dataclass
from itertools import pairwise
from pathlib import Path
from types import NoneType, UnionType
from typing import Any, Literal, Union, get_args, get_origin, get_type_hints

import splitcheck
from splitcheck.report.jsonfile import SCHEMA
from splitcheck.verdict import changes, findings
from splitcheck.verdict.changes import VERDICTS, Change, Comparison, Move
from splitcheck.verdict.findings import Finding, Kind, Level, Report

FILE = Path(splitcheck.__file__).parent / "report" / "schema.json"
#: Fields that the file keeps under another name or in another place.
RENAMED = {("NetRow", "net_class"): "class"}
ELSEWHERE = {"board", "size_mm", "corner_mm", "layers", "seconds"}
COUNT = {"type": "integer", "minimum": 0}


def whole() -> dict[str, Any]:
    """The schema, every row of the report in ``$defs``."""
    making = _Making()
    report = making.object_of(Report, leave=ELSEWHERE)
    hints = get_type_hints(Report)
    board = _closed(
        name={"type": "string"},
        size_mm=making.of(hints["size_mm"]),
        layers=making.of(hints["layers"]),
    )
    corner = {"description": _words(Report, "corner_mm"), **making.of(hints["corner_mm"])}
    board["properties"]["corner_mm"] = corner
    properties: dict[str, Any] = {
        "schema": {"const": SCHEMA},
        "tool": _closed(name={"const": "splitcheck"}, version={"type": "string"}),
        "board": board,
        **report["properties"],
        "summary": _summary(),
        "comparison": _comparison(making),
    }
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "$id": f"urn:splitcheck:{SCHEMA}",
        "title": "Report of splitcheck",
        "description": "Names of quantities end in their unit. Keys may be added, none is renamed.",
        "type": "object",
        "required": ["schema", "tool", "board", *report["required"], "summary"],
        "properties": properties,
        "$defs": dict(sorted(making.defs.items())),
    }


def _closed(**properties: Any) -> dict[str, Any]:
    return {"type": "object", "required": list(properties), "properties": properties}


def _summary() -> dict[str, Any]:
    return _closed(
        by_level=_closed(**dict.fromkeys(get_args(Level), COUNT)),
        by_kind=_closed(**dict.fromkeys(get_args(Kind), COUNT)),
        waived=COUNT,
        worst={"type": ["string", "null"], "description": "Id of the worst that is not waived."},
        seconds={
            "type": "object",
            "additionalProperties": {"type": "number", "minimum": 0},
            "description": "Wall time of each stage; all else is the same in every run.",
        },
    )


def _comparison(making: _Making) -> dict[str, Any]:
    known = making.object_of(Finding)["properties"]
    keys = ("id", "kind", "level", "net", "layer", "plane_layer", "at_mm", "added_nh", "error_nh")
    was = _closed(**{key: known[key] for key in (*keys, "noise_mv", "waived")})
    change = _closed(
        verdict={"enum": list(VERDICTS)},
        why={"type": "string", "description": _words(Change, "why")},
        finding={"type": ["string", "null"], "description": "Its id in this report."},
        was={"anyOf": [was, {"type": "null"}], "description": _words(Change, "was")},
    )
    move = _closed(
        turned_deg={"type": "number", "description": inspect.getdoc(Move.turned_deg)},
        shift_mm=making.of(get_type_hints(Move)["shift_mm"]),
    )
    found = _closed(
        was=_closed(name={"type": "string"}, findings=COUNT),
        move=move,
        remarks={"type": "array", "items": {"type": "string"}},
        by_verdict=_closed(**dict.fromkeys(VERDICTS, COUNT)),
        changes={"type": "array", "items": change, "description": _words(Comparison, "changes")},
    )
    return found | {"description": "What became of an earlier revision; only in reports of a gate."}


class _Making:
    """Collects the definitions of rows as it meets them."""

    def __init__(self) -> None:
        self.defs: dict[str, Any] = {}

    def object_of(self, kind: type[Any], leave: set[str] | None = None) -> dict[str, Any]:
        """A data class as an object."""
        hints = get_type_hints(kind)
        properties: dict[str, Any] = {}
        required = []
        for field in fields(kind):
            if leave and field.name in leave:
                continue
            key = RENAMED.get((kind.__name__, field.name), field.name)
            words = _words(kind, field.name)
            properties[key] = self.of(hints[field.name])
            if words:
                properties[key] = {"description": words, **properties[key]}
            if field.default is MISSING:
                required.append(key)
        return {"type": "object", "required": required, "properties": properties}

    def of(self, hint: Any) -> dict[str, Any]:
        """A type as a schema."""
        origin, inner = get_origin(hint), get_args(hint)
        if origin is tuple and inner[-1] is Ellipsis:
            return {"type": "array", "items": self.of(inner[0])}
        if origin is tuple:
            items = [self.of(one) for one in inner]
            return {"type": "array", "prefixItems": items, "items": False, "minItems": len(items)}
        if origin in {UnionType, Union}:
            (some,) = (one for one in inner if one is not NoneType)
            return {"anyOf": [self.of(some), {"type": "null"}]}
        if origin is Literal:
            return {"enum": list(inner)}
        if is_dataclass(hint):
            assert isinstance(hint, type)
            if hint.__name__ not in self.defs:
                self.defs[hint.__name__] = {}
                self.defs[hint.__name__] = self.object_of(hint) | {
                    "description": (inspect.getdoc(hint) or "").split("\n")[0]
                }
            return {"$ref": f"#/$defs/{hint.__name__}"}
        plain = {str: "string", float: "number", int: "integer", bool: "boolean"}
        return {"type": plain[hint]}


def _words(kind: type, name: str) -> str:
    """The sentence under a field of a data class, as one line."""
    module = changes if kind.__module__ == changes.__name__ else findings
    tree = ast.parse(inspect.getsource(module))
    body = next(
        n for n in tree.body if isinstance(n, ast.ClassDef) and n.name == kind.__name__
    ).body
    for here, after in pairwise(body):
        if isinstance(here, ast.AnnAssign) and getattr(here.target, "id", "") == name:
            if isinstance(after, ast.Expr) and isinstance(after.value, ast.Constant):
                return " ".join(str(after.value.value).split())
            break
    return ""


def text() -> str:
    """The file's text."""
    return json.dumps(whole(), indent=1) + "\n"


if __name__ == "__main__":
    FILE.write_text(text(), encoding="utf-8")
