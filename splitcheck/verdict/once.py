"""Weighed crossings in, one for every gap that a return goes past once out."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace
from math import hypot, inf

import shapely

from splitcheck.loops.estimate import Inductance
from splitcheck.verdict.scene import Scene, Weighed
from splitcheck.verdict.weighing import ends_of, past_by_holes

#: A run whose middle lies this near to the same stretch of trace is on it, mm.
SAME_PLACE_MM = 1e-3


def once_a_gap(scene: Scene, weighed: Sequence[Weighed]) -> list[Weighed]:
    """Join the runs of one stretch of trace that a return goes past at once into the worst of them.

    (1) Runs over one gap of one island: the return has to go round once for all of them, or not at
    all where the trace comes back.
    (2) Splits on either side of a narrow island: if the holes of that island are farther off than
    the next split, the return that went over to the plane on the trace's other side stays there.

    The solve sees the whole stretch. Adding their values up would count it several times.
    """
    groups: dict[tuple[int, ...], list[Weighed]] = defaultdict(list)
    kept: list[Weighed] = []
    for item in weighed:
        c = item.crossing
        one, other = c.islands
        if one == other:
            groups[c.net, c.layer, c.plane, c.gap, one].append(item)
        elif item.stitches:
            groups[c.net, c.layer, c.plane, c.gap, -1].append(item)
        else:
            kept.append(item)
    for key, members in sorted(groups.items(), key=lambda group: group[0]):
        left = sorted(members, key=_by_estimate)
        while left:
            worst = left.pop(0)
            same = _in_a_row(worst, left) if key[-1] < 0 else _on_stretch(worst, left)
            left = [item for item in left if item not in same]
            runs = (worst.crossing, *(item.crossing for item in same))
            every = sorted({stitch for item in (worst, *same) for stitch in item.stitches})
            joined = replace(worst, runs=runs, stitches=tuple(every))
            if key[-1] < 0 and same:
                value = _all_past(scene, (worst, *same))
                joined = replace(joined, estimate=value, by_holes=True)
            kept.append(joined)
    return kept


def _by_estimate(item: Weighed) -> tuple[float, float, tuple[float, float]]:
    added = inf if item.estimate is None else item.estimate.added_nh
    return (-added, -item.crossing.run_mm, item.crossing.at)


def _on_stretch(worst: Weighed, others: Sequence[Weighed]) -> list[Weighed]:
    """Those whose run lies on the same stretch of trace."""
    stretch = shapely.LineString(worst.crossing.stretch)
    return [
        item
        for item in others
        if shapely.dwithin(stretch, shapely.Point(item.crossing.at), SAME_PLACE_MM)
    ]


def _in_a_row(worst: Weighed, others: Sequence[Weighed]) -> list[Weighed]:
    """Splits of the same stretch that follow one upon another over narrow islands."""
    left = _on_stretch(worst, others)
    row = [worst]
    while True:
        more = [item for item in left if any(_follow(item, known) for known in row)]
        if not more:
            return row[1:]
        row.extend(more)
        left = [item for item in left if item not in more]


def _follow(one: Weighed, other: Weighed) -> bool:
    """Whether the island between two splits is too narrow for the return to come back to it."""
    for side, on in enumerate(one.crossing.islands):
        for there, island in enumerate(other.crossing.islands):
            if on != island:
                continue
            rim = (one.crossing.path[0], one.crossing.path[-1])[side]
            end = (other.crossing.path[0], other.crossing.path[-1])[there]
            nearest = min(
                (
                    hypot(hole.at[0] - rim[0], hole.at[1] - rim[1])
                    for hole in one.stitches
                    if hole.side == side
                ),
                default=inf,
            )
            if hypot(end[0] - rim[0], end[1] - rim[1]) < nearest:
                return True
    return False


def _all_past(scene: Scene, row: Sequence[Weighed]) -> Inductance | None:
    """What it costs the return to go past splits in a row on the other plane."""
    first = row[0]
    if first.other is None:
        return first.estimate
    stretch = shapely.LineString(first.crossing.stretch)
    places = [
        (stretch.project(shapely.Point(at)), at, ends_of(item.stitches, side))
        for item in row
        for side, at in enumerate((item.crossing.path[0], item.crossing.path[-1]))
    ]
    (start, one, at_one), (stop, two, at_two) = min(places), max(places)
    ends = ((one, at_one), (two, at_two))
    return past_by_holes(scene, first.crossing, first.other, ends, stop - start)
