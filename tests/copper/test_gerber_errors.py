"""Gerber files at fault: one clear message with file and line, quickly, and never a traceback."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import gerber, paint
from splitcheck.errors import SplitcheckError

HEAD = "%FSLAX33Y33*%\n%MOMM*%\n%ADD10C,1*%\n"


def fault(text: str) -> str:
    """The message that reading the text ends with."""
    with pytest.raises(SplitcheckError) as caught:
        gerber.read(text, "it.gbr")
    return str(caught.value)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (HEAD + "D11*\nX0Y0D03*M02*", "it.gbr:5: aperture D11 is used but never defined; export"),
        (HEAD + "X0Y0D03*M02*", "it.gbr:4: something is drawn before any aperture is selected;"),
        ("%MOMM*%\nX0Y0D02*M02*", "it.gbr:2: coordinates come before the number format (FS);"),
        ("%FSLAX33Y33*%\nX0Y0D02*M02*", "it.gbr:2: the file does not say its units (MO) before"),
        (HEAD + "D10*\nX10000000Y0D03*", "it.gbr:5: the coordinate (10000, 0) mm is beyond the"),
        (HEAD + "D10*\nX9999Y-2000000D03*", "it.gbr:5: the coordinate (9.999, -2000) mm is beyond"),
        (HEAD + "D10*\nX0Y0D0", "it.gbr:5: the file ends in the middle of the word 'X0Y0D0';"),
        (HEAD + "%ADD11C,", "it.gbr:4: the file ends in the middle of an extended command (%);"),
        (HEAD + "G36*\nX0Y0D02*\nX1D01*\n", "it.gbr:4: a region (G36) is never ended (G37);"),
        (HEAD + "G36*\nG36*\n", "it.gbr:5: a region (G36) begins inside another;"),
        (HEAD + "%ABD20*%\nD10*", "it.gbr:4: a block aperture (AB) is never ended;"),
        (
            HEAD + "%ABD20*%\nD20*\nX0Y0D03*\n%AB*%M02*",
            "it.gbr:6: block aperture D20 is used inside its own definition;",
        ),
        (
            HEAD + "D10*\n%SRX10000Y10000I1J1*%\nX0Y0D03*%SR*%M02*",
            "it.gbr:5: step-repeat and blocks make too many marks: 10000 x 10000 = 100000000,",
        ),
        (
            HEAD + "D10*\n%SRX1000Y900I1J1*%\nX0Y0D03*X1D03*%SR*%M02*",
            "it.gbr:5: step-repeat and blocks make too many marks: 1000 x 900 copies of 2 marks =",
        ),
        (HEAD + "%SRX2Y1I3000J0*%", "it.gbr:4: step-repeat reaches 3000 mm, beyond the limit of"),
        (HEAD + "%SRX0Y1I1J0*%", "it.gbr:4: the command 'SRX0Y1I1J0' cannot be read;"),
        (HEAD + "%LPX*%", "it.gbr:4: the command 'LPX' cannot be read;"),
        (HEAD + "%LR1e9*%", "it.gbr:4: the command 'LR1e9' cannot be read;"),
        (HEAD + "%LS0*%", "it.gbr:4: the command 'LS0' cannot be read;"),
        (HEAD + "%IR45*%", "it.gbr:4: the command 'IR45' cannot be read;"),
        (HEAD + "%OFA9999*%", "it.gbr:4: the image offset 'OFA9999' is beyond 2000 mm;"),
        ("%FSLAXY*%\n", "it.gbr:1: the command 'FSLAXY' cannot be read;"),
        ("%MOCM*%\n", "it.gbr:1: the command 'MOCM' cannot be read;"),
        (HEAD + "%ADD11*%", "it.gbr:4: the aperture definition 'ADD11' cannot be read;"),
        (HEAD + "%ADD11FOO,1*%", "it.gbr:4: aperture D11 uses the macro 'FOO', not defined before"),
        (HEAD + "%ADD11R,1X2X3X4X5*%\nD11*X0Y0D03*", "it.gbr:4: aperture D11 (R) has 5 parameters"),
        (HEAD + "%ADD11C,-1*%\nD11*X0Y0D03*", "it.gbr:4: aperture D11 has the negative size -1;"),
        (HEAD + "%ADD11C,9999*%\nD11*X0Y0D03*", "it.gbr:4: aperture D11 has the size 9999 mm,"),
        (HEAD + "%ADD11P,1X2*%\nD11*X0Y0D03*", "it.gbr:4: aperture D11 is a polygon of 2 corners"),
        (
            HEAD + "%AMM*\n1,1,1*%\n%ADD11M*%\nD11*X0Y0D03*",
            "it.gbr:6: the aperture macro holds primitive 1 (circle) with 2 values where 5 belong;",
        ),
        (
            HEAD + "%AMM*1,1,9000,0,0*%%ADD11M*%\nD11*X0Y0D03*",
            "it.gbr:4: aperture D11 reaches 4500",
        ),
        (HEAD + "D10*\nXAY5D03*", "it.gbr:5: the command 'XAY5D03' cannot be read;"),
        (HEAD + "D10*\nX" + "1" * 5000 + "D03*", "it.gbr:5: the command 'X1111111"),
        ("", "it.gbr: the file is empty;"),
        ("hello, this is a letter\n", "it.gbr: no Gerber command in it;"),
        ("\x89PNG\r\n\x1a\n\0\0\0\rIHDR*" + "\x01\x02\0" * 99, "it.gbr: "),
        ("PK\x03\x04\x14\0\x08\x08*", "it.gbr: "),
    ],
)
def test_fault_is_told_with_its_place(text: str, message: str) -> None:
    """File, line, what is wrong; then what to do."""
    assert fault(text).startswith(message)


def test_blocks_in_blocks_are_capped_before_they_grow() -> None:
    """Twenty levels of two flashes each would be a million marks twice over."""
    body = "%ABD20*%D10*X0Y0D03*X1D03*%AB*%\n"
    for code in range(21, 45):
        body += f"%ABD{code}*%D{code - 1}*X0Y0D03*X1D03*%AB*%\n"
    assert "make too many marks" in fault(HEAD + body)


def test_macros_that_draw_too_much_together() -> None:
    """A hundred apertures of a macro of nine thousand circles each."""
    macro = "%AMM*" + "1,1,0,0,0*" * 9000 + "%\n"
    uses = "".join(f"%ADD{n}M*%\nD{n}*X0Y0D03*\n" for n in range(11, 111))
    assert "primitives, limit 100000" in fault(HEAD + macro + uses)


def test_large_aperture_set_down_very_often() -> None:
    """A macro outline of 5000 corners, 5000 times, is told before it is painted."""
    ring = ",".join(f"{n % 100},{n // 100}" for n in range(4999))
    macro = f"%AMM*4,1,4999,{ring},0,0,0*%%ADD11M*%\nD11*"
    flashes = "\n".join(f"X{n}D03*" for n in range(5000))
    assert "corners, limit 20000000" in fault(HEAD + macro + flashes + "M02*")


@pytest.mark.parametrize(
    "text",
    [
        "\0" * 10_000_000,
        "0" * 10_000_000,
        " \n" * 5_000_000,
        HEAD + "0" * 10_000_000,
        HEAD + "%" * 100_001,
        HEAD + "G04 %" * 100_000,
        HEAD + "X" * 1_000_000 + "*",
        HEAD + "X1" * 1_000_000,
        HEAD + "\n" * 5_000_000 + "X",
        HEAD + "%AMM*1,1," + "(" * 1_000_000 + "*%%ADD11M*%D11*X0Y0D03*",
        HEAD + "%AMM*1,1," + "-" * 100_000 + "*%%ADD11M*%D11*X0Y0D03*",
    ],
    ids=range(11),
)
def test_large_junk_ends_quickly(text: str) -> None:
    """Linear cost: under a second each, where a quadratic scan would take hours."""
    assert fault(text).startswith("it.gbr")


@given(st.text(alphabet="%*GDXYIJMLPCSRABTO.,0123-\n $x()", max_size=60))
def test_any_text_is_read_or_refused(text: str) -> None:
    """No other exception, whatever comes after a good header."""
    try:
        drawing = gerber.read(HEAD + "D10*" + text, "it.gbr")
    except SplitcheckError:
        return
    paint.paint(drawing.marks)


@given(st.integers(0, 400))
def test_any_prefix_is_read_or_refused(length: int) -> None:
    """A file cut off anywhere."""
    whole = (
        HEAD + "%AMM*21,1,$1,1,0,0,0*%%ADD11M,2*%%SRX2Y1I9J0*%D11*X0Y0D03*%SR*%\nG36*X0Y0D02*"
        "X9000D01*Y9000D01*X0Y0D01*G37*%LPC*%D10*X1Y1D02*G75*G03*X9Y9I4J4D01*%ABD12*%%AB*%M02*"
    )
    try:
        drawing = gerber.read(whole[:length], "it.gbr")
    except SplitcheckError:
        return
    paint.paint(drawing.marks)
