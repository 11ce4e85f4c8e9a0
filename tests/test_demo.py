"""The demo board shows every fault planted in it, and its clean twin shows nothing."""

from __future__ import annotations

import tomllib
from math import dist
from pathlib import Path
from typing import Any

import pytest

from splitcheck.cli.entry import run
from tests.making.running import Outcome, rank

FIXTURES = Path(__file__).parent.parent / "fixtures"
EXPECTED: list[dict[str, Any]] = tomllib.loads(
    (FIXTURES / "demo" / "fixture.toml").read_text(encoding="utf-8")
)["findings"]


@pytest.fixture(scope="module")
def demo() -> Outcome:
    """The demo board, ranked once."""
    return rank(FIXTURES / "demo")


def _is(finding: dict[str, Any], expected: dict[str, Any]) -> bool:
    keys = ("net", "kind", "layer", "plane_layer")
    return all(finding[key] == expected[key] for key in keys)


@pytest.mark.parametrize("expected", EXPECTED, ids=lambda e: f"{e['net']} {e['kind']}")
def test_demo_shows_each_planted_fault_at_its_place(
    demo: Outcome, expected: dict[str, Any]
) -> None:
    """Kind, layers, place and length of the gap are those that the maker planted."""
    found = [finding for finding in demo.findings if _is(finding, expected)]
    assert len(found) == 1, [(f["net"], f["kind"], f["at_mm"]) for f in demo.findings]
    assert dist(found[0]["at_mm"], expected["at_mm"]) <= expected["tolerance_mm"]
    assert abs(found[0]["gap_mm"] - expected["gap_mm"]) <= expected["gap_tolerance_mm"]


def test_demo_shows_nothing_else(demo: Outcome) -> None:
    """Every finding is one of the planted faults."""
    others = [f for f in demo.findings if not any(_is(f, expected) for expected in EXPECTED)]
    assert [(f["net"], f["kind"], f["level"], f["at_mm"]) for f in others] == []


def test_demo_ends_with_findings(demo: Outcome) -> None:
    """The demo board is bad enough to make the exit code 1 as it stands."""
    assert demo.code == 1


def test_bus_over_one_split_shares_one_gap(demo: Outcome) -> None:
    """The eight nets of the bus name each other, so that they can be shown as one gap."""
    bus = [finding for finding in demo.findings if finding["kind"] == "split-crossing"]
    assert len({finding["gap"] for finding in bus}) == 1
    for finding in bus:
        others = {share["net"] for share in finding["shares_gap_with"]}
        assert others == {f"D{bit}" for bit in range(8)} - {finding["net"]}


def test_slot_to_the_edge_leaves_one_way_round_its_closed_end(demo: Outcome) -> None:
    """The return of RTC_CLK walks to the closed end of the slot and back."""
    clock = next(finding for finding in demo.findings if finding["net"] == "RTC_CLK")
    # Closed end: the antipad of P2, radius 0.85 at x = 66; a taut way from the rims of the slot
    # at x = 70 round it is 2 x 4.85 mm and less than its half circle, 0.85 pi, more than straight.
    assert 2 * 4.0 < clock["detour_mm"] < 2 * 4.85 + 1.0


def test_clean_twin_shows_nothing() -> None:
    """Same board, same nets, no fault: no finding of any level, at any threshold."""
    twin = rank(FIXTURES / "demo_clean", "--min-nh", "0", "--fail-at", "note")
    assert [(f["net"], f["kind"], f["level"], f["at_mm"]) for f in twin.findings] == []
    assert twin.code == 0
    assert len(twin.report["nets"]) >= 25


def test_boards_leave_only_the_edge_to_be_assumed() -> None:
    """Layers, stack, nets and drills are stated in the files: only the edge is assumed."""
    for name in ("demo", "demo_clean"):
        report = rank(FIXTURES / name).report
        layers = [(row["number"], row["name"]) for row in report["board"]["layers"]]
        assert layers == [(1, "L1-top"), (2, "L2-ground"), (3, "L3-supply"), (4, "L4-bottom")]
        assumed = report["assumptions"]
        assert [("switch in 1 ns" in text, "by their class" in text) for text in assumed] == [
            (True, False),
            (False, True),
        ]
        assert report["board"]["size_mm"] == pytest.approx([80, 55], abs=0.11)


def test_demo_command_writes_the_board_and_ranks_it(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    """``splitcheck demo --run`` works anywhere and says which command it ran."""
    assert run(["demo", str(tmp_path / "board"), "--run"]) == 0
    assert "splitcheck rank" in capfd.readouterr().out
