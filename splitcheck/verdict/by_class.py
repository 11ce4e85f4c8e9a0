"""What the classes of nets make of findings: which are counted, and what others over a gap do."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from splitcheck.verdict.findings import Finding
from splitcheck.verdict.rules import Class
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import crosstalk_mv

#: What crossings of exempt nets, and findings on them, are counted as.
EXEMPT = "crossings of nets that are exempt by class"
EXEMPT_FINDINGS = "other places on nets that are exempt by class"
BELOW_NOTE = "places with less noise than the note_mv of their class"


def listed(scene: Scene, findings: Sequence[Finding], dropped: dict[str, int]) -> list[Finding]:
    """Those findings that the classes of their nets want to see; the others are counted.

    Parameters
    ----------
    scene
        The board with the classes of its nets.
    findings
        All findings.
    dropped
        Counts by reason; added to.
    """
    drives = _drives(scene)
    kept = []
    for finding in findings:
        drive = drives[finding.net]
        if drive.exempt:
            dropped[EXEMPT_FINDINGS] += 1
        elif finding.noise_mv is not None and finding.noise_mv < drive.note_mv:
            dropped[BELOW_NOTE] += 1
        else:
            kept.append(finding)
    return kept


def with_crosstalk(scene: Scene, findings: Sequence[Finding]) -> list[Finding]:
    """Say what all other nets over each gap induce when they switch together.

    Parameters
    ----------
    scene
        The board with the classes of its nets, and its pairs.
    findings
        Findings that know which nets share their gaps.

    Returns
    -------
    The findings in the order given. As much crosstalk as makes an error by itself makes a note a
    warning: the net is broken little, but it hears the others.

    Notes
    -----
    The legs of a pair switch against each other: of a pair over the gap only the difference of
    both mutual inductances counts, and the other leg of the finding's own pair does not.
    """
    drives = _drives(scene)
    partner: dict[str, str] = {}
    for pair in scene.pairs:
        one, other = (scene.board.nets[net].name for net in pair.nets)
        partner.update({one: other, other: one})
    told = []
    for finding in findings:
        mutual = {
            share.net: share.mutual_nh
            for share in finding.shares_gap_with
            if share.mutual_nh is not None and share.net != partner.get(finding.net)
        }
        if not mutual:
            told.append(finding)
            continue
        aggressors = [
            (_as_pair(net, value, mutual, partner), drives[net]) for net, value in mutual.items()
        ]
        heard = crosstalk_mv(aggressors)
        loud = heard >= drives[finding.net].error_mv and finding.level == "note"
        level = "warning" if loud else finding.level
        why = finding.reason
        if loud:
            why += f"; {heard:.0f} mV come from the other nets over the gap"
        told.append(replace(finding, crosstalk_mv=heard, level=level, reason=why))
    return told


def _as_pair(net: str, value: float, mutual: dict[str, float], partner: dict[str, str]) -> float:
    """Mutual inductance of a net, or its half of what is left of a pair's."""
    other = mutual.get(partner.get(net, ""))
    return value if other is None else (value - other) / 2.0


def _drives(scene: Scene) -> dict[str, Class]:
    return {net.name: scene.drive_of(net.number) for net in scene.board.nets}
