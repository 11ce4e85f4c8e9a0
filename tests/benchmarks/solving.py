"""What a solved crossing costs on one core, over all boards of a folder, and how good it is.

``OPENBLAS_NUM_THREADS=1 python -m tests.benchmarks.solving FOLDER_OF_BOARDS``. Crossings that are
solved together share the time of their solve evenly; finding the ways round is counted apart. Times
are of the processor, so that other work on the machine matters less, though it still does. After
the boards: judging the largest with the solve and without it, a bus over one slot, one case beside
PyPEEC if that is installed, and all references.
"""

from __future__ import annotations

import gc
import sys
from collections.abc import Callable, Iterable, Sequence
from functools import partial
from pathlib import Path
from statistics import median
from time import process_time
from typing import Any, NamedTuple
from unittest.mock import patch

import pytest
from shapely import LineString, Polygon, box, wkt

from splitcheck.errors import SplitcheckError
from splitcheck.loops.bridges import join_islands
from splitcheck.loops.fields import Fields
from splitcheck.loops.solve import Solution, TraceOver, added
from splitcheck.planes.islands import find_planes
from splitcheck.road import (
    Clock,
    Options,
    Spread,
    build,
    cross,
    lay_tracks,
    load,
    read_copper,
    set_scene,
)
from splitcheck.verdict.judge import judge
from splitcheck.verdict.scene import Judged
from tests.benchmarks.measure import load as machine
from tests.benchmarks.measure import table
from tests.loops.test_solve_against_field_solvers import bridges_of, gaps_of
from tests.loops.test_solve_against_field_solvers import rows as references

#: So many of the largest boards are judged with the solve and without it.
_LARGEST = 3


class Call(NamedTuple):
    """One call of a stage of judging: a crossing weighed, or a cluster of crossings solved."""

    crossings: int
    ms: float


class Timed(NamedTuple):
    """A board, judged."""

    weighed: list[Call]
    solves: list[Call]
    judged: Judged
    again: Callable[[], Judged]
    """Judges it once more, in one process."""


def timed(folder: Path) -> Timed:
    """Times of all weighings and of all solves of a board, and what was found."""
    options = Options(jobs=1)
    export = load(folder, options)
    layers = read_copper(export, 1, Clock(lambda stage, done, total: None))
    assembled = build(export, layers, options)
    planes = find_planes(assembled.board)
    crossings, bare = cross(lay_tracks(assembled, options), planes, Spread(1))
    scene = set_scene(assembled, planes, join_islands(assembled.board, planes), options)
    stages: list[list[Call]] = []

    def spread(function: Callable[[Any], Any], items: Iterable[Any]) -> Iterable[Any]:
        calls: list[Call] = []
        stages.append(calls)
        for item in items:
            start = process_time()
            result = function(item)
            size = len(item) if isinstance(item, list | tuple) else 1
            calls.append(Call(size, 1000 * (process_time() - start)))
            yield result

    judged = judge(scene, crossings, bare, spread)
    weighed, *solves = stages
    each = [call for stage in solves for call in stage]
    return Timed(weighed, each, judged, partial(judge, scene, crossings, bare))


def shares(judged: Judged) -> tuple[str, str, str]:
    """Of the findings about gaps: how many are solved, how many are estimated, and why.

    A closed form stands for crossings from one island to another whose way back the solve does not
    know, and for those over gaps with too many others round them.
    """
    over_gaps = [finding for finding in judged.findings if finding.id in judged.weighed]
    solved = [finding for finding in over_gaps if finding.method == "solved"]
    behind = [judged.weighed[f.id] for f in over_gaps if f.method == "estimated"]
    apart = sum(item.crossing.islands[0] != item.crossing.islands[1] for item in behind)
    why = f"{apart} islands apart, {len(behind) - apart} too ragged"
    return _part(solved, over_gaps), _part(behind, over_gaps), why


def _part(some: Sequence[object], of: Sequence[object]) -> str:
    return f"{len(some)} ({100 * len(some) / len(of):.0f} %)" if of else "0"


def with_and_without(judged: Sequence[tuple[str, Timed]]) -> None:
    """Judge the largest boards once more, and once with a solve that finds nothing."""
    print()
    largest = sorted(judged, key=lambda pair: -len(pair[1].weighed))[:_LARGEST]
    for name, board in largest:
        with_s = _timed(board.again) / 1000
        with patch.object(Fields, "solve", lambda self, tasks: {}):
            without_s = _timed(board.again) / 1000
        print(
            f"{name}: judge with the solve against without {with_s:.2f} s against"
            f" {without_s:.2f} s: {with_s / without_s:.2f} x"
        )


def boards(folder: Path) -> None:
    """Measure all boards and print the table."""
    head = ["board", "crossings", "findings", "solved", "estimated", "because", "tasks", "solves",
            "median ms", "p90", "worst", "worst solve", "all solves s", "weigh s"]  # fmt: skip
    rows, everything = [], []
    all_boards: list[tuple[str, Timed]] = []
    for path in sorted(path for path in folder.iterdir() if path.is_dir()):
        try:
            board = timed(path)
        except SplitcheckError as error:
            print(f"{path.name}: left out, {error}")
            continue
        all_boards.append((path.name, board))
        weighed, solves, judged, _ = board
        each = [call.ms / call.crossings for call in solves for _ in range(call.crossings)]
        everything += each
        rows.append([
            path.name, str(len(weighed)), str(len(judged.findings)), *shares(judged),
            str(len(each)), str(len(solves)), _middle(each), _most_of(each),
            _most(each), _most([call.ms for call in solves]),
            f"{sum(call.ms for call in solves) / 1000:.2f}",
            f"{sum(call.ms for call in weighed) / 1000:.2f}",
        ])  # fmt: skip
    print(table(head, rows))
    print(
        f"\nall {len(everything)}: median {_middle(everything)} ms, p90 {_most_of(everything)},"
        f" worst {_most(everything)} ms a crossing"
    )
    with_and_without(all_boards)


