"""The closed form of voids beside a trace against PyPEEC 5.8.0: single voids of reference.csv."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
import shapely
from shapely import Polygon, wkt

from splitcheck.loops.estimate import beside_edge_nh_mm, beside_void_nh

TABLE = (Path(__file__).parent / "reference.csv").read_text(encoding="utf-8")
ROWS = [
    row
    for row in csv.DictReader(TABLE.splitlines())
    if isinstance(wkt.loads(row["gaps"]), Polygon)
    and not wkt.loads(row["trace"]).intersects(wkt.loads(row["gaps"]))
]


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["case"])
def test_closed_form_of_a_void_beside_the_trace(row: dict[str, str]) -> None:
    """From 15 % low to 80 % high, out to 5 heights."""
    gap, height = wkt.loads(row["gaps"]), float(row["height_mm"])
    x0, y0, x1, y1 = gap.bounds
    aside = float(shapely.distance(wkt.loads(row["trace"]), gap))
    edge = (x1 - x0) * beside_edge_nh_mm(aside, height)
    value = beside_void_nh(edge, aside, y1 - y0, height)
    assert 0.85 * float(row["added_nh"]) < value < 1.8 * float(row["added_nh"])
