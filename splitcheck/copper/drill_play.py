"""From the commands of a drill file and a number format to holes, tool by tool."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from splitcheck.copper.drill_fit import Format
from splitcheck.copper.drill_script import Op, Script
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError

#: Most holes in one file, repeats included.
HOLES_CAP = 500_000


class Raw(NamedTuple):
    """A hole before its tool is looked up."""

    path: tuple[Point, ...]
    tool: int
    line: int


def play(script: Script, form: Format, most: int | None = None) -> list[Raw]:
    """Carry out the commands of a drill file under one number format.

    Parameters
    ----------
    script
        The file taken apart.
    form
        How its numbers are read.
    most
        Stop after about that many holes; ``None``: play all.

    Returns
    -------
    Holes and slots in file order, mm on the 1 nm grid.

    Raises
    ------
    SplitcheckError
        If it drills before a tool is chosen, or more than ``HOLES_CAP`` holes.
    """
    head = _Head(script, form, most)
    for op in script.ops:
        head.do(op)
        if most is not None and len(head.raws) >= most:
            break
    head.lift()
    return head.raws


class _Head:
    """Where the drill stands and what it has drilled."""

    def __init__(self, script: Script, form: Format, most: int | None) -> None:
        self.most = HOLES_CAP if most is None else most
        self.script = script
        self.form = form
        self.raws: list[Raw] = []
        self.at: Point = (0.0, 0.0)
        self.tool: int | None = None
        self.relative = False
        self.path: list[Point] = []
        self.line = 0
        self.values_mm: dict[str, float] = {}

    def value_mm(self, word: str) -> float:
        value = self.values_mm.get(word)
        if value is None:
            value = self.values_mm[word] = self.form.value_mm(word)
        return value

    def target(self, x: str | None, y: str | None) -> Point:
        """The place that coordinates name; a missing one stays as it was."""
        if self.relative:
            dx_mm = 0.0 if x is None else self.value_mm(x)
            dy_mm = 0.0 if y is None else self.value_mm(y)
            return round(self.at[0] + dx_mm, 6), round(self.at[1] + dy_mm, 6)
        x_mm = self.at[0] if x is None else self.value_mm(x)
        y_mm = self.at[1] if y is None else self.value_mm(y)
        return x_mm, y_mm

    def do(self, op: Op) -> None:
        self.line = op.line
        if op.code == "tool":
            self.lift()
            self.tool = op.number
        elif op.code == "hit":
            self.lift()
            self.at = self.target(op.x, op.y)
            self.drill((self.at,))
        elif op.code == "slot":
            self.lift()
            start = self.at = self.target(op.x, op.y)
            self.at = self.target(op.x2, op.y2)
            self.drill((start, self.at) if self.at != start else (start,))
        elif op.code == "repeat":
            self.repeat(op)
        elif op.code in ("relative", "absolute"):
            self.relative = op.code == "relative"
        else:
            self.rout(op)

    def rout(self, op: Op) -> None:
        if op.code == "up":
            self.lift()
        elif op.code == "down":
            self.path = self.path or [self.at]
        elif op.code == "arc":
            end = self.target(op.x, op.y)
            arc = self.arc(op, end)
            if self.path:
                self.path.extend(arc)
            self.at = end
        else:
            self.at = self.target(op.x, op.y)
            if self.path and op.code == "cut":
                self.path.append(self.at)

    def arc(self, op: Op, end: Point) -> list[Point]:
        """Points on an arc given by its centre (I, J) or by its radius (A)."""
        start = self.at
        if op.radius is None:
            i_mm = self.value_mm(op.x2) if op.x2 else 0.0
            j_mm = self.value_mm(op.y2) if op.y2 else 0.0
            centre = start[0] + i_mm, start[1] + j_mm
        else:
            radius_mm = abs(self.value_mm(op.radius))
            half_mm = math.dist(start, end) / 2
            if half_mm == 0 or half_mm > radius_mm + 1e-3:
                return [end]
            # The centre of an arc of at most half a turn, right of the chord if clockwise.
            rise_mm = math.sqrt(max(0.0, radius_mm**2 - half_mm**2)) * op.number
            ux, uy = (end[0] - start[0]) / half_mm / 2, (end[1] - start[1]) / half_mm / 2
            middle = (start[0] + end[0]) / 2, (start[1] + end[1]) / 2
            centre = middle[0] + uy * rise_mm, middle[1] - ux * rise_mm
        return _arc_points(start, end, centre, op.number)

    def repeat(self, op: Op) -> None:
        """R: the last hole again, each time one step further."""
        dx_mm = 0.0 if op.x is None else self.value_mm(op.x)
        dy_mm = 0.0 if op.y is None else self.value_mm(op.y)
        for _ in range(min(op.number, self.most - len(self.raws) + 1)):
            self.at = round(self.at[0] + dx_mm, 6), round(self.at[1] + dy_mm, 6)
            self.drill((self.at,))

    def lift(self) -> None:
        """End the slot that is being cut, if one is."""
        if self.path:
            clean = [p for i, p in enumerate(self.path) if i == 0 or p != self.path[i - 1]]
            self.drill(tuple(clean))
            self.path = []

    def drill(self, path: tuple[Point, ...]) -> None:
        if self.tool is None:
            wrong = "drills before any tool is chosen"
            raise SplitcheckError(f"{self.script.name}:{self.line}", wrong, "export it again")
        if len(self.raws) >= HOLES_CAP:
            wrong = f"drills over {HOLES_CAP} holes"
            raise SplitcheckError(f"{self.script.name}:{self.line}", wrong, "split the drill file")
        self.raws.append(Raw(path, self.tool, self.line))


def _arc_points(
    start: tuple[float, float], end: tuple[float, float], centre: tuple[float, float], way: int
) -> list[tuple[float, float]]:
    """Points after ``start`` on an arc to ``end``, mm; ``way`` is 1 clockwise, -1 the other way."""
    x, y = centre
    angle = float(np.arctan2(start[1] - y, start[0] - x))
    last = float(np.arctan2(end[1] - y, end[0] - x))
    turn = (angle - last if way > 0 else last - angle) % (2 * np.pi) or 2 * np.pi
    radius_mm = float(np.hypot(start[0] - x, start[1] - y))
    angles = angle - way * np.linspace(0, turn, max(2, int(np.ceil(turn / 0.1)) + 1))[1:-1]
    mid = [
        (round(x + radius_mm * np.cos(a), 6), round(y + radius_mm * np.sin(a), 6)) for a in angles
    ]
    return [*((float(a), float(b)) for a, b in mid), end]
