"""Crossings of a board to field solves: which gaps, traces, planes and bridges each one takes."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from math import isfinite

import numpy as np
import shapely
from shapely import LineString, MultiPolygon, Polygon
from shapely.ops import substring

from splitcheck.board.board import Board
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.loops import solve as engine
from splitcheck.loops.bridges import IslandGraph, PartBridge, bridges_between, parts_between
from splitcheck.loops.estimate import Inductance, via_pair_nh
from splitcheck.loops.mounted import BARREL_MM, LOWEST_MM, STRIP_MM
from splitcheck.loops.stray import stray_db
from splitcheck.loops.streams import Flow, flow_of, over_whole_plane
from splitcheck.loops.ways import Route, Way, to_point
from splitcheck.loops.windows import (
    ALONG_MM,
    Windows,
    along_rim,
    clipped,
    cut_ends,
    span_mm,
    windows_of,
)
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Gap, Plane, box_size_mm
from splitcheck.units import Floats

#: Crossings of one gap this near to one another are solved together, mm; and those no further
#: apart than so many of their detours, as they couple (by 0.3 of the lesser value at one of them,
#: K_10 of tests/loops/reference_coupling.csv), out to where one mesh can hardly serve both, mm ...
TOGETHER_MM = 4.0
TOGETHER_DETOURS = 1.2
TOGETHER_MOST_MM = 20.0
#: ... but not more of them at once.
MOST_TRACES = 40
#: A trace is solved with at least this many heights of it beyond either rim of its gap.
ENDS = 10.0
#: At most so many other gaps near the crossed one are looked at.
MOST_NEIGHBOURS = 12
#: A solve whose panels would have to be made coarser than this is worth less than a closed form.
MOST_COARSER = 3.0
#: Gaps with more corners than this in the window are not solved: the mesh would be too coarse.
MOST_CORNERS = 5000
#: Gaps smaller than the height do not matter unless this many heights near, or crossed.
NEAR_HEIGHTS = 2.0
#: So many of the nearest vias on either side of a gap are bridges, besides that of the way.
MOST_VIAS = 10
#: ... out to here, mm: farther off a part is of no use in 1 ns (S. Weir, si-list, 16 Oct 2008).
BRIDGES_MM = 25.0
#: A trace that a window cuts off ends so far inside it, mm.
ON_RIM_MM = 0.01
#: Width taken for copper that a way borrows on the trace's side, mm.
STRAP_MM = 1.0


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


@dataclass(frozen=True, slots=True)
class Field:
    """What the solve says of one crossing."""

    value: Inductance
    mutual_nh: tuple[tuple[int, float], ...]
    """Mutual added inductance with other crossings of the same gap, by their number: for currents
    that run the same way over the gap, whichever way the traces were drawn."""
    stray_db: float | None = None
    """How much more field a probe finds above the crossing; None under another plane."""


def can_solve(task: Task) -> bool:
    """Whether the solve sees the way that the return takes.

    A gap inside one island always has a way round in the plane. Where the islands are cut apart,
    the bridges carry all of the return: the solve then knows vias and capacitors to the plane
    beyond, capacitors from one island straight to the other, and nothing else well enough.
    """
    if task.crossing.islands[0] == task.crossing.islands[1]:
        return True
    best = task.route.best
    if best is None:
        return False
    if _is_straight(best):
        return any(_as_strap(task, part) for part in best.capacitors)
    return (
        len(best.bridges) + len(best.capacitors) == 2
        and task.beyond is not None
        and best.bridge_layer == task.beyond
    )


def _is_straight(way: Way) -> bool:
    """Whether a way goes over one part from the one island to the other."""
    return len(way.capacitors) == 1 and not way.bridges


def _stays(way: Way) -> bool:
    """Whether a way stays on the plane."""
    return not way.bridges and not way.capacitors


def _is_seen(task: Task, way: Way) -> bool:
    """Whether the solve knows what a way goes over.

    That is the plane itself, a part straight over the gap, two vias or parts to the plane beyond,
    or two vias to copper on the trace's side that is not the plane there.
    """
    if _stays(way) or _is_straight(way):
        return True
    if len(way.bridges) + len(way.capacitors) != 2:
        return False
    if way.bridge_layer == task.beyond:
        return True
    crossing = task.crossing
    on_side = (way.bridge_layer > crossing.plane) == (crossing.layer > crossing.plane)
    return on_side and not way.capacitors and way.bridge_layer != task.other


def _as_strap(task: Task, part: PartBridge) -> bool:
    """Whether a part stands on a side of the plane where nothing is between it and the plane."""
    plane, layer = task.crossing.plane, part.layer
    walls = [wall for wall in (task.beyond, task.other) if wall is not None]
    return not any(plane < wall <= layer or layer <= wall < plane for wall in walls)


def cluster(tasks: Sequence[Task]) -> tuple[tuple[Task, ...], ...]:
    """Put together crossings that one solve serves.

    They are over one gap, from one layer, under the same planes, and near one another. A trace that
    only passes by a gap is solved by itself: what it crosses nearby is not to be left out of the
    others.
    """
    groups: dict[tuple[object, ...], list[Task]] = defaultdict(list)
    for task in tasks:
        c = task.crossing
        alone = task.number + 1 if c.aside_mm else 0
        groups[c.plane, c.gap, c.layer, task.beyond or 0, task.other or 0, alone].append(task)
    clusters: list[tuple[Task, ...]] = []
    for _, members in sorted(groups.items()):
        clusters.extend(_near_one_another(members))
    return tuple(clusters)


def together_mm(detour_mm: float | None, detours: float = TOGETHER_DETOURS) -> float:
    """How far from a crossing others of its gap may be to be solved with it, mm.

    Examples
    --------
    >>> together_mm(None), together_mm(10.0), together_mm(100.0)
    (4.0, 12.0, 20.0)
    """
    return max(TOGETHER_MM, min(detours * (detour_mm or 0.0), TOGETHER_MOST_MM))


def _near_one_another(
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


class Fields:
    """The board as the solves see it; built once, asked for every cluster."""

    def __init__(self, board: Board, planes: dict[int, Plane], graph: IslandGraph) -> None:
        self.board = board
        self.planes = planes
        self.graph = graph
        self._foreign: dict[int, shapely.STRtree] = {}

    def solve(self, tasks: Sequence[Task]) -> dict[int, Field]:
        """Solve for crossings that belong together.

        Parameters
        ----------
        tasks
            A cluster.

        Returns
        -------
        Solved values by number of the crossing. Left out are those that the solve finds no way
        back for, because the way it would have to take leads over more layers than it knows, and
        those with more gaps round them than it can take.
        """
        first = tasks[0].crossing
        plane = self.planes[first.plane]
        traces = [_trace(task, plane.gaps[first.gap].shape) for task in tasks]
        bridges = self._bridges(tasks)
        solution = self._solution(tasks, traces, bridges)
        nearer = [] if solution is not None else _near_one_another(tasks, 0.0)
        if len(nearer) > 1:
            return {number: field for part in nearer for number, field in self.solve(part).items()}
        if solution is None:
            solution = self._solution(tasks, traces, bridges, narrow=True)
        if solution is None:
            return {}
        return {
            task.number: Field(
                Inductance(
                    task.part**2 * float(solution.added_nh[i, i]),
                    task.part**2 * float(solution.error_nh[i, i]),
                ),
                tuple(
                    (
                        other.number,
                        _same_way(task, other)
                        * (task.part * other.part * float(solution.added_nh[i, j])),
                    )
                    for j, other in enumerate(tasks)
                    if j != i and not solution.cut_off[j]
                ),
                _stray_db(task, solution, i, traces[i], bridges),
            )
            for i, task in enumerate(tasks)
            if not solution.cut_off[i] and isfinite(float(solution.added_nh[i, i]))
        }

    def flow(self, task: Task) -> Flow | None:
        """The return current of one crossing, solved by itself.

        Returns
        -------
        The flow; None where `solve` leaves the crossing out as well.
        """
        crossing = task.crossing
        traces = [_trace(task, self.planes[crossing.plane].gaps[crossing.gap].shape)]
        bridges = self._bridges([task])
        solution = self._solution([task], traces, bridges)
        if solution is None:
            solution = self._solution([task], traces, bridges, narrow=True)
        if solution is None:
            return None
        return flow_of(
            solution,
            0,
            traces,
            task.height_mm,
            beyond_mm=self._apart_mm(crossing.plane, task.beyond),
            above_mm=self._apart_mm(crossing.plane, task.other),
            bridges=bridges,
        )

    def undisturbed(self, task: Task) -> Flow:
        """The return current of the trace of a crossing, were the plane whole."""
        crossing = task.crossing
        trace = _trace(task, self.planes[crossing.plane].gaps[crossing.gap].shape)
        above_mm = self._apart_mm(crossing.plane, task.other)
        return over_whole_plane(trace, task.height_mm, above_mm)

    def _solution(
        self,
        tasks: Sequence[Task],
        traces: Sequence[engine.TraceOver],
        bridges: Sequence[engine.ViaBridge | engine.Strap],
        *,
        narrow: bool = False,
    ) -> engine.Solution | None:
        """One solve, looking no further than it must if `narrow`; None if gaps are too ragged."""
        plane = self.planes[tasks[0].crossing.plane]
        crossed = plane.gaps[tasks[0].crossing.gap]
        lines = [trace.line for trace in traces]
        cut = any(_parts_islands(task) for task in tasks)
        standing = bridges if cut else ()
        windows = _windows(tasks, crossed, standing, narrow=narrow)
        if windows is None:
            return None
        window = windows.outer
        # flux that a ragged gap lets through nearby finds ample room in the rest of it
        gaps, ends = self._gaps(tasks, windows, lines, loose=crossed.open or narrow)
        if _too_ragged(gaps):
            return None
        if cut:
            traces = [
                _within(trace, task, window) for trace, task in zip(traces, tasks, strict=True)
            ]
        try:
            return engine.added(
                gaps,
                traces,
                tasks[0].height_mm,
                beyond_mm=self._apart_mm(plane.layer, tasks[0].beyond),
                above_mm=self._apart_mm(plane.layer, tasks[0].other),
                bridges=bridges,
                outside=_outside(plane, window, cut=cut),
                ends=ends,
                disjoint=True,
                coarsest=MOST_COARSER,
                inner=None if window.contains(crossed.shape) else windows.half,
            )
        except SplitcheckError:
            return None

    def _apart_mm(self, plane: int, other: int | None) -> float | None:
        return None if other is None else self.board.stack.height_mm(plane, other)

    def _gaps(
        self,
        tasks: Sequence[Task],
        windows: Windows,
        lines: Sequence[LineString],
        *,
        loose: bool,
    ) -> tuple[list[Polygon], list[shapely.Point]]:
        """The crossed gap and uncrossed neighbours, in the window, foreign copper taken out.

        Returned with the places where the window cuts off what leads to the outside; the crossed
        gap does if it is `loose`.
        """
        window = windows.outer
        shapely.prepare(windows.beside)
        plane = self.planes[tasks[0].crossing.plane]
        across = shapely.union_all(lines)
        height = tasks[0].height_mm
        crossed = plane.gaps[tasks[0].crossing.gap]
        beside = []
        for number in sorted(plane.gap_boxes.intersection(windows.beside.bounds)):
            shape = plane.gaps[number].shape
            if shape is crossed.shape or not windows.beside.intersects(shape):
                continue
            apart = shape.distance(across)
            small = box_size_mm(shape) < height
            if apart == 0 or (small and apart > NEAR_HEIGHTS * height):
                continue
            beside.append((apart, number))
        chosen = [plane.gaps[number] for _, number in sorted(beside)[:MOST_NEIGHBOURS]]
        foreign = self._foreign_copper(plane, window)
        gaps: list[Polygon] = []
        ends: list[shapely.Point] = []
        for gap in (crossed, *chosen):
            inside = clipped(gap.shape, window)
            if _too_ragged(_polygons(inside)):
                # foreign copper in it only adds corners; taking it out would be in vain
                return _polygons(inside), []
            free = shapely.difference(inside, foreign)
            pieces = _polygons(free)
            if gap is not crossed and _too_ragged([*gaps, *pieces]):
                break
            gaps.extend(pieces)
            if loose if gap is crossed else gap.open:
                ends.extend(cut_ends(pieces, window))
        return gaps, ends

    def _foreign_copper(self, plane: Plane, window: Polygon) -> shapely.Geometry:
        """Copper of the plane's layer that carries no return: no flux goes through it either."""
        if plane.layer not in self._foreign:
            islands = {island.part for island in plane.islands}
            self._foreign[plane.layer] = shapely.STRtree(
                [
                    part.shape
                    for part in self.board.parts
                    if part.layer == plane.layer and part.id not in islands
                ]
            )
        tree = self._foreign[plane.layer]
        # pieces of copper do not touch one another, so that they are a multipolygon as they stand
        return MultiPolygon(list(tree.geometries[np.sort(tree.query(window))]))

    def _bridges(self, tasks: Sequence[Task]) -> list[engine.ViaBridge | engine.Strap]:
        """Bridges that the ways round can take: vias and parts to the plane beyond, or straps.

        A plane on the trace's other side is in the solve already and needs no strap.
        """
        crossing = tasks[0].crossing
        vias: dict[Point, engine.ViaBridge] = {}
        straps: dict[tuple[Point, ...], engine.Strap] = {}
        for task in tasks:
            for way in (task.route.left, task.route.right):
                if way is None or not _is_seen(task, way) or _stays(way):
                    continue
                if _is_straight(way):
                    straps.update(self._straight_straps(task))
                elif way.bridge_layer == task.beyond:
                    vias.update(self._vias_like(task, way))
                else:
                    straps[way.bridges] = self._strap(crossing, way.bridges, way.bridge_layer)
        return [
            *(strap for _, strap in sorted(straps.items())),
            *(via for _, via in sorted(vias.items())),
        ]

    def _vias_like(self, task: Task, way: Way) -> dict[Point, engine.ViaBridge]:
        """The vias and parts of a way and the nearest others that join the same islands."""
        crossing = task.crossing
        plane = self.planes[crossing.plane]
        borrowed = {
            island.id
            for island in self.planes[way.bridge_layer].islands
            if island.net_name == way.bridge_net
        }
        found: dict[Point, engine.ViaBridge] = {}
        for number, at in zip(crossing.islands, (crossing.before, crossing.after), strict=True):
            island = plane.islands[number].id
            for other in sorted(borrowed):
                places = bridges_between(self.graph, island, other)
                for i in _nearest(places, at, way.bridges):
                    wide_mm = float(self.graph.edges[island, other]["wide_mm"][i])
                    found.setdefault(to_point(places[i]), _via(places[i], wide_mm))
                parts = parts_between(self.graph, island, other)
                places = np.array([part.at_one for part in parts]).reshape(-1, 2)
                for i in _nearest(places, at, [part.at_one for part in way.capacitors]):
                    found.setdefault(
                        to_point(places[i]), _via(places[i], BARREL_MM, parts[i].mounted_nh)
                    )
        return found

    def _straight_straps(self, task: Task) -> dict[tuple[Point, ...], engine.Strap]:
        """The parts from one island straight to the other that are nearest to the crossing."""
        crossing = task.crossing
        one, other = (self.planes[crossing.plane].islands[i].id for i in crossing.islands)
        parts = [part for part in parts_between(self.graph, one, other) if _as_strap(task, part)]
        far = [
            float(np.hypot(part.at[0] - crossing.at[0], part.at[1] - crossing.at[1]))
            for part in parts
        ]
        found: dict[tuple[Point, ...], engine.Strap] = {}
        for i in np.argsort(far, kind="stable")[:MOST_VIAS].tolist():
            if far[i] > max(BRIDGES_MM, min(far)):
                break
            part = parts[i]
            apart = (
                0.0
                if part.layer == crossing.plane
                else self.board.stack.height_mm(crossing.plane, part.layer)
            )
            ends = (part.at_one, part.at_other)
            found[ends] = engine.Strap(
                LineString(ends), STRIP_MM, max(apart, LOWEST_MM), part.mounted_nh
            )
        return found

    def _strap(self, crossing: Crossing, ends: tuple[Point, ...], layer: int) -> engine.Strap:
        """A way over copper on the trace's side of the plane."""
        height = self.board.stack.height_mm(crossing.plane, layer)
        line = LineString(ends)
        return engine.Strap(line, STRAP_MM, height, via_pair_nh(line.length, BARREL_MM, height))


