"""Marks against the commands that stock pygerber 2.4.3 draws, on files where it is right."""

from __future__ import annotations

import decimal
import warnings
from collections.abc import Iterator
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import gerber
from splitcheck.copper import gerber_language as language
from splitcheck.copper.marks import Fill, Flash, Mark, Stroke

HEAD = (
    "%FSLAX26Y26*%\n%MO{unit}*%\n%TF.FileFunction,Copper,L1,Top*%\n"
    "%TA.AperFunction,Conductor*%\n%ADD10C,0.3*%\n%TA.AperFunction,SMDPad,CuDef*%\n"
    "%ADD11R,2X1X0.4*%\n%TD*%\n%ADD12O,3X1*%\n%ADD13P,2X6X10*%\nG01*\nG75*\n"
)
FILES = {
    "strokes": "D10*\nX0Y0D02*\nX5000000Y-3000000D01*\nX9000000D01*\nY0D01*\n",
    "flashes": "D11*\nX0Y0D03*\nD12*\nX5000000D03*\nD13*\nX5000000Y5000000D03*\n",
    "polarity": "D10*\n%LPC*%\nX0Y0D03*\n%LPD*%\nX1000000Y0D03*\n",
    "nets": "%TO.N,GND*%\nD10*\nX0Y0D02*\nX1000000Y0D01*\n%TO.N,/A*%\nX2000000Y0D01*\n%TD*%\n"
    "X3000000Y0D01*\n",
    "pins": "D11*\n%TO.P,U1,7*%\n%TO.N,CLK*%\nX0Y0D03*\n%TD*%\nX1000000Y0D03*\n",
    "region": "%TO.N,GND*%\nG36*\nX0Y0D02*\nX4000000Y0D01*\nX4000000Y3000000D01*\nX0Y0D01*\nG37*\n",
    "step-repeat": "%SRX2Y3I5.0J4.0*%\nD10*\nX0Y0D02*\nX1000000Y0D01*\n%SR*%\n",
}


@pytest.fixture(autouse=True)
def _same_decimals() -> Iterator[None]:
    """Importing pygerber's parser changes the precision of all decimals."""
    precision = decimal.getcontext().prec
    yield
    decimal.getcontext().prec = precision


