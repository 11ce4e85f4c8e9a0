"""What lies round a crossing: planes beyond and beside it, and why it may be no finding."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import Polygon

from splitcheck.loops import estimate
from splitcheck.loops.bridges import stitched_near
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Gap
from splitcheck.planes.shadows import nearest_cover
from splitcheck.units import Floats
from splitcheck.verdict.coplanar import carries_past
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.under import ALONG_SUPPLY, runs_along_a_supply

#: A net's own antipad is at most this much wider than its hole, mm; more is a field of antipads.
OWN_ANTIPAD_MM = 2.0
#: A run at least this long over another whole plane can be a change of plane: mm ...
CHANGE_RUN_MM = 5.0
#: ... if the two are one net and stitched this near to both ends, mm, ...
CHANGE_STITCH_MM = 3.0
#: ... or, whatever their nets, if it is this many times longer than the planes are apart.
CHANGE_RATIO = 10.0
#: ... where it covers this share of the run: antipads do not count.
MOSTLY = 0.8
#: Why such a run is no crossing: it is judged as a change of plane.
LONG_RUN = "long runs over another whole plane (changes of plane)"
#: Why a crossing with copper beside the trace is none.
COPLANAR = "crossings beside reference copper of the trace's own layer"
#: A line wider than so many times its height is below some 15 ohm: no signal (common practice).
SUPPLY_RATIO = 10.0
#: So many heights along a trace the return takes to come to a farther plane.
SETTLES = 3.0
#: So far before and after a run the plane on the trace's other side is looked for, mm.
BESIDE_MM = 3.0
#: A plane is whole under a gap if it covers this share of places in it: antipads do not count.
WHOLE = 0.6


def exempt(scene: Scene, crossing: Crossing) -> str | None:
    """Why a crossing is no finding, or None.

    (1) The gap is the antipad of a plated hole of the net itself.
    (2) It is too small to add what is asked for, whatever way the return takes.
    (3) A long run over or under another whole plane, of the same net and stitched at both ends or
    close by: the return changes planes there, it does not go round.
    (4) The line is so wide for its height that it carries supply, not signals.
    (5) A nearer plane carries the return before or after: the run lies in a gap of that plane, and
    over so short a way the return does not come down to this one.
    (6) Copper beside the trace, in its own layer, carries the return past the gap.
    (7) The run lies along the line of a supply, in this layer or a nearer one, which carries the
    return there.
    """
    plane = scene.planes[crossing.plane]
    gap = plane.gaps[crossing.gap]
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    if crossing.width_mm > SUPPLY_RATIO * height:
        return f"crossings of lines wider than {SUPPLY_RATIO:g} times their height (supply lines)"
    if not gap.open and _own_antipad(scene, crossing, gap):
        return "antipads at a net's own holes"
    if not (gap.open or crossing.aside_mm) and _ceiling_nh(scene, crossing, gap) < scene.min_nh:
        return f"crossings that add less than {scene.min_nh:g} nH"
    if _is_hidden(scene, crossing):
        return "crossings of farther planes inside a gap of a nearer one"
    if crossing.run_mm >= CHANGE_RUN_MM and _changes_plane(scene, crossing):
        return LONG_RUN
    if carries_past(scene, crossing):
        return COPLANAR
    if runs_along_a_supply(scene, crossing):
        return ALONG_SUPPLY
    return None


def too_small(scene: Scene) -> str:
    """What crossings below the threshold are counted as."""
    return f"crossings that add less than {scene.min_nh:g} nH"


def _own_antipad(scene: Scene, crossing: Crossing, gap: Gap) -> bool:
    x0, y0, x1, y1 = gap.shape.bounds
    for hole in scene.board.holes:
        if hole.net != crossing.net:
            continue
        x, y = hole.at
        if (
            x0 <= x <= x1
            and y0 <= y <= y1
            and max(x1 - x0, y1 - y0) <= hole.hole.diameter_mm + OWN_ANTIPAD_MM
            and gap.shape.buffer(hole.hole.diameter_mm).contains(shapely.Point(x, y))
        ):
            return True
    return False


def _ceiling_nh(scene: Scene, crossing: Crossing, gap: Gap) -> float:
    """More than a closed gap can add: a slot as long as the gap's own diagonal, crossed midway."""
    x0, y0, x1, y1 = gap.shape.bounds
    across = float(np.hypot(x1 - x0, y1 - y0))
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    stub = estimate.stub_nh(across / 2, crossing.run_mm, height, crossing.width_mm)
    along = crossing.run_mm * estimate.beside_edge_nh_mm(-across / 2, height)
    return 1.3 * max(stub, 0.0 if across / 2 > 3 * height else along)


