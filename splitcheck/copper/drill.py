"""From a drill file to holes and slots in mm, its format checked against the copper pads."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np
from shapely import Polygon

from splitcheck.copper import drill_fit, naming
from splitcheck.copper.drill_fit import Fit, Format
from splitcheck.copper.drill_script import Op, Script, Tool, scan
from splitcheck.copper.holes import DrillFile, Hole
from splitcheck.copper.marks import Drawing, Flash, Point, Stroke
from splitcheck.errors import SplitcheckError
from splitcheck.units import INCH_MM, Floats

#: Most holes in one file, repeats included.
HOLES_CAP = 1_000_000
#: Share of holes on pads from which a format counts as right.
_RIGHT = 0.5
_CLEAR = 0.6
_SHIFT_CLEAR = 0.8
_FEW = 5


class _Raw(NamedTuple):
    """A hole before its tool is looked up."""

    path: tuple[Point, ...]
    tool: int
    line: int


class _Choice(NamedTuple):
    format: Format
    shift_mm: Point
    remarks: tuple[str, ...]


def read(
    text: str,
    name: str,
    *,
    pads: Sequence[Point] | Floats = (),
    tools: Mapping[int, float] | None = None,
) -> DrillFile:
    r"""Read an Excellon or XNC drill file.

    Parameters
    ----------
    text
        The whole file.
    name
        Its name, for messages; ``NPTH`` or ``PTH`` in it tells plating where nothing else does.
    pads
        Pad centres of the copper layers, mm. They decide the number format where the file does
        not state it all, and correct one that is evidently wrong. Without them the file's word
        or the default of the trade is taken, with a remark.
    tools
        Diameters from a separate list, mm, by tool number; used for tools without a size.

    Returns
    -------
    Holes and slots in file order, with the format in words; what was assumed or looked odd is
    in the remarks.

    Raises
    ------
    SplitcheckError
        At a command or number that cannot be understood, a tool without diameter, or a stated
        format that the copper contradicts while no other fits.

    Examples
    --------
    >>> drill = read("M48\nMETRIC\nT1C0.3\n%\nT1\nX1.5Y2.0\nM30\n", "a.drl")
    >>> drill.holes[0].path, drill.holes[0].diameter_mm, drill.format
    (((1.5, 2.0),), 0.3, 'metric, decimal points')
    """
    script = scan(text, name)
    choice = _choose(script, drill_fit.unique_places(pads))
    raws = _play(script, choice.format)
    plating = _plating(script)
    span = _span(script)
    sizes_mm = {n: _size_mm(script, n, choice.format, tools, raws) for n in {r.tool for r in raws}}
    holes = []
    for raw in raws:
        tool = script.tools.get(raw.tool)
        plated = tool.plated if tool and tool.plated is not None else plating
        via = tool.via if tool else None
        path = _moved(raw.path, choice.shift_mm)
        holes.append(Hole(path, sizes_mm[raw.tool], plated, span, raw.line, via))
    return DrillFile(
        name=name,
        holes=tuple(holes),
        format=choice.format.words(script.all_decimal()),
        stated=drill_fit.states_all(script),
        remarks=(*script.remarks, *choice.remarks, *_count_remarks(script, raws)),
    )


def _plating(script: Script) -> bool | None:
    """Plating of the whole file: its attribute, or else its name."""
    if script.function:
        return {"plated": True, "nonplated": False}.get(script.function[0].casefold())
    return naming.plating(script.name)


def _span(script: Script) -> tuple[int, int] | None:
    ends = [int(f) for f in script.function[1:3] if f.isdecimal() and len(f) <= 3]
    return (min(ends), max(ends)) if len(ends) == 2 else None


def _moved(path: tuple[Point, ...], shift_mm: Point) -> tuple[Point, ...]:
    if shift_mm == (0.0, 0.0):
        return path
    return tuple((round(x + shift_mm[0], 6), round(y + shift_mm[1], 6)) for x, y in path)


def _play(script: Script, form: Format) -> list[_Raw]:
    """Carry out the commands under one number format."""
    head = _Head(script, form)
    for op in script.ops:
        head.do(op)
    head.lift()
    return head.raws


class _Head:
    """Where the drill stands and what it has drilled."""

    def __init__(self, script: Script, form: Format) -> None:
        self.script = script
        self.form = form
        self.raws: list[_Raw] = []
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
        return drill_fit.arc_points(start, end, centre, op.number)

    def repeat(self, op: Op) -> None:
        """R: the last hole again, each time one step further."""
        dx_mm = 0.0 if op.x is None else self.value_mm(op.x)
        dy_mm = 0.0 if op.y is None else self.value_mm(op.y)
        for _ in range(op.number):
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
        self.raws.append(_Raw(path, self.tool, self.line))


def _size_mm(
    script: Script, number: int, form: Format, tools: Mapping[int, float] | None, raws: list[_Raw]
) -> float:
    """Diameter of a tool; a number without a decimal point and over reason is in thousandths."""
    tool = script.tools.get(number)
    size_mm = 0.0
    if tool and tool.size:
        size_mm = _listed_mm(tool, form)
    elif tools and number in tools:
        size_mm = tools[number]
    if not 0 < size_mm < 100:
        line = next(r.line for r in raws if r.tool == number)
        wrong = f"tool T{number} drills holes but its diameter is not given"
        if size_mm:
            wrong = f"tool T{number} drills holes of {size_mm:g} mm, over 100 mm"
        do = "export the drill file with its tool table"
        raise SplitcheckError(f"{script.name}:{line}", wrong, do)
    return round(size_mm, 6)


def _listed_mm(tool: Tool, form: Format) -> float:
    size = float(tool.size or "0")
    unit_mm = 1.0 if (tool.unit or form.unit) == "mm" else INCH_MM
    whole_number = "." not in (tool.size or "")
    return size * unit_mm / 1000 if whole_number and size * unit_mm > 12.7 else size * unit_mm


def _choose(script: Script, pads: Floats) -> _Choice:
    """The format to read the numbers by, with what led to it."""
    base = drill_fit.default(script)
    stated = drill_fit.states_all(script)
    if not script.ops:
        return _Choice(base, (0.0, 0.0), (f"{script.name}: drills no holes",))
    words = base.words(script.all_decimal())
    if not len(pads):
        guess = f"{script.name}: the number format is not stated; read as {words}, unchecked"
        return _Choice(base, (0.0, 0.0), () if stated else (guess,))
    first = Fit(base, drill_fit.share_on_pads(_centres(script, base), pads))
    if stated and first.share >= _RIGHT:
        return _Choice(base, (0.0, 0.0), (_said(script, first),))
    ranked = drill_fit.rank(drill_fit.candidates(script), pads, lambda f: _centres(script, f))
    best = ranked[0]
    count = len(_centres(script, base))
    if stated:
        return _overruled(script, first, best, pads, count)
    if best.share >= _RIGHT or (best.share >= 0.3 and count >= 10):
        return _Choice(best.format, (0.0, 0.0), (_said(script, best, ranked),))
    moved = _shifted(script, [fit.format for fit in ranked], pads)
    return moved or _by_spread(script, ranked, pads)


def _overruled(script: Script, first: Fit, best: Fit, pads: Floats, count: int) -> _Choice:
    """What to do with a stated format that few pads bear out.

    Non-plated holes rarely have pads, so a low share alone contradicts nothing.
    """
    all_decimal = script.all_decimal()
    words = first.format.words(all_decimal)
    if best.share >= _CLEAR and best.share > 3 * first.share and best.share * count >= _FEW:
        text = (
            f"{script.name}: states {words}, by which {first.share:.0%} of its {count} holes lie on"
            f" pads; assumed to be {best.format.words(all_decimal)} instead ({best.share:.0%})"
        )
        return _Choice(best.format, (0.0, 0.0), (text,))
    if moved := _shifted(script, [first.format], pads):
        return moved
    holes_mm = drill_fit.spread_mm(_centres(script, first.format))
    copper_mm = drill_fit.spread_mm(pads)
    scale = max(h / max(c, 1.0) for h, c in zip(holes_mm, copper_mm, strict=True))
    if scale > 2.5 and first.share < 0.1:
        wrong = (
            f"read as it states ({words}) its holes spread over {holes_mm[0]:.0f} x"
            f" {holes_mm[1]:.0f} mm, {scale:.1f} times the copper"
            f" ({copper_mm[0]:.0f} x {copper_mm[1]:.0f} mm)"
        )
        raise SplitcheckError(script.name, wrong, "export the drill file in the right format")
    return _Choice(first.format, (0.0, 0.0), (_said(script, first),))


def _shifted(script: Script, formats: Sequence[Format], pads: Floats) -> _Choice | None:
    """Holes from another origin: a shift that brings nearly all of them onto pads."""
    size_mm = drill_fit.spread_mm(pads)
    for form in formats:
        centres = _centres(script, form)
        spread_mm = drill_fit.spread_mm(centres)
        fitting = all(s <= c + 5 for s, c in zip(spread_mm, size_mm, strict=True))
        if len(centres) < 8 or not fitting or max(spread_mm) < max(size_mm) / 10:
            continue
        dx_mm, dy_mm, share = drill_fit.shift_between(centres, pads)
        if share >= _SHIFT_CLEAR:
            text = (
                f"{script.name}: its holes have another origin than the copper; assumed to be moved"
                f" by ({dx_mm:g}, {dy_mm:g}) mm, by which {share:.0%} of {len(centres)} lie on pads"
                f" (read as {form.words(script.all_decimal())})"
            )
            return _Choice(form, (dx_mm, dy_mm), (text,))
    return None


def _by_spread(script: Script, ranked: Sequence[Fit], pads: Floats) -> _Choice:
    """Where no pad tells, the format by which the holes lie within the copper and fill it best."""
    low, high = pads.min(axis=0) - 5.0, pads.max(axis=0) + 5.0

    def key(fit: Fit) -> tuple[float, float]:
        centres = _centres(script, fit.format)
        inside = float(np.mean(np.all((centres >= low) & (centres <= high), axis=1)))
        return -round(inside, 2), -sum(drill_fit.spread_mm(centres))

    best = min(ranked, key=key)
    words = best.format.words(script.all_decimal())
    text = (
        f"{script.name}: the number format is not stated and few holes have pads"
        f" ({best.share:.0%}); assumed to be {words}, by which they lie within the copper"
    )
    return _Choice(best.format, (0.0, 0.0), (text,))


def _said(script: Script, fit: Fit, ranked: Sequence[Fit] = ()) -> str:
    words = fit.format.words(script.all_decimal())
    count = len(_centres(script, fit.format))
    text = f"{script.name}: read as {words}; {fit.share:.0%} of {count} holes lie on pads"
    if not ranked:
        return text
    other = next((r for r in ranked[1:] if r.share < fit.share), None)
    rest = f" (next best {other.share:.0%})" if other else ""
    return (
        f"{script.name}: the number format is not stated in full; {text.partition(': ')[2]}{rest}"
    )


def _centres(script: Script, form: Format) -> Floats:
    """Middle of every hole or slot, shape (n, 2), mm, each place once."""
    raws = _play(script, form)
    middles = [
        ((r.path[0][0] + r.path[-1][0]) / 2, (r.path[0][1] + r.path[-1][1]) / 2) for r in raws
    ]
    return drill_fit.unique_places(middles)


def _count_remarks(script: Script, raws: Sequence[_Raw]) -> list[str]:
    """Differences between the number of holes drilled and what comments state."""
    counts: dict[int, int] = {}
    for raw in raws:
        counts[raw.tool] = counts.get(raw.tool, 0) + 1
    return [
        f"{script.name}: T{n} drills {counts.get(n, 0)} holes, its comment says {tool.quantity}"
        for n, tool in sorted(script.tools.items())
        if tool.quantity is not None and counts.get(n, 0) != tool.quantity
    ]


def from_drawing(drawing: Drawing) -> DrillFile:
    """Take a Gerber file with a drill function as holes (flashes) and slots (strokes).

    Parameters
    ----------
    drawing
        A Gerber file whose file function is ``Plated`` or ``NonPlated``.

    Returns
    -------
    Its holes in file order; fills and clear marks are left out with a remark.

    References
    ----------
    Ucamco, "The Gerber Layer Format Specification" rev. 2023.08, 5.6.3 (file function: layers
    from and to, in any order) and 5.6.10 (aperture functions of drill tools).
    """
    function = drawing.attribute(".FileFunction") or ()
    kind = function[0].casefold() if function else ""
    plated = {"plated": True, "nonplated": False}.get(kind, naming.plating(drawing.name))
    ends = [int(f) for f in function[1:3] if f.isdecimal() and len(f) <= 3]
    span = (min(ends), max(ends)) if len(ends) == 2 else None
    holes: list[Hole] = []
    left_out: dict[str, int] = {}
    for mark in drawing.marks:
        via = None if mark.tag.function is None else mark.tag.function == "ViaDrill"
        if not mark.dark:
            left_out.setdefault("a clear mark", mark.line)
        elif isinstance(mark, Flash):
            path, size_mm = _flashed(mark)
            holes.append(Hole(path, size_mm, plated, span, mark.line, via))
        elif isinstance(mark, Stroke) and mark.width_mm > 0:
            holes.append(Hole(mark.points, mark.width_mm, plated, span, mark.line, via))
        else:
            left_out.setdefault("a filled contour or a line without width", mark.line)
    remarks = (f"{drawing.name}:{n}: {what} is no hole; left out" for what, n in left_out.items())
    return DrillFile(drawing.name, tuple(holes), "Gerber", True, (*drawing.remarks, *remarks))


def _flashed(flash: Flash) -> tuple[tuple[Point, ...], float]:
    """Centre line and diameter of a flash: a round hole, or a slot if it is longer than wide."""
    if flash.diameter_mm is not None:
        return (flash.at,), flash.diameter_mm
    box = flash.shape.minimum_rotated_rectangle
    if not isinstance(box, Polygon) or box.is_empty:
        return (flash.at,), 0.0
    a, b, c = (np.array(p) for p in list(box.exterior.coords)[:3])
    first_mm, second_mm = float(np.linalg.norm(b - a)), float(np.linalg.norm(c - b))
    long_mm, wide_mm = max(first_mm, second_mm), min(first_mm, second_mm)
    if long_mm - wide_mm < 1e-3 * long_mm + 1e-6:
        return (flash.at,), round(wide_mm, 6)
    way = (b - a) / first_mm if first_mm >= second_mm else (c - b) / second_mm
    half = way * (long_mm - wide_mm) / 2
    middle = np.array(flash.at) + np.array([box.centroid.x, box.centroid.y])
    start, end = middle - half, middle + half
    path = tuple((round(float(p[0]), 6), round(float(p[1]), 6)) for p in (start, end))
    return path, round(wide_mm, 6)
