"""Holes, slots and tools of small hand-made drill files, and laws over their number formats."""

from __future__ import annotations

import math
from contextlib import suppress

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from shapely import Point as Dot
from shapely import box

from splitcheck.copper import drill, drill_play
from splitcheck.copper.holes import DrillFile, Hole
from splitcheck.copper.marks import NO_TAG, Drawing, Fill, Flash, Mark, Stroke, Tag
from splitcheck.errors import SplitcheckError

Places = list[tuple[float, float]]

PADS: Places = [(round(3.0 * i + 0.37 * j, 4), round(2.5 * j + 0.11 * i * i, 4))
                for i in range(8) for j in range(6)]  # fmt: skip


def _read(*lines: str, name: str = "a.drl", pads: Places | None = None) -> DrillFile:
    return drill.read("\n".join(lines), name, pads=pads or [])


def _places(file: DrillFile) -> Places:
    return [hole.path[0] for hole in file.holes]


def _metric(*body: str) -> DrillFile:
    return _read("M48", "METRIC", "T1C0.3", "T2C1.0", "%", *body, "M30")


def test_tools_in_header_and_body() -> None:
    """Holes take the diameter of the tool chosen before them."""
    file = _metric("T1", "X1.5Y2.0", "X3.0", "Y4.0", "T02", "X-1.Y-.5", "T3C.55", "X0Y0", "T0")
    assert file.holes == (
        Hole(((1.5, 2.0),), 0.3, None, None, 7),
        Hole(((3.0, 2.0),), 0.3, None, None, 8),
        Hole(((3.0, 4.0),), 0.3, None, None, 9),
        Hole(((-1.0, -0.5),), 1.0, None, None, 11),
        Hole(((0.0, 0.0),), 0.55, None, None, 13),
    )
    assert file.stated
    assert file.format == "metric, decimal points"


@pytest.mark.parametrize(
    ("head", "words", "place"),
    [
        (["METRIC,TZ,000.000"], "X12500Y-250", (12.5, -0.25)),
        (["METRIC,LZ,000.000"], "X0125Y-00025", (12.5, -0.25)),
        (["METRIC,LZ", ";FILE_FORMAT=4:4"], "X00125Y-000025", (12.5, -0.25)),
        (["INCH,TZ,00.0000"], "X12500Y-250", (31.75, -0.635)),
        (["INCH,LZ,00.0000"], "X0125Y-00025", (31.75, -0.635)),
        (["; FORMAT={2:4/ absolute / inch / suppress leading zeros}", "INCH"], "X1Y10000",
         (0.00254, 25.4)),
        (["; FORMAT={3:3/ absolute / metric / keep zeros}", "METRIC"], "X012500Y000250",
         (12.5, 0.25)),
        (["METRIC,TZ"], "X12.5Y.25", (12.5, 0.25)),
        (["M71"], "X12.5Y+0.25", (12.5, 0.25)),
        (["M72"], "X0.5Y1.", (12.7, 25.4)),
        (["INCH"], "X0.5Y1.0", (12.7, 25.4)),
    ],
)  # fmt: skip
def test_stated_number_formats(head: list[str], words: str, place: tuple[float, float]) -> None:
    """Units, digits and zero suppression are taken as the file states them."""
    file = _read("M48", *head, "T1C0.012", "%", "T1", words, "M30")
    assert _places(file) == [place]
    assert file.stated
    assert not file.remarks


def _written(value_mm: float, unit: str, whole: int, decimal: int, zeros: str) -> str:
    """A coordinate as a writer of the given format puts it."""
    value = value_mm / (25.4 if unit == "inch" else 1.0)
    if zeros == "point":
        return f"{value:.{decimal}f}"
    digits = f"{round(abs(value) * 10**decimal):0{whole + decimal}d}"
    sign = "-" if value < 0 else ""
    if zeros == "leading":  # leading zeros kept: trailing ones may go
        return sign + (digits.rstrip("0") or "0")
    return sign + (digits.lstrip("0") or "0")


FORMATS = [(unit, whole, decimal, zeros)
           for unit, whole, decimal in [("mm", 3, 3), ("mm", 4, 4), ("inch", 2, 4), ("inch", 2, 5)]
           for zeros in ("leading", "trailing", "point")]  # fmt: skip
