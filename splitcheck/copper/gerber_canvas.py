"""Marks as they pile up: step-repeat and block apertures written out, within a cap."""

from __future__ import annotations

from collections.abc import Sequence
from math import floor
from typing import NamedTuple, NoReturn

from shapely import Polygon, get_num_coordinates

from splitcheck.copper.apertures import MOST_MM, Setting, linear
from splitcheck.copper.gerber_language import Repeat
from splitcheck.copper.marks import Fill, Flash, Mark, Point, Stroke, Tag
from splitcheck.errors import SplitcheckError

#: Most marks that step-repeat and blocks may make of a file, together.
MOST_COPIES = 1_000_000
MOST_NESTING = 100
#: Most corners of all marks of a file together; a dense real layer has half a million.
MOST_CORNERS = 20_000_000

Matrix = tuple[float, float, float, float]
SAME: Matrix = (1.0, 0.0, 0.0, 1.0)


class Copying(NamedTuple):
    """How a mark is copied: its points and its shape by a matrix, then moved."""

    points: Matrix = SAME
    shape: Matrix = SAME
    scale: float = 1.0
    flip: bool = False
    """Turn dark into clear and back."""


class Canvas:
    """Where marks go: the file itself, a block being defined, or a step-repeat being gathered."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.marks: list[Mark] = []
        self._outer: list[tuple[list[Mark], int | None, int, Repeat | None]] = []
        self._copies = 0
        self._shapes: dict[tuple[int, Matrix], tuple[Polygon, Polygon]] = {}

    def open_block(self, code: int, line: int) -> None:
        """Start the definition of a block aperture."""
        self._nest(code, line, None)

    def open_repeat(self, repeat: Repeat, line: int) -> None:
        """Start gathering marks for step-repeat."""
        copies = repeat.columns * repeat.rows
        if copies > MOST_COPIES:
            self._too_many(line, f"{repeat.columns} x {repeat.rows} = {copies}")
        reach = max(
            (repeat.columns - 1) * abs(repeat.step_x), (repeat.rows - 1) * abs(repeat.step_y)
        )
        if not reach < MOST_MM:
            wrong = f"step-repeat reaches {reach:g} mm, beyond the limit of {MOST_MM:g} mm"
            raise SplitcheckError(f"{self.name}:{line}", wrong, "check its steps and units")
        self._nest(None, line, repeat)

    def _nest(self, code: int | None, line: int, repeat: Repeat | None) -> None:
        if len(self._outer) >= MOST_NESTING:
            wrong = f"blocks and step-repeats are nested more than {MOST_NESTING} deep"
            raise SplitcheckError(f"{self.name}:{line}", wrong, "export the file again")
        self._outer.append((self.marks, code, line, repeat))
        self.marks = []

    def inside_block(self) -> int | None:
        """Line at which the innermost open block was opened; ``None`` outside of blocks."""
        for _, code, line, _ in reversed(self._outer):
            if code is not None:
                return line
        return None

    def open_codes(self) -> set[int]:
        """Codes of the blocks being defined now: none of them can be used yet."""
        return {code for _, code, _, _ in self._outer if code is not None}

    def repeating(self) -> bool:
        """Whether the innermost open thing is a step-repeat."""
        return bool(self._outer) and self._outer[-1][3] is not None

    def close_block(self) -> tuple[int, tuple[Mark, ...]] | None:
        """End the innermost block: its code and marks; ``None`` if none is open."""
        if self.repeating():
            self.close_repeat()
        if not self._outer or self._outer[-1][1] is None:
            return None
        marks = tuple(self.marks)
        self.marks, code, _, _ = self._outer.pop()
        assert code is not None
        return code, marks

    def close_repeat(self) -> None:
        """End the innermost step-repeat and write its copies out: up each column, then across."""
        gathered = self.marks
        self.marks, _, line, repeat = self._outer.pop()
        assert repeat is not None
        count = repeat.columns * repeat.rows
        if count == 1:
            self.marks.extend(gathered)
            return
        self._spend(
            line,
            count * len(gathered),
            f"{repeat.columns} x {repeat.rows} copies of {len(gathered)} marks"
            f" = {count * len(gathered)}",
        )
        for column in range(repeat.columns):
            for row in range(repeat.rows):
                shift = (column * repeat.step_x, row * repeat.step_y)
                self.marks.extend(self.copied(mark, Copying(), shift) for mark in gathered)

    def set_down(
        self,
        block: tuple[Mark, ...],
        setting: Setting,
        at: Point,
        tag: Tag,
        line: int,
        *,
        dark: bool,
    ) -> None:
        """Flash a block aperture: a clear flash turns its polarities round."""
        self._spend(line, len(block), f"{self._copies + len(block)} marks from blocks")
        matrix = setting.matrix()
        copying = Copying(matrix, matrix, setting.scale, flip=not dark)
        for mark in block:
            copy = self.copied(mark, copying, at)
            if copy.tag != tag:
                copy = copy._replace(tag=_inherited(copy.tag, tag))
            self.marks.append(copy)

    def copied(self, mark: Mark, how: Copying, shift: Point) -> Mark:
        """One mark under ``how``, then moved by ``shift`` (mm), back on the 1 nm grid."""
        dark = mark.dark != how.flip
        if type(mark) is Stroke:
            points, width, shape, _, tag, line = mark
            if how.scale != 1.0:
                width = round(width * how.scale, 6)
            if shape is not None:
                shape = self._shaped(shape, how.shape)
            return Stroke(_moved(points, how.points, shift), width, shape, dark, tag, line)
        if type(mark) is Flash:
            at, stamp, _, tag, line, size = mark
            if size is not None and how.scale != 1.0:
                size = round(size * how.scale, 6)
            (at,) = _moved((at,), how.points, shift)
            return Flash(at, self._shaped(stamp, how.shape), dark, tag, line, size)
        assert isinstance(mark, Fill)
        return Fill(_moved(mark.ring, how.points, shift), dark, mark.tag, mark.line)

    def _shaped(self, shape: Polygon, matrix: Matrix) -> Polygon:
        if matrix == SAME:
            return shape
        key = (id(shape), matrix)
        # The original is kept too, or its id could be given to another.
        if key not in self._shapes:
            self._shapes[key] = (shape, linear(shape, matrix))
        return self._shapes[key][1]

    def _spend(self, line: int, copies: int, told: str) -> None:
        self._copies += copies
        if self._copies > MOST_COPIES:
            self._too_many(line, told)

    def _too_many(self, line: int, told: str) -> NoReturn:
        wrong = f"step-repeat and blocks make too many marks: {told}, limit {MOST_COPIES}"
        raise SplitcheckError(
            f"{self.name}:{line}", wrong, "export one board, not the panel, or write it out"
        )


def check_corners(marks: Sequence[Mark], name: str) -> None:
    """Refuse marks that would have absurdly many corners when they are painted.

    Raises
    ------
    SplitcheckError
        At the mark that passes the limit: a large macro set down very often, for example.
    """
    total = 0
    known: dict[int, int] = {}
    for mark in marks:
        if type(mark) is Stroke and mark.shape is None:
            continue
        if isinstance(mark, Fill):
            total += len(mark.ring)
        elif mark.shape is not None:
            if id(mark.shape) not in known:
                known[id(mark.shape)] = int(get_num_coordinates(mark.shape))
            # Each edge sweeps a parallelogram along each stretch of a stroke.
            each = 1 if isinstance(mark, Flash) else 4 * len(mark.points)
            total += each * known[id(mark.shape)]
        if total > MOST_CORNERS:
            wrong = f"the marks up to here have {total} corners, limit {MOST_CORNERS}"
            raise SplitcheckError(f"{name}:{mark.line}", wrong, "export with simpler apertures")


def _moved(points: tuple[Point, ...], matrix: Matrix, shift: Point) -> tuple[Point, ...]:
    dx, dy = shift
    # Flooring a sum of grid values is as exact as round(), and three times as fast.
    if matrix == SAME:
        return tuple(
            (floor((x + dx) * 1e6 + 0.5) / 1e6, floor((y + dy) * 1e6 + 0.5) / 1e6)
            for x, y in points
        )
    a, b, c, d = matrix
    return tuple(
        (
            floor((a * x + b * y + dx) * 1e6 + 0.5) / 1e6,
            floor((c * x + d * y + dy) * 1e6 + 0.5) / 1e6,
        )
        for x, y in points
    )


def _inherited(inner: Tag, outer: Tag) -> Tag:
    """Attributes of the mark inside the block; what it does not say, the flash says."""
    return Tag(
        *(mine if mine is not None else theirs for mine, theirs in zip(inner, outer, strict=True))
    )
