"""What judging needs to know: the board, its planes, and each crossing once it is weighed."""

from __future__ import annotations

from dataclasses import dataclass

from splitcheck.board.board import Board
from splitcheck.board.pairs import Pair
from splitcheck.loops.bridges import IslandGraph
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.stitches import Stitch
from splitcheck.loops.terrain import Terrain
from splitcheck.loops.ways import Route
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.islands import Plane
from splitcheck.verdict.findings import Count, Finding, Kind, WaiverRow
from splitcheck.verdict.rules import PLAIN_RULES, Class, Rules


@dataclass(frozen=True, slots=True)
class Scene:
    """What judging a crossing needs to know beyond the crossing."""

    board: Board
    planes: dict[int, Plane]
    terrains: dict[int, Terrain]
    graph: IslandGraph
    min_nh: float
    rules: Rules = PLAIN_RULES
    drives: tuple[Class, ...] = ()
    """The class of each net, by its number, with what is known of the net alone; empty: every net
    as by default."""
    pairs: tuple[Pair, ...] = ()
    """The differential pairs among the nets that are judged."""

    def drive_of(self, net: int) -> Class:
        """The class of a net: what drives it and what it bears."""
        return self.drives[net] if self.drives else self.rules.default


@dataclass(frozen=True, slots=True)
class Weighed:
    """A crossing with its way round and what closed forms say of it."""

    crossing: Crossing
    route: Route
    beyond: int | None
    """Layer number of a whole plane beyond the broken one."""
    other: int | None
    """Layer number of a whole plane on the trace's other side."""
    beside: int | None
    """Layer number of the plane on the trace's other side, before and after the run."""
    share: float
    """Part of the return that the broken plane carries."""
    estimate: Inductance | None
    kind: Kind
    runs: tuple[Crossing, ...]
    """All runs that it stands for: one trace may pass over one gap several times."""
    stitches: tuple[Stitch, ...] = ()
    """Plated holes near them that join the plane with that on the trace's other side."""
    by_holes: bool = False
    """Whether the estimate is that of a return which goes over to the other plane by them."""

    @property
    def bare_mm(self) -> float:
        """Length of all its runs, mm."""
        return sum(crossing.run_mm for crossing in self.runs)


@dataclass(frozen=True, slots=True)
class Judged:
    """What judging a board comes to."""

    findings: tuple[Finding, ...]
    """Worst first, numbered."""
    counts: tuple[Count, ...]
    """What was seen and is not a finding."""
    weighed: dict[str, Weighed]
    """By id of the finding: the crossing behind it, of those that have one."""
    waivers: tuple[WaiverRow, ...] = ()
    """What became of each waiver of the rules."""
