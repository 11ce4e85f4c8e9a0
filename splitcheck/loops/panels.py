"""Gap outlines in, graded panels out: small pieces of the gaps, each with one flux density."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import Polygon

from splitcheck.loops.cells import laid
from splitcheck.loops.grading import Grading
from splitcheck.loops.outlines import Ints, axes, edges_of, moments
from splitcheck.loops.pieces import Cuts, stacked
from splitcheck.units import Floats

#: A panel at the rim is widened by this part of its thickness there. The density rises towards
#: the rim as one over the root of the distance; for a strip cut into n equal cells of uniform
#: density this widening gives back the exact capacity (0.1204 for n = 1 and 2, 0.1152 for many).
_WIDEN = 0.118
#: A gap that asks for no more panels along its side than this is cut into four.
_FEW = 2.5
_QUARTERS = 1.075


@dataclass(frozen=True, slots=True)
class Panels:
    """The panels of all gaps, as arrays with one row a panel."""

    edges: Floats
    """Outlines as edges, shape (n, m, 4), mm, widened at the rim; unused edges have no length."""
    area: Floats
    """mm^2, shape (n,)."""
    centre: Floats
    """Centroids, shape (n, 2), mm."""
    spread: Floats
    """Second moments per area about the centroid, shape (n, 3) as xx, xy, yy, mm^2."""
    sides: Floats
    """Sides of the rectangle of the same second moments, shape (n, 2), mm, longer first."""
    points: Floats
    """Four points of equal weight that have the same second moments, shape (n, 4, 2), mm."""
    radius: Floats
    """Largest distance of a corner from the centroid, shape (n,), mm."""
    inside: Floats
    """A point of the gap in each panel, shape (n, 2), mm."""
    gap: Ints
    """Number of the gap each panel belongs to, shape (n,)."""

    def __len__(self) -> int:
        return len(self.area)


def cut(gaps: Sequence[Polygon], grading: Grading, least: Sequence[float] = ()) -> Panels:
    """Cut gaps into graded panels.

    Parameters
    ----------
    gaps
        Valid polygons that do not overlap, mm; holes are copper.
    grading
        How fine, and where.
    least
        For each gap, into how many panels to cut its longer side at least; 4 if not given.

    Returns
    -------
    The panels of all gaps, in the order of the gaps.

    Examples
    --------
    >>> slot, trace = shapely.box(-0.2, -4, 0.2, 4), shapely.LineString([(-9, 0), (9, 0)])
    >>> panels = cut([slot], Grading((trace,), near_mm=0.2))
    >>> round(float(panels.area.sum() / slot.area), 2)
    1.12
    """
    wanted = np.array(least or [4.0] * len(gaps))
    shapes = np.empty(len(gaps), dtype=object)
    shapes[:] = gaps
    shapely.prepare(shapes)
    few = np.flatnonzero(wanted <= _FEW)
    found = [_quarters(shapes[few], few)] if len(few) else []
    many = np.flatnonzero(wanted > _FEW)
    if len(many):
        pieces = laid(shapes[many], grading, wanted[many])
        found.append(pieces._replace(gap=many[pieces.gap]))
    return _measured(stacked(found))


def _quarters(gaps: NDArray[np.object_], numbers: Ints) -> Cuts:
    """Four rectangles for each gap that sees the same field all over.

    Together they have the second moments of the gap, for which a rectangle and a disc are as easily
    polarised, and are larger by what four panels alone lack (1.07 for a square, 1.05 to 1.12 for
    4 : 1, against many panels).
    """
    centre, spread = moments(edges_of(gaps))[1:]
    u, v = (_QUARTERS * np.sqrt(3.0) * axis for axis in axes(spread))
    square = np.array([[0, 0], [1, 0], [1, 1], [0, 1]])
    steps = square + np.array([[[-1, -1]], [[0, -1]], [[0, 0]], [[-1, 0]]])
    along, aside = steps[None, :, :, :1], steps[None, :, :, 1:]
    ring = centre[:, None, None] + along * u[:, None, None] + aside * v[:, None, None]
    ring = ring.reshape(-1, 4, 2)
    edges = np.concatenate([ring, np.roll(ring, -1, axis=1)], axis=2)
    rim = np.array([[1, 0, 0, 1], [1, 1, 0, 0], [0, 1, 1, 0], [0, 0, 1, 1]], dtype=bool)
    area = np.repeat(np.hypot(*u.T) * np.hypot(*v.T), 4)
    return Cuts(edges, np.tile(rim, (len(gaps), 1)), area, ring.mean(axis=1), np.repeat(numbers, 4))


def _measured(cuts: Cuts) -> Panels:
    """Widen panels at the rim, up to what their true area asks for, and measure them."""
    area, centre, spread = moments(cuts.edges)
    edges = cuts.edges.copy()
    # a lump keeps its moments rather than its area
    some = np.flatnonzero(cuts.rim.any(axis=1))
    if len(some):
        part = (1 + _WIDEN) * cuts.area[some] / area[some] - 1
        edges[some] = _widened(edges[some], cuts.rim[some], part, centre[some])
        area[some], centre[some], spread[some] = moments(edges[some])
    u, v = axes(spread)
    points = centre[:, None, :] + np.stack([u + v, u - v, v - u, -u - v], axis=1)
    x, y = edges[:, :, 0] - centre[:, :1], edges[:, :, 1] - centre[:, 1:]
    radius = np.sqrt((x * x + y * y).max(axis=1, initial=0.0))
    sides = np.sqrt(12.0) * np.stack([np.hypot(*u.T), np.hypot(*v.T)], axis=1)
    return Panels(edges, area, centre, spread, sides, points, radius, cuts.inside, cuts.gap)


def _widened(edges: Floats, rim: NDArray[np.bool_], part: Floats, centre: Floats) -> Floats:
    """Stretch panels across the rim by a part of them, away from their inner side."""
    row, place = np.nonzero(rim)
    x1, y1, x2, y2 = edges[row, place].T
    dx, dy = x2 - x1, y2 - y1
    length = np.hypot(dx, dy)
    whole = np.bincount(row, length, minlength=len(edges))
    weight = length / whole[row]
    square = np.maximum(length * length, 1e-300)

    def mean(values: Floats) -> Floats:
        return np.bincount(row, weight * values, minlength=len(edges)).astype(np.float64)

    # the mean of n n over the rim, with n the normal on each of its edges
    xx, xy = part * mean(dy * dy / square), part * mean(-dx * dy / square)
    yy = part * mean(dx * dx / square)
    fixed_x = 2 * centre[:, 0] - mean((x1 + x2) / 2)
    fixed_y = 2 * centre[:, 1] - mean((y1 + y2) / 2)
    out = np.empty_like(edges)
    for first in (0, 2):
        x, y = edges[:, :, first], edges[:, :, first + 1]
        away_x, away_y = x - fixed_x[:, None], y - fixed_y[:, None]
        out[:, :, first] = x + xx[:, None] * away_x + xy[:, None] * away_y
        out[:, :, first + 1] = y + xy[:, None] * away_x + yy[:, None] * away_y
    return out
