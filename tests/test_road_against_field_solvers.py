"""Whole road, from Gerber text to the reported number, against other field solvers.

The rows are those of ``loops/reference.csv`` and ``loops/reference_coupling.csv``: PyPEEC 5.8.0
runs (voxels 0.1 mm or finer, corrected for the mesh) and runs of sheet solvers, as their last
column says row by row. Each is built as a board of its own: the trace on the first layer, the
plane with its gaps cut out in clear polarity on the second, the plane beyond on the third.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Mapping
from pathlib import Path
from typing import cast

import pytest
import shapely
from shapely import Polygon, wkt

from fixtures.making.plan import (
    BoardPlan,
    Dielectric,
    Hole,
    Pad,
    Point,
    Pour,
    Sheet,
    Trace,
    box,
)
from fixtures.making.write import write_board
from splitcheck import road
from splitcheck.verdict.beside import LEAST_BESIDE_NH
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.pairs import odd_nh

FOLDER = Path(__file__).parent / "loops"
#: A Gerber stroke has a width; this is as good as none 0.2 mm over a plane.
FILAMENT_MM = 0.01


def rows(name: str) -> list[dict[str, str]]:
    """Rows of a table."""
    with (FOLDER / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def passes_by(row: dict[str, str]) -> bool:
    """Whether the centre line stays over copper all along."""
    return not wkt.loads(row["trace"]).intersects(wkt.loads(row["gaps"]))


ALL = rows("reference.csv")
OVER = [row for row in ALL if not passes_by(row)]
BESIDE = [row for row in ALL if passes_by(row)]
COUPLED = rows("reference_coupling.csv")


def ring(polygon: Polygon) -> tuple[Point, ...]:
    """Corners of a polygon."""
    return tuple((float(x), float(y)) for x, y in polygon.exterior.coords)


def vias(row: dict[str, str]) -> tuple[Hole, ...]:
    """Buried vias between the two planes; a square one of side a as a round one of 1.18 a.

    That is the diameter at which both carry current alike (from memory).
    """
    side = float(found[1]) if (found := re.search(r"([\d.]+) mm square", row["bridges"])) else 0.0
    places = re.findall(r"\((-?[\d.]+) (-?[\d.]+)\)", row["bridges"])
    return tuple(
        Hole((float(x), float(y)), "GND", 1.18 * side, 1.18 * side + 0.1, span=(2, 3))
        for x, y in places
    )


def board_of(
    row: dict[str, str],
    plane: tuple[Point, ...],
    lanes: Mapping[str, tuple[Point, ...]],
    width_mm: float,
) -> BoardPlan:
    """A board of the row's plane, gaps and stack, with pads at the ends of its traces."""
    gaps = shapely.get_parts(wkt.loads(row["gaps"]))
    beyond = row.get("beyond_mm")
    sheets = [Sheet("trace"), Sheet("cut", "Plane")]
    dielectrics = [Dielectric(float(row["height_mm"]))]
    pours = [Pour(2, "GND", plane, tuple(ring(gap) for gap in gaps))]
    if beyond:
        sheets.append(Sheet("whole", "Plane"))
        dielectrics.append(Dielectric(float(beyond)))
        pours.append(Pour(3, "GND", plane))
    side = max(width_mm, 0.1)
    return BoardPlan(
        name="row",
        outline=plane,
        sheets=tuple(sheets),
        dielectrics=tuple(dielectrics),
        traces=tuple(Trace(1, net, points, width_mm) for net, points in lanes.items()),
        pours=tuple(pours),
        pads=tuple(
            Pad(1, net, at, (side, side), ref, str(pin))
            for pin, (net, points) in enumerate(lanes.items(), start=1)
            for ref, at in (("U1", points[0]), ("U2", points[-1]))
        ),
        holes=vias(row) if beyond else (),
    )


def ranked(plan: BoardPlan, folder: Path) -> tuple[Finding, ...]:
    """Findings of a board, however little they add."""
    write_board(plan, folder)
    return road.rank(folder, road.Options(min_nh=0.0, jobs=1)).findings


def single(row: dict[str, str], folder: Path) -> tuple[Finding, ...]:
    """Findings of a row with one trace."""
    plane = ring(cast(Polygon, wkt.loads(row["plane"])))
    line = tuple((float(x), float(y)) for x, y in wkt.loads(row["trace"]).coords)
    return ranked(board_of(row, plane, {"SIG": line}, float(row["width_mm"])), folder)


def near(value: float | None, truth: float) -> bool:
    """Within 5 % or 0.02 nH."""
    return value is not None and abs(value - truth) <= max(0.05 * truth, 0.02)


@pytest.mark.parametrize("row", OVER, ids=lambda row: row["case"])
def test_reported_value_is_that_of_the_other_solver(row: dict[str, str], tmp_path: Path) -> None:
    """One finding for the trace, solved, within 5 % or 0.02 nH."""
    (found,) = single(row, tmp_path)
    assert (found.net, found.layer, found.plane_layer) == ("SIG", "trace", "cut")
    assert found.method == "solved"
    truth = float(row["added_nh"])
    assert near(found.added_nh, truth), (found.added_nh, truth)
    assert found.added_nh is not None
    assert found.error_nh is not None
    assert abs(found.added_nh - truth) <= found.error_nh + float(row["error_nh"])


@pytest.mark.parametrize("row", BESIDE, ids=lambda row: row["case"])
def test_a_void_that_the_trace_passes_by_is_told_if_it_counts(
    row: dict[str, str], tmp_path: Path
) -> None:
    """One finding, solved, within 5 % or 0.02 nH; none where there is little to tell of."""
    truth = float(row["added_nh"])
    found = single(row, tmp_path)
    if truth < LEAST_BESIDE_NH:
        assert found == ()
        return
    (one,) = found
    assert (one.kind, one.method, one.gap_mm) == ("void-crossing", "solved", 0.0)
    assert near(one.added_nh, truth), (one.added_nh, truth)
    assert "is open beside the trace" in one.reason


@pytest.mark.parametrize("way", [1.0, -1.0], ids=["drawn-alike", "drawn-against"])
@pytest.mark.parametrize("row", COUPLED, ids=lambda row: row["case"])
def test_two_nets_over_one_slot_couple_as_the_other_solver_says(
    row: dict[str, str], way: float, tmp_path: Path
) -> None:
    """Own and mutual inductance of both within 5 % or 0.02 nH, whichever way they are drawn."""
    aside = float(row["spacing_mm"]) / 2
    lanes = {"SIG0": ((-25.0, -aside), (25.0, -aside))}
    lanes["SIG1"] = ((-25.0 * way, aside), (25.0 * way, aside))
    plane = box(-40.0, -30.0, 40.0, 30.0)
    found = ranked(board_of(row, plane, lanes, FILAMENT_MM), tmp_path)
    assert sorted(finding.net for finding in found) == ["SIG0", "SIG1"]
    for finding in found:
        (share,) = finding.shares_gap_with
        assert near(finding.added_nh, float(row["self_nh"])), finding.added_nh
        assert near(share.mutual_nh, float(row["mutual_nh"])), share.mutual_nh
    one, other = (finding.added_nh or 0.0 for finding in found)
    odd = odd_nh(one, other, found[0].shares_gap_with[0].mutual_nh or 0.0)
    truth = 2 * (float(row["self_nh"]) - float(row["mutual_nh"]))
    assert odd == pytest.approx(truth, rel=0.05, abs=0.04)
