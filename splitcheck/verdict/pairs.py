"""Findings on the legs of differential pairs: judged in odd mode, and by what the legs differ."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import replace
from math import exp, hypot, log, pi

from splitcheck.board.board import Board
from splitcheck.board.pairs import Pair
from splitcheck.units import MU0
from splitcheck.verdict.findings import LEVELS, Finding, Level, PairRow
from splitcheck.verdict.rules import Class
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import level, noise_mv

#: Findings of both legs within so many spacings, and always within so many mm, are one place.
SAME_SPACINGS = 4.0
SAME_MM = 3.0
#: How fast the coupling of two crossings of one slot fades with their distance by its length.
FADES = 2.3


def pair_rows(board: Board, pairs: Iterable[Pair]) -> tuple[PairRow, ...]:
    """The pairs as the report states them, by name."""
    rows = [
        PairRow(
            (board.nets[pair.nets[0]].name, board.nets[pair.nets[1]].name),
            pair.known_by,
            pair.apart_mm,
            pair.coupled_mm,
        )
        for pair in pairs
    ]
    return tuple(sorted(rows, key=lambda row: row.nets))


def with_pairs(scene: Scene, findings: Sequence[Finding]) -> list[Finding]:
    """Judge the findings on legs of pairs as what they are.

    Parameters
    ----------
    scene
        The board with its pairs.
    findings
        All findings, with the ids of their gaps.

    Returns
    -------
    The findings in the order given. Those on a leg name the other leg. Where both legs cross one
    gap side by side, the noise is that of the odd mode, or of the part by which the legs differ if
    that is more; where one leg crosses alone, all of it is unbalanced. A pair whose legs never run
    side by side is judged leg by leg, and says so.
    """
    told = list(findings)
    where: dict[str, list[int]] = defaultdict(list)
    for number, finding in enumerate(findings):
        where[finding.net].append(number)
    for pair in scene.pairs:
        one, other = (scene.board.nets[net].name for net in pair.nets)
        drives = [scene.drive_of(net) for net in pair.nets]
        if not pair.coupled:
            for number in (*where[one], *where[other]):
                told[number] = _apart(told[number], other if told[number].net == one else one)
            continue
        matched = _matched(
            pair, [(i, told[i]) for i in where[one]], [(i, told[i]) for i in where[other]]
        )
        for i, j in matched:
            height = _height_mm(scene, told[i])
            told[i], told[j] = _both(pair, (told[i], told[j]), (drives[0], drives[1]), height)
        alone = {*where[one], *where[other]} - {i for match in matched for i in match}
        for number in sorted(alone):
            told[number] = _alone(told[number], other if told[number].net == one else one)
    return told


def _matched(
    pair: Pair, ones: Sequence[tuple[int, Finding]], others: Sequence[tuple[int, Finding]]
) -> list[tuple[int, int]]:
    """Findings of both legs at one place, each in at most one match, nearest first."""
    reach = max(SAME_MM, SAME_SPACINGS * (pair.apart_mm or 0.0))
    near = sorted(
        (_apart_mm(one, other), i, j)
        for i, one in ones
        for j, other in others
        if _same_gap(one, other) and (one.kind == "no-plane" or _apart_mm(one, other) <= reach)
    )
    taken: set[int] = set()
    found = []
    for _, i, j in near:
        if not taken & {i, j}:
            taken.update((i, j))
            found.append((i, j))
    return found


def _same_gap(one: Finding, other: Finding) -> bool:
    """Whether two findings are over one gap of one plane, or both change planes."""
    if "plane-change" in {one.kind, other.kind}:
        return one.kind == other.kind
    keys = [
        (f.layer, f.plane_layer, f.gap, frozenset(f.islands), f.kind == "no-plane")
        for f in (one, other)
    ]
    return keys[0] == keys[1]


def _apart_mm(one: Finding, other: Finding) -> float:
    return hypot(one.at_mm[0] - other.at_mm[0], one.at_mm[1] - other.at_mm[1])


def _apart(finding: Finding, other: str) -> Finding:
    why = f"{finding.reason}; a pair with {other} by name, but the legs do not run side by side: "
    return replace(finding, pair=other, reason=f"{why}judged by itself")


def _alone(finding: Finding, other: str) -> Finding:
    whole = (
        "keeps its plane here or finds a way near enough: all of it is taken as unbalanced"
        if finding.kind == "plane-change"
        else "is not broken here: all of it is unbalanced"
    )
    why = f"{finding.reason}; the other leg, {other}, {whole}"
    added = finding.added_nh
    return replace(finding, pair=other, reason=why, odd_nh=added, unbalance_nh=added)


def _both(
    pair: Pair, legs: tuple[Finding, Finding], drives: tuple[Class, Class], height_mm: float | None
) -> tuple[Finding, Finding]:
    """Both legs of a pair at one place, judged together."""
    one, other = legs
    gap_mm = max(one.gap_mm, other.gap_mm)
    unbalance = None
    if one.added_nh is not None and other.added_nh is not None:
        unbalance = abs(one.added_nh - other.added_nh)
    elif one.added_nh is not None or other.added_nh is not None:
        return _alone(one, other.net), _alone(other, one.net)
    if unbalance is None or one.kind == "no-plane" or _beyond_edge(one, other):
        odd = open_odd_nh(pair.apart_mm or 0.0, height_mm, gap_mm)
    else:
        odd = odd_nh(one.added_nh or 0.0, other.added_nh or 0.0, mutual_nh(one, other))
    return (
        _judged(one, other.net, drives[0], odd, unbalance),
        _judged(other, one.net, drives[1], odd, unbalance),
    )


def _beyond_edge(one: Finding, other: Finding) -> bool:
    """Whether both legs hang beyond one edge, and no solve says how they couple there."""
    solved = any(
        share.net == other.net and share.mutual_nh is not None for share in one.shares_gap_with
    )
    return one.kind == other.kind == "edge-run" and not solved


def _judged(
    finding: Finding, other: str, drive: Class, odd: float, unbalance: float | None
) -> Finding:
    noise = max(odd_noise_mv(odd, drive), noise_mv(unbalance or 0.0, drive))
    if finding.capped and finding.noise_mv is not None:
        noise = min(noise, finding.noise_mv)  # the gap as a line limits the pair as well
    how = level(noise, drive, max(odd / 2.0, unbalance or 0.0))
    said = f"{finding.reason}; judged as a pair with {other}: {odd:.2f} nH in odd mode"
    if unbalance is None:
        how = _at_least(how, "warning")
        said += ", what both legs carry together has no way back"
    else:
        said += f", the legs differ by {unbalance:.2f} nH"
    return replace(
        finding,
        pair=other,
        odd_nh=odd,
        unbalance_nh=unbalance,
        noise_mv=noise,
        level=how,
        reason=said,
    )


def _at_least(level_: Level, least: Level) -> Level:
    return min(level_, least, key=LEVELS.index)


def odd_nh(one_nh: float, other_nh: float, mutual_nh: float) -> float:
    """Added loop inductance of a pair in odd mode: down one leg and back in the other.

    Parameters
    ----------
    one_nh, other_nh
        Added inductance of either leg alone, nH, >= 0.
    mutual_nh
        Added mutual inductance of the legs, nH.

    Returns
    -------
    nH, >= 0.

    Notes
    -----
    L11 + L22 - 2 L12: two coupled inductances in series against one another; textbook (Paul,
    *Analysis of Multiconductor Transmission Lines*, from memory). Between legs of opposite currents
    the two legs' unequal parts leave (L11 - L22)/2 dI/dt to both legs together: mode conversion.

    Examples
    --------
    >>> round(odd_nh(3.0, 3.0, 2.7), 6), odd_nh(3.0, 0.0, 0.0)
    (0.6, 3.0)
    """
    return max(one_nh + other_nh - 2.0 * mutual_nh, 0.0)


def odd_noise_mv(odd: float, drive: Class) -> float:
    """Noise of the odd mode.

    Notes
    -----
    A differential class states wave and impedance of the pair, so that all of the odd-mode
    inductance is in that line. Any other class states them of one leg: half the inductance each.
    """
    return noise_mv(odd if drive.differential else odd / 2.0, drive)


def mutual_nh(one: Finding, other: Finding) -> float:
    """Added mutual inductance of two legs over one gap: as solved, else by a closed form.

    Notes
    -----
    Else k = exp(-2.3 s/D), s the distance of the legs and D what the return walks more: fitted to
    four values of a sheet solver (slot 20 x 1 mm, h 0.2 mm, spacing 1, 2, 5, 10 mm: k = 0.89, 0.79,
    0.57, 0.33), 2 %. M = k sqrt(L11 L22). Vias side by side that change planes share their way.
    """
    for share in one.shares_gap_with:
        if share.net == other.net and share.mutual_nh is not None:
            # its sign tells which way either leg happens to be drawn over the gap
            return min(abs(share.mutual_nh), _most_mutual_nh(one, other))
    if one.kind == "plane-change":
        return ((one.added_nh or 0.0) + (other.added_nh or 0.0)) / 2.0
    return coupling(_apart_mm(one, other), one.detour_mm) * _most_mutual_nh(one, other)


def _most_mutual_nh(one: Finding, other: Finding) -> float:
    return float(((one.added_nh or 0.0) * (other.added_nh or 0.0)) ** 0.5)


def coupling(apart_mm: float, detour_mm: float | None) -> float:
    """How much of one leg's added inductance couples into the other.

    Parameters
    ----------
    apart_mm
        Distance of the two crossings, mm, >= 0.
    detour_mm
        What the return walks more, mm; None or 0: not known, then nothing couples.

    Examples
    --------
    >>> [round(coupling(s, 20.0), 2) for s in (1.0, 2.0, 5.0, 10.0)]
    [0.89, 0.79, 0.56, 0.32]
    """
    return exp(-FADES * apart_mm / detour_mm) if detour_mm else 0.0


def open_odd_nh(apart_mm: float, height_mm: float | None, gap_mm: float) -> float:
    """What a pair gains in odd mode where there is no plane for a way.

    Parameters
    ----------
    apart_mm, height_mm
        Distance of the legs, and their height over the plane where there is one, mm; a height of
        None: there is no plane to compare with.
    gap_mm
        Length of the way, mm.

    Notes
    -----
    Two wires at s over a plane at h: L' = mu0/pi ln(s/r) - mu0/(2 pi) ln(1 + (s/2h)^2), by images
    (textbook). Without the plane the second term is gone.

    Examples
    --------
    >>> round(open_odd_nh(0.3, 0.2, 1.0), 3)
    0.089
    """
    if height_mm is None:
        return 0.0
    return gap_mm * MU0 / (2.0 * pi) * log(1.0 + (apart_mm / (2.0 * height_mm)) ** 2)


def _height_mm(scene: Scene, finding: Finding) -> float | None:
    """Height of a finding's trace over its plane, or over the nearest one if it has none."""
    numbers = {layer.name: layer.number for layer in scene.board.stack.layers}
    layer = numbers[finding.layer]
    others = [numbers[finding.plane_layer]] if finding.plane_layer else sorted(scene.planes)
    heights = [scene.board.stack.height_mm(layer, other) for other in others if other != layer]
    return min(heights, default=None)
