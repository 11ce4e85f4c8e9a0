"""Bad input gets one clear message and exit code 2, or a stated assumption; the rest is kept."""

from __future__ import annotations

import json
import os
import zipfile
from dataclasses import replace
from pathlib import Path

import pytest

from fixtures.making.plan import Placing
from fixtures.making.write import board_texts, write_board
from tests.making.boards import slotted_board
from tests.making.running import complaint, rank

Captured = pytest.CaptureFixture[str]

TOP, BOTTOM = "slotted-top.gbr", "slotted-bottom.gbr"
HEAD = "%FSLAX46Y46*%\n%MOMM*%\n"


@pytest.fixture
def board(tmp_path: Path) -> Path:
    """A folder with a sound board in it, for a test to spoil."""
    folder = tmp_path / "board"
    write_board(slotted_board(), folder)
    return folder


def _edit(path: Path, old: str, new: str) -> None:
    text = path.read_text()
    assert old in text
    path.write_text(text.replace(old, new, 1))


def _insert(path: Path, text: str) -> int:
    """Put text before the end of a Gerber file; returns the line number of its first line."""
    whole = path.read_text()
    path.write_text(whole.replace("M02*", f"{text}\nM02*"))
    return whole.count("\n", 0, whole.index("M02*")) + 1


def test_sound_board_is_read(board: Path) -> None:
    """The board that the other tests spoil has findings and nothing else."""
    outcome = rank(board)
    assert {finding["net"] for finding in outcome.findings} == {"CLK", "DATA"}


# Input that cannot be judged: exit code 2 and one line.


def test_empty_folder(tmp_path: Path, capfd: Captured) -> None:
    """An empty folder is named."""
    assert f"{tmp_path}: holds no files; " in complaint(tmp_path, capfd)


def test_missing_folder(tmp_path: Path, capfd: Captured) -> None:
    """A path that is not there is named."""
    assert "nowhere: does not exist; " in complaint(tmp_path / "nowhere", capfd)


def test_no_copper(board: Path, capfd: Captured) -> None:
    """Without copper files the message says what was found instead."""
    for name in (TOP, BOTTOM, "slotted.gbrjob"):
        (board / name).unlink()
    assert "holds no copper layer; found " in complaint(board, capfd)


@pytest.mark.parametrize("name", [TOP, "unknown.gbr"])
def test_binary_junk_named_gbr(board: Path, capfd: Captured, name: str) -> None:
    """Bytes that are no text are refused by file name."""
    (board / name).write_bytes(bytes(range(256)) * 40)
    assert f"{name}: holds binary data" in complaint(board, capfd)


def test_file_cut_off_in_the_middle(board: Path, capfd: Captured) -> None:
    """A file that stops inside a region is named with its line, not half painted."""
    text = (board / BOTTOM).read_text()
    kept = text[: text.index("G36*") + 30]
    (board / BOTTOM).write_text(kept)
    assert f"{BOTTOM}:" in complaint(board, capfd)


def test_undefined_aperture(board: Path, capfd: Captured) -> None:
    """An aperture that is used but never defined is named with its line."""
    line = _insert(board / TOP, "D77*\nX1000000Y1000000D03*")
    said = complaint(board, capfd)
    assert f"{TOP}:{line}: " in said or f"{TOP}:{line + 1}: " in said
    assert "D77" in said


def test_missing_format(board: Path, capfd: Captured) -> None:
    """Coordinates without a format statement cannot be placed."""
    _edit(board / TOP, "%FSLAX46Y46*%\n", "")
    said = complaint(board, capfd)
    assert f"{TOP}:" in said
    assert "FS" in said


def test_missing_unit(board: Path, capfd: Captured) -> None:
    """Coordinates without a unit cannot be placed, and half a guess is worse than a message."""
    _edit(board / TOP, "%MOMM*%\n", "")
    said = complaint(board, capfd)
    assert f"{TOP}:" in said
    assert "MO" in said


