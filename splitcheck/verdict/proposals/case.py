"""A finding to be mended, and what a mend of it is worth: by the same road in a changed scene."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from math import hypot
from typing import NamedTuple

import networkx as nx
import numpy as np
import shapely
from shapely.ops import nearest_points

from splitcheck.loops.bridges import joined_by_copper, over_parts
from splitcheck.loops.terrain import Terrain
from splitcheck.planes.crossings import BareTrace, Crossing, find_crossings
from splitcheck.planes.edges import EdgeRun
from splitcheck.planes.islands import Island, Plane
from splitcheck.planes.tracks import Tracks, redrawn
from splitcheck.units import segments
from splitcheck.verdict.bare import OWN_END_MM, bare_findings
from splitcheck.verdict.findings import Finding, Miss, Point, Proposal
from splitcheck.verdict.judge import value_again, value_together
from splitcheck.verdict.plane_changes import Case as Change
from splitcheck.verdict.proposals.room import Room
from splitcheck.verdict.scene import Scene, Weighed
from splitcheck.verdict.score import level

#: A gap this many heights beside a trace still adds something (5 h: 0.002 nH for 4 mm).
BESIDE_HEIGHTS = 5.0
#: A proposal must take away at least this share of what the finding adds.
LEAST_GAIN = 0.05
#: More of a kind (two capacitors for one) must take away this share of what the fewer leave.
LEAST_MORE = 0.1


class Worth(NamedTuple):
    """What is left of a finding."""

    added_nh: float
    error_nh: float
    noise_mv: float


NOTHING = Worth(0.0, 0.0, 0.0)


@dataclass(frozen=True, slots=True)
class Case:
    """A finding with all that is needed to mend it."""

    scene: Scene
    room: Room
    finding: Finding
    net: int
    tracks: Tracks
    """The traces of its net on its layer."""
    item: Weighed | None
    """The crossing behind it, if it is one."""
    change: Change | None = None
    """The change of planes behind it, if it is one."""
    beside: tuple[Crossing, ...] = ()
    """Crossings of other traces over the same gap."""
    neighbours: tuple[tuple[Finding, Weighed], ...] = ()
    """The findings that these crossings are, with what is behind each."""
    all_tracks: Tracks | None = None
    """The traces of all nets on its layer."""
    before: tuple[tuple[Crossing, ...], tuple[BareTrace, ...]] = ((), ())
    """What the net's traces on the layer cross, and where they are bare, as the board is."""
    edges: tuple[EdgeRun, ...] = ()
    """Where they run along edges of planes, if the finding is such a run."""

    @property
    def crossing(self) -> Crossing:
        """The crossing behind it."""
        assert self.item is not None
        return self.item.crossing

    @property
    def plane(self) -> Plane:
        """The broken plane."""
        return self.scene.planes[self.crossing.plane]

    @property
    def islands(self) -> tuple[Island, Island]:
        """Where the return leaves, and where it must arrive."""
        one, other = self.crossing.islands
        return self.plane.islands[one], self.plane.islands[other]

    def of_neighbours(self) -> Iterator[Case]:
        """The findings of the other nets that cross the gap nearby, each as a case of its own."""
        assert self.all_tracks is not None
        for finding, item in self.neighbours:
            net = item.crossing.net
            tracks = redrawn(self.all_tracks, net)
            before = find_crossings(tracks, tuple(self.scene.planes.values()))
            yield Case(self.scene, self.room, finding, net, tracks, item, before=before)

    def island(self, name: str) -> Island:
        """The island of an id."""
        found: Island = self.scene.graph.nodes[name]["island"]
        return found

    def is_enough(self, worth: Worth | None) -> bool:
        """Whether what is left is no more than a note."""
        if worth is None:
            return False
        drive = self.scene.drive_of(self.net)
        return level(worth.noise_mv, drive, worth.added_nh) == "note"

    def bare_spans(self) -> list[tuple[Point, Point]]:
        """Stretches of the net's traces on its layer with no plane at all."""
        told = [t for t in self.before[1] if not t.leaves and t.bare_mm >= OWN_END_MM]
        return [span for trace in told for span in trace.spans]

    def layer_name(self, number: int) -> str:
        """What the report calls a layer."""
        return self.scene.board.stack.layers[number - 1].name

    def proposal(
        self, what: str, at_mm: Sequence[Point], words: str, worth: Worth | None
    ) -> Proposal | Miss:
        """The proposal if it gains enough, else how little it gains."""
        if worth is None:
            lost = "what was tried leaves no way back"
            return Miss(what, lost)  # type: ignore[arg-type]  # as below
        before = self.finding.added_nh
        if before is not None and worth.added_nh > (1.0 - LEAST_GAIN) * before:
            share = 1.0 - worth.added_nh / before if before else 0.0
            return Miss(what, "takes away too little", share)  # type: ignore[arg-type]  # as below
        return Proposal(
            what=what,  # type: ignore[arg-type]  # a word of Proposal, from this package alone
            at_mm=tuple((round(x, 4), round(y, 4)) for x, y in at_mm),
            words=words,
            added_nh=worth.added_nh,
            error_nh=worth.error_nh,
            noise_mv=worth.noise_mv,
            isolation=self._may_isolate(),
        )

    def _may_isolate(self) -> bool:
        """Whether the two sides share no net and nothing bridges them, not even a capacitor."""
        if len(self.finding.islands) < 2:
            return False
        one, other = (self.island(name) for name in self.finding.islands[:2])
        if one.net_name == other.net_name:
            return False
        if joined_by_copper(self.scene.graph, one.id, other.id):
            return False
        parts = over_parts(self.scene.graph)
        both = nx.compose(nx.Graph(self.scene.graph.edges), nx.Graph(parts.edges))
        return not (one.id in both and other.id in both and nx.has_path(both, one.id, other.id))


