"""One finding in, all that a picture of it shows: gap, trace, ways round, return current."""

from __future__ import annotations

from collections.abc import Sequence
from math import log10
from typing import TypeAlias

import numpy as np
import shapely
from shapely import LineString, Polygon

from splitcheck.loops.corner import impedance_ohm, ways
from splitcheck.loops.fields import Fields
from splitcheck.loops.sheet import Stream, stream_lines
from splitcheck.loops.streams import Flow, without_gaps
from splitcheck.loops.tasks import Task, can_solve
from splitcheck.loops.ways import Route, Way
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane, box_size_mm
from splitcheck.planes.tracks import Tracks
from splitcheck.verdict.boardmap import line_of, rounded_box, shapes_of
from splitcheck.verdict.findings import Finding, Method
from splitcheck.verdict.scene import Scene, Weighed
from splitcheck.verdict.views import (
    FindingView,
    ImpedanceView,
    Line,
    Shape,
    StreamView,
    TraceView,
    WayView,
)

#: A window reaches this much beyond what it must show: as a share of that, in heights, and in mm.
ROOM, ROOM_HEIGHTS, ROOM_MM = 0.35, 6.0, 0.8
#: A second way this many times longer than the first is not made room for.
OTHER_WAY = 2.5
#: What is smaller than this share of the window is drawn no better.
SEEN = 1 / 700
#: Into how many lines the return current is parted.
LINES = 20
#: Small gaps that lines are led round: at most so many, each at least this share of the window.
MOST_OBSTACLES, LEAST_OBSTACLE = 60, 1 / 60
#: Corners of stream lines are cut so often, for the eye.
_ROUNDED = 2
#: Frequencies of the impedance, kHz: first, last, and how many a decade.
FIRST_KHZ, LAST_KHZ, A_DECADE = 1.0, 1e6, 4

#: Questions and answers.
Facts: TypeAlias = tuple[tuple[str, str], ...]


