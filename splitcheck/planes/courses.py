"""Courses: the pieces of a net's trace in order, from end to end and over plated holes."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from heapq import heappop, heappush
from math import inf
from typing import NamedTuple

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from splitcheck.board.board import Board
from splitcheck.planes.tracks import Ints, Tracks
from splitcheck.units import Floats

#: A trace that ends this near to the wall of a plated hole ends in its pad, mm.
RING_MM = 0.4


class Step(NamedTuple):
    """One straight piece of trace on the way."""

    tracks: int
    """Which of the layers' tracks it is in."""
    piece: int
    forward: bool
    """Whether it is gone along from its start to its end."""


class Course(NamedTuple):
    """A way along one net; the next step begins where the last one ends, maybe on another layer."""

    net: int
    steps: tuple[Step, ...]
    branch: bool
    """Whether it begins on an earlier course of the net."""


class _Edge(NamedTuple):
    far: int
    length_mm: float
    step: Step


#: Pieces by the places where they end.
_Graph = dict[int, list[_Edge]]


def courses(board: Board, tracks: Sequence[Tracks]) -> tuple[Course, ...]:
    """Order the pieces of every net into ways from end to end.

    Parameters
    ----------
    board
        The board, for its plated holes and pads.
    tracks
        The traces of every layer.

    Returns
    -------
    By net the longest way from end to end first, then its branches, longest first; then the same
    for what neither trace, pad nor plated hole joins to it. Every piece is in one course, but for
    those that lie wholly within one pad.

    Notes
    -----
    Of a net with loops the longest of the shortest ways is taken; what closes a loop is a branch.
    """
    places = _places(board, tracks)
    by_net: dict[int, _Graph] = defaultdict(lambda: defaultdict(list))
    for number, layer in enumerate(tracks):
        twice = set()
        rows = zip(
            places[number].tolist(), layer.length_mm.tolist(), layer.net.tolist(), strict=True
        )
        for piece, ((one, other), length_mm, net) in enumerate(rows):
            length = round(length_mm, 6)
            key = (min(one, other), max(one, other), length)
            if one == other or key in twice:  # within a pad, or drawn twice
                continue
            twice.add(key)
            graph = by_net[net]
            graph[one].append(_Edge(other, length, Step(number, piece, True)))
            graph[other].append(_Edge(one, length, Step(number, piece, False)))
    return tuple(course for net in sorted(by_net) for course in _of_net(net, by_net[net]))


def _places(board: Board, tracks: Sequence[Tracks]) -> list[Ints]:
    """Number of the place at both ends of every piece; ends in one pad or hole are one place."""
    offsets = np.cumsum([0, *(int(t.nodes.max(initial=-1)) + 1 for t in tracks)])
    count = int(offsets[-1])
    at, net, layer = np.zeros((count, 2)), np.full(count, -1), np.zeros(count, dtype=np.intp)
    for offset, t in zip(offsets, tracks, strict=False):
        at[offset + t.nodes[:, 0]], at[offset + t.nodes[:, 1]] = t.start, t.end
        net[offset + t.nodes] = t.net[:, None]
        layer[offset + t.nodes] = t.layer
    if not count:
        return [t.nodes for t in tracks]
    links = [*_in_holes(board, cKDTree(at), net), *_in_pads(board, at, net, layer)]
    ones, others = np.array(links, dtype=np.intp).reshape(-1, 2).T
    joined = coo_array((np.ones(len(ones)), (ones, others)), shape=(count, count))
    _, place = connected_components(joined, directed=False)
    return [
        place[offset + t.nodes].astype(np.intp) for offset, t in zip(offsets, tracks, strict=False)
    ]