def stock(text: str) -> list[tuple[Any, ...]]:
    """Each command of pygerber as: kind, points, dark, net, function."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from pygerber.gerberx3.parser2.parser2 import Parser2  # noqa: PLC0415
        from pygerber.gerberx3.tokenizer.tokenizer import Tokenizer  # noqa: PLC0415

        commands = list(Parser2().parse(Tokenizer().tokenize(text)))
    return [entry for command in commands for entry in flat(command)]


def flat(command: Any) -> Iterator[tuple[Any, ...]]:
    """Commands inside buffers, one by one."""
    kind = type(command).__name__
    if kind == "BufferCommand2":
        for inner in command:
            yield from flat(inner)
        return
    regional = kind == "Region2"
    net = (command.object_attributes if regional else command.attributes).get(".N")
    dark = command.transform.polarity.value == "D"
    if regional:
        points = [command.command_buffer[0].start_point]
        points += [line.end_point for line in command.command_buffer]
        yield "Fill", pairs(points), dark, net, None
        return
    function = command.aperture.attributes.get(".AperFunction")
    first = function.split(",")[0] if function else None
    if kind == "Line2":
        yield "Stroke", pairs([command.start_point, command.end_point]), dark, net, first
    else:
        yield "Flash", pairs([command.flash_point]), dark, net, first


def pairs(points: list[Any]) -> tuple[tuple[float, float], ...]:
    """Points in mm."""
    return tuple((round(float(p.x.value), 6), round(float(p.y.value), 6)) for p in points)


def ours(mark: Mark) -> tuple[Any, ...]:
    """A mark in the same terms."""
    match mark:
        case Stroke():
            points = mark.points
        case Flash():
            points = (mark.at,)
        case Fill():
            points = mark.ring
    function = None if isinstance(mark, Fill) else mark.tag.function
    return type(mark).__name__, points, mark.dark, mark.tag.net, function


@pytest.mark.parametrize("unit", ["MM", "IN"])
@pytest.mark.parametrize("name", FILES)
def test_same_marks(name: str, unit: str) -> None:
    """Kind, points (mm), polarity, net and aperture function, one by one."""
    text = HEAD.format(unit=unit) + FILES[name] + "M02*\n"
    expected = stock(text)
    found = [ours(mark) for mark in gerber.read(text, "it.gbr").marks]
    if name == "step-repeat":
        # pygerber goes along each row, the format up each column: without clear marks the same.
        expected, found = sorted(expected), sorted(found)
    assert expected
    assert [entry[0] for entry in found] == [entry[0] for entry in expected]
    for mine, theirs in zip(found, expected, strict=True):
        assert np.array(mine[1]) == pytest.approx(np.array(theirs[1]), abs=2e-6)
        assert mine[2:] == theirs[2:]


_SIZES = st.decimals(0, 999, places=6).map(str)
_SIGNED = st.decimals(-999, 999, places=6).map(str)


@given(st.integers(10, 9999), st.lists(_SIZES, min_size=1, max_size=2))
def test_plain_circles_are_what_pygerber_reads(code: int, sizes: list[str]) -> None:
    """Code, diameter and hole."""
    command = f"ADD{code}C,{'X'.join(sizes)}"
    told, read = language.token(command), language.read_definition(command)
    values = tuple(float(v) for v in (told.diameter, told.hole_diameter) if v is not None)
    assert read == (code, "C", values)
    assert told.aperture_id == f"D{code}"


@given(st.sampled_from("RO"), st.lists(_SIZES, min_size=2, max_size=3))
def test_plain_rectangles_and_obrounds_are_what_pygerber_reads(kind: str, sizes: list[str]) -> None:
    """Sides and hole."""
    command = f"ADD10{kind},{'X'.join(sizes)}"
    told, read = language.token(command), language.read_definition(command)
    values = (told.x_size, told.y_size, told.hole_diameter)
    assert read == (10, kind, tuple(float(v) for v in values if v is not None))
    assert type(told).__name__ == {"R": "DefineRectangle", "O": "DefineObround"}[kind]


@given(st.from_regex(r"[A-Za-z_][A-Za-z0-9_]{1,12}", fullmatch=True), st.lists(_SIGNED, max_size=9))
def test_plain_macros_are_what_pygerber_reads(name: str, values: list[str]) -> None:
    """Name and signed values."""
    command = f"ADD10{name}" + ("," + "X".join(values) if values else "")
    told, read = language.token(command), language.read_definition(command)
    assert (told.aperture_type, tuple(map(float, told.am_param))) == (name, read and read[2])


@pytest.mark.parametrize("command", ["FSLAX46Y46", "FSLAX24Y25"])
def test_a_plain_format_is_what_pygerber_reads(command: str) -> None:
    """Decimals, digits, zeros and mode."""
    told, read = language.token(command), language.read_format(command)
    assert read is not None
    assert read.decimals == (told.x_format.decimal, told.y_format.decimal)
    assert read.digits[0] - read.decimals[0] == told.x_format.integer
    assert (told.zeros_mode.value, told.coordinate_mode.value) == ("L", "A")


@pytest.mark.parametrize(
    ("command", "words"),
    [
        ("LPD", ("C", "D")),
        ("LPC", ("C", "D")),
        ("LMXY", ("N", "X", "Y", "XY")),
        ("IPNEG", ("NEG",)),
    ],
)
def test_a_plain_word_is_what_pygerber_reads(command: str, words: tuple[str, ...]) -> None:
    """Polarity, mirroring and image polarity."""
    told = language.token(command)
    name = {"LP": "polarity", "LM": "mirroring", "IP": "image_polarity"}[command[:2]]
    assert language.read_word(command, words) == getattr(told, name).value


@given(st.sampled_from(["LR", "LS"]), st.decimals(0, 359, places=4).map(str))
def test_a_plain_number_is_what_pygerber_reads(kind: str, number: str) -> None:
    """Degrees and scale."""
    told = language.token(kind + number)
    assert language.read_number(kind + number) == float(
        told.rotation if kind == "LR" else told.scaling
    )
