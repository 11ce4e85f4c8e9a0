"""Capacitors down the whole road: from attributes, from a placement list, from none, from junk."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import pytest

from fixtures.making.write import write_board
from tests.making.boards import split_board
from tests.making.running import Outcome, rank

#: Centres of the two capacitors of the board: midway between pads at y 14 and 15.5.
PLACED = """\
# Ref Val Package PosX PosY Rot Side
C1 1uF 0603 17.0 14.75 90.0 top
C2 1uF 0603 23.0 14.75 90.0 top
"""
JUNK = (
    "# Ref Val Package PosX PosY Rot Side\nC1 1uF 0603 nan 14.75 90 top\nC2\n\x01\x02\n"
    + "x" * 9000
)


def _written(folder: Path, *, attributes: bool, placement: str | None = None) -> Path:
    """The board, with or without what its pads say of components."""
    write_board(split_board(), folder)
    if not attributes:
        for path in folder.glob("*.gbr"):
            text = path.read_text(encoding="utf-8")
            path.write_text(re.sub(r"%TO\.[CP],[^%]*%\n?", "", text), encoding="utf-8")
    if placement is not None:
        (folder / "parts.pos").write_text(placement, encoding="utf-8")
    return folder


def _splits(outcome: Outcome) -> list[dict[str, Any]]:
    found = [f for f in outcome.findings if f["kind"] == "split-crossing"]
    return sorted(found, key=lambda finding: str(finding["net"]))


@pytest.fixture(scope="module")
def with_attributes(tmp_path_factory: pytest.TempPathFactory) -> Outcome:
    """The board as it is written."""
    return rank(_written(tmp_path_factory.mktemp("x2"), attributes=True))


def test_attributes_tell_the_capacitors(with_attributes: Outcome) -> None:
    """The bus returns over both, in series: more than their bodies, less than two of 3 nH."""
    found = _splits(with_attributes)
    assert [finding["net"] for finding in found] == ["BUS0", "BUS1"]
    for finding in found:
        assert finding["method"] == "solved"
        assert [b["at_mm"] for b in finding["bridges"]] == [[17.0, 14.75], [23.0, 14.75]]
        assert [b["kind"] for b in finding["bridges"]] == ["capacitor", "capacitor"]
        assert 2 * 0.8 < finding["added_nh"] < 2 * 3.0
    assert "2 capacitors between planes" in with_attributes.told()


def test_a_placement_list_tells_the_same(tmp_path: Path, with_attributes: Outcome) -> None:
    """The same places, so the same values."""
    outcome = rank(_written(tmp_path, attributes=False, placement=PLACED))
    assert "parts from the centres of placed parts" in outcome.told()
    for one, other in zip(_splits(with_attributes), _splits(outcome), strict=True):
        assert other["bridges"] == one["bridges"]
        assert other["added_nh"] == pytest.approx(one["added_nh"], rel=1e-9)


@pytest.mark.parametrize("placement", [None, JUNK], ids=["no list", "junk"])
def test_without_them_there_is_no_way_back(tmp_path: Path, placement: str | None) -> None:
    """And the report says that nothing tells the components; a broken list stops nothing."""
    outcome = rank(_written(tmp_path, attributes=False, placement=placement))
    found = _splits(outcome)
    assert [finding["net"] for finding in found] == ["BUS0", "BUS1"]
    assert {finding["method"] for finding in found} == {"none"}
    assert any(
        "capacitors between planes are unknown" in text for text in outcome.report["assumptions"]
    )
    assert ("no part with a place" in outcome.told()) is (placement is not None)
