"""What of a crossing its solve needs to know, and whether the solve sees the way of the return."""

from __future__ import annotations

from dataclasses import dataclass

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import PartBridge
from splitcheck.loops.stitches import Stitch
from splitcheck.loops.ways import Route, Way
from splitcheck.planes.crossings import Crossing


@dataclass(frozen=True, slots=True)
class Task:
    """A crossing with all that its solve needs to know."""

    number: int
    """Its place among the crossings of the board."""
    crossing: Crossing
    route: Route
    runs: tuple[tuple[Point, ...], ...]
    """Centre lines of all runs that it stands for, its own among them."""
    height_mm: float
    beyond: int | None
    """Layer number of the whole plane beyond the broken one."""
    other: int | None
    """Layer number of the whole plane on the trace's other side."""
    part: float = 1.0
    """Part of the current that the solve would see which really returns on this plane."""
    stitches: tuple[Stitch, ...] = ()
    """Holes to the plane on the trace's other side."""


def can_solve(task: Task) -> bool:
    """Whether the solve sees the way that the return takes.

    A gap inside one island always has a way round in the plane. Where the islands are cut apart,
    the bridges carry all of the return: the solve then knows vias and capacitors to the plane
    beyond, vias to a plane on the trace's other side, capacitors from one island straight to the
    other, and nothing else well enough.
    """
    if task.crossing.islands[0] == task.crossing.islands[1] or task.stitches:
        return True
    best = task.route.best
    if best is None:
        return False
    if is_straight(best):
        return any(as_strap(task, part) for part in best.capacitors)
    return (
        len(best.bridges) + len(best.capacitors) == 2
        and task.beyond is not None
        and best.bridge_layer == task.beyond
    )


def is_straight(way: Way) -> bool:
    """Whether a way goes over one part from the one island to the other."""
    return len(way.capacitors) == 1 and not way.bridges


def stays(way: Way) -> bool:
    """Whether a way stays on the plane."""
    return not way.bridges and not way.capacitors


def is_seen(task: Task, way: Way) -> bool:
    """Whether the solve knows what a way goes over.

    That is the plane itself, a part straight over the gap, two vias or parts to the plane beyond,
    or two vias to copper on the trace's side that is not the plane there.
    """
    if stays(way) or is_straight(way):
        return True
    if len(way.bridges) + len(way.capacitors) != 2:
        return False
    if way.bridge_layer == task.beyond:
        return True
    crossing = task.crossing
    on_side = (way.bridge_layer > crossing.plane) == (crossing.layer > crossing.plane)
    return on_side and not way.capacitors and way.bridge_layer != task.other


def as_strap(task: Task, part: PartBridge) -> bool:
    """Whether a part stands on a side of the plane where nothing is between it and the plane."""
    plane, layer = task.crossing.plane, part.layer
    walls = [wall for wall in (task.beyond, task.other) if wall is not None]
    return not any(plane < wall <= layer or layer <= wall < plane for wall in walls)


def parts_islands(task: Task) -> bool:
    """Whether the gap cuts apart what lies on either side of it."""
    one, other = task.crossing.islands
    return one != other
