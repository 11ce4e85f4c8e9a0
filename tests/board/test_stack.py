"""Layers in z: stack files, job files and the default build."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.stack import default_build, from_entries, from_job, read_stack_file
from splitcheck.copper import jobfile
from splitcheck.errors import SplitcheckError

TWO = '[[copper]]\nname = "top"\nbelow_mm = 1.5\n[[copper]]\nname = "bottom"\n'


def _names(count: int) -> list[str]:
    return [f"L{number}" for number in range(1, count + 1)]


@given(st.integers(2, 29))
def test_default_build_adds_up_to_a_board_of_1_6_mm(count: int) -> None:
    """While they fit, all layers make the usual thickness (common practice, no source)."""
    stack = default_build(_names(count))
    assert stack.layers[0].top_mm == 0.0
    assert stack.layers[-1].bottom_mm == pytest.approx(1.6, abs=1e-5)


@given(st.integers(1, 40), st.floats(0.1, 6.0))
def test_default_build_leaves_some_dielectric_everywhere(count: int, thickness: float) -> None:
    """However thin the board or many its layers, each lies below the one before."""
    stack = default_build(_names(count), thickness)
    assert all(stack.height_mm(n, n + 1) > 0 for n in range(1, count))


def test_default_build_says_how_thick_it_is() -> None:
    """Forty layers with the least dielectric are thicker than asked for, and it says so."""
    stack = default_build(_names(40))
    assert stack.layers[-1].bottom_mm == pytest.approx(40 * 0.035 + 39 * 0.02)
    assert "40 layers and 2.18 mm" in stack.assumptions[0]


def test_default_build_of_four_layers_is_thin_outside() -> None:
    """Outer dielectrics of 0.2 mm, the core takes the rest; and it says that this is assumed."""
    stack = default_build(_names(4))
    assert [stack.height_mm(n, n + 1) for n in (1, 2, 3)] == [0.2, 1.06, 0.2]
    assert "--stack" in stack.assumptions[0]


def test_height_is_between_facing_surfaces_in_either_order() -> None:
    """Two dielectrics and the copper between: 0.2 + 0.035 + 1.06 mm."""
    stack = default_build(_names(4))
    assert stack.height_mm(1, 3) == stack.height_mm(3, 1) == pytest.approx(1.295)


def test_stack_file_sets_every_height() -> None:
    """What the file says is what the stack holds, and nothing is assumed."""
    text = """
[[copper]]
name = "top"
copper_um = 18
below_mm = 0.11
below_er = 3.9
[[copper]]
name = "inner"
below_mm = 1.2
polarity = "negative"
[[copper]]
"""
    entries = read_stack_file(text, "stack.toml")
    stack = from_entries(entries, ["a", "b", "c"], "stack.toml")
    assert [layer.name for layer in stack.layers] == ["top", "inner", "c"]
    assert stack.height_mm(1, 2) == pytest.approx(0.11)
    assert stack.layers[1].top_mm == pytest.approx(0.128)
    assert stack.layers[0].er_below == 3.9
    assert [entry.negative for entry in entries] == [None, True, None]
    assert stack.assumptions == ()


@pytest.mark.parametrize(
    ("text", "place", "said"),
    [
        ("copper = [", "stack.toml", "is not TOML"),
        ("", "stack.toml", "no [[copper]] table"),
        ("copper = 3", "stack.toml", "no [[copper]] table"),
        ('board = "x"\n' + TWO, "stack.toml", "unknown key 'board'"),
        (TWO.replace("below_mm", "bellow"), "stack.toml: [[copper]] 1", "unknown key 'bellow'"),
        (TWO.replace("below_mm = 1.5", ""), "stack.toml: [[copper]] 1", "below_mm is missing"),
        (TWO.replace("1.5", "0.001"), "stack.toml: [[copper]] 1", "below_mm = 0.001"),
        (TWO.replace("1.5", "true"), "stack.toml: [[copper]] 1", "below_mm = True"),
        (TWO.replace("1.5", "nan"), "stack.toml: [[copper]] 1", "below_mm = nan"),
        (TWO.replace("1.5", '"1.5"'), "stack.toml: [[copper]] 1", "below_mm = '1.5'"),
        (TWO + 'polarity = "dark"', "stack.toml: [[copper]] 2", "polarity 'dark'"),
        (TWO + "copper_um = 0", "stack.toml: [[copper]] 2", "copper_um = 0"),
        (TWO + "below_er = 0.5", "stack.toml: [[copper]] 2", "below_er = 0.5"),
    ],
)
def test_faulty_stack_file_is_refused_at_its_place(text: str, place: str, said: str) -> None:
    """The message names file and table, says what is wrong, and what to do."""
    with pytest.raises(SplitcheckError) as caught:
        read_stack_file(text, "stack.toml")
    assert caught.value.place == place
    assert said in caught.value.wrong
    assert caught.value.do


def test_stack_file_for_another_number_of_layers_is_refused() -> None:
    """Both numbers are in the message."""
    entries = read_stack_file(TWO, "stack.toml")
    with pytest.raises(SplitcheckError, match=r"has 2 .* but the export has 4 copper layers"):
        from_entries(entries, _names(4), "stack.toml")


def _job(*rows: str) -> jobfile.Job:
    return jobfile.read('{"MaterialStackup": [' + ",".join(rows) + "]}", "board.gbrjob")


TOP = '{"Type": "Copper", "Name": "F", "Thickness": 0.018}'
CORE = '{"Type": "Dielectric", "Name": "core", "Thickness": 0.4, "DielectricConstant": 4.1}'
MASK = '{"Type": "SolderMask", "Name": "mask", "Thickness": 0.01}'
BOTTOM = '{"Type": "Copper", "Name": "B"}'


def test_job_file_gives_heights_and_permittivity() -> None:
    """Two dielectrics in a row add up; the solder mask counts for nothing."""
    stack = from_job(_job(MASK, TOP, CORE, CORE, BOTTOM, MASK), ["F", "B"])
    assert stack is not None
    assert stack.height_mm(1, 2) == pytest.approx(0.8)
    assert (stack.layers[0].copper_um, stack.layers[0].er_below) == (18.0, 4.1)
    assert stack.layers[1].copper_um == 35.0


@pytest.mark.parametrize(
    "rows",
    [
        (),
        (TOP, BOTTOM),
        (TOP, '{"Type": "Dielectric", "Name": "core"}', BOTTOM),
        (TOP, CORE, BOTTOM, CORE, BOTTOM),
    ],
)
def test_job_file_without_every_thickness_gives_no_stack(rows: tuple[str, ...]) -> None:
    """Better a default build that says so than half of one."""
    assert from_job(_job(*rows), ["F", "B"]) is None
