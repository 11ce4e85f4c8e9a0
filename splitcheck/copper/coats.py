"""Dark and clear marks to coats of paint: what does not overlap is painted at once."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.copper.outlines import Shapes

#: More overlaps of dark and clear boxes than this are not sorted out; runs are painted in turn.
MOST_PAIRS = 5_000_000


def coats(
    shapes: Shapes, dark: NDArray[np.bool_], most_pairs: int = MOST_PAIRS
) -> NDArray[np.int64]:
    """Give each mark a coat of paint: dark ones even, clear ones odd, in an order that counts.

    Parameters
    ----------
    shapes
        Outlines in file order, shape (n,).
    dark
        Their polarity, shape (n,).
    most_pairs
        Give up sorting beyond so many overlaps of boxes.

    Returns
    -------
    Number of the coat of each mark, shape (n,), >= 0.

    Notes
    -----
    A mark must come after the earlier marks of the other polarity that it may overlap; with all
    others it commutes. So a file that changes polarity ten thousand times is mostly painted in
    three coats.

    Examples
    --------
    >>> boxes = shapely.box([0, 1, 9, 1], 0, [3, 2, 10, 2], 1)
    >>> coats(boxes, np.array([True, False, True, True])).tolist()
    [0, 1, 0, 2]
    """
    pairs = _overlaps(shapes, dark, most_pairs)
    if pairs is None:
        changes = np.concatenate(([not dark[0]], dark[1:] != dark[:-1]))
        return np.cumsum(changes)
    earlier, later = pairs
    found = np.where(dark, 0, 1)
    starts = np.searchsorted(later, np.arange(len(shapes) + 1))
    for number in np.unique(later).tolist():
        before = found[earlier[starts[number] : starts[number + 1]]]
        found[number] = max(int(found[number]), int(before.max()) + 1)
    return found


def _overlaps(
    shapes: Shapes, dark: NDArray[np.bool_], most_pairs: int
) -> tuple[NDArray[np.int64], NDArray[np.int64]] | None:
    """Pairs (earlier, later) of opposite polarity whose boxes meet, sorted by the later one."""
    dark_at, clear_at = np.flatnonzero(dark), np.flatnonzero(~dark)
    tree = shapely.STRtree(shapes[dark_at])
    found = [np.empty((2, 0), dtype=np.int64)]
    total = 0
    for chunk in np.array_split(clear_at, max(1, len(clear_at) // 256)):
        clear, hit = tree.query(shapes[chunk])
        total += len(hit)
        if total > most_pairs:
            return None
        found.append(np.stack((chunk[clear], dark_at[hit])))
    earlier, later = np.sort(np.concatenate(found, axis=1), axis=0)
    order = np.argsort(later, kind="stable")
    return earlier[order], later[order]