HEADERS = {"leading": ",LZ", "trailing": ",TZ", "point": ""}


def _file(places: Places, form: tuple[str, int, int, str], *, stated: bool) -> str:
    unit, whole, decimal, zeros = form
    name = "METRIC" if unit == "mm" else "INCH"
    size = 0.3 / (25.4 if unit == "inch" else 1.0)
    picture = f",{'0' * whole}.{'0' * decimal}" if zeros != "point" else ""
    head = [name + HEADERS[zeros] + picture] if stated else []
    rows = [f"X{_written(x, *form)}Y{_written(y, *form)}" for x, y in places]
    return "\n".join(["M48", *head, f"T1C{size:.5f}", "%", "T1", *rows, "M30"])


places_on_both_grids = st.lists(
    st.tuples(st.integers(-700, 700), st.integers(-700, 700)).map(
        lambda p: (round(p[0] * 0.127, 6), round(p[1] * 0.127, 6))
    ),
    min_size=1,
    max_size=12,
)


@given(places_on_both_grids, st.sampled_from(FORMATS))
def test_every_stated_format_gives_the_same_holes(
    places: Places, form: tuple[str, int, int, str]
) -> None:
    """Writing holes in any format that can hold them and reading it back changes nothing."""
    file = drill.read(_file(places, form, stated=True), "a.drl")
    assert file.stated
    assert np.allclose(_places(file), places, atol=6e-7)
    assert {round(h.diameter_mm, 3) for h in file.holes} == {0.3}


@given(st.sampled_from(FORMATS), st.integers(20, 48))
def test_unstated_format_is_found_by_the_pads(form: tuple[str, int, int, str], count: int) -> None:
    """Without a word on units and digits the pads tell the format."""
    step = 0.127
    pads = [(round(x / step) * step, round(y / step) * step) for x, y in PADS]
    file = drill.read(_file(pads[:count], form, stated=False), "a.drl", pads=pads)
    assert not file.stated
    assert np.allclose(_places(file), pads[:count], atol=0.004)
    assert any("100% of" in remark for remark in file.remarks)


def test_default_format_without_pads_is_remarked() -> None:
    """Nothing stated and no copper: the default of the trade, said to be unchecked."""
    file = _read("M48", "T1C0.03", "%", "T1", "X01Y0123", "M30")
    assert _places(file) == [(25.4, 31.242)]
    assert file.format == "inch, 2.4, leading zeros kept"
    assert any("unchecked" in remark for remark in file.remarks)


def test_stated_format_that_the_copper_contradicts() -> None:
    """A file that says 2.4 but is written in 2.5 is read ten times smaller, as an assumption."""
    rows = [f"X{round(x / 25.4 * 1e5)}Y{round(y / 25.4 * 1e5)}" for x, y in PADS]
    file = _read("M48", "INCH,TZ,00.0000", "T1C.01", "%", "T1", *rows, "M30", pads=PADS)
    assert np.allclose(_places(file), PADS, atol=0.004)
    assert any("assumed to be inch, 2.5" in remark for remark in file.remarks)


def test_metric_file_that_says_inch() -> None:
    """Units stated wrongly are corrected by the copper, as an assumption."""
    rows = [f"X{x:.3f}Y{y:.3f}" for x, y in PADS]
    file = _read("M48", "INCH", "T1C.01", "%", "T1", *rows, "M30", pads=PADS)
    assert np.allclose(_places(file), PADS, atol=0.004)
    assert any("assumed to be metric" in remark for remark in file.remarks)


def test_scale_that_nothing_explains_is_an_error() -> None:
    """Holes spread over seven times the copper, and no format fits: the error names the scale."""
    rows = [f"X{7 * x + 1:.3f}Y{7 * y * y:.3f}" for x, y in PADS]
    with pytest.raises(SplitcheckError, match=r"spread over .* times the copper"):
        _read("M48", "METRIC", "T1C.3", "%", "T1", *rows, "M30", pads=PADS)


