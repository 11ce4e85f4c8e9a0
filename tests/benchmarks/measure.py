"""Runs commands as a user would and measures them: wall time, processor time, memory."""

from __future__ import annotations

import os
import subprocess
from collections.abc import Sequence
from pathlib import Path
from time import perf_counter, sleep
from typing import NamedTuple


class Run(NamedTuple):
    """What one command took, start-up included."""

    wall_s: float
    cpu_s: float
    """Processor time of the command and of all processes that it waited for."""
    largest_mb: float
    """Most memory that any one of its processes held."""


def measure(command: Sequence[str], *, codes: Sequence[int] = (0,)) -> Run:
    """Run a command once.

    Raises
    ------
    RuntimeError
        If it ends with another exit code than those given.
    """
    start = perf_counter()
    with subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE) as process:
        said = process.stderr.read() if process.stderr else b""
        _, status, used = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
    wall_s = perf_counter() - start
    if process.returncode not in codes:
        raise RuntimeError(f"{' '.join(command)} ended with {process.returncode}: {said.decode()}")
    return Run(wall_s, used.ru_utime + used.ru_stime, used.ru_maxrss / 1024)


def together_mb(command: Sequence[str], every_s: float = 0.05) -> float:
    """Most memory that a command and its processes hold at one time, pages they share once.

    The sum of their proportional set sizes, looked at every so often; Linux only.
    """
    most_kb = 0
    with subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL) as process:
        while process.poll() is None:
            most_kb = max(most_kb, sum(_share_kb(pid) for pid in _family(process.pid)))
            sleep(every_s)
    return most_kb / 1024


def _family(pid: int) -> list[int]:
    found = [pid]
    for parent in found:
        children = Path(f"/proc/{parent}/task/{parent}/children")
        try:
            found.extend(int(child) for child in children.read_text().split())
        except OSError:  # it has ended meanwhile
            continue
    return found


def _share_kb(pid: int) -> int:
    try:
        lines = Path(f"/proc/{pid}/smaps_rollup").read_text().splitlines()
    except OSError:  # it has ended meanwhile
        return 0
    return sum(int(line.split()[1]) for line in lines if line.startswith("Pss:"))


def load() -> str:
    """How busy the machine is, for the head of a table."""
    one, five, _ = os.getloadavg()
    return f"{os.cpu_count()} cores, load {one:.2f} over one minute, {five:.2f} over five"


def table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Rows under a head, first column to the left, the others to the right."""
    width = [max(map(len, column)) for column in zip(head, *rows, strict=True)]
    lines = [
        "  ".join(
            [
                cells[0].ljust(width[0]),
                *(c.rjust(w) for c, w in zip(cells[1:], width[1:], strict=True)),
            ]
        )
        for cells in [head, *rows]
    ]
    return "\n".join(lines)
