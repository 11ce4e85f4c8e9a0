"""What a drill file says: holes and slots with diameter, plating and span."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

from splitcheck.copper.marks import Point


class Hole(NamedTuple):
    """One drilled hole, or one slot if it has more than one point."""

    path: tuple[Point, ...]
    """Centre of the hole, or the centre line of a slot, mm."""
    diameter_mm: float
    plated: bool | None
    """``None`` where the file does not say; decided later against the copper, as an assumption."""
    span: tuple[int, int] | None
    """First and last copper layer it goes through, 1-based; ``None``: all of them."""
    line: int
    via: bool | None = None
    """True for a via (``ViaDrill``), False for a component hole, ``None`` if not said."""


@dataclass(frozen=True, slots=True)
class DrillFile:
    """One drill file as read, in mm."""

    name: str
    holes: tuple[Hole, ...]
    format: str
    """How the coordinates were read, in words: ``metric, 4.4, leading zeros kept``."""
    stated: bool
    """Whether the file itself states all of ``format``."""
    remarks: tuple[str, ...]
