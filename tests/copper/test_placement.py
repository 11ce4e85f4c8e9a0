"""Lists of placed parts: the forms of the trade, units, sides, and rows that cannot be read."""

from __future__ import annotations

from pathlib import Path
from time import perf_counter

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import placement
from splitcheck.copper.intake import open_export
from splitcheck.copper.placement import Placed
from splitcheck.errors import SplitcheckError

BLANKS = """\
### Footprint positions - created on 2026-01-21T13:05:11 ###
## Unit = mm, Angle = deg.
## Side : bottom
# Ref     Val                Package         PosX       PosY       Rot  Side
C1        1uF                C_0402        6.0500    91.6000   90.0000  bottom
R7        0 Ohm              R_0402       -2.5000    10.0000  180.0000  top
## End
"""
COMMAS = """\
Component position file.
Made by a script 1.2.0.

Measurements are in inches. Comma delimited

RefDes,Layer,LocationX,LocationY,Rotation
B1,Top,4.035,1.705,270
C1,Bottom,1.000,-0.500,180
"""
BARE = """\
C3 122.31 12.89 180 10n C0805
FM5 -2.00  8.00   0 FIDUCIAL FIDUCIAL
L2   6.35 16.61  90  WE-LQS
"""
OWN_UNITS = """\
"Designator","Comment","Mid X","Mid Y","Layer","Rotation"
"C1","100nF, 16 V","10.5mm","3.25mm","T","0"
"C2","100nF","100mil","-200mil","B","90"
"""
SEMICOLONS = "Ref;Val;PosX;PosY;Rot;Side\nC1;100n;12,5;-3,25;90,0;top\n"
HEADED = "Designator\tCenter-X(mil)\tCenter-Y(mil)\tRotation\tLayer\nC1\t1000\t2000\t0\tTopLayer\n"
INCHES = (
    "## Unit = inches, Angle = deg.\n# Ref Val Package PosX PosY Rot Side\nC1 1u 0402 1.0 2.0 0 T\n"
)


@pytest.mark.parametrize(
    ("name", "text", "stated", "parts"),
    [
        (
            "a.pos",
            BLANKS,
            True,
            [
                ("C1", 6.05, 91.6, "bottom", 90.0, "1uF"),
                ("R7", -2.5, 10.0, "top", 180.0, "0 Ohm"),
            ],
        ),
        (
            "a.csv",
            COMMAS,
            True,
            [
                ("B1", 102.489, 43.307, "top", 270.0, None),
                ("C1", 25.4, -12.7, "bottom", 180.0, None),
            ],
        ),
        (
            "a.mnt",
            BARE,
            False,
            [
                ("C3", 122.31, 12.89, "top", 180.0, "10n"),
                ("FM5", -2.0, 8.0, "top", 0.0, "FIDUCIAL"),
                ("L2", 6.35, 16.61, "top", 90.0, None),
            ],
        ),
        (
            "a.csv",
            OWN_UNITS,
            False,
            [
                ("C1", 10.5, 3.25, "top", 0.0, "100nF, 16 V"),
                ("C2", 2.54, -5.08, "bottom", 90.0, "100nF"),
            ],
        ),
        ("a.csv", SEMICOLONS, False, [("C1", 12.5, -3.25, "top", None, "100n")]),
        ("a.txt", HEADED, True, [("C1", 25.4, 50.8, "top", 0.0, None)]),
        ("a.pos", INCHES, True, [("C1", 25.4, 50.8, "top", 0.0, "1u")]),
    ],
    ids=["blanks", "commas", "bare", "own units", "semicolons", "unit in header", "inches"],
)
def test_forms_of_the_trade(
    name: str, text: str, stated: bool, parts: list[tuple[object, ...]]
) -> None:
    """Each form by hand, as exporters write it; values are those in the text, in mm."""
    read = placement.read(text, name)
    assert [part[:6] for part in read.parts] == parts
    assert read.stated is stated


def test_lines_are_those_of_the_file() -> None:
    """So that a person finds the row again."""
    assert [part.line for part in placement.read(BLANKS, "a.pos").parts] == [5, 6]
    assert [part.line for part in placement.read(COMMAS, "a.csv").parts] == [7, 8]


def test_file_name_tells_the_side_where_rows_do_not() -> None:
    """And a row that tells it goes before the name."""
    bare = "Ref,X,Y\nC1,1,2\n"
    assert [placement.read(bare, name).parts[0].side for name in ("b-top.csv", "b.csv")] == [
        "top",
        None,
    ]
    told = "Ref,X,Y,Side\nC1,1,2,bottom\n"
    assert placement.read(told, "board-top.csv").parts[0].side == "bottom"


