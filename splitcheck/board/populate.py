"""Which components are on the board: from attributes of pads, a netlist, or placed parts."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np

from splitcheck.board.components import Component, Origin, Pin
from splitcheck.board.listed import ListedPin
from splitcheck.board.parts import CopperLayer
from splitcheck.board.placing import find_pads
from splitcheck.board.traces import locate
from splitcheck.copper import placement
from splitcheck.copper.holes import Hole
from splitcheck.copper.intake import Export
from splitcheck.copper.marks import Point

_SOURCES: tuple[tuple[Origin, str], ...] = (
    ("attributes", "X2 attributes of pads"),
    ("netlist", "the netlist"),
    ("placement", "the centres of placed parts"),
    ("rules", "the rules"),
)


class Spot(NamedTuple):
    """A pad of a component before it is looked up on the copper."""

    ref: str
    pin: str
    layer: int
    """The outer layer of it that is looked at, 1 is the top."""
    at: Point
    through: bool
    """Whether it goes through the board, so that its layer tells no side."""


@dataclass(frozen=True, slots=True)
class Populated:
    """Components, and what is to be said of finding them."""

    components: tuple[Component, ...]
    """By reference."""
    assumptions: tuple[str, ...]
    remarks: tuple[str, ...]


def populate(
    export: Export,
    layers: Sequence[CopperLayer],
    net_of: Sequence[int],
    holes: Sequence[Hole],
    listed: Sequence[ListedPin],
    corner: Point = (0.0, 0.0),
) -> Populated:
    """Find the components.

    Parameters
    ----------
    export
        The files; every list of placed parts among them is read.
    layers
        All copper, top to bottom, as its pieces are numbered.
    net_of
        Number of the net of every piece of copper.
    holes
        Plated holes.
    listed
        Pins of the netlists, moved onto the copper.
    corner
        Lower left corner of the board, mm.

    Returns
    -------
    Every component by the first source that knows it: attributes of its pads, the netlist, and,
    where neither knows any, the centre that a list of placed parts gives, with the two pads on
    either side of it. Values are those of the lists.
    """
    last = len(layers)
    pins = [
        Spot(pin.component, pin.pin or "", last if pin.bottom else 1, pin.at, pin.through)
        for pin in listed
    ]
    found = _components("netlist", pins, layers, net_of)
    found |= _components("attributes", _attributed(layers), layers, net_of)
    lists = [placement.read(file.text, file.name) for file in export.of_kind("placement")]
    remarks = [remark for one in lists for remark in one.remarks]
    assumptions: list[str] = []
    if not found:
        for one in lists:
            if 2 * sum(part.ref in found for part in one.parts) > len(one.parts):
                continue  # the same parts in another form
            laid = find_pads(one, layers, holes, corner)
            assumptions.extend(laid.assumptions)
            remarks.extend(laid.remarks)
            spots = [
                Spot(part.ref, pin, 1 if part.top else last, at, through=False)
                for part in laid.parts
                for pin, at in zip("12", part.pads, strict=True)
            ]
            found |= _components("placement", spots, layers, net_of)
    values = {part.ref: part.value for one in lists for part in one.parts if part.value}
    return Populated(
        tuple(replace(found[ref], value=values.get(ref)) for ref in sorted(found)),
        tuple(assumptions),
        tuple(remarks),
    )


def sources_of(components: Iterable[Component]) -> str:
    """Where components are known from, in words.

    Examples
    --------
    >>> sources_of([Component("C1", 1, (), None, "netlist")])
    'the netlist'
    """
    known = {part.source for part in components}
    return " and ".join(words for source, words in _SOURCES if source in known)


def _attributed(layers: Sequence[CopperLayer]) -> list[Spot]:
    """Pads of the outer layers that say which component they belong to."""
    found = []
    for layer in dict.fromkeys((layers[0], layers[-1])):
        for pad in layer.pads:
            if pad.component:
                # a component without pins: its pads are told by their places
                pin = pad.pin or f"at {pad.at[0]:.3f}, {pad.at[1]:.3f}"
                found.append(Spot(pad.component, pin, layer.number, pad.at, through=False))
    return found


def _components(
    source: Origin, spots: Sequence[Spot], layers: Sequence[CopperLayer], net_of: Sequence[int]
) -> dict[str, Component]:
    """Components of their pads; of a pad on both sides, or named twice, the first is taken."""
    parts = _copper_under(spots, layers)
    pins: dict[str, dict[str, Pin]] = defaultdict(dict)
    sides: dict[str, set[int]] = defaultdict(set)
    for spot, part in zip(spots, parts, strict=True):
        net = net_of[part] if part >= 0 else -1
        pins[spot.ref].setdefault(spot.pin, Pin(spot.pin, spot.at, net, part))
        if not spot.through:
            sides[spot.ref].add(spot.layer)
    return {
        ref: Component(
            ref,
            min(sides[ref], default=1),
            tuple(found[name] for name in sorted(found)),
            None,
            source,
        )
        for ref, found in sorted(pins.items())
    }


def _copper_under(spots: Sequence[Spot], layers: Sequence[CopperLayer]) -> list[int]:
    """Id of the piece of copper under each pad, -1 for none."""
    found = np.full(len(spots), -1)
    first = 0
    for layer in layers:
        rows = [i for i, spot in enumerate(spots) if spot.layer == layer.number]
        if rows:
            xs, ys = np.array([spots[i].at for i in rows]).T
            piece = locate(xs, ys, layer.pieces)
            found[rows] = np.where(piece >= 0, first + piece, -1)
        first += len(layer.pieces)
    return [int(part) for part in found]
