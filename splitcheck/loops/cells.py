"""Gap outlines in, pieces of graded cells out: halved until fine enough, then clipped."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.loops.boxes import clips, halved
from splitcheck.loops.grading import Grading, Sizes, TooManyPanelsError, sizes_for, wanted
from splitcheck.loops.outlines import Ints
from splitcheck.loops.pieces import Cells, Cuts, cut_out
from splitcheck.units import Floats

#: Cells reach this far beyond their gap, as part of its size; less is rounding.
_HAIR = 1e-7
_SLACK = 1e-9
#: A hole larger than this part of a cell must not lie in it whole.
_HOLE = 0.3
#: Gaps with more corners than this are clipped step by step.
_INTRICATE = 100


def laid(gaps: NDArray[np.object_], grading: Grading, least: Floats) -> Cuts:
    """Cut gaps in cells that lie along each of them.

    Parameters
    ----------
    gaps
        Polygons, prepared, mm.
    grading
        How fine, and where.
    least
        Into how many cells to cut the longer side of each gap at least.

    Returns
    -------
    The pieces.

    Raises
    ------
    TooManyPanelsError
        If there would be more than `grading.most`.
    """
    local = _around(gaps, grading)
    angle = _frame_angles(gaps, local, grading)
    cos, sin = np.cos(angle), np.sin(angle)
    turned = gaps.copy()
    askew = np.flatnonzero(angle)
    turned[askew] = _rotated(gaps[askew], cos[askew], -sin[askew])
    cuts = _clipped(turned, sizes_for(local, cos, sin, grading), least)
    c, s = cos[cuts.gap], sin[cuts.gap]
    back = np.stack([np.stack([c, s], axis=1), np.stack([-s, c], axis=1)], axis=1)
    ends = cuts.edges.reshape(len(c), -1, 2)
    return cuts._replace(
        edges=(ends @ back).reshape(cuts.edges.shape),
        inside=(cuts.inside[:, None, :] @ back)[:, 0],
    )


def _rotated(shapes: NDArray[np.object_], cos: Floats, sin: Floats) -> NDArray[np.object_]:
    """Turn each shape about the origin."""
    if not len(shapes):
        return shapes
    points, owner = shapely.get_coordinates(shapes, return_index=True)
    c, s = cos[owner], sin[owner]
    x, y = points.T
    turned: NDArray[np.object_] = shapely.set_coordinates(
        shapes.copy(), np.stack([c * x - s * y, s * x + c * y], axis=1)
    )
    return turned


def _around(gaps: NDArray[np.object_], grading: Grading) -> NDArray[np.object_]:
    """What of each gap lies around the traces: all of it, unless it is intricate."""
    local = gaps.copy()
    intricate = shapely.get_num_coordinates(gaps) > 10 * _INTRICATE
    if grading.lines and intricate.any():
        west, south, east, north = shapely.total_bounds(np.array(grading.lines, dtype=object))
        box = np.array([west - 1.0, south - 1.0, east + 1.0, north + 1.0])
        local[intricate] = clips(gaps[intricate], np.tile(box, (int(intricate.sum()), 1)))
    return local


def _frame_angles(
    gaps: NDArray[np.object_], local: NDArray[np.object_], grading: Grading
) -> Floats:
    """Direction in which to lay the cells: that of a straight gap, else that of the trace."""
    outlines = shapely.oriented_envelope(gaps)
    straight = shapely.area(gaps) > 0.8 * np.maximum(shapely.area(outlines), 1e-300)
    angle = np.zeros(len(gaps))
    for k in np.flatnonzero(straight):
        ends = shapely.get_coordinates(outlines[k])[:2]
        if len(ends) > 1:
            angle[k] = np.arctan2(*(ends[1] - ends[0])[::-1])
    lines = np.array(grading.lines, dtype=object)
    for k in np.flatnonzero(~straight):
        over = lines[shapely.intersects(gaps[k], lines)]
        if len(over):
            over = shapely.intersection(local[k], over)
            ends = shapely.get_coordinates(over[int(np.argmax(shapely.length(over)))])
            if len(ends) > 1:
                angle[k] = np.arctan2(*(ends[-1] - ends[0])[::-1])
    angle = (angle + np.pi / 4) % (np.pi / 2) - np.pi / 4
    return np.where(np.abs(angle) < 1e-9, 0.0, angle)


def _clipped(gaps: NDArray[np.object_], sizes: Sizes, least: Floats) -> Cuts:
    """Halve the cells of the bounding boxes until they are fine enough, and clip them."""
    shapely.prepare(gaps)
    grading = sizes.grading
    bounds = shapely.bounds(gaps)
    extent = (bounds[:, 2:] - bounds[:, :2]).max(axis=1)
    # a hair wider, by odd amounts, so that no cell border falls on a rim
    around = bounds + _HAIR * extent[:, None] * np.array([-1.0, -1.7, 2.3, 1.3])
    boxes, gap = _roots(around, min(grading.root_mm, grading.near_mm))
    shapes, holes = gaps[gap], _holes(gaps)
    limit = (extent / least)[:, None]
    done: list[tuple[Floats, NDArray[np.object_], Ints]] = []
    count = 0
    while len(boxes):
        size = boxes[:, 2:] - boxes[:, :2]
        middle = (boxes[:, :2] + boxes[:, 2:]) / 2
        most = np.minimum(wanted(sizes, middle, gap), limit[gap])
        over = size > most * 1.2
        open_ = np.flatnonzero(~over.all(axis=1))
        swallow = _swallows(boxes[open_], most[open_].min(axis=1), gap[open_], holes)
        over[open_[swallow]] = True
        fine = ~over.any(axis=1)
        done.append((boxes[fine], shapes[fine], gap[fine]))
        count += int(fine.sum())
        boxes, owner = halved(boxes[~fine], middle[~fine], over[~fine])
        if count + len(boxes) > grading.most:
            raise TooManyPanelsError
        boxes, shapes, gap = _met(gaps, boxes, shapes[~fine][owner], gap[~fine][owner])
    boxes, shapes, gap = (np.concatenate(part) for part in zip(*done, strict=True))
    return cut_out(gaps, Cells(boxes, shapes, gap, _SLACK * extent[gap]), grading)


def _met(
    gaps: NDArray[np.object_], boxes: Floats, shapes: NDArray[np.object_], gap: Ints
) -> tuple[Floats, NDArray[np.object_], Ints]:
    """Cells that meet their gap, each with the part of an intricate gap that is left in it."""
    met = shapely.intersects(gaps[gap], shapely.box(*boxes.T))
    boxes, shapes, gap = boxes[met], shapes[met], gap[met]
    intricate = shapely.get_num_coordinates(shapes) > _INTRICATE
    if intricate.any():
        shapes[intricate] = clips(shapes[intricate], boxes[intricate])
    return boxes, shapes, gap


def _roots(around: Floats, near_mm: float) -> tuple[Floats, Ints]:
    """First cells: halving them shall lead close to the size wanted, not up to twice below it.

    Returns them and the number of the gap of each.
    """
    sides = (around[:, 2:] - around[:, :2]) / near_mm
    roots: list[Floats] = []
    for box, ratios in zip(around.tolist(), sides.tolist(), strict=True):
        columns, rows = (_division(ratio) for ratio in ratios)
        if columns == rows == 1:
            roots.append(np.array([box]))
            continue
        x = np.linspace(box[0], box[2], columns + 1)
        y = np.linspace(box[1], box[3], rows + 1)
        corners = [np.repeat(x[:-1], rows), np.tile(y[:-1], columns)]
        corners += [np.repeat(x[1:], rows), np.tile(y[1:], columns)]
        roots.append(np.stack(corners, axis=1))
    return np.concatenate(roots), np.repeat(np.arange(len(roots)), [len(r) for r in roots])


def _division(ratio: float) -> int:
    """First division of a side that is `ratio` final cells long: 4 to 7, or 1 where it is short."""
    if ratio < 40:
        return 1
    halvings = int(np.floor(np.log2(ratio / 4)))
    return int(np.ceil(ratio / 1.1 / 2**halvings))


def _holes(gaps: NDArray[np.object_]) -> Sequence[tuple[int, Floats]]:
    """Numbers of the gaps that have holes, and the bounds of these, shape (k, 4)."""
    with_holes = np.flatnonzero(shapely.get_num_interior_rings(gaps))
    return [
        (int(k), shapely.bounds(shapely.get_rings(gaps[k])[1:]).reshape(-1, 4)) for k in with_holes
    ]


def _swallows(
    boxes: Floats, most: Floats, gap: Ints, holes: Sequence[tuple[int, Floats]]
) -> NDArray[np.bool_]:
    """Which cells hold a whole hole that is not small, in them or against what is wanted."""
    swallowed = np.zeros(len(boxes), dtype=bool)
    for number, hole in holes:
        mine = np.flatnonzero(gap == number)
        if len(mine):
            west, south, east, north = boxes[mine].T[:, :, None]
            inside = (west < hole[:, 0]) & (south < hole[:, 1])
            inside &= (east > hole[:, 2]) & (north > hole[:, 3])
            cell, which = np.nonzero(inside)
            box = boxes[mine[cell]]
            side = np.maximum((box[:, 2:] - box[:, :2]).min(axis=1), most[mine[cell]])
            large = (hole[which, 2:] - hole[which, :2]).max(axis=1) > _HOLE * side
            swallowed[mine[cell[large]]] = True
    return swallowed
