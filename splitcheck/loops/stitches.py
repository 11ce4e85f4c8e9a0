"""Plated holes by which a return gets from a broken plane to that on the trace's other side."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import IslandGraph, bridges_between
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane

#: So many of the nearest holes at either end of a run count. With half as many the values of 27
#: crossings of one board were 1 % higher in the middle and 10 % at most; with twice as many those
#: that were solved both times were 0.5 % lower, one by 9 %, and others had too much to look at.
MOST_STITCHES = 8
#: ... out to here, mm: what is farther off is of no use in 1 ns (S. Weir, si-list, 16 Oct 2008).
STITCHES_MM = 25.0


class Stitch(NamedTuple):
    """A plated hole from a broken plane to the whole one on the trace's other side."""

    at: Point
    wide_mm: float
    side: int
    """Which end of the run it was found for: 0 before it, 1 after it."""


def stitches(
    crossing: Crossing, planes: Mapping[int, Plane], layer: int | None, graph: IslandGraph
) -> tuple[Stitch, ...]:
    """Find the plated holes by which a return gets past a gap on another plane.

    Parameters
    ----------
    crossing
        The crossing.
    planes, graph
        Planes by layer number, and the island graph.
    layer
        Layer number of a plane on the trace's other side that is whole along the run; None: there
        is none.

    Returns
    -------
    The holes nearest to either end of the run, sorted; those on this side of its middle as the
    trace goes, if the gap does not part islands. None at all where they would be no way past the
    gap: where the other plane is in pieces there, or one end has no hole nearby.
    """
    if layer is None:
        return ()
    ends = np.array([crossing.before, crossing.after, crossing.at])
    over = planes[layer].island_at(ends[:, 0], ends[:, 1])
    numbers = set(over[over >= 0].tolist())
    if len(numbers) != 1:
        return ()
    whole = planes[layer].islands[numbers.pop()].id
    parted = crossing.islands[0] != crossing.islands[1]
    found: list[Stitch] = []
    for side, at in enumerate((crossing.before, crossing.after)):
        island = planes[crossing.plane].islands[crossing.islands[side]].id
        ahead = (0.0, 0.0) if parted else (at[0] - crossing.at[0], at[1] - crossing.at[1])
        near = _nearest(graph, island, whole, at, ahead, side)
        if not near:
            return ()
        found.extend(near)
    return tuple(sorted(found))


def _nearest(
    graph: IslandGraph, one: str, other: str, at: Point, ahead: Point, side: int
) -> list[Stitch]:
    """The holes nearest to a place, none of them on the other side of where `ahead` leads from."""
    places = bridges_between(graph, one, other)
    if not len(places):
        return []
    away = places - np.asarray(at)
    far = np.hypot(*away.T)
    there = (far <= STITCHES_MM) & (away @ ahead >= -np.dot(ahead, ahead))
    order = np.argsort(far, kind="stable")
    wide_mm = graph.edges[one, other]["wide_mm"]
    return [
        Stitch((float(places[i, 0]), float(places[i, 1])), float(wide_mm[i]), side)
        for i in order[there[order]][:MOST_STITCHES].tolist()
    ]
