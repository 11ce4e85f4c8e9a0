"""The copper layers in z: from a stack file, a job file, or a stated default build."""

from __future__ import annotations

import tomllib
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from splitcheck.copper.jobfile import Job
from splitcheck.errors import SplitcheckError

#: Board thickness that a default build adds up to, mm (common practice, no source).
DEFAULT_THICKNESS_MM = 1.6
#: Copper of a default build, um (1 oz, common practice, no source).
DEFAULT_COPPER_UM = 35.0
#: Outermost dielectric of a default build, mm, from this many layers on (common practice).
DEFAULT_OUTER_MM = ((4, 0.2), (6, 0.12), (10, 0.1))
#: Relative permittivity of a default build (woven glass and epoxy, common practice).
DEFAULT_ER = 4.3


@dataclass(frozen=True, slots=True)
class StackLayer:
    """One copper layer in the stack."""

    name: str
    number: int
    """1 is the top."""
    top_mm: float
    """Depth of its upper face below the upper face of layer 1, mm, growing downwards."""
    copper_um: float
    er_below: float
    """Relative permittivity of the dielectric beneath it."""

    @property
    def bottom_mm(self) -> float:
        """Depth of its lower face, mm."""
        return self.top_mm + self.copper_um / 1000.0


@dataclass(frozen=True, slots=True)
class Stack:
    """All copper layers, top to bottom, and where their spacing was taken from."""

    layers: tuple[StackLayer, ...]
    origin: str
    """Where from, in words, for the report."""
    assumptions: tuple[str, ...] = ()

    def height_mm(self, one: int, other: int) -> float:
        """Clear distance between the facing surfaces of two layers, mm, > 0.

        Parameters
        ----------
        one, other
            Layer numbers, 1-based, in either order, different.
        """
        upper, lower = self.layers[min(one, other) - 1], self.layers[max(one, other) - 1]
        return round(lower.top_mm - upper.bottom_mm, 9)


@dataclass(frozen=True, slots=True)
class CopperEntry:
    """One ``[[copper]]`` table of a stack file, top to bottom."""

    name: str
    file: str | None
    copper_um: float
    below_mm: float | None
    below_er: float
    negative: bool | None


_KEYS = {"name", "file", "copper_um", "below_mm", "below_er", "polarity"}


def read_stack_file(text: str, name: str) -> tuple[CopperEntry, ...]:
    """Read a stack file: one ``[[copper]]`` table a layer, from the top down.

    Parameters
    ----------
    text
        TOML. Keys of a table: ``name``; ``file`` (which Gerber file it is); ``copper_um``;
        ``below_mm`` and ``below_er`` (the dielectric beneath it; not for the last layer);
        ``polarity`` ("positive" or "negative").
    name
        File name, for messages.

    Raises
    ------
    SplitcheckError
        If it is not TOML, a key is unknown, or a value is missing or out of range.

    Examples
    --------
    >>> top, bottom = read_stack_file('''
    ... [[copper]]
    ... name = "top"
    ... below_mm = 1.5
    ... [[copper]]
    ... name = "bottom"
    ... ''', "stack.toml")
    >>> top.below_mm, bottom.copper_um
    (1.5, 35.0)
    """
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise SplitcheckError(name, f"is not TOML: {error}", "mend the syntax") from error
    unknown = sorted(set(data) - {"copper"})
    if unknown:
        raise SplitcheckError(name, f"unknown key {unknown[0]!r}", "only [[copper]] tables go here")
    tables = data.get("copper")
    if not isinstance(tables, list) or not tables:
        raise SplitcheckError(name, "holds no [[copper]] table", "give one a layer, top to bottom")
    return tuple(
        _entry(table, f"{name}: [[copper]] {number}", last=number == len(tables))
        for number, table in enumerate(tables, start=1)
    )


def _entry(table: dict[str, Any], place: str, *, last: bool) -> CopperEntry:
    unknown = sorted(set(table) - _KEYS)
    if unknown:
        raise SplitcheckError(
            place, f"unknown key {unknown[0]!r}", f"the keys are {', '.join(sorted(_KEYS))}"
        )
    polarity = table.get("polarity")
    if polarity not in {None, "positive", "negative"}:
        raise SplitcheckError(place, f"polarity {polarity!r}", 'write "positive" or "negative"')
    below = _number(table, "below_mm", place, None, 0.01, 20.0)
    if below is None and not last:
        raise SplitcheckError(
            place, "below_mm is missing", "give the dielectric beneath this layer"
        )
    copper_um = _number(table, "copper_um", place, DEFAULT_COPPER_UM, 1.0, 1000.0)
    er = _number(table, "below_er", place, DEFAULT_ER, 1.0, 100.0)
    assert copper_um is not None
    assert er is not None
    return CopperEntry(
        name=str(table.get("name", "")),
        file=str(table["file"]) if "file" in table else None,
        copper_um=copper_um,
        below_mm=below,
        below_er=er,
        negative=None if polarity is None else polarity == "negative",
    )


