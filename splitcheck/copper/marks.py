"""What a Gerber file draws, mark by mark: strokes, flashes and fills with file line and net."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple, TypeAlias

from shapely import Polygon

Point: TypeAlias = tuple[float, float]


class Tag(NamedTuple):
    """What the attributes in force say of a mark; shared by all marks of one attribute state."""

    net: str | None = None
    """Net name (``.N``): ``None`` unknown, ``""`` declared to be on no net."""
    function: str | None = None
    """First field of ``.AperFunction``: ``Conductor``, ``ViaPad``, ``ComponentPad`` ..."""
    component: str | None = None
    """Reference of the component (``.C``, or first field of ``.P``)."""
    pin: str | None = None
    """Pin of the component (second field of ``.P``)."""


NO_TAG = Tag()


class Stroke(NamedTuple):
    """A drawn line or arc, as its centre line; arcs are already flattened."""

    points: tuple[Point, ...]
    """Centre line, two or more points, mm, on the 1 nm grid."""
    width_mm: float
    """Diameter of the round aperture; for other apertures their smaller side. 0 paints nothing."""
    shape: Polygon | None
    """Outline at the origin of an aperture that is not round (it sweeps a hull), else ``None``."""
    dark: bool
    tag: Tag
    line: int
    """Line in the file, 1-based."""


class Flash(NamedTuple):
    """An aperture set down once. Block apertures are taken apart into their own marks."""

    at: Point
    shape: Polygon
    """Outline at the origin (mirror, turn and scale already applied), holes included, mm."""
    dark: bool
    tag: Tag
    line: int
    diameter_mm: float | None = None
    """Diameter if the aperture is a plain circle."""


class Fill(NamedTuple):
    """One filled contour of a region statement (G36/G37)."""

    ring: tuple[Point, ...]
    """Closed contour as drawn, first point repeated last; may have cut-ins or cross itself."""
    dark: bool
    tag: Tag
    line: int


Mark: TypeAlias = Stroke | Flash | Fill


@dataclass(frozen=True, slots=True)
class Drawing:
    """One Gerber file as read: its marks in file order, nothing painted yet."""

    name: str
    marks: tuple[Mark, ...]
    attributes: tuple[tuple[str, tuple[str, ...]], ...]
    """File attributes (``.FileFunction``, ``Copper, L1, Top``), plain or from ``G04 #@!``."""
    remarks: tuple[str, ...]
    """Oddities that could be read, each as ``file:line: text``; they reach the report."""
    image_negative: bool = False
    """Whether the file says that its image is negative (``%IPNEG*%`` or ``.FilePolarity``)."""

    def attribute(self, name: str) -> tuple[str, ...] | None:
        """Fields of a file attribute, or ``None`` if the file does not carry it."""
        return dict(self.attributes).get(name)
