"""What is asked of the field solve, and what it answers."""

from __future__ import annotations

from dataclasses import dataclass

from shapely import LineString, Point, Polygon

from splitcheck.loops.panels import Panels
from splitcheck.units import Floats


@dataclass(frozen=True, slots=True)
class TraceOver:
    """One trace over a gap."""

    line: LineString
    """Centre line, mm, with its ends over copper on both sides of the gap."""
    width_mm: float


@dataclass(frozen=True, slots=True)
class ViaBridge:
    """A plated hole that joins this plane and the plane beyond, or a part that does.

    Or else one to the plane above, if `above`.
    """

    at: Point
    diameter_mm: float
    mounted_nh: float = 0.0
    """Inductance of a part in its way, as mounted; 0 for a mere hole."""
    above: bool = False


@dataclass(frozen=True, slots=True)
class Strap:
    """A two-pad part across the gap, as a short wide trace: capacitor, resistor, link."""

    line: LineString
    """From pad to pad, mm, both ends over copper."""
    width_mm: float
    height_mm: float
    """Height of its current over the plane."""
    mounted_nh: float
    """Inductance of the part as mounted over a whole plane."""
    beyond: bool = False
    """It stands on the plane's other side than the traces, where `beyond_mm` lies above it."""


@dataclass(frozen=True, slots=True)
class Solution:
    """Added inductance of all traces over the same gaps, and the flux that makes it."""

    added_nh: Floats
    """Matrix, shape (n, n): added loop inductance on the diagonal, mutual off it. A trace that is
    cut off has infinity on the diagonal and 0 elsewhere."""
    error_nh: Floats
    """How far each entry may be off, shape (n, n)."""
    panels: int
    cut_off: tuple[bool, ...]
    """For each trace: no way back, neither by copper nor by a bridge."""
    remarks: tuple[str, ...]
    """What was done to the input that may change the value, each a full sentence."""
    mesh: Panels
    flux_nwb: Floats
    """Flux through each panel per ampere in each trace, shape (panels, n), nWb/A."""
    bridge_a: Floats
    """Current in each bridge per ampere in each trace, shape (bridges, n)."""
    coarser: float = 1.0
    """How many times coarser than they should be the panels were made, so as not to be too many."""
    gaps: tuple[Polygon, ...] = ()
    """The gaps as they were solved."""
    lines: tuple[Floats | None, ...] = ()
    """The centre lines as they were solved, shape (p, 2); None: nowhere over copper."""

    def of(self, trace: int) -> float | None:
        """Added inductance of one trace in nH, or None where it has no way back."""
        return None if self.cut_off[trace] else float(self.added_nh[trace, trace])
