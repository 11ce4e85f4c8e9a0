"""The board: stack, copper, nets, plated holes and outline, in the Gerber files' own x and y."""

from __future__ import annotations

from dataclasses import dataclass

from shapely import MultiPolygon, Polygon

from splitcheck.board.components import Component
from splitcheck.board.nets import Net, PlatedHole
from splitcheck.board.parts import CopperLayer, Part
from splitcheck.board.stack import Stack


@dataclass(frozen=True, slots=True)
class Board:
    """Everything later stages need to know of the board."""

    name: str
    outline: Polygon | MultiPolygon
    stack: Stack
    layers: tuple[CopperLayer, ...]
    parts: tuple[Part, ...]
    net_of: tuple[int, ...]
    """Number of the net of each part."""
    nets: tuple[Net, ...]
    holes: tuple[PlatedHole, ...]
    """Plated holes."""
    components: tuple[Component, ...] = ()
    """Parts on the board, by reference; empty if no file tells them."""
    references: frozenset[int] = frozenset()
    """Numbers of the nets that the rules say carry returns, whatever they are called."""
    capacitors: tuple[str, ...] = ()
    """References of components that the rules say are capacitors."""
