"""The rules a board is judged by: interface classes, distances, named nets and parts, waivers."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import Literal, TypeAlias

from splitcheck.verdict.findings import Kind, Point, Source

#: What a supply plane as the reference of a signal is taken for.
SupplyReference: TypeAlias = Literal["allowed", "discouraged", "forbidden"]

#: How far from its place a waiver reaches, mm, if it does not say.
WAIVED_RADIUS_MM = 2.0


@dataclass(frozen=True, slots=True)
class Class:
    """An interface class: what drives its nets, and what they bear."""

    name: str
    rise_ns: float
    """10 to 90 %."""
    wave_mv: float
    """Amplitude of the wave that a driver launches."""
    line_ohm: float
    error_mv: float
    """Noise from which a finding is an error."""
    warning_mv: float
    """Noise from which a finding is a warning."""
    error_nh: float | None = None
    """Added inductance from which a finding is an error, whatever its noise; None: never."""
    warning_nh: float | None = None
    note_mv: float = 0.0
    """Below this noise a place is counted, not listed."""
    words: tuple[str, ...] = ()
    """Patterns of words in the names of its nets: see ``patterns.py``."""
    names: tuple[str, ...] = ()
    """Patterns of whole names."""
    unless: tuple[str, ...] = ()
    """Patterns of words: what has one of them in its name is not of this class."""
    differential: bool = False
    """Whether its nets come as pairs."""
    exempt: bool = False
    """Whether its nets are too slow or too quiet to be judged; they are counted."""
    change_mm: float | None = None
    """Its own ``Rules.change_mm``; None: that of the rules."""
    change_warning_nh: float | None = None
    """Its own ``Rules.change_warning_nh``; None: that of the rules."""
    source: str = "common practice, no source"
    """Where its numbers come from."""


#: 3.3 V logic behind a series termination into 50 ohm, 1 ns; thresholds of 6 % and 2 % of the
#: launched wave. Common practice, no source.
DEFAULT_CLASS = Class("default", 1.0, 1650.0, 50.0, 100.0, 33.0)


@dataclass(frozen=True, slots=True)
class Assignment:
    """What a board's rules say of one net, or of all nets of a pattern."""

    key: str
    """A net's very name, or a pattern of names."""
    source: Source
    net_class: str | None = None
    rise_ns: float | None = None
    current_ma: float | None = None
    """Step of the current that its driver launches, mA: the wave, by the impedance of the line."""


@dataclass(frozen=True, slots=True)
class Waiver:
    """Findings that somebody answers for: they stay visible and do not count."""

    reason: str
    source: Source
    net: str | None = None
    """Pattern of net names; None: any."""
    kind: Kind | None = None
    at_mm: Point | None = None
    radius_mm: float = WAIVED_RADIUS_MM
    fingerprint: str | None = None
    until: date | None = None
    """The last day it holds; None: for ever."""


@dataclass(frozen=True, slots=True)
class Rules:
    """How a board is judged: the shipped rules, with what its own file changes."""

    classes: tuple[Class, ...] = (DEFAULT_CLASS,)
    """In the order in which they are asked; the first that matches a name has it. The one called
    ``default`` has all others."""
    assignments: tuple[Assignment, ...] = ()
    """What the board's own file says of its nets; it goes before what names say."""
    change_mm: float = 1.27
    """A return via at most this far from a via that changes planes serves it, mm."""
    change_warning_nh: float = 0.5
    """A change of plane that adds this much is at least a warning, nH, for edges of 1 ns."""
    edge_heights: float = 1.0
    """A trace nearer to the edge of its plane than so many heights runs along the edge ..."""
    edge_mm: float = 0.0
    """... or nearer than this, mm."""
    supply_reference: SupplyReference = "allowed"
    pairs: tuple[tuple[str, str], ...] = ()
    """Names of nets that are the two legs of a pair, whatever names and geometry say."""
    references: tuple[str, ...] = ()
    """Patterns of nets that carry returns, whatever their names and areas say."""
    capacitors: tuple[str, ...] = ()
    """References of two-pad parts that are capacitors, whatever they are called."""
    waivers: tuple[Waiver, ...] = ()

    @property
    def default(self) -> Class:
        """The class of nets of which nothing is known."""
        return next((one for one in self.classes if one.name == "default"), DEFAULT_CLASS)

    def change_mm_of(self, net_class: Class) -> float:
        """How far a return via may be for a class, mm."""
        return self.change_mm if net_class.change_mm is None else net_class.change_mm

    def change_warning_nh_of(self, net_class: Class) -> float:
        """From where on a change of plane is at least a warning for a class, nH.

        That of the rules is meant for edges of 1 ns and faster; for slower ones it grows with the
        rise time, as the same noise takes so much more.

        Examples
        --------
        >>> slow = Class("i2c", 20.0, 1650.0, 50.0, 99.0, 33.0)
        >>> Rules().change_warning_nh_of(DEFAULT_CLASS), Rules().change_warning_nh_of(slow)
        (0.5, 10.0)
        """
        own = net_class.change_warning_nh
        return self.change_warning_nh * max(1.0, net_class.rise_ns) if own is None else own


#: What is judged by where nobody gives rules: one class for all nets.
PLAIN_RULES = Rules()
