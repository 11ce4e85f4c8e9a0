"""From a drill file to holes and slots in mm, its format checked against the copper pads."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from shapely import Polygon

from splitcheck.copper import drill_fit, naming
from splitcheck.copper.drill_choice import choose
from splitcheck.copper.drill_fit import Format
from splitcheck.copper.drill_play import Raw, play
from splitcheck.copper.drill_scan import scan
from splitcheck.copper.drill_script import Script, Tool
from splitcheck.copper.holes import DrillFile, Hole
from splitcheck.copper.marks import Drawing, Flash, Point, Stroke
from splitcheck.errors import SplitcheckError
from splitcheck.units import INCH_MM, Floats


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
    choice = choose(script, drill_fit.unique_places(pads))
    raws = play(script, choice.format)
    plating = script.plated()
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


def _span(script: Script) -> tuple[int, int] | None:
    ends = [int(f) for f in script.function[1:3] if f.isdecimal() and len(f) <= 3]
    return (min(ends), max(ends)) if len(ends) == 2 else None


def _moved(path: tuple[Point, ...], shift_mm: Point) -> tuple[Point, ...]:
    if shift_mm == (0.0, 0.0):
        return path
    return tuple((round(x + shift_mm[0], 6), round(y + shift_mm[1], 6)) for x, y in path)


def _size_mm(
    script: Script, number: int, form: Format, tools: Mapping[int, float] | None, raws: list[Raw]
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


def _count_remarks(script: Script, raws: Sequence[Raw]) -> list[str]:
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