def _same_way(one: Task, other: Task) -> float:
    """1 if two traces are drawn the same way over their gap, -1 if they run against one another."""
    ahead = [np.subtract(task.crossing.after, task.crossing.before) for task in (one, other)]
    return 1.0 if float(ahead[0] @ ahead[1]) >= 0.0 else -1.0


def _nearest(places: Floats, at: Point, always: Sequence[Point]) -> list[int]:
    """Rows of the places nearest to one, within reach, and of some that are always wanted."""
    far = np.hypot(*(places - np.asarray(at)).T)
    order = np.argsort(far, kind="stable")[:MOST_VIAS]
    wanted = np.flatnonzero([tuple(place) in always for place in places.tolist()])
    return sorted({*order[far[order] <= BRIDGES_MM].tolist(), *wanted.tolist()})


def _feet(bridge: engine.ViaBridge | engine.Strap) -> Floats:
    """Where a bridge stands on the plane, shape (n, 2)."""
    shape = bridge.at if isinstance(bridge, engine.ViaBridge) else bridge.line
    return shapely.get_coordinates(shape)


def _via(place: Floats, wide_mm: float, mounted_nh: float = 0.0) -> engine.ViaBridge:
    return engine.ViaBridge(shapely.Point(place), wide_mm, mounted_nh)


