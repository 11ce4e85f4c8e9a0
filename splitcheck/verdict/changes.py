"""What became of an earlier revision's findings: the contract between comparing and showing."""

from __future__ import annotations

from dataclasses import dataclass
from math import cos, degrees, hypot, radians, sin
from typing import Literal, TypeAlias

from splitcheck.verdict.findings import LEVELS, Finding, Kind, Level, Point, Report

Verdict: TypeAlias = Literal["new", "worse", "better", "gone", "unchanged"]

#: In the order in which they are told.
VERDICTS: tuple[Verdict, ...] = ("new", "worse", "better", "gone", "unchanged")

_NOTHING_DEG, _NOTHING_MM = 0.005, 0.005
_CROSSINGS: tuple[Kind, ...] = ("slot-crossing", "void-crossing", "split-crossing")


def family(kind: Kind) -> str:
    """What a kind may turn into without being another finding: a crossing stays a crossing.

    Examples
    --------
    >>> family("slot-crossing") == family("split-crossing"), family("no-plane")
    (True, 'no-plane')
    """
    return "crossing" if kind in _CROSSINGS else kind


@dataclass(frozen=True, slots=True)
class Move:
    """How a board lies in its newer files against its older ones: turned first, then moved."""

    turned_rad: float = 0.0
    """Counter-clockwise, -pi to pi."""
    shift_mm: Point = (0.0, 0.0)

    def place(self, point: Point) -> Point:
        """Where a place of the older board is on the newer one, mm.

        Examples
        --------
        >>> Move(0.0, (5.0, -1.0)).place((1.0, 2.0))
        (6.0, 1.0)
        """
        c, s = cos(self.turned_rad), sin(self.turned_rad)
        x, y = point
        return c * x - s * y + self.shift_mm[0], s * x + c * y + self.shift_mm[1]

    @property
    def turned_deg(self) -> float:
        """The same angle in degrees."""
        return degrees(self.turned_rad)

    @property
    def is_nothing(self) -> bool:
        """Whether the board lies where it lay."""
        still = abs(self.turned_rad) <= radians(_NOTHING_DEG)
        return still and hypot(*self.shift_mm) <= _NOTHING_MM


@dataclass(frozen=True, slots=True)
class Change:
    """One finding of either revision and what became of it."""

    verdict: Verdict
    why: str
    """Half a sentence for a person: by how much, or what else made the verdict."""
    now: Finding | None
    """None where it is gone."""
    was: Finding | None
    """None where it is new."""

    @property
    def finding(self) -> Finding:
        """The newer of the two."""
        finding = self.now or self.was
        assert finding is not None
        return finding


@dataclass(frozen=True, slots=True)
class Comparison:
    """Two revisions of a board, finding by finding."""

    was: Report
    """The earlier revision."""
    move: Move
    changes: tuple[Change, ...]
    """By verdict in the order of ``VERDICTS``, the worst first within each; every finding of
    either revision once."""
    remarks: tuple[str, ...]
    """What else differs and matters to the comparison, each a full sentence."""

    def by_id(self) -> dict[str, Change]:
        """What became of each finding of the newer revision, by its id."""
        return {change.now.id: change for change in self.changes if change.now is not None}

    def of(self, *verdicts: Verdict) -> tuple[Change, ...]:
        """All changes with one of these verdicts, in order."""
        return tuple(change for change in self.changes if change.verdict in verdicts)

    def failing(self, at: Level) -> tuple[Change, ...]:
        """What fails a gate: new or worse, of a level or one above it, and not waived."""
        counted = LEVELS[: LEVELS.index(at) + 1]
        return tuple(
            change
            for change in self.of("new", "worse")
            if change.finding.level in counted and change.finding.waived is None
        )