def test_coordinates_of_ten_metres(board: Path, capfd: Captured) -> None:
    """A stroke that leaves for 10 m is refused with its line, or left out and said."""
    line = _insert(board / TOP, "D10*\nX10000000000Y1000000D02*\nY2000000D01*")
    said = complaint(board, capfd)
    assert any(f"{TOP}:{line + more}: " in said for more in range(3))


def test_step_repeat_of_a_hundred_million(board: Path, capfd: Captured) -> None:
    """10,000 x 10,000 copies are refused by their number, before they are made."""
    line = _insert(board / TOP, "%SRX10000Y10000I0.01J0.01*%\nD10*\nX1000000Y1000000D03*\n%SR*%")
    said = complaint(board, capfd)
    assert any(f"{TOP}:{line + more}: " in said for more in range(4))


def test_blocks_nested_to_a_million(board: Path, capfd: Captured) -> None:
    """Twenty blocks, each of two copies of the last, are refused before they are made."""
    blocks = [
        f"%ABD{number}*%\nD{number - 1}*\nX0Y0D03*\nX10Y0D03*\n%AB*%" for number in range(101, 121)
    ]
    blocks.insert(0, "%ABD100*%\nD10*\nX0Y0D03*\n%AB*%")
    _insert(board / TOP, "\n".join([*blocks, "D120*", "X1000000Y1000000D03*"]))
    assert f"{TOP}:" in complaint(board, capfd)


def test_ten_megabytes_of_zeros(board: Path, capfd: Captured) -> None:
    """A large file of nothing is refused at once, as a copper layer or beside them."""
    (board / TOP).write_bytes(bytes(10 * 2**20))
    assert f"{TOP}: " in complaint(board, capfd)


def test_ten_megabytes_of_digit_zeros(board: Path, capfd: Captured) -> None:
    """The same in text: a number of ten million digits is no coordinate."""
    (board / TOP).write_text(HEAD + "X" + "0" * (10 * 2**20) + "Y0D02*\nM02*\n")
    assert TOP in complaint(board, capfd)


def _zipped(tmp_path: Path, entries: dict[str, str]) -> Path:
    path = tmp_path / "board.zip"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, text in entries.items():
            archive.writestr(name, text)
    return path


def test_zip_that_reaches_outside(tmp_path: Path, capfd: Captured) -> None:
    """An entry named ../ is refused and nothing is written outside."""
    path = _zipped(tmp_path, {**board_texts(slotted_board()), "../escaped.gbr": HEAD})
    assert "../escaped.gbr" in complaint(path, capfd)
    assert not (tmp_path.parent / "escaped.gbr").exists()


def test_zip_bomb(tmp_path: Path, capfd: Captured) -> None:
    """An entry that grows a thousandfold is refused by its name."""
    bomb = "0" * (64 * 2**20)
    assert "bomb.gbr" in complaint(_zipped(tmp_path, {"bomb.gbr": bomb}), capfd)


def test_broken_zip(tmp_path: Path, capfd: Captured) -> None:
    """A .zip that is none is named."""
    path = tmp_path / "board.zip"
    path.write_bytes(b"PK\x03\x04" + bytes(100))
    assert "board.zip: " in complaint(path, capfd)


def test_link_to_nowhere(board: Path, capfd: Captured) -> None:
    """A layer that cannot be opened is named."""
    (board / TOP).unlink()
    (board / TOP).symlink_to(board / "gone.gbr")
    assert f"{TOP}: " in complaint(board, capfd)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes on this system")
def test_named_pipe_is_not_waited_for(board: Path, capfd: Captured) -> None:
    """A layer that is a pipe is named; reading it would never end."""
    (board / TOP).unlink()
    os.mkfifo(board / TOP)
    assert f"{TOP}: " in complaint(board, capfd)


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may read everything")
def test_unreadable_file(board: Path, capfd: Captured) -> None:
    """A layer without the right to read it is named."""
    (board / TOP).chmod(0)
    assert f"{TOP}: " in complaint(board, capfd)


