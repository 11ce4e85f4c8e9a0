"""Laws of the Gerber reader and the painter, on drawings that hypothesis makes up."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import pi

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import affinity
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import gerber, paint
from splitcheck.copper.marks import Mark

#: Coordinates on a grid that mm and inch share: 0.254 mm = 0.01 in.
STEP_MM = 0.254
GRID = st.integers(-40, 40)
#: Circle, rectangle, obround, triangle (a macro): sizes in steps.
APERTURES = ("C,{0}", "R,{0}X{1}", "O,{0}X{1}", "T,{0}X{1}")
MACRO = "%AMT*4,1,3,0,0,$1,0,0,$2,0,0,0*%"


@dataclass(frozen=True)
class Move:
    """One operation of a drawing, in grid steps."""

    kind: str
    at: tuple[int, int]
    to: tuple[int, int]
    tool: int
    dark: bool


moves = st.builds(
    Move,
    st.sampled_from(["flash", "stroke", "region"]),
    st.tuples(GRID, GRID),
    st.tuples(GRID, GRID),
    st.integers(0, 3),
    st.booleans(),
)
drawings = st.lists(moves, min_size=1, max_size=7)


def header(*, inch: bool = False) -> str:
    """Format, units and four apertures of the same size in mm."""
    step = STEP_MM / 25.4 if inch else STEP_MM
    lines = [f"%FSLAX44Y44*%%MO{'IN' if inch else 'MM'}*%", MACRO]
    for number, template in enumerate(APERTURES):
        lines.append(f"%ADD1{number}{template.format(f'{7 * step:.6f}', f'{4 * step:.6f}')}*%")
    return "\n".join([*lines, "G01*G75*", ""])


def body(drawing: list[Move], *, inch: bool = False, shift: tuple[int, int] = (0, 0)) -> str:
    """The operations of a drawing, as Gerber words."""
    step = 100 if inch else 2540

    def point(at: tuple[int, int]) -> str:
        return f"X{(at[0] + shift[0]) * step}Y{(at[1] + shift[1]) * step}"

    words = []
    for move in drawing:
        words.append(f"%LP{'D' if move.dark else 'C'}*%D1{move.tool}*")
        (x, y), (u, v) = move.at, move.to
        if move.kind == "flash":
            words.append(f"{point(move.at)}D03*")
        elif move.kind == "stroke":
            words.append(f"{point(move.at)}D02*{point(move.to)}D01*")
        else:
            ring = ((x, y), (u, y), (u, v), (x, v), (x, y))
            words.append(
                "G36*" + "".join(f"{point(p)}D0{1 + (not n)}*" for n, p in enumerate(ring))
            )
            words.append("G37*")
    return "\n".join(words) + "\n%LPD*%"


def image(text: str) -> BaseGeometry:
    """What a file leaves as copper, each piece valid."""
    pieces = paint.paint(gerber.read(text + "M02*", "it.gbr").marks)
    for piece in pieces:
        assert piece.is_valid
    return shapely.MultiPolygon(pieces)


def assert_same(one: BaseGeometry, other: BaseGeometry, tolerance_mm2: float = 1e-4) -> None:
    """The same image but for the rounding of corners to 1 nm."""
    assert shapely.symmetric_difference(one, other).area < tolerance_mm2


@given(drawings)
def test_inch_file_is_the_mm_file(drawing: list[Move]) -> None:
    """Same marks, same image."""
    mm = gerber.read(header() + body(drawing) + "M02*", "it.gbr").marks
    inch = gerber.read(header(inch=True) + body(drawing, inch=True) + "M02*", "it.gbr").marks
    assert [type(m) for m in mm] == [type(m) for m in inch]
    assert_same(paint_of(mm), paint_of(inch))


def paint_of(marks: Sequence[Mark]) -> BaseGeometry:
    """What marks leave as copper."""
    return shapely.MultiPolygon(paint.paint(marks))


@given(drawings, GRID, GRID)
def test_moved_drawing_is_the_image_moved(drawing: list[Move], x: int, y: int) -> None:
    """Painting does not depend on the place."""
    here = image(header() + body(drawing))
    there = image(header() + body(drawing, shift=(x, y)))
    assert_same(affinity.translate(here, x * STEP_MM, y * STEP_MM), there)


SETTINGS = {
    "%LMX*%": (-1, 0, 0, 1),
    "%LMY*%": (1, 0, 0, -1),
    "%LR90*%": (0, -1, 1, 0),
    "%LR180*%": (-1, 0, 0, -1),
    "%LMXY*%%LR270*%": (0, -1, 1, 0),
    "%LS2*%": (2, 0, 0, 2),
    "%LMX*%%LR90*%%LS0.5*%": (0, -0.5, -0.5, 0),
}


@given(drawings, st.sampled_from(sorted(SETTINGS)))
def test_block_under_lm_lr_ls_is_the_image_transformed(drawing: list[Move], setting: str) -> None:
    """Everything in a block is mirrored, turned and scaled together."""
    plain = image(header() + body(drawing))
    block = f"%ABD50*%{body(drawing)}%AB*%{setting}D50*X0Y0D03*"
    expected = affinity.affine_transform(plain, [*SETTINGS[setting], 0, 0])
    # Circles of another size have other chords: 2 um each way along every edge.
    assert_same(expected, image(header() + block), 0.004 * expected.length + 1e-4)


@given(drawings, st.integers(1, 3), st.integers(1, 3))
def test_step_repeat_is_the_copies_written_out(drawing: list[Move], nx: int, ny: int) -> None:
    """In the order of the format: up each column, then across."""
    repeat = f"%SRX{nx}Y{ny}I{31 * STEP_MM:.6f}J{17 * STEP_MM:.6f}*%"
    written = "".join(
        body(drawing, shift=(31 * column, 17 * row)) for column in range(nx) for row in range(ny)
    )
    one = gerber.read(header() + repeat + body(drawing) + "%SR*%M02*", "it.gbr").marks
    other = gerber.read(header() + written + "M02*", "it.gbr").marks
    assert [m._replace(line=0) for m in one] == [m._replace(line=0) for m in other]


@given(drawings)
def test_block_flashed_at_the_origin_is_its_contents(drawing: list[Move]) -> None:
    """Mark by mark."""
    plain = gerber.read(header() + body(drawing) + "M02*", "it.gbr").marks
    block = f"%ABD50*%{body(drawing)}%AB*%D50*X0Y0D03*M02*"
    boxed = gerber.read(header() + block, "it.gbr").marks
    assert [m._replace(line=0) for m in plain] == [m._replace(line=0) for m in boxed]


@given(drawings)
def test_dark_then_the_same_clear_leaves_nothing(drawing: list[Move]) -> None:
    """What the drawing paints, the drawing as clear takes away."""
    dark = body([move.__class__(**{**vars(move), "dark": True}) for move in drawing])
    clear = dark.replace("%LPD*%D", "%LPC*%D")
    assert image(header() + dark + clear).area == pytest.approx(0, abs=1e-6)


@given(drawings)
def test_painting_twice_changes_nothing(drawing: list[Move]) -> None:
    """The same dark marks again are the same copper."""
    dark = body([move.__class__(**{**vars(move), "dark": True}) for move in drawing])
    assert_same(image(header() + dark), image(header() + dark + dark))


@settings(max_examples=60)
@given(drawings)
def test_paint_is_the_plain_fold_of_its_marks(drawing: list[Move]) -> None:
    """Coats of paint give what one union or difference after another gives."""
    marks = gerber.read(header() + body(drawing) + "M02*", "it.gbr").marks
    plain: BaseGeometry = shapely.Polygon()
    for mark in marks:
        shape = paint_of([mark._replace(dark=True)])
        # On a grid: in floating numbers this plain fold itself goes wrong now and then.
        paint_on = shapely.union if mark.dark else shapely.difference
        plain = paint_on(plain, shape, grid_size=1e-6)
    assert_same(plain, paint_of(marks))


@given(drawings)
def test_a_mark_lies_on_a_piece_unless_it_was_cleared(drawing: list[Move]) -> None:
    """Each piece has a mark; each dark mark not touched by clear ones lies on exactly one."""
    marks = gerber.read(header() + body(drawing) + "M02*", "it.gbr").marks
    pieces = paint.paint(marks)
    landed = paint.landed(marks, pieces)
    assert {number for numbers in landed for number in numbers} == set(range(len(pieces)))
    for mark, numbers in zip(marks, landed, strict=True):
        if not mark.dark:
            assert numbers == ()
    if all(mark.dark for mark in marks):
        assert all(len(numbers) <= 1 for numbers in landed)


@given(st.floats(0.01, 30), st.floats(0, 2 * pi), st.floats(0.01, 2 * pi), st.booleans())
def test_pie_has_its_area(radius: float, start: float, sweep: float, clockwise: bool) -> None:
    """Any arc of any radius: r^2 sweep / 2, within the grid and 0.05 %."""
    centre = (40_000_000, 40_000_000)
    end = start + (-sweep if clockwise else sweep)
    a, b = (
        (
            centre[0] + round(1e6 * radius * float(np.cos(turn))),
            centre[1] + round(1e6 * radius * float(np.sin(turn))),
        )
        for turn in (start, end)
    )
    if max(abs(a[0] - b[0]), abs(a[1] - b[1])) < 100:
        return
    text = (
        f"%FSLAX46Y46*%%MOMM*%G75*G36*X{centre[0]}Y{centre[1]}D02*G01*X{a[0]}Y{a[1]}D01*"
        f"G0{2 if clockwise else 3}*X{b[0]}Y{b[1]}I{centre[0] - a[0]}J{centre[1] - a[1]}D01*"
        f"G01*X{centre[0]}Y{centre[1]}D01*G37*"
    )
    assert image(text).area == pytest.approx(radius**2 * sweep / 2, rel=5e-4, abs=1e-6 * radius)
