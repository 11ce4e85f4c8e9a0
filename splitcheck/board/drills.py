"""Drill files to the plated holes of the board, checked against the copper."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import shapely

from splitcheck.board.parts import CopperLayer
from splitcheck.copper import drill, gerber
from splitcheck.copper.holes import DrillFile, Hole
from splitcheck.copper.intake import Export, InputFile
from splitcheck.units import Floats


@dataclass(frozen=True, slots=True)
class Drilling:
    """All plated holes and what is to be said of reading them."""

    holes: tuple[Hole, ...]
    other: int
    """How many holes are not plated."""
    remarks: tuple[str, ...]
    assumptions: tuple[str, ...]
    facts: tuple[str, ...]


def read_drills(export: Export, layers: Sequence[CopperLayer], pads: Floats) -> Drilling:
    """Read every drill file and keep the plated holes.

    Parameters
    ----------
    export
        The export.
    layers
        All copper, for holes of which no file says whether they are plated.
    pads
        Centres of flashed pads, shape (n, 2), mm.
    """
    files = [_read_one(file, pads, export) for file in export.of_kind("drill")]
    holes = [hole for file in files for hole in file.holes]
    unknown = [hole for hole in holes if hole.plated is None]
    decided = _by_copper(unknown, layers)
    plated = [hole for hole in holes if hole.plated] + [hole for hole in decided if hole.plated]
    assumptions = []
    if not files:
        assumptions.append(
            "There is no drill file: layers count as joined by nothing, so nets fall into pieces "
            "and no way round over another layer is known; export the drill files as well."
        )
    if unknown:
        kept = sum(1 for hole in decided if hole.plated)
        assumptions.append(
            f"For {len(unknown)} holes no file says whether they are plated: the {kept} that have "
            "copper at both outer ends were taken as plated."
        )
    unique = sorted(set(plated), key=lambda hole: (hole.path, hole.diameter_mm, hole.line))
    remarks = [remark for file in files for remark in file.remarks]
    assumed = [remark for remark in remarks if "assumed" in remark]
    return Drilling(
        tuple(_once(unique)),
        len(holes) - len(plated),
        tuple(remark for remark in remarks if remark not in assumed),
        (*assumptions, *(f"{remark}." for remark in assumed)),
        tuple(f"{file.name}: {len(file.holes)} holes, {file.format}" for file in files),
    )


def _read_one(file: InputFile, pads: Floats, export: Export) -> DrillFile:
    if file.text.lstrip()[:1] in {"%", "G"} and "%FS" in file.text[:20000]:
        found = drill.from_drawing(gerber.read(file.text, file.name))
    else:
        found = drill.read(file.text, file.name, pads=pads, tools=export.drill_tools() or None)
    holes = tuple(replace_hole(hole, file.plated, file.span) for hole in found.holes)
    return replace(found, holes=holes)


def replace_hole(hole: Hole, plated: bool | None, span: tuple[int, int] | None) -> Hole:
    """The hole with plating and span of its file where it does not carry its own."""
    return hole._replace(
        plated=plated if hole.plated is None else hole.plated,
        span=span if hole.span is None else hole.span,
    )


def _once(holes: Sequence[Hole]) -> list[Hole]:
    """Holes that differ only in the line they stand on, once."""
    seen: set[tuple[object, ...]] = set()
    kept = []
    for hole in holes:
        key = (hole.path, hole.diameter_mm, hole.span)
        if key not in seen:
            seen.add(key)
            kept.append(hole)
    return kept


def _by_copper(holes: Sequence[Hole], layers: Sequence[CopperLayer]) -> list[Hole]:
    """Decide plating: a plated hole has copper round it on both outer layers."""
    if not holes or not layers:
        return list(holes)
    rims = np.array(
        [shapely.Point(hole.path[0]).buffer(hole.diameter_mm / 2 + 0.02) for hole in holes]
    )
    rings = shapely.boundary(rims)
    touched = np.ones(len(holes), dtype=bool)
    for layer in (layers[0], layers[-1]):
        tree = shapely.STRtree(list(layer.pieces))
        met = np.zeros(len(holes), dtype=bool)
        met[np.unique(tree.query(rings, predicate="intersects")[0])] = True
        touched &= met
    return [hole._replace(plated=bool(on)) for hole, on in zip(holes, touched, strict=True)]
