"""Where the return must change planes: a via beside the trace's own, or a capacitor."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import replace
from math import hypot

import numpy as np

from splitcheck.loops.bridges import with_capacitor
from splitcheck.loops.mounted import mounted_nh
from splitcheck.planes.islands import Island
from splitcheck.verdict.findings import Point, Proposal
from splitcheck.verdict.plane_changes import change_findings
from splitcheck.verdict.proposals.capacitors import (
    PADS_APART_MM,
    TO_VIA_MM,
    TRIED,
    Mount,
    mount_words,
    room_for_end,
)
from splitcheck.verdict.proposals.case import Case, Worth, worth_of_findings
from splitcheck.verdict.proposals.room import HOLE_MM
from splitcheck.verdict.proposals.vias import circles, met_by, spots, stitched, words
from splitcheck.verdict.scene import Scene


def return_vias(case: Case) -> Iterator[Proposal]:
    """Propose a via that joins both planes beside the hole, where they are of one net."""
    one, other = (case.island(name) for name in case.finding.islands)
    if one.net_name != other.net_name:
        return
    for start in _starts(case):
        xs, ys = circles(start)
        joined = [
            frozenset(ids) if {one.id, other.id} <= ids else frozenset()
            for ids in met_by(case, one.net_name, xs, ys)
        ]
        for spot in spots(case, one.net_name, xs, ys, joined)[:1]:
            apart = hypot(spot.at[0] - start[0], spot.at[1] - start[1])
            said = words(case, [spot], one.net_name, f"{apart:.2f} mm from the change")
            worth = _worth(case, stitched(case.scene, [spot]))
            found = case.proposal("via", [spot.at], said, worth)
            if found is not None:
                yield found


def return_capacitors(case: Case) -> Iterator[Proposal]:
    """Propose a capacitor between both planes beside the hole, where they are of two nets."""
    one, other = (case.island(name) for name in case.finding.islands)
    if one.net_name == other.net_name:
        return
    for start in _starts(case):
        for mount in _mounts(case, start, one, other):
            graph = with_capacitor(
                case.scene.graph,
                one.id,
                other.id,
                *mount.down,
                mount.value_nh,
                layer=mount.layer,
                ref="a new capacitor",
            )
            worth = _worth(case, replace(case.scene, graph=graph))
            said = mount_words(case, mount, one.net_name, other.net_name)
            found = case.proposal("capacitor", mount.pads, said, worth)
            if found is not None:
                yield found


def _starts(case: Case) -> list[Point]:
    assert case.change is not None
    return list(dict.fromkeys(change.at for change in case.change.changes))


def _worth(case: Case, scene: Scene) -> Worth:
    """What the change costs in a changed scene, as it would be told."""
    assert case.change is not None
    return worth_of_findings(change_findings(scene, [case.change], defaultdict(int)))


def _mounts(case: Case, start: Point, one: Island, other: Island) -> Iterator[Mount]:
    """Free places for a part whose vias go down to both planes, nearest first."""
    outer = (1, len(case.scene.board.stack.layers))
    xs, ys = circles(start)
    reach = PADS_APART_MM / 2 + TO_VIA_MM
    taken = 0
    for x, y in zip(xs.tolist(), ys.tolist(), strict=True):
        for layer in sorted(outer, key=lambda n: (abs(n - one.layer) + abs(n - other.layer), n)):
            for ahead in ((1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0)):
                mount = _mount(case, (x, y), layer, ahead, (one, other), reach)
                if mount is None:
                    continue
                yield mount
                taken += 1
                if taken == TRIED:
                    return
                break


def _mount(
    case: Case,
    middle: Point,
    layer: int,
    ahead: Point,
    islands: tuple[Island, Island],
    reach: float,
) -> Mount | None:
    pads: list[Point] = []
    down: list[Point] = []
    opened: list[str] = []
    for sign, island in zip((-1, 1), islands, strict=True):
        if island.layer == layer:
            return None
        pad, hole = (
            (
                round(middle[0] + sign * far * ahead[0], 3),
                round(middle[1] + sign * far * ahead[1], 3),
            )
            for far in (PADS_APART_MM / 2, reach)
        )
        plane = case.scene.planes[island.layer]
        number = int(plane.island_at(np.array([hole[0]]), np.array([hole[1]]))[0])
        if number < 0 or plane.islands[number].id != island.id:
            return None
        found = room_for_end(case, layer, island.net_name, pad, hole, ahead)
        if found is None:
            return None
        pads.append(pad)
        down.append(hole)
        opened.extend(found)
    stack = case.scene.board.stack
    # what a hole runs on between two planes is the spreading between them, counted there
    depth = min(stack.height_mm(layer, island.layer) for island in islands)
    value = mounted_nh(2 * reach, (depth, depth), HOLE_MM)
    return Mount(layer, (pads[0], pads[1]), (down[0], down[1]), tuple(sorted(set(opened))), value)
