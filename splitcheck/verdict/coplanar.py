"""Whether copper beside a trace, in its own layer, carries its return past a gap."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import LineString

from splitcheck.loops.bridges import stitched_near
from splitcheck.planes.crossings import Crossing
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.sideways import STEP_MM, steps_along, to_the_left

#: Copper as near to the centre line as this share of the height over the plane is no worse a way.
NEAR_SHARE = 0.5
#: It must go on for so many heights beyond either end of a run ...
ON_HEIGHTS = 3.0
#: ... or be joined to the plane by a plated hole this near to that end, mm.
STITCH_MM = 3.0


def carries_past(scene: Scene, crossing: Crossing) -> bool:
    """Whether copper of the trace's own layer carries the return past the gap.

    Parameters
    ----------
    scene
        The board and its planes.
    crossing
        A run of a trace over a gap.

    Returns
    -------
    True if, on one side of the trace or on the other,

    (1) one piece of copper of the broken plane's own net lies beside the whole run, its rim no
    farther from the centre line than half the height of the trace over the plane; interruptions
    count for nothing that are no longer than this height, all together, and
    (2) beyond either end it goes on beside the trace for three heights, or as far as the trace was
    followed, or a plated hole within 3 mm of that end joins it to the plane there.

    Notes
    -----
    A wire of radius a beside the rim of a half plane in its own layer, e away from it, has the loop
    inductance mu0/(2 pi) ln(4 e / a) (exact, by the conformal map w = sqrt(z)); at the height h
    over a plane without end it is mu0/(2 pi) ln(2 h / a). The two are equal at e = h / 2: with
    copper nearer than that a return that stays in the trace's layer costs nothing more.
    """
    own = scene.planes.get(crossing.layer)
    if own is None or crossing.aside_mm:
        return False
    ends = [scene.planes[crossing.plane].islands[i] for i in crossing.islands]
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    reach = NEAR_SHARE * height
    run = LineString([crossing.before, *crossing.path, crossing.after])
    for island in own.islands:
        if any(end.net != island.net for end in ends):
            continue
        if not shapely.dwithin(island.shape, run, reach):
            continue
        near = shapely.clip_by_rect(island.shape, *run.buffer(2 * ON_HEIGHTS * height).bounds)
        for side in (-1.0, 1.0):
            if _goes_beside(near, run, side * reach) and all(
                _goes_on(near, crossing, height, side, at_end=at_end)
                or stitched_near(scene.graph, end.id, island.id, place, STITCH_MM)
                for at_end, end, place in (
                    (False, ends[0], crossing.before),
                    (True, ends[1], crossing.after),
                )
            ):
                return True
    return False


def _goes_on(
    copper: shapely.Geometry, crossing: Crossing, height_mm: float, side: float, *, at_end: bool
) -> bool:
    """Whether copper goes on beside the trace beyond an end of its run."""
    stretch = LineString(crossing.stretch)
    first, last = (stretch.project(shapely.Point(p)) for p in (crossing.before, crossing.after))
    forward = first <= last
    on = ON_HEIGHTS * height_mm
    # the run may lie either way round in the stretch
    ahead = at_end == forward
    start, stop = (
        (max(first, last), max(first, last) + on)
        if ahead
        else (max(min(first, last) - on, 0.0), min(first, last))
    )
    stop = min(stop, stretch.length)
    if stop - start < STEP_MM:
        return True
    places = stretch.interpolate(steps_along(start, stop))
    piece = LineString(shapely.get_coordinates(places))
    return _goes_beside(copper, piece, (side if forward else -side) * NEAR_SHARE * height_mm)


def _goes_beside(copper: shapely.Geometry, line: LineString, reach_mm: float) -> bool:
    """Whether one piece of copper lies within reach beside a line, on its left; see `carries_past`.

    A reach below 0 looks on the right.
    """
    height = abs(reach_mm) / NEAR_SHARE
    along = steps_along(0.0, line.length)
    places, left = to_the_left(line, along)
    if not left.any(axis=1).all():
        return False
    looks = shapely.linestrings(np.stack([places, places + reach_mm * left], axis=1))
    strip = line.buffer(2.0 * height * np.sign(reach_mm), single_sided=True)
    step = line.length / (len(along) - 1)
    for piece in shapely.get_parts(shapely.intersection(copper, strip)):
        seen = shapely.intersects(looks, piece)
        if seen[0] and seen[-1] and int(np.count_nonzero(~seen)) * step <= height:
            return True
    return False
