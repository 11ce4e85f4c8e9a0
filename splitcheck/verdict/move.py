"""How a board lies in two revisions of its files: turned by what angle, moved by how much.

A board may be moved on its drawing sheet without anything on it having changed. Places that both
revisions know by name, and the bounds of the outline, tell how.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Sequence
from itertools import product
from math import pi, radians
from typing import NamedTuple, TypeAlias

import numpy as np
from numpy.typing import NDArray

from splitcheck.verdict.changes import Move, family
from splitcheck.verdict.findings import Point, Report

Floats: TypeAlias = NDArray[np.float64]
#: Names a layer the same in both revisions; see `match.layer_keys`.
Keys: TypeAlias = dict[str, str]

#: Places nearer than this after the move are the same, mm.
NEAR_MM = 0.3
#: Outlines whose bounds differ by no more are of one size, mm.
SAME_SIZE_MM = 0.05
#: A name with more places than this in either revision says too little.
_MOST_OF_A_NAME = 4
_MOST_PAIRS = 4000
_MOST_FOR_ANGLES = 300
#: Two places nearer than this say too little about an angle, mm.
_APART_MM = 5.0
#: An outline that fits counts as many places, or this share of all, whichever is more.
_OUTLINE_PLACES, _OUTLINE_SHARE = 3.0, 0.3
_PLACED = re.compile(r"@L(\d+)\((-?\d+\.\d+),(-?\d+\.\d+)\)")
#: Names that layout programs give to nets without one, and give anew when a part is renumbered:
#: N$12, Net-(R1-Pad2), unconnected-(J1-Pad3), NetR1_2, N01234, $1N45, $$$12345, unnamed_net7
#: (common practice, no source).
_AUTOMATIC = re.compile(
    r"@L\d|N\$\d+$|/?(?:[^/]+/)*(?:Net-|unconnected-)\(|Net[A-Z]+\d+_\w+$|N\d{4,}$|\$\d*N\d+$"
    r"|\$\$\$\d+$|unnamed_net\d+$|Net\s?\d+$",
    re.IGNORECASE,
)


class _Pairs(NamedTuple):
    """Places that may be the same: row by row, older and newer."""

    was: Floats
    """Shape (n, 2), mm."""
    now: Floats
    names: NDArray[np.intp]
    """Number of the name that each row has; a name counts once."""
    total: int
    """How many names there are."""


def is_automatic(net: str) -> bool:
    """Whether nobody gave a net its name, so that another name may be the same net.

    Examples
    --------
    >>> is_automatic("@L1(12.30,4.00)"), is_automatic("N$12"), is_automatic("Net-(R1-Pad2)")
    (True, True, True)
    >>> is_automatic("SDA"), is_automatic("NETWORK_RX1"), is_automatic("N12V")
    (False, False, False)
    """
    return _AUTOMATIC.match(net) is not None


def find_move(was: Report, now: Report, layers: tuple[Keys, Keys]) -> Move:
    """How the newer files lie against the older ones.

    Parameters
    ----------
    was, now
        The revisions.
    layers
        What each layer of either revision is called in both.

    Notes
    -----
    Tried are (1) no move at all, (2) the four moves by quarter turns that bring the bounds of one
    outline onto the other, if both are known and of one size, (3) quarter turns and (4) any other
    turn with the shift that most places agree on. The one that brings most names to their place
    is taken; an outline that fits counts for three names or 30 % of them. Of equals the earlier in
    this order is taken, so that a board is not moved without need.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> find_move(empty, empty, ({}, {}))
    Move(turned_rad=0.0, shift_mm=(0.0, 0.0))
    """
    pairs = _pairs(_anchors(was, layers[0]), _anchors(now, layers[1]))
    fitting = list(_by_outline(was, now))
    bonus = max(_OUTLINE_PLACES, _OUTLINE_SHARE * pairs.total)
    best, most = Move(), -1.0
    for move in (Move(), *fitting, *_by_places(pairs)):
        score = _agreeing(pairs, move) + bonus * any(_same(move, fit) for fit in fitting)
        if score > most:
            best, most = move, score
    return best


def _anchors(report: Report, layers: Keys) -> dict[tuple[str, ...], list[Point]]:
    """Places of a board by a name that both revisions give them."""
    anchors: dict[tuple[str, ...], list[Point]] = defaultdict(list)
    for finding in report.findings:
        where = (layers.get(finding.layer, ""), layers.get(finding.plane_layer, ""))
        net = "" if is_automatic(finding.net) else finding.net
        size = "" if net else f"{finding.gap_mm:.2f}"
        anchors["finding", family(finding.kind), net, size, *where].append(finding.at_mm)
    for row in report.nets:
        found = _PLACED.match(row.name)
        if found:  # its length does not change when the board is moved
            place = (float(found[2]), float(found[3]))
            anchors["net", found[1], f"{row.length_mm:.2f}"].append(place)
        else:
            if is_automatic(row.name):
                continue
            for leg in row.journey:
                anchors["leg", row.name, leg.kind, layers.get(leg.layer, "")].append(leg.at_mm)
    return anchors


def _pairs(
    was: dict[tuple[str, ...], list[Point]], now: dict[tuple[str, ...], list[Point]]
) -> _Pairs:
    rows: list[tuple[Point, Point, int]] = []
    names = 0
    for name in sorted(set(was) & set(now)):
        older, newer = was[name], now[name]
        if len(older) > _MOST_OF_A_NAME or len(newer) > _MOST_OF_A_NAME or len(rows) > _MOST_PAIRS:
            continue
        rows.extend((one, other, names) for one, other in product(older, newer))
        names += 1
    return _Pairs(
        np.array([row[0] for row in rows]).reshape(-1, 2),
        np.array([row[1] for row in rows]).reshape(-1, 2),
        np.array([row[2] for row in rows], dtype=np.intp),
        names,
    )


def _by_outline(was: Report, now: Report) -> Iterator[Move]:
    """The quarter turns that bring one outline's bounds onto the other's."""
    if was.corner_mm is None or now.corner_mm is None:
        return
    (wide, high), (x, y) = was.size_mm, was.corner_mm
    corners = np.array([(x, y), (x + wide, y), (x + wide, y + high), (x, y + high)])
    for angle in _QUARTERS:
        turned = corners @ _matrix(angle).T
        size = turned.max(axis=0) - turned.min(axis=0)
        if np.abs(size - now.size_mm).max() <= SAME_SIZE_MM:
            yield _move(angle, np.array(now.corner_mm) - turned.min(axis=0))


def _by_places(pairs: _Pairs) -> Iterator[Move]:
    """The shifts that most places agree on, for quarter turns and the likeliest other turns."""
    if not len(pairs.was):
        return
    for angle in (*_QUARTERS, *_likely_angles(pairs)):
        shifts = pairs.now - pairs.was @ _matrix(angle).T
        bins = np.round(shifts).astype(np.int64)
        kinds, counts = np.unique(bins, axis=0, return_counts=True)
        middle = kinds[counts.argmax()]
        agreeing = shifts[np.abs(shifts - middle).max(axis=1) <= 1.0]
        yield _move(angle, np.median(agreeing, axis=0))


def _likely_angles(pairs: _Pairs) -> list[float]:
    """Angles between lines through two places each, the most frequent three, radians."""
    few = slice(0, _MOST_FOR_ANGLES)
    was, now, names = pairs.was[few], pairs.now[few], pairs.names[few]
    one, other = np.triu_indices(len(was), 1)
    apart = names[one] != names[other]
    older, newer = (p[other[apart]] - p[one[apart]] for p in (was, now))
    lengths = np.hypot(*older.T)
    alike = (np.abs(np.hypot(*newer.T) - lengths) < 0.05) & (lengths > _APART_MM)
    if not alike.any():
        return []
    older, newer = older[alike], newer[alike]
    angles = np.arctan2(newer[:, 1], newer[:, 0]) - np.arctan2(older[:, 1], older[:, 0])
    angles = (angles + pi) % (2 * pi) - pi
    bins = np.round(np.degrees(angles)).astype(np.int64)
    kinds, counts = np.unique(bins, return_counts=True)
    most = kinds[np.argsort(-counts, kind="stable")[:3]]
    near = (angles[np.abs(np.degrees(angles) - middle) <= 1.0] for middle in most)
    return [float(np.median(some)) for some in near]


def _agreeing(pairs: _Pairs, move: Move) -> int:
    """How many names have one of their places where the move brings it."""
    if not len(pairs.was):
        return 0
    moved = pairs.was @ _matrix(move.turned_rad).T + np.array(move.shift_mm)
    near = np.hypot(*(moved - pairs.now).T) <= NEAR_MM
    return len(np.unique(pairs.names[near]))


def _same(one: Move, other: Move) -> bool:
    """Whether two moves bring the corner of a board of usual size to the same place."""
    turned = abs((one.turned_rad - other.turned_rad + pi) % (2 * pi) - pi)
    shifts: Sequence[float] = np.subtract(one.shift_mm, other.shift_mm).tolist()
    return turned < radians(0.05) and max(map(abs, shifts)) <= NEAR_MM


_QUARTERS = (0.0, pi / 2, -pi / 2, pi)


def _matrix(angle: float) -> Floats:
    c, s = np.cos(angle), np.sin(angle)
    if angle in _QUARTERS:  # exact, so that a board that only turned keeps its places to the digit
        c, s = np.round(c), np.round(s)
    return np.array([[c, -s], [s, c]])


def _move(angle: float, shift: Floats) -> Move:
    x, y = shift.tolist()
    return Move(float(angle), (round(x, 4) + 0.0, round(y, 4) + 0.0))
