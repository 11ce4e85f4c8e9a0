"""What a drill file says, taken apart into commands whose numbers are still unread."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal, NamedTuple, TypeAlias

from splitcheck.copper import naming

Unit: TypeAlias = Literal["mm", "inch"]
Zeros: TypeAlias = Literal["leading", "trailing"]
"""Which zeros are kept in a number without a decimal point."""
Code: TypeAlias = Literal[
    "tool", "hit", "slot", "move", "cut", "arc", "down", "up", "repeat", "relative", "absolute"
]


class Op(NamedTuple):
    """One command, with its numbers as they are written."""

    code: Code
    line: int
    x: str | None = None
    y: str | None = None
    x2: str | None = None
    """Second point of a slot, or I of an arc."""
    y2: str | None = None
    number: int = 0
    """Tool number, number of repeats, or 1 for a clockwise and -1 for the other arc."""
    radius: str | None = None


class Tool(NamedTuple):
    """One entry of the tool table."""

    size: str | None
    unit: Unit | None
    """Unit in force where the tool is defined."""
    plated: bool | None = None
    via: bool | None = None
    quantity: int | None = None
    """Number of holes that a comment states."""


@dataclass(slots=True)
class Script:
    """A drill file taken apart into commands."""

    name: str
    ops: list[Op] = field(default_factory=list)
    tools: dict[int, Tool] = field(default_factory=dict)
    unit: Unit | None = None
    digits: tuple[int, int] | None = None
    """Digits before and after the decimal point, where the file states them."""
    zeros: Zeros | None = None
    function: tuple[str, ...] = ()
    """Its file function (X2), if any."""
    remarks: list[str] = field(default_factory=list)

    def plated(self) -> bool | None:
        """Plating of the whole file: by its attribute, or else its name."""
        if self.function:
            return {"plated": True, "nonplated": False}.get(self.function[0].casefold())
        return naming.plating(self.name)

    def all_decimal(self) -> bool:
        """Whether every coordinate carries its decimal point."""
        return all("." in word or not word.strip("+-0") for word in self._numbers())

    def longest_number(self) -> int:
        """Most digits of any coordinate without a decimal point."""
        return max((len(w.lstrip("+-")) for w in self._numbers() if "." not in w), default=0)

    def _numbers(self) -> set[str]:
        words = {w for op in self.ops for w in (op.x, op.y, op.x2, op.y2, op.radius)}
        return {word for word in words if word is not None}
