"""Cuts planted on purpose: clear strokes under traces, appended to the Gerber file of a plane."""

from __future__ import annotations

import random
import re
from collections.abc import Iterator
from math import dist, hypot
from pathlib import Path
from typing import NamedTuple, TypeGuard

import shapely
from shapely import LineString, Polygon

from splitcheck.board.names import is_ground, is_supply
from splitcheck.copper import gerber
from splitcheck.copper.intake import open_export
from splitcheck.copper.marks import Fill, Mark, Point, Stroke
from splitcheck.copper.paint import paint

CUT_MM = 2.4
#: From the middle of a cut to the end of the stroke it lies under, mm.
FROM_END_MM = 1.2
#: Copper left between two cuts, and between a cut and whatever else is in the plane, mm.
APART_MM, MARGIN_MM = 1.0, 0.15
#: Pieces of copper smaller than this are not taken for a plane, mm2.
PLANE_MM2 = 100.0
#: Wider strokes are supplies or switching nodes, which the cut would hardly reach beyond, mm.
SIGNAL_MM = 0.5


class PlantedCut(NamedTuple):
    """One cut, and what must be found there."""

    net: str
    at: Point
    ends: tuple[Point, Point]
    width_mm: float
    plane_file: str


def choose_cuts(folder: Path, wanted: int, seed: int) -> tuple[PlantedCut, ...]:
    """Choose places for cuts, at random but the same for one seed.

    Notes
    -----
    Only traces of the two outer layers are taken, and the plane is the layer next to them: no
    other layer is as near. (1) The trace is a signal's: narrow, its net has a name, pours
    nothing on any layer and is no supply by name.
    (2) The place is away from the ends of its stroke. (3) Before the cut the plane is whole there:
    the cut with a margin lies inside one large piece of copper. (4) Cuts keep apart.
    """
    copper = open_export(folder).copper()
    drawings = {file.name: gerber.read(file.text, file.name).marks for file in copper}
    sites: list[PlantedCut] = []
    rng = random.Random(seed)
    poured = {
        mark.tag.net for marks in drawings.values() for mark in marks if isinstance(mark, Fill)
    }
    for trace_file, plane_file in ((copper[0], copper[1]), (copper[-1], copper[-2])):
        strokes = [mark for mark in drawings[trace_file.name] if _is_signal(mark, poured)]
        planes = [p for p in paint(drawings[plane_file.name]) if p.area >= PLANE_MM2]
        sites += _sites(strokes, planes, plane_file.name, rng)
    rng.shuffle(sites)
    chosen: list[PlantedCut] = []
    for site in sites:
        if len(chosen) < wanted and all(_apart_mm(site, other) >= APART_MM for other in chosen):
            chosen.append(site)
    return tuple(chosen)


def _apart_mm(one: PlantedCut, other: PlantedCut) -> float:
    between = LineString(one.ends).distance(LineString(other.ends))
    return float(between - (one.width_mm + other.width_mm) / 2)


def _is_signal(mark: Mark, poured: set[str | None]) -> TypeGuard[Stroke]:
    if not isinstance(mark, Stroke) or not mark.dark or mark.width_mm > SIGNAL_MM:
        return False
    net = mark.tag.net
    if not net or net in poured or is_ground(net) or is_supply(net):
        return False
    return len(mark.points) == 2 and dist(*mark.points) > 2 * FROM_END_MM


def _sites(
    strokes: list[Stroke], planes: list[Polygon], plane_file: str, rng: random.Random
) -> Iterator[PlantedCut]:
    """Possible cuts at random places along every stroke, one try for each mm of it."""
    shapely.prepare(planes)
    for stroke in strokes:
        length_mm = dist(*stroke.points)
        for _ in range(int(length_mm)):
            along_mm = rng.uniform(FROM_END_MM, length_mm - FROM_END_MM)
            cut = _cut(stroke, along_mm / length_mm, rng.uniform(0.2, 0.4), plane_file)
            if _is_whole(planes, cut):
                yield cut


def _cut(stroke: Stroke, fraction: float, width_mm: float, plane_file: str) -> PlantedCut:
    (x0, y0), (x1, y1) = stroke.points
    dx, dy = x1 - x0, y1 - y0
    x, y = x0 + fraction * dx, y0 + fraction * dy
    half = CUT_MM / 2 / hypot(dx, dy)
    ends = ((x - half * dy, y + half * dx), (x + half * dy, y - half * dx))
    return PlantedCut(stroke.tag.net or "", (x, y), ends, width_mm, plane_file)


def _is_whole(planes: list[Polygon], cut: PlantedCut) -> bool:
    around = LineString(cut.ends).buffer(cut.width_mm / 2 + MARGIN_MM)
    return any(plane.contains(around) for plane in planes)


def plant(folder: Path, cuts: tuple[PlantedCut, ...]) -> None:
    """Append the cuts to the plane's files."""
    for name in sorted({cut.plane_file for cut in cuts}):
        path = next(path for path in folder.rglob("*") if path.name == Path(name).name)
        text = path.read_text(encoding="utf-8", errors="surrogateescape")
        end = text.rindex("M02*")
        lines = _gerber(text, [cut for cut in cuts if cut.plane_file == name])
        spoiled = text[:end] + "\n".join(lines) + "\n" + text[end:]
        path.write_text(spoiled, encoding="utf-8", errors="surrogateescape")


def _gerber(text: str, cuts: list[PlantedCut]) -> list[str]:
    form = re.search(r"FSLAX\d(\d)Y\d(\d)", text)
    assert form is not None
    unit_mm = 25.4 if "MOIN" in text else 1.0
    scale = 10 ** int(form[1]) / unit_mm
    code = max(int(number) for number in re.findall(r"%?ADD(\d+)", text)) + 1
    lines = ["%LPC*%", "G01*"]
    for number, cut in enumerate(cuts, code):
        lines.append(f"%ADD{number}C,{cut.width_mm / unit_mm:.6f}*%")
        lines.append(f"D{number}*")
        for (x, y), operation in zip(cut.ends, ("D02", "D01"), strict=True):
            lines.append(f"X{round(x * scale)}Y{round(y * scale)}{operation}*")
    return lines
