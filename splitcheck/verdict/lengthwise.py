"""Runs along a slot or a rim nearer than the trace is high: how much of them counts as open."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import shapely
from shapely import LineString

from splitcheck.loops.estimate import beside_edge_nh_mm
from splitcheck.planes.crossings import Crossing
from splitcheck.units import Floats
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.sideways import steps_along, to_the_left

#: Runs no longer than so many heights are across: what they may be along is within the error.
LEAST_HEIGHTS = 3.0
#: At which shares of a run, and how much of the way out to half the height, is looked first.
FIRST_PLACES = np.array([0.1, 0.3, 0.5, 0.7, 0.9])
FIRST_LOOKS = np.array([0.25, 0.5, 0.75, 1.0])
#: A run right on a rim lies across so much of the gap, mm.
LEAST_MM = 0.05


class Opened(NamedTuple):
    """What a closed form takes of a run over a gap."""

    across_mm: float
    """Length that counts as lying across the gap."""
    along_nh: float = 0.0
    """What the rest adds, which lies along a rim."""


def opened(scene: Scene, crossing: Crossing) -> Opened:
    """How much of a run lies across its gap, and what the rest costs.

    Parameters
    ----------
    scene
        The board and its planes.
    crossing
        A run of a trace over a gap.

    Returns
    -------
    All of the run lies across, unless it is longer than three heights, copper of its islands is
    beside all of it, on one side or on both, and the slot is nowhere wider than the trace is high.
    Then that width lies across.

    Notes
    -----
    Between two rims the return flows on both: of the current beneath a trace at the height h only
    (2/pi) atan(s/2h) belongs into a slot of the width s, less than 0.3 for s = h, and it moves
    aside by no more than s/2. What costs is to get from one side to the other, once. Beside one rim
    the trace hangs beyond an edge, which costs what `beside_edge_nh_mm` says for each mm.
    """
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    all_of_it = Opened(crossing.run_mm)
    if crossing.run_mm <= LEAST_HEIGHTS * height:
        return all_of_it
    run = LineString([crossing.before, *crossing.path, crossing.after])
    plane = scene.planes[crossing.plane]
    places, left = to_the_left(run, FIRST_PLACES * run.length)
    # copper is at most half the height off, on one side at least: most runs end here
    out = np.concatenate([FIRST_LOOKS, -FIRST_LOOKS])[:, None, None] * (height / 2) * left
    looks = (places + out).reshape(-1, 2)
    copper_at = np.isin(plane.island_at(*looks.T), crossing.islands).reshape(-1, len(places))
    if not copper_at.any(axis=0).all():
        return all_of_it
    shapes = [plane.islands[i].shape for i in sorted(set(crossing.islands))]
    room = run.buffer(2.0 * height).bounds
    copper = shapely.union_all([shapely.clip_by_rect(shape, *room) for shape in shapes])
    sides = np.array([_to_rim_mm(run, copper, side * height) for side in (1.0, -1.0)])
    near, both = sides.min(axis=0), np.isfinite(sides).all(axis=0)
    if not np.isfinite(near).all():
        return all_of_it
    wide = np.where(both, sides.sum(axis=0), 2.0 * near)
    if float(wide.max()) > height:
        return all_of_it
    step = run.length / (len(near) - 1)
    along = sum(step * beside_edge_nh_mm(-far, height) for far in near[~both].tolist())
    return Opened(min(crossing.run_mm, max(float(wide.max()), LEAST_MM)), along)


def _to_rim_mm(run: LineString, copper: shapely.Geometry, reach_mm: float) -> Floats:
    """Distance to copper square to a line, on its left, place by place; inf beyond reach.

    A reach below 0 looks on the right.
    """
    places, left = to_the_left(run, steps_along(0.0, run.length))
    looks = shapely.linestrings(np.stack([places, places + reach_mm * left], axis=1))
    met = shapely.intersection(looks, copper)
    far = np.asarray(shapely.distance(shapely.points(places), met))
    return np.where(shapely.is_empty(met), np.inf, far)
