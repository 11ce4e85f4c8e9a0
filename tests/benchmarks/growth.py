"""How the time of ``rank`` grows with the board: the demo board tiled 1, 4, 9 and 16 times.

``python -m tests.benchmarks.growth``. One process, start-up not counted; of each stage the best of
three. The exponent is the slope of the logarithm of time over that of the number of marks: 1 is
linear; n log n from 1 to 16 boards of this size shows about 1.1.
"""

from __future__ import annotations

import json
import sys
from math import log
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, TypeVar

import numpy as np

from fixtures.making.plan import BoardPlan, Cut, Hole, Pad, Point, Pour, Trace, box
from fixtures.making.write import write_board
from fixtures.tide_logger import HEIGHT_MM, WIDTH_MM, tide_logger
from tests.benchmarks.measure import load, measure, table

TIMES = 3
APART_MM = 2.0
Item = TypeVar("Item", Trace, Pour, Cut, Pad, Hole)


def tiled(plan: BoardPlan, across: int) -> BoardPlan:
    """``across`` by ``across`` copies of a board on one panel, nets of each copy its own."""
    copies = [
        (number, (column * (WIDTH_MM + APART_MM), row * (HEIGHT_MM + APART_MM)))
        for number, (row, column) in enumerate(np.ndindex(across, across))
    ]
    wide = across * (WIDTH_MM + APART_MM) - APART_MM
    high = across * (HEIGHT_MM + APART_MM) - APART_MM
    return BoardPlan(
        name=f"{plan.name}-{across}x{across}",
        outline=box(0, 0, wide, high),
        sheets=plan.sheets,
        dielectrics=plan.dielectrics,
        traces=_all(plan.traces, copies),
        pours=_all(plan.pours, copies),
        cuts=_all(plan.cuts, copies),
        pads=_all(plan.pads, copies),
        holes=_all(plan.holes, copies),
        clearance_mm=plan.clearance_mm,
        mask_mm=plan.mask_mm,
    )


def _all(items: tuple[Item, ...], copies: list[tuple[int, Point]]) -> tuple[Item, ...]:
    return tuple(_copy(item, number, shift) for number, shift in copies for item in items)


def _copy(item: Item, number: int, shift: Point) -> Item:
    def moved(value: Any) -> Any:
        """Points lie in tuples of tuples; everything else stays."""
        if isinstance(value, tuple) and value and all(isinstance(v, int | float) for v in value):
            return value[0] + shift[0], value[1] + shift[1]
        return tuple(map(moved, value)) if isinstance(value, tuple) else value

    changed = {
        name: moved(getattr(item, name)) for name in ("at", "to", "points", "ring", "holes")
        if hasattr(item, name)
    }  # fmt: skip
    net = getattr(item, "net", None)
    if net is not None and number:
        changed["net"] = f"{net}.{number}"
    return item._replace(**changed)


def _seconds(folder: Path) -> tuple[int, int, dict[str, float]]:
    """Marks, findings, and the best time of every stage."""
    out = folder / "report.json"
    rank = [sys.executable, "-m", "splitcheck", "rank", str(folder), "--quiet", "--jobs", "1"]
    best: dict[str, float] = {}
    for _ in range(TIMES):
        measure([*rank, "--fail-at", "never", "--out", f"json={out}"])
        report = json.loads(out.read_text(encoding="utf-8"))
        out.unlink()
        for stage, seconds in report["summary"]["seconds"].items():
            best[stage] = min(seconds, best.get(stage, seconds))
    marks = sum(
        text.count("D01*") + text.count("D03*")
        for text in (path.read_text(encoding="ascii") for path in folder.glob("*.gbr"))
    )
    return marks, len(report["findings"]), best


def exponent(marks: list[int], seconds: list[float]) -> float:
    """Slope of log time over log marks, by least squares."""
    return float(np.polyfit([log(n) for n in marks], [log(max(s, 1e-6)) for s in seconds], 1)[0])


def main(most: int = 4) -> None:
    """Measure and print the table."""
    print(f"{load()}; best of {TIMES}, one process\n")
    found = []
    for across in range(1, most + 1):
        with TemporaryDirectory() as scratch:
            write_board(tiled(tide_logger(faulty=True), across), Path(scratch))
            found.append((across, *_seconds(Path(scratch))))
    stages = list(found[0][3])
    rows = [
        [f"{n * n}x", str(marks), str(findings), *(f"{best[s]:.3f}" for s in stages),
         f"{sum(best.values()):.3f}"]
        for n, marks, findings, best in found
    ]  # fmt: skip
    marks = [row[1] for row in found]
    slopes = [exponent(marks, [row[3][stage] for row in found]) for stage in stages]
    whole = exponent(marks, [sum(row[3].values()) for row in found])
    rows.append(["exponent", "", "", *(f"{slope:.2f}" for slope in slopes), f"{whole:.2f}"])
    print(table(["boards", "marks", "findings", *(f"{s} s" for s in stages), "all s"], rows))
    print(f"\n{load()} at the end")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
