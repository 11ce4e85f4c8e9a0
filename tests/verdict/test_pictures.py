"""What is drawn of the demo board: true to the board, and never over a gap."""

from __future__ import annotations

import pytest
import shapely
from shapely import LineString, Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck import road
from splitcheck.verdict.closeup import LINES
from splitcheck.verdict.pictures import OVER_ONE_GAP
from splitcheck.verdict.views import Pictures, Shape


@pytest.fixture(scope="module")
def walked() -> road.Walked:
    """The demo board, judged."""
    return road.look(road.fixtures_folder() / "demo", road.Options(jobs=1))


@pytest.fixture(scope="module")
def pictures(walked: road.Walked) -> Pictures:
    """The demo board, drawn."""
    return road.picture(walked, road.Options(jobs=1))


def area(shapes: tuple[Shape, ...]) -> BaseGeometry:
    """Shapes of a picture as one geometry."""
    polygons = [Polygon(shape[0], shape[1:]) for shape in shapes]
    united: BaseGeometry = shapely.union_all(shapely.make_valid(polygons))
    return united


def test_no_line_of_the_return_current_crosses_a_gap(
    walked: road.Walked, pictures: Pictures
) -> None:
    """Not the gap in question as the board has it, but for what the eye cannot see."""
    drawn = [view for view in pictures.findings if view.broken is not None]
    assert len(drawn) >= 4
    for view in drawn:
        crossing = walked.judged.weighed[view.id].crossing
        gap = walked.scene.planes[crossing.plane].gaps[crossing.gap].shape
        size = max(view.window_mm[2] - view.window_mm[0], view.window_mm[3] - view.window_mm[1])
        inside = gap.buffer(-size / 150)
        assert view.broken is not None
        crossing_lines = [line for line in view.broken.lines if LineString(line).intersects(inside)]
        assert not crossing_lines, view.id


def test_lines_stand_for_equal_parts(pictures: Pictures) -> None:
    """As many as make the current of the trace; over a whole plane they keep near to it."""
    for view in pictures.findings:
        if view.whole is not None:
            assert view.whole.part == pytest.approx(1 / LINES)
            assert len(view.whole.lines) >= LINES - 2


def test_the_map_has_the_board_s_copper(walked: road.Walked, pictures: Pictures) -> None:
    """To a hundredth of its area, on every plane."""
    for layer in pictures.board.layers:
        if layer.number not in walked.scene.planes:
            assert layer.islands == ()
            continue
        true = sum(i.shape.area for i in walked.scene.planes[layer.number].islands)
        drawn = sum(area((island.shape,)).area for island in layer.islands)
        assert drawn == pytest.approx(true, rel=0.01)


def test_close_ups_show_where_the_plane_is_missing(walked: road.Walked, pictures: Pictures) -> None:
    """The run lies over the gap that is marked, in the window."""
    assert pictures.findings
    for view in pictures.findings:
        window = shapely.box(*view.window_mm)
        for run in view.runs:
            line = LineString(run)
            assert window.contains(line)
            bare = line.intersection(area(view.crossed)).length
            assert bare == pytest.approx(line.length, rel=0.1), view.id


def test_not_all_of_a_bus_is_solved_again(pictures: Pictures) -> None:
    """Over one gap the return current of the worst is enough."""
    assert 0 < pictures.with_streams < len(pictures.findings)
    by_gap = [view.crossed for view in pictures.findings if view.broken is not None]
    assert len(by_gap) == pictures.with_streams
    assert OVER_ONE_GAP >= 1


def test_drawing_changes_no_verdict(walked: road.Walked, pictures: Pictures) -> None:
    """Judged again after drawing, the findings are the same."""
    assert pictures.findings
    again = road.look(road.fixtures_folder() / "demo", road.Options(jobs=1))
    assert again.report.findings == walked.report.findings
