"""From a crossing to what it is weighed by: the way round, what lies about it, its estimate."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from splitcheck.copper.marks import Point
from splitcheck.loops import estimate
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.handover import over_holes
from splitcheck.loops.routes import find_route
from splitcheck.loops.stitches import Stitch, stitches
from splitcheck.loops.ways import Route, Way
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Gap
from splitcheck.verdict import around
from splitcheck.verdict.around import exempt, share_of
from splitcheck.verdict.beside import estimate_beside, least_nh, straight_on, too_small
from splitcheck.verdict.by_class import EXEMPT
from splitcheck.verdict.edge_runs import COVERED
from splitcheck.verdict.findings import Kind
from splitcheck.verdict.lengthwise import opened
from splitcheck.verdict.scene import Scene, Weighed

#: From this ratio of length across the trace to length along it a closed gap is a slot.
SLOT_RATIO = 2.5
#: A trace this near the rim of a gap, as a share of its run, clips the gap rather than crosses it.
EDGE_RATIO = 0.25
#: Error of what a run adds along a rim, which is never straight, as a share.
ALONG_ERROR = 0.4


def weigh(scene: Scene, crossing: Crossing) -> Weighed | str:
    """Find the way round of a crossing and estimate it; the reason if it is no finding."""
    why_not = exempt(scene, crossing)
    if why_not is not None:
        return why_not
    if scene.drive_of(crossing.net).exempt:
        return EXEMPT
    item = look_at(scene, crossing)
    value = item.estimate
    if value is not None and value.added_nh + value.error_nh < least_nh(scene, crossing):
        return too_small(scene, crossing)
    if item.kind == "edge-run" and (item.other is not None or item.beyond is not None):
        return COVERED
    return item


def look_at(scene: Scene, crossing: Crossing) -> Weighed:
    """The way round of a crossing, what lies about it, and its estimate, finding or not."""
    route = straight_on(scene, crossing) if crossing.aside_mm else _route(scene, crossing)
    other = around.other_side(scene, crossing)
    beyond = around.beyond(scene, crossing)
    beside = around.beside(scene, crossing)
    share = share_of(scene, crossing, other if beside is None else beside)
    holes = stitches(crossing, scene.planes, other, scene.graph)
    over = None
    if crossing.aside_mm:
        value: Inductance | None = estimate_beside(scene, crossing, share, beyond, other)
    else:
        over = _handed_over(scene, crossing, share, other, holes)
        known = [over, _round_gap(scene, crossing, route, share, beyond, other)]
        value = min((v for v in known if v is not None), key=lambda v: v.added_nh, default=None)
    return Weighed(
        crossing,
        route,
        beyond,
        other,
        beside,
        share,
        value,
        _kind(crossing, scene.planes[crossing.plane].gaps[crossing.gap], route),
        (crossing,),
        holes,
        bool(holes) and value is over,
    )


def _route(scene: Scene, crossing: Crossing) -> Route:
    return find_route(crossing, scene.planes, scene.terrains, scene.graph)


def _kind(crossing: Crossing, gap: Gap, route: Route) -> Kind:
    if crossing.aside_mm:
        return "void-crossing"
    if crossing.islands[0] != crossing.islands[1]:
        return "split-crossing"
    left, right = (min(route.reach_mm(way), 1e3) for way in (route.left, route.right))
    if min(left, right) < EDGE_RATIO * crossing.run_mm:
        return "edge-run" if gap.open else "void-crossing"
    return "slot-crossing" if left + right >= SLOT_RATIO * crossing.run_mm else "void-crossing"


def _round_gap(
    scene: Scene,
    crossing: Crossing,
    route: Route,
    share: float,
    beyond: int | None,
    other: int | None,
) -> Inductance | None:
    """What it costs the return to go round; None if there is no way."""
    if not route.joined:
        return None
    height = scene.board.stack.height_mm
    run = opened(scene, crossing)
    value = estimate.added(
        (reach_mm(crossing, route, route.left), reach_mm(crossing, route, route.right)),
        (_bridge_nh(scene, crossing, route.left), _bridge_nh(scene, crossing, route.right)),
        run.across_mm,
        height(crossing.layer, crossing.plane),
        crossing.width_mm,
        beyond_mm=None if beyond is None else height(crossing.plane, beyond),
        above_mm=None if other is None else height(crossing.plane, other),
        share=share,
    )
    along = share**2 * run.along_nh
    if value is None or not along:
        return value
    return Inductance(value.added_nh + along, value.error_nh + ALONG_ERROR * along)


def _handed_over(
    scene: Scene,
    crossing: Crossing,
    share: float,
    other: int | None,
    holes: Sequence[Stitch],
) -> Inductance | None:
    """What it costs the return to leave for the plane on the trace's other side and come back.

    Without holes that is asked only where the islands are cut apart.
    """
    if other is None:
        return None
    if holes:
        one, two = (
            (crossing.path[0 if side == 0 else -1], ends_of(holes, side)) for side in (0, 1)
        )
        return past_by_holes(scene, crossing, other, (one, two), crossing.run_mm)
    if crossing.islands[0] == crossing.islands[1]:
        return None
    islands = scene.planes[crossing.plane].islands
    smaller = min(islands[i].shape.area for i in crossing.islands)
    planes_mm = scene.board.stack.height_mm(crossing.plane, other)
    return estimate.handed_over(planes_mm, smaller, share)


def ends_of(holes: Sequence[Stitch], side: int) -> tuple[tuple[Point, float], ...]:
    """Place and diameter of the holes at one end of a run."""
    return tuple((hole.at, hole.wide_mm) for hole in holes if hole.side == side)


def past_by_holes(
    scene: Scene,
    crossing: Crossing,
    other: int,
    ends: Sequence[tuple[Point, Sequence[tuple[Point, float]]]],
    run_mm: float,
) -> Inductance:
    """What it costs the return of a trace to get past a run on another plane: see `over_holes`."""
    height = scene.board.stack.height_mm
    return over_holes(
        ends,
        run_mm,
        height(crossing.layer, crossing.plane),
        crossing.width_mm,
        height(crossing.plane, other),
    )


def reach_mm(crossing: Crossing, route: Route, way: Way | None) -> float:
    """How far along the gap a way goes before it crosses, mm.

    Over bridges that is where the leg between them crosses the gap: the way to them and back runs
    along the trace, over copper that is whole.
    """
    ends = None if way is None else way.off_plane
    if ends is None:
        return route.reach_mm(way)
    ahead = np.subtract(crossing.after, crossing.before)
    ahead = ahead / (float(np.hypot(*ahead)) or 1.0)
    (one, other) = (np.subtract(at, crossing.at) for at in ends)
    before, after = float(one @ ahead), float(other @ ahead)
    part = 0.5 if before == after else min(max(-before / (after - before), 0.0), 1.0)
    x, y = one + part * (other - one)
    return abs(float(y * ahead[0] - x * ahead[1]))


def _bridge_nh(scene: Scene, crossing: Crossing, way: Way | None) -> float:
    """What the bridges of a way add: parts as mounted, and the field between the two planes."""
    if way is None or not (way.bridges or way.capacitors):
        return 0.0
    if way.bridge_layer in {0, crossing.plane}:
        return way.parts_nh
    (x0, y0), (x1, y1) = way.path[1], way.path[-2]
    height = scene.board.stack.height_mm(crossing.plane, way.bridge_layer)
    return way.parts_nh + estimate.via_pair_nh(float(np.hypot(x1 - x0, y1 - y0)), 0.3, height)
