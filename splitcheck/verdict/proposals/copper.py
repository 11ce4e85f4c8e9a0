"""A bridge of copper across a gap under the trace, or a plane where there is none."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import shapely
from shapely import LineString, Polygon

from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane
from splitcheck.planes.patched import patched
from splitcheck.verdict.findings import Miss, Proposal
from splitcheck.verdict.proposals.case import Case, telling, with_all, with_plane, worth_after
from splitcheck.verdict.proposals.moves import way_in_words
from splitcheck.verdict.proposals.room import CLEAR_MM

#: Widths of bridges that are tried, mm.
WIDTHS_MM = (1.0, 2.0, 4.0, 6.0)
#: A wider bridge must leave this much less than a narrower one to be told instead, nH.
WORTH_WIDENING_NH = 0.02
#: Copper narrower than this is not made, mm (common practice, no source).
NARROWEST_MM = 0.2
#: A bridge reaches this far onto the copper on either side, mm.
ONTO_MM = 0.3
#: New plane under a bare trace reaches the nearest island this far away at most, mm.
REACH_MM = 2.0
#: Copper for all nets over a gap is looked at for so many of them.
MOST_NETS = 16
IN_THE_WAY = "other nets' copper, holes or the outline leave no way across"


def copper(case: Case) -> Iterator[Proposal | Miss]:
    """Propose the narrowest bridge that leaves hardly more than a wider one."""
    found = _over_bare(case) if case.item is None else _over_gap(case)
    best: Proposal | None = None
    misses: list[Miss] = []
    for proposal in found:
        if isinstance(proposal, Miss):
            misses.append(proposal)
            continue
        if best is None or proposal.added_nh < best.added_nh - WORTH_WIDENING_NH:
            best = proposal
        if best.added_nh <= WORTH_WIDENING_NH:
            break
    if best is not None:
        yield best
    else:
        yield from telling(misses)


def _over_gap(case: Case) -> Iterator[Proposal | Miss]:
    one, other = case.islands
    if one.net_name != other.net_name:
        yield Miss("copper", f"the sides are of two nets, {one.net_name} and {other.net_name}")
        return
    crossing = case.crossing
    line = _over(crossing)
    for width in WIDTHS_MM:
        patch = _from_end_to_end(
            cleared(
                case,
                line.buffer(width / 2, cap_style="flat", join_style="mitre"),
                crossing.plane,
                one.net_name,
            ),
            line,
        )
        plane = None if patch is None else patched(case.plane, sorted({*crossing.islands}), patch)
        if plane is None:
            yield Miss("copper", IN_THE_WAY)
            continue
        scene = with_plane(case.scene, plane)
        worth = worth_after(case, scene, case.tracks, line)
        (x0, y0), (x1, y1) = line.coords[0], line.coords[-1]
        words = (
            f"copper of {one.net_name} on {case.layer_name(crossing.plane)}, {width:g} mm wide, "
            f"under the trace from x {x0:.2f} y {y0:.2f} to x {x1:.2f} y {y1:.2f}, "
            f"{CLEAR_MM:g} mm clear of other nets"
        )
        yield case.proposal("copper", ((x0, y0), (x1, y1)), words, worth)


def copper_for_all(case: Case) -> Iterator[Proposal | Miss]:
    """Propose one piece of copper that closes the gap under all the traces over it nearby."""
    one, other = case.islands
    many = len(case.neighbours) + 1
    if one.net_name != other.net_name or not 1 < many <= MOST_NETS:
        return
    crossing = case.crossing
    runs = [*case.beside, crossing]
    if any(set(run.islands) != set(crossing.islands) for run in runs):
        return
    lines = shapely.union_all([_over(run) for run in runs])
    corners = shapely.get_coordinates(
        shapely.oriented_envelope(lines).buffer(WIDTHS_MM[0] / 2, join_style="mitre")
    )[:-1].round(2)
    area = cleared(case, Polygon(corners), crossing.plane, one.net_name)
    patch = _from_end_to_end(area, _over(crossing))
    plane = None if patch is None else patched(case.plane, sorted(set(crossing.islands)), patch)
    if plane is None:
        return
    scene = with_plane(case.scene, plane)
    worth = worth_after(case, scene, case.tracks, _over(crossing))
    if worth is None:
        return
    left = [
        worth_after(each, scene, each.tracks, _over(each.crossing)) for each in case.of_neighbours()
    ]
    places = [(float(x), float(y)) for x, y in corners.tolist()]
    words = (
        f"copper of {one.net_name} on {case.layer_name(crossing.plane)} under all {many} nets that "
        f"cross here, within {way_in_words(places)}, {CLEAR_MM:g} mm clear of other nets"
    ) + with_all(case, [worth.added_nh, *(None if w is None else w.added_nh for w in left)])
    yield case.proposal("copper", places, words, worth)


def _over(crossing: Crossing) -> LineString:
    """The way of a trace over the gap, with a little of it over the copper on either side."""
    return LineString(
        [
            _beyond(crossing.path[0], crossing.before),
            *crossing.path,
            _beyond(crossing.path[-1], crossing.after),
        ]
    )


def _beyond(rim: tuple[float, float], on: tuple[float, float]) -> tuple[float, float]:
    """A place on the copper beyond a rim, in the direction in which the trace goes on."""
    ahead = np.subtract(on, rim)
    length = float(np.hypot(*ahead))
    if length < 1e-9:
        return on
    x, y = np.asarray(rim) + ahead / length * ONTO_MM
    return float(x), float(y)


def _from_end_to_end(patch: shapely.Geometry, line: LineString) -> Polygon | None:
    """The piece of a patch that reaches both ends of a line, if one does."""
    for piece in shapely.get_parts(patch):
        if isinstance(piece, Polygon) and all(
            shapely.dwithin(piece, shapely.Point(end), NARROWEST_MM / 2)
            for end in (line.coords[0], line.coords[-1])
        ):
            return piece
    return None


def cleared(case: Case, patch: shapely.Geometry, layer: int, net: str) -> shapely.Geometry:
    """What of a shape on a layer copper of a net can fill."""
    free = shapely.difference(case.room.within_outline(patch), case.room.foreign(patch, layer, net))
    half = NARROWEST_MM / 2
    return free.buffer(-half, join_style="mitre").buffer(half, join_style="mitre")


def _over_bare(case: Case) -> Iterator[Proposal | Miss]:
    """Plane of the nearest island's net along the bare trace, layer by layer, nearest first."""
    bare = case.bare_spans()
    if not bare:
        yield Miss("copper", "no stretch of trace without a plane to draw one under")
        return
    lines = shapely.union_all([LineString(span) for span in bare])
    own = case.tracks.layer
    layers = sorted(case.scene.planes, key=lambda n: (abs(n - own), n))
    if not set(layers) - {own}:
        yield Miss("copper", "no other layer has a plane to let out under the trace")
    for layer in [n for n in layers if n != own][:2]:
        plane = case.scene.planes[layer]
        for width in WIDTHS_MM[1:]:
            yield _poured(case, plane, lines, width)


