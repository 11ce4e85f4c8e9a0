"""Reference copper of each layer as islands, and the gaps between and inside them."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from itertools import pairwise
from math import hypot

import numpy as np
import shapely
from numpy.typing import NDArray
from rtree import index
from shapely import MultiPolygon, Polygon

from splitcheck.board.board import Board
from splitcheck.board.names import is_power
from splitcheck.board.parts import Part
from splitcheck.board.traces import Pieces
from splitcheck.units import Floats

#: A piece of copper counts as plane-like from this area and mean width on (common practice).
LEAST_AREA_MM2 = 4.0
LEAST_WIDTH_MM = 0.5
#: A net that no name calls ground or supply must show this much more, mm2 and share of the board.
UNNAMED_AREA_MM2 = 25.0
UNNAMED_SHARE = 0.01
UNNAMED_WIDTH_MM = 0.8
#: No more than this share of a plane may be strokes of traces: a wide trace is still a trace.
MOST_STROKED = 0.5
#: Gaps are looked at out to this far beyond the copper, mm.
FRAME_MM = 5.0
#: Gap polygons with more corners than this are cut into tiles for quick tests.
TILE_CORNERS = 64


@dataclass(frozen=True, slots=True)
class Island:
    """A connected piece of reference copper."""

    id: str
    layer: int
    part: int
    net: int
    net_name: str
    shape: Polygon


@dataclass(frozen=True, slots=True)
class Gap:
    """A connected piece of what is not reference copper on a plane's layer."""

    id: str
    layer: int
    shape: Polygon
    open: bool
    """Whether it reaches beyond the copper to the outside of the board."""


@dataclass(frozen=True, slots=True)
class Tile:
    """A convex-boxed bit of a gap, small enough for quick intersections."""

    shape: Polygon
    gap: int
    """Index of its gap in the plane."""


class Plane:
    """All reference copper of one layer, with what is needed to ask where it is missing."""

    def __init__(self, layer: int, islands: tuple[Island, ...], board_box: Polygon) -> None:
        self.layer = layer
        self.islands = islands
        self.gaps = _gaps(layer, islands, board_box)
        self.tiles = tuple(
            Tile(shape, number)
            for number, gap in enumerate(self.gaps)
            for shape in _tiles(gap.shape)
        )
        self._tile_tree = shapely.STRtree([tile.shape for tile in self.tiles])
        self._islands = Pieces([island.shape for island in islands])
        self.gap_boxes = _box_index(gap.shape for gap in self.gaps)

    def island_at(self, xs: Floats, ys: Floats) -> NDArray[np.intp]:
        """Index of the island under each point, -1 where copper is missing; shape (n,)."""
        return self._islands.at(xs, ys)

    def tiles_over(self, lines: NDArray[np.object_]) -> NDArray[np.intp]:
        """Pairs (line, tile) that meet, shape (2, n)."""
        return self._tile_tree.query(lines, predicate="intersects")


def box_size_mm(shape: Polygon) -> float:
    """Larger side of a shape's box, mm."""
    x0, y0, x1, y1 = shape.bounds
    return max(x1 - x0, y1 - y0)


def find_planes(board: Board) -> tuple[Plane, ...]:
    """Find the reference copper of every layer.

    Returns
    -------
    One plane for each layer that has islands, from the top down.

    Notes
    -----
    (1) A piece of copper is plane-like if it has area, is wide on average (2 area / perimeter) and
    is not drawn as a trace.
    (2) A net carries returns if its name is a ground's or a supply's, or the rules name it, and it
    has a plane-like piece, or, whatever its name, if it has a piece as large as only planes are.
    (3) Islands are the plane-like pieces of such nets. Signal copper is never an island.
    """
    nets = reference_nets(board)
    chosen: dict[int, list[Part]] = defaultdict(list)
    for part in _not_drawn(board):
        if board.net_of[part.id] in nets:
            chosen[part.layer].append(part)
    box = shapely.box(*_bounds(board)).buffer(FRAME_MM, join_style="mitre")
    return tuple(
        Plane(layer, _number(board, layer, chosen[layer]), box) for layer in sorted(chosen)
    )


def is_plane_like(
    shape: Polygon, area_mm2: float = LEAST_AREA_MM2, width_mm: float = LEAST_WIDTH_MM
) -> bool:
    """Whether a piece of copper has the area and the mean width of a plane.

    Examples
    --------
    >>> is_plane_like(shapely.box(0, 0, 10, 10)), is_plane_like(shapely.box(0, 0, 100, 0.2))
    (True, False)
    """
    return bool(shape.area >= area_mm2 and 2 * shape.area >= width_mm * shape.length)


def reference_nets(board: Board) -> frozenset[int]:
    """Numbers of the nets whose copper can carry a return current."""
    large = max(UNNAMED_AREA_MM2, UNNAMED_SHARE * board.outline.area)
    chosen = set()
    for part in _not_drawn(board):
        net = board.nets[board.net_of[part.id]]
        known = is_power(net.name) or net.number in board.references
        if known or is_plane_like(part.shape, large, UNNAMED_WIDTH_MM):
            chosen.add(net.number)
    return frozenset(chosen)