class Closeups:
    """The board as pictures of findings see it; built once, asked for every finding."""

    def __init__(self, scene: Scene, tracks: Sequence[Tracks], fields: Fields) -> None:
        self.scene = scene
        self.fields = fields
        self.tracks = {layer.layer: layer for layer in tracks}
        self._trees: dict[int, shapely.STRtree] = {}

    def of(self, finding: Finding, item: Weighed, *, streams: bool) -> FindingView:
        """Draw a finding.

        Parameters
        ----------
        finding, item
            The finding and the crossing behind it.
        streams
            Whether to look for the lines of the return current, which takes about a second.
        """
        crossing = item.crossing
        plane = self.scene.planes[crossing.plane]
        height_mm = self.scene.board.stack.height_mm(crossing.layer, crossing.plane)
        window = _window(item, height_mm)
        fine = SEEN * box_size_mm(window)
        missing = self._missing(plane, window, fine)
        gap = plane.gaps[crossing.gap]
        crossed: list[shapely.Geometry] = [shapely.clip_by_rect(gap.shape, *window.bounds)]
        if gap.open:
            crossed = [shapely.union_all([*crossed, _beyond(plane, window)])]
        own, others = self._traces(finding, crossing, window)
        whole = broken = None
        if streams:
            whole, broken = self._streams(item, height_mm, window)
        return FindingView(
            id=finding.id,
            window_mm=rounded_box(window.bounds),
            gaps=shapes_of(missing, fine),
            crossed=shapes_of(crossed, fine),
            foreign=self._foreign(plane, window, fine),
            islands=_names(plane, crossing, window),
            runs=tuple(line_of(run.path) for run in item.runs),
            own=own,
            others=others,
            ways=_ways(item.route),
            whole=whole,
            broken=broken,
            impedance=self._impedance(finding, item, height_mm),
            fed_mm=_fed(broken, item, window),
            facts=self._facts(finding, item, height_mm),
        )

    def _missing(self, plane: Plane, window: Polygon, fine: float) -> list[shapely.Geometry]:
        """Gaps of the plane in the window, as far as they can be seen."""
        near = sorted(plane.gap_boxes.intersection(window.bounds))
        shapes = [
            shape for shape in (plane.gaps[k].shape for k in near) if box_size_mm(shape) > fine
        ]
        clipped = shapely.clip_by_rect(np.array(shapes, dtype=object), *window.bounds)
        return [part for part in [*clipped, _beyond(plane, window)] if not part.is_empty]

    def _foreign(self, plane: Plane, window: Polygon, fine: float) -> tuple[Shape, ...]:
        """Copper of the plane's layer that carries no return, in the window."""
        if plane.layer not in self._trees:
            islands = {island.part for island in plane.islands}
            own = [p for p in self.scene.board.parts if p.layer == plane.layer]
            self._trees[plane.layer] = shapely.STRtree(
                [part.shape for part in own if part.id not in islands]
            )
        tree = self._trees[plane.layer]
        pieces = tree.geometries[np.sort(tree.query(window))]
        return shapes_of(list(shapely.clip_by_rect(pieces, *window.bounds)), fine)

    def _traces(
        self, finding: Finding, crossing: Crossing, window: Polygon
    ) -> tuple[tuple[TraceView, ...], tuple[TraceView, ...]]:
        """The net's own traces in the window, and those of the nets that share the gap."""
        layer = self.tracks.get(crossing.layer)
        names = {share.net for share in finding.shares_gap_with}
        nets = self.scene.board.nets
        own: list[TraceView] = []
        others: list[TraceView] = []
        if layer is None or not len(layer.net):
            return (), ()
        ends = np.stack([layer.start, layer.end], axis=1)
        lines = shapely.linestrings(ends)
        near = np.flatnonzero(shapely.intersects(lines, window))
        groups: dict[tuple[int, float], list[int]] = {}
        for piece in near.tolist():
            key = (int(layer.net[piece]), float(layer.width_mm[piece]))
            groups.setdefault(key, []).append(piece)
        for (net, width_mm), pieces in sorted(groups.items()):
            name = nets[net].name
            if net != crossing.net and name not in names:
                continue
            merged = shapely.line_merge(shapely.multilinestrings(ends[pieces]))
            for part in shapely.get_parts(shapely.clip_by_rect(merged, *window.bounds)):
                view = TraceView(name, line_of(part.coords), round(width_mm, 4))
                (own if net == crossing.net else others).append(view)
        return tuple(own), tuple(others)

    def _streams(
        self,
        item: Weighed,
        height_mm: float,
        window: Polygon,
    ) -> tuple[StreamView | None, StreamView | None]:
        """Lines of the return current, were the plane whole and as it is."""
        paths = tuple(run.path for run in item.runs)
        task = Task(
            0, item.crossing, item.route, paths, height_mm, item.beyond, item.other,
            stitches=item.stitches,
        )  # fmt: skip
        flow = self.fields.flow(task) if can_solve(task) else None
        alone = self.fields.undisturbed(task) if flow is None else without_gaps(flow)
        around = _around(alone, window)
        whole = _drawn(stream_lines(alone, around, LINES, focus=window), window, (), ())
        if flow is None:
            return whole, None
        around = _around(flow, window)
        size = box_size_mm(window)
        missing = self._missing(self.scene.planes[item.crossing.plane], around, SEEN * size)
        parts = [p for p in shapely.get_parts(missing) if isinstance(p, Polygon)]
        seen = [p for p in parts if box_size_mm(p) > LEAST_OBSTACLE * size]
        seen = sorted(seen, key=lambda part: (-part.area, part.bounds))[:MOST_OBSTACLES]
        plain = shapely.get_parts(shapely.simplify(np.array(seen, dtype=object), SEEN * size))
        hard = [*flow.gaps, *(part for part in plain if isinstance(part, Polygon))]
        broken = stream_lines(flow, around, LINES, obstacles=hard, focus=window)
        vias = tuple(
            ((round(float(x), 4), round(float(y), 4)), round(abs(float(amps)), 4))
            for (x, y), amps in zip(flow.via_at, flow.via_a, strict=True)
            if abs(amps) > 0.005
        )
        return whole, _drawn(broken, window, hard, vias)

    def _impedance(self, finding: Finding, item: Weighed, height_mm: float) -> ImpedanceView | None:
        """Impedance of both ways; None where no number was solved."""
        if finding.added_nh is None or finding.detour_mm is None or finding.added_nh <= 0:
            return None
        if item.crossing.aside_mm:
            return None  # there is no other way round
        copper_um = self.scene.board.stack.layers[item.crossing.plane - 1].copper_um
        direct, detour = ways(
            item.route.straight_mm,
            finding.detour_mm,
            finding.added_nh,
            height_mm=height_mm,
            width_mm=item.crossing.width_mm,
            copper_um=copper_um,
        )
        steps = round(log10(LAST_KHZ / FIRST_KHZ) * A_DECADE)
        khz = tuple(round(FIRST_KHZ * 10 ** (step / A_DECADE), 3) for step in range(steps + 1))
        ghz = [value / 1e6 for value in khz]
        return ImpedanceView(
            khz,
            tuple(float(f"{z:.3g}") for z in impedance_ohm(direct, ghz, copper_um)),
            tuple(float(f"{z:.3g}") for z in impedance_ohm(detour, ghz, copper_um)),
            finding.corner_khz,
        )

    def _facts(self, finding: Finding, item: Weighed, height_mm: float) -> Facts:
        """Why it was taken for a crossing, as question and answer."""
        stack, crossing = self.scene.board.stack, item.crossing
        names = [layer.name for layer in stack.layers]
        own = names[crossing.plane - 1]
        plane = self.scene.planes[crossing.plane]
        gap = plane.gaps[crossing.gap].id
        (x0, y0), (x1, y1) = crossing.path[0], crossing.path[-1]
        nearest = f"{own}, {height_mm:.3f} mm from the trace: the nearest before and after the gap"
        where = f"from ({x0:.2f}, {y0:.2f}) to ({x1:.2f}, {y1:.2f})"
        missing = f"{where}: {item.bare_mm:.2f} mm without {own} beneath, over gap {gap}"
        way = _way_in_words(item.route, names)
        if crossing.aside_mm:
            missing = f"{where}: gap {gap} lies {crossing.aside_mm:.2f} mm beside the centre line"
            way = "none is needed: the return is crowded onto the copper that is left"
        facts = [
            ("Which plane", nearest),
            ("Where it is missing", missing),
            ("Copper on either side", _sides(plane, crossing)),
            ("Way round", way),
        ]
        if item.share < 1.0:
            part = f"{100 * item.share:.0f} % of the return flows on this plane"
            facts.append(("Share", f"{part}, the rest on the trace's other side"))
        if item.beyond is not None:
            apart = stack.height_mm(crossing.plane, item.beyond)
            whole = f"{names[item.beyond - 1]} is whole, {apart:.2f} mm beyond the gap"
            facts.append(("Plane beyond", whole))
        facts.append(("Where the number is from", _METHODS[finding.method]))
        return tuple(facts)