def bus() -> None:
    """One net and 32 nets over one slot, each 1 mm from the next."""
    slot = [box(-0.2, -20, 0.2, 20)]
    times = []
    for count in (1, 32):
        places = (k - (count - 1) / 2 for k in range(count))
        traces = [TraceOver(LineString([(-15, y), (15, y)]), 0.2) for y in places]
        times.append(_least_ms(partial(added, slot, traces, 0.2)))
    one, many = times
    print(f"\none net over a slot {one:.1f} ms, 32 nets {many:.1f} ms: {many / one:.1f} x")


def beside_pypeec() -> None:
    """One case by both; PyPEEC with voxels of 0.1 mm, with the slot and without it."""
    try:
        from tests.loops import test_solve_against_pypeec as live  # noqa: PLC0415
    except pytest.skip.Exception as reason:
        print(f"\nbeside PyPEEC: {reason}")
        return
    found: list[float] = []
    theirs_ms = _timed(
        lambda: found.extend(live.loop_nh(0.1, slotted=slotted) for slotted in (True, False))
    )
    across, along = live.SLOT
    slot = box(-across / 2, -along / 2, across / 2, along / 2)
    trace = TraceOver(LineString([(-live.REACH, 0), (live.REACH, 0)]), live.WIDE)
    plane = box(-live.HALF, -live.HALF, live.HALF, live.HALF)
    value = added([slot], [trace], live.HIGH, outside=plane).of(0)
    ours_ms = _least_ms(partial(added, [slot], [trace], live.HIGH, outside=plane))
    print(
        f"\na slot of {across} x {along} mm: PyPEEC {found[0] - found[1]:.3f} nH in"
        f" {theirs_ms:.0f} ms, ours {value:.3f} nH in {ours_ms:.1f} ms:"
        f" {theirs_ms / ours_ms:.0f} times as fast"
    )


def against_references() -> None:
    """Every reference value beside ours."""
    lines = []
    for row in references("reference.csv"):
        solution = _reference(row)
        truth, value = float(row["added_nh"]), float(solution.added_nh[0, 0])
        lines.append([
            row["case"], f"{truth:.3f}", f"{value:.3f}", f"{100 * (value / truth - 1):+.1f} %",
            str(solution.panels), f"{_least_ms(partial(_reference, row)):.1f}",
        ])  # fmt: skip
    for row in references("reference_coupling.csv"):
        aside = float(row["spacing_mm"]) / 2
        traces = [TraceOver(LineString([(-25, y), (25, y)]), 0.0) for y in (-aside, aside)]
        solution = added(gaps_of(row), traces, float(row["height_mm"]))
        (own, mutual), _ = solution.added_nh
        odd = 2 * (float(row["self_nh"]) - float(row["mutual_nh"]))
        for what, truth, value in (
            ("self", float(row["self_nh"]), own),
            ("mutual", float(row["mutual_nh"]), mutual),
            ("odd mode", odd, solution.added_nh.trace() - 2 * mutual),
        ):
            off = f"{100 * (value / truth - 1):+.1f} %"
            name = f"{row['case']} {what}"
            lines.append([name, f"{truth:.3f}", f"{value:.3f}", off, str(solution.panels), ""])
    print()
    print(table(["case", "reference nH", "ours nH", "difference", "panels", "ms"], lines))


def _reference(row: dict[str, str]) -> Solution:
    gaps, plane, line = gaps_of(row), wkt.loads(row["plane"]), wkt.loads(row["trace"])
    assert isinstance(plane, Polygon)
    assert isinstance(line, LineString)
    return added(
        gaps,
        [TraceOver(line, float(row["width_mm"]))],
        float(row["height_mm"]),
        beyond_mm=float(row["beyond_mm"]) if row["beyond_mm"] else None,
        bridges=bridges_of(row),
        outside=plane if any(gap.intersects(plane.exterior) for gap in gaps) else None,
    )


def _least_ms(work: Callable[[], object]) -> float:
    return min(_timed(work) for _ in range(3))


def _timed(work: Callable[[], object]) -> float:
    start = process_time()
    work()
    return 1000 * (process_time() - start)


def main(folder: Path) -> None:
    """Measure and print everything."""
    print(f"{machine()}\n")
    gc.disable()  # as the road does
    boards(folder)
    bus()
    beside_pypeec()
    against_references()
    print(f"\n{machine()} at the end")


def _middle(values: list[float]) -> str:
    return f"{median(values):.1f}" if values else "-"


def _most_of(values: list[float]) -> str:
    return f"{sorted(values)[int(0.9 * (len(values) - 1))]:.1f}" if values else "-"


def _most(values: list[float]) -> str:
    return f"{max(values):.0f}" if values else "-"


if __name__ == "__main__":
    if len(sys.argv) != 2 or not Path(sys.argv[1]).is_dir():
        sys.exit(
            "usage: OPENBLAS_NUM_THREADS=1 python -m tests.benchmarks.solving FOLDER_OF_BOARDS\n"
            "       a folder with one folder of exported files for each board"
        )
    main(Path(sys.argv[1]))
