"""What a solved crossing costs on one core, over all boards of a folder.

``OPENBLAS_NUM_THREADS=1 python -m tests.benchmarks.solving FOLDER_OF_BOARDS``. Crossings that are
solved together share the time of their solve evenly; finding the ways round is counted apart.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable
from pathlib import Path
from statistics import median
from time import perf_counter
from typing import Any, NamedTuple

from splitcheck.errors import SplitcheckError
from splitcheck.loops.bridges import join_islands
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
from tests.benchmarks.measure import load as machine
from tests.benchmarks.measure import table


class Call(NamedTuple):
    """One call of a stage of judging: a crossing weighed, or a cluster of crossings solved."""

    crossings: int
    ms: float


def timed(folder: Path) -> tuple[list[Call], list[Call], int]:
    """Times of all weighings and of all solves of a board, and how many findings it has."""
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
            start = perf_counter()
            result = function(item)
            size = len(item) if isinstance(item, list | tuple) else 1
            calls.append(Call(size, 1000 * (perf_counter() - start)))
            yield result

    findings = judge(scene, crossings, bare, spread).findings
    weighed, *solves = stages
    return weighed, [call for stage in solves for call in stage], len(findings)


def main(folder: Path) -> None:
    """Measure and print the table."""
    print(f"{machine()}\n")
    head = [
        "board",
        "findings",
        "crossings",
        "weigh ms",
        "worst",
        "solved",
        "solves",
        "ms each",
        "worst solve",
        "all s",
    ]
    rows, everything = [], []
    for path in sorted(path for path in folder.iterdir() if path.is_dir()):
        try:
            weighed, solves, findings = timed(path)
        except SplitcheckError as error:
            print(f"{path.name}: left out, {error}")
            continue
        each = [call.ms / call.crossings for call in solves for _ in range(call.crossings)]
        everything += each
        rows.append([
            path.name, str(findings), str(len(weighed)),
            _middle([call.ms for call in weighed]), _most([call.ms for call in weighed]),
            str(len(each)), str(len(solves)), _middle(each), _most([call.ms for call in solves]),
            f"{sum(call.ms for call in (*weighed, *solves)) / 1000:.1f}",
        ])  # fmt: skip
    print(table(head, rows))
    print(f"\nall solved: median {_middle(everything)} ms, worst {_most(everything)} ms a crossing")
    print(f"{machine()} at the end")


def _middle(values: list[float]) -> str:
    return f"{median(values):.1f}" if values else "-"


def _most(values: list[float]) -> str:
    return f"{max(values):.0f}" if values else "-"


if __name__ == "__main__":
    main(Path(sys.argv[1]))
