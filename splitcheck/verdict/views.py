"""What pictures are drawn from: shapes in mm, simplified for the eye, never for a verdict."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from splitcheck.verdict.findings import Point

#: A closed outline, its first point not repeated; or an open line.
Line: TypeAlias = tuple[Point, ...]
#: A polygon: its outline, then its holes.
Shape: TypeAlias = tuple[Line, ...]
#: West, south, east, north, mm.
Box: TypeAlias = tuple[float, float, float, float]


@dataclass(frozen=True, slots=True)
class IslandView:
    """A piece of reference copper."""

    id: str
    net: str
    shape: Shape


@dataclass(frozen=True, slots=True)
class LayerView:
    """A copper layer of the board map."""

    number: int
    name: str
    islands: tuple[IslandView, ...]
    """Reference copper; empty on a layer without a plane."""
    traces: tuple[Line, ...]
    """Centre lines of the traces that are judged."""


@dataclass(frozen=True, slots=True)
class NetView:
    """The traces of one net that has findings."""

    name: str
    lines: tuple[tuple[int, Line], ...]
    """Number of the layer, and a centre line on it."""


@dataclass(frozen=True, slots=True)
class BoardView:
    """The map of a board."""

    box_mm: Box
    outline: tuple[Shape, ...]
    layers: tuple[LayerView, ...]
    nets: tuple[NetView, ...]
    gaps: tuple[tuple[str, Shape], ...]
    """Gaps with findings, by their id, without what reaches beyond the board."""
    tolerance_mm: float
    """Outlines are drawn this well."""


@dataclass(frozen=True, slots=True)
class TraceView:
    """A stretch of trace in the window of a finding."""

    net: str
    line: Line
    width_mm: float


@dataclass(frozen=True, slots=True)
class WayView:
    """A way that the return can take round the gap."""

    path: Line
    length_mm: float
    bridges: tuple[Point, ...]
    """Plated holes or parts that it goes through."""
    best: bool


@dataclass(frozen=True, slots=True)
class StreamView:
    """Lines of the return current, each for an equal part of it."""

    lines: tuple[Line, ...]
    part: float
    """The part each stands for, of the current in the trace."""
    vias: tuple[tuple[Point, float], ...]
    """Plated holes that it goes through, and the part of the current in each."""


@dataclass(frozen=True, slots=True)
class ImpedanceView:
    """Impedance of the direct way and of the way round against frequency."""

    frequency_khz: tuple[float, ...]
    direct_ohm: tuple[float, ...]
    """Were the plane whole."""
    round_ohm: tuple[float, ...]
    corner_khz: float | None
    """Above it what the detour adds is inductance rather than resistance."""


@dataclass(frozen=True, slots=True)
class FindingView:
    """One finding seen from near."""

    id: str
    window_mm: Box
    gaps: tuple[Shape, ...]
    """Where the plane has no copper, in the window."""
    crossed: tuple[Shape, ...]
    """The gap in question, in the window."""
    foreign: tuple[Shape, ...]
    """Copper on the plane's layer that carries no return."""
    islands: tuple[tuple[str, Point], ...]
    """Names of the pieces of plane, and where to write them."""
    runs: tuple[Line, ...]
    """The trace where it has no plane."""
    own: tuple[TraceView, ...]
    """The net in question."""
    others: tuple[TraceView, ...]
    """Other nets over the same gap."""
    ways: tuple[WayView, ...]
    whole: StreamView | None
    """The return current, were the plane whole; None if nothing was solved or drawn."""
    broken: StreamView | None
    """The return current as it is."""
    impedance: ImpedanceView | None
    fed_mm: tuple[Point, ...] | None
    """Where the drawing lets the return in and out, if the window shows it: the ends of the
    stretch that the trace was followed for."""
    facts: tuple[tuple[str, str], ...]
    """What the picture was made from, as question and answer, for the chain of reasoning."""


@dataclass(frozen=True, slots=True)
class Pictures:
    """All that is drawn of a board: its map, and the worst findings from near."""

    board: BoardView
    findings: tuple[FindingView, ...]
    """Worst first; not every finding of a long list."""
    with_streams: int
    """For how many of them the return current was looked for."""

    def of(self, finding: str) -> FindingView | None:
        """The view of a finding, if it was drawn."""
        return next((view for view in self.findings if view.id == finding), None)
