"""Drill files read here and by an independent reader (gerbonara 1.5.0, where it is right)."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from gerbonara.excellon import ExcellonFile
from gerbonara.graphic_objects import Flash, Line
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import drill
from splitcheck.copper.holes import DrillFile

Row = tuple[float, ...]

VARIED = [
    "M48\nMETRIC\nT1C0.3\nT2C1.0\n%\nG90\nG05\nT1\nX1.0Y1.0\nX2.5\nT2\nY-3.0\nM30\n",
    "M48\nINCH,TZ\nT01C0.0118\n%\nT01\nX012500Y001000\nX5000\nM30\n",
    "M48\nINCH,LZ\nT01C0.0118\n%\nT01\nX0125Y001\nX-005\nM30\n",
    (
        "M48\n; FORMAT={-:-/ absolute / inch / decimal}\nFMAT,2\nINCH\nT1C0.0098\n%\nG90\nG05\nT1\n"
        "X4.5Y-3.25\nX4.75Y-3.25\nG00X5.0Y-3.0\nM15\nG01X5.0Y-3.1\nM16\nG05\nM30\n"
    ),
    (
        "M48\n;FILE_FORMAT=4:4\nMETRIC,LZ\n;TYPE=PLATED\nT01F00S00C0.2032\n%\nT01\n"
        "X-0007493Y-00684276\nX0004318\nM30\n"
    ),
]


def _rows(file: DrillFile) -> list[Row]:
    rows = [(*h.path[0], *h.path[-1], h.diameter_mm) for h in file.holes]
    return sorted(tuple(round(v, 4) for v in row) for row in rows)


def _their_rows(text: str) -> list[Row]:
    rows = []
    for thing in ExcellonFile.from_string(text).objects:
        mm = thing.unit.convert_to
        size = thing.tool.unit.convert_to("mm", thing.tool.diameter)
        if isinstance(thing, Flash):
            x, y = mm("mm", thing.x), mm("mm", thing.y)
            rows.append((x, y, x, y, size))
        elif isinstance(thing, Line):
            ends = (thing.x1, thing.y1, thing.x2, thing.y2)
            rows.append((*(mm("mm", v) for v in ends), size))
    return sorted(tuple(round(float(v), 4) for v in row) for row in rows)


@pytest.mark.parametrize("text", VARIED)
@pytest.mark.filterwarnings("ignore")
def test_same_holes_as_another_reader(text: str) -> None:
    """Both readers find the same holes and slots."""
    theirs = _their_rows(text)
    assert theirs
    assert np.allclose(_rows(drill.read(text, "a.drl")), theirs, atol=2e-4)


places = st.lists(
    st.tuples(st.integers(-90_000, 90_000), st.integers(-90_000, 90_000)), min_size=1, max_size=10
)


@given(places, st.sampled_from(["METRIC", "INCH"]))
@pytest.mark.filterwarnings("ignore")
def test_same_decimal_holes_as_another_reader(steps: list[tuple[int, int]], unit: str) -> None:
    """Decimal coordinates in either unit are read alike."""
    rows = [f"X{x / 1000:.3f}Y{y / 1000:.3f}" for x, y in steps]
    text = "\n".join(["M48", unit, "T1C0.01", "%", "T1", *rows, "M30"]) + "\n"
    assert np.allclose(_rows(drill.read(text, "a.drl")), _their_rows(text), atol=2e-4)


@pytest.mark.filterwarnings("ignore")
def test_same_holes_on_real_boards(corpus: Path) -> None:
    """Real files with decimal points and without G85 are read alike by both readers."""
    compared = 0
    for path in sorted(p for p in corpus.glob("*/*") if p.suffix.casefold() in (".drl", ".drill")):
        text = path.read_text(encoding="utf-8", errors="replace")
        if "G85" in text or not re.search(r"^X-?\d+\.\d*Y", text, re.MULTILINE):
            continue
        ours, theirs = _rows(drill.read(text, path.name)), _their_rows(text)
        assert len(ours) == len(theirs), path.name
        assert np.allclose(ours, theirs, atol=3e-4), path.name
        compared += 1
    assert compared >= 5
