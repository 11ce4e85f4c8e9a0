"""The closed forms against field solvers that mesh the copper.

``reference.csv`` holds independent PyPEEC 5.8.0 runs (voxels 0.1 mm or finer, corrected for the
mesh) and runs of sheet solvers, as its last column says row by row.
"""

from __future__ import annotations

import csv
import re
from math import dist, inf
from pathlib import Path

import pytest
import shapely
from shapely import Polygon, wkt

from splitcheck.loops.estimate import Inductance, added, via_pair_nh

#: Width over side of a round wire that stands for a square one (from memory).
ROUND_FOR_SQUARE = 1.18


def _rows() -> list[dict[str, str]]:
    with (Path(__file__).parent / "reference.csv").open(encoding="utf-8", newline="") as file:
        return [row for row in csv.DictReader(file) if _crossed(row) is not None]


def _crossed(row: dict[str, str]) -> Polygon | None:
    """The one gap under the trace, which runs along y = 0."""
    for gap in shapely.get_parts(wkt.loads(row["gaps"])):
        if gap.area > 0 and gap.bounds[1] < 0 < gap.bounds[3]:
            assert gap.equals(shapely.box(*gap.bounds))
            return Polygon(gap)
    return None


def _bridge(row: dict[str, str]) -> tuple[float, float]:
    """How far aside the leg between two vias crosses the gap, mm, and what the pair adds, nH."""
    one, other = [
        (float(x), float(y)) for x, y in re.findall(r"\((-?[\d.]+) (-?[\d.]+)\)", row["bridges"])
    ]
    side = re.search(r"([\d.]+) mm square", row["bridges"])
    assert side is not None
    aside = one[1] + (other[1] - one[1]) * one[0] / (one[0] - other[0])
    barrel_mm = ROUND_FOR_SQUARE * float(side[1])
    return abs(aside), via_pair_nh(dist(one, other), barrel_mm, float(row["beyond_mm"]))


def _estimate(row: dict[str, str]) -> Inductance:
    gap = _crossed(row)
    assert gap is not None
    _, low, _, high = wkt.loads(row["plane"]).bounds
    x0, y0, x1, y1 = gap.bounds
    reach = (y1 if y1 < high else inf, -y0 if y0 > low else inf)
    bridge = (0.0, 0.0)
    if row["bridges"]:
        aside, nh = _bridge(row)
        reach, bridge = (aside, inf), (nh, 0.0)
    found = added(
        reach,
        bridge,
        x1 - x0,
        float(row["height_mm"]),
        float(row["width_mm"]),
        beyond_mm=float(row["beyond_mm"]) if row["beyond_mm"] else None,
        above_mm=None,
        share=1.0,
    )
    assert found is not None
    return found


@pytest.mark.parametrize("row", _rows(), ids=lambda row: row["case"])
def test_estimate_is_off_by_no_more_than_it_says(row: dict[str, str]) -> None:
    """Within the two error bars, whatever the gap: slots, voids, open ends, webs, bridges."""
    found = _estimate(row)
    off_nh = abs(found.added_nh - float(row["added_nh"]))
    assert off_nh <= found.error_nh + float(row["error_nh"])


@pytest.mark.parametrize(
    "row",
    [row for row in _rows() if re.match(r"[BG]_.*h0\.2", row["case"])],
    ids=lambda row: row["case"],
)
def test_straight_slot_near_the_trace_is_within_ten_percent(row: dict[str, str]) -> None:
    """The case that the form was made for."""
    assert _estimate(row).added_nh == pytest.approx(float(row["added_nh"]), rel=0.1)


@pytest.mark.parametrize(
    "row", [row for row in _rows() if row["case"].startswith("S_")], ids=lambda row: row["case"]
)
def test_plane_beyond_shields_as_the_sheet_solver_says(row: dict[str, str]) -> None:
    """The form is fitted to gaps of all shapes, so no single one is hit exactly."""
    assert _estimate(row).added_nh == pytest.approx(float(row["added_nh"]), rel=0.1)
