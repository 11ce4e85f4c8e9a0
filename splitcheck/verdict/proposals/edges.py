"""Along the edge of a plane: the trace moved inwards, or the plane let reach farther out."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import pairwise
from math import dist

import numpy as np
import shapely
from shapely import LineString
from shapely.ops import substring

from splitcheck.planes.edges import EdgeRun, find_edge_runs
from splitcheck.planes.patched import patched
from splitcheck.planes.tracks import Tracks
from splitcheck.units import Floats
from splitcheck.verdict.edge_runs import edge_findings
from splitcheck.verdict.findings import Miss, Proposal
from splitcheck.verdict.proposals.case import (
    NOTHING,
    Case,
    Worth,
    telling,
    together,
    with_plane,
    worth_after,
    worth_of_findings,
)
from splitcheck.verdict.proposals.copper import cleared
from splitcheck.verdict.proposals.moves import (
    Chain,
    carried,
    chain_over,
    corners,
    moved_tracks,
    on_grid,
    way_in_words,
)
from splitcheck.verdict.proposals.room import CLEAR_MM
from splitcheck.verdict.scene import Scene

#: The trace is moved to so many heights within the edge, as far as there is room: the loop's share
#: falls with the square of it (of a half plane: (h / (2 pi s))^2), so 3 leave little.
HEIGHTS_WITHIN = (5.0, 3.0, 2.0, 1.0)
#: ... or the plane reaches out so many heights beyond the trace.
HEIGHTS_BEYOND = (3.0, 5.0, 2.0, 1.0)
#: What is left is looked for as far within the edge as this, in heights.
LOOKED_AT_HEIGHTS = 12.0
#: A move of less is not worth drawing, and none is longer, mm.
SHIFTS_MM = (0.05, 10.0)
#: If not the whole run, so many of its straight stretches are tried, none shorter than this, mm.
MOST_STRETCHES = 3
SHORTEST_MM = 2.0
BRANCHES = "the trace branches all along the edge"


def find_edges(scene: Scene, tracks: Tracks) -> tuple[EdgeRun, ...]:
    """Where the traces of one net on a layer run along edges, looked for well within them."""
    planes = tuple(scene.planes.values())
    near = (max(scene.rules.edge_heights, LOOKED_AT_HEIGHTS), scene.rules.edge_mm)
    return find_edge_runs(scene.board, planes, [tracks], *near)


def _worth(scene: Scene, case: Case, runs: Sequence[EdgeRun]) -> Worth:
    """What all runs along edges add, however little."""
    crossings = case.before[0]
    least = replace(scene, min_nh=0.0)
    return worth_of_findings(edge_findings(least, runs, crossings, defaultdict(int)))


def _after(case: Case, scene: Scene, tracks: Tracks, where: shapely.Geometry) -> Worth | None:
    """What is left of the finding in a changed scene: new crossings, and runs along edges.

    What the net adds along edges elsewhere is taken off again.
    """
    crossed = worth_after(case, scene, tracks, where)
    if crossed is None:
        return None
    before = _worth(case.scene, case, case.edges)
    after = _worth(scene, case, find_edges(scene, tracks))
    gained = before.added_nh - after.added_nh
    left = max((case.finding.added_nh or 0.0) - gained, 0.0)
    if left <= 0.0:
        return together([crossed, NOTHING])
    share = min(left / after.added_nh, 1.0) if after.added_nh else 0.0
    return together([crossed, Worth(left, share * after.error_nh, share * after.noise_mv)])


def _run(case: Case) -> EdgeRun | None:
    """The run along an edge that the finding is."""
    layer = case.finding.plane_layer
    own = [run for run in case.edges if case.layer_name(run.plane) == layer]
    return min(own, key=lambda run: dist(run.at, case.finding.at_mm), default=None)


def _chain(case: Case, run: EdgeRun) -> tuple[Chain, tuple[float, float]] | None:
    """The longest stretch of trace in a row along the edge: its pieces, and from where to where."""
    half = run.step_mm[:, None] / 2 * run.ahead
    steps = [
        LineString([a, b])
        for a, b in zip((run.places - half).tolist(), (run.places + half).tolist(), strict=True)
    ]
    merged = shapely.line_merge(shapely.set_precision(shapely.union_all(steps), 1e-4))
    parts = sorted(shapely.get_parts(merged).tolist(), key=lambda part: -part.length)
    for part in parts:
        chain = chain_over(case.tracks, part)
        if chain is not None:
            along = sorted(chain.line.project(shapely.Point(at)) for at in part.coords)
            return chain, (along[0], along[-1])
    return None


def inwards(case: Case) -> Iterator[Proposal | Miss]:
    """Propose the trace moved inwards, as far as there is room up to some heights."""
    run = _run(case)
    found = None if run is None else _chain(case, run)
    if run is None or found is None:
        yield Miss("move", BRANCHES)
        return
    chain, ends = found
    height = case.scene.board.stack.height_mm(run.layer, run.plane)
    misses: list[Miss] = []
    for stretch in [ends, *_straight(chain, ends)]:
        for heights in HEIGHTS_WITHIN:
            proposal = _moved(case, run, chain, stretch, heights * height)
            if isinstance(proposal, Proposal):
                yield proposal
                return
            misses.append(proposal)
    yield from telling(misses)


def _straight(chain: Chain, ends: tuple[float, float]) -> list[tuple[float, float]]:
    """The longest straight stretches along the edge: there may be room for one, if not for all."""
    along = [chain.line.project(shapely.Point(at)) for at in chain.line.coords]
    inside = [min(max(s, ends[0]), ends[1]) for s in along]
    pairs = sorted(pairwise(inside), key=lambda pair: pair[0] - pair[1])
    return [pair for pair in pairs[:MOST_STRETCHES] if pair[1] - pair[0] > SHORTEST_MM]


def _moved(
    case: Case, run: EdgeRun, chain: Chain, ends: tuple[float, float], within_mm: float
) -> Proposal | Miss:
    shift_mm = on_grid(within_mm - float(run.inside_mm.min()))
    if not SHIFTS_MM[0] <= shift_mm <= SHIFTS_MM[1]:
        least, most = SHIFTS_MM
        return Miss("move", f"no shift of {least:g} to {most:g} mm brings it farther within")
    there = carried(chain.line, ends, shift_mm * _inward(case, run))
    line = LineString(there)
    shape = line.buffer(run.width_mm / 2, quad_segs=4)
    opened = case.room.openings(shape, run.layer, case.finding.net)
    if opened is None or not line.is_simple:
        return Miss("move", f"no room {shift_mm:.2f} mm farther within")
    tracks = moved_tracks(case, chain, there)
    worth = _after(case, case.scene, tracks, LineString(there[1:-1]))
    words = (
        f"move the trace on {case.layer_name(run.layer)} by {shift_mm:.2f} mm, inwards from the "
        f"edge of {case.layer_name(run.plane)}: {way_in_words(there)}"
    )
    if opened:
        words += f"; opens {', '.join(opened)}"
    return case.proposal("move", (there[0], there[-1]), words, worth)


def _inward(case: Case, run: EdgeRun) -> Floats:
    """Unit vector across the trace, where it is nearest to the edge, away from the edge."""
    nearest = int(np.argmin(np.round(run.inside_mm, 6)))
    ahead, at = run.ahead[nearest], run.places[nearest]
    across = np.array([-ahead[1], ahead[0]])
    gap = case.scene.planes[run.plane].gaps[run.gap].shape
    far = [gap.distance(shapely.Point(at + sign * 0.05 * across)) for sign in (1, -1)]
    return across if far[0] >= far[1] else -across


def widened(case: Case) -> Iterator[Proposal | Miss]:
    """Propose more plane beyond the trace, as far out as the outline and other nets let it."""
    run = _run(case)
    found = None if run is None else _chain(case, run)
    if run is None or found is None:
        yield Miss("copper", BRANCHES)
        return
    chain, ends = found
    height = case.scene.board.stack.height_mm(run.layer, run.plane)
    misses: list[Miss] = []
    line = LineString(substring(chain.line, *ends).coords)
    for heights in HEIGHTS_BEYOND:
        proposal = _poured(case, run, line, heights * height + run.width_mm / 2)
        if isinstance(proposal, Proposal):
            yield proposal
            return
        misses.append(proposal)
    yield from telling(misses)


def _poured(case: Case, run: EdgeRun, line: LineString, half_mm: float) -> Proposal | Miss:
    plane = case.scene.planes[run.plane]
    island = plane.islands[run.island]
    half_mm = on_grid(half_mm)
    grown = line.buffer(half_mm, cap_style="flat", join_style="mitre")
    new = cleared(case, grown, plane.layer, island.net_name)
    after = patched(plane, [run.island], new)
    if after is None:
        return Miss("copper", "other nets' copper, holes or the outline leave no room for plane")
    worth = _after(case, with_plane(case.scene, after), case.tracks, line)
    places = corners(line)
    words = (
        f"plane of {island.net_name} on {case.layer_name(plane.layer)} let out under the trace, "
        f"{half_mm:.2f} mm to either side, along {way_in_words(places)}, as far as the "
        f"outline lets it, {CLEAR_MM:g} mm clear of other nets"
    )
    return case.proposal("copper", (places[0], places[-1]), words, worth)
