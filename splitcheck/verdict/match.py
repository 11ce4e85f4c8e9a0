"""Which finding of a newer revision is which of an older one, whatever was moved or renamed."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import hypot, log, sqrt

import numpy as np
from scipy.optimize import linear_sum_assignment
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from splitcheck.verdict.changes import Move, family
from splitcheck.verdict.findings import Finding, Point, Report
from splitcheck.verdict.move import Keys, is_automatic

#: A finding may have gone this far with its trace and still be the same, mm: on a net of the same
#: name, besides half the length of its gap; and on one of another name.
REACH_MM, STRANGER_REACH_MM = 10.0, 5.0
#: Findings nearer than this are at one place, mm.
SAME_PLACE_MM = 0.02
#: More than this in one group is paired one after the other, nearest first.
_MOST_AT_ONCE = 1500
_FORBIDDEN = 1e6


@dataclass(frozen=True, slots=True)
class _Item:
    """A finding as matching sees it."""

    finding: Finding
    key: tuple[str, ...]
    """What has to be equal: family of kinds, layer, planes."""
    at_mm: Point
    """On the newer board."""
    names: frozenset[str]
    """Names of its net that the files gave; empty if its name was made."""


def layer_keys(was: Report, now: Report) -> tuple[Keys, Keys]:
    """What to call each layer of two revisions so that the same one has the same key.

    Names of layers often come from file names, which change. Boards with equally many layers are
    matched by number; else a name that both have decides, then the number from the nearer side.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> layer_keys(empty, empty)
    ({}, {})
    """
    if len(was.layers) == len(now.layers):
        keys = [{row.name: str(row.number) for row in report.layers} for report in (was, now)]
        return keys[0], keys[1]
    shared = {row.name for row in was.layers} & {row.name for row in now.layers}
    found = []
    for report in (was, now):
        last = len(report.layers)
        found.append(
            {
                row.name: f"name {row.name}"
                if row.name in shared
                else f"{row.number} from the top"
                if row.number <= last - row.number
                else f"{last + 1 - row.number} from the bottom"
                for row in report.layers
            }
        )
    return found[0], found[1]


def match(
    was: Report, now: Report, move: Move, layers: tuple[Keys, Keys]
) -> tuple[tuple[int, int], ...]:
    """Pairs of indexes into the findings of both revisions, sorted by the newer.

    Notes
    -----
    Two findings can be the same if (1) they are of one family of kinds, on the same layer over
    the same planes, (2) their nets have a name in common; or one has a made name, or a net was
    renamed: then neither name may live on in the other revision, (3) they are near: see
    ``REACH_MM``; a stretch without a plane is told once a net and layer and may be anywhere.
    What is at the same place is paired at once. Of what is left, each group of possible pairs is
    assigned so that as many as possible are paired, at the least cost: distance first (its square
    root, so that one long way costs less than several short ones), then name, kind, gap, value.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> match(empty, empty, Move(), ({}, {}))
    ()
    """
    older = [_item(f, layers[0], move.place(f.at_mm)) for f in was.findings]
    newer = [_item(f, layers[1], f.at_mm) for f in now.findings]
    alive = (_names(was), _names(now))
    pairs = _at_one_place(older, newer, alive)
    done = ({i for i, _ in pairs}, {j for _, j in pairs})
    edges = {
        (i, j): cost
        for i, j in _near(older, newer)
        if i not in done[0] and j not in done[1]
        for cost in _cost(older[i], newer[j], alive)
    }
    pairs.extend(_assign(edges, len(older), len(newer)))
    return tuple(sorted(pairs, key=lambda pair: pair[1]))


def _item(finding: Finding, layers: Keys, at_mm: Point) -> _Item:
    planes = finding.plane_layer.split(" to ") if finding.plane_layer else []
    if finding.plane_layer in layers:
        planes = [finding.plane_layer]
    words = (family(finding.kind), *(layers.get(name, name) for name in (finding.layer, *planes)))
    return _Item(finding, words, at_mm, _given(finding.net))


def _given(net: str) -> frozenset[str]:
    return frozenset(name for name in net.split("|") if not is_automatic(name))


def _names(report: Report) -> frozenset[str]:
    """Every name that a net of the board has."""
    nets = {row.name for row in report.nets} | {finding.net for finding in report.findings}
    return frozenset(name for net in nets for name in _given(net))


def _at_one_place(
    older: Sequence[_Item], newer: Sequence[_Item], alive: tuple[frozenset[str], frozenset[str]]
) -> list[tuple[int, int]]:
    """Pairs that nothing else could be mistaken for: each alone at its place."""
    found: dict[int, list[int]] = defaultdict(list)
    back: dict[int, list[int]] = defaultdict(list)
    for i, j in _within(older, newer, SAME_PLACE_MM):
        found[i].append(j)
        back[j].append(i)
    return [
        (i, near[0])
        for i, near in sorted(found.items())
        if len(near) == 1
        and len(back[near[0]]) == 1
        and any(True for _ in _cost(older[i], newer[near[0]], alive))
    ]


def _within(
    older: Sequence[_Item], newer: Sequence[_Item], reach_mm: float
) -> Iterator[tuple[int, int]]:
    """Pairs of one key within a distance."""
    groups: dict[tuple[str, ...], tuple[list[int], list[int]]] = defaultdict(lambda: ([], []))
    for side, items in enumerate((older, newer)):
        for number, item in enumerate(items):
            groups[item.key][side].append(number)
    for _, (left, right) in sorted(groups.items()):
        if not left or not right:
            continue
        tree = cKDTree(np.array([newer[j].at_mm for j in right]))
        near = tree.query_ball_point(np.array([older[i].at_mm for i in left]), reach_mm)
        for i, numbers in zip(left, near, strict=True):
            yield from ((i, right[number]) for number in sorted(numbers))


def _near(older: Sequence[_Item], newer: Sequence[_Item]) -> Iterator[tuple[int, int]]:
    """Pairs worth a look: near each other, or on nets of one name."""
    yield from _within(older, newer, STRANGER_REACH_MM)
    by_name: dict[tuple[tuple[str, ...], str], list[int]] = defaultdict(list)
    for j, item in enumerate(newer):
        for name in item.names:
            by_name[item.key, name].append(j)
    for i, item in enumerate(older):
        for name in sorted(item.names):
            yield from ((i, j) for j in by_name.get((item.key, name), ()))


def _cost(
    one: _Item, other: _Item, alive: tuple[frozenset[str], frozenset[str]]
) -> Iterator[float]:
    """What it costs to take two findings for the same; nothing if they cannot be."""
    apart_mm = hypot(one.at_mm[0] - other.at_mm[0], one.at_mm[1] - other.at_mm[1])
    was, now = one.finding, other.finding
    named = _named(one, other, alive)
    if named is None:
        return
    reach_mm = STRANGER_REACH_MM
    if one.names & other.names:
        reach_mm = REACH_MM + max(was.gap_mm, now.gap_mm) / 2
        if was.kind == "no-plane":
            reach_mm = float("inf")
    if apart_mm > reach_mm:
        return
    cost = 0.3 * sqrt(apart_mm) + named + 0.3 * (was.kind != now.kind)
    cost += 0.2 * _unlike(was.gap_mm, now.gap_mm) + 0.1 * _unlike(was.added_nh, now.added_nh)
    yield cost


def _named(one: _Item, other: _Item, alive: tuple[frozenset[str], frozenset[str]]) -> float | None:
    """0 for one name, more for names that may be of one net, None for two nets."""
    if one.names & other.names or one.finding.net == other.finding.net:
        return 0.0
    if one.names & alive[1] or other.names & alive[0]:
        return None  # the net of one of them is there in the other revision, and is another
    return 0.8 if one.names and other.names else 0.1


def _unlike(one: float | None, other: float | None) -> float:
    """How many times larger one of two is, as a logarithm up to 2."""
    if one is None or other is None:
        return 0.0 if one is other else 2.0
    small, large = sorted((max(one, 1e-3), max(other, 1e-3)))
    return min(log(large / small), 2.0)


def _assign(
    edges: dict[tuple[int, int], float], older: int, newer: int
) -> Iterator[tuple[int, int]]:
    """The cheapest of the assignments with most pairs, one group of linked findings at a time."""
    if not edges:
        return
    rows, columns = (np.array(side) for side in zip(*edges, strict=True))
    size = older + newer
    links = coo_array((np.ones(len(rows)), (rows, columns + older)), shape=(size, size))
    _, group = connected_components(links, directed=False)
    groups: dict[int, list[tuple[int, int]]] = defaultdict(list)
    for pair in sorted(edges):
        groups[int(group[pair[0]])].append(pair)
    for pairs in groups.values():
        left, right = (sorted({pair[side] for pair in pairs}) for side in (0, 1))
        if max(len(left), len(right)) > _MOST_AT_ONCE:
            yield from _one_by_one({pair: edges[pair] for pair in pairs})
            continue
        costs = np.full((len(left), len(right)), _FORBIDDEN)
        for i, j in pairs:
            costs[left.index(i), right.index(j)] = edges[i, j]
        for row, column in zip(*linear_sum_assignment(costs), strict=True):
            if costs[row, column] < _FORBIDDEN:
                yield left[row], right[column]


def _one_by_one(edges: dict[tuple[int, int], float]) -> Iterator[tuple[int, int]]:
    taken: tuple[set[int], set[int]] = (set(), set())
    for i, j in sorted(edges, key=lambda pair: (edges[pair], pair)):
        if i not in taken[0] and j not in taken[1]:
            taken[0].add(i)
            taken[1].add(j)
            yield i, j
