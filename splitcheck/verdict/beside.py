"""Gaps beside a trace as findings: from where on they are told, how often, and their estimate."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace
from math import hypot

import shapely

from splitcheck.loops.beside import gaps_beside
from splitcheck.loops.estimate import Inductance, between, shielding
from splitcheck.loops.ways import Route, Way
from splitcheck.loops.windows import BEYOND_HEIGHTS, BEYOND_MM
from splitcheck.planes.crossings import Crossing
from splitcheck.verdict import around
from splitcheck.verdict.scene import Scene, Weighed

#: Gaps beside traces are told from here on, whatever is asked for, nH: every hole near a trace
#: adds something, and of some thousandths of a nH there is no end.
LEAST_BESIDE_NH = 0.1
#: How far the closed form may be off, with planes beside it and without.
ERROR = 0.5
ERROR_SHIELDED = 0.7


def least_nh(scene: Scene, crossing: Crossing) -> float:
    """What a crossing must add to be told, nH."""
    return max(scene.min_nh, LEAST_BESIDE_NH) if crossing.aside_mm else scene.min_nh


def too_small(scene: Scene, crossing: Crossing) -> str:
    """What those that add less are counted as."""
    if crossing.aside_mm:
        return f"gaps beside traces that add less than {least_nh(scene, crossing):g} nH"
    return around.too_small(scene)


def straight_on(scene: Scene, crossing: Crossing) -> Route:
    """The way of the return past a gap beside the trace: straight on, on both sides of its line."""
    (x0, y0), (x1, y1) = crossing.before, crossing.after
    straight = hypot(x1 - x0, y1 - y0)
    net = scene.planes[crossing.plane].islands[crossing.islands[0]].net_name
    way = Way(straight, (crossing.before, crossing.after), (), net, 0)
    return Route(straight, way, way, joined=True)


def estimate_beside(
    scene: Scene, crossing: Crossing, share: float, beyond: int | None, other: int | None
) -> Inductance:
    """What the gaps beside a stretch of trace add, by closed forms.

    Parameters
    ----------
    scene, crossing
        The board, and the stretch.
    share
        Part of the return that the plane carries, 0 to 1.
    beyond, other
        Layer numbers of whole planes beyond the gap and on the trace's other side, or None.

    Notes
    -----
    Planes nearby shield as they do a slot as long as the gap is deep.
    """
    stack = scene.board.stack
    plane = scene.planes[crossing.plane]
    height = stack.height_mm(crossing.layer, crossing.plane)
    apart = [None if n is None else stack.height_mm(crossing.plane, n) for n in (beyond, other)]
    total = 0.0
    for value, number, _ in gaps_beside(crossing.path, plane, height):
        x0, y0, x1, y1 = plane.gaps[number].shape.bounds
        wide, narrow = max(x1 - x0, y1 - y0), min(x1 - x0, y1 - y0)
        left = [shielding(mm, narrow, wide / 2, height) for mm in apart]
        total += value * between(*left)
    total *= share**2
    error = ERROR if apart == [None, None] else ERROR_SHIELDED
    return Inductance(total, error * total + 0.01)


def once_a_place(scene: Scene, weighed: Sequence[Weighed]) -> list[Weighed]:
    """Leave out gaps beside a trace that the solve of another place of the same trace holds.

    A solve sees all gaps in its window. Of several such places near one another the worst is kept
    and stands for all; beside a crossing none is.
    """
    groups: dict[tuple[int, int, int], list[Weighed]] = defaultdict(list)
    for item in weighed:
        c = item.crossing
        groups[c.net, c.layer, c.plane].append(item)
    kept = [item for item in weighed if not item.crossing.aside_mm]
    for (_, layer, plane), members in sorted(groups.items()):
        reach = BEYOND_MM + BEYOND_HEIGHTS * scene.board.stack.height_mm(layer, plane)
        over = [item for item in members if not item.crossing.aside_mm]
        crossed = shapely.union_all([shapely.LineString(r.path) for i in over for r in i.runs])
        left = [
            item
            for item in sorted(members, key=_worst_first)
            if item.crossing.aside_mm and not shapely.dwithin(crossed, _line(item), reach)
        ]
        while left:
            worst = left.pop(0)
            same = [item for item in left if shapely.dwithin(_line(worst), _line(item), reach)]
            left = [item for item in left if item not in same]
            runs = (*worst.runs, *(run for item in same for run in item.runs))
            kept.append(replace(worst, runs=runs))
    return kept


def _line(item: Weighed) -> shapely.LineString:
    return shapely.LineString(item.crossing.path)


def _worst_first(item: Weighed) -> tuple[float, tuple[float, float]]:
    return (0.0 if item.estimate is None else -item.estimate.added_nh, item.crossing.at)