def test_other_origin_is_found_and_said() -> None:
    """Holes with another origin are moved onto the pads, as an assumption."""
    rows = [f"X{x + 100:.3f}Y{y - 50:.3f}" for x, y in PADS[:40]]
    file = _read("M48", "METRIC", "T1C.3", "%", "T1", *rows, "M30", pads=PADS)
    assert np.allclose(_places(file), PADS[:40], atol=0.004)
    assert any("moved by (-100, 50) mm" in remark for remark in file.remarks)


def test_non_plated_holes_without_pads_keep_the_stated_format() -> None:
    """Mounting holes have no pads; that alone contradicts nothing."""
    file = _read("M48", "METRIC", "T1C3.2", "%", "T1", "X-2.0Y-2.0", "X23.5Y15.5", "M30", pads=PADS)
    assert _places(file) == [(-2.0, -2.0), (23.5, 15.5)]
    assert not any("assumed" in remark for remark in file.remarks)


def test_bare_holes_in_an_unstated_format_lie_within_the_copper() -> None:
    """Few mounting holes without pads: the format by which they lie on the board, as assumption."""
    rows = ["X0010000Y0020000", "X2300000Y0020000", "X2300000Y1500000"]
    file = _read("M48", "METRIC", "T1C3.2", "%", "T1", *rows, "M30", pads=PADS)
    assert _places(file) == [(0.1, 0.2), (23.0, 0.2), (23.0, 15.0)]
    assert any("lie within the copper" in remark for remark in file.remarks)


def test_one_pad_under_all_holes_is_no_fit() -> None:
    """A scale that draws all holes together onto one pad does not win."""
    rows = [f"X{round(x * 1e5):07d}Y{round(y * 1e5):07d}" for x, y in PADS]
    file = _read("M48", "METRIC", "T1C.3", "%", "T1", *rows, "M30", pads=[*PADS, (0.0, 0.0)])
    assert np.allclose(_places(file), PADS, atol=1e-4)


def test_repeat_and_incremental() -> None:
    """R repeats the last hole a step further each time; G91 counts from the last place."""
    file = _metric("T1", "X1.0Y1.0", "R3X0.5", "G91", "X1.0Y1.0", "X-0.5", "G90", "X0Y0")
    assert _places(file) == [(1, 1), (1.5, 1), (2, 1), (2.5, 1), (3.5, 2), (3, 2), (0, 0)]


def test_slots_by_g85_and_by_routing() -> None:
    """A slot is one hole with a centre line, drilled (G85) or routed (M15 to M16)."""
    file = _metric(
        "T2", "X1.0Y1.0G85X3.0Y1.0", "G05", "X5.Y5.G85Y7.", "G00X0.0Y0.0", "M15", "G01X2.0",
        "G01X2.0Y2.0", "M16", "G05", "X9.0Y9.0", "X4.Y4.G85X4.Y4.",
    )  # fmt: skip
    assert [hole.path for hole in file.holes] == [
        ((1.0, 1.0), (3.0, 1.0)),
        ((5.0, 5.0), (5.0, 7.0)),
        ((0.0, 0.0), (2.0, 0.0), (2.0, 2.0)),
        ((9.0, 9.0),),
        ((4.0, 4.0),),
    ]
    assert {hole.diameter_mm for hole in file.holes} == {1.0}


@pytest.mark.parametrize("arc", ["G03X-1.0Y0.0A1.0", "G03X-1.0Y0.0I-1.0J0.0", "G02X-1.0Y0.0A1.0"])
def test_routed_arc_keeps_its_radius(arc: str) -> None:
    """All points of a half circle lie on it, above for G03 and below for G02."""
    file = _metric("T2", "G00X1.0Y0.0", "M15", arc, "M16")
    path = file.holes[0].path
    assert path[0] == (1.0, 0.0)
    assert path[-1] == (-1.0, 0.0)
    assert len(path) > 10
    assert all(abs(math.hypot(x, y) - 1.0) < 1e-5 for x, y in path)
    assert all((y > 0) == arc.startswith("G03") for _, y in path[1:-1])