def _poured(case: Case, plane: Plane, lines: shapely.Geometry, width: float) -> Proposal | Miss:
    near = [
        (round(island.shape.distance(lines), 6), number)
        for number, island in enumerate(plane.islands)
    ]
    far, number = min(near)
    if far > REACH_MM:
        return Miss("copper", f"no plane begins within {REACH_MM:g} mm of the trace")
    island = plane.islands[number]
    grown = shapely.buffer(lines, width / 2 + far, quad_segs=4, join_style="mitre")
    plane_after = patched(plane, [number], cleared(case, grown, plane.layer, island.net_name))
    if plane_after is None:
        return Miss("copper", "other nets' copper, holes or the outline leave no room")
    worth = worth_after(case, with_plane(case.scene, plane_after), case.tracks, lines)
    x0, y0, x1, y1 = shapely.bounds(lines).tolist()
    wide = width + 2 * far
    words = (
        f"plane of {island.net_name} on {case.layer_name(plane.layer)} under the bare trace, "
        f"{wide / 2:.2f} mm to either side, from x {x0:.2f} y {y0:.2f} to x {x1:.2f} y {y1:.2f}, "
        f"{CLEAR_MM:g} mm clear of other nets"
    )
    return case.proposal("copper", ((x0, y0), (x1, y1)), words, worth)