def _stray_db(
    task: Task,
    solution: engine.Solution,
    number: int,
    trace: engine.TraceOver,
    bridges: Sequence[engine.ViaBridge | engine.Strap],
) -> float | None:
    """Field above the crossing, unless a plane on the trace's side, whole or not, is in between."""
    if task.other is not None or task.part < 1.0:
        return None
    at = task.crossing.at
    return stray_db(solution, number, trace, task.height_mm, at, bridges=bridges)


def _within(trace: engine.TraceOver, task: Task, window: Polygon) -> engine.TraceOver:
    """The stretch of a trace round its run that lies in the window."""
    inside = shapely.intersection(trace.line, window.buffer(-ON_RIM_MM, join_style="mitre"))
    pieces = [piece for piece in shapely.get_parts(inside) if isinstance(piece, LineString)]
    run = shapely.Point(task.crossing.at)
    line = min(pieces, key=lambda piece: piece.distance(run), default=trace.line)
    return engine.TraceOver(line, trace.width_mm)


def _parts_islands(task: Task) -> bool:
    one, other = task.crossing.islands
    return one != other


def _outside(plane: Plane, window: Polygon, *, cut: bool) -> Polygon | None:
    """What the plane's layer may hold copper in, if the window looks beyond it.

    Where the gap cuts islands apart it ends with the window: else the copper that the solve takes
    to be beyond the window would join them.
    """
    if not plane.gaps or not plane.gaps[0].open:
        return window if cut else None
    frame: Polygon = shapely.box(*plane.gaps[0].shape.bounds)
    if cut:
        inside = shapely.intersection(frame, window)
        return inside if isinstance(inside, Polygon) else window
    return None if frame.contains_properly(window) else frame