def test_routing_without_plunge_commands() -> None:
    """Where a file never plunges, G01 cuts all the same."""
    file = _metric("T2", "G00X1.0Y0.0", "G01X3.0", "G00X5.0Y5.0", "G01Y6.0", "G05", "X9.0Y9.0")
    assert [hole.path for hole in file.holes] == [
        ((1.0, 0.0), (3.0, 0.0)), ((5.0, 5.0), (5.0, 6.0)), ((9.0, 9.0),),
    ]  # fmt: skip


def test_plating_by_tool_comments() -> None:
    """Plating and via come per tool: structured comments, TYPE lines, size lists."""
    file = _read(
        "M48", "; #@! TF.FileFunction,MixedPlating,1,4", "METRIC",
        "; #@! TA.AperFunction,Plated,PTH,ViaDrill", "T1C0.3",
        "; #@! TA.AperFunction,NonPlated,NPTH,ComponentDrill", "T2C1.0", "; #@! TD",
        ";TYPE=PLATED", "T3C0.4", ";TYPE=NON_PLATED", "T4C0.5",
        ";T05 Holesize 5. = 0.600000 Tolerance = +0.0/-0.0 PLATED MM Quantity = 2",
        ";   Holesize 6. = 40.0 Tolerance = +0.0/-0.0 NON_PLATED MILS Quantity = 1", "%",
        *[line for n in range(1, 7) for line in (f"T{n}", f"X{n}.0Y0.0")], "M30",
    )  # fmt: skip
    assert [(h.plated, h.via, h.diameter_mm) for h in file.holes] == [
        (True, True, 0.3), (False, False, 1.0), (True, None, 0.4), (False, None, 0.5),
        (True, None, 0.6), (False, None, 1.016),
    ]  # fmt: skip
    assert {h.span for h in file.holes} == {(1, 4)}
    assert any("T5 drills 1 holes, its comment says 2" in remark for remark in file.remarks)


@pytest.mark.parametrize(
    ("name", "line", "plated", "span"),
    [
        ("b-PTH.drl", "", True, None),
        ("b-NPTH.drl", "", False, None),
        ("b.drl", "", None, None),
        ("b.drl", "; #@! TF.FileFunction,Plated,1,2,Blind", True, (1, 2)),
        ("b-PTH.drl", "; #@! TF.FileFunction,NonPlated,4,1,NPTH", False, (1, 4)),
    ],
)
def test_plating_of_the_whole_file(
    name: str, line: str, plated: bool | None, span: tuple[int, int] | None
) -> None:
    """The file function decides, else the file's name, else nobody."""
    file = _read("M48", line, "METRIC", "T1C0.3", "%", "T1", "X1.0Y1.0", name=name)
    assert (file.holes[0].plated, file.holes[0].span) == (plated, span)


def test_tools_changed_by_hand() -> None:
    """Where no tool is chosen, each stop changes to the next tool of the table: an assumption."""
    file = _read("M48", "METRIC", "T1C0.3", "T2C1.0", "%", "X1.0Y1.0", "M00", "X2.0Y2.0", "M30")
    assert [hole.diameter_mm for hole in file.holes] == [0.3, 1.0]
    assert any("chooses no tool" in remark for remark in file.remarks)


def test_tools_from_a_separate_list() -> None:
    """A tool without a size takes it from the list; without a list it is an error with its line."""
    lines = "M48\nMETRIC\n%\nT1\nX1.0Y1.0\nM30"
    assert drill.read(lines, "a.drl", tools={1: 0.4}).holes[0].diameter_mm == 0.4
    with pytest.raises(SplitcheckError, match=r"a\.drl:5: tool T1 drills holes but its diameter"):
        drill.read(lines, "a.drl")


@pytest.mark.parametrize(
    ("lines", "text"),
    [
        (["T1", "X1.2.3Y0"], r"a\.drl:6: .*not a coordinate"),
        (["T1", "XY"], "not a coordinate"),
        (["X1.0Y1.0", "T1"], r"a\.drl:5: drills before any tool"),
        (["T1", "WHAT"], r'a\.drl:6: "WHAT" is not a drill command'),
        (["T1", "X1.0Y1.0", "INCH"], "changes units after the first coordinate"),
        (["T1", "X1.0Y1.0", "R999999999X0.1"], "over the cap of 10000"),
        (["T1", "X1.0Y1.0", "G93X1.0Y0"], "moves the origin"),
        (["T1", "X1.0Y1.0", "M02X1.0Y1.0"], "repeated pattern"),
        (["T1C500.0", "X1.0Y1.0"], "500 mm, over 100 mm"),
    ],
)
def test_errors_name_line_and_text(lines: list[str], text: str) -> None:
    """What cannot be understood and would move holes is an error with its line."""
    with pytest.raises(SplitcheckError, match=text):
        _read("M48", "METRIC", "T1C0.3", "%", *lines)


