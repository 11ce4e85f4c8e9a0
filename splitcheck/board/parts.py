"""One copper layer as the board sees it: its connected pieces, their names, pads and traces."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

from shapely import Polygon

from splitcheck.board.traces import CentreLine
from splitcheck.copper.marks import Point


class Pad(NamedTuple):
    """A flashed pad, or a filled contour of a pad's size."""

    at: Point
    net: str | None
    component: str | None
    pin: str | None
    function: str | None
    size_mm: float
    """Larger side of its outline."""
    flashed: bool


@dataclass(frozen=True, slots=True)
class CopperLayer:
    """The copper of one layer, painted and taken apart into connected pieces."""

    number: int
    """1 is the top."""
    name: str
    file: str
    pieces: tuple[Polygon, ...]
    names: tuple[tuple[str, ...], ...]
    """For every piece the net names its marks carry, sorted."""
    lines: tuple[CentreLine, ...]
    pads: tuple[Pad, ...]
    marks: int
    """How many marks the file draws."""


@dataclass(frozen=True, slots=True)
class Part:
    """One connected piece of copper on one layer."""

    id: int
    layer: int
    """Layer number, 1-based."""
    shape: Polygon
    names: tuple[str, ...]


def parts_of(layers: tuple[CopperLayer, ...]) -> tuple[Part, ...]:
    """All pieces of all layers, numbered from the top down."""
    parts: list[Part] = []
    for layer in layers:
        for shape, names in zip(layer.pieces, layer.names, strict=True):
            parts.append(Part(len(parts), layer.number, shape, names))
    return tuple(parts)