def telling(misses: Sequence[Miss]) -> Sequence[Miss]:
    """Of what failed one after the other, each asking less: what was valued, else the last."""
    return [miss for miss in misses if miss.share is not None] or misses[-1:]


def with_plane(scene: Scene, plane: Plane) -> Scene:
    """The scene with one plane in place of another of its layer."""
    return replace(
        scene,
        planes={**scene.planes, plane.layer: plane},
        terrains={**scene.terrains, plane.layer: Terrain(plane)},
    )


def worth_of(
    scene: Scene, crossings: Sequence[Crossing], with_them: Sequence[Crossing] = ()
) -> Worth | None:
    """What some crossings add; None if one has no way back. Others are solved with them."""
    values = value_again(scene, crossings, with_them)
    known = [Worth(v[0].added_nh, v[0].error_nh, v[1]) for v in values if v is not None]
    return together(known) if len(known) == len(values) else None


class Shared(NamedTuple):
    """What is left of a finding, and of all that cross its gap nearby."""

    own: Worth | None
    """None: no way back."""
    all_nh: float | None
    """The sum over all of them, nH; None if one of them has no way back."""
    words: str
    """The sum in words; empty where no other net crosses the gap nearby."""

    def gains_on(self, other: Shared) -> bool:
        """Whether more of a kind is worth it: for the net itself, or for all of them together."""
        if self.own is None or other.own is None:
            return self.own is not None
        if self.own.added_nh <= (1.0 - LEAST_MORE) * other.own.added_nh:
            return True
        if self.all_nh is None or other.all_nh is None:
            return self.all_nh is not None
        return self.all_nh <= (1.0 - LEAST_MORE) * other.all_nh


def best_of(tried: Iterable[Shared]) -> Shared | None:
    """The one that leaves least; None if none has a way back."""
    known = [(each.own.added_nh, each) for each in tried if each.own is not None]
    return min(known, key=lambda pair: pair[0], default=(0.0, None))[1]


def worth_with_neighbours(case: Case, scene: Scene) -> Shared:
    """What a finding adds in a changed scene, and what all nets over its gap add there."""
    assert case.item is not None
    values = value_together(scene, [*case.item.runs, *case.beside])
    own = [(value, mv) for crossing, value, mv in values if crossing in case.item.runs]
    if any(value is None for value, _ in own):
        return Shared(None, None, "")
    worth = together([Worth(v.added_nh, v.error_nh, mv or 0.0) for v, mv in own if v is not None])
    others = [None if v is None else v.added_nh for c, v, _ in values if c not in case.item.runs]
    known = [added for added in others if added is not None]
    all_nh = worth.added_nh + sum(known) if len(known) == len(others) else None
    return Shared(worth, all_nh, with_all(case, [worth.added_nh, *others]))


def with_all(case: Case, left_nh: Sequence[float | None]) -> str:
    """What is left for all nets over a gap, in words that follow those of a proposal."""
    if not case.neighbours:
        return ""
    many = len(case.neighbours)
    said = f"; with the {many} other nets" if many > 1 else "; with the other net"
    said += " near it over this gap"
    before = [finding.added_nh for finding in (case.finding, *(f for f, _ in case.neighbours))]
    lost = sum(1 for added in left_nh if added is None)
    left = sum(added for added in left_nh if added is not None)
    if lost:
        return f"{said} {left:.2f} nH left, and {lost} still without a way back"
    was_lost = sum(1 for added in before if added is None)
    if was_lost:
        return f"{said} {left:.2f} nH left, where {was_lost} had no way back"
    return f"{said} {left:.2f} nH left of {sum(added or 0.0 for added in before):.2f}"


