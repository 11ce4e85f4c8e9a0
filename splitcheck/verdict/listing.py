"""Which of the places that every board has many of are worth a line, and which are one place."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Sequence
from dataclasses import replace
from math import hypot

from splitcheck.verdict.findings import Finding, Kind
from splitcheck.verdict.rules import Class
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import worst_first

#: Changes of plane and runs along an edge are listed from this share of a warning on, where the
#: class states no ``note_mv``: every via is a change of plane (common practice, no source).
NOTE_SHARE = 1.0 / 3.0


def worth_listing(noise: float, drive: Class) -> bool:
    """Whether a place that every board has many of is worth a note, by its noise in mV.

    Examples
    --------
    >>> from splitcheck.verdict.rules import DEFAULT_CLASS
    >>> worth_listing(5.0, DEFAULT_CLASS), worth_listing(15.0, DEFAULT_CLASS)
    (False, True)
    """
    return noise >= (drive.note_mv or NOTE_SHARE * drive.warning_mv)


def near_enough(kind: Kind) -> str:
    """What places of a kind that are not worth a line are counted as."""
    if kind == "plane-change":
        return "changes of plane with a way for the return near enough, or too slow to matter"
    return "runs along or beyond the rim of a plane that add too little to matter (edge runs)"


def worth_a_line(
    scene: Scene, findings: Sequence[Finding], dropped: dict[str, int]
) -> list[Finding]:
    """Leave out changes of plane and edge runs that are not worth a line, and count them.

    Asked once pairs are judged: two legs together may be worth less than one alone.
    """
    drives = {net.name: scene.drive_of(net.number) for net in scene.board.nets}
    kept = []
    for finding in findings:
        common = finding.kind in {"plane-change", "edge-run"} and finding.level == "note"
        if common and not worth_listing(finding.noise_mv or 0.0, drives[finding.net]):
            dropped[near_enough(finding.kind)] += 1
        else:
            kept.append(finding)
    return kept


def gathered(
    findings: Sequence[Finding],
    alike: Callable[[Finding], str],
    reach_mm: float,
) -> list[Finding]:
    """Give findings ids of the places they are at.

    Parameters
    ----------
    findings
        Findings of one kind.
    alike
        What findings at one place have in common, as the beginning of the id.
    reach_mm
        The worst of them takes all within this distance; then the worst of those left.

    Returns
    -------
    The findings in the order given, with ``gap`` set.
    """
    groups: dict[str, list[int]] = defaultdict(list)
    for number in sorted(range(len(findings)), key=lambda i: worst_first(findings[i])):
        groups[alike(findings[number])].append(number)
    told = list(findings)
    for name, ranked in sorted(groups.items()):
        left, place = ranked, 0
        while left:
            place += 1
            x, y = findings[left[0]].at_mm
            near = [
                i
                for i in left
                if hypot(findings[i].at_mm[0] - x, findings[i].at_mm[1] - y) <= reach_mm
            ]
            for i in near:
                told[i] = replace(findings[i], gap=f"{name} #{place}")
            left = [i for i in left if i not in near]
    return told
