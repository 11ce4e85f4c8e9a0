"""The board's components: which part sits where, with its pins on the copper and their nets."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple, TypeAlias

from splitcheck.copper.marks import Point

#: Where a component is known from.
Origin: TypeAlias = Literal["attributes", "netlist", "placement", "rules"]

_REF = re.compile(r"([A-Za-z]+)[\d_?]")
_ZERO = re.compile(
    "^\\s*0+(?:[.,]0*)?\\s*(?:[re]0*|ohms?|\u03a9|\u2126)?\\s*(?:$|[/,_;(-])", re.IGNORECASE
)


class Pin(NamedTuple):
    """One pad of a component."""

    number: str
    at: Point
    net: int
    """Number of the net of the copper it lies on, -1 if it lies on none."""
    part: int
    """Id of that piece of copper, -1 if it lies on none."""


@dataclass(frozen=True, slots=True)
class Component:
    """One part on the board."""

    ref: str
    layer: int
    """The outer layer that it is mounted on, 1 is the top."""
    pins: tuple[Pin, ...]
    """By number; only those that a file tells the place of."""
    value: str | None
    """As the placement file has it; None if no file tells."""
    source: Origin


def prefix(ref: str) -> str:
    """The letters a reference begins with, in upper case.

    Examples
    --------
    >>> prefix("C12"), prefix("FB3"), prefix("U"), prefix("7")
    ('C', 'FB', '', '')
    """
    found = _REF.match(ref)
    return found[1].upper() if found else ""


def is_zero_ohm(value: str | None) -> bool:
    """Whether a part's value says that it is a link of no resistance.

    Examples
    --------
    >>> [is_zero_ohm(value) for value in ("0R", "0", "0 Ohm", "0R0/0402", "0.1uF", "10R", None)]
    [True, True, True, True, False, False, False]
    """
    return value is not None and bool(_ZERO.match(value))


def capacitors_of(
    components: Iterable[Component], extra_refs: Sequence[str] = ()
) -> tuple[Component, ...]:
    """Two-pad parts whose reference begins with C, and those named.

    Parameters
    ----------
    components
        All components.
    extra_refs
        References of more parts that are capacitors, whatever they are called.

    Returns
    -------
    In the order of the components.

    Notes
    -----
    C for capacitor is common practice (IEC 81346-2 and IEEE 315 use the letter too).
    """
    extra = set(extra_refs)
    return tuple(
        part
        for part in components
        if len(part.pins) == 2 and (prefix(part.ref) == "C" or part.ref in extra)
    )


def links_of(components: Iterable[Component]) -> tuple[Component, ...]:
    """Two-pad resistors, inductors and ferrites whose value says 0 ohm: they are mere copper."""
    return tuple(
        part
        for part in components
        if len(part.pins) == 2 and prefix(part.ref) in {"R", "L", "FB"} and is_zero_ohm(part.value)
    )
