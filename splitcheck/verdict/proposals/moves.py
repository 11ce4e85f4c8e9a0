"""Moving the trace aside, past the end of the gap."""

from __future__ import annotations

from collections.abc import Iterator
from math import inf

import numpy as np
import shapely
from shapely import LineString

from splitcheck.loops.ways import heading
from splitcheck.planes.tracks import redrawn
from splitcheck.units import Floats, segments
from splitcheck.verdict.findings import Point, Proposal
from splitcheck.verdict.proposals.case import Case, worth_after

#: A trace is not moved farther than this, mm.
FARTHEST_MM = 10.0
#: Edges of a moved trace are kept so many heights beyond the gap's end, if there is room: the
#: first is a maker's rule for impedance, the last where added inductance ends.
HEIGHTS_BEYOND = (5.0, 2.0, 1.0)
#: The piece that is moved begins and ends one of these far beyond the gap, mm.
ROOMS_MM = (1.0, 1.5, 2.0, 3.0, 4.0)


def moves(case: Case) -> Iterator[Proposal]:
    """Propose the shortest move to either side that leaves the gap behind and has room."""
    piece = _piece(case)
    if piece is None or case.islands[0].id != case.islands[1].id:
        return
    for side in (1, -1):
        proposal = _moved(case, piece, side)
        if proposal is not None:
            yield proposal


def _piece(case: Case) -> int | None:
    """The straight piece of trace that the crossing lies on, if it is on one alone."""
    path = case.crossing.path
    if len(path) != 2:
        return None
    t = case.tracks
    lines = segments(np.stack([t.start, t.end], axis=1))
    whole = LineString(path)
    on = [i for i, line in enumerate(lines.tolist()) if line.buffer(1e-3).covers(whole)]
    return on[0] if len(on) == 1 else None


def _moved(case: Case, piece: int, side: int) -> Proposal | None:
    crossing = case.crossing
    height = case.scene.board.stack.height_mm(crossing.layer, crossing.plane)
    (dx, dy) = heading(crossing)
    aside = np.array([-dy * side, dx * side])
    for heights in HEIGHTS_BEYOND:
        beyond = heights * height + crossing.width_mm / 2
        shift = _shift_mm(case, aside, beyond)
        if shift > FARTHEST_MM:
            continue
        free = _free(case, piece, aside * shift)
        found = None if free is None else _valued(case, piece, shift, *free)
        if found is not None:
            return found
    return None


def _free(
    case: Case, piece: int, shift: Floats
) -> tuple[tuple[Point, ...], tuple[str, ...]] | None:
    """The shortest moved way that has room, and the pours it opens."""
    pairs = [(one, other) for one in ROOMS_MM for other in ROOMS_MM]
    for rooms in sorted(pairs, key=lambda pair: (sum(pair), pair)):
        ends = _ends(case, piece, rooms)
        if ends is None:
            continue
        there = (ends[0], _shifted(ends[0], shift), _shifted(ends[1], shift), ends[1])
        shape = LineString(there).buffer(case.crossing.width_mm / 2, quad_segs=4)
        opened = case.room.openings(shape, case.crossing.layer, case.finding.net)
        if opened is not None:
            return there, opened
    return None


def _shift_mm(case: Case, aside: Floats, beyond: float) -> float:
    """How far aside the gap ends, for a band as long as the run, and the distance beyond; mm."""
    crossing = case.crossing
    gap = case.plane.gaps[crossing.gap].shape
    (x0, y0), (x1, y1) = crossing.path[0], crossing.path[-1]
    far = aside * (FARTHEST_MM + 1.0)
    ahead = np.subtract((x1, y1), (x0, y0)) / max(crossing.run_mm, 1e-9)
    start, stop = np.array([x0, y0]) - ahead * ROOMS_MM[0], np.array([x1, y1]) + ahead * ROOMS_MM[0]
    band = shapely.Polygon([start, stop, stop + far, start + far])
    inside = [
        piece
        for piece in shapely.get_parts(shapely.intersection(gap, band))
        if piece.distance(LineString(crossing.path)) < 1e-3
    ]
    if not inside:
        return inf
    corners = shapely.get_coordinates(inside) - np.array(crossing.at)
    reach = float((corners @ aside).max())
    return float(np.ceil((reach + beyond) / 0.05) * 0.05)


def _ends(case: Case, piece: int, rooms: tuple[float, float]) -> tuple[Point, Point] | None:
    """Where the trace leaves its old way and comes back, in the order of its straight piece."""
    t = case.tracks
    line = LineString([t.start[piece], t.end[piece]])
    rims = sorted(line.project(shapely.Point(rim)) for rim in case.crossing.path)
    start, stop = rims[0] - rooms[0], rims[-1] + rooms[1]
    if start < 0.0 or stop > line.length:
        return None
    a, b = line.interpolate(start), line.interpolate(stop)
    return (round(a.x, 4), round(a.y, 4)), (round(b.x, 4), round(b.y, 4))


def _valued(
    case: Case, piece: int, shift_mm: float, there: tuple[Point, ...], opened: tuple[str, ...]
) -> Proposal | None:
    """The trace moved, if it gains."""
    start, end = (_place(at[piece]) for at in (case.tracks.start, case.tracks.end))
    lines = ((start, there[0]), there, (there[-1], end))
    tracks = redrawn(case.tracks, case.net, lines, piece)
    worth = worth_after(case, case.scene, tracks, LineString(there[1:3]))
    way = ", ".join(f"x {x:.2f} y {y:.2f}" for x, y in there)
    words = (
        f"move the trace on {case.layer_name(case.crossing.layer)} by {shift_mm:.2f} mm, "
        f"past the end of the gap: {way}"
    )
    if opened:
        words += f"; opens {', '.join(opened)}"
    return case.proposal("move", (there[0], there[-1]), words, worth)


def _shifted(at: Point, shift: Floats) -> Point:
    return round(at[0] + float(shift[0]), 4), round(at[1] + float(shift[1]), 4)


def _place(row: Floats) -> Point:
    return float(row[0]), float(row[1])
