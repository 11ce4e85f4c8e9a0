"""Shapes added to copper and cut from it: large and small ones kept apart, so that it is fast."""

from __future__ import annotations

from collections import defaultdict
from typing import TypeAlias

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from splitcheck.copper.outlines import Shapes
from splitcheck.units import GRID_MM

#: A shape of more corners than this is large: a pour or a plane.
LARGE_CORNERS = 400

Pairs: TypeAlias = tuple[NDArray[np.int64], NDArray[np.int64]]


def united(shapes: Shapes) -> Shapes:
    """Connected pieces of the union of shapes that files give, with their corners on the grid.

    Parameters
    ----------
    shapes
        Valid polygons and multipolygons, shape (n,), mm.

    Returns
    -------
    Disjoint polygons, shape (m,), in no particular order.

    Notes
    -----
    A union of thousands of shapes works up a tree, and a plane of 20,000 corners would be
    overlaid again at every level of it. So the small shapes are united first, those wholly inside
    a large one are dropped, and each large one is overlaid once with what reaches over its edge.
    Measured on planes with a few thousand pads: 2 to 4 times faster.
    """
    parts: Shapes = shapely.get_parts(shapes)
    large = shapely.get_num_coordinates(parts) > LARGE_CORNERS
    small = parts[~large]
    if len(small):
        whole = shapely.disjoint_subset_union_all(small)
        small = np.asarray(shapely.get_parts(whole), dtype=object)
    planes = parts[large]
    return _overlaid(planes, small, _meeting(planes, planes)) if len(planes) else small


def added(standing: Shapes, pieces: Shapes) -> Shapes:
    """Paint dark over copper that was cut before.

    Parameters
    ----------
    standing, pieces
        Disjoint polygons each, shape (n,) and (m,), mm.

    Returns
    -------
    Disjoint polygons.
    """
    if not len(standing) or not len(pieces):
        return np.concatenate((standing, pieces))
    nothing = np.empty(0, dtype=np.int64)
    return _overlaid(standing, pieces, (nothing, nothing))


def cleared(standing: Shapes, clear: Shapes) -> Shapes:
    """What clear shapes leave of disjoint pieces; only pieces that they meet are touched."""
    clear = np.asarray(shapely.get_parts(clear), dtype=object)
    piece, hit = _meeting(standing, clear)
    if not len(piece):
        return standing
    left = standing.copy()
    starts = np.searchsorted(piece, np.arange(len(standing) + 1))
    for number in np.unique(piece).tolist():
        cutter = shapely.union_all(clear[hit[starts[number] : starts[number + 1]]])
        left[number] = _without(standing[number], cutter)
    parts: Shapes = shapely.get_parts(left)
    return parts[shapely.area(parts) > 0]


def _overlaid(planes: Shapes, small: Shapes, joined: Pairs) -> Shapes:
    """Large shapes, of which some pairs are joined, and small disjoint ones that may reach them.

    Each group that hangs together becomes one overlay.
    """
    plane, hit = _meeting(planes, small)
    swallowed = np.zeros(len(small), dtype=bool)
    swallowed[hit[shapely.covers(planes[plane], small[hit])]] = True
    reaching = ~swallowed[hit]
    groups = _groups(len(planes), joined, (plane[reaching], hit[reaching]))
    pieces = [_whole(planes[p], small[s]) for p, s in groups]
    loose = np.ones(len(small), dtype=bool)
    loose[hit] = False
    return np.concatenate([small[loose], *pieces])


def _meeting(planes: Shapes, small: Shapes) -> Pairs:
    """Pairs of polygons that intersect, sorted by the first.

    Notes
    -----
    Asking a plane with a thousand holes about a pad in one of them, GEOS looks for a piece of the
    plane inside the pad, hole by hole. Asking about the rim of the pad is quick and says the same
    unless the whole plane lies inside the pad, which its box rules out.
    """
    shapely.prepare(planes)
    tree, rims = shapely.STRtree(small), shapely.get_exterior_ring(small)
    bounds = shapely.bounds(small)
    found = [np.empty((2, 0), dtype=np.int64)]
    # Some at a time: ten thousand planes over one another would be a hundred million pairs.
    for chunk in np.array_split(np.arange(len(planes)), len(planes) // 256 + 1):
        number, hit = tree.query(planes[chunk])
        plane = chunk[number]
        meet = shapely.intersects(planes[plane], rims[hit])
        inner, outer = shapely.bounds(planes)[plane], bounds[hit]
        around = ~meet & (outer[:, :2] <= inner[:, :2]).all(axis=1)
        around &= (outer[:, 2:] >= inner[:, 2:]).all(axis=1)
        meet[around] = shapely.intersects(planes[plane[around]], small[hit[around]])
        found.append(np.stack((plane[meet], hit[meet])))
    first, second = np.concatenate(found, axis=1)
    order = np.argsort(first, kind="stable")
    return first[order], second[order]


def _whole(planes: Shapes, small: Shapes) -> Shapes:
    whole = planes[0] if len(planes) == 1 else shapely.union_all(planes)
    if len(small):
        # The small pieces are disjoint, so together they are one valid multipolygon.
        whole = _with(whole, shapely.MultiPolygon(list(small)))
    return np.asarray(shapely.get_parts(whole), dtype=object)


def _with(one: BaseGeometry, other: BaseGeometry) -> BaseGeometry:
    """Union of two, checked by their intersection.

    Notes
    -----
    Where copper was cut, new corners lie a rounding off the edges they were cut from, and an edge
    may be painted or cut there again. In floating numbers such overlays can go wrong without a
    word (seen: 0.7 mm2 of copper where no mark was). Areas tell: if union and intersection do not
    add up to both parts, it is done again on the 1 nm grid, which is safe and slower.
    """
    both = shapely.union(one, other)
    common = shapely.intersection(one, other)
    if _adds_up(one.area + other.area, both.area + common.area):
        return both
    return shapely.union(one, other, grid_size=GRID_MM)


def _without(one: BaseGeometry, other: BaseGeometry) -> BaseGeometry:
    """Difference of two, checked by their intersection in the same way."""
    left = shapely.difference(one, other)
    common = shapely.intersection(one, other)
    if _adds_up(one.area, left.area + common.area):
        return left
    return shapely.difference(one, other, grid_size=GRID_MM)


def _adds_up(expected_mm2: float, found_mm2: float) -> bool:
    return abs(expected_mm2 - found_mm2) <= 1e-7 * max(1.0, expected_mm2)


def _groups(planes: int, joined: Pairs, reaching: Pairs) -> list[tuple[list[int], list[int]]]:
    """Large shapes that hang together, directly or by small ones, with those small ones."""
    parent = list(range(planes))

    def root(number: int) -> int:
        while parent[number] != number:
            parent[number] = parent[parent[number]]
            number = parent[number]
        return number

    for one, other in zip(joined[0].tolist(), joined[1].tolist(), strict=True):
        parent[root(one)] = root(other)
    owner: dict[int, int] = {}
    for one, piece in zip(reaching[0].tolist(), reaching[1].tolist(), strict=True):
        parent[root(one)] = root(owner.setdefault(piece, one))
    members: dict[int, tuple[list[int], list[int]]] = defaultdict(lambda: ([], []))
    for number in range(planes):
        members[root(number)][0].append(number)
    for piece, one in owner.items():
        members[root(one)][1].append(piece)
    return [members[key] for key in sorted(members)]
