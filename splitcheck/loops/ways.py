"""What a way round is, and the two sides of a crossing that ways are told apart by."""

from __future__ import annotations

from dataclasses import dataclass
from math import inf
from typing import NamedTuple

import numpy as np
from shapely import LineString

from splitcheck.copper.marks import Point
from splitcheck.loops.bridges import PartBridge
from splitcheck.planes.crossings import Crossing
from splitcheck.units import Floats

#: A way on the other side of the trace this many times longer than the best is not looked for.
OTHER_SIDE = 5.0


#: What 1 nH of a part is worth in length of a way, mm: a bridge 1 mm farther off, which is 2 mm
#: more of way, costs 0.5 to 0.7 nH (the field solves of the closed forms, gap open on one side).
MM_PER_NH = 2.0 / 0.6


class Way(NamedTuple):
    """One way for the return current from the entry of a crossing to its exit."""

    length_mm: float
    path: tuple[Point, ...]
    bridges: tuple[Point, ...]
    """Places of the plated holes it goes through; empty if it stays on the plane."""
    bridge_net: str
    bridge_layer: int
    """Layer of the island it borrows; 0 if it stays on the plane."""
    capacitors: tuple[PartBridge, ...] = ()
    """Capacitors and links that it goes over, each seen from where it comes."""

    @property
    def parts_nh(self) -> float:
        """What its capacitors add as mounted, nH."""
        return sum(part.mounted_nh for part in self.capacitors)

    @property
    def off_plane(self) -> tuple[Point, Point] | None:
        """Where it leaves the plane and comes back; None if it stays, or goes over more islands."""
        over = len(self.bridges) + len(self.capacitors)
        return (self.path[1], self.path[-2]) if 0 < over <= 2 else None

    @property
    def cost_mm(self) -> float:
        """Its length, and what its capacitors are worth in length, mm."""
        return self.length_mm + MM_PER_NH * self.parts_nh


@dataclass(frozen=True, slots=True)
class Route:
    """How the return current gets round a gap."""

    straight_mm: float
    left: Way | None
    """Best way that passes the gap on the left of the trace; None if there is none."""
    right: Way | None
    joined: bool
    """Whether anything joins the two sides: copper, plated holes, or capacitors."""

    @property
    def best(self) -> Way | None:
        """The shorter of the two ways, capacitors counted by what they are worth in length."""
        ways = [way for way in (self.left, self.right) if way is not None]
        return min(ways, key=lambda way: way.cost_mm) if ways else None

    @property
    def detour_mm(self) -> float | None:
        """What the best way is longer than the straight one, mm."""
        best = self.best
        return None if best is None else max(best.length_mm - self.straight_mm, 0.0)

    def reach_mm(self, way: Way | None) -> float:
        """How far along the gap a way must go before it can cross, mm; inf for none."""
        if way is None:
            return inf
        return max((way.length_mm - self.straight_mm) / 2, 0.0)


def heading(crossing: Crossing) -> tuple[float, float]:
    """Unit vector from the entry of a crossing to its exit."""
    dx = crossing.after[0] - crossing.before[0]
    dy = crossing.after[1] - crossing.before[1]
    length = float(np.hypot(dx, dy)) or 1.0
    return dx / length, dy / length


def wall(crossing: Crossing, side: int, across_mm: float = 0.0) -> LineString:
    """A wall from the middle of the run, or farther across, out to one side (1 left, -1 right)."""
    (dx, dy), (x, y) = heading(crossing), crossing.at
    ends = [(x - dy * far, y + dx * far) for far in (-across_mm * side, 2000.0 * side)]
    return LineString(ends)


def side_of(crossing: Crossing, a: Point, b: Point) -> int:
    """On which side of the trace the middle of two places lies: 1 left, -1 right."""
    (dx, dy), (x, y) = heading(crossing), crossing.at
    return 1 if ((a[1] + b[1]) / 2 - y) * dx - ((a[0] + b[0]) / 2 - x) * dy >= 0 else -1


def to_point(place: Floats) -> Point:
    """A row of an array as a point."""
    return float(place[0]), float(place[1])
