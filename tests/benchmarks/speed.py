"""The whole of ``rank`` against merely parsing the same copper files with gerbonara.

``python -m tests.benchmarks.speed FOLDER_OF_BOARDS [HOW_MANY]`` takes the largest boards of the
folder whose copper carries net names. Both programs are started afresh every time, in turn.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from tempfile import TemporaryDirectory

from splitcheck.copper.intake import Export, open_export
from splitcheck.errors import SplitcheckError
from tests.benchmarks.measure import Run, load, measure, table, together_mb

TIMES = 3
PARSE = """
import sys, warnings
warnings.simplefilter("ignore")
from gerbonara.rs274x import GerberFile
for path in sys.argv[1:]:
    GerberFile.open(path)
"""


def largest_with_names(folder: Path, count: int) -> list[Export]:
    """The largest boards, by bytes of copper files, that carry net names as attributes."""
    found = []
    for path in sorted(path for path in folder.iterdir() if path.is_dir()):
        try:
            export = open_export(path)
        except SplitcheckError:
            continue
        copper = export.copper()
        if any("%TO.N," in file.text for file in copper):
            found.append((sum(len(file.text) for file in copper), path, export))
    return [export for _, _, export in sorted(found, key=lambda item: -item[0])[:count]]


def commands(folder: Path, export: Export, out: Path) -> tuple[list[str], list[str]]:
    """What is compared: ``rank`` of the folder, and a parse of its copper files."""
    names = {Path(file.name).name for file in export.copper()}
    copper = sorted(str(path) for path in folder.rglob("*") if path.name in names)
    rank = [sys.executable, "-m", "splitcheck", "rank", str(folder), "--quiet"]
    return [*rank, "--fail-at", "never", "--out", f"json={out}"], [
        sys.executable,
        "-c",
        PARSE,
        *copper,
    ]


def _best(runs: list[Run]) -> Run:
    return Run(*(min(column) for column in zip(*runs, strict=True)))


def _compare(folder: Path, export: Export) -> tuple[list[str], list[tuple[str, float]]]:
    with TemporaryDirectory() as scratch:
        out = Path(scratch) / "report.json"
        rank, parse = commands(folder, export, out)
        pairs = [(measure(parse), measure(rank)) for _ in range(TIMES)]
        memory_mb = together_mb(rank)
        summary = json.loads(out.read_text(encoding="utf-8"))["summary"]
    parsed, ranked = (_best([pair[i] for pair in pairs]) for i in (0, 1))
    size_mb = sum(len(file.text) for file in export.copper()) / 1e6
    row = [
        folder.name,
        f"{size_mb:.1f}",
        f"{parsed.wall_s:.2f}",
        f"{ranked.wall_s:.2f}",
        f"{ranked.wall_s / parsed.wall_s:.2f}",
        f"{parsed.cpu_s:.2f}",
        f"{ranked.cpu_s:.2f}",
        f"{ranked.largest_mb:.0f}",
        f"{memory_mb:.0f}",
    ]
    return row, sorted(summary["seconds"].items(), key=lambda item: -item[1])


def main(folder: Path, count: int = 2) -> None:
    """Measure and print the table."""
    print(f"{load()}; best of {TIMES}, programs in turn\n")
    head = [
        "board",
        "MB",
        "parse s",
        "rank s",
        "ratio",
        "parse cpu",
        "rank cpu",
        "MB one",
        "MB all",
    ]
    rows, stages = [], []
    for export in largest_with_names(folder, count):
        path = next(p for p in sorted(folder.iterdir()) if _holds(p, export))
        row, seconds = _compare(path, export)
        rows.append(row)
        stages.append(f"{path.name}: " + ", ".join(f"{name} {s:.2f} s" for name, s in seconds))
    print(table(head, rows))
    print("\nMB one: the largest process; MB all: all together, shared pages counted once.")
    print("\nStages of rank:\n" + "\n".join(stages))
    print(f"\n{load()} at the end")


def _holds(path: Path, export: Export) -> bool:
    try:
        return path.is_dir() and open_export(path).files == export.files
    except SplitcheckError:
        return False


if __name__ == "__main__":
    main(Path(sys.argv[1]), *map(int, sys.argv[2:]))
