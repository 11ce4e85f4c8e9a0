"""Differential pairs: two nets that are the legs of one signal, known by name or by geometry."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from math import hypot
from typing import Literal, NamedTuple, TypeAlias

import numpy as np
import shapely

from splitcheck.board.board import Board
from splitcheck.board.traces import CentreLine
from splitcheck.errors import SplitcheckError
from splitcheck.units import Floats, segments

#: How a pair was known.
KnownBy: TypeAlias = Literal["name", "geometry", "name and geometry", "rules"]
#: Legs run side by side up to this distance of their centre lines: in widths, and at most in mm.
SIDE_WIDTHS = 6.0
SIDE_MOST_MM = 2.0
#: Traces within this angle are parallel (cosine of 8 degrees).
PARALLEL = 0.99
#: Legs known by geometry alone keep one spacing to this part, over this share of either, ...
SAME_SPACING = 0.1
MOSTLY = 0.75
#: ... for at least so many mm, ...
LEAST_MM = 5.0
#: ... not farther apart, from edge to edge, than so many widths, ...
CLOSE_WIDTHS = 2.0
#: ... with no third trace within so many spacings along more than this share of the way.
ALONE_SPACINGS = 2.2
ALONE_SHARE = 0.25
#: A pair whose legs run side by side for less than this, and this share of the shorter leg, is
#: one by name alone.
COUPLED_MM = 1.0
COUPLED_SHARE = 0.2


@dataclass(frozen=True, slots=True)
class Pair:
    """Two nets that are the legs of a differential pair."""

    nets: tuple[int, int]
    """Numbers of the nets; the leg that is called positive first, where names tell."""
    known_by: KnownBy
    apart_mm: float | None
    """Usual distance of the centre lines; None if they never run side by side."""
    coupled_mm: float
    """Length along which they run side by side, mm."""
    coupled: bool
    """Whether that is enough for the legs to carry one another's return."""

    def other(self, net: int) -> int:
        """The other leg."""
        return self.nets[1] if net == self.nets[0] else self.nets[0]


class Side(NamedTuple):
    """How two nets run side by side."""

    coupled_mm: float
    apart_mm: float
    even_mm: float
    """Length at the usual distance."""


#: How the trade marks the two legs: one group that holds the mark, positive and negative; what is
#: left of the name must be equal. Common practice, no source.
_MARKS: tuple[tuple[re.Pattern[str], dict[str, bool]], ...] = (
    (re.compile(r"(?<=.)([+-])"), {"+": True, "-": False}),
    (re.compile(r"(?<=.)[_.\-/ ](POS|NEG)(?![A-Z])"), {"POS": True, "NEG": False}),
    (re.compile(r"(?<=.)[_.\- ]([PNM])(?=$|[_.\-\d \])])"), {"P": True, "N": False, "M": False}),
    (re.compile(r"(?<![A-Z])D(?:ATA)?([PM])(?![A-Z])"), {"P": True, "M": False}),
    (re.compile(r"(?<=CAN)[_.\- ]?([HL])(?![A-Z])"), {"H": True, "L": False}),
    (re.compile(r"(?<=CAN)\d[_.\- ]?([HL])(?![A-Z])"), {"H": True, "L": False}),
    (re.compile(r"(?:CLK|CK|DQS|STROBE)\w*?[_.\- ]([TC])(?![A-Z])"), {"T": True, "C": False}),
    (re.compile(r"(?<=[A-Z\d])([PN])(?=$|[_.\-\d \])])"), {"P": True, "N": False}),
)
_CLOCK_BAR = re.compile(r"^(.*(?:CLK|CK|DQS)\w*)(#|_B|N)?$")
#: Names that a layout tool makes from a pin: the letter is that of a ball, no mark of a leg.
_BALL = re.compile(r"PAD[A-Z]{1,2}\d|^NET[A-Z]+\d+_[A-Z]{1,2}\d")


def legs_of(name: str) -> Iterator[tuple[str, bool]]:
    """What a net can be a leg of by its name, and whether it is the positive one; likeliest first.

    Parameters
    ----------
    name
        One name of a net.

    Yields
    ------
    The name with the mark of the leg taken out, in upper case, and the leg. Two nets are a pair if
    one has a positive and one a negative mark at the same place of names that are equal otherwise.

    Examples
    --------
    >>> [next(legs_of(name)) for name in ("USB_D+", "usb_d-", "TX0_P")]
    [('USB_D~', True), ('USB_D~', False), ('TX0_~', True)]
    >>> list(legs_of("SDA")), list(legs_of("Net-(U1-PadP1)"))
    ([], [])
    """
    upper = name.upper()
    if _BALL.search(upper):
        return
    for pattern, legs in _MARKS:
        for found in pattern.finditer(upper):
            start, stop = found.span(1)
            yield f"{upper[:start]}~{upper[stop:]}", legs[found[1]]
    if bar := _CLOCK_BAR.match(upper):
        if bar[2] == "#":
            yield f"{bar[1]}~", False
        elif bar[2] is None:
            yield f"{upper}~", True


