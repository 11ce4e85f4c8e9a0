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
class Proposal:
    """One thing that would mend a finding, with what the finding is worth afterwards."""

    what: Literal["via", "capacitor", "copper", "move"]
    at_mm: tuple[Point, ...]
    """Where: the places of vias, both pads of each capacitor, the ends of a bridge of copper or
    the corners of a piece of copper, or the ends of the piece of trace to move."""
    words: str
    """One sentence for a person: what to put where, and how large."""
    added_nh: float
    """What is left of the added inductance."""
    error_nh: float
    noise_mv: float
    isolation: bool
    """Whether the gap may be an isolation barrier: the two sides share no net and no bridge."""


@dataclass(frozen=True, slots=True)
class Miss:
    """A way to mend a finding that was tried in vain, and why."""

    what: Literal["via", "capacitor", "copper", "move"]
    words: str
    """What was in the way, or how little the best that was tried takes away."""
    share: float | None = None
    """The largest share of the added inductance that anything tried takes away, too small to be
    proposed (below 0 it adds); None: nothing could be valued."""


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
    odd_nh: float | None = None
    """For a leg of a differential pair: what both legs gain together in odd mode, nH."""
    unbalance_nh: float | None = None
    """For a leg of a pair: by how much the legs differ, which turns into common mode, nH."""
    common_nh: float | None = None
    """For an edge run: the common-mode inductance of the plane beneath, nH."""
    crosstalk_mv: float | None = None
    """What all other nets over the gap induce when they switch together, mV."""
    capped: bool = False
    """Whether the gap is too long for the rise time, so that the noise stands at the limit of the
    slot as a line."""
    proposals: tuple[Proposal, ...] = ()
    """What would mend it, best first; empty unless asked for."""
    misses: tuple[Miss, ...] = ()
    """If it was asked for and nothing would: each way that was tried, and why it fails."""


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
class Leg:
    """One step of a net's way: a stretch over one plane, a change of plane, or a finding."""

    kind: Literal["stretch", "bare", "change", "finding"]
    layer: str
    plane_layers: tuple[str, ...]
    """Layers of the planes that carry the return, nearest first."""
    plane_nets: tuple[str, ...]
    length_mm: float
    """0 for a change of plane."""
    at_mm: Point
    """Where it begins."""
    added_nh: float | None
    """0 where nothing is broken; None: no way back."""
    finding: str | None
    """Id of the finding that it is, if it is one."""


@dataclass(frozen=True, slots=True)
class NetRow:
    """A net and what was found on it."""

    name: str
    net_class: str
    length_mm: float
    layers: tuple[str, ...]
    findings: int
    worst_added_nh: float | None
    journey: tuple[Leg, ...] = ()
    """From one end to the other; of a branched net its longest way, then the branches."""
    sum_nh: float | None = None
    """What all its findings add, nH; None if one of them has no way back."""
    pair: str | None = None
    """The other leg, if the net is one of a differential pair."""
    exempt: str | None = None
    """Why the net is not judged, if it is not."""


@dataclass(frozen=True, slots=True)
class Count:
    """Something known that is not a finding: exempt nets, crossings too small to list."""

    what: str
    number: int


@dataclass(frozen=True, slots=True)
class ClassRow:
    """An interface class and how its nets are judged."""

    name: str
    nets: int
    rise_ns: float
    wave_mv: float
    line_ohm: float
    error_mv: float
    warning_mv: float
    exempt: bool
    source: str
    """Where its numbers come from."""


@dataclass(frozen=True, slots=True)
class PairRow:
    """A differential pair and how it was known."""

    nets: tuple[str, str]
    known_by: Literal["name", "geometry", "name and geometry", "rules"]
    apart_mm: float | None
    """Usual distance of the centre lines; None if they never run side by side."""
    coupled_mm: float
    """Length along which they run side by side, mm."""


@dataclass(frozen=True, slots=True)
class WaiverRow:
    """A waiver of the board's rules and what became of it."""

    reason: str
    until: str | None
    """Last day it holds, as written (ISO 8601), or None."""
    findings: int
    """How many findings it waives."""
    state: Literal["used", "expired", "unmatched"]
    source: Source


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
    classes: tuple[ClassRow, ...] = ()
    """Every class with nets on this board, by name."""
    pairs: tuple[PairRow, ...] = ()
    waivers: tuple[WaiverRow, ...] = ()
    corner_mm: Point | None = None
    """Lower left corner of the outline's bounds, which with ``size_mm`` says where the board lies
    in its files; None if not known."""
