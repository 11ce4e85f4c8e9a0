"""Net names from a netlist file, found by where its points lie on the copper."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from splitcheck.board.parts import CopperLayer
from splitcheck.board.traces import locate
from splitcheck.copper import netlist
from splitcheck.copper.holes import Hole
from splitcheck.copper.intake import Export
from splitcheck.copper.marks import Point
from splitcheck.units import Floats

#: Below this share of points on pads or holes a netlist belongs to something else.
LEAST_SHARE = 0.5


class ListedPin(NamedTuple):
    """A pin of a component, moved onto the copper."""

    component: str
    pin: str | None
    at: Point
    bottom: bool
    """Whether it is reached from the bottom."""
    through: bool


@dataclass(frozen=True, slots=True)
class Listed:
    """Names by part id, and what is to be said of finding them."""

    names: dict[int, tuple[str, ...]]
    pins: tuple[ListedPin, ...]
    """Pins of components, in file order."""
    remarks: tuple[str, ...]
    assumptions: tuple[str, ...]


def listed_names(
    export: Export, layers: Sequence[CopperLayer], pads: Floats, holes: Sequence[Hole]
) -> Listed:
    """Look up which part each point of the netlists lies on.

    Parameters
    ----------
    export
        The files; every netlist among them is read.
    layers
        All copper, top to bottom.
    pads
        Centres of pads, shape (n, 2), mm.
    holes
        Plated holes.
    """
    names: dict[int, set[str]] = defaultdict(set)
    remarks: list[str] = []
    assumptions: list[str] = []
    pins: list[ListedPin] = []
    centres = np.array([hole.path[0] for hole in holes]).reshape(-1, 2)
    for file in export.of_kind("netlist"):
        read = netlist.read(file.text, file.name)
        remarks.extend(read.remarks)
        fit = netlist.align(read, pads, centres)
        if fit.share < LEAST_SHARE:
            assumptions.append(f"{fit.remark}: no net names were taken from it.")
            continue
        remarks.append(fit.remark)
        for part, name in _landed(read, fit, layers):
            names[part].add(name)
        pins.extend(_pins(read, fit))
    return Listed(
        {part: tuple(sorted(found)) for part, found in sorted(names.items())},
        tuple(pins),
        tuple(remarks),
        tuple(assumptions),
    )


def _pins(read: netlist.Netlist, fit: netlist.Alignment) -> list[ListedPin]:
    return [
        ListedPin(
            point.component,
            point.pin,
            (round(point.x_mm + fit.dx_mm, 6), round(point.y_mm + fit.dy_mm, 6)),
            bottom=not point.through and point.access not in (0, 1),
            through=point.through,
        )
        for point in read.points
        if point.component is not None
    ]


def _landed(
    read: netlist.Netlist, fit: netlist.Alignment, layers: Sequence[CopperLayer]
) -> list[tuple[int, str]]:
    """Pairs of part id and net name: surface points on their side, others on both outer layers."""
    first_of_last = sum(len(layer.pieces) for layer in layers[:-1])
    sides: tuple[tuple[CopperLayer, int, set[int]], ...] = (
        (layers[0], 0, {0, 1}),
        (layers[-1], first_of_last, set()),
    )
    pairs = []
    for layer, first, accesses in sides:
        points = [
            point
            for point in read.points
            if point.net
            and (point.through or not accesses or point.access in accesses)
            and (point.through or bool(accesses) or point.access != 1)
        ]
        if not points:
            continue
        xs = np.array([point.x_mm + fit.dx_mm for point in points])
        ys = np.array([point.y_mm + fit.dy_mm for point in points])
        for point, piece in zip(points, locate(xs, ys, layer.pieces).tolist(), strict=True):
            if piece >= 0:
                pairs.append((first + piece, point.net))
    return pairs