def _changes_plane(scene: Scene, crossing: Crossing) -> bool:
    run = shapely.LineString([crossing.before, *crossing.path, crossing.after])
    points = shapely.get_coordinates(run.interpolate(np.linspace(0.05, 0.95, 19), normalized=True))
    xs, ys = points[:, 0], points[:, 1]
    planes = tuple(scene.planes.values())
    beyond_it = nearest_cover(planes, layers_beyond(scene, crossing), xs, ys, MOSTLY)
    beside_it = nearest_cover(planes, _layers_on_other_side(scene, crossing), xs, ys, MOSTLY)
    for layer in (beyond_it, beside_it):
        if layer is not None and crossing.run_mm >= CHANGE_RATIO * scene.board.stack.height_mm(
            crossing.plane, layer
        ):
            return True
    return beyond_it is not None and _is_stitched(scene, crossing, beyond_it)


def _is_stitched(scene: Scene, crossing: Crossing, layer: int) -> bool:
    """Whether the plane of a layer is of the same net and joined at both ends of the run."""
    one, other = (scene.planes[crossing.plane].islands[i] for i in crossing.islands)
    x, y = crossing.at
    number = int(scene.planes[layer].island_at(np.array([x]), np.array([y]))[0])
    if number < 0:
        return False
    island = scene.planes[layer].islands[number]
    return (
        one.net == other.net == island.net
        and stitched_near(scene.graph, one.id, island.id, crossing.before, CHANGE_STITCH_MM)
        and stitched_near(scene.graph, other.id, island.id, crossing.after, CHANGE_STITCH_MM)
    )


def layers_beyond(scene: Scene, crossing: Crossing) -> list[int]:
    """Numbers of the layers beyond the broken plane, nearest first."""
    step = 1 if crossing.plane > crossing.layer else -1
    last = len(scene.board.stack.layers)
    return list(range(crossing.plane + step, last + 1 if step > 0 else 0, step))


def _layers_on_other_side(scene: Scene, crossing: Crossing) -> list[int]:
    step = -1 if crossing.plane > crossing.layer else 1
    last = len(scene.board.stack.layers)
    return list(range(crossing.layer + step, last + 1 if step > 0 else 0, step))


def other_side(scene: Scene, crossing: Crossing) -> int | None:
    """The layer on the trace's other side that carries returns along most of the run."""
    run = shapely.LineString([crossing.before, *crossing.path, crossing.after])
    points = shapely.get_coordinates(run.interpolate(np.linspace(0.0, 1.0, 13), normalized=True))
    return nearest_cover(
        tuple(scene.planes.values()),
        _layers_on_other_side(scene, crossing),
        points[:, 0],
        points[:, 1],
        WHOLE,
    )


