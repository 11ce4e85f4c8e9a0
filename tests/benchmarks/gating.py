"""What a gate costs: ``gate`` against a kept report and against a folder, beside one ``rank``.

``python -m tests.benchmarks.gating FOLDER_OF_BOARDS [TIMES]`` takes the largest board of the folder
that can be ranked, by bytes of its copper files. All three are started afresh every time, in turn;
the least processor time and wall time of each are compared, and the peak of memory.
"""

from __future__ import annotations

import sys
from pathlib import Path
from tempfile import TemporaryDirectory

from splitcheck.copper.intake import open_export
from splitcheck.errors import SplitcheckError
from tests.benchmarks.measure import Run, load, measure, table

#: At most this many times one rank (issue "Gate it", done when 4).
AGAINST_REPORT, AGAINST_FOLDER = 1.2, 2.2


def largest(folder: Path) -> Path:
    """The board with the most copper to read."""
    found = []
    for path in sorted(path for path in folder.iterdir() if path.is_dir()):
        try:
            copper = open_export(path).copper()
        except SplitcheckError:
            continue
        if len(copper) >= 2:
            found.append((sum(len(file.text) for file in copper), path))
    return max(found)[1]


def main(folder: Path, times: int = 3) -> None:
    """Measure and print the table."""
    board = largest(folder)
    with TemporaryDirectory() as scratch:
        kept = Path(scratch) / "kept.json"
        start = [sys.executable, "-m", "splitcheck"]
        rank = [
            *start,
            "rank",
            str(board),
            "--quiet",
            "--fail-at",
            "never",
            "--out",
            f"json={kept}",
        ]
        gate = [*start, "gate", str(board), "--quiet", "--was"]
        commands = {
            "rank": rank,
            "gate, report": [*gate, str(kept)],
            "gate, folder": [*gate, str(board)],
        }
        print(f"{board.name}; {load()}; best of {times}, in turn\n")
        runs: dict[str, list[Run]] = {name: [] for name in commands}
        for _ in range(times):
            for name, command in commands.items():
                runs[name].append(measure(command))
        size_mb = kept.stat().st_size / 1e6
    best = {
        name: Run(*(min(column) for column in zip(*some, strict=True)))
        for name, some in runs.items()
    }
    rows = [
        [
            name,
            f"{run.wall_s:.2f}",
            f"{run.wall_s / best['rank'].wall_s:.2f}",
            f"{run.cpu_s:.2f}",
            f"{run.cpu_s / best['rank'].cpu_s:.2f}",
            f"{run.largest_mb:.0f}",
        ]
        for name, run in best.items()
    ]
    print(table(["command", "wall s", "ratio", "cpu s", "ratio", "MB one"], rows))
    print(
        f"\nThe report has {size_mb:.1f} MB. At most {AGAINST_REPORT} and {AGAINST_FOLDER} times."
    )
    print(f"{load()} at the end")


if __name__ == "__main__":
    main(Path(sys.argv[1]), *map(int, sys.argv[2:]))
