"""Capacitors that a board's own rules place, as components with their pads on the copper."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from splitcheck.board.board import Board
from splitcheck.board.components import Component, Pin
from splitcheck.board.traces import locate
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.verdict.rulesfile import PlacedCapacitor


def with_capacitors(board: Board, placed: Sequence[PlacedCapacitor], named: Sequence[str]) -> Board:
    """A board with the capacitors that the rules know of.

    Parameters
    ----------
    board
        The board; a component of the same reference is told anew.
    placed
        Two-pad parts by the places of their pads.
    named
        References of components that are capacitors, whatever they are called.

    Raises
    ------
    SplitcheckError
        With file and line: a pad that lies on no copper.
    """
    if not placed and not named:
        return board
    new = {part.ref: _component(board, part) for part in placed}
    kept = [part for part in board.components if part.ref not in new]
    components = tuple(sorted([*kept, *new.values()], key=lambda part: part.ref))
    return replace(board, components=components, capacitors=(*named, *new))


def _component(board: Board, placed: PlacedCapacitor) -> Component:
    layer = 1 if placed.top else len(board.layers)
    pins = tuple(
        _pin(board, layer, number, at, placed.place)
        for number, at in zip("12", placed.pads_mm, strict=True)
    )
    return Component(placed.ref, layer, pins, None, "rules")


def _pin(board: Board, layer: int, number: str, at: Point, place: str) -> Pin:
    copper = board.layers[layer - 1]
    piece = int(locate(np.array([at[0]]), np.array([at[1]]), copper.pieces)[0])
    if piece < 0:
        wrong = f"pad {number} at ({at[0]:g}, {at[1]:g}) lies on no copper of {copper.name!a}"
        raise SplitcheckError(place, wrong, "give the middle of a pad, as in the Gerber files, mm")
    part = sum(len(one.pieces) for one in board.layers[: layer - 1]) + piece
    return Pin(number, at, board.net_of[part], part)
