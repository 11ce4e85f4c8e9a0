"""Files of rules, each value checked for itself, and what is wrong with it told with its line."""

from __future__ import annotations

from dataclasses import fields
from datetime import date

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.errors import SplitcheckError
from splitcheck.verdict.rules import Class
from splitcheck.verdict.rulesfile import read_rules

WHOLE = """
reference = ["PE", "SHIELD*"]
supply_reference = "forbidden"
capacitors = ["X7"]

[plane_change]
within_mm = 2
warning_nh = 0.3

[edge_run]
heights = 3
mm = 1

[class.camera]
about = "the camera's lanes"
like = "lvds"
words = ["CAM_D#_P", "CAM_D#_N"]
rise_ns = 0.4
error_nh = 3
warning_nh = 1
change_mm = 0.8
source = "data sheet of the sensor, table 9"

[nets]
SCK = "spi"
"LED_*" = { class = "gpio", rise_ns = 2.5, current_ma = 12 }

[[capacitor]]
ref = "C99"
pads_mm = [[1, 2], [3, 4]]
side = "bottom"

[[pair]]
nets = ["RX_A", "RX_B"]

[[waive]]
net = "SYNC*"
kind = "slot-crossing"
at_mm = [10, 20.5]
reason = "isolation barrier,  see the safety file"
until = 2031-12-31

[[waive]]
fingerprint = "00ff"
reason = "measured"
until = "2031-12-30"
"""


def test_every_key_is_read() -> None:
    """One file with all of them."""
    read = read_rules(WHOLE, "splitcheck.toml")
    assert [one.text for one in read.references] == ["PE", "SHIELD*"]
    assert (read.supply_reference, [one.text for one in read.capacitors]) == ("forbidden", ["X7"])
    assert dict(read.numbers) == {
        "change_mm": 2.0, "change_warning_nh": 0.3, "edge_heights": 3.0, "edge_mm": 1.0,
    }  # fmt: skip
    (camera,) = read.classes
    assert (camera.name, camera.like, camera.place) == ("camera", "lvds", "splitcheck.toml:14")
    assert dict(camera.changes) == {
        "words": ("CAM_D#_P", "CAM_D#_N"), "rise_ns": 0.4, "error_nh": 3.0, "warning_nh": 1.0,
        "change_mm": 0.8, "source": "data sheet of the sensor, table 9",
    }  # fmt: skip
    told = [(one.key, one.net_class, one.rise_ns, one.current_ma) for one in read.assignments]
    assert told == [("SCK", "spi", None, None), ("LED_*", "gpio", 2.5, 12.0)]
    assert read.assignments[1].source.line == 26
    (placed,) = read.placed
    assert (placed.ref, placed.pads_mm, placed.top) == ("C99", ((1.0, 2.0), (3.0, 4.0)), False)
    assert [pair.nets for pair in read.pairs] == [("RX_A", "RX_B")]
    one, other = read.waivers
    assert (one.net, one.kind, one.at_mm, one.radius_mm) == (
        "SYNC*", "slot-crossing", (10.0, 20.5), 2.0,
    )  # fmt: skip
    assert one.reason == "isolation barrier, see the safety file"
    assert (one.until, one.source.line) == (date(2031, 12, 31), 36)
    assert (other.fingerprint, other.until) == ("00ff", date(2031, 12, 30))


def test_an_empty_file_says_nothing() -> None:
    """And is no fault."""
    read = read_rules("# nothing yet\n", "splitcheck.toml")
    assert (read.classes, read.waivers, read.numbers) == ((), (), ())


