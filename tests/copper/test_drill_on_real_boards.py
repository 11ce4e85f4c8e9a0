"""Drill files of real boards against the pads of their own copper."""

from __future__ import annotations

from pathlib import Path

import pytest

from splitcheck.copper import drill, gerber
from splitcheck.copper.intake import Export, open_export
from splitcheck.copper.marks import Flash
from splitcheck.errors import SplitcheckError


def _boards(corpus: Path) -> list[Export]:
    found = []
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        try:
            found.append(open_export(folder))
        except SplitcheckError as error:
            # An export in the folder that lacks layers is refused; that is tested with intake.
            if "no file is L" not in error.wrong:
                raise
    return found


@pytest.mark.slow
def test_plated_holes_lie_on_pads(corpus: Path) -> None:
    """Of the holes not declared bare, 90 % lie on a pad of an outer layer of their board."""
    boards = _boards(corpus)
    assert boards
    for board in boards:
        top = board.copper()[0]
        marks = gerber.read(top.text, top.name).marks
        pads = {(round(m.at[0], 1), round(m.at[1], 1)) for m in marks if isinstance(m, Flash)}
        places = [m.at for m in marks if isinstance(m, Flash)]
        holes = [
            hole
            for file in board.of_kind("drill")
            for hole in drill.read(
                file.text, file.name, pads=places, tools=board.drill_tools()
            ).holes
            if hole.plated is not False
        ]
        near = 0
        for hole in holes:
            x = (hole.path[0][0] + hole.path[-1][0]) / 2
            y = (hole.path[0][1] + hole.path[-1][1]) / 2
            around = [(round(x + dx, 1), round(y + dy, 1)) for dx in (-0.1, 0, 0.1)
                      for dy in (-0.1, 0, 0.1)]  # fmt: skip
            near += any(place in pads for place in around)
        assert near >= 0.9 * len(holes) > 0, board.name
