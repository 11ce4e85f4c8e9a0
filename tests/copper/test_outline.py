"""The board found in hand-made drawings of its edge, with what else such drawings hold."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from itertools import pairwise
from pathlib import Path

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from shapely import MultiPolygon, Polygon, box

from splitcheck.copper import gerber
from splitcheck.copper.marks import NO_TAG, Drawing, Flash, Mark, Stroke
from splitcheck.copper.outline import outline

Places = Sequence[tuple[float, float]]

WIDTH, HEIGHT = 40.0, 30.0
CORNERS = ((0.0, 0.0), (WIDTH, 0.0), (WIDTH, HEIGHT), (0.0, HEIGHT), (0.0, 0.0))
COPPER = (box(1, 1, 38, 28),)


def _strokes(*lines: Places) -> list[Mark]:
    return [Stroke(tuple(line), 0.1, None, True, NO_TAG, n) for n, line in enumerate(lines, 1)]


def _edges(ring: Places) -> list[Places]:
    return [tuple(pair) for pair in pairwise(ring)]


def _circle(x: float, y: float, radius: float, count: int = 48) -> Places:
    angles = [2 * math.pi * i / count for i in range(count)]
    ring = [(x + radius * math.cos(a), y + radius * math.sin(a)) for a in angles]
    return [*ring, ring[0]]


def _square(x: float, y: float, width: float, height: float) -> Places:
    return [(x, y), (x + width, y), (x + width, y + height), (x, y + height), (x, y)]


def _drawing(marks: list[Mark]) -> Drawing:
    return Drawing("edge.gbr", tuple(marks), (), ())


def _found(*lines: Places, copper: Sequence[Polygon] = COPPER) -> Polygon | MultiPolygon | None:
    x0, y0, x1, y1 = (float(v) for v in shapely.total_bounds(list(copper)))
    return outline(_drawing(_strokes(*lines)), (x0, y0, x1, y1), copper).shape


def _without(piece: Polygon, ring: Places) -> Polygon:
    rest = piece.difference(Polygon(ring))
    assert isinstance(rest, Polygon)
    return rest


def _area(shape: Polygon | MultiPolygon | None) -> float:
    assert shape is not None
    return float(shape.area)


@given(st.permutations(range(4)), st.lists(st.booleans(), min_size=4, max_size=4))
def test_edges_in_any_order_and_direction(order: list[int], turned: list[bool]) -> None:
    """Four lines close to one board, however they are drawn."""
    lines = [_edges(CORNERS)[i] for i in order]
    lines = [line[::-1] if turn else line for line, turn in zip(lines, turned, strict=True)]
    shape = _found(*lines)
    assert shape is not None
    assert shape.equals(box(0, 0, WIDTH, HEIGHT))


@given(st.floats(0.0, 0.09), st.sampled_from([0, 1, 2, 3]))
def test_small_gaps_close(gap: float, side: int) -> None:
    """A gap of up to 0.1 mm at a corner closes; the area hardly changes, and it is said."""
    edges = [list(edge) for edge in _edges(CORNERS)]
    (x0, y0), (x1, y1) = edges[side]
    length = math.dist((x0, y0), (x1, y1))
    edges[side][1] = (x1 - gap * (x1 - x0) / length, y1 - gap * (y1 - y0) / length)
    found = outline(_drawing(_strokes(*edges)), (1, 1, 38, 28), COPPER)
    assert _area(found.shape) == pytest.approx(WIDTH * HEIGHT, abs=0.2 * max(WIDTH, HEIGHT))
    assert any("gaps" in remark for remark in found.remarks) == (gap > 1e-3)


def test_open_edge_gives_no_outline() -> None:
    """A gap of 2 mm does not close, and that is said."""
    lines = [*_edges(CORNERS)[:3], ((0.0, HEIGHT), (0.0, 2.0))]
    found = outline(_drawing(_strokes(*lines)), (1, 1, 38, 28), COPPER)
    assert found.shape is None
    assert any("no loop" in remark for remark in found.remarks)


def test_line_that_ends_in_the_middle_of_another() -> None:
    """Edges that just miss the middle of a longer line still close."""
    lines = [
        ((-5.0, 0.0), (WIDTH + 5, 0.0)), ((0.0, 0.02), (0.0, HEIGHT)),
        ((0.0, HEIGHT), (WIDTH, HEIGHT)), ((WIDTH, HEIGHT), (WIDTH, 0.02)),
    ]  # fmt: skip
    assert _area(_found(*lines)) == pytest.approx(WIDTH * HEIGHT, rel=1e-3)


def test_cutouts_are_left_out_and_copper_is_not() -> None:
    """A loop inside without copper is a cut-out; one full of copper is a note on the drawing."""
    hole, note = _circle(10, 10, 3), _square(25, 10, 5, 5)
    copper = (_without(COPPER[0], _circle(10, 10, 3.5)),)
    shape = _found(*_edges(CORNERS), hole, note, copper=copper)
    assert isinstance(shape, Polygon)
    assert len(shape.interiors) == 1
    assert shape.area == pytest.approx(WIDTH * HEIGHT - Polygon(hole).area)


def test_sheet_rails_and_title_are_ignored() -> None:
    """A sheet frame, panel rails and a title box round or beside the board are not the board."""
    sheet, rails = _square(-100, -80, 300, 220), _square(-10, -10, 60, 50)
    found = outline(
        _drawing(_strokes(sheet, rails, *_edges(CORNERS), _square(120, -70, 60, 20))),
        (1, 1, 38, 28), COPPER,
    )  # fmt: skip
    assert found.shape is not None
    assert found.shape.equals(box(0, 0, WIDTH, HEIGHT))
    assert any("beside the board are ignored" in remark for remark in found.remarks)


def test_text_on_the_film_outside_the_board() -> None:
    """A little copper far off, such as a title on the film, does not hide the board."""
    copper = (*COPPER, box(80, 0, 90, 2))
    shape = _found(*_edges(CORNERS), copper=copper)
    assert shape is not None
    assert shape.equals(box(0, 0, WIDTH, HEIGHT))


def test_score_line_across_the_board() -> None:
    """A line from edge to edge does not halve the board."""
    shape = _found(*_edges(CORNERS), ((20.0, 0.0), (20.0, HEIGHT)))
    assert _area(shape) == pytest.approx(WIDTH * HEIGHT)


def test_round_board_without_copper_to_judge_by() -> None:
    """The box round the copper alone finds a round board."""
    ring = _circle(0, 0, 20)
    found = outline(_drawing(_strokes(ring)), (-19.9, -19.9, 19.9, 19.9))
    assert _area(found.shape) == pytest.approx(Polygon(ring).area)


def test_panel_of_boards() -> None:
    """Four boards side by side, framed or not, are four boards."""
    places = [(0, 0), (50, 0), (0, 40), (50, 40)]
    loops = [_square(x, y, WIDTH, HEIGHT) for x, y in places]
    copper = [box(x + 1, y + 1, x + WIDTH - 1, y + HEIGHT - 1) for x, y in places]
    shape = _found(*loops, copper=copper)
    assert isinstance(shape, MultiPolygon)
    assert len(shape.geoms) == 4
    assert shape.area == pytest.approx(4 * WIDTH * HEIGHT)


def test_nothing_drawn() -> None:
    """A file without lines gives no outline, and that is said."""
    marks: list[Mark] = [Flash((0.0, 0.0), box(0, 0, 1, 1), True, NO_TAG, 1)]
    found = outline(_drawing(marks), (0, 0, 1, 1))
    assert found.shape is None
    assert any("draws no line" in remark for remark in found.remarks)


@given(st.floats(-1000, 1000), st.floats(-1000, 1000), st.integers(0, 3))
def test_moving_and_turning_the_drawing_moves_the_board(dx: float, dy: float, turns: int) -> None:
    """The same drawing elsewhere, or turned, gives a board of the same area."""

    def put(point: tuple[float, float]) -> tuple[float, float]:
        x, y = point
        for _ in range(turns):
            x, y = -y, x
        return round(x + dx, 6), round(y + dy, 6)

    lines = [[put(p) for p in line] for line in [*_edges(CORNERS), _circle(10, 10, 3)]]
    corners = [(1.0, 1.0), (38.0, 1.0), (38.0, 28.0), (1.0, 28.0)]
    ring = [put(p) for p in _circle(10, 10, 4)]
    copper = [_without(Polygon([put(p) for p in corners]), ring)]
    expected = WIDTH * HEIGHT - Polygon(_circle(10, 10, 3)).area
    assert _area(_found(*lines, copper=copper)) == pytest.approx(expected, rel=1e-6)


def test_real_edges_close(corpus: Path) -> None:
    """The edge of every real board closes to a board within the size that its index states."""
    text = (corpus / "SOURCES.md").read_text(encoding="utf-8")
    sections = re.split(r"^### ", text, flags=re.MULTILINE)[1:]
    assert sections
    for section in sections:
        name = section.split("\n", 1)[0].strip()
        row = re.search(rf"^\| {re.escape(name)} \|.*\| ([^|]*) \|$", text, re.MULTILINE)
        files = re.findall(r"`([^`]+)`", re.findall(r"^- outline.*$", section, re.MULTILINE)[0])
        assert row
        # Several sizes stand where the file holds more than the board; the last is the copper's.
        sizes = re.findall(r"([\d.]+)x([\d.]+)", row[1])
        width, height = (float(v) for v in sizes[-1])
        path = corpus / name / files[0]
        drawing = gerber.read(path.read_text(encoding="latin-1"), path.name)
        x, y = (v for v in zip(*(p for m in drawing.marks if isinstance(m, Stroke)
                                 for p in m.points), strict=True))  # fmt: skip
        x_mm, y_mm = (min(x) + max(x)) / 2, (min(y) + max(y)) / 2
        w, h = width / 2 - 0.6, height / 2 - 0.6
        shape = outline(drawing, (x_mm - w, y_mm - h, x_mm + w, y_mm + h)).shape
        assert shape is not None, name
        x0, y0, x1, y1 = shape.bounds
        assert x1 - x0 == pytest.approx(width, abs=1.2), name
        assert y1 - y0 == pytest.approx(height, abs=1.2), name
