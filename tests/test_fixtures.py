"""The committed fixtures are what their cards and their maker say, byte for byte."""

from __future__ import annotations

import tomllib
from hashlib import sha256
from pathlib import Path
from typing import Any

import pytest

from fixtures.make_demo import demo_texts, main

FIXTURES = Path(__file__).parent.parent / "fixtures"
FOLDERS = sorted(card.parent for card in FIXTURES.glob("*/fixture.toml"))


def _card(folder: Path) -> dict[str, Any]:
    return tomllib.loads((folder / "fixture.toml").read_text(encoding="utf-8"))


@pytest.mark.parametrize("folder", FOLDERS, ids=lambda folder: folder.name)
def test_fixture_folder_holds_exactly_the_files_on_its_card(folder: Path) -> None:
    """No file is missing, changed or unlisted."""
    listed = _card(folder)["sha256"]
    found = {
        path.relative_to(folder).as_posix(): sha256(path.read_bytes()).hexdigest()
        for path in folder.rglob("*")
        if path.is_file() and path.name != "fixture.toml"
    }
    assert found == listed


@pytest.mark.parametrize("folder", FOLDERS, ids=lambda folder: folder.name)
def test_fixture_card_says_where_the_board_comes_from(folder: Path) -> None:
    """Maker or origin, licence and purpose are stated; each expected number has its source."""
    card = _card(folder)
    assert {"licence", "shows"} <= card.keys()
    assert "made_by" in card or {"origin", "commit"} <= card.keys()
    if "made_by" in card:
        assert (FIXTURES.parent / card["made_by"]).is_file()
    assert all(finding["source"] for finding in card.get("findings", []))


@pytest.mark.parametrize(("name", "faulty"), [("demo", True), ("demo_clean", False)])
def test_maker_writes_the_committed_files(name: str, faulty: bool) -> None:
    """The demo boards in the repository are what the maker writes today."""
    committed = {path.name: path.read_text("utf-8") for path in (FIXTURES / name).iterdir()}
    assert demo_texts(faulty=faulty) == committed


def test_maker_writes_both_boards_below_a_folder(tmp_path: Path) -> None:
    """The maker as a program leaves two folders of the same file names."""
    main(tmp_path)
    faulty, clean = (
        sorted(p.name for p in (tmp_path / n).iterdir()) for n in ("demo", "demo_clean")
    )
    assert faulty == clean
    assert "fixture.toml" in faulty


def test_clean_twin_differs_only_in_its_planes() -> None:
    """Twin and demo have the same nets, pins, pads and holes; only planes and two traces differ."""
    demo, clean = demo_texts(faulty=True), demo_texts(faulty=False)
    differing = {name for name in demo if demo[name] != clean[name]}
    assert differing == {
        "fixture.toml",
        "tide-logger-L2-ground.gbr",
        "tide-logger-L3-supply.gbr",
        "tide-logger-L4-bottom.gbr",
    }
