"""Room: where a via, a pad, a strip of copper or a trace has its clearance from everything else."""

from __future__ import annotations

from collections import defaultdict

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.spatial import cKDTree
from shapely import Point as Place

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.planes.islands import Plane
from splitcheck.units import Floats

#: Copper of different nets is kept this far apart, mm (common practice, no source).
CLEAR_MM = 0.2
#: Copper left between an opening made in a pour and the pour's own rim, mm (common practice).
WEB_MM = 0.2
#: Walls of two holes are kept this far apart, and a wall from foreign copper, mm (common practice).
HOLES_APART_MM = 0.25
#: Copper is kept this far inside the outline, mm (common practice, no source).
EDGE_MM = 0.3
#: A stitching via: hole, pad, and the opening it needs in a foreign pour, mm (common practice).
HOLE_MM, PAD_MM = 0.3, 0.6
ANTIPAD_MM = PAD_MM + 2 * CLEAR_MM


class Room:
    """All copper and all plated holes of a board, asked for clearances.

    Foreign copper that is a plane is not in the way if it can be opened: the opening keeps a web to
    the rim, so that it neither merges with another gap nor cuts the plane. What is a part's body,
    and holes that are not plated, are not known here, but no copper of a plane covers such a hole.
    """

    def __init__(self, board: Board, planes: dict[int, Plane]) -> None:
        self.board = board
        self._names = [board.nets[net].name for net in board.net_of]
        pours = {island.part for plane in planes.values() for island in plane.islands}
        self._parts: dict[int, list[int]] = defaultdict(list)
        for part in board.parts:
            self._parts[part.layer].append(part.id)
        self._trees = {
            layer: shapely.STRtree([board.parts[i].shape for i in ids])
            for layer, ids in self._parts.items()
        }
        self._pours = pours
        self._inside = shapely.buffer(board.outline, -EDGE_MM)
        shapely.prepare(self._inside)
        self._holes = np.array([hole.at for hole in board.holes]).reshape(-1, 2)
        self._radii = np.array([_radius(hole.hole) for hole in board.holes])
        self._hole_nets = [
            board.nets[hole.net].name if hole.net >= 0 else "" for hole in board.holes
        ]
        self._hole_tree = cKDTree(self._holes) if len(self._holes) else None
        outer = (board.layers[0], board.layers[-1])
        self._pads = np.array(
            [(*pad.at, pad.size_mm) for layer in outer for pad in layer.pads]
        ).reshape(-1, 3)
        self._widest = float(self._radii.max(initial=0.0))

    def openings(self, shape: shapely.Geometry, layer: int, net: str) -> tuple[str, ...] | None:
        """Names of the foreign pours that copper of a net on a layer would open; None: no room.

        Parameters
        ----------
        shape
            The copper, mm.
        layer
            Number of its layer.
        net
            Name of its net; copper of the same name is no obstacle.
        """
        if not self._inside.covers(shape):
            return None
        opened = []
        for part in self._near(shape, layer, CLEAR_MM):
            if self._names[part] == net:
                continue
            if part not in self._pours:
                return None
            opening = shapely.buffer(shape, CLEAR_MM + WEB_MM, quad_segs=4)
            if not self.board.parts[part].shape.contains(opening):
                return None
            opened.append(f"{self._names[part]} on {self.board.stack.layers[layer - 1].name}")
        if any(name != net for name in self._holes_near(shape, HOLES_APART_MM)):
            return None
        return tuple(sorted(opened))

    def hopeless_vias(self, xs: Floats, ys: Floats) -> NDArray[np.bool_]:
        """Which places are out of the question for a via: too near to a hole, or in a pad.

        A quick look at many places at once; ``via`` says of one whether it has room.
        """
        places = np.column_stack([xs, ys])
        hopeless = np.zeros(len(places), dtype=np.bool_)
        if self._hole_tree is not None:
            reach = self._widest + HOLE_MM / 2 + HOLES_APART_MM
            for i, near in enumerate(self._hole_tree.query_ball_point(places, reach)):
                far = np.hypot(*(self._holes[near] - places[i]).T) - self._radii[near]
                hopeless[i] = bool((far < HOLE_MM / 2 + HOLES_APART_MM - 1e-2).any())
        if len(self._pads):
            for i in np.flatnonzero(~hopeless).tolist():
                hopeless[i] = self._on_pad((float(xs[i]), float(ys[i])))
        return hopeless

    def hopeless(
        self, xs: Floats, ys: Floats, layer: int, net: str, half_mm: float
    ) -> NDArray[np.bool_]:
        """Which places foreign copper that is no pour makes hopeless for copper round them.

        Parameters
        ----------
        half_mm
            Radius of a disc that the copper covers at least, mm.
        """
        hopeless = np.zeros(len(xs), dtype=np.bool_)
        tree = self._trees.get(layer)
        if tree is None or not len(xs):
            return hopeless
        reach = half_mm + CLEAR_MM - 1e-2
        place, part = tree.query(shapely.points(xs, ys), predicate="dwithin", distance=reach)
        ids = np.array(self._parts[layer], dtype=np.intp)[part]
        foreign = np.array(
            [i not in self._pours and self._names[i] != net for i in ids.tolist()], dtype=np.bool_
        )
        hopeless[place[foreign]] = True
        return hopeless

    def via(self, at: Point, net: str) -> tuple[str, ...] | None:
        """Names of the foreign pours that a through via of a net would open; None: no room."""
        place = Place(at)
        if self._holes_near(place.buffer(HOLE_MM / 2), HOLES_APART_MM) or self._on_pad(at):
            return None
        opened: list[str] = []
        for layer in self._parts:
            found = self.openings(place.buffer(PAD_MM / 2, quad_segs=8), layer, net)
            if found is None:
                return None
            opened.extend(found)
        return tuple(opened)

    def foreign(self, around: shapely.Geometry, layer: int, net: str) -> shapely.Geometry:
        """All that copper of a net must keep clear of on a layer, widened by its clearance."""
        parts = [
            self.board.parts[part].shape
            for part in self._near(around, layer, CLEAR_MM)
            if self._names[part] != net
        ]
        holes = [
            Place(at).buffer(float(self._radii[i]) + HOLES_APART_MM, quad_segs=8)
            for i, at in self._hole_places(around, HOLES_APART_MM)
            if self._hole_nets[i] != net
        ]
        return shapely.union_all([*(p.buffer(CLEAR_MM, quad_segs=8) for p in parts), *holes])

    def within_outline(self, shape: shapely.Geometry) -> shapely.Geometry:
        """What of a shape keeps its distance from the board's edge."""
        return shapely.intersection(shape, self._inside)

    def _near(self, shape: shapely.Geometry, layer: int, distance: float) -> list[int]:
        tree = self._trees.get(layer)
        if tree is None:
            return []
        found = tree.query(shape, predicate="dwithin", distance=distance - 1e-6)
        return sorted(self._parts[layer][i] for i in found.tolist())

    def _hole_places(
        self, shape: shapely.Geometry, apart_mm: float
    ) -> list[tuple[int, tuple[float, float]]]:
        """Plated holes whose walls come nearer to a shape than a distance."""
        if self._hole_tree is None:
            return []
        x0, y0, x1, y1 = shapely.bounds(shape).tolist()
        reach = float(np.hypot(x1 - x0, y1 - y0)) / 2 + self._widest + apart_mm
        near = self._hole_tree.query_ball_point(((x0 + x1) / 2, (y0 + y1) / 2), reach)
        return [
            (i, tuple(self._holes[i].tolist()))
            for i in sorted(near)
            if shapely.distance(shape, Place(self._holes[i])) < self._radii[i] + apart_mm - 1e-6
        ]

    def _holes_near(self, shape: shapely.Geometry, apart_mm: float) -> list[str]:
        return [self._hole_nets[i] for i, _ in self._hole_places(shape, apart_mm)]

    def _on_pad(self, at: Point) -> bool:
        """Whether a via would lie in a pad of an outer layer: solder would run down it."""
        far = np.abs(self._pads[:, :2] - np.asarray(at)).max(axis=1)
        return bool((far < self._pads[:, 2] / 2 + PAD_MM / 2).any())


def _radius(hole: object) -> float:
    """Radius of a hole round its middle, a slot's ends included, mm."""
    path, wide = hole.path, hole.diameter_mm  # type: ignore[attr-defined]
    (x0, y0), (x1, y1) = path[0], path[-1]
    return float(np.hypot(x1 - x0, y1 - y0)) / 2 + float(wide) / 2
