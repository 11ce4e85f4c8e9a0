"""Parts joined by plated holes into nets, and the names the files give them."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely

from splitcheck.board.names import is_ground, is_supply
from splitcheck.board.parts import CopperLayer, Part
from splitcheck.copper.holes import Hole
from splitcheck.units import runs


@dataclass(frozen=True, slots=True)
class PlatedHole:
    """A plated hole and the parts it joins, from the top down."""

    hole: Hole
    parts: tuple[int, ...]
    """Ids of the parts that its barrel touches."""
    layers: tuple[int, ...]
    """Their layer numbers, in the same order."""
    net: int
    """Number of its net, -1 if it touches no copper."""

    @property
    def at(self) -> tuple[float, float]:
        """Its centre; of a slot, the middle of its ends."""
        (x0, y0), (x1, y1) = self.hole.path[0], self.hole.path[-1]
        return ((x0 + x1) / 2, (y0 + y1) / 2)


@dataclass(frozen=True, slots=True)
class Net:
    """Copper joined by plated holes."""

    number: int
    name: str
    given: bool
    """Whether the files name it; else the name is made from its place."""
    parts: tuple[int, ...]


def join(
    layers: Sequence[CopperLayer], parts: Sequence[Part], holes: Sequence[Hole]
) -> tuple[tuple[PlatedHole, ...], tuple[int, ...]]:
    """Find what each plated hole touches, and which parts are one net.

    Parameters
    ----------
    layers, parts
        All copper, as ``parts_of`` numbers it.
    holes
        Plated holes only.

    Returns
    -------
    The holes with the parts they join, and for every part the number of its net.
    """
    touched: list[list[int]] = [[] for _ in holes]
    barrels = _barrels(holes)
    offset = 0
    for layer in layers:
        through = [
            i
            for i, hole in enumerate(holes)
            if hole.span is None or hole.span[0] <= layer.number <= hole.span[1]
        ]
        for barrel, piece in _touches(barrels[through], layer):
            touched[through[barrel]].append(offset + piece)
        offset += len(layer.pieces)
    net_of = _unite(len(parts), touched)
    joined = tuple(
        PlatedHole(
            hole,
            tuple(ids),
            tuple(parts[i].layer for i in ids),
            net_of[ids[0]] if ids else -1,
        )
        for hole, ids in zip(holes, touched, strict=True)
    )
    return joined, net_of


def _barrels(holes: Sequence[Hole]) -> np.ndarray[tuple[int], np.dtype[np.object_]]:
    paths = [
        shapely.Point(hole.path[0]) if len(hole.path) == 1 else shapely.LineString(hole.path)
        for hole in holes
    ]
    radii_mm = np.array([max(hole.diameter_mm, 0.02) / 2 for hole in holes])
    made = shapely.buffer(np.array(paths, dtype=object), radii_mm, quad_segs=4)
    return np.asarray(made, dtype=object)


def _touches(
    barrels: np.ndarray[tuple[int], np.dtype[np.object_]], layer: CopperLayer
) -> list[tuple[int, int]]:
    """Pairs (barrel, piece) that touch, sorted."""
    if not len(barrels) or not layer.pieces:
        return []
    which, hits = shapely.STRtree(list(layer.pieces)).query(barrels)
    order = np.argsort(hits, kind="stable")
    which, hits = which[order], hits[order]
    pairs: list[tuple[int, int]] = []
    for start, stop in runs(hits):
        piece = layer.pieces[hits[start]]
        shapely.prepare(piece)
        meets = shapely.intersects(piece, barrels[which[start:stop]])
        pairs.extend((int(barrel), int(hits[start])) for barrel in which[start:stop][meets])
    return sorted(pairs)


def _unite(count: int, groups: Sequence[Sequence[int]]) -> tuple[int, ...]:
    """Number the sets that the groups join, in order of their first member."""
    above = list(range(count))

    def root(i: int) -> int:
        while above[i] != i:
            above[i] = above[above[i]]
            i = above[i]
        return i

    for group in groups:
        for other in group[1:]:
            one, two = sorted((root(group[0]), root(other)))
            above[two] = one
    numbers: dict[int, int] = {}
    return tuple(numbers.setdefault(root(i), len(numbers)) for i in range(count))


def name_nets(
    parts: Sequence[Part], net_of: Sequence[int], also: dict[int, tuple[str, ...]]
) -> tuple[tuple[Net, ...], tuple[str, ...]]:
    """Name every net from its parts, or from its place where no file names it.

    Parameters
    ----------
    parts, net_of
        As from ``join``.
    also
        More names by part id, from a netlist.

    Returns
    -------
    The nets by number, and remarks on names that contradict the copper.
    """
    members: dict[int, list[int]] = defaultdict(list)
    for part, number in enumerate(net_of):
        members[number].append(part)
    nets: list[Net] = []
    remarks: list[str] = []
    for number in sorted(members):
        ids = members[number]
        found = {name for i in ids for name in (*parts[i].names, *also.get(i, ()))}
        names = sorted(found, key=_grounds_first)
        if len(names) > 1:
            listed = ", ".join(repr(name) for name in names[:4]) + (
                " ..." if len(names) > 4 else ""
            )
            x, y = _anchor(parts[ids[0]])
            remarks.append(
                f"One piece of copper carries {len(names)} net names ({listed}), near "
                f"x {x:.2f}, y {y:.2f}: a net tie, or a short"
            )
        nets.append(
            Net(
                number,
                "|".join(names) if names else _place_name(parts, ids),
                bool(names),
                tuple(ids),
            )
        )
    remarks.extend(_fallen_apart(nets))
    return tuple(nets), tuple(remarks)


def _grounds_first(name: str) -> tuple[bool, bool, str]:
    """Order of the names of a net tie: what carries returns names the plane."""
    return not is_ground(name), not is_supply(name), name


def _fallen_apart(nets: Sequence[Net]) -> list[str]:
    pieces: dict[str, int] = defaultdict(int)
    for net in nets:
        if net.given:
            pieces[net.name] += 1
    return [
        f"Net {name!r} lies in {count} pieces that neither copper nor plated holes join"
        for name, count in sorted(pieces.items())
        if count > 1
    ]


def _anchor(part: Part) -> tuple[float, float]:
    x_min, y_min, x_max, y_max = part.shape.bounds
    return (x_min + x_max) / 2, (y_min + y_max) / 2


def _place_name(parts: Sequence[Part], ids: Sequence[int]) -> str:
    """A stable name from the place of the net's topmost, leftmost part."""
    first = min(ids, key=lambda i: (parts[i].layer, *parts[i].shape.bounds))
    x, y = _anchor(parts[first])
    return f"@L{parts[first].layer}({x:.2f},{y:.2f})"
