"""Crossings of a board to field solves: which gaps, traces, planes and bridges each one takes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import isfinite
from typing import NamedTuple

import numpy as np

from splitcheck.board.board import Board
from splitcheck.errors import SplitcheckError
from splitcheck.loops import solve as engine
from splitcheck.loops.bridges import IslandGraph
from splitcheck.loops.clusters import near_one_another
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.foreseen import is_too_much
from splitcheck.loops.openings import Openings
from splitcheck.loops.spans import Spans
from splitcheck.loops.stray import stray_db
from splitcheck.loops.streams import Flow, flow_of, over_whole_plane
from splitcheck.loops.stretches import trace_over, within_window
from splitcheck.loops.tasks import Task, parts_islands
from splitcheck.loops.windows import Windows, look_at
from splitcheck.planes.islands import Plane

#: A solve whose panels would have to be made coarser than this is worth less than a closed form.
MOST_COARSER = 3.0


@dataclass(frozen=True, slots=True)
class Field:
    """What the solve says of one crossing."""

    value: Inductance
    mutual_nh: tuple[tuple[int, float], ...]
    """Mutual added inductance with other crossings of the same gap, by their number: for currents
    that run the same way over the gap, whichever way the traces were drawn."""
    stray_db: float | None = None
    """How much more field a probe finds above the crossing; None under another plane."""
    handed_over: float = 0.0
    """Part of the trace's current that comes back over holes to the plane on its other side in
    place of the broken one."""


class _Look(NamedTuple):
    """How far a solve looks."""

    windows: Windows
    loose: bool
    """Whether flux may leave where the window cuts the crossed gap off."""


class _Solved(NamedTuple):
    """A solve, and the traces as they would be if no window had cut them off."""

    solution: engine.Solution
    traces: Sequence[engine.TraceOver]


class Fields:
    """The board as the solves see it; built once, asked for every cluster."""

    def __init__(self, board: Board, planes: dict[int, Plane], graph: IslandGraph) -> None:
        self.board = board
        self.planes = planes
        self._openings = Openings(board, planes)
        self._spans = Spans(board, planes, graph)

    def solve(self, tasks: Sequence[Task]) -> dict[int, Field]:
        """Solve for crossings that belong together.

        Parameters
        ----------
        tasks
            A cluster.

        Returns
        -------
        Solved values by number of the crossing. Left out are those that the solve finds no way
        back for, because the way it would have to take leads over more layers than it knows, and
        those with more gaps round them than it can take.
        """
        bridges = self._spans.of(tasks)
        wide = self._look_at(tasks, bridges, narrow=False)
        solved = self._solved(tasks, bridges, wide)
        nearer = [] if solved is not None else near_one_another(tasks, 0.0)
        if len(nearer) > 1:
            return {number: field for part in nearer for number, field in self.solve(part).items()}
        if solved is None:
            solved = self._solved_narrowly(tasks, bridges, wide)
        if solved is None:
            return {}
        solution, traces = solved
        return {
            task.number: Field(
                Inductance(
                    task.part**2 * float(solution.added_nh[i, i]),
                    task.part**2 * float(solution.error_nh[i, i]),
                ),
                tuple(
                    (
                        other.number,
                        _same_way(task, other)
                        * (task.part * other.part * float(solution.added_nh[i, j])),
                    )
                    for j, other in enumerate(tasks)
                    if j != i and not solution.cut_off[j]
                ),
                _stray_db(task, solution, i, traces[i], bridges),
                task.part * _handed_over(solution, i, bridges),
            )
            for i, task in enumerate(tasks)
            if not solution.cut_off[i] and isfinite(float(solution.added_nh[i, i]))
        }

    def flow(self, task: Task) -> Flow | None:
        """The return current of one crossing, solved by itself.

        Returns
        -------
        The flow; None where `solve` leaves the crossing out as well.
        """
        crossing = task.crossing
        bridges = self._spans.of([task])
        wide = self._look_at([task], bridges, narrow=False)
        solved = self._solved([task], bridges, wide)
        if solved is None:
            solved = self._solved_narrowly([task], bridges, wide)
        if solved is None:
            return None
        return flow_of(
            solved.solution,
            0,
            solved.traces,
            task.height_mm,
            beyond_mm=self._apart_mm(crossing.plane, task.beyond),
            above_mm=self._apart_mm(crossing.plane, task.other),
            bridges=bridges,
        )

    def undisturbed(self, task: Task) -> Flow:
        """The return current of the trace of a crossing, were the plane whole."""
        crossing = task.crossing
        trace = trace_over(task, self.planes[crossing.plane])
        above_mm = self._apart_mm(crossing.plane, task.other)
        return over_whole_plane(trace, task.height_mm, above_mm)

    def _look_at(
        self,
        tasks: Sequence[Task],
        bridges: Sequence[engine.ViaBridge | engine.Strap],
        *,
        narrow: bool,
    ) -> _Look | None:
        """How far to look, no further than one must if `narrow`; None if there is no telling."""
        plane, number = self.planes[tasks[0].crossing.plane], tasks[0].crossing.gap
        gap = plane.gaps[number]
        standing = bridges if any(parts_islands(task) for task in tasks) else ()
        hull = self._openings.hull_of(plane, number)
        windows = look_at(tasks, gap, standing, narrow=narrow, hull=hull)
        # flux that a ragged gap lets through nearby finds ample room in the rest of it
        return None if windows is None else _Look(windows, gap.open or narrow)

    def _solved_narrowly(
        self,
        tasks: Sequence[Task],
        bridges: Sequence[engine.ViaBridge | engine.Strap],
        wide: _Look | None,
    ) -> _Solved | None:
        """One solve that looks no further than it must, unless that is what was done already.

        Where its window cuts a closed gap off, the flux that leaves there finds some room in the
        rest of the gap, but not without end: the truth lies between.
        """
        narrow = self._look_at(tasks, bridges, narrow=True)
        if wide is not None and narrow is not None and wide.windows == narrow.windows:
            return None
        endless = self._solved(tasks, bridges, narrow)
        gap = self.planes[tasks[0].crossing.plane].gaps[tasks[0].crossing.gap]
        if endless is None or narrow is None or gap.open:
            return endless
        if narrow.windows.outer.contains(gap.shape):
            return endless
        shut = self._solved(tasks, bridges, narrow._replace(loose=False))
        return None if shut is None else _between(shut, endless)

    def _solved(
        self,
        tasks: Sequence[Task],
        bridges: Sequence[engine.ViaBridge | engine.Strap],
        look: _Look | None,
    ) -> _Solved | None:
        """One solve; None if gaps are too ragged."""
        plane, number = self.planes[tasks[0].crossing.plane], tasks[0].crossing.gap
        if look is None or self._openings.is_hopeless(plane, number, look.windows.outer):
            return None
        traces = [trace_over(task, plane) for task in tasks]
        lines = [trace.line for trace in traces]
        seen = self._openings.within(tasks, look.windows, lines, loose=look.loose)
        if seen is None or is_too_much(seen.gaps, lines, tasks[0].height_mm):
            return None
        cut = any(parts_islands(task) for task in tasks)
        window = look.windows.outer
        ending = [
            within_window(trace, task, window) if cut else trace
            for trace, task in zip(traces, tasks, strict=True)
        ]
        try:
            solution = engine.added(
                seen.gaps,
                ending,
                tasks[0].height_mm,
                beyond_mm=self._apart_mm(plane.layer, tasks[0].beyond),
                above_mm=self._apart_mm(plane.layer, tasks[0].other),
                bridges=bridges,
                outside=seen.outside,
                ends=seen.ends,
                disjoint=True,
                coarsest=MOST_COARSER,
                inner=seen.inner,
            )
        except SplitcheckError:
            return None
        return _Solved(solution, traces)

    def _apart_mm(self, plane: int, other: int | None) -> float | None:
        return None if other is None else self.board.stack.height_mm(plane, other)


def _between(one: _Solved, other: _Solved) -> _Solved:
    """The mean of two solves of one mesh, with what they differ by in the error."""
    values = [solved.solution.added_nh for solved in (one, other)]
    errors = np.maximum(one.solution.error_nh, other.solution.error_nh)
    mean = replace(
        one.solution,
        added_nh=(values[0] + values[1]) / 2,
        error_nh=errors + np.abs(values[1] - values[0]) / 2,
    )
    return _Solved(mean, one.traces)


def _same_way(one: Task, other: Task) -> float:
    """1 if two traces are drawn the same way over their gap, -1 if they run against one another."""
    ahead = [np.subtract(task.crossing.after, task.crossing.before) for task in (one, other)]
    return 1.0 if float(ahead[0] @ ahead[1]) >= 0.0 else -1.0


def _handed_over(
    solution: engine.Solution, number: int, bridges: Sequence[engine.ViaBridge | engine.Strap]
) -> float:
    """Current that leaves for the plane above, which is all that comes back from there."""
    return sum(
        max(float(amps), 0.0)
        for bridge, amps in zip(bridges, solution.bridge_a[:, number], strict=True)
        if isinstance(bridge, engine.ViaBridge) and bridge.above
    )


def _stray_db(
    task: Task,
    solution: engine.Solution,
    number: int,
    trace: engine.TraceOver,
    bridges: Sequence[engine.ViaBridge | engine.Strap],
) -> float | None:
    """Field above the crossing, unless a plane on the trace's side, whole or not, is in between."""
    if task.other is not None or task.part < 1.0:
        return None
    at = task.crossing.at
    return stray_db(solution, number, trace, task.height_mm, at, bridges=bridges)
