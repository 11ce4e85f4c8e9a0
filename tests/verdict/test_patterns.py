"""Patterns of net names."""

from __future__ import annotations

import re
from fnmatch import fnmatchcase
from time import process_time

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.verdict.patterns import Names, Words, spellings

letters = st.text("AB1_", max_size=12)
globs = st.text("AB1_*?", min_size=1, max_size=8)


@given(globs, letters)
def test_names_are_matched_as_the_standard_library_matches_them(pattern: str, name: str) -> None:
    """`*` and `?` mean what they mean to fnmatch."""
    assert Names([pattern]).match(name) == (pattern == name or fnmatchcase(name, pattern))


@given(st.text("AB1*?#", min_size=1, max_size=6), st.lists(st.text("AB1", min_size=1, max_size=6)))
def test_words_are_matched_whole_and_anywhere(pattern: str, words: list[str]) -> None:
    """One word of a pattern against every word of a name, by a plain regular expression."""
    signs = {"*": ".*", "?": ".", "#": r"(?<!\d)\d+(?!\d)"}
    plain = re.compile("".join(signs.get(sign, sign) for sign in pattern))
    expected = any(plain.fullmatch(word) for word in words)
    if "#" in pattern and re.search(r"#[#1?*]|[1?*]#", pattern):
        return  # a number beside a digit or any text can be cut in several ways
    assert Words([pattern]).match("_".join(words)) == expected


@given(st.lists(letters, max_size=4), letters)
def test_many_patterns_match_what_one_of_them_does(patterns: list[str], name: str) -> None:
    """In any order."""
    given_some = [pattern for pattern in patterns if pattern.strip("_")]
    for kind in (Names, Words):
        one_of = any(kind([pattern]).match(name) for pattern in given_some)
        assert kind(given_some).match(name) == one_of
        assert kind(reversed(given_some)).match(name) == one_of


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("/power supply/EN.3V3", ("EN_3V3",)),
        ("~{RESET}", ("RESET",)),
        ("PRSNT1#", ("PRSNT1",)),
        ("D+", ("D_P",)),
        ("D-", ("D_N",)),
        ("OSC-IN", ("OSC_IN",)),
        ("MDI[3]-", ("MDI_3_N",)),
        ("Net-(U7-GPIO19{slash}USB_D-)", ("GPIO19", "USB_D_N")),
        ("Net-(U7-USB_D+-Pad3)", ("USB_D_P",)),
        ("Net-(R1-Pad2)", ()),
        ("Net-(Q1-G)", ()),
        ("Net-(R1-Pad2)|SCL", ("SCL",)),
        ("unconnected-(U1-NC-Pad13)", ("NC",)),
        ("", ()),
        ("|||", ()),
    ],
)
def test_spellings(name: str, expected: tuple[str, ...]) -> None:
    """As schematic programs write names."""
    assert spellings(name) == expected


@given(st.text(max_size=400))
def test_any_text_has_spellings_of_plain_words(name: str) -> None:
    """Nothing but capitals, digits and single `_` comes out, whatever goes in."""
    for spelling in spellings(name):
        assert re.fullmatch(r"[A-Z0-9]+(?:_[A-Z0-9]+)*", spelling), spelling


def test_patterns_made_to_be_slow_are_not() -> None:
    """Twenty-five wild cards against names that nearly match."""
    start = process_time()
    assert not Names(["*a" * 25 + "b"]).match("a" * 5000)
    assert not Words(["*A" * 25 + "B"]).match("_".join(["A" * 100] * 50))
    assert not Names(["#" * 50 + "b"]).match("1" * 5000)
    assert process_time() - start < 2.0
