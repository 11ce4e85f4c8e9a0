"""Nets whose lines are far wider than the usual ones of the board: supplies, not signals."""

from __future__ import annotations

from collections import defaultdict
from itertools import pairwise
from math import hypot
from typing import NamedTuple

import numpy as np

from splitcheck.board.board import Board

#: Lines this many times wider than the usual one of the board are wide (common practice).
WIDE_RATIO = 3.0
#: Of a supply at least this share of the length is wide; ends at fine pins are not.
WIDE_SHARE = 0.75
#: Shorter nets are left to their class, mm: a pad's own stub says nothing.
LEAST_MM = 5.0
#: Widths over heights of lines of some 65 to 40 ohm, over woven glass (er 4.3; Hammerstad and
#: Jensen, 1980): a wide line may be one on purpose, from a radio to its antenna.
LINE_LIKE = (1.2, 2.7)


class _Line(NamedTuple):
    width_mm: float
    length_mm: float
    net: int
    line_like: bool


def wide_nets(board: Board) -> frozenset[int]:
    """Numbers of the nets that are wide lines for the most part.

    Parameters
    ----------
    board
        The board.

    Notes
    -----
    The usual width is the median of all lines by length. A line counts as wide from three times
    that on, unless its width over its height over the nearest copper layer makes it a line of some
    40 to 65 ohm. Common practice, no source: who routes a board draws its supplies wide.
    """
    lines = _lines(board)
    usual = _usual_mm(lines)
    total: dict[int, float] = defaultdict(float)
    wide: dict[int, float] = defaultdict(float)
    for line in lines:
        total[line.net] += line.length_mm
        if line.width_mm >= WIDE_RATIO * usual and not line.line_like:
            wide[line.net] += line.length_mm
    return frozenset(
        net
        for net, length in total.items()
        if length >= LEAST_MM and wide[net] >= WIDE_SHARE * length
    )


def _usual_mm(lines: list[_Line]) -> float:
    """Median width by length, mm; without end where there are no lines."""
    ranked = sorted(lines)
    sums = np.cumsum([line.length_mm for line in ranked])
    if not len(sums) or sums[-1] <= 0.0:
        return float("inf")
    return ranked[int(np.searchsorted(sums, sums[-1] / 2))].width_mm


def _lines(board: Board) -> list[_Line]:
    stack, last = board.stack, len(board.layers)
    found = []
    first = 0
    for layer in board.layers:
        next_to = [n for n in (layer.number - 1, layer.number + 1) if 1 <= n <= last]
        height = min((stack.height_mm(layer.number, n) for n in next_to), default=float("inf"))
        for line in layer.lines:
            length = sum(hypot(x1 - x0, y1 - y0) for (x0, y0), (x1, y1) in pairwise(line.points))
            like = LINE_LIKE[0] * height <= line.width_mm <= LINE_LIKE[1] * height
            found.append(_Line(line.width_mm, length, board.net_of[first + line.piece], like))
        first += len(layer.pieces)
    return found
