"""The bridges that a solve takes: vias and parts to the planes beside, straps over the gap."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from shapely import LineString

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.loops import solve as engine
from splitcheck.loops.bridges import IslandGraph, bridges_between, parts_between
from splitcheck.loops.estimate import via_pair_nh
from splitcheck.loops.mounted import BARREL_MM, LOWEST_MM, STRIP_MM
from splitcheck.loops.tasks import Task, as_strap, is_seen, is_straight, stays
from splitcheck.loops.ways import Way, to_point
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane
from splitcheck.units import Floats

#: So many of the nearest vias on either side of a gap are bridges, besides that of the way.
MOST_VIAS = 10
#: ... out to here, mm: farther off a part is of no use in 1 ns (S. Weir, si-list, 16 Oct 2008).
BRIDGES_MM = 25.0
#: Width taken for copper that a way borrows on the trace's side, mm.
STRAP_MM = 1.0


class Spans:
    """Finds the bridges of solves among those of the board."""

    def __init__(self, board: Board, planes: dict[int, Plane], graph: IslandGraph) -> None:
        self.board = board
        self.planes = planes
        self.graph = graph

    def of(self, tasks: Sequence[Task]) -> list[engine.ViaBridge | engine.Strap]:
        """Bridges that the ways round can take: vias and parts to the planes beside, or straps.

        A plane on the trace's other side is in the solve already: it needs vias and no strap.
        """
        crossing = tasks[0].crossing
        vias: dict[Point, engine.ViaBridge] = {}
        straps: dict[tuple[Point, ...], engine.Strap] = {}
        for task in tasks:
            for way in (task.route.left, task.route.right):
                if way is None or not is_seen(task, way) or stays(way):
                    continue
                if is_straight(way):
                    straps.update(self._straight_straps(task))
                elif way.bridge_layer == task.beyond:
                    vias.update(self._vias_like(task, way))
                else:
                    straps[way.bridges] = self._strap(crossing, way.bridges, way.bridge_layer)
        return [
            *(strap for _, strap in sorted(straps.items())),
            *(via for _, via in sorted(vias.items())),
            *(
                engine.ViaBridge(shapely.Point(at), wide_mm, above=True)
                for at, wide_mm in sorted(
                    {stitch[:2] for task in tasks for stitch in task.stitches}
                )
            ),
        ]

    def _vias_like(self, task: Task, way: Way) -> dict[Point, engine.ViaBridge]:
        """The vias and parts of a way and the nearest others that join the same islands."""
        crossing = task.crossing
        plane = self.planes[crossing.plane]
        borrowed = {
            island.id
            for island in self.planes[way.bridge_layer].islands
            if island.net_name == way.bridge_net
        }
        found: dict[Point, engine.ViaBridge] = {}
        for number, at in zip(crossing.islands, (crossing.before, crossing.after), strict=True):
            island = plane.islands[number].id
            for other in sorted(borrowed):
                places = bridges_between(self.graph, island, other)
                for i in _nearest(places, at, way.bridges):
                    wide_mm = float(self.graph.edges[island, other]["wide_mm"][i])
                    found.setdefault(to_point(places[i]), _via(places[i], wide_mm))
                parts = parts_between(self.graph, island, other)
                places = np.array([part.at_one for part in parts]).reshape(-1, 2)
                for i in _nearest(places, at, [part.at_one for part in way.capacitors]):
                    found.setdefault(
                        to_point(places[i]), _via(places[i], BARREL_MM, parts[i].mounted_nh)
                    )
        return found

    def _straight_straps(self, task: Task) -> dict[tuple[Point, ...], engine.Strap]:
        """The parts from one island straight to the other that are nearest to the crossing."""
        crossing = task.crossing
        one, other = (self.planes[crossing.plane].islands[i].id for i in crossing.islands)
        parts = [part for part in parts_between(self.graph, one, other) if as_strap(task, part)]
        far = [
            float(np.hypot(part.at[0] - crossing.at[0], part.at[1] - crossing.at[1]))
            for part in parts
        ]
        found: dict[tuple[Point, ...], engine.Strap] = {}
        for i in np.argsort(far, kind="stable")[:MOST_VIAS].tolist():
            if far[i] > max(BRIDGES_MM, min(far)):
                break
            part = parts[i]
            apart = (
                0.0
                if part.layer == crossing.plane
                else self.board.stack.height_mm(crossing.plane, part.layer)
            )
            ends = (part.at_one, part.at_other)
            # parts stand on either face of the board
            under = part.layer != crossing.plane and (part.layer > crossing.plane) != (
                crossing.layer > crossing.plane
            )
            found[ends] = engine.Strap(
                LineString(ends), STRIP_MM, max(apart, LOWEST_MM), part.mounted_nh, beyond=under
            )
        return found

    def _strap(self, crossing: Crossing, ends: tuple[Point, ...], layer: int) -> engine.Strap:
        """A way over copper on the trace's side of the plane."""
        height = self.board.stack.height_mm(crossing.plane, layer)
        line = LineString(ends)
        return engine.Strap(line, STRAP_MM, height, via_pair_nh(line.length, BARREL_MM, height))


def _nearest(places: Floats, at: Point, always: Sequence[Point]) -> list[int]:
    """Rows of the places nearest to one, within reach, and of some that are always wanted."""
    if not len(places):
        return []
    far = np.hypot(*(places - np.asarray(at)).T)
    order = np.argsort(far, kind="stable")[:MOST_VIAS]
    same = places[:, None] == np.array(always).reshape(-1, 2)
    wanted = np.flatnonzero(same.all(axis=2).any(axis=1))
    return sorted({*order[far[order] <= BRIDGES_MM].tolist(), *wanted.tolist()})


def feet(bridge: engine.ViaBridge | engine.Strap) -> Floats:
    """Where a bridge stands on the plane, shape (n, 2)."""
    shape = bridge.at if isinstance(bridge, engine.ViaBridge) else bridge.line
    return shapely.get_coordinates(shape)


def _via(place: Floats, wide_mm: float, mounted_nh: float = 0.0) -> engine.ViaBridge:
    return engine.ViaBridge(shapely.Point(place), wide_mm, mounted_nh)