def test_many_repeats_are_capped(monkeypatch: pytest.MonkeyPatch) -> None:
    """Repeats of repeats cannot fill the memory."""
    monkeypatch.setattr(drill_play, "HOLES_CAP", 1000)
    with pytest.raises(SplitcheckError, match="over 1000 holes"):
        _metric("T1", "X1.0Y1.0", *["R600X0.1"] * 9)


def test_commands_that_move_nothing_are_said() -> None:
    """Text engraving and machine codes are passed over with one remark."""
    file = _metric(
        "G40", "T1", "S100F50", "M97,BOARD X1", "M98", "X55Y55 TEXT", "X1.0Y1.0", "G04X5"
    )
    assert _places(file) == [(1.0, 1.0)]
    assert any("G04" in remark and "M97" in remark for remark in file.remarks)


def test_units_that_change_before_the_first_hole() -> None:
    """Tools listed in inch, coordinates in mm: each is read in its own unit, with a remark."""
    file = _read("M48", "INCH", "T1C0.0394", "%", "M71", "T1", "X10.0Y5.0", "M30")
    assert _places(file) == [(10.0, 5.0)]
    assert file.holes[0].diameter_mm == pytest.approx(1.0, abs=1e-3)
    assert any("unit changes" in remark for remark in file.remarks)


def test_empty_program() -> None:
    """A file without holes is no error."""
    for body in ((), ("T1", "G00X1.0Y1.0")):
        file = _read("M48", "METRIC", "T1C0.3", "%", *body, "M30", pads=PADS)
        assert file.holes == ()
        assert any("drills no holes" in remark for remark in file.remarks)


@given(st.text(alphabet="TXYGMRCIAN0123456789.-+%;,= \n", max_size=200))
def test_any_text_ends_in_holes_or_an_error_of_ours(text: str) -> None:
    """Whatever stands in a drill file, reading ends without a crash."""
    with suppress(SplitcheckError):
        for hole in drill.read("M48\nMETRIC\nT1C0.3\n%\nT1\n" + text, "a.drl", pads=PADS).holes:
            assert all(math.isfinite(v) for point in hole.path for v in point)


def test_gerber_drill_file() -> None:
    """Flashes are holes, strokes and long flashes slots; the function gives plating and span."""
    via = Tag(function="ViaDrill")
    marks: list[Mark] = [
        Flash((1.0, 2.0), Dot(0, 0).buffer(0.15), True, via, 5, 0.3),
        Flash((5.0, 5.0), box(-1.0, -0.25, 1.0, 0.25), True, NO_TAG, 6),
        Stroke(((0.0, 0.0), (2.0, 0.0)), 0.6, None, True, Tag(function="ComponentDrill"), 7),
        Flash((9.0, 9.0), Dot(0, 0).buffer(0.15), False, via, 8, 0.3),
        Fill(((0, 0), (1, 0), (1, 1), (0, 0)), True, NO_TAG, 9),
    ]
    attributes = ((".FileFunction", ("Plated", "4", "2", "Buried")),)
    file = drill.from_drawing(Drawing("d.gbr", tuple(marks), attributes, ()))
    assert file.holes == (
        Hole(((1.0, 2.0),), 0.3, True, (2, 4), 5, True),
        Hole(((4.25, 5.0), (5.75, 5.0)), 0.5, True, (2, 4), 6, None),
        Hole(((0.0, 0.0), (2.0, 0.0)), 0.6, True, (2, 4), 7, False),
    )
    assert [remark.split(": ")[0] for remark in file.remarks] == ["d.gbr:8", "d.gbr:9"]