def _not_drawn(board: Board) -> list[Part]:
    """Plane-like pieces of copper that are not drawn as traces."""
    shapes = np.array([part.shape for part in board.parts], dtype=object)
    area, length = shapely.area(shapes), shapely.length(shapes)
    wide = (area >= LEAST_AREA_MM2) & (2 * area >= LEAST_WIDTH_MM * length)
    drawn = np.array(_stroked_mm2(board)) > MOST_STROKED * area
    return [board.parts[number] for number in np.flatnonzero(wide & ~drawn).tolist()]


def _stroked_mm2(board: Board) -> list[float]:
    """Area that traces draw of every part, mm2; where they overlap it counts twice."""
    areas = [0.0] * len(board.parts)
    first = 0
    for layer in board.layers:
        for line in layer.lines:
            if len(line.points) == 2:
                (x0, y0), (x1, y1) = line.points
                length = hypot(x1 - x0, y1 - y0)
            else:
                length = sum(hypot(c - a, d - b) for (a, b), (c, d) in pairwise(line.points))
            areas[first + line.piece] += length * line.width_mm
        first += len(layer.pieces)
    return areas


def _bounds(board: Board) -> tuple[float, float, float, float]:
    shapes = np.array([board.outline, *(part.shape for part in board.parts)], dtype=object)
    x0, y0, x1, y1 = shapely.total_bounds(shapes).tolist()
    return x0, y0, x1, y1


def _number(board: Board, layer: int, parts: list[Part]) -> tuple[Island, ...]:
    ranked = sorted(parts, key=lambda part: (-round(part.shape.area, 6), part.shape.bounds))
    return tuple(
        Island(
            f"L{layer}.{rank}",
            layer,
            part.id,
            board.net_of[part.id],
            board.nets[board.net_of[part.id]].name,
            part.shape,
        )
        for rank, part in enumerate(ranked, start=1)
    )


def _gaps(layer: int, islands: tuple[Island, ...], box: Polygon) -> tuple[Gap, ...]:
    """Turn islands inside out: holes become gaps, and islands inside a hole are holes of it."""
    holes = [
        (ring, number) for number, island in enumerate(islands) for ring in island.shape.interiors
    ]
    rings = np.array([ring for ring, _ in holes], dtype=object)
    shapes = np.atleast_1d(np.asarray(shapely.polygons(rings), dtype=object)).tolist()
    within = _holes_holding(islands, shapes, [number for _, number in holes])
    inner: dict[int, list[shapely.LinearRing]] = defaultdict(list)
    for number, island in enumerate(islands):
        inner[within[number]].append(island.shape.exterior)
    gaps = [Polygon(box.exterior, inner[-1]), *shapes]
    for number, hollow in inner.items():
        if number >= 0:
            gaps[1 + number] = Polygon(shapes[number].exterior, hollow)
    sound = shapely.is_valid(np.array(gaps, dtype=object)).tolist()
    valid = [
        piece
        for gap, whole in zip(gaps, sound, strict=True)
        for piece in ([gap] if whole and not gap.is_empty else _polygons(gap.buffer(0)))
    ]
    pieces = np.array(valid, dtype=object)
    opened = shapely.intersects(pieces, box.exterior).tolist()
    areas, boxes = shapely.area(pieces).tolist(), shapely.bounds(pieces).tolist()
    order = sorted(range(len(valid)), key=lambda i: (not opened[i], -round(areas[i], 6), boxes[i]))
    return tuple(
        Gap(f"L{layer}.g{rank}", layer, valid[i], opened[i])
        for rank, i in enumerate(order, start=1)
    )


def _holes_holding(
    islands: tuple[Island, ...], holes: list[Polygon], owner: list[int]
) -> list[int]:
    """For each island the smallest foreign hole it lies in, -1 for the outside."""
    within = [-1] * len(islands)
    if not holes:
        return within
    points = np.array([island.shape.exterior.coords[0] for island in islands])
    pairs = shapely.STRtree(holes).query(shapely.points(points), predicate="intersects")
    for number, hole in sorted(zip(*pairs.tolist(), strict=True)):
        smaller = within[number] < 0 or holes[hole].area < holes[within[number]].area
        if owner[hole] != number and smaller:
            within[number] = hole
    return within


def _polygons(shape: shapely.Geometry) -> list[Polygon]:
    if isinstance(shape, Polygon):
        return [] if shape.is_empty else [shape]
    if isinstance(shape, MultiPolygon) or hasattr(shape, "geoms"):
        return [piece for part in shape.geoms for piece in _polygons(part)]
    return []


def _tiles(shape: Polygon) -> list[Polygon]:
    if shapely.get_num_coordinates(shape) <= TILE_CORNERS:
        return [shape]
    x0, y0, x1, y1 = shape.bounds
    if max(x1 - x0, y1 - y0) < 0.05:
        return [shape]
    if x1 - x0 > y1 - y0:
        middle = (x0 + x1) / 2
        halves = (x0, y0, middle, y1), (middle, y0, x1, y1)
    else:
        middle = (y0 + y1) / 2
        halves = (x0, y0, x1, middle), (x0, middle, x1, y1)
    return [
        tile
        for half in halves
        for piece in _polygons(shapely.clip_by_rect(shape, *half))
        for tile in _tiles(piece)
    ]


def _box_index(shapes: Iterable[Polygon]) -> index.Index:
    boxes = shapely.bounds(np.array(list(shapes), dtype=object)).tolist()
    if not boxes:
        return index.Index()
    return index.Index((number, box, None) for number, box in enumerate(boxes))