@pytest.mark.parametrize(
    "row",
    [
        "C1,nan,2,top",
        "C1,inf,2,top",
        "C1,1e400,2,top",
        "C1,,2,top",
        "C1,1",
        ",1,2,top",
        "C1,99999999,2,top",
        f"{'C' * 200}1,1,2,top",
        "C1," + "1" * 5000 + ",2,top",
        'C1,"1,2',
        "\x00\x01,\x02,3,top",
    ],
)
def test_rows_that_cannot_be_read_are_told(row: str) -> None:
    """One remark with their line; the other rows are read."""
    read = placement.read(f"Ref,X,Y,Side\nC0,1,2,top\n{row}\nC9,3,4,top\n", "a.csv")
    assert [part.ref for part in read.parts] == ["C0", "C9"]
    assert read.remarks == ("a.csv: 1 rows give no part and place (line 3)",)


@pytest.mark.parametrize("text", ["", "\n\n", "hello\nworld", "Ref,X,Y\n", "%" * 100_000])
def test_file_without_parts_is_told(text: str) -> None:
    """It is no error: a placement file is not needed."""
    read = placement.read(text, "a.pos")
    assert read.parts == ()
    assert read.remarks[-1] == "a.pos: no part with a place was found in it"


@pytest.mark.slow
def test_long_file_is_read_in_seconds() -> None:
    """10^5 rows; and not more than the cap of a longer one."""
    rows = "".join(f"C{i},{i % 300}.5,{i % 200}.25,{i % 360},top,1u\n" for i in range(250_000))
    start = perf_counter()
    read = placement.read("Ref,X,Y,Rot,Side,Val\n" + rows, "a.csv")
    assert perf_counter() - start < 20.0
    assert len(read.parts) == placement.ROWS_CAP - 1
    assert "only the first 200000 of 250001 rows" in read.remarks[0]


refs = st.from_regex(r"\A[A-Z]{1,3}[0-9]{1,4}\Z")
sizes = st.integers(-300_000, 300_000).map(lambda n: n / 1000)
rows = st.lists(
    st.tuples(refs, sizes, sizes, st.sampled_from(["top", "bottom"]), st.integers(0, 359)),
    min_size=1,
    max_size=8,
)


@given(rows, st.sampled_from([",", ";", "\t", "   "]), st.permutations(range(5)))
def test_whatever_is_written_is_read(
    parts: list[tuple[str, float, float, str, int]], between: str, order: list[int]
) -> None:
    """Any order of columns, any of the usual delimiters."""
    names = ["Ref", "PosX", "PosY", "Side", "Rot"]
    lines = [between.join(names[i] for i in order)]
    lines += [between.join(str(part[i]) for i in order) for part in parts]
    read = placement.read("\n".join(lines), "a.txt")
    assert [tuple(part[:5]) for part in read.parts] == [
        (ref, x, y, side, float(turn)) for ref, x, y, side, turn in parts
    ]


@given(rows)
def test_inches_are_25_4_mm(parts: list[tuple[str, float, float, str, int]]) -> None:
    """The same numbers with another unit stated, by the definition of the inch (1959)."""
    text = "Ref,X,Y\n" + "\n".join(f"{ref},{x},{y}" for ref, x, y, _, _ in parts)
    plain, inches = placement.read(text, "a.csv"), placement.read(f"Units: inch\n{text}", "a.csv")
    assert inches.unit == "in"
    for one, other in zip(plain.parts, inches.parts, strict=True):
        assert other.x_mm == pytest.approx(25.4 * one.x_mm, abs=2e-6)
    assert plain.factor("in") == 25.4


@given(st.text(max_size=300))
def test_any_text_is_read_without_a_crash(text: str) -> None:
    """Parts are finite and named, whatever stands in the file."""
    for part in placement.read(text, "a.csv").parts:
        assert isinstance(part, Placed)
        assert part.ref
        assert abs(part.x_mm) <= 10_000.0
        assert abs(part.y_mm) <= 10_000.0


def test_real_lists_are_known_and_read(corpus: Path) -> None:
    """Each is known as one, and nine rows in ten of it or more are parts with a side."""
    found = 0
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        try:
            export = open_export(folder)
        except SplitcheckError:  # judged elsewhere
            continue
        for file in export.of_kind("placement"):
            read = placement.read(file.text, file.name)
            full = [line for line in file.text.splitlines() if line.strip()]
            assert len(read.parts) >= 0.9 * (len(full) - 10)
            assert all(part.side is not None for part in read.parts)
            found += 1
    assert found
