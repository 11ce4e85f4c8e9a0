"""The writer of hand-made boards, read back by another reader (gerbonara 1.5)."""

from __future__ import annotations

from pathlib import Path

import pytest
from gerbonara import ExcellonFile, GerberFile
from gerbonara.utils import MM

from fixtures.making.gerber import Attributes, Units
from fixtures.making.plan import Placing
from fixtures.making.write import write_board
from fixtures.tide_logger import HEIGHT_MM, WIDTH_MM, tide_logger
from tests.making.boards import slotted_board

PLACINGS = (
    Placing(),
    Placing((-120.0, 35.5), 90.0),
    Placing((7.0, -3.0), 270.0, mirrored=True),
)


@pytest.mark.parametrize("units", ["mm", "inch"])
@pytest.mark.parametrize("placing", PLACINGS, ids=str)
def test_outline_lies_where_the_plan_puts_it(
    tmp_path: Path, units: Units, placing: Placing
) -> None:
    """Corners of the outline's box, read back, are those of the plan, placed."""
    plan = tide_logger(faulty=True)
    write_board(plan, tmp_path, units=units, placing=placing)
    drawing = GerberFile.open(tmp_path / "tide-logger-outline.gbr")
    (x0, y0), (x1, y1) = drawing.bounding_box(unit="mm")
    ends = [placing.place((0.0, 0.0)), placing.place((WIDTH_MM, HEIGHT_MM))]
    half = 0.05  # of the line the outline is drawn with
    xs, ys = zip(*ends, strict=True)
    assert (x0, y0) == pytest.approx((min(xs) - half, min(ys) - half), abs=1e-4)
    assert (x1, y1) == pytest.approx((max(xs) + half, max(ys) + half), abs=1e-4)


@pytest.mark.filterwarnings("ignore::SyntaxWarning")  # it warns of a bare METRIC, which is XNC
@pytest.mark.parametrize("units", ["mm", "inch"])
def test_holes_lie_where_the_plan_puts_them(tmp_path: Path, units: Units) -> None:
    """Places and diameters of all plated holes, read back, are those of the plan."""
    plan = tide_logger(faulty=True)
    write_board(plan, tmp_path, units=units, drilling="xnc")
    drawing = ExcellonFile.open(tmp_path / "tide-logger-PTH.drl")
    found = sorted(
        (round(MM(hole.x, hole.unit), 3), round(MM(hole.y, hole.unit), 3))
        for hole in drawing.objects
    )
    assert found == sorted((round(h.at[0], 3), round(h.at[1], 3)) for h in plan.holes if h.plated)
    sizes = sorted(MM(hole.aperture.diameter, hole.aperture.unit) for hole in drawing.objects)
    assert sizes == pytest.approx(sorted(h.drill_mm for h in plan.holes if h.plated), abs=1e-3)


@pytest.mark.parametrize("attributes", ["x2", "comments", "none"])
def test_attributes_change_no_copper(tmp_path: Path, attributes: Attributes) -> None:
    """However layers and nets are named, a reader finds the same strokes and flashes."""
    paths = write_board(slotted_board(), tmp_path, attributes=attributes)
    top = next(path for path in paths if "top" in path.name or path.suffix == ".gtl")
    objects = GerberFile.open(top).objects
    # three traces of one straight stroke, six pads, four vias
    assert len(objects) == 3 + 6 + 4