def _number(
    table: dict[str, Any], key: str, place: str, default: float | None, low: float, high: float
) -> float | None:
    value = table.get(key, default)
    if value is None:
        return None
    if isinstance(value, bool) or not isinstance(value, int | float) or not low <= value <= high:
        raise SplitcheckError(place, f"{key} = {value!r}", f"give a number from {low} to {high}")
    return float(value)


def from_entries(entries: Sequence[CopperEntry], names: Sequence[str], origin: str) -> Stack:
    """Build the stack that a stack file describes.

    Parameters
    ----------
    entries
        As read, top to bottom, one a layer.
    names
        Names of the layers as read from the files, used where an entry gives none.
    origin
        Name of the stack file, for the report and messages.
    """
    if len(entries) != len(names):
        raise SplitcheckError(
            origin,
            f"has {len(entries)} [[copper]] tables but the export has {len(names)} copper layers",
            "give one table a layer, top to bottom",
        )
    copper = [entry.copper_um for entry in entries]
    below = [entry.below_mm or 0.0 for entry in entries]
    er = [entry.below_er for entry in entries]
    given = [entry.name or name for entry, name in zip(entries, names, strict=True)]
    return Stack(_pile(given, copper, below, er), f"stack file {origin}")


def from_job(job: Job, names: Sequence[str]) -> Stack | None:
    """Build the stack that a job file describes; None if it lacks thicknesses or layers."""
    copper: list[float] = []
    below: list[float] = []
    er: list[float] = []
    for row in job.stackup:
        if row.type == "Copper":
            copper.append(1000.0 * row.thickness_mm if row.thickness_mm else DEFAULT_COPPER_UM)
            below.append(0.0)
            er.append(DEFAULT_ER)
        elif row.type == "Dielectric" and copper:
            if row.thickness_mm is None:
                return None
            below[-1] += row.thickness_mm
            er[-1] = row.er or DEFAULT_ER
    if len(copper) != len(names) or any(thickness <= 0.0 for thickness in below[:-1]):
        return None
    return Stack(_pile(names, copper, below, er), f"job file {job.name}")


def default_build(names: Sequence[str], thickness_mm: float | None = None) -> Stack:
    """Build a usual stack for that many layers; its spacing is an assumption and says so.

    Parameters
    ----------
    names
        Names of the copper layers, top to bottom, one or more.
    thickness_mm
        Board thickness if known, mm.

    Notes
    -----
    Thin dielectrics outside, the rest shared evenly; common practice, no source.

    Examples
    --------
    >>> default_build(["top", "gnd", "pwr", "bottom"]).height_mm(1, 2)
    0.2
    """
    count = len(names)
    total = thickness_mm or DEFAULT_THICKNESS_MM
    dielectric = max(total - count * DEFAULT_COPPER_UM / 1000.0, 0.02 * max(count - 1, 1))
    outer = 0.0
    for least, height_mm in DEFAULT_OUTER_MM:
        if count >= least:
            outer = height_mm
    if outer and 2 * outer < 0.9 * dielectric:
        inner = (dielectric - 2 * outer) / (count - 3)
        below = [outer, *[inner] * (count - 3), outer, 0.0]
    else:
        below = [*[dielectric / max(count - 1, 1)] * (count - 1), 0.0]
    spacing = ", ".join(f"{height_mm:.2f}" for height_mm in below[:-1])
    layers = _pile(names, [DEFAULT_COPPER_UM] * count, below, [DEFAULT_ER] * count)
    said = (
        f"The export states no layer spacing: a usual build of {count} layers and "
        f"{layers[-1].bottom_mm:.2f} mm was taken (dielectrics {spacing} mm from the top down, "
        f"35 um copper); heights set the nH, so give --stack FILE.toml to be sure."
    )
    return Stack(layers, "default build", (said,))


def _pile(
    names: Sequence[str], copper_um: Sequence[float], below_mm: Sequence[float], er: Sequence[float]
) -> tuple[StackLayer, ...]:
    layers: list[StackLayer] = []
    depth = 0.0
    for number, name in enumerate(names, start=1):
        layers.append(
            StackLayer(name, number, round(depth, 6), copper_um[number - 1], er[number - 1])
        )
        depth += copper_um[number - 1] / 1000.0 + below_mm[number - 1]
    return tuple(layers)
