"""Two revisions side by side: which finding is which, and what became of it."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from math import cos, radians, sin
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from splitcheck.report import jsonfile, readback
from splitcheck.verdict.changes import Change, Comparison
from splitcheck.verdict.compare import compare
from splitcheck.verdict.findings import ClassRow, Finding, LayerRow, Report
from tests.report import made


def board(*findings: Finding, **changes: Any) -> Report:
    """The small board with these findings and nothing else on it."""
    return replace(made.pump(), findings=findings, nets=(), **changes)


def verdicts(comparison: Comparison) -> dict[str, str]:
    """What became of the findings by the name of their newer net."""
    return {change.finding.net: change.verdict for change in comparison.changes}


def only(was: Finding, now: Finding, **changes: Any) -> Change:
    """What became of a single finding."""
    (change,) = compare(board(was), board(now, **changes)).changes
    return change


def test_a_report_against_itself_is_unchanged() -> None:
    """Every finding is paired with itself."""
    pump = made.pump()
    comparison = compare(pump, pump)
    assert {change.verdict for change in comparison.changes} == {"unchanged"}
    assert all(change.now == change.was for change in comparison.changes)
    assert comparison.remarks == ()


def test_new_and_gone() -> None:
    """Another net at another place is another finding."""
    one, other = made.finding(1, "CLK"), made.finding(1, "LED", at_mm=(70.0, 5.0))
    assert verdicts(compare(board(one), board(other))) == {"LED": "new", "CLK": "gone"}


@pytest.mark.parametrize(
    ("nh", "error", "expected"),
    [
        (3.0, 0.1, "unchanged"),
        (3.25, 0.1, "unchanged"),  # 8 %
        (3.5, 0.1, "worse"),
        (3.5, 0.3, "unchanged"),  # within both bars
        (2.5, 0.1, "better"),
        (2.5, 0.3, "unchanged"),
    ],
)
def test_a_value_has_to_leave_its_error_bars_and_a_tenth(
    nh: float, error: float, expected: str
) -> None:
    """3 nH before, both with the same error."""
    was = made.finding(1, "CLK", added_nh=3.0, error_nh=error)
    assert only(was, replace(was, added_nh=nh)).verdict == expected


def test_small_values_have_to_change_by_a_tenth_of_a_nanohenry() -> None:
    """0.05 nH more is nothing, though it is twice as much."""
    was = made.finding(1, "CLK", added_nh=0.05, error_nh=0.0)
    assert only(was, replace(was, added_nh=0.1)).verdict == "unchanged"
    assert only(was, replace(was, added_nh=0.2)).verdict == "worse"


def test_losing_the_way_back_is_worse_and_getting_one_is_better() -> None:
    """No number is worse than any."""
    way = made.finding(1, "CLK", added_nh=40.0)
    lost = replace(way, added_nh=None, error_nh=None, noise_mv=None, method="none")
    assert only(way, lost).verdict == "worse"
    assert only(lost, way).verdict == "better"
    assert only(lost, lost).verdict == "unchanged"


def test_a_longer_stretch_without_a_plane_is_worse() -> None:
    """Where nothing has a value the length counts."""
    was = made.finding(
        1, "LED", kind="no-plane", plane_layer="", added_nh=None, error_nh=None, gap_mm=20.0
    )
    assert only(was, replace(was, gap_mm=21.0)).verdict == "unchanged"
    assert only(was, replace(was, gap_mm=24.0)).verdict == "worse"
    assert only(replace(was, gap_mm=24.0), was).verdict == "better"


def test_a_level_at_its_threshold_does_not_fail_a_gate() -> None:
    """A value that has hardly changed is not worse for being called an error now."""
    was = made.finding(1, "CLK", level="warning", added_nh=3.0, error_nh=0.5, noise_mv=99.9)
    assert only(was, replace(was, level="error", added_nh=3.01)).verdict == "unchanged"
    assert only(was, replace(was, level="error", added_nh=3.4)).verdict == "worse"


def test_a_level_counts_where_the_rules_have_changed() -> None:
    """Another class, another rise time, or other numbers of the class."""
    was = made.finding(1, "CLK", level="warning", net_class="default")
    error = replace(was, level="error")
    assert only(was, error).verdict == "unchanged"
    assert only(was, replace(error, net_class="clock")).verdict == "worse"
    assert only(was, replace(error, rise_ns=0.3)).verdict == "worse"
    strict = ClassRow("default", 6, 1.0, 1650.0, 50.0, 50.0, 20.0, False, "our own")
    changed = only(was, error, classes=(strict,))
    assert (changed.verdict, changed.why) == ("worse", "warning to error, by other rules")
    assert only(error, was, classes=(strict,)).verdict == "better"


def test_a_waiver_taken_away_is_worse_and_a_waived_finding_fails_nothing() -> None:
    """What is waived can get as bad as it likes; what no longer is counts again."""
    plain = made.finding(1, "CLK")
    waived = replace(plain, waived="isolation barrier")
    assert only(waived, plain).verdict == "worse"
    assert only(plain, waived).verdict == "better"
    worse = compare(board(waived), board(replace(waived, added_nh=9.0)))
    assert [change.verdict for change in worse.changes] == ["worse"]
    assert worse.failing("note") == ()
    assert len(compare(board(waived), board(plain)).failing("error")) == 1


def test_levels_below_the_threshold_do_not_fail() -> None:
    """``--fail-at`` names the lowest level that does."""
    warning = made.finding(1, "CLK", level="warning")
    comparison = compare(board(), board(warning))
    assert not comparison.failing("error")
    assert len(comparison.failing("warning")) == len(comparison.failing("note")) == 1


def test_a_slot_that_becomes_a_split_is_the_same_crossing() -> None:
    """Kinds of crossings turn into one another as a gap grows."""
    was = made.finding(1, "CLK")
    assert only(was, replace(was, kind="split-crossing", added_nh=9.0)).verdict == "worse"


def test_a_net_that_lives_on_is_not_taken_for_another() -> None:
    """SDA was mended and SCL was moved over the slot: one is gone, the other is new."""
    nets = tuple(replace(made.pump().nets[0], name=name) for name in ("SCL", "SDA"))
    was = replace(board(made.finding(1, "SDA")), nets=nets)
    now = replace(board(made.finding(1, "SCL")), nets=nets)
    assert verdicts(compare(was, now)) == {"SCL": "new", "SDA": "gone"}


@pytest.mark.parametrize(
    ("before", "after"),
    [("SDA", "I2C_SDA"), ("@L1(12.00,45.00)", "@L1(12.10,45.00)"), ("@L1(12.00,45.00)", "SDA")],
)
def test_a_renamed_net_keeps_its_finding(before: str, after: str) -> None:
    """Where neither name lives on in the other revision."""
    was = made.finding(1, before)
    assert only(was, replace(was, net=after)).verdict == "unchanged"


def test_automatic_names_may_swap() -> None:
    """Numbers that a layout program gives anew say nothing: the place does."""
    first = made.finding(1, "N$1", at_mm=(10.0, 10.0))
    second = made.finding(2, "N$2", at_mm=(10.0, 10.5), added_nh=5.0)
    swapped = board(replace(first, net="N$2"), replace(second, net="N$1"))
    comparison = compare(board(first, second), swapped)
    assert {change.verdict for change in comparison.changes} == {"unchanged"}
    assert "2 of the findings" in comparison.remarks[0]


def test_a_bus_of_equal_findings_is_matched_by_name() -> None:
    """Eight equal crossings 1 mm apart, the whole bus shifted by one pitch: each keeps its own."""
    was = [made.finding(n, f"D{n}", at_mm=(20.0, 10.0 + n)) for n in range(8)]
    now = [replace(f, at_mm=(20.0, f.at_mm[1] + 1.0)) for f in was]
    comparison = compare(board(*was), board(*now))
    assert {change.verdict for change in comparison.changes} == {"unchanged"}
    assert all(c.now and c.was and c.now.net == c.was.net for c in comparison.changes)


def test_layers_called_otherwise_are_the_same_layers() -> None:
    """Names that come from files change with the files."""
    pump = made.pump()
    other = {row.name: f"rev-b-{row.number}" for row in pump.layers} | {"": ""}
    now = replace(
        pump,
        layers=tuple(replace(row, name=other[row.name]) for row in pump.layers),
        findings=tuple(
            replace(f, layer=other[f.layer], plane_layer=other[f.plane_layer])
            for f in pump.findings
        ),
    )
    assert {change.verdict for change in compare(pump, now).changes} == {"unchanged"}


def test_layers_put_in_the_middle_change_nothing_outside() -> None:
    """A board of four layers becomes one of six: the outer ones are counted from their side."""
    pump = made.pump()
    top, first, last, bottom = pump.layers
    grown = [("a", 1), ("b", 2), ("c", 3), ("d", 4), ("e", 5), ("f", 6)]
    names = {top.name: "a", first.name: "b", last.name: "e", bottom.name: "f", "": ""}
    now = replace(
        pump,
        layers=tuple(LayerRow(name, f"{name}.gbr", n, 0.0, 35.0, "mixed") for name, n in grown),
        findings=tuple(
            replace(f, layer=names[f.layer], plane_layer=names[f.plane_layer])
            for f in pump.findings
        ),
    )
    comparison = compare(pump, now)
    assert {change.verdict for change in comparison.changes} == {"unchanged"}
    assert comparison.remarks[0].startswith("There were 4 copper layers and are 6")


places = st.tuples(st.floats(0, 80), st.floats(0, 60))
shifts = st.tuples(st.floats(-300, 300), st.floats(-300, 300))
angles = st.one_of(st.sampled_from((0.0, 90.0, 180.0, -90.0)), st.floats(-180, 180))
nets = st.sampled_from(("CLK", "SDA", "D0", "D1", "@L1(1.00,2.00)", "@L1(5.00,6.00)", "N$7"))
boards = st.lists(
    st.builds(
        lambda net, at, gap, nh: (net, at, gap, nh),
        nets,
        places,
        st.floats(0.2, 9.0),
        st.floats(0.1, 9.0),
    ),
    max_size=14,
)


def drawn(rows: list[tuple[str, tuple[float, float], float, float]]) -> list[Finding]:
    """Findings of a drawn board; no two at one place."""
    seen: dict[tuple[int, int], Finding] = {}
    for number, (net, at, gap_mm, nh) in enumerate(rows, 1):
        finding = made.finding(number, net, at_mm=at, gap_mm=gap_mm, added_nh=nh, error_nh=0.0)
        seen.setdefault((round(at[0] / 3), round(at[1] / 3)), finding)
    return list(seen.values())


@given(boards, angles, shifts)
def test_a_moved_and_turned_board_is_the_same_board(
    rows: list[tuple[str, tuple[float, float], float, float]],
    degrees: float,
    shift: tuple[float, float],
) -> None:
    """Where it lies in its files changes no verdict, when places enough are known to tell."""
    named = [("CLK", (3.0, 3.0), 1.0, 1.0), ("RST", (70.0, 4.0), 1.5, 2.0)]
    named += [("IRQ", (12.0, 50.0), 2.5, 1.0), ("EN", (60.0, 40.0), 3.5, 0.5)]
    c, s = cos(radians(degrees)), sin(radians(degrees))
    was = drawn([*named, *rows])
    now = [
        replace(
            f,
            at_mm=(
                round(c * f.at_mm[0] - s * f.at_mm[1] + shift[0], 4),
                round(s * f.at_mm[0] + c * f.at_mm[1] + shift[1], 4),
            ),
        )
        for f in was
    ]
    comparison = compare(board(*was, corner_mm=None), board(*now, corner_mm=None))
    assert {change.verdict for change in comparison.changes} == {"unchanged"}
    assert all(c.now and c.was and c.now.id == c.was.id for c in comparison.changes)


def test_the_outline_tells_the_move_where_nothing_has_a_name() -> None:
    """One crossing without a name, the board 50 mm farther and turned: the same crossing."""
    was = made.finding(1, "@L1(12.30,45.10)", at_mm=(12.3, 45.1))
    now = replace(was, net="@L1(4.90,62.30)", at_mm=(50.0 - 45.1, 50.0 + 12.3))
    before = board(was, size_mm=(80.0, 60.0), corner_mm=(0.0, 0.0))
    after = board(now, size_mm=(60.0, 80.0), corner_mm=(-10.0, 50.0))
    comparison = compare(before, after)
    assert verdicts(comparison) == {"@L1(4.90,62.30)": "unchanged"}
    assert comparison.move.turned_deg == pytest.approx(90.0)


@given(boards, boards)
def test_there_and_back_are_mirror_images(
    one: list[tuple[str, tuple[float, float], float, float]],
    other: list[tuple[str, tuple[float, float], float, float]],
) -> None:
    """What is new one way is gone the other way, and worse is better; every finding once."""
    was, now = board(*drawn(one)), board(*drawn(other))
    there, back = compare(was, now), compare(now, was)
    for comparison, older, newer in ((there, was, now), (back, now, was)):
        assert Counter(c.was.id for c in comparison.changes if c.was) == Counter(
            f.id for f in older.findings
        )
        assert Counter(c.now.id for c in comparison.changes if c.now) == Counter(
            f.id for f in newer.findings
        )
    mirror = {"new": "gone", "gone": "new"}
    counts = Counter(mirror.get(c.verdict, "both") for c in there.changes)
    assert counts == Counter("both" if c.verdict not in mirror else c.verdict for c in back.changes)


@given(boards, boards, st.randoms(use_true_random=False))
@settings(max_examples=50)
def test_a_report_read_back_compares_like_the_board(
    one: list[tuple[str, tuple[float, float], float, float]],
    other: list[tuple[str, tuple[float, float], float, float]],
    random: Any,
) -> None:
    """Kept as JSON, an earlier revision gives the same verdicts."""
    was, now = board(*drawn(one)), board(*drawn(other))
    kept = readback.load(jsonfile.render(was), "kept.json")
    fresh, read = compare(was, now), compare(kept, now)
    assert [(c.verdict, c.finding.id) for c in fresh.changes] == [
        (c.verdict, c.finding.id) for c in read.changes
    ]


def test_thousands_of_findings_take_seconds() -> None:
    """A board of 4000 crossings without names, every one shifted by 0.4 mm."""
    was = [
        made.finding(n, f"@L1({n}.00,0.00)", at_mm=(n % 80 * 1.0, n // 80 * 1.0), gap=f"G{n}")
        for n in range(4000)
    ]
    now = [replace(f, at_mm=(f.at_mm[0] + 0.4, f.at_mm[1])) for f in was]
    comparison = compare(board(*was), board(*now))
    assert {change.verdict for change in comparison.changes} == {"unchanged"}