def _beyond(plane: Plane, window: Polygon) -> shapely.Geometry:
    """What of the window lies so far outside the board that no gap reaches there."""
    if not plane.gaps or not plane.gaps[0].open:
        return Polygon()
    return window.difference(shapely.box(*plane.gaps[0].shape.bounds))


def _sides(plane: Plane, crossing: Crossing) -> str:
    one, other = (plane.islands[i] for i in crossing.islands)
    if one.id == other.id:
        return f"{one.net_name} ({one.id}), before and after"
    return f"{one.net_name} ({one.id}) before, {other.net_name} ({other.id}) after"


def _way_in_words(route: Route, names: Sequence[str]) -> str:
    best = route.best
    if best is None:
        return "none was found in copper, plated holes or parts"
    over = "in the plane itself"
    if best.bridges or best.bridge_layer:
        layer = names[best.bridge_layer - 1] if best.bridge_layer else "the same layer"
        over = f"over {best.bridge_net} on {layer}" if best.bridge_net else "over parts"
    straight = f"instead of {route.straight_mm:.2f} mm straight under the trace"
    return f"{best.length_mm:.2f} mm {over}, {straight}"


_METHODS: dict[Method, str] = {
    "solved": "solved from the field: the gap, the traces over it, the planes beside it, and the "
    "plated holes that bridge it",
    "estimated": "estimated by closed forms: the solve does not see this way round",
    "none": "there is none: no way back, nothing to put a number on",
}


def _window(item: Weighed, height_mm: float) -> Polygon:
    """A box round the run and the ways round it, no slimmer than 5 to 3."""
    points = [point for run in item.runs for point in run.path]
    found = [way for way in (item.route.left, item.route.right) if way is not None]
    least = min((way.length_mm for way in found), default=0.0)
    points += [p for way in found if way.length_mm <= OTHER_WAY * least for p in way.path]
    x0, y0 = np.min(points, axis=0)
    x1, y1 = np.max(points, axis=0)
    room = ROOM * max(x1 - x0, y1 - y0) + ROOM_HEIGHTS * height_mm + ROOM_MM
    wide, high = x1 - x0 + 2 * room, y1 - y0 + 2 * room
    wide, high = max(wide, 0.6 * high), max(high, 0.6 * wide)
    x, y = (x0 + x1) / 2, (y0 + y1) / 2
    window: Polygon = shapely.box(x - wide / 2, y - high / 2, x + wide / 2, y + high / 2)
    return window