def find_pairs(
    board: Board, nets: Iterable[int], explicit: Sequence[tuple[str, str]] = ()
) -> tuple[Pair, ...]:
    """Find the differential pairs among some nets.

    Parameters
    ----------
    board
        The board.
    nets
        Numbers of the nets that can be legs: signals.
    explicit
        Names of two nets each that are pairs whatever names and geometry say; they come first.

    Returns
    -------
    Each net in at most one pair, sorted by the numbers of their nets.

    Raises
    ------
    SplitcheckError
        If an explicit pair names a net that the board does not have, or names one twice.

    Notes
    -----
    (1) Explicit pairs. (2) Names that are equal but for a mark that the trade uses for the two
    legs. (3) Two traces of equal width that run side by side at one spacing along most of their
    length, with no third one beside them, as a bus would have. Common practice, no source.
    """
    chosen = frozenset(nets)
    sides = _sides(board, chosen)
    length, widths = _lengths(board, chosen)
    taken: set[int] = set()
    found: list[Pair] = []

    def take(one: int, other: int, known_by: KnownBy) -> None:
        taken.update((one, other))
        found.append(_pair(sides, length, (one, other), known_by))

    for one, other in _explicit(board, explicit):
        take(one, other, "rules")
    alone = _by_geometry(sides, length, widths)
    for one, other in _by_name(board, chosen):
        if not taken & {one, other}:
            by_both = _key(one, other) in alone
            take(one, other, "name and geometry" if by_both else "name")
    for one, other in sorted(alone):
        if not taken & {one, other}:
            take(one, other, "geometry")
    return tuple(sorted(found, key=lambda pair: sorted(pair.nets)))


def _key(one: int, other: int) -> tuple[int, int]:
    return (one, other) if one < other else (other, one)


def _explicit(board: Board, named: Sequence[tuple[str, str]]) -> list[tuple[int, int]]:
    numbers = {net.name: net.number for net in reversed(board.nets)}
    seen: set[str] = set()
    found = []
    for one, other in named:
        for name in (one, other):
            if name not in numbers:
                wrong = f"pair of {one} and {other}: no net is called {name}"
                raise SplitcheckError("pairs", wrong, "splitcheck read lists the nets")
            if name in seen:
                wrong = f"{name} is a leg of two pairs"
                raise SplitcheckError("pairs", wrong, "name each net once")
            seen.add(name)
        found.append((numbers[one], numbers[other]))
    return found


def _by_name(board: Board, nets: frozenset[int]) -> list[tuple[int, int]]:
    """Pairs (positive, negative) by name, likeliest first."""
    stems: dict[str, dict[bool, dict[int, int]]] = defaultdict(lambda: {True: {}, False: {}})
    for net in board.nets:
        if net.number not in nets or not net.given:
            continue
        for alias in net.name.split("|"):
            for rank, (stem, positive) in enumerate(legs_of(alias)):
                stems[stem][positive].setdefault(net.number, rank)
    ranked = [
        (rank_one + rank_other, stem, one, other)
        for stem, legs in stems.items()
        for one, rank_one in legs[True].items()
        for other, rank_other in legs[False].items()
        if one != other and len(legs[True]) == len(legs[False]) == 1
    ]
    return [(one, other) for _, _, one, other in sorted(ranked)]


def _by_geometry(
    sides: dict[tuple[int, int], Side], length: dict[int, float], widths: dict[int, set[float]]
) -> set[tuple[int, int]]:
    """Pairs of nets that run as the legs of a pair do and as nothing else does."""
    beside: dict[int, list[tuple[Side, int]]] = defaultdict(list)
    for (one, other), side in sides.items():
        beside[one].append((side, other))
        beside[other].append((side, one))
    found = set()
    for (one, other), side in sides.items():
        width = max(min(widths[one]), min(widths[other]))
        close = side.apart_mm <= (1.0 + CLOSE_WIDTHS) * width
        shared = widths[one] & widths[other]
        enough = side.even_mm >= max(LEAST_MM, MOSTLY * max(length[one], length[other]))
        if close and shared and enough and _alone(side, beside, one, other):
            found.add((one, other))
    return found


def _alone(side: Side, beside: dict[int, list[tuple[Side, int]]], one: int, other: int) -> bool:
    for leg, partner in ((one, other), (other, one)):
        for third, net in beside[leg]:
            near = third.apart_mm <= ALONE_SPACINGS * side.apart_mm
            if net != partner and near and third.coupled_mm > ALONE_SHARE * side.coupled_mm:
                return False
    return True


