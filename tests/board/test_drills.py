"""Which holes are plated, and which files and lines they come from."""

from __future__ import annotations

from pathlib import Path

import pytest

from fixtures.making.plan import BoardPlan, Dielectric, Hole, Pad, Pour, Sheet, box
from fixtures.making.write import write_board
from splitcheck.board.drills import Drilling, read_drills
from splitcheck.board.layers import pad_places
from splitcheck.copper.intake import open_export
from splitcheck.road import Clock, read_copper


def _plan(*holes: Hole) -> BoardPlan:
    pads = [Pad(1, f"S{n}", (4.0 + 4 * n, 4.0), (0.8, 0.8), "U1", str(n)) for n in range(8)]
    return BoardPlan(
        name="drilled",
        outline=box(0, 0, 40, 20),
        sheets=(Sheet("top"), Sheet("ground", "Plane"), Sheet("bottom")),
        dielectrics=(Dielectric(0.2), Dielectric(0.2)),
        pours=(Pour(2, "GND", box(0.5, 0.5, 39.5, 19.5)),),
        pads=tuple(pads),
        holes=holes,
    )


def _drilled(folder: Path) -> Drilling:
    export = open_export(folder)
    layers = [
        found.layer for found in read_copper(export, 1, Clock(lambda stage, done, total: None))
    ]
    return read_drills(export, layers, pad_places(tuple(layers)))


VIAS = tuple(Hole((4.0 + 4 * n, 10.0), "GND") for n in range(8))
BARE = (Hole((6.0, 16.0), None, 3.0, 0.0, 0.0, plated=False),)


@pytest.mark.parametrize("drilling", ["excellon", "xnc", "gerber"])
def test_plated_and_bare_holes_are_told_apart(tmp_path: Path, drilling: str) -> None:
    """By what the files say of themselves; nothing is assumed."""
    write_board(_plan(*VIAS, *BARE), tmp_path, drilling=drilling)  # type: ignore[arg-type]
    found = _drilled(tmp_path)
    assert sorted(hole.path[0] for hole in found.holes) == [via.at for via in VIAS]
    assert found.other == 1
    assert found.assumptions == ()
    assert len(found.facts) == 2


def _one_silent_file(folder: Path) -> None:
    """All holes in one drill file that says nothing of plating."""
    paths = sorted(folder.glob("*.drl"))
    holes: list[str] = []
    tools: list[str] = []
    for number, path in enumerate(paths, start=1):
        lines = path.read_text(encoding="ascii").splitlines()
        size = next(line.split("C")[1] for line in lines if line.startswith("T1C"))
        tools.append(f"T{number}C{size}")
        holes += [f"T{number}", *(line for line in lines if line.startswith("X"))]
        path.unlink()
    text = "\n".join(["M48", "METRIC", *tools, "%", *holes, "M30", ""])
    (folder / "drilled.drl").write_text(text, encoding="ascii")


def test_holes_of_unknown_plating_are_decided_by_their_copper(tmp_path: Path) -> None:
    """Copper at both outer ends: plated. The mounting hole has none. It is an assumption."""
    write_board(_plan(*VIAS, *BARE), tmp_path)
    _one_silent_file(tmp_path)
    found = _drilled(tmp_path)
    assert sorted(hole.path[0] for hole in found.holes) == [via.at for via in VIAS]
    assert found.other == 1
    assert any("For 9 holes no file says" in text for text in found.assumptions)
    assert any("the 8 that have" in text for text in found.assumptions)


def test_hole_listed_twice_is_one_hole(tmp_path: Path) -> None:
    """The same drill file under two names."""
    write_board(_plan(*VIAS), tmp_path)
    path = next(tmp_path.glob("*-PTH.drl"))
    (tmp_path / "again-PTH.drl").write_bytes(path.read_bytes())
    assert len(_drilled(tmp_path).holes) == len(VIAS)


def test_span_of_a_blind_file_reaches_its_holes(tmp_path: Path) -> None:
    """From the file function; through holes keep none or all."""
    blind = Hole((20.0, 16.0), "S1", span=(1, 2))
    write_board(_plan(*VIAS, blind), tmp_path)
    spans = {hole.path[0]: hole.span for hole in _drilled(tmp_path).holes}
    assert spans[20.0, 16.0] == (1, 2)
    assert spans[4.0, 10.0] in {None, (1, 3)}


def test_no_drill_file_is_an_assumption(tmp_path: Path) -> None:
    """And no hole."""
    write_board(_plan(), tmp_path)
    found = _drilled(tmp_path)
    assert found.holes == ()
    assert found.assumptions[0].startswith("There is no drill file")
