"""Which islands the two pads of a part reach, where, and what it adds as mounted there."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from functools import cached_property
from math import hypot
from typing import TYPE_CHECKING, Literal, NamedTuple, TypeAlias

import numpy as np

from splitcheck.board.board import Board
from splitcheck.board.components import Component, Pin, capacitors_of, links_of
from splitcheck.copper.marks import Point
from splitcheck.loops.mounted import BARREL_MM, mounted_nh
from splitcheck.planes.islands import Island

if TYPE_CHECKING:
    from scipy.spatial import KDTree

#: A capacitor, or a link of no resistance.
BridgeKind: TypeAlias = Literal["capacitor", "copper"]


#: An island reached by a hole this near to a pad is always reached, mm; farther off only if
#: within so many times the distance of the nearest (common practice, no source).
NEAR_MM = 3.0
MUCH_FARTHER = 1.5
#: More islands than this are not looked for from one pad: what a part joins is their product.
MOST_ISLANDS = 16


class Standing(NamedTuple):
    """A two-pad part between two islands."""

    kind: BridgeKind
    ref: str
    at: Point
    """Middle of its two pads."""
    layer: int
    ends: tuple[tuple[str, Point], tuple[str, Point]]
    """Ids of the islands and where its current leaves and enters them."""
    mounted_nh: float


class _Reach(NamedTuple):
    """An island that a pad reaches."""

    island: Island
    at: Point
    barrel_mm: float


def standing_between(board: Board, by_part: Mapping[int, Island]) -> Iterator[Standing]:
    """Capacitors and links of no resistance between two islands.

    Parameters
    ----------
    board
        The board with its components.
    by_part
        Islands by the id of their piece of copper.

    Returns
    -------
    One for each pair of islands that the two pads of a part reach: the island that a pad lies on,
    and those that plated holes through the pad's own piece of copper lead to, by the nearest hole
    for each. A part whose pads reach one and the same island joins nothing.
    """
    parts: list[tuple[BridgeKind, Component]] = [
        *(("capacitor", part) for part in capacitors_of(board.components, board.capacitors)),
        *(("copper", part) for part in links_of(board.components)),
    ]
    holes = _holes_through(board, {pin.part for _, part in parts for pin in part.pins}, by_part)
    for kind, part in parts:
        one, other = (_reached(pin, holes, by_part) for pin in part.pins)
        for start in one:
            for stop in other:
                if start.island.id != stop.island.id:
                    yield _standing(kind, board, part, start, stop)


class _Holes:
    """Plated holes through one piece of copper that lead to islands."""

    def __init__(self) -> None:
        self.places: list[Point] = []
        self.barrels_mm: list[float] = []
        self.islands: list[list[Island]] = []

    def add(self, at: Point, barrel_mm: float, islands: list[Island]) -> None:
        """One more hole."""
        self.places.append(at)
        self.barrels_mm.append(barrel_mm)
        self.islands.append(islands)

    @cached_property
    def tree(self) -> KDTree:
        """Their places, to be asked for the nearest."""
        from scipy.spatial import KDTree  # noqa: PLC0415 (0.1 s, only where needed)

        return KDTree(np.array(self.places))

    def near(self, at: Point, reach_mm: float) -> list[tuple[float, int]]:
        """Distances and numbers of those within reach, nearest first."""
        rows = self.tree.query_ball_point(at, reach_mm)
        return sorted(
            (hypot(self.places[i][0] - at[0], self.places[i][1] - at[1]), i) for i in rows
        )


def _holes_through(
    board: Board, parts: set[int], by_part: Mapping[int, Island]
) -> dict[int, _Holes]:
    """For pieces of copper, the plated holes through them that lead to islands."""
    found: dict[int, _Holes] = {}
    for hole in board.holes:
        mine = [part for part in hole.parts if part in parts]
        met = [by_part[part] for part in hole.parts if part in by_part] if mine else []
        for part in mine:
            islands = [island for island in met if island.part != part]
            if islands:
                through = found.setdefault(part, _Holes())
                through.add(hole.at, hole.hole.diameter_mm, islands)
    return found


def _reached(pin: Pin, holes: Mapping[int, _Holes], by_part: Mapping[int, Island]) -> list[_Reach]:
    """The islands that a pad reaches, by layer, each by the nearest hole.

    Left out are those whose nearest hole is much farther off than the nearest of all: the current
    comes down there before, and goes on by other holes.
    """
    found: dict[str, _Reach] = {}
    nearest = 0.0
    if pin.part in by_part:
        island = by_part[pin.part]
        found[island.id] = _Reach(island, pin.at, BARREL_MM)
    elif pin.part in holes:
        nearest = float(holes[pin.part].tree.query(pin.at)[0])
    if pin.part in holes:
        through = holes[pin.part]
        for _, row in through.near(pin.at, max(NEAR_MM, MUCH_FARTHER * nearest)):
            for island in through.islands[row]:
                reach = _Reach(island, through.places[row], through.barrels_mm[row])
                found.setdefault(island.id, reach)
            if len(found) >= MOST_ISLANDS:
                break
    return sorted(found.values(), key=lambda reach: (reach.island.layer, reach.island.id))


def _standing(
    kind: BridgeKind,
    board: Board,
    part: Component,
    start: _Reach,
    stop: _Reach,
) -> Standing:
    (x0, y0), (x1, y1) = part.pins[0].at, part.pins[1].at
    depths = [
        0.0
        if reach.island.layer == part.layer
        else board.stack.height_mm(part.layer, reach.island.layer)
        for reach in (start, stop)
    ]
    if min(depths) > 0.0:
        # what a hole runs on between two planes is the spreading between them, counted there
        depths = [min(depths)] * 2
    span = hypot(stop.at[0] - start.at[0], stop.at[1] - start.at[1])
    value = mounted_nh(
        max(span, hypot(x1 - x0, y1 - y0)),
        (depths[0], depths[1]),
        min(start.barrel_mm, stop.barrel_mm) or BARREL_MM,
    )
    return Standing(
        kind,
        part.ref,
        ((x0 + x1) / 2, (y0 + y1) / 2),
        part.layer,
        ((start.island.id, start.at), (stop.island.id, stop.at)),
        value,
    )