def _pair(
    sides: dict[tuple[int, int], Side],
    length: dict[int, float],
    nets: tuple[int, int],
    known_by: KnownBy,
) -> Pair:
    side = sides.get(_key(*nets))
    if side is None:
        return Pair(nets, known_by, None, 0.0, coupled=False)
    enough = side.coupled_mm >= max(COUPLED_MM, COUPLED_SHARE * min(length[n] for n in nets))
    return Pair(nets, known_by, round(side.apart_mm, 4), round(side.coupled_mm, 4), coupled=enough)


def _lengths(board: Board, nets: frozenset[int]) -> tuple[dict[int, float], dict[int, set[float]]]:
    """Length of the traces of every net, mm, and their widths."""
    length: dict[int, float] = defaultdict(float)
    widths: dict[int, set[float]] = defaultdict(set)
    first = 0
    for layer in board.layers:
        for line in layer.lines:
            net = board.net_of[first + line.piece]
            if net in nets:
                steps = pairwise(line.points)
                length[net] += sum(hypot(x1 - x0, y1 - y0) for (x0, y0), (x1, y1) in steps)
                widths[net].add(round(line.width_mm, 4))
        first += len(layer.pieces)
    return length, widths


def _sides(board: Board, nets: frozenset[int]) -> dict[tuple[int, int], Side]:
    """How every two nets run side by side, by their numbers, the lesser first."""
    rows: list[Floats] = []
    first = 0
    for layer in board.layers:
        rows.append(_beside(*_pieces(board, layer.lines, first, nets)))
        first += len(layer.pieces)
    table = np.concatenate(rows) if rows else np.empty((0, 4))
    if not len(table):
        return {}
    order = np.lexsort((table[:, 2], table[:, 1], table[:, 0]))
    table = table[order]
    change = (np.diff(table[:, :2], axis=0) != 0).any(axis=1)
    starts = np.concatenate([[0], np.flatnonzero(change) + 1, [len(table)]])
    return {
        (int(table[a, 0]), int(table[a, 1])): _side(table[a:b, 2], table[a:b, 3])
        for a, b in zip(starts[:-1].tolist(), starts[1:].tolist(), strict=True)
    }


def _side(apart: Floats, along: Floats) -> Side:
    """From distances, sorted, and the lengths at each."""
    total = np.cumsum(along)
    usual = float(apart[np.searchsorted(total, total[-1] / 2)])
    even = np.abs(apart - usual) <= SAME_SPACING * usual
    return Side(float(total[-1]), usual, float(along[even].sum()))


def _pieces(
    board: Board, lines: Sequence[CentreLine], first_part: int, nets: frozenset[int]
) -> tuple[Floats, Floats, Floats]:
    """Straight pieces of the traces of some nets: ends (n, 2, 2), widths and nets."""
    ends, widths, owners = [], [], []
    for line in lines:
        net = board.net_of[first_part + line.piece]
        if net not in nets:
            continue
        for start, stop in zip(line.points, line.points[1:], strict=False):
            if start != stop:
                ends.append((start, stop))
                widths.append(line.width_mm)
                owners.append(net)
    return np.array(ends).reshape(-1, 2, 2), np.array(widths), np.array(owners, dtype=float)


def _beside(ends: Floats, widths: Floats, nets: Floats) -> Floats:
    """Rows (lesser net, greater net, distance, length) of pieces that run side by side, mm."""
    if len(ends) < 2:
        return np.empty((0, 4))
    reach = np.minimum(SIDE_WIDTHS * widths, SIDE_MOST_MM)
    step = ends[:, 1] - ends[:, 0]
    length = np.hypot(step[:, 0], step[:, 1])
    ahead = step / length[:, None]
    low, high = ends.min(axis=1) - reach[:, None], ends.max(axis=1) + reach[:, None]
    # boxes alone: what is not parallel is sorted out faster below than by true distances
    i, j = shapely.STRtree(segments(ends)).query(shapely.box(*low.T, *high.T))
    keep = nets[i] < nets[j]
    i, j = i[keep], j[keep]
    keep = np.abs((ahead[i] * ahead[j]).sum(axis=1)) >= PARALLEL
    i, j = i[keep], j[keep]
    # where the ends of the second lie along the first
    at = ((ends[j] - ends[i, :1]) * ahead[i][:, None]).sum(axis=2)
    start = np.clip(at.min(axis=1), 0.0, None)
    along = np.minimum(at.max(axis=1), length[i]) - start
    # how far the second is off the first in the middle of what they share
    middle = start + along / 2
    span = at[:, 1] - at[:, 0]
    part = (middle - at[:, 0]) / np.where(np.abs(span) < 1e-9, 1.0, span)
    there = ends[j, 0] + part[:, None] * step[j]
    off = there - ends[i, 0]
    apart = np.abs(ahead[i][:, 0] * off[:, 1] - ahead[i][:, 1] * off[:, 0])
    keep = (along > 1e-6) & (apart <= np.minimum(reach[i], reach[j])) & (apart > 1e-6)
    rows: Floats = np.column_stack([nets[i], nets[j], np.round(apart, 6), along])[keep]
    return rows