def test_job_file_that_is_not_json(board: Path, capfd: Captured) -> None:
    """A job file that cannot be read is named with its line."""
    (board / "slotted.gbrjob").write_text("{\n  'Header': nothing\n}\n")
    assert "slotted.gbrjob:2: " in complaint(board, capfd)


def test_job_file_that_names_missing_copper(board: Path, capfd: Captured) -> None:
    """A copper layer that the job file lists and the folder lacks is not silently left out."""
    job = json.loads((board / "slotted.gbrjob").read_text())
    job["FilesAttributes"].append({"Path": "lost.gbr", "FileFunction": "Copper,L3,Bot"})
    job["GeneralSpecs"]["LayerNumber"] = 3
    (board / "slotted.gbrjob").write_text(json.dumps(job))
    said = complaint(board, capfd)
    assert "slotted.gbrjob: " in said
    assert '"lost.gbr"' in said


def test_two_files_for_one_layer(board: Path, capfd: Captured) -> None:
    """Two different files that both claim the top are named together."""
    (board / "other-top.gbr").write_text((board / TOP).read_text().replace("D02*", "D03*", 1))
    said = complaint(board, capfd)
    assert "other-top.gbr" in said
    assert TOP in said


def test_layers_that_do_not_overlap(board: Path, capfd: Captured) -> None:
    """Layers with different origins do not make a board; the message names both."""
    moved = board_texts(slotted_board(), placing=Placing((500.0, 0.0)))
    (board / TOP).write_text(moved[TOP])
    said = complaint(board, capfd)
    assert TOP in said


def _ten_times(line: str) -> str:
    if not line.startswith("X"):
        return line
    x, y = (float(text) * 10 for text in line[1:].split("Y"))
    return f"X{x:.6f}Y{y:.6f}"


def test_drill_ten_times_too_large(board: Path, capfd: Captured) -> None:
    """Drill coordinates in decimals leave no other reading: the message says how far off."""
    path = board / "slotted-PTH.drl"
    lines = path.read_text().splitlines()
    path.write_text("\n".join(_ten_times(line) for line in lines) + "\n")
    said = complaint(board, capfd)
    assert f"{path.name}: " in said
    assert "10.0 times" in said


# Input that can be judged with an assumption, which is said.


def test_one_copper_layer(tmp_path: Path, capfd: Captured) -> None:
    """One layer has no plane to cross; that is an error of the input, said as such."""
    write_board(slotted_board(), tmp_path, job=False)
    (tmp_path / BOTTOM).unlink()
    said = complaint(tmp_path, capfd)
    assert "one copper layer" in said


def test_no_plane_anywhere(tmp_path: Path) -> None:
    """Without any pour every trace is without a plane: said once for each net, with the reason."""
    write_board(replace(slotted_board(), pours=(), cuts=()), tmp_path)
    outcome = rank(tmp_path)
    findings = outcome.findings
    assert sorted(finding["net"] for finding in findings) == ["CLK", "DATA"]
    assert {"what": "nets exempt by class: enable", "number": 1} in outcome.report["counts"]
    assert {finding["kind"] for finding in findings} == {"no-plane"}
    assert all("no reference copper" in finding["reason"] for finding in findings)


def test_no_drill_file(board: Path) -> None:
    """Without drill files layers cannot be joined; that is said, and the slot is still found."""
    for path in board.glob("*.drl"):
        path.unlink()
    outcome = rank(board)
    assert "drill" in outcome.told()
    assert {finding["net"] for finding in outcome.findings} == {"CLK", "DATA"}


def test_job_file_that_names_missing_extras(board: Path) -> None:
    """A missing file that is not copper is a remark and loses nothing."""
    job = json.loads((board / "slotted.gbrjob").read_text())
    job["FilesAttributes"].append({"Path": "lost-mask.gbr", "FileFunction": "Soldermask,Top"})
    (board / "slotted.gbrjob").write_text(json.dumps(job))
    outcome = rank(board)
    assert "lost-mask.gbr" in outcome.told()
    assert {finding["net"] for finding in outcome.findings} == {"CLK", "DATA"}