def _is_hidden(scene: Scene, crossing: Crossing) -> bool:
    """Whether nearer planes cover most of the trace just before or just after the run."""
    step = 1 if crossing.plane > crossing.layer else -1
    nearer = [
        scene.planes[layer]
        for layer in range(crossing.layer + step, crossing.plane, step)
        if layer in scene.planes
    ]
    if not nearer:
        return False
    reach = SETTLES * scene.board.stack.height_mm(crossing.layer, crossing.plane)
    for points in _along_ends(crossing, reach):
        covered = np.zeros(len(points), dtype=np.bool_)
        for plane in nearer:
            covered |= plane.island_at(points[:, 0], points[:, 1]) >= 0
        if len(points) and covered.mean() > 0.5:
            return True
    return False


def _along_ends(crossing: Crossing, reach_mm: float) -> tuple[Floats, Floats]:
    """Places along the trace before and after a run, out to a distance, each of shape (n, 2)."""
    stretch = shapely.LineString(crossing.stretch)
    ends = sorted(stretch.project(shapely.Point(end)) for end in (crossing.before, crossing.after))
    steps = np.linspace(0.1, 1.0, 10) * reach_mm
    found = []
    for along in (ends[0] - steps, ends[1] + steps):
        inside = along[(along >= 0.0) & (along <= stretch.length)]
        found.append(shapely.get_coordinates(stretch.interpolate(inside)))
    return found[0], found[1]


def beside(scene: Scene, crossing: Crossing) -> int | None:
    """The layer on the trace's other side that carries returns just before and after the run."""
    ends = np.array([crossing.before, crossing.after])
    points = np.concatenate([*_along_ends(crossing, BESIDE_MM), ends])
    layers = _layers_on_other_side(scene, crossing)
    xs, ys = points[:, 0], points[:, 1]
    return nearest_cover(tuple(scene.planes.values()), layers, xs, ys, WHOLE)


def share_of(scene: Scene, crossing: Crossing, other: int | None) -> float:
    """Part of the return that the broken plane carries: 1 - h1/(h1 + h2) between two planes."""
    if other is None:
        return 1.0
    near = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    far = scene.board.stack.height_mm(crossing.layer, other)
    return far / (near + far)


def beyond(scene: Scene, crossing: Crossing) -> int | None:
    """Layer number of the nearest plane beyond the broken one if it is whole under the gap.

    A nearer plane that is open there as well is passed over for the next one.
    """
    xs, ys = _places_in_gap(scene, crossing)
    return nearest_cover(
        tuple(scene.planes.values()), layers_beyond(scene, crossing), xs, ys, WHOLE
    )


def _places_in_gap(
    scene: Scene, crossing: Crossing
) -> tuple[np.ndarray[tuple[int], np.dtype[np.float64]], ...]:
    """The run itself and places of the gap to its left and right, as far as it matters."""
    gap = scene.planes[crossing.plane].gaps[crossing.gap].shape
    if crossing.aside_mm:
        return _places_beside(crossing, gap)
    dx = crossing.after[0] - crossing.before[0]
    dy = crossing.after[1] - crossing.before[1]
    length = float(np.hypot(dx, dy)) or 1.0
    reach = np.array([-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0]) * max(crossing.run_mm, 1.0)
    xs = np.append(crossing.at[0] - dy / length * reach, [p[0] for p in crossing.path])
    ys = np.append(crossing.at[1] + dx / length * reach, [p[1] for p in crossing.path])
    inside = shapely.contains_xy(gap, xs, ys) & shapely.contains_xy(scene.board.outline, xs, ys)
    if not inside.any():
        return np.array([crossing.at[0]]), np.array([crossing.at[1]])
    return xs[inside], ys[inside]


def _places_beside(
    crossing: Crossing, gap: Polygon
) -> tuple[np.ndarray[tuple[int], np.dtype[np.float64]], ...]:
    """Places in a gap beside the trace: its rim nearest to the trace, and a little further in."""
    line = shapely.LineString(crossing.path)
    near = shapely.intersection(gap, line.buffer(2.0 * crossing.aside_mm, quad_segs=4))
    points = [part.representative_point() for part in shapely.get_parts(near)]
    at = shapely.get_coordinates(points)
    return at[:, 0], at[:, 1]
