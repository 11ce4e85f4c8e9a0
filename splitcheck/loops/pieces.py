"""Cells and gaps in, pieces of the gaps out: clipped, cut on until compact, with their rims."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.loops.boxes import clips, halved
from splitcheck.loops.grading import Grading, TooManyPanelsError
from splitcheck.loops.outlines import Ints, axes, box_edges, edges_of, moments, padded
from splitcheck.units import Floats

#: Pieces smaller than this part of their cell are dropped.
_SLIVER = 1e-4
#: Pieces with more corners than this, or that fill less than this of their hull, are cut again.
_MOST_CORNERS = 24
_HOLLOW = 0.6
#: Of so many pieces in one cell at most panels are made.
_MOST_PARTS = 6
#: Intricate pieces are not cut on if they are this many times as large as a panel at the trace.
_LARGE = 12.0


class Cuts(NamedTuple):
    """Pieces of a gap on their way to be panels."""

    edges: Floats
    rim: NDArray[np.bool_]
    """Which edges lie on the rim of the gap."""
    area: Floats
    """Areas that the pieces stand for."""
    inside: Floats
    """A point in each of them."""
    gap: Ints
    """Number of the gap each is of."""


def stacked(cuts: Sequence[Cuts]) -> Cuts:
    """Put pieces together; all get as many edges as the one with most."""
    full = [some for some in cuts if len(some.area)]
    if not full:
        none = np.zeros((0, 1, 4))
        return Cuts(none, none[:, :, 0] > 0, none[:, 0, 0], none[:, 0, :2], np.zeros(0, np.int64))
    widest = max(some.edges.shape[1] for some in full)
    return Cuts(
        np.concatenate([padded(some.edges, widest) for some in full]),
        np.concatenate([np.pad(s.rim, ((0, 0), (0, widest - s.rim.shape[1]))) for s in full]),
        np.concatenate([some.area for some in full]),
        np.concatenate([some.inside for some in full]),
        np.concatenate([some.gap for some in full]),
    )


class Cells(NamedTuple):
    """Cells and what they lie over."""

    boxes: Floats
    shapes: NDArray[np.object_]
    """The gap, or the part of it that is left in the cell."""
    gap: Ints
    slack: Floats
    """What counts as on the border of a cell, mm."""

    def take(self, which: NDArray[np.bool_] | Ints) -> Cells:
        """Some of the cells."""
        return Cells(self.boxes[which], self.shapes[which], self.gap[which], self.slack[which])


def cut_out(gaps: NDArray[np.object_], cells: Cells, grading: Grading) -> Cuts:
    """Clip cells to their gaps."""
    whole = shapely.contains_properly(gaps[cells.gap], shapely.box(*cells.boxes.T))
    inner = cells.boxes[whole]
    middle, size = (inner[:, :2] + inner[:, 2:]) / 2, inner[:, 2:] - inner[:, :2]
    off_rim = np.zeros((len(inner), 4), dtype=bool)
    cuts = [Cuts(box_edges(inner), off_rim, size.prod(axis=1), middle, cells.gap[whole])]
    if not whole.all():
        plain, hollow = _plain_pieces(cells.take(~whole), grading)
        if len(plain.gap):
            area = shapely.area(plain.shapes)
            edges = edges_of(shapely.orient_polygons(_simpler(plain.shapes, area)))
            rim = _on_rim(edges, plain)
            cuts.append(Cuts(edges, rim, area, _points_in(plain.shapes), plain.gap))
        if len(hollow.gap):
            cuts.append(_lumps(hollow.shapes, hollow.gap))
    return stacked(cuts)


def _simpler(pieces: NDArray[np.object_], area: Floats) -> NDArray[np.object_]:
    """Straighten curved rims."""
    many = np.flatnonzero(shapely.get_num_coordinates(pieces) > 7)
    if not len(many):
        return pieces
    slack = 0.03 * np.sqrt(area[many])
    rough = shapely.simplify(pieces[many], slack, preserve_topology=False)
    fit = shapely.get_type_id(rough) == shapely.GeometryType.POLYGON
    fit &= (shapely.area(rough) > 0.7 * area[many]) & shapely.is_valid(rough)
    rough[~fit] = shapely.simplify(pieces[many[~fit]], slack[~fit])
    pieces = pieces.copy()
    pieces[many] = rough
    return pieces


def _points_in(pieces: NDArray[np.object_]) -> Floats:
    return shapely.get_coordinates(shapely.point_on_surface(pieces))


def _plain_pieces(cells: Cells, grading: Grading) -> tuple[Cells, Cells]:
    """Clip to cells, and cut on what is not compact.

    Returns the compact pieces as the shapes of their cells, and what is still not compact at the
    end. Of cells that hold many pieces only the largest count.
    """
    done: list[Cells] = []
    lumps: list[Cells] = []
    for left in range(grading.rounds, -1, -1):
        pieces, owner = _parts(cells)
        if len(owner) > 3 * grading.most:
            raise TooManyPanelsError
        bounds = shapely.bounds(pieces.shapes)
        compact = _compact(pieces.shapes, bounds, grading)
        extent = bounds[:, 2:] - bounds[:, :2]
        # far from the traces, where cells are large, shapes do not matter so much
        over = extent.max(axis=1) > _LARGE * grading.near_mm * 2.0 ** (left - grading.rounds)
        end = over & (left < grading.rounds) | (left == 0)
        kept = ~end | (_rank(shapely.area(pieces.shapes), owner) < _MOST_PARTS)
        done.append(pieces.take(compact & kept))
        lumps.append(pieces.take(~compact & end & kept))
        again = ~compact & ~end
        if not again.any():
            break
        middle = (bounds[again, :2] + bounds[again, 2:]) / 2
        along = extent[again] > 0.4 * extent[again].max(axis=1)[:, None]
        boxes, half = halved(pieces.boxes[again], middle, along)
        cells = pieces.take(again).take(half)._replace(boxes=boxes)
    return (
        Cells(*(np.concatenate(column) for column in zip(*done, strict=True))),
        Cells(*(np.concatenate(column) for column in zip(*lumps, strict=True))),
    )


def _parts(cells: Cells) -> tuple[Cells, Ints]:
    """Clip shapes to their cells; the pieces, and the number of the cell each came from."""
    clipped = clips(cells.shapes, cells.boxes)
    pieces, owner = shapely.get_parts(clipped, return_index=True)
    whole = np.prod(cells.boxes[:, 2:] - cells.boxes[:, :2], axis=1)
    keep = shapely.area(pieces) > _SLIVER * whole[owner]
    owner = owner[keep]
    return cells.take(owner)._replace(shapes=pieces[keep]), owner


def _compact(pieces: NDArray[np.object_], bounds: Floats, grading: Grading) -> NDArray[np.bool_]:
    """Which pieces one density and a few points can stand for."""
    area = shapely.area(pieces)
    corners = shapely.get_num_coordinates(pieces)
    many = np.flatnonzero(corners > _MOST_CORNERS)
    slack = 0.03 * np.sqrt(area[many])
    rough = shapely.simplify(pieces[many], slack, preserve_topology=False)
    corners[many] = shapely.get_num_coordinates(rough)
    long = (bounds[:, 2:] - bounds[:, :2]).max(axis=1)
    good: NDArray[np.bool_] = corners <= _MOST_CORNERS
    good &= area > _HOLLOW * shapely.area(shapely.convex_hull(pieces))
    good &= long**2 <= grading.slender * area
    return good


def _rank(area: Floats, owner: Ints) -> Ints:
    """The how-manieth largest of its owner each piece is, from 0."""
    order = np.lexsort((-area, owner))
    first = np.searchsorted(owner[order], owner[order], side="left")
    rank = np.empty(len(area), dtype=np.int64)
    rank[order] = np.arange(len(area)) - first
    return rank


def _lumps(pieces: NDArray[np.object_], gap: Ints) -> Cuts:
    """A rectangle of the same centre and second moments in place of each intricate piece."""
    area, centre, spread = moments(edges_of(shapely.orient_polygons(pieces)))
    u, v = axes(spread)
    corners = np.stack([-u - v, u - v, u + v, v - u], axis=1)
    ring = centre[:, None, :] + np.sqrt(3.0) * corners
    edges = np.concatenate([ring, np.roll(ring, -1, axis=1)], axis=2)
    off_rim = np.zeros((len(pieces), 4), dtype=bool)
    return Cuts(edges, off_rim, area, _points_in(pieces), gap)


def _on_rim(edges: Floats, cells: Cells) -> NDArray[np.bool_]:
    """Which edges do not lie on the border of their cell, and so on the rim of the gap."""
    boxes, slack = cells.boxes, cells.slack[:, None]
    border = np.zeros(edges.shape[:2], dtype=bool)
    for axis in (0, 1):
        for side in (0, 2):
            level = boxes[:, side + axis, None]
            border |= (np.abs(edges[:, :, axis] - level) < slack) & (
                np.abs(edges[:, :, 2 + axis] - level) < slack
            )
    length = np.hypot(edges[:, :, 2] - edges[:, :, 0], edges[:, :, 3] - edges[:, :, 1])
    return ~border & (length > 0)