def _too_ragged(gaps: Sequence[Polygon]) -> bool:
    return sum(int(shapely.get_num_coordinates(gap)) for gap in gaps) > MOST_CORNERS


def _windows(
    tasks: Sequence[Task],
    gap: Gap,
    bridges: Sequence[engine.ViaBridge | engine.Strap],
    *,
    narrow: bool,
) -> Windows | None:
    """How far a solve looks: at the crossings, some bridges, and the ways round that it sees.

    In place of a way that it does not see it takes that along the rim, if it is not too long.
    None if a crossing has neither: a window would close the gap where nothing does.
    """
    points = [point for task in tasks for point in task.crossing.path]
    points.extend(to_point(at) for bridge in bridges for at in _feet(bridge))
    one_sided = False
    for task in tasks:
        found = [way for way in (task.route.left, task.route.right) if way is not None]
        seen = [way for way in found if _is_seen(task, way)]
        points.extend(point for way in seen for point in way.path)
        # flux goes on beyond a bridge as long as the gap does, for no bridge is a short circuit
        held = seen if _parts_islands(task) or narrow else [way for way in seen if _stays(way)]
        all_held = len(held) == len(found)
        along = [] if narrow or all_held else _along_rim(task, gap)
        hulls = (shapely.get_coordinates(way.convex_hull) for way in along)
        points.extend(to_point(at) for hull in hulls for at in hull)
        if not seen and not along:
            return None
        one_sided |= len(found) < 2 or not (all_held or len(along) == 2)
    shut = tasks[0].beyond is not None or tasks[0].other is not None
    return windows_of(
        points, gap, tasks[0].height_mm, one_sided=one_sided, shut=shut, narrow=narrow
    )


