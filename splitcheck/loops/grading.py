"""Traces over gaps in, the size of panel wanted at each place out."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString

from splitcheck.loops.outlines import Ints
from splitcheck.units import Floats


class TooManyPanelsError(Exception):
    """More panels than `Grading.most`: the caller shall ask for coarser ones."""


@dataclass(frozen=True, slots=True)
class Grading:
    """How fine the panels are: by the distance from the traces and from where they cross a rim."""

    lines: tuple[LineString, ...]
    """Centre lines over the gaps."""
    near_mm: float
    """Size of a panel at the trace."""
    slope: float = 0.35
    """By how much a panel may grow per mm of distance."""
    far_mm: float = np.inf
    """From this distance on panels grow twice as fast, and faster further out."""
    stretch: float = 3.0
    """How much longer than wide a panel at the trace may be, along the trace."""
    slender: float = np.inf
    """How long against its width a panel may be at most."""
    root_mm: float = np.inf
    """Size of panel that the first division of a large gap aims at; inf: `near_mm`."""
    rounds: int = 3
    """How often to cut on pieces that are not compact, before they are lumped together."""
    most: int = 100_000
    """Give up on gaps that need more panels than this."""


class Sizes(NamedTuple):
    """What decides the size of cells, for many gaps at once."""

    cos: Floats
    sin: Floats
    """Direction of the first axis of the frame of each gap, shape (gaps,)."""
    lines: Floats
    """Stretches of the traces, shape (s, 4), those of one direction together."""
    along: Floats
    """Direction of each, shape (s, 2)."""
    first: Ints
    """Number of the first stretch of each direction."""
    entries: Floats
    """Where traces cross the rim of each gap, shape (gaps, k, 2); far off if none."""
    grading: Grading


def sizes_for(gaps: NDArray[np.object_], cos: Floats, sin: Floats, grading: Grading) -> Sizes:
    """What decides the size of cells.

    Parameters
    ----------
    gaps
        Polygons, or what of them lies around the traces.
    cos, sin
        Direction of the first axis of the frame of each gap, shape (gaps,).
    grading
        How fine, and where.

    Returns
    -------
    To be asked by `wanted`.
    """
    lines, along, first = _segments(grading)
    return Sizes(cos, sin, lines, along, first, _entries(gaps, lines), grading)


def _segments(grading: Grading) -> tuple[Floats, Floats, Ints]:
    """Straight stretches of the traces, as fine as panels see them, sorted by direction."""
    if not grading.lines:
        return np.zeros((0, 4)), np.zeros((0, 2)), np.zeros(0, dtype=np.int64)
    plain = shapely.simplify(np.array(grading.lines, dtype=object), grading.near_mm / 4)
    points, owner = shapely.get_coordinates(plain, return_index=True)
    lines = np.concatenate([points[:-1], points[1:]], axis=1)[owner[1:] == owner[:-1]]
    step = lines[:, 2:] - lines[:, :2]
    along = step / np.maximum(np.hypot(step[:, 0], step[:, 1]), 1e-12)[:, None]
    backward = (along[:, 0] < -1e-9) | ((np.abs(along[:, 0]) <= 1e-9) & (along[:, 1] < 0))
    alike = np.where(backward[:, None], -along, along).round(9) + 0.0
    order = np.lexsort((alike[:, 1], alike[:, 0]))
    new = (np.diff(alike[order], axis=0) != 0).any(axis=1)
    return lines[order], along[order], np.concatenate([[0], np.flatnonzero(new) + 1])


def _entries(gaps: NDArray[np.object_], lines: Floats) -> Floats:
    """Where stretches of traces cross the rim of each gap, shape (gaps, k, 2); far off if none."""
    parts, owner = shapely.get_parts(gaps, return_index=True)
    rims, part = shapely.get_rings(parts, return_index=True)
    points, rim = shapely.get_coordinates(rims, return_index=True)
    edges = np.concatenate([points[:-1], points[1:]], axis=1)
    (same,) = np.nonzero(rim[1:] == rim[:-1])
    edges, gap = edges[same], owner[part[rim[same]]]
    at, number = _crossings(edges, lines)
    gap = gap[number]
    order = np.argsort(gap, kind="stable")
    counts = np.bincount(gap, minlength=len(gaps))
    first = np.cumsum(counts) - counts
    entries = np.full((len(gaps), max(int(counts.max(initial=0)), 1), 2), 1e9)
    entries[gap[order], np.arange(len(order)) - first[gap[order]]] = at[order]
    return entries


def _crossings(edges: Floats, lines: Floats) -> tuple[Floats, Ints]:
    """Where edges cross stretches, shape (k, 2), and the number of the edge."""
    u, v = lines[:, 2] - lines[:, 0], lines[:, 3] - lines[:, 1]
    level = u * lines[:, 1] - v * lines[:, 0]
    start = u * edges[:, 1, None] - v * edges[:, 0, None] - level
    stop = u * edges[:, 3, None] - v * edges[:, 2, None] - level
    # an edge runs from one side of a stretch to the other, and the stretch from side to side of it
    number, which = np.nonzero((start <= 0) != (stop <= 0))
    x, y = (edges[number, :2] - lines[which, :2]).T
    dx, dy = (edges[number, 2:] - edges[number, :2]).T
    before, after = dx * y - dy * x, dx * (y - v[which]) - dy * (x - u[which])
    met = np.flatnonzero(before * after <= 0)
    number, which = number[met], which[met]
    part = start[number, which] / (start[number, which] - stop[number, which])
    return edges[number, :2] + part[:, None] * (edges[number, 2:] - edges[number, :2]), number


def wanted(sizes: Sizes, middle: Floats, gap: Ints) -> Floats:
    """Largest panel wanted at points of the gaps' frames, along either axis, mm.

    Parameters
    ----------
    sizes
        What `sizes_for` says.
    middle
        Points in the frames of their gaps, shape (k, 2), mm.
    gap
        Number of the gap of each.

    Returns
    -------
    Sizes along the first and the second axis of the frame, shape (k, 2).
    """
    if not len(sizes.lines):
        return np.full((len(middle), 2), np.inf)
    grading = sizes.grading
    cos, sin = sizes.cos[gap], sizes.sin[gap]
    x = cos * middle[:, 0] - sin * middle[:, 1]
    y = sin * middle[:, 0] + cos * middle[:, 1]
    # of all stretches of one direction the nearest asks for most
    distance = np.sqrt(np.minimum.reduceat(_squares(sizes, x, y), sizes.first, axis=0)).T
    growth = grading.slope * distance * (1.0 + distance / grading.far_mm)
    # a cell wider than its distance would reach the trace itself
    across_mm = np.maximum(grading.near_mm, np.minimum(growth, 0.8 * distance))
    rim = sizes.entries[gap]
    to_x, to_y = x[:, None] - rim[:, :, 0], y[:, None] - rim[:, :, 1]
    entry = np.sqrt((to_x * to_x + to_y * to_y).min(axis=1))
    least = np.minimum(
        grading.near_mm * grading.stretch, grading.slope * entry + 1.5 * grading.near_mm
    )
    along_mm = np.maximum(across_mm, least[:, None])
    # a cell axis at an angle to the trace takes the radius of the ellipse in that direction
    ux, uy = sizes.along[sizes.first].T
    cross_x = (cos[:, None] * ux + sin[:, None] * uy) ** 2
    cross_y = (cos[:, None] * uy - sin[:, None] * ux) ** 2
    a, b = 1.0 / (along_mm * along_mm), 1.0 / (across_mm * across_mm)
    wide = (cross_x * a + cross_y * b).max(axis=1)
    high = (cross_y * a + cross_x * b).max(axis=1)
    most: Floats = 1.0 / np.sqrt(np.stack([wide, high], axis=1))
    return most


def _squares(sizes: Sizes, x: Floats, y: Floats) -> Floats:
    """Squared distance of stretches from points, shape (s, k)."""
    x1, y1, x2, y2 = sizes.lines.T[:, :, None]
    ux, uy = sizes.along.T[:, :, None]
    from_x, from_y = x - x1, y - y1
    along = from_x * ux
    along += from_y * uy
    np.clip(along, 0.0, np.hypot(x2 - x1, y2 - y1), out=along)
    from_x -= along * ux
    from_y -= along * uy
    from_x *= from_x
    from_y *= from_y
    square: Floats = from_x + from_y
    return square
