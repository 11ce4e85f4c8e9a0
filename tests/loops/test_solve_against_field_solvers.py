"""The field solve against other field solvers, which mesh the copper where it meshes the gaps.

``reference.csv`` and ``reference_coupling.csv`` hold independent PyPEEC 5.8.0 runs (voxels 0.1 mm
or finer, corrected for the mesh) and runs of sheet solvers, as their last column says row by row.
"""

from __future__ import annotations

import csv
import re
from pathlib import Path

import numpy as np
import pytest
import shapely
from shapely import LineString, Point, Polygon, wkt

from splitcheck.loops.solve import TraceOver, ViaBridge, added

FOLDER = Path(__file__).parent


def rows(name: str) -> list[dict[str, str]]:
    """Rows of a table."""
    with (FOLDER / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def gaps_of(row: dict[str, str]) -> list[Polygon]:
    """The gaps of a row."""
    return [part for part in shapely.get_parts(wkt.loads(row["gaps"])) if part.area > 0]


def bridges_of(row: dict[str, str]) -> list[ViaBridge]:
    """A square via of side a carries current like a round one of diameter 1.18 a (from memory)."""
    side = float(found[1]) if (found := re.search(r"([\d.]+) mm square", row["bridges"])) else 0.0
    places = re.findall(r"\((-?[\d.]+) (-?[\d.]+)\)", row["bridges"])
    return [ViaBridge(Point(float(x), float(y)), 1.18 * side) for x, y in places]


@pytest.mark.parametrize("row", rows("reference.csv"), ids=lambda row: row["case"])
def test_added_inductance_is_that_of_the_other_solver(row: dict[str, str]) -> None:
    """Within 5 % or 0.02 nH, and within the two error bars."""
    line = wkt.loads(row["trace"])
    assert isinstance(line, LineString)
    plane = wkt.loads(row["plane"])
    assert isinstance(plane, Polygon)
    gaps = gaps_of(row)
    open_ended = any(gap.intersects(plane.exterior) for gap in gaps)
    solution = added(
        gaps,
        [TraceOver(line, float(row["width_mm"]))],
        float(row["height_mm"]),
        beyond_mm=float(row["beyond_mm"]) if row["beyond_mm"] else None,
        bridges=bridges_of(row),
        outside=plane if open_ended else None,
    )
    value = solution.of(0)
    assert value is not None
    truth, unsure = float(row["added_nh"]), float(row["error_nh"])
    assert abs(value - truth) <= max(0.05 * truth, 0.02)
    assert abs(value - truth) <= unsure + solution.error_nh[0, 0]


@pytest.mark.parametrize("row", rows("reference_coupling.csv"), ids=lambda row: row["case"])
def test_two_traces_over_one_slot_couple_as_the_other_solver_says(row: dict[str, str]) -> None:
    """Self and mutual inductance within 5 %."""
    aside = float(row["spacing_mm"]) / 2
    traces = [TraceOver(LineString([(-25, y), (25, y)]), 0.0) for y in (-aside, aside)]
    solution = added(gaps_of(row), traces, float(row["height_mm"]))
    assert solution.added_nh[0, 0] == pytest.approx(float(row["self_nh"]), rel=0.05)
    assert solution.added_nh[0, 1] == pytest.approx(float(row["mutual_nh"]), rel=0.05)


@pytest.mark.parametrize("row", rows("reference_coupling.csv"), ids=lambda row: row["case"])
def test_a_pair_over_one_slot_adds_in_odd_mode_what_the_other_solver_says(
    row: dict[str, str],
) -> None:
    """L11 + L22 - 2 L12 within 5 % or 0.02 nH a leg, though near values are taken from another."""
    aside = float(row["spacing_mm"]) / 2
    traces = [TraceOver(LineString([(-25, y), (25, y)]), 0.0) for y in (-aside, aside)]
    one_way = np.array([1.0, -1.0])
    odd_nh = one_way @ added(gaps_of(row), traces, float(row["height_mm"])).added_nh @ one_way
    truth = 2 * (float(row["self_nh"]) - float(row["mutual_nh"]))
    assert odd_nh == pytest.approx(truth, rel=0.05, abs=0.04)


def test_a_slot_under_a_stripline_adds_what_the_other_solver_says() -> None:
    """PyPEEC 5.8.0: 0.438 nH with voxels of 0.2 mm and 0.420 nH with 0.1 mm, so 0.403 nH at none.

    Planes of 16 x 16 mm, 0.6 mm apart; a trace 10 mm long and 0.4 mm wide, 0.2 mm from the plane
    with the slot of 8 x 0.4 mm; both planes joined at the ends of the trace.
    """
    trace = TraceOver(LineString([(-5, 0), (5, 0)]), 0.4)
    slot = shapely.box(-0.2, -4, 0.2, 4)
    assert added([slot], [trace], 0.2, above_mm=0.6).of(0) == pytest.approx(0.403, rel=0.05)


@pytest.mark.parametrize("kept_mm", [4.0, 8.0, 12.0])
@pytest.mark.parametrize(
    "row",
    [row for row in rows("reference.csv") if row["case"].startswith("D_")],
    ids=lambda row: row["case"],
)
def test_slot_cut_off_on_its_way_to_the_rim_adds_what_all_of_it_does(
    row: dict[str, str], kept_mm: float
) -> None:
    """The slot goes on to the rim of the plane, 20 mm off; closed where it is cut it adds less."""
    (gap,) = gaps_of(row)
    kept = shapely.box(*gap.bounds[:3], kept_mm)
    trace = TraceOver(LineString([(-15, 0), (15, 0)]), float(row["width_mm"]))
    open_nh = added([kept], [trace], float(row["height_mm"]), ends=[Point(0, kept_mm)]).of(0)
    closed_nh = added([kept], [trace], float(row["height_mm"])).of(0)
    assert open_nh == pytest.approx(float(row["added_nh"]), rel=0.05)
    assert closed_nh is not None
    assert closed_nh < 0.9 * float(row["added_nh"])
