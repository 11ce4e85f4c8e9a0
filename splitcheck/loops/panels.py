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
    area, centre, _ = moments(cuts.edges)
    # a lump keeps its moments rather than its area
    part = np.where(cuts.rim.any(axis=1), (1 + _WIDEN) * cuts.area / area - 1, 0.0)
    edges = _widened(cuts.edges, cuts.rim, part, centre)
    area, centre, spread = moments(edges)
    u, v = axes(spread)
    points = centre[:, None, :] + np.stack([u + v, u - v, v - u, -u - v], axis=1)
    reach = np.hypot(edges[:, :, 0] - centre[:, None, 0], edges[:, :, 1] - centre[:, None, 1])
    sides = np.sqrt(12.0) * np.stack([np.hypot(*u.T), np.hypot(*v.T)], axis=1)
    radius = reach.max(axis=1) if len(edges) else np.zeros(0)
    return Panels(edges, area, centre, spread, sides, points, radius, cuts.inside, cuts.gap)


def _widened(edges: Floats, rim: NDArray[np.bool_], part: Floats, centre: Floats) -> Floats:
    """Stretch panels across the rim by a part of them, away from their inner side."""
    dx, dy = edges[:, :, 2] - edges[:, :, 0], edges[:, :, 3] - edges[:, :, 1]
    length = np.where(rim, np.hypot(dx, dy), 0.0)
    whole = np.maximum(length.sum(axis=1), 1e-300)
    square = np.maximum(length, 1e-300)
    nx, ny = dy / square, -dx / square
    weight = length / whole[:, None]
    pull = np.stack(
        [(weight * nx * nx).sum(1), (weight * nx * ny).sum(1), (weight * ny * ny).sum(1)]
    )
    middle = (edges[:, :, :2] + edges[:, :, 2:]) / 2
    rim_at = (weight[:, :, None] * middle).sum(axis=1)
    touched = length.sum(axis=1) > 0
    fixed = np.where(touched[:, None], 2 * centre - rim_at, centre)
    out = edges.copy()
    for first in (0, 2):
        x = edges[:, :, first] - fixed[:, None, 0]
        y = edges[:, :, first + 1] - fixed[:, None, 1]
        out[:, :, first] += part[:, None] * (pull[0][:, None] * x + pull[1][:, None] * y)
        out[:, :, first + 1] += part[:, None] * (pull[1][:, None] * x + pull[2][:, None] * y)
    return out
