"""Choosing nets and layers by name."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.errors import SplitcheckError
from splitcheck.verdict.choose import choose

NETS = ("/mcu/CLK", "DDR_DQ0", "DDR_DQ1", "D[0]", "D0")


@pytest.mark.parametrize(
    ("word", "meant"),
    [
        ("DDR_*", {"DDR_DQ0", "DDR_DQ1"}),
        ("DDR_DQ?", {"DDR_DQ0", "DDR_DQ1"}),
        ("*CLK", {"/mcu/CLK"}),
        ("D[0]", {"D[0]"}),
        ("D[01]", {"D0"}),
        ("*", set(NETS)),
    ],
)
def test_words_mean_names(word: str, meant: set[str]) -> None:
    """Patterns of the shell; an exact name is that net alone."""
    assert choose(NETS, [word], "--net") == meant


@pytest.mark.parametrize(
    ("word", "near"),
    [("ddr_dq0", "near it are DDR_DQ0"), ("DDR_DQS", "DDR_DQ0"), ("zzzz", "`splitcheck read`")],
)
def test_a_word_without_meaning_is_an_error_that_helps(word: str, near: str) -> None:
    """The nearest names are told, never silently taken."""
    with pytest.raises(SplitcheckError) as caught:
        choose(NETS, ["DDR_*", word], "--net")
    assert caught.value.place == f"--net {word}"
    assert near in caught.value.do


@given(st.lists(st.text(max_size=8), min_size=1), st.data())
def test_every_name_means_itself(names: list[str], data: st.DataObject) -> None:
    """Whatever a net is called, its own name finds it."""
    name = data.draw(st.sampled_from(names))
    assert name in choose(names, [name], "--net")