def _along_rim(task: Task, gap: Gap) -> list[LineString]:
    """The ways along the rim of a gap that are not too long."""
    path = task.crossing.path
    ways = along_rim(gap.shape, path[0], path[-1])
    return [way for way in ways if span_mm(way) <= ALONG_MM]


def _trace(task: Task, gap: Polygon) -> engine.TraceOver:
    """The trace over its runs and on either side of them.

    Where it comes over the same gap again in a run that is judged by itself, it is cut short. A
    short end goes straight on, if on copper: the source of a trace that ends right at the rim
    would be that of its end, not of its length.
    """
    points: list[Point] = [(x, y) for x, y in _own_stretch(task, gap).coords]
    for ahead in (False, True):
        ends = points if ahead else points[::-1]
        missing = ENDS * task.height_mm - _beyond_rim_mm(task.crossing, ends)
        step = np.subtract(ends[-1], ends[-2])
        length = float(np.hypot(*step))
        if missing <= 0 or length <= 0:
            continue
        x, y = np.asarray(ends[-1]) + step / length * missing
        end = (float(x), float(y))
        if not LineString([ends[-1], end]).intersects(gap):
            points = [*points, end] if ahead else [end, *points]
    return engine.TraceOver(LineString(points), task.crossing.width_mm)


def _own_stretch(task: Task, gap: Polygon) -> LineString:
    """The stretch of a crossing up to where it would count another finding's run."""
    stretch = LineString(task.crossing.stretch)
    own = shapely.union_all([LineString(path) for path in task.runs])
    bare = shapely.intersection(stretch, gap)
    mine: list[tuple[float, float]] = []
    others: list[tuple[float, float]] = []
    for part in getattr(bare, "geoms", [bare]):
        if part.geom_type != "LineString" or part.is_empty:
            continue
        ends = sorted(
            stretch.project(shapely.Point(end)) for end in (part.coords[0], part.coords[-1])
        )
        is_own = shapely.dwithin(part.interpolate(0.5, normalized=True), own, 1e-3)
        (mine if is_own else others).append((ends[0], ends[1]))
    if not mine or not others:
        return stretch
    first, last = min(start for start, _ in mine), max(stop for _, stop in mine)
    before = max((stop for _, stop in others if stop <= first + 1e-6), default=None)
    after = min((start for start, _ in others if start >= last - 1e-6), default=None)
    room = 3 * task.height_mm
    start = 0.0 if before is None else min(before + room, (before + first) / 2)
    stop = stretch.length if after is None else max(after - room, (after + last) / 2)
    cut = substring(stretch, start, stop)
    return cut if isinstance(cut, LineString) else stretch


def _beyond_rim_mm(crossing: Crossing, ends: Sequence[Point]) -> float:
    """Length of the trace from the rim of the gap to the last of its points, mm."""
    line = LineString(ends)
    rims = (line.project(shapely.Point(rim)) for rim in (crossing.path[0], crossing.path[-1]))
    return float(line.length - max(rims))


def _polygons(shape: shapely.Geometry) -> list[Polygon]:
    parts = getattr(shape, "geoms", [shape])
    return [part for part in parts if isinstance(part, Polygon) and part.area > 1e-9] + [
        inner for part in parts if isinstance(part, MultiPolygon) for inner in _polygons(part)
    ]