def _around(flow: Flow, window: Polygon) -> Polygon:
    """The window, and all places where current gets in or out of the plane, with room."""
    at = np.concatenate([flow.poles[0], shapely.get_coordinates(window)])
    (x0, y0), (x1, y1) = at.min(axis=0), at.max(axis=0)
    room = 0.4 * max(x1 - x0, y1 - y0)
    box: Polygon = shapely.box(x0 - room, y0 - room, x1 + room, y1 + room)
    return box


def _drawn(
    streams: Sequence[Stream],
    window: Polygon,
    hard: Sequence[Polygon],
    vias: tuple[tuple[tuple[float, float], float], ...],
) -> StreamView:
    """Lines rounded for the eye, where that leads none over a gap, and cut to the window."""
    fine = SEEN * box_size_mm(window)
    lines: list[Line] = []
    tree = shapely.STRtree(list(hard)) if hard else None
    for stream in streams:
        path = _cut_corners(stream.path)
        if tree is not None and len(tree.query(path, predicate="intersects")):
            path = stream.path
        for part in shapely.get_parts(shapely.clip_by_rect(path, *window.bounds)):
            line = line_of(part.simplify(fine / 2).coords)
            if len(line) > 1:
                lines.append(line)
    return StreamView(tuple(lines), round(1 / LINES, 4), vias)


def _cut_corners(path: LineString) -> LineString:
    """A line with its corners cut off, a quarter of each stretch, some times over."""
    points = shapely.get_coordinates(path)
    for _ in range(_ROUNDED):
        a, b = points[:-1], points[1:]
        cut = np.stack([0.75 * a + 0.25 * b, 0.25 * a + 0.75 * b], axis=1).reshape(-1, 2)
        points = np.concatenate([points[:1], cut, points[-1:]])
    return LineString(points)


def _fed(
    broken: StreamView | None, item: Weighed, window: Polygon
) -> tuple[tuple[float, float], ...] | None:
    """Ends of the stretch in the window."""
    ends = (item.crossing.stretch[0], item.crossing.stretch[-1])
    seen = line_of(end for end in ends if window.contains(shapely.Point(end)))
    return seen if broken is not None and seen else None


def _names(
    plane: Plane, crossing: Crossing, window: Polygon
) -> tuple[tuple[str, tuple[float, float]], ...]:
    """The pieces of plane on either side, and where their names have room."""
    found = []
    for number in dict.fromkeys(crossing.islands):
        island = plane.islands[number]
        clipped = shapely.clip_by_rect(island.shape, *window.bounds)
        parts = [p for p in shapely.get_parts(clipped) if isinstance(p, Polygon)]
        if parts:
            largest = max(parts, key=lambda part: (part.area, part.bounds))
            spot = _roomy(largest, LineString(crossing.stretch), window)
            found.append((island.net_name, spot))
    return tuple(found)


def _roomy(part: Polygon, trace: LineString, window: Polygon) -> tuple[float, float]:
    """A place on a piece of copper that is far from its rim and from the trace."""
    x0, y0, x1, y1 = window.bounds
    share = (np.arange(7) + 0.5) / 7
    x, y = (a.ravel() for a in np.meshgrid(x0 + share * (x1 - x0), y0 + share * (y1 - y0)))
    inside = shapely.contains_xy(part, x, y)
    spots = [shapely.Point(at) for at in zip(x[inside], y[inside], strict=True)]
    if not spots:
        spot = part.representative_point()
        return round(spot.x, 4), round(spot.y, 4)
    room = np.minimum(shapely.distance(part.exterior, spots), shapely.distance(trace, spots))
    best = spots[int(np.argmax(room.round(6)))]
    return round(best.x, 4), round(best.y, 4)


def _ways(route: Route) -> tuple[WayView, ...]:
    best = route.best
    found: list[Way] = [way for way in (route.left, route.right) if way is not None]
    return tuple(
        WayView(
            line_of(way.path),
            round(way.length_mm, 4),
            line_of([*way.bridges, *(part.at for part in way.capacitors)]),
            way is best,
        )
        for way in sorted(found, key=lambda way: way.length_mm)
    )