def test_a_class_may_state_every_number_that_a_class_has() -> None:
    """The fields of the class and the keys of the file are the same words."""
    numbers = [one.name for one in fields(Class) if one.name.endswith(("_ns", "_mv", "_ohm"))]
    numbers += [one.name for one in fields(Class) if one.name.endswith(("_nh", "_mm"))]
    assert len(numbers) == 10
    for name in numbers:
        read = read_rules(f"[class.x]\n{name} = 7", "splitcheck.toml")
        assert read.classes[0].changes == ((name, 7.0),)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("refrence = []", '1: unknown key "refrence"; did you mean reference'),
        ("[class.x]\nrise = 1", '2: unknown key "rise": this quantity is in ns; write rise_ns = 1'),
        (
            "[class.x]\nrise_ps = 500",
            '2: unknown key "rise_ps": this quantity is in ns; write rise_ns = 0.5',
        ),
        (
            "[class.x]\n\nwave_v = 3.3",
            '3: unknown key "wave_v": this quantity is in mv; write wave_mv = 3300',
        ),
        (
            "[plane_change]\nwithin_mil = 50",
            '2: unknown key "within_mil": this quantity is in mm; write within_mm = 1.27',
        ),
        (
            '[class.x]\nrise_ns = "500ps"',
            '2: rise_ns = "500ps" is a text; write rise_ns = 0.5: the unit, ns, is in the key',
        ),
        (
            '[class.x]\nrise_ns = "1 ns"',
            '2: rise_ns = "1 ns" is a text; write rise_ns = 1: the unit, ns, is in the key',
        ),
        (
            '[class.x]\nrise_ns = "fast"',
            '2: rise_ns = "fast" is a text; give a number without quotes, in ns',
        ),
        ("[class.x]\nrise_ns = 0", "2: rise_ns = 0; give a number from 0.001 to 100000, in ns"),
        ("[class.x]\nrise_ns = -1", "2: rise_ns = -1; give a number from 0.001 to 100000, in ns"),
        ("[class.x]\nrise_ns = nan", "2: rise_ns = nan; give a number from 0.001"),
        ("[class.x]\nrise_ns = true", "2: rise_ns = True; give a number from 0.001"),
        ("[class.x]\nexempt = 1", "2: exempt = 1; write true or false"),
        (
            "[class.x]\nwarning_mv = 9\nerror_mv = 3",
            "2: warning_mv = 9 is more than error_mv = 3; a warning begins below an error",
        ),
        ("[class.x]\nwords = 3", '2: words = 3; write words = ["one", "another"]'),
        ("[class.x]\nwords = ['']", "2: words = ['']"),
        ("class = 3", "1: class = 3 is no table; write [class] and its keys below"),
        ('supply_reference = "forbiden"', '1: supply_reference = "forbiden"; did you mean forbid'),
        ("[nets]\nSCK = 3", '2: "SCK" = 3; write the name of a class, or { class = "spi"'),
        ("[nets]\nSCK = { klass = 'spi' }", '2: unknown key "klass"; did you mean class'),
        (
            "[nets]\nSCK = { rise_us = 2 }",
            '2: unknown key "rise_us": this quantity is in ns; write rise_ns = 2000',
        ),
        ("[[pair]]\nnets = ['A']", "2: a pair of 1 nets"),
        ("[[pair]]\nnets = ['A', 'A']", "2: a pair of 1 nets"),
        ("pair = 3", "1: pair is not a list of tables; write [[pair]] for each"),
        ("[[waive]]\nnet = 'A'", "1: a waiver without a reason"),
        ("[[waive]]\nreason = 'b'", "1: a waiver of everything"),
        ("[[waive]]\nnet = 'A'\nreason = ''", '3: reason = ""; give a text'),
        (
            "[[waive]]\nnet = 'A'\nreason = 'b'\nuntil = '2031-02-30'",
            '4: until = "2031-02-30" is no day; write until = "2030-12-31": year-month-day',
        ),
        ("[[waive]]\nreason = 'b'\nnet = 'A'\nuntil = 2031", "4: until = 2031 is no day"),
        (
            "[[waive]]\nreason = 'b'\nnet = 'A'\nuntil = 2031-01-01T00:00:00",
            "4: until = 2031-01-01T00:00:00 is no day",
        ),
        (
            "[[waive]]\nreason = 'b'\nkind = 'slot'",
            '3: kind = "slot"; it is one of slot-crossing, void-crossing',
        ),
        (
            "[[waive]]\nreason = 'b'\nat_mm = [1]",
            "3: at_mm = [1] is no place; write at_mm = [x, y]",
        ),
        ("[[waive]]\nreason = 'b'\nnet = 'A'\nradius_mm = 1", "4: radius_mm without a place"),
        ("[[capacitor]]\npads_mm = [[1, 2]]", "2: a capacitor has two pads at two places"),
        ("[[capacitor]]\npads_mm = [1, 2]", "2: pads_mm = [1, 2] are no places"),
        (f"reference = ['{'x' * 121}']", "1: a name or pattern of 121 characters"),
        (f"[class.x]\nsource = '{'x' * 1001}'", "2: source has 1001 characters"),
        ("a = 'b", "1: is not TOML"),
    ],
)
def test_faults_are_told_with_file_and_line(text: str, said: str) -> None:
    """Place, what is wrong, what to do; never a traceback."""
    with pytest.raises(SplitcheckError) as caught:
        read_rules(text, "splitcheck.toml")
    assert str(caught.value).startswith(f"splitcheck.toml:{said}")
    assert "; " in str(caught.value)


_words = st.sampled_from(
    ["class", "nets", "waive", "pair", "reference", "rise_ns", "net", "at_mm", "until", "x"]
)
_values = st.recursive(
    st.one_of(st.none(), st.integers(), st.floats(), st.booleans(), st.text(max_size=9)),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3), st.dictionaries(_words, inner, max_size=3)
    ),
    max_leaves=6,
)


def _written(value: object) -> str:
    if isinstance(value, dict):
        return "{" + ", ".join(f"{key} = {_written(one)}" for key, one in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(_written(one) for one in value) + "]"
    if isinstance(value, str):
        return "'" + "".join(letter for letter in value if letter.isalnum()) + "'"
    return str(value).lower() if value is not None else "2030-01-01"


@given(st.dictionaries(_words, _values, max_size=3))
def test_anything_is_read_or_refused_in_one_sentence(data: dict[str, object]) -> None:
    """Any data under our keys: no other error than ours, and that in one line of plain letters."""
    text = "\n".join(f"{key} = {_written(value)}" for key, value in data.items())
    try:
        read_rules(text, "splitcheck.toml")
    except SplitcheckError as error:
        said = str(error)
        assert said.startswith("splitcheck.toml")
        assert "\n" not in said
        assert said.isascii()
