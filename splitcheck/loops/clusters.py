"""Which crossings one solve serves."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np

from splitcheck.loops.tasks import Task, parts_islands

#: Crossings of one gap this near to one another are solved together, mm; and those no further
#: apart than so many of their detours, as they couple (by 0.3 of the lesser value at one of them,
#: K_10 of tests/loops/reference_coupling.csv), out to where one mesh can hardly serve both, mm ...
TOGETHER_MM = 4.0
TOGETHER_DETOURS = 1.2
TOGETHER_MOST_MM = 20.0
#: ... but not more of them at once.
MOST_TRACES = 40


def cluster(tasks: Sequence[Task]) -> tuple[tuple[Task, ...], ...]:
    """Put together crossings that one solve serves.

    They are over one gap, from one layer, under the same planes, and near one another. A trace that
    only passes by a gap is solved by itself: what it crosses nearby is not to be left out of the
    others. Splits whose islands come together by holes to the plane on the trace's other side are
    solved apart from the rest, in a world that ends with the window.
    """
    groups: dict[tuple[object, ...], list[Task]] = defaultdict(list)
    for task in tasks:
        c = task.crossing
        alone = task.number + 1 if c.aside_mm else 0
        over = parts_islands(task) and bool(task.stitches)
        key = (c.plane, c.gap, c.layer, task.beyond or 0, task.other or 0, alone, over)
        groups[key].append(task)
    clusters: list[tuple[Task, ...]] = []
    for _, members in sorted(groups.items()):
        clusters.extend(near_one_another(members))
    return tuple(clusters)


def together_mm(detour_mm: float | None, detours: float = TOGETHER_DETOURS) -> float:
    """How far from a crossing others of its gap may be to be solved with it, mm.

    Examples
    --------
    >>> together_mm(None), together_mm(10.0), together_mm(100.0)
    (4.0, 12.0, 20.0)
    """
    return max(TOGETHER_MM, min(detours * (detour_mm or 0.0), TOGETHER_MOST_MM))


def near_one_another(
    tasks: Sequence[Task], detours: float = TOGETHER_DETOURS
) -> list[tuple[Task, ...]]:
    """Split tasks into chains of neighbours."""
    left = sorted(tasks, key=lambda task: (task.crossing.at, task.number))
    clusters = []
    while left:
        members = [left.pop(0)]
        grown = True
        while grown and len(members) < MOST_TRACES:
            at = np.array([task.crossing.at for task in members])
            reach = np.array([together_mm(task.route.detour_mm, detours) for task in members])
            near = [
                task
                for task in left
                if (
                    np.hypot(*(at - np.asarray(task.crossing.at)).T)
                    <= np.minimum(reach, together_mm(task.route.detour_mm, detours))
                ).any()
            ][: MOST_TRACES - len(members)]
            grown = bool(near)
            members.extend(near)
            left = [task for task in left if task not in near]
        clusters.append(tuple(sorted(members, key=lambda task: task.number)))
    return clusters
