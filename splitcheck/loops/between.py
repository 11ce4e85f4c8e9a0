"""Which islands the two pads of a part reach, where, and what it adds as mounted there."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from math import hypot
from typing import Literal, NamedTuple, TypeAlias

import numpy as np

from splitcheck.board.board import Board
from splitcheck.board.components import Component, Pin, capacitors_of, links_of
from splitcheck.copper.marks import Point
from splitcheck.loops.mounted import BARREL_MM, mounted_nh
from splitcheck.planes.islands import Island
from splitcheck.units import Floats

#: A capacitor, or a link of no resistance.
BridgeKind: TypeAlias = Literal["capacitor", "copper"]


#: An island reached by a hole this near to a pad is always reached, mm; farther off only if
#: within so many times the distance of the nearest (common practice, no source).
NEAR_MM = 3.0
MUCH_FARTHER = 1.5


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
    ways = _ways_down(board, {pin.part for _, part in parts for pin in part.pins}, by_part)
    for kind, part in parts:
        one, other = (_reached(pin, ways, by_part) for pin in part.pins)
        for start in one:
            for stop in other:
                if start.island.id != stop.island.id:
                    yield _standing(kind, board, part, start, stop)


def _ways_down(
    board: Board, parts: set[int], by_part: Mapping[int, Island]
) -> dict[int, list[tuple[Island, Floats]]]:
    """For pieces of copper, the islands that plated holes through them lead to, and the holes.

    The holes have shape (n, 3): place and diameter, mm, sorted.
    """
    found: dict[int, dict[str, list[tuple[float, float, float]]]] = {}
    islands = {island.id: island for island in by_part.values()}
    for hole in board.holes:
        met = [by_part[part] for part in hole.parts if part in by_part]
        for part in hole.parts if met else ():
            if part not in parts:
                continue
            down = found.setdefault(part, {})
            for island in met:
                if island.part != part:
                    down.setdefault(island.id, []).append((*hole.at, hole.hole.diameter_mm))
    return {
        part: [(islands[name], np.array(sorted(holes))) for name, holes in sorted(down.items())]
        for part, down in found.items()
    }


def _reached(
    pin: Pin, ways: Mapping[int, list[tuple[Island, Floats]]], by_part: Mapping[int, Island]
) -> list[_Reach]:
    """The islands that a pad reaches, by layer, each by the nearest hole.

    Left out are those whose nearest hole is much farther off than the nearest of all: the current
    comes down there before, and goes on by other holes.
    """
    met = []
    if pin.part in by_part:
        met.append((0.0, _Reach(by_part[pin.part], pin.at, BARREL_MM)))
    for island, holes in ways.get(pin.part, ()):
        far = np.hypot(holes[:, 0] - pin.at[0], holes[:, 1] - pin.at[1])
        nearest = int(np.argmin(far))
        x, y, wide = holes[nearest].tolist()
        met.append((float(far[nearest]), _Reach(island, (x, y), wide)))
    enough = max(NEAR_MM, MUCH_FARTHER * min((far for far, _ in met), default=0.0))
    found = [reach for far, reach in met if far <= enough]
    return sorted(found, key=lambda reach: (reach.island.layer, reach.island.id))


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
