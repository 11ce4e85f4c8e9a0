"""Crossings, ways that a solve sees and a gap in, how far the solve looks out: its window.

A window is a convex region round points of the board, so that it turns with the board. What the
solve does not see, such as a way over a plane that it does not know, has no part in it.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np
import shapely
from shapely import LinearRing, LineString, MultiPoint, Point, Polygon

from splitcheck.copper import marks
from splitcheck.loops import solve as engine
from splitcheck.loops.spans import feet
from splitcheck.loops.tasks import Task, is_seen, parts_islands, stays
from splitcheck.loops.ways import to_point
from splitcheck.planes.islands import Gap

#: A window reaches this much beyond the ways round the gap: in mm, as a share of their size, and
#: in heights of the trace.
BEYOND_MM = 3.0
BEYOND_SHARE = 0.5
BEYOND_HEIGHTS = 5.0
#: Neighbours of the gap are taken out to this beyond the ways round, in the same measures.
BESIDE_MM = 2.0
BESIDE_SHARE = 0.3
#: ... and cut off so many times further out than the crossed gap, if they are not taken whole.
BESIDE_FAR = 2.0
#: A gap with a way round on one side only is kept on the other out to this many times the size of
#: that way: if it leads outside, for flux may leave where it is cut off; with another plane, which
#: keeps the flux near; and else, if that is not too ragged.
OPEN_SIDE = 2.0
OPEN_SIDE_SHUT = 8.0
FAR_SIDE = 30.0
#: ... and out to this at least, mm: a trace over the very end of a gap has a short way there.
FAR_LEAST_MM = 10.0
#: A closed gap is taken whole if it is no longer than this, mm, with no more corners than that.
WHOLE_MM = 30.0
WHOLE_CORNERS = 1000
#: ... and a plain one up to this length.
PLAIN_MM = 60.0
PLAIN_CORNERS = 400
#: The way along the rim on a side without a way that the solve sees is followed if it spans no
#: more than this, mm.
ALONG_MM = 60.0
#: Corners of a quarter of the round ends of windows: more would only cost.
_ROUND = 4
#: What counts as on the rim of a gap, mm.
_ON_RIM_MM = 1e-3


class Windows(NamedTuple):
    """How far a solve looks; all convex."""

    outer: Polygon
    """What the crossed gap is cut off at."""
    half: Polygon
    """Half as far beyond the ways round."""
    beside: Polygon
    """Where gaps that are not crossed count: what those add that lie beside the trace further
    along is not owed to this crossing."""
    far: Polygon
    """What those are cut off at: flux that comes in through one goes out through the rest of it."""


def span_mm(shape: shapely.Geometry) -> float:
    """The largest distance between two points of a shape, mm: the same however it is turned.

    Examples
    --------
    >>> span_mm(shapely.box(0, 0, 3, 4))
    5.0
    """
    corners = shapely.get_coordinates(shapely.convex_hull(shape))
    return float(np.hypot(*(corners[:, None] - corners).T).max())


def look_at(
    tasks: Sequence[Task],
    gap: Gap,
    bridges: Sequence[engine.ViaBridge | engine.Strap],
    *,
    narrow: bool,
    hull: Polygon | None = None,
) -> Windows | None:
    """How far a solve looks: at the crossings, some bridges, and the ways round that it sees.

    In place of a way that it does not see it takes that along the rim, if it is not too long.
    None if a crossing has neither: a window would close the gap where nothing does. The hull of the
    gap may be given, to save time.
    """
    points = [point for task in tasks for point in task.crossing.path]
    points.extend(to_point(at) for bridge in bridges for at in feet(bridge))
    one_sided = False
    for task in tasks:
        found = [way for way in (task.route.left, task.route.right) if way is not None]
        seen = [way for way in found if is_seen(task, way)]
        points.extend(point for way in seen for point in way.path)
        # flux goes on beyond a bridge as long as the gap does, for no bridge is a short circuit
        held = seen if parts_islands(task) or narrow else [way for way in seen if stays(way)]
        all_held = len(held) == len(found)
        along = [] if narrow or all_held else _along_rim(task, gap)
        hulls = (shapely.get_coordinates(way.convex_hull) for way in along)
        points.extend(to_point(at) for hull in hulls for at in hull)
        # holes to the plane on the other side are ways on both sides; both planes keep flux near
        stitched = parts_islands(task) and bool(task.stitches)
        if not (seen or along or stitched):
            return None
        one_sided |= not stitched and (len(found) < 2 or not (all_held or len(along) == 2))
    shut = tasks[0].beyond is not None or tasks[0].other is not None
    return windows_of(
        points, gap, tasks[0].height_mm, one_sided=one_sided, shut=shut, narrow=narrow, hull=hull
    )


def _along_rim(task: Task, gap: Gap) -> list[LineString]:
    """The ways along the rim of a gap that are not too long."""
    path = task.crossing.path
    ways = along_rim(gap.shape, path[0], path[-1])
    return [way for way in ways if span_mm(way) <= ALONG_MM]


def windows_of(
    points: Sequence[marks.Point],
    gap: Gap,
    height_mm: float,
    *,
    one_sided: bool,
    shut: bool,
    narrow: bool = False,
    hull: Polygon | None = None,
) -> Windows:
    """The regions round the crossings, their ways round and some bridges, with room to spare.

    Parameters
    ----------
    points
        Points of all that must be in it, mm.
    gap
        The crossed gap.
    height_mm
        Height of the traces over the plane.
    one_sided
        Whether there is a side without a way round: there the gap is kept out to some times the
        size of the points, or to its end.
    shut
        Whether another plane keeps the flux near.
    narrow
        The gap is too ragged for all that room.
    hull
        Convex hull of the gap, if known: some gaps have very many corners.

    Returns
    -------
    The windows.
    """
    seen = shapely.multipoints(np.array(points))
    assert isinstance(seen, MultiPoint)
    size = span_mm(seen)
    room = BEYOND_MM + BEYOND_SHARE * size + BEYOND_HEIGHTS * height_mm
    beside = BESIDE_MM + BESIDE_SHARE * size + BEYOND_HEIGHTS * height_mm
    parts: list[shapely.Geometry] = [_round(seen, room)]
    half: list[shapely.Geometry] = [_round(seen, room / 2)]
    about = shapely.convex_hull(gap.shape) if hull is None else hull
    if is_moderate(gap, about):
        parts.append(_round(about, BEYOND_MM))
    elif one_sided:
        whole = _round(about, BEYOND_MM)
        times = OPEN_SIDE if gap.open and not shut else FAR_SIDE
        times = min(times, OPEN_SIDE_SHUT) if shut or narrow else times
        far = room + max(times * size, 0.0 if narrow else FAR_LEAST_MM)
        parts.append(shapely.intersection(_round(seen, far), whole))
        half.append(shapely.intersection(_round(seen, far / 2), whole))
    outer = _together(parts)
    beyond = _together([outer, _round(seen, BESIDE_FAR * room)])
    return Windows(outer, _together(half), _round(seen, beside), beyond)


def along_rim(gap: Polygon, start: marks.Point, stop: marks.Point) -> Iterator[LineString]:
    """Both ways along the rim of a gap from one place on it to another.

    The way round in the copper, drawn taut, lies within the hull of the rim that it goes along.
    There is none between places on different rims.

    Examples
    --------
    >>> slot = shapely.box(0, 0, 1, 10)
    >>> sorted(line.length for line in along_rim(slot, (0, 2), (1, 2)))
    [5.0, 17.0]
    """
    ends = [Point(start), Point(stop)]
    for ring in (gap.exterior, *gap.interiors):
        if all(shapely.dwithin(ring, end, _ON_RIM_MM) for end in ends):
            yield from _both_ways(ring, *sorted(ring.project(end) for end in ends))
            return


def _both_ways(ring: LinearRing, first_mm: float, last_mm: float) -> Iterator[LineString]:
    corners = shapely.get_coordinates(ring)
    far = np.cumsum(np.hypot(*np.diff(corners, axis=0, prepend=corners[:1]).T))
    places = (ring.interpolate(along_mm) for along_mm in (first_mm, last_mm))
    first, last = (shapely.get_coordinates(place) for place in places)
    before, beyond = far < first_mm, far > last_mm
    between = ~before & ~beyond
    yield LineString(np.concatenate([first, corners[between], last]))
    yield LineString(np.concatenate([last, corners[beyond], corners[before], first]))


def cut_ends(pieces: Sequence[Polygon], window: Polygon) -> list[Point]:
    """Where a window cuts off pieces of a gap: the middle of the longest cut through each."""
    # a hair inside, for what lies on a slanting rim is rounded off it
    within = shapely.buffer(window, -_ON_RIM_MM, join_style="mitre")
    shapely.prepare(within)
    cut = np.array(pieces, dtype=object)[~shapely.contains(within, pieces)]
    rim = shapely.boundary(within)
    ends = (_longest(shapely.intersection(rim, piece)) for piece in cut)
    return [end for end in ends if end is not None]


def _longest(rim: shapely.Geometry) -> Point | None:
    """The middle of the longest line."""
    along = shapely.get_parts(shapely.line_merge(rim))
    cuts = along[shapely.get_type_id(along) == shapely.GeometryType.LINESTRING]
    if not len(cuts):
        return None
    longest: LineString = cuts[int(np.argmax(shapely.length(cuts).round(6)))]
    return longest.interpolate(0.5, normalized=True)


def clipped(shape: Polygon, window: Polygon) -> shapely.Geometry:
    """What of a gap is in a window."""
    if window.contains(shapely.box(*shape.bounds)):
        return shape
    # by far faster than an intersection where the gap is intricate
    near = shapely.clip_by_rect(shape, *window.bounds)
    near = near if near.is_valid else shapely.make_valid(near)
    return near if window.contains(near) else shapely.intersection(near, window)


def is_moderate(gap: Gap, hull: shapely.Geometry) -> bool:
    """Whether a gap with some hull is taken whole, however little of it the ways round need."""
    corners = int(shapely.get_num_coordinates(gap.shape))
    if gap.open or corners > WHOLE_CORNERS:
        return False
    return span_mm(hull) <= (PLAIN_MM if corners <= PLAIN_CORNERS else WHOLE_MM)


def _round(shape: shapely.Geometry, room_mm: float) -> Polygon:
    """The hull of a shape with round room about it; a buffer may lose hulls of no width."""
    turn = np.arange(4 * _ROUND) * (np.pi / 2 / _ROUND)
    circle = room_mm * np.stack([np.cos(turn), np.sin(turn)], axis=1)
    corners = shapely.get_coordinates(shapely.convex_hull(shape))
    hull = shapely.convex_hull(shapely.multipoints((corners[:, None] + circle).reshape(-1, 2)))
    assert isinstance(hull, Polygon)
    return hull


def _together(shapes: Sequence[shapely.Geometry]) -> Polygon:
    hull = shapely.convex_hull(shapely.multipoints(shapely.get_coordinates(shapes)))
    assert isinstance(hull, Polygon)
    return hull
