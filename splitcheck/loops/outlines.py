"""Polygons as arrays of edges, and what can be said of them: areas, centres, moments, axes."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.units import Floats

Ints = NDArray[np.int64]


def padded(outline: Floats, widest: int) -> Floats:
    """Add edges of no length, all at the start of the outline."""
    room = widest - outline.shape[1]
    start = np.concatenate([outline[:, :1, :2], outline[:, :1, :2]], axis=2)
    return np.concatenate([outline, np.repeat(start, room, axis=1)], axis=1)


def box_edges(boxes: Floats) -> Floats:
    """Edges of boxes, given as west, south, east, north, shape (n, 4); result (n, 4, 4)."""
    west, south, east, north = boxes.T
    corners = np.stack([west, south, east, south, east, north, west, north], axis=1).reshape(
        -1, 4, 2
    )
    return np.concatenate([corners, np.roll(corners, -1, axis=1)], axis=2)


def edges_of(pieces: NDArray[np.object_]) -> Floats:
    """Edges of polygons with counter-clockwise shells, holes included, padded to one length."""
    rings, piece = shapely.get_rings(pieces, return_index=True)
    points, ring = shapely.get_coordinates(rings, return_index=True)
    same = ring[1:] == ring[:-1]
    edges = np.concatenate([points[:-1], points[1:]], axis=1)[same]
    owner = piece[ring[:-1][same]]
    counts = np.bincount(owner, minlength=len(pieces))
    first = np.concatenate([[0], np.cumsum(counts)[:-1]])
    place = np.arange(len(owner)) - first[owner]
    start = edges[first][:, [0, 1, 0, 1]]
    padded: Floats = np.repeat(start[:, None, :], int(counts.max()), axis=1)
    padded[owner, place] = edges
    return padded


def moments(edges: Floats) -> tuple[Floats, Floats, Floats]:
    """Area, centroid and second moments per area of outlines, by Green's theorem."""
    origin = edges[:, 0, :2].copy()
    # one axis after another in memory is read twice as fast
    x1, y1, x2, y2 = np.array(edges.transpose(2, 0, 1), order="C")
    x1 -= origin[:, :1]
    y1 -= origin[:, 1:]
    x2 -= origin[:, :1]
    y2 -= origin[:, 1:]
    turn = x1 * y2 - x2 * y1
    area = turn.sum(axis=1) / 2
    x, y = x1 + x2, y1 + y2
    cx = np.einsum("ij,ij->i", x, turn) / (6 * area)
    cy = np.einsum("ij,ij->i", y, turn) / (6 * area)
    # x1 x1 + x1 x2 + x2 x2 = (x x + x1 x1 + x2 x2)/2, and so on
    xx = np.einsum("ij,ij->i", x * x + x1 * x1 + x2 * x2, turn) / (24 * area) - cx * cx
    yy = np.einsum("ij,ij->i", y * y + y1 * y1 + y2 * y2, turn) / (24 * area) - cy * cy
    xy = np.einsum("ij,ij->i", x * y + x1 * y1 + x2 * y2, turn) / (24 * area) - cx * cy
    return area, np.stack([cx, cy], axis=1) + origin, np.stack([xx, xy, yy], axis=1)


def axes(spread: Floats) -> tuple[Floats, Floats]:
    """Principal axes of second moments, each as long as the root of its moment."""
    xx, xy, yy = spread.T
    half = np.hypot((xx - yy) / 2, xy)
    mean = (xx + yy) / 2
    long, short = np.sqrt(mean + half), np.sqrt(np.maximum(mean - half, 1e-6 * mean))
    # a square has any axes: rounding must not choose them
    turn = np.where(half > 1e-9 * mean, 0.5 * np.arctan2(2 * xy, xx - yy), 0.0)
    u = np.stack([np.cos(turn), np.sin(turn)], axis=1) * long[:, None]
    v = np.stack([-np.sin(turn), np.cos(turn)], axis=1) * short[:, None]
    return u, v
