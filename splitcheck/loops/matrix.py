"""Panels in, their interaction out: the mean of the potential of each panel over each other."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from splitcheck.loops.kernels import (
    edges_potential,
    images_rise,
    outline_potential,
    plate_images_squared,
    rectangle_self,
)
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

#: Panels this close (distance against the sum of their radii) are integrated in closed form,
_TOUCHING = 1.05
#: these by four points each, and all others by their second moments.
_NEARBY = 2.0
#: Panels whose radii add up to less than this part of the distance of a plane see its images by
#: their second moments as well.
_SMALL = 1.0
#: Places and weights of the Gauss rule from 0 to 1 along either side of a panel.
_NODES, _WEIGHTS = (leggauss(6)[0] + 1) / 2, leggauss(6)[1] / 2
#: Rows of the matrix that are filled at a time.
_BLOCK = 48


def interaction(panels: Panels, plates_mm: Sequence[float]) -> Floats:
    """Mean of g_up + g_down between all pairs of panels, shape (n, n), 1/mm.

    With planes it is so up to a constant, which counts nothing for gaps without net flux.
    """
    count = len(panels)
    matrix = np.empty((count, count))
    if not count:
        return matrix
    constant = _constant(panels, plates_mm)
    pairs: list[tuple[Ints, Ints, NDArray[np.bool_]]] = []
    for start in range(0, count, _BLOCK):
        # only the upper half, a strip of rows at a time that stays in the cache
        rows, block = slice(start, start + _BLOCK), slice(start, None)
        far, square, close, touching = _by_moments(panels, rows, block)
        far *= 2.0
        for plate in plates_mm:
            far += plate_images_squared(square, plate)
        far += constant
        matrix[rows, block] = far
        matrix[block, rows] = far.T
        first, second = np.nonzero(close)
        ahead = second > first
        first, second = first[ahead], second[ahead]
        pairs.append((first + start, second + start, touching[first, second]))
    i, j, touch = (np.concatenate(part) for part in zip(*pairs, strict=True))
    own = np.arange(count)
    by_points = _by_points(panels, i[~touch], j[~touch])
    by_outline, by_own = _by_outline(panels, i[touch], j[touch])
    matrix[i[~touch], j[~touch]] = 2.0 * by_points
    matrix[i[touch], j[touch]] = 2.0 * by_outline
    matrix[own, own] = 2.0 * by_own + constant
    matrix[i, j] += constant
    for plate in plates_mm:
        matrix[i, j] += _images(panels, i, j, plate)
        matrix[own, own] += _own_images(panels, plate)
    matrix[j, i] = matrix[i, j]
    return matrix


def _by_moments(
    panels: Panels, rows: slice, block: slice
) -> tuple[Floats, Floats, NDArray[np.bool_], NDArray[np.bool_]]:
    """Mean of 1/r by second moments, squares of r, and pairs too close for it, or even touching.

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
    return bend, square, close, touching


def _by_points(panels: Panels, i: Ints, j: Ints) -> Floats:
    total = np.zeros(len(i))
    for square in _squares(panels, i, j):
        total += (1.0 / np.sqrt(square)).sum(axis=0)
    return total / 16.0


def _squares(panels: Panels, i: Ints, j: Ints) -> Sequence[Floats]:
    """Squared distances of each of the four points of one panel from all four of the other."""
    (x1, y1), (x2, y2) = panels.points[i].T, panels.points[j].T
    return [(x1[a] - x2) ** 2 + (y1[a] - y2) ** 2 for a in range(4)]


def _by_outline(panels: Panels, i: Ints, j: Ints) -> tuple[Floats, Floats]:
    """Closed form of the larger panel at the points of the smaller; and of each at its own."""
    swap = panels.area[i] > panels.area[j]
    small, large = np.where(swap, j, i), np.where(swap, i, j)
    own = np.arange(len(panels))
    mean = _potential_at(panels, np.concatenate([small, own]), np.concatenate([large, own]))
    # four points read the mean of a rectangle's own potential a little high: take that out
    a, b = panels.sides.T
    own_mean = mean[len(i) :] * rectangle_self(a, b) / _four_points(a, b)
    return mean[: len(i)], own_mean


def _potential_at(panels: Panels, target: Ints, source: Ints) -> Floats:
    """Mean potential of panels over the four points of others."""
    real = (panels.edges[:, :, :2] != panels.edges[:, :, 2:]).any(axis=2)
    real[:, 0] = True
    count = real.sum(axis=1)
    begin = np.cumsum(count) - count
    first = np.cumsum(count[source]) - count[source]
    which = np.repeat(begin[source] - first, count[source])
    which += np.arange(len(which))
    x, y = np.moveaxis(panels.points[target], 2, 0)
    value = edges_potential(x, y, panels.edges[real][which], first)
    mean: Floats = value.mean(axis=1) / panels.area[source]
    return mean


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


def _images(panels: Panels, i: Ints, j: Ints, plate: float) -> Floats:
    """Mean of the image series between pairs of panels that are close.

    A function of the square s of the distance d has the mean K + K' tr T + 2 K'' d.T d over panels
    with the second moments T; images are smooth where panels are small against their distance.
    """
    small = panels.radius[i] + panels.radius[j] < _SMALL * plate
    value = np.empty(len(i))
    k, m = i[small], j[small]
    x, y = (panels.centre[k] - panels.centre[m]).T
    xx, xy, yy = (panels.spread[k] + panels.spread[m]).T
    square = x * x + y * y
    rise, bend = images_rise(square, plate)
    value[small] = plate_images_squared(square, plate) + rise * (xx + yy)
    value[small] += 2.0 * bend * (x * x * xx + 2.0 * x * y * xy + y * y * yy)
    total = np.zeros(len(i) - len(k))
    for square in _squares(panels, i[~small], j[~small]):
        total += plate_images_squared(square, plate).sum(axis=0)
    value[~small] = total / 16.0
    return value


def _constant(panels: Panels, plates_mm: Sequence[float]) -> float:
    """A constant that keeps the sum positive; it counts nothing for gaps without net flux."""
    far = float(np.hypot(*np.ptp(panels.centre, axis=0)))
    return float(sum((np.log(max(far / (2 * plate), 1.0)) + 4.0) / plate for plate in plates_mm))


def _own_images(panels: Panels, plate: float) -> Floats:
    """Mean of the image series over all pairs of points of the equivalent rectangle."""
    u, w = _NODES, _WEIGHTS
    a, b = panels.sides.T[:, :, None] * u
    value = plate_images_squared(a[:, :, None] ** 2 + b[:, None, :] ** 2, plate)
    weight = 2 * w * (1 - u)
    mean: Floats = np.einsum("nij,i,j->n", value, weight, weight)
    return mean
