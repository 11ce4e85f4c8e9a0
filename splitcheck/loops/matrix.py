"""Panels in, their interaction out: the mean of the potential of each panel over each other."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from splitcheck.loops.kernels import outline_potential, plate_images_squared, rectangle_self
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

#: Panels this close (distance against the sum of their radii) are integrated in closed form,
_TOUCHING = 1.05
#: these by four points each, and all others by their second moments.
_NEARBY = 2.0
#: Rows of the matrix that are filled at a time.
_BLOCK = 48


def interaction(panels: Panels, plates_mm: Sequence[float]) -> Floats:
    """Mean of g_up + g_down between all pairs of panels, shape (n, n), 1/mm."""
    matrix = _free(panels)
    matrix *= 2.0
    if plates_mm:
        matrix += _images(panels, plates_mm)
    return matrix


def _free(panels: Panels) -> Floats:
    """Mean of 1/r between all pairs, by how far apart they are."""
    count = len(panels)
    matrix = np.empty((count, count))
    if not count:
        return matrix
    pairs: list[tuple[Ints, Ints, NDArray[np.bool_]]] = []
    for start in range(0, count, _BLOCK):
        # only the upper half, a strip of rows at a time that stays in the cache
        rows, block = slice(start, start + _BLOCK), slice(start, None)
        far, close, touching = _by_moments(panels, rows, block)
        matrix[rows, block] = far
        matrix[block, rows] = far.T
        first, second = np.nonzero(np.triu(close, 1))
        pairs.append((first + start, second + start, touching[first, second]))
    first, second, touch = (np.concatenate(part) for part in zip(*pairs, strict=True))
    i, j = first[~touch], second[~touch]
    matrix[i, j] = matrix[j, i] = _by_points(panels, i, j)
    i, j = first[touch], second[touch]
    matrix[i, j] = matrix[j, i] = _by_outline(panels, i, j)
    diagonal = np.arange(count)
    matrix[diagonal, diagonal] = _self(panels)
    return matrix


def _by_moments(
    panels: Panels, rows: slice, block: slice
) -> tuple[Floats, NDArray[np.bool_], NDArray[np.bool_]]:
    """Mean of 1/r by second moments, and which pairs are too close for it, or even touch.

    With the second moments T of both panels <1/r> = 1/R + (T : grad grad 1/R)/2.
    """
    at, moved = panels.centre[rows, None], panels.centre[None, block]
    dx, dy = at[:, :, 0] - moved[:, :, 0], at[:, :, 1] - moved[:, :, 1]
    xx, yy = dx * dx, dy * dy
    square = xx + yy
    reach = (panels.radius[rows, None] + panels.radius[None, block]) ** 2
    close = square < _NEARBY**2 * reach
    touching = square < _TOUCHING**2 * reach
    np.maximum(square, 1e-18, out=square)
    a, c, b = (panels.spread[rows, None, k] + panels.spread[None, block, k] for k in range(3))
    bend = a * (2 * xx - yy)
    bend += b * (2 * yy - xx)
    dx *= dy
    dx *= 6 * c
    bend += dx
    bend *= 0.5
    bend /= square
    bend /= square
    bend += 1.0
    bend /= np.sqrt(square)
    return bend, close, touching


def _by_points(panels: Panels, i: Ints, j: Ints) -> Floats:
    total = np.zeros(len(i))
    for a in range(4):
        dx = panels.points[i, a, None, 0] - panels.points[j, :, 0]
        dy = panels.points[i, a, None, 1] - panels.points[j, :, 1]
        total += (1.0 / np.sqrt(dx * dx + dy * dy)).sum(axis=1)
    return total / 16.0


def _by_outline(panels: Panels, i: Ints, j: Ints) -> Floats:
    """Closed form of the larger panel at the points of the smaller."""
    swap = panels.area[i] > panels.area[j]
    small, large = np.where(swap, j, i), np.where(swap, i, j)
    return _potential_at(panels, small, large)


def _potential_at(panels: Panels, target: Ints, source: Ints) -> Floats:
    sides = _sides(panels)[source]
    out = np.zeros(len(target))
    at = panels.points[target]
    for low, high in ((0, 4), (4, 6), (6, 10), (10, 10**6)):
        pick = np.flatnonzero((sides > low) & (sides <= high))
        if len(pick):
            width = min(high, panels.edges.shape[1])
            value = outline_potential(
                at[pick, :, 0], at[pick, :, 1], panels.edges[source[pick], :width]
            )
            out[pick] = value.mean(axis=1)
    return out / panels.area[source]


def _sides(panels: Panels) -> Ints:
    e = panels.edges
    real = (e[:, :, 0] != e[:, :, 2]) | (e[:, :, 1] != e[:, :, 3])
    return np.where(real.any(1), e.shape[1] - np.argmax(real[:, ::-1], axis=1), 0)


def _self(panels: Panels) -> Floats:
    own = np.arange(len(panels))
    rough = _potential_at(panels, own, own)
    # four points read the mean of a rectangle's own potential a little high: take that out
    a, b = panels.sides.T
    own_mean: Floats = rough * rectangle_self(a, b) / _four_points(a, b)
    return own_mean


def _four_points(a: Floats, b: Floats) -> Floats:
    zero = np.zeros_like(a)
    corners = [(zero, zero), (a, zero), (a, b), (zero, b)]
    edges = np.stack(
        [np.stack([*corners[k], *corners[(k + 1) % 4]], axis=1) for k in range(4)], axis=1
    )
    x = (0.5 - 0.5 / np.sqrt(3.0)) * a
    y = (0.5 - 0.5 / np.sqrt(3.0)) * b
    mean: Floats = outline_potential(x[:, None], y[:, None], edges)[:, 0] / (a * b)
    return mean


def _images(panels: Panels, plates_mm: Sequence[float]) -> Floats:
    """Mean of the image series between all pairs, up to a constant."""
    count = len(panels)
    total = np.empty((count, count))
    pairs: list[tuple[Ints, Ints]] = []
    constant = _constant(panels, plates_mm)
    for start in range(0, count, _BLOCK):
        rows, block = slice(start, start + _BLOCK), slice(start, None)
        at, moved = panels.centre[rows, None], panels.centre[None, block]
        square = (at[:, :, 0] - moved[:, :, 0]) ** 2 + (at[:, :, 1] - moved[:, :, 1]) ** 2
        reach = panels.radius[rows, None] + panels.radius[None, block]
        first, second = np.nonzero(np.triu(square < (_NEARBY * reach) ** 2, 1))
        pairs.append((first + start, second + start))
        far = sum((plate_images_squared(square, plate) for plate in plates_mm), constant)
        total[rows, block] = far
        total[block, rows] = far.T
    first, second = (np.concatenate(part) for part in zip(*pairs, strict=True))
    close = np.zeros(len(first))
    for a in range(4):
        dx, dy = np.moveaxis(panels.points[first, a, None] - panels.points[second], 2, 0)
        square = dx * dx + dy * dy
        close += sum(plate_images_squared(square, plate).sum(axis=1) for plate in plates_mm)
    total[first, second] = total[second, first] = close / 16.0 + constant
    own = np.arange(count)
    total[own, own] = sum((_own_images(panels, plate) for plate in plates_mm), constant)
    return total


def _constant(panels: Panels, plates_mm: Sequence[float]) -> Floats:
    """A constant that keeps the sum positive; it counts nothing for gaps without net flux."""
    far = float(np.hypot(*np.ptp(panels.centre, axis=0))) if len(panels) else 1.0
    parts = [(np.log(max(far / (2 * plate), 1.0)) + 4.0) / plate for plate in plates_mm]
    return np.array(sum(parts))


def _own_images(panels: Panels, plate: float) -> Floats:
    """Mean of the image series over all pairs of points of the equivalent rectangle."""
    nodes, weights = leggauss(6)
    u, w = (nodes + 1) / 2, weights / 2
    a, b = panels.sides.T[:, :, None] * u
    value = plate_images_squared(a[:, :, None] ** 2 + b[:, None, :] ** 2, plate)
    weight = 2 * w * (1 - u)
    mean: Floats = np.einsum("nij,i,j->n", value, weight, weight)
    return mean
