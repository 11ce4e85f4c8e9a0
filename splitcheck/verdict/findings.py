"""The findings and the report: what every way of showing results is made from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

Kind: TypeAlias = Literal[
    "slot-crossing", "void-crossing", "split-crossing", "edge-run", "plane-change", "no-plane"
]
Level: TypeAlias = Literal["error", "warning", "note"]
Method: TypeAlias = Literal["solved", "estimated", "none"]
Role: TypeAlias = Literal["signal", "plane", "mixed"]
Point: TypeAlias = tuple[float, float]

#: Worst first.
LEVELS: tuple[Level, ...] = ("error", "warning", "note")


@dataclass(frozen=True, slots=True)
class Source:
    """A place in an input file."""

    file: str
    line: int


@dataclass(frozen=True, slots=True)
class BridgeUse:
    """Something the return current uses to get from one side of a gap to the other."""

    kind: Literal["via", "capacitor", "copper"]
    at_mm: Point
    net: str


@dataclass(frozen=True, slots=True)
class GapShare:
    """Another net over the same gap; ``mutual_nh`` is None while nothing was solved."""

    net: str
    mutual_nh: float | None


@dataclass(frozen=True, slots=True)
class Finding:
    """One place where a return path is broken, with what it costs."""

    id: str
    """Short and stable within the report: ``F1`` is the worst."""
    kind: Kind
    level: Level
    net: str
    net_class: str
    layer: str
    plane_layer: str
    """Empty for ``no-plane``."""
    plane_net: str
    at_mm: Point
    gap_mm: float
    """Length of the trace without its plane beneath, mm."""
    detour_mm: float | None
    """What the return walks more than the straight way; None: no galvanic way at all."""
    added_nh: float | None
    """Added loop inductance; None: no way back to put a number on, see ``method`` "none"."""
    error_nh: float | None
    method: Method
    noise_mv: float | None
    rise_ns: float
    corner_khz: float | None
    stray_db: float | None
    islands: tuple[str, ...]
    """Ids of the islands where the return leaves and where it must arrive."""
    bridges: tuple[BridgeUse, ...]
    gap: str
    """Id of the gap; findings over one gap share it and are shown together."""
    shares_gap_with: tuple[GapShare, ...]
    pair: str | None
    source: Source
    waived: str | None
    """The reason given in the waiver, else None."""
    fingerprint: str
    reason: str
    """One sentence for a person: what is missing, where the return goes instead."""
    estimated_nh: float | None = None
    """What closed forms say, where that differs from the solved value by more than both errors."""
    estimated_error_nh: float | None = None


@dataclass(frozen=True, slots=True)
class LayerRow:
    """A copper layer as the report states it."""

    name: str
    file: str
    number: int
    z_mm: float
    copper_um: float
    role: Role


@dataclass(frozen=True, slots=True)
class InputRow:
    """An input file: what it was taken for, why, and its digest."""

    file: str
    kind: str
    sha256: str
    reason: str


@dataclass(frozen=True, slots=True)
class IslandRow:
    """A connected piece of reference copper."""

    id: str
    layer: str
    net: str
    area_mm2: float


@dataclass(frozen=True, slots=True)
class NetRow:
    """A net and what was found on it."""

    name: str
    net_class: str
    length_mm: float
    layers: tuple[str, ...]
    findings: int
    worst_added_nh: float | None
    journey: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Count:
    """Something known that is not a finding: exempt nets, crossings too small to list."""

    what: str
    number: int


@dataclass(frozen=True, slots=True)
class Report:
    """Everything ``rank`` found out about one board; findings sorted worst first."""

    board: str
    size_mm: tuple[float, float]
    layers: tuple[LayerRow, ...]
    assumptions: tuple[str, ...]
    """What was assumed and changes results, worst first, each a full sentence."""
    remarks: tuple[str, ...]
    """Oddities of the input that do not change results."""
    facts: tuple[str, ...]
    """Short lines of what was read: ``1209 of 1214 plated holes land on copper of two layers``."""
    inputs: tuple[InputRow, ...]
    islands: tuple[IslandRow, ...]
    nets: tuple[NetRow, ...]
    findings: tuple[Finding, ...]
    counts: tuple[Count, ...]
    seconds: tuple[tuple[str, float], ...]
    """Wall time of each stage; the only part that differs between two runs."""
