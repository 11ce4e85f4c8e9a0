"""Laws of names and numbers as they are shown."""

from __future__ import annotations

import unicodedata
from decimal import Decimal
from math import inf, nan

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from splitcheck.report.words import number, shorten, visible, with_error

NAMES = st.text(st.characters(codec=None), max_size=200)


@given(NAMES)
def test_nothing_unseen_is_left_in_a_visible_name(name: str) -> None:
    """Whatever a file holds, no control, format or unassigned character reaches the terminal."""
    seen = visible(name).removesuffix("\N{LEFT-TO-RIGHT MARK}")
    assert not {unicodedata.category(char)[0] for char in seen} & {"C"}
    assert not {"Zl", "Zp"} & {unicodedata.category(char) for char in seen}


@given(NAMES, st.integers(8, 120))
def test_a_shortened_name_fits(name: str, cells: int) -> None:
    """No name is wider than it may be."""
    assert cell_len(shorten(name, cells)) <= cells


@given(
    st.text(st.characters(codec="ascii", categories=["L", "N"]), min_size=41), st.integers(9, 40)
)
def test_a_shortened_name_keeps_both_ends(name: str, cells: int) -> None:
    """Bus names differ in their last letters, hierarchies in their first."""
    head, tail = shorten(name, cells).split("...")
    assert name.startswith(head)
    assert name.endswith(tail)
    assert head
    assert tail


def test_a_name_of_ten_thousand_characters_is_cut_in_the_middle() -> None:
    """A hostile length costs nothing and keeps its ends."""
    assert shorten("A" + "n" * 10_000 + "Z", 12) == "Annnn...nnnZ"
    assert shorten("A" + "\u0301" * 10_000 + "Z", 12).endswith("Z")


def test_a_wide_script_counts_two_columns_a_letter() -> None:
    """Unicode Standard Annex 11: CJK ideographs take two columns."""
    assert shorten("電源電圧電源電圧", 10) == "電源...圧"


@given(st.floats(1e-4, 1e7))
def test_a_number_keeps_three_digits(value: float) -> None:
    """What is shown is within half a unit of the third digit."""
    shown = float(number(value))
    assert abs(shown - value) <= 0.005000001 * value


@given(st.floats(0, 1e6), st.floats(1e-3, 1e6))
def test_value_and_error_end_at_one_digit(value: float, error: float) -> None:
    """Both have the same decimals, and both are within half of the last of them.

    JCGM 100:2008 (GUM), 7.2.6: a value is rounded to agree with its uncertainty, which is given to
    two digits at most where it decides the rounding.
    """
    shown, shown_error = (Decimal(part) for part in with_error(value, error).split(" +-"))
    assert shown.as_tuple().exponent == shown_error.as_tuple().exponent
    half = Decimal(5).scaleb(int(shown.as_tuple().exponent) - 1)
    assert abs(shown - Decimal(value)) <= half
    assert abs(shown_error - Decimal(error)) <= half


@pytest.mark.parametrize("bad", [nan, inf, -inf])
def test_what_is_not_a_number_is_never_shown(bad: float) -> None:
    """A NaN is a fault of this program: it must not be printed as if it were a result."""
    with pytest.raises(ValueError, match="not a"):
        number(bad)
    with pytest.raises(ValueError, match="not a"):
        with_error(1.0, bad)
