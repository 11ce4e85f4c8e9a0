"""Panels in, the same field on merged panels out: what a solve owes to the size of its panels."""

from __future__ import annotations

import numpy as np

from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

#: Panels are merged in pairs this often, so that up to four become one.
_ROUNDS = 2
#: Among so many of the nearest a panel looks for its partner.
_LOOKED_AT = 4


def merged(panels: Panels) -> Ints:
    """Put each panel together with its nearest neighbours of the same gap.

    Parameters
    ----------
    panels
        The panels.

    Returns
    -------
    Number of the merged panel of each, shape (n,), from 0 without holes.

    Examples
    --------
    >>> from shapely import LineString, box
    >>> from splitcheck.loops.grading import Grading
    >>> from splitcheck.loops.panels import cut
    >>> slot, trace = box(-0.2, -4, 0.2, 4), LineString([(-9, 0), (9, 0)])
    >>> panels = cut([slot], Grading((trace,), near_mm=0.2))
    >>> len(panels), int(merged(panels).max()) + 1
    (18, 6)
    """
    group: Ints = np.arange(len(panels))
    at, area, gap = panels.centre, panels.area, panels.gap
    for _ in range(_ROUNDS):
        if len(at) < 2:
            break
        pair = _paired(at, gap)
        whole: Floats = np.bincount(pair, area).astype(np.float64)
        at = np.stack([np.bincount(pair, area * at[:, k]) / whole for k in (0, 1)], axis=1)
        ahead = np.zeros(len(whole), dtype=np.int64)
        ahead[pair] = gap
        gap, area, group = ahead, whole, pair[group]
    return group


def _paired(at: Floats, gap: Ints) -> Ints:
    """Number of the pair of each of some places, nearest first; some stay alone."""
    from scipy.spatial import KDTree  # noqa: PLC0415 (0.1 s, only where needed)

    count, looked_at = len(at), min(_LOOKED_AT + 1, len(at))
    far, other = (np.ravel(found) for found in KDTree(at).query(at, k=looked_at))
    one, far = np.repeat(np.arange(count), looked_at), far.round(9)
    fit = (one != other) & (gap[one] == gap[other])
    first, second = np.minimum(one, other)[fit], np.maximum(one, other)[fit]
    order = np.lexsort((second, first, far[fit]))
    pair = list(range(count))
    free = [True] * count
    for a, b in zip(first[order].tolist(), second[order].tolist(), strict=True):
        if free[a] and free[b]:
            free[a] = free[b] = False
            pair[b] = a
    numbers: Ints = np.unique(pair, return_inverse=True)[1]
    return numbers


def on_merged(
    panels: Panels, group: Ints, matrix: Floats, sources: Floats
) -> tuple[Floats, Floats, Ints]:
    """Interaction and sources of merged panels with one flux density each, and their gaps.

    Parameters
    ----------
    panels
        The panels.
    group
        What `merged` says of them.
    matrix
        Their interaction, shape (n, n), as means over panels.
    sources
        Source functions as means over panels, shape (n, s).

    Returns
    -------
    Shapes (m, m), (m, s) and (m,).

    Notes
    -----
    The solve is the largest of 2 f.b - b.S b over all b; on fewer panels it is never larger, so
    that what is lost by merging tells by how much it may still grow with smaller panels.
    """
    order = np.argsort(group, kind="stable")
    first = np.searchsorted(group[order], np.arange(int(group.max(initial=-1)) + 1))
    weight = panels.area[order]
    weight = weight / np.add.reduceat(weight, first)[group[order]]
    rows = np.add.reduceat(matrix[order] * weight[:, None], first, axis=0)
    both = np.add.reduceat(rows[:, order] * weight, first, axis=1)
    means = np.add.reduceat(sources[order] * weight[:, None], first, axis=0)
    return both, means, panels.gap[order][first]
