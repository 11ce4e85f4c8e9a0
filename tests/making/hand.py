"""Boards put together from polygons by hand, without any file between the test and the room."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import shapely
from shapely import LineString, Polygon

from splitcheck.board.board import Board
from splitcheck.board.components import Component, Pin
from splitcheck.board.nets import join, name_nets
from splitcheck.board.parts import CopperLayer, parts_of
from splitcheck.board.stack import CopperEntry, from_entries
from splitcheck.board.traces import CentreLine
from splitcheck.copper.holes import Hole
from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import IslandGraph, join_islands
from splitcheck.loops.terrain import Terrain
from splitcheck.planes.crossings import BareTrace, Crossing, find_crossings, judged_nets
from splitcheck.planes.islands import Plane, find_planes, reference_nets
from splitcheck.planes.tracks import lay_all
from splitcheck.verdict.scene import Scene


class Line(NamedTuple):
    """A trace as one drawn stroke."""

    net: str
    points: tuple[Point, ...]
    width_mm: float = 0.2


class Sheet(NamedTuple):
    """One layer: areas of copper by net, and traces."""

    areas: tuple[tuple[str, Polygon], ...] = ()
    lines: tuple[Line, ...] = ()


def via(x: float, y: float, span: tuple[int, int] | None = None) -> Hole:
    """A plated hole of 0.3 mm."""
    return Hole(((x, y),), 0.3, plated=True, span=span, line=1)


def board(
    *sheets: Sheet,
    holes: Sequence[Hole] = (),
    heights_mm: Sequence[float] | None = None,
    outline: Polygon | None = None,
) -> Board:
    """A board of these layers, top to bottom.

    Parameters
    ----------
    sheets
        The layers.
    holes
        Plated holes.
    heights_mm
        Dielectrics from the top down, mm; 0.2 each if not given.
    outline
        Outline; the box of all copper if not given.
    """
    layers = tuple(_layer(number, sheet) for number, sheet in enumerate(sheets, start=1))
    below: list[float | None] = [*(heights_mm or [0.2] * (len(sheets) - 1)), None]
    entries = [CopperEntry("", None, 35.0, mm, 4.3, None) for mm in below]
    parts = parts_of(layers)
    joined, net_of = join(layers, parts, holes)
    nets, _ = name_nets(parts, net_of, {})
    pieces = [piece for layer in layers for piece in layer.pieces]
    return Board(
        "hand",
        outline or shapely.box(*shapely.total_bounds(pieces)),
        from_entries(entries, [layer.name for layer in layers], "hand"),
        layers,
        parts,
        net_of,
        nets,
        joined,
    )


def mounted(made: Board, *parts: tuple[str, int, Point, Point, str | None]) -> Board:
    """The same board with two-pad parts: reference, layer, places of both pads, value."""
    components = []
    for ref, layer, one, other, value in parts:
        pins = []
        for number, at in enumerate((one, other), start=1):
            part = next(
                (
                    part.id
                    for part in made.parts
                    if part.layer == layer and part.shape.intersects(shapely.Point(at))
                ),
                -1,
            )
            pins.append(Pin(str(number), at, made.net_of[part] if part >= 0 else -1, part))
        components.append(Component(ref, layer, tuple(pins), value, "attributes"))
    return replace(made, components=tuple(components))


def _layer(number: int, sheet: Sheet) -> CopperLayer:
    painted: dict[str, list[shapely.Geometry]] = {}
    for net, shape in sheet.areas:
        painted.setdefault(net, []).append(shape)
    for line in sheet.lines:
        stroke = LineString(line.points).buffer(line.width_mm / 2, quad_segs=4)
        painted.setdefault(line.net, []).append(stroke)
    pieces, names = [], []
    for net, shapes in painted.items():
        for piece in shapely.get_parts(shapely.union_all(shapes)):
            pieces.append(piece)
            names.append((net,) if net else ())
    lines = tuple(
        CentreLine(line.points, line.width_mm, _piece(pieces, names, line), row)
        for row, line in enumerate(sheet.lines, start=1)
    )
    return CopperLayer(
        number, f"L{number}", f"l{number}.gbr", tuple(pieces), tuple(names), lines, (), 0
    )


def _piece(pieces: Sequence[Polygon], names: Sequence[tuple[str, ...]], line: Line) -> int:
    start = shapely.Point(line.points[0])
    return next(
        i
        for i, piece in enumerate(pieces)
        if line.net in (*names[i], "") and piece.intersects(start)
    )


def crossings(made: Board) -> tuple[tuple[Crossing, ...], tuple[BareTrace, ...]]:
    """Crossings and bare traces of all layers."""
    planes = find_planes(made)
    found = [
        find_crossings(tracks, planes)
        for tracks in lay_all(made, judged_nets(made, reference_nets(made)), ())
    ]
    return tuple(c for some, _ in found for c in some), tuple(b for _, some in found for b in some)


def plane(made: Board, layer: int) -> Plane:
    """The plane of a layer."""
    return next(plane for plane in find_planes(made) if plane.layer == layer)


def scene(made: Board, min_nh: float = 0.05) -> Scene:
    """What judging a board needs."""
    planes = find_planes(made)
    by_layer = {plane.layer: plane for plane in planes}
    terrains = {plane.layer: Terrain(plane) for plane in planes}
    return Scene(made, by_layer, terrains, join_islands(made, planes), min_nh)


def islands_joined(made: Board) -> IslandGraph:
    """The island graph of a board."""
    return join_islands(made, find_planes(made))
