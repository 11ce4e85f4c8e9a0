"""A judged board in, all that is drawn of it out: its map and the worst findings from near."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from functools import partial
from typing import Any, TypeAlias

from splitcheck.loops.fields import Fields
from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Tracks
from splitcheck.verdict.boardmap import board_view
from splitcheck.verdict.closeup import Closeups
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.scene import Judged, Scene
from splitcheck.verdict.views import FindingView, Pictures

#: The return current is looked for in so many of the worst that were solved, no more than so many
#: of them over one gap, ...
MOST_STREAMS, OVER_ONE_GAP = 10, 2
#: ... and so many are drawn from near at all.
MOST_CLOSEUPS = 100

#: Calls a function on every item and gives the results in order, as ``map`` does.
Spread: TypeAlias = Callable[[Callable[[Any], Any], Iterable[Any]], Iterable[Any]]


def draw(
    scene: Scene,
    planes: Sequence[Plane],
    tracks: Sequence[Tracks],
    judged: Judged,
    spread: Spread = map,
    *,
    only: Sequence[str] | None = None,
) -> Pictures:
    """Draw a board.

    Parameters
    ----------
    scene, planes, tracks, judged
        The board and what was found on it.
    spread
        How to call a function on many items.
    only
        Ids of the findings to draw from near; None: the worst.
    """
    chosen = _chosen(judged) if only is None else [f for f in judged.findings if f.id in only]
    drawn = [f for f in chosen if f.id in judged.weighed]
    closeups = Closeups(scene, tracks, Fields(scene.board, scene.planes, scene.graph))
    closest = {f.id for f in (_closest(drawn) if only is None else drawn)}
    jobs = [(finding, finding.id in closest) for finding in drawn]
    views = tuple(spread(partial(_one, closeups, judged), jobs))
    return Pictures(
        board_view(scene, planes, tracks, judged.findings),
        views,
        sum(streams for _, streams in jobs),
    )


def _one(closeups: Closeups, judged: Judged, job: tuple[Finding, bool]) -> FindingView:
    finding, streams = job
    return closeups.of(finding, judged.weighed[finding.id], streams=streams)


def _chosen(judged: Judged) -> list[Finding]:
    """The worst of every gap, then the others, as many as are drawn."""
    seen: set[str] = set()
    first: list[Finding] = []
    rest: list[Finding] = []
    for finding in judged.findings:
        (rest if finding.gap in seen else first).append(finding)
        seen.add(finding.gap)
    return [*first, *rest][:MOST_CLOSEUPS]


def _closest(drawn: Sequence[Finding]) -> list[Finding]:
    """Those whose return current is looked for: of what was solved, the worst."""
    over: Counter[str] = Counter()
    found = []
    for finding in drawn:
        if finding.method == "solved" and over[finding.gap] < OVER_ONE_GAP:
            over[finding.gap] += 1
            found.append(finding)
    return found[:MOST_STREAMS]