def together(parts: Sequence[Worth]) -> Worth:
    """The sum of several places on one net."""
    columns = zip(NOTHING, *parts, strict=True)
    return Worth(*(float(sum(column)) for column in columns))


def worth_of_findings(findings: Sequence[Finding]) -> Worth:
    """What findings of some other kind add, as they would be told."""
    return together(
        [Worth(f.added_nh or 0.0, f.error_nh or 0.0, f.noise_mv or 0.0) for f in findings]
    )


def worth_after(case: Case, scene: Scene, tracks: Tracks, where: shapely.Geometry) -> Worth | None:
    """What the net adds in a changed scene, in place of the finding.

    Parameters
    ----------
    case
        The finding.
    scene
        The scene as changed.
    tracks
        The traces of the net on the layer as changed.
    where
        What was mended, mm: the traces there are looked at for gaps right beside them.

    Returns
    -------
    The finding's share of what is left: crossings that were not there before, and gaps beside the
    trace where it no longer crosses them; None if one has no way back.
    """
    after = find_crossings(tracks, tuple(scene.planes.values()))
    known = {(c.plane, c.path) for c in case.before[0]}
    new = [c for c in after[0] if (c.plane, c.path) not in known or _is_of(case, c)]
    added = worth_of(scene, new)
    bare = _bare_worth(scene, after[1])
    if added is None:
        return None
    beside = NOTHING
    if case.item is not None:
        old = _bare_worth(case.scene, case.before[1])
        bare = bare if bare.added_nh > old.added_nh + 1e-9 else NOTHING
        if not any(shapely.dwithin(where, shapely.LineString(c.path), 0.5) for c in new):
            beside = beside_worth(scene, case.item, tracks, where)
    return together([added, bare, beside])


def _is_of(case: Case, crossing: Crossing) -> bool:
    """Whether a crossing is one of the runs that the finding stands for."""
    if case.item is None:
        return False
    return any(run.plane == crossing.plane and run.path == crossing.path for run in case.item.runs)


def _bare_worth(scene: Scene, bare: Sequence[BareTrace]) -> Worth:
    """What the runs without any plane add."""
    return worth_of_findings(bare_findings(scene, bare, defaultdict(int)))


def beside_worth(scene: Scene, item: Weighed, tracks: Tracks, where: shapely.Geometry) -> Worth:
    """What gaps right beside a trace add that no longer crosses them, by the field solve.

    The centre line being over copper, the road finds no crossing there; a narrow strip of copper
    under a trace is still no plane.
    """
    crossing = item.crossing
    plane = scene.planes[crossing.plane]
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    lines = segments(np.stack([tracks.start, tracks.end], axis=1))
    near = [line for line in lines.tolist() if line.distance(where) < 1e-3]
    best: tuple[float, int, shapely.LineString] | None = None
    for number in sorted(
        plane.gap_boxes.intersection(
            shapely.bounds(shapely.buffer(where, BESIDE_HEIGHTS * height)).tolist()
        )
    ):
        gap = plane.gaps[number].shape
        for line in near:
            far = gap.distance(line)
            if 0 < far < BESIDE_HEIGHTS * height and (best is None or far < best[0]):
                best = (far, number, line)
    if best is None:
        return NOTHING
    _, number, line = best
    along = line.project(nearest_points(line, plane.gaps[number].shape)[0])
    return _value_beside(scene, item, number, line, along)


def _value_beside(
    scene: Scene, item: Weighed, gap: int, line: shapely.LineString, along: float
) -> Worth:
    half = max(item.crossing.run_mm / 2, 0.1)
    ends = [line.interpolate(min(max(along + s, 0.0), line.length)) for s in (-half, half)]
    (x0, y0), (x1, y1) = ((end.x, end.y) for end in ends)
    if hypot(x1 - x0, y1 - y0) < 1e-3:
        return NOTHING
    plane = scene.planes[item.crossing.plane]
    island = int(plane.island_at(np.array([(x0 + x1) / 2]), np.array([(y0 + y1) / 2]))[0])
    if island < 0:
        return NOTHING
    made = replace(
        item.crossing,
        gap=gap,
        path=((x0, y0), (x1, y1)),
        stretch=tuple((float(x), float(y)) for x, y in line.coords),
        before=(x0, y0),
        after=(x1, y1),
        islands=(island, island),
        run_mm=hypot(x1 - x0, y1 - y0),
    )
    found = value_again(scene, [made], all_of_them=True)
    if not found or found[0] is None:
        return NOTHING
    value, noise = found[0]
    return Worth(max(value.added_nh, 0.0), value.error_nh, noise)
