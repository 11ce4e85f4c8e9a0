"""Raw gaps and lines in, a clean scene out: the gaps that matter, and line ends over copper."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import networkx as nx
import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Point, Polygon
from shapely.ops import substring

from splitcheck.units import MU0, Floats

#: Gaps are snapped to this grid, so that rims that should coincide do, mm.
_SNAP_MM = 1e-6
_DECIMALS = 9
#: The outside of the plane is a gap out to this many times its larger side.
_REACH = 2.5
#: ... but only to this many times the distance of another plane, if there is one.
_REACH_PLATES = 12.0
#: Gaps that would add less than this by themselves are left out unless a crossed gap is near, nH.
_NEGLIGIBLE_NH = 1e-3
#: At most this many gaps beside those crossed; the rest goes into the error.
_MOST_GAPS = 40
#: A gap this large against its distance from the current still sees one field all over.
_UNIFORM = 0.8


@dataclass(frozen=True, slots=True)
class Scene:
    """What is solved for."""

    gaps: tuple[Polygon, ...]
    """Clean gaps, no two of them touching; the ones that are crossed first."""
    weight: tuple[int, ...]
    """For each gap: 2 crossed by a trace (or nothing is crossed and it is near), 1 near, 0 so small
    against its distance from all traces that it sees one field all over."""
    endless: int | None
    """Number of the gap that is the outside of the plane."""
    lines: tuple[Floats | None, ...]
    """Centre lines with their ends over copper, shape (p, 2); None: nowhere over copper."""
    cut_short_mm: tuple[float, ...]
    """How much of each line was taken off because it ended in a gap."""
    left_out_nh: Floats
    """What the gaps that were left out may add to each trace, shape (n,)."""


def arrange(
    gaps: Sequence[Polygon],
    lines: Sequence[LineString],
    height_mm: float,
    outside: Polygon | None,
    kept: Sequence[LineString] = (),
    plate_mm: float | None = None,
    *,
    disjoint: bool = False,
) -> Scene:
    """Clean and choose gaps, and pull the ends of lines back onto copper.

    Parameters
    ----------
    gaps
        Any polygons, mm.
    lines
        Centre lines of the traces.
    height_mm
        Height of the traces over the plane.
    outside
        Outline of the plane, or None.
    kept
        More lines of which a crossed gap is always kept: the bridges.
    plate_mm
        Distance of another plane, which keeps the field close to the rim of the board.
    disjoint
        The gaps are known to be valid and not to touch.

    Returns
    -------
    The scene.
    """
    reach = np.inf if plate_mm is None else _REACH_PLATES * max(plate_mm, height_mm)
    clean, endless = _merged(gaps, outside, reach, disjoint=disjoint)
    lines = [shapely.remove_repeated_points(line, 1e-9) for line in lines]
    chosen, weight, left_out = _chosen(clean, lines, [*lines, *kept], height_mm, endless)
    finer = _plainer([clean[k] for k in chosen], height_mm / 50)
    short = _ending_in_gaps(lines, finer)
    trimmed = [
        _on_copper(line, finer) if k in short else (line, 0.0) for k, line in enumerate(lines)
    ]
    return Scene(
        gaps=tuple(finer),
        weight=tuple(weight),
        endless=chosen.index(endless) if endless in chosen else None,
        lines=tuple(None if line is None else shapely.get_coordinates(line) for line, _ in trimmed),
        cut_short_mm=tuple(short for _, short in trimmed),
        left_out_nh=np.full(len(lines), left_out),
    )


def _merged(
    gaps: Sequence[Polygon], outside: Polygon | None, reach_mm: float, *, disjoint: bool
) -> tuple[list[Polygon], int | None]:
    """Valid polygons that do not touch, in a fixed order, and which of them is the outside."""
    shapes = np.array(gaps, dtype=object).reshape(-1)
    if not disjoint:
        shapes = shapely.transform(shapes, lambda points: points.round(_DECIMALS))
        shapes = _joined(shapely.get_parts(shapely.make_valid(shapes)))
    if outside is not None:
        shapes = _with_outside(shapes, outside, reach_mm)
    small = shapely.area(shapes) <= _SNAP_MM * shapely.length(shapes)
    parts: list[Polygon] = list(shapely.orient_polygons(shapes[~small]))
    parts.sort(key=lambda part: (part.bounds, part.area))
    endless = None
    if outside is not None and parts:
        endless = max(range(len(parts)), key=lambda k: shapely.box(*parts[k].bounds).area)
    return parts, endless


def _with_outside(
    shapes: NDArray[np.object_], outside: Polygon, reach_mm: float
) -> NDArray[np.object_]:
    """Add all that lies outside the outline of the plane."""
    west, south, east, north = outside.bounds
    reach = min(_REACH * max(east - west, north - south), reach_mm)
    frame = shapely.box(west - reach, south - reach, east + reach, north + reach)
    shell = np.array([Polygon(shape.exterior) for shape in shapes], dtype=object)
    around = shapely.contains_properly(shell, outside.exterior)
    if around.any():
        # a gap that already runs round the whole board only has to reach further
        k = int(np.flatnonzero(around)[0])
        shapes = shapes.copy()
        if shapely.contains_properly(frame, shell[k]):
            shapes[k] = Polygon(frame.exterior, shapes[k].interiors)
        return shapes
    ring = shapely.get_parts(frame.difference(shapely.make_valid(outside)))
    return _joined(np.concatenate([shapes, ring]))


def _joined(shapes: NDArray[np.object_]) -> NDArray[np.object_]:
    """Unite the polygons that touch, each group by itself; most gaps of a board stand alone."""
    shapes = shapes[shapely.get_type_id(shapes) == shapely.GeometryType.POLYGON]
    # lines are close to their polygons, and need no answer of what lies inside
    tree = shapely.STRtree(shapes)
    reach = np.array([-2 * _SNAP_MM, -2 * _SNAP_MM, 2 * _SNAP_MM, 2 * _SNAP_MM])
    first, second = tree.query(shapely.box(*(shapely.bounds(shapes) + reach).T))
    ahead = first < second
    first, second = first[ahead], second[ahead]
    shapely.prepare(shapes)
    touch = shapely.dwithin(shapes[first], shapes[second], 2 * _SNAP_MM)
    graph: nx.Graph[int] = nx.Graph()
    graph.add_nodes_from(range(len(shapes)))
    graph.add_edges_from(zip(first[touch].tolist(), second[touch].tolist(), strict=True))
    joined: list[Polygon] = []
    for group in nx.connected_components(graph):
        members = sorted(group)
        if len(members) == 1:
            joined.append(shapes[members[0]])
            continue
        united = shapely.union_all(shapes[members], grid_size=_SNAP_MM)
        joined.extend(part for part in shapely.get_parts(united) if isinstance(part, Polygon))
    out = np.empty(len(joined), dtype=object)
    out[:] = joined
    return out


def _plainer(gaps: Sequence[Polygon], tolerance_mm: float) -> list[Polygon]:
    """Drop corners that the field does not see."""
    shapes = np.array(gaps, dtype=object)
    holes = shapely.get_num_interior_rings(shapes)
    many = np.flatnonzero((shapely.get_num_coordinates(shapes) > 8) | (holes > 0))
    # what heeds the topology is slow, and rarely needed for so little
    for heeding in (False, True):
        plain = shapely.simplify(shapes[many], tolerance_mm, preserve_topology=heeding)
        fit = shapely.get_num_interior_rings(plain) == holes[many]
        fit &= ~shapely.is_empty(plain) & shapely.is_valid(plain)
        shapes[many[fit]] = shapely.orient_polygons(plain[fit])
        many = many[~fit]
    return list(shapes)


def _ending_in_gaps(lines: Sequence[LineString], gaps: Sequence[Polygon]) -> set[int]:
    """Which lines have an end in a gap; few have."""
    if not gaps or not lines:
        return set()
    # the points that `_on_copper` starts from
    ends = [shapely.line_interpolate_point(lines, part, normalized=True) for part in (0.0, 1.0)]
    hits = shapely.STRtree(gaps).query(np.concatenate(ends), predicate="intersects")[0]
    return {int(hit) % len(lines) for hit in hits}


def _on_copper(line: LineString, gaps: Sequence[Polygon]) -> tuple[LineString | None, float]:
    """Cut off what the line runs over a gap without reaching copper, at either end."""
    whole = line.length
    tree = shapely.STRtree(gaps) if gaps else None
    for at_end in (False, True):
        for _ in range(8):
            end = line.interpolate(1.0 if at_end else 0.0, normalized=True)
            hit = tree.query(end, predicate="intersects") if tree is not None else ()
            if not len(hit):
                break
            gap = gaps[int(min(hit))]
            places = [line.project(p) for p in _rim_points(line, gap)]
            back = [line.length - place if at_end else place for place in places]
            # a hair further than the rim itself, where inside and outside are for rounding to say
            beyond = [b + 2e-4 for b in back if _clear(line, b + 2e-4, gap, at_end=at_end)]
            if not beyond:
                return None, whole
            step = min(beyond)
            rest = substring(line, 0 if at_end else step, line.length - (step if at_end else 0))
            assert isinstance(rest, LineString)
            line = rest
    short = whole - line.length
    return line, (short if short > 1e-6 else 0.0)


def _clear(line: LineString, along: float, gap: Polygon, *, at_end: bool) -> bool:
    if along >= line.length:
        return False
    spot = line.interpolate(line.length - along if at_end else along)
    return not gap.intersects(spot)


def _rim_points(line: LineString, gap: Polygon) -> NDArray[np.object_]:
    met = line.intersection(gap.boundary)
    return np.array([Point(spot) for spot in shapely.get_coordinates(met)], dtype=object)


def _chosen(
    gaps: Sequence[Polygon],
    traces: Sequence[LineString],
    lines: Sequence[LineString],
    height_mm: float,
    endless: int | None,
) -> tuple[list[int], list[int], float]:
    """Gaps under a line, then those that matter to them; what the others may add, nH."""
    if not gaps or not lines:
        return [], [], 0.0
    shapes = np.array(gaps, dtype=object)
    bundle = shapely.multilinestrings(list(lines))
    shapely.prepare(bundle)
    main = [int(k) for k in np.flatnonzero(shapely.dwithin(bundle, shapes, 3 * height_mm))]
    if endless is not None and endless not in main:
        main.append(endless)
    others = np.setdiff1d(np.arange(len(gaps)), main)
    alone = _alone_nh(shapes[others], traces, height_mm)
    around = [gaps[k] for k in main if k != endless]
    close = np.zeros(len(others), dtype=bool)
    # a gap far from the traces has little flux to hand on, whatever lies beside it
    maybe = np.flatnonzero(alone > _NEGLIGIBLE_NH / 50)
    if around and len(maybe):
        near = shapely.multipolygons(around)
        shapely.prepare(near)
        size = np.sqrt(shapely.area(shapes[others[maybe]]))
        close[maybe] = shapely.distance(near, shapes[others[maybe]]) < 2.5 * size
    matters = (alone > _NEGLIGIBLE_NH) | close
    if not main and not matters.any():
        # nothing counts for much: solve for what counts most
        matters[np.argsort(-alone, kind="stable")[:3]] = True
    wanted, weight = others[matters], alone[matters]
    order = np.argsort(-weight, kind="stable")[:_MOST_GAPS]
    more = sorted(int(k) for k in wanted[order])
    # few panels are spent on them, so that a part of what they add is in doubt as well
    left = float(alone.sum() - 0.8 * weight[order].sum())
    chosen = [*main, *more]
    apart = shapely.distance(shapes[chosen], bundle)
    size = np.hypot(*_extent(shapes[chosen]).T)
    whole = shapely.get_num_interior_rings(shapes[chosen]) == 0
    small = whole & (size < _UNIFORM * (height_mm + apart))
    rank = np.where(small, 0, np.where((apart == 0) | (apart > 0).all(), 2, 1))
    if endless in chosen:
        rank[chosen.index(endless)] = 2 if apart[chosen.index(endless)] == 0 else 1
    return chosen, [int(k) for k in rank], left


def _extent(shapes: NDArray[np.object_]) -> Floats:
    box = shapely.bounds(shapes)
    extent: Floats = box[:, 2:] - box[:, :2]
    return extent


def _alone_nh(gaps: NDArray[np.object_], traces: Sequence[LineString], height_mm: float) -> Floats:
    """About what a gap beside a trace adds by itself.

    A disc of diameter a in the field h/(pi y^2) of a trace with its image at the distance y:
    f changes by h a/(pi y^2) over it, and the disc has a polarisability of a^3/3 (from memory:
    Bethe's small hole), so that it adds about mu0 a^3/3 (h/(pi y^2))^2.
    """
    if not len(gaps) or not traces:
        return np.zeros(len(gaps))
    bundle = shapely.multilinestrings(list(traces))
    shapely.prepare(bundle)
    # a large gap sees this field only over about its distance
    apart = np.maximum(shapely.distance(gaps, bundle), height_mm)
    size = np.minimum(np.hypot(*_extent(gaps).T), 2 * apart)
    away = apart + 0.25 * size
    value: Floats = MU0 * size**3 / 3 * (height_mm / (np.pi * away**2)) ** 2
    return value