def _in_holes(board: Board, tree: cKDTree, net: Ints) -> Iterator[tuple[int, int]]:
    """Pairs of trace ends that meet in one plated hole of their net."""
    holes = [hole for hole in board.holes if hole.net >= 0]
    if not holes:
        return
    reach = np.array([hole.hole.diameter_mm / 2 + RING_MM for hole in holes])
    near = tree.query_ball_point(np.array([hole.at for hole in holes]), reach)
    for hole, found in zip(holes, near, strict=True):
        own = [node for node in found if net[node] == hole.net]
        for node in own[1:]:
            yield own[0], node


def _in_pads(board: Board, at: Floats, net: Ints, layer: Ints) -> Iterator[tuple[int, int]]:
    """Pairs of trace ends that meet in one pad, on its own layer."""
    for copper in board.layers:
        here = np.flatnonzero(layer == copper.number)
        if not len(here) or not copper.pads:
            continue
        reach = np.array([pad.size_mm / 2 for pad in copper.pads])
        pads = np.array([pad.at for pad in copper.pads])
        for found in cKDTree(at[here]).query_ball_point(pads, reach):
            first: dict[int, int] = {}
            if len(found) < 2:
                continue
            for node in sorted(here[found].tolist()):
                other = first.setdefault(int(net[node]), node)
                if other != node:
                    yield other, node


def _of_net(net: int, graph: _Graph) -> list[Course]:
    """The courses of one net: of its longest part first."""
    parts: list[tuple[float, list[Course]]] = []
    left = set(graph)
    while left:
        start = min(left)
        reached, _ = _spread(graph, [start])
        left.difference_update(reached)
        end = max(reached, key=lambda place: (reached[place], -place))
        far, above = _spread(graph, [end])
        start = max(far, key=lambda place: (far[place], -place))
        trunk = _up(above, start, {end})
        found = [Course(net, tuple(_turned(step) for step in trunk), branch=False)]
        found.extend(_branches(net, graph, far, start, end, above))
        parts.append((far[start], found))
    parts.sort(key=lambda part: (-part[0], part[1][0].steps[:1]))
    return [course for _, found in parts for course in found if course.steps]


_Above = dict[int, tuple[int, Step]]


def _spread(graph: _Graph, starts: Sequence[int]) -> tuple[dict[int, float], _Above]:
    """Distance from the nearest start, and for every place the one before it with the piece."""
    far = dict.fromkeys(starts, 0.0)
    above: _Above = {}
    queue = [(0.0, start) for start in sorted(starts)]
    while queue:
        distance, place = heappop(queue)
        if distance > far[place]:
            continue
        for edge in graph[place]:
            longer = distance + edge.length_mm
            if longer < far.get(edge.far, inf):
                far[edge.far] = longer
                above[edge.far] = (place, edge.step)
                heappush(queue, (longer, edge.far))
    return far, above


def _up(above: _Above, place: int, until: set[int]) -> list[Step]:
    """The pieces from a place up to the first of some, each as it was gone down."""
    steps = []
    while place not in until:
        place, step = above[place]
        steps.append(step)
    return steps


def _turned(step: Step) -> Step:
    return step._replace(forward=not step.forward)


def _branches(
    net: int, graph: _Graph, members: dict[int, float], start: int, end: int, above: _Above
) -> Iterator[Course]:
    """What is left of a part when its trunk is taken out."""
    used, taken = {end}, set()
    place = start
    while place not in used:
        used.add(place)
        place, step = above[place]
        taken.add(step[:2])
    if len(used) == len(members) and len(taken) * 2 == sum(len(graph[p]) for p in members):
        return
    far, above = _spread(graph, sorted(used))
    for leaf in sorted(far, key=lambda place: (-far[place], place)):
        if leaf in used:
            continue
        steps = _up(above, leaf, used)
        place = leaf
        while place not in used:
            used.add(place)
            place = above[place][0]
        taken.update(step[:2] for step in steps)
        yield Course(net, tuple(reversed(steps)), branch=True)
    loose = {edge.step for place in members for edge in graph[place] if edge.step.forward}
    for step in sorted(loose):
        if step[:2] not in taken:
            yield Course(net, (step,), branch=True)
