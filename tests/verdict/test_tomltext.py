"""TOML with the lines of its keys."""

from __future__ import annotations

from time import process_time
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.errors import SplitcheckError
from splitcheck.verdict.tomltext import LARGEST_BYTES, read_toml

TEXT = '''# a comment with key = 1
top = 1
"quoted # key" = "a = [ not a table"

[ class . "a.b" ]   # header = with a comment
words = [
  "x",  # = ]
  "y",
]
after = 1
text = """
inside = 2
[not.a.table]
"""
dotted.key.here = { in.line = [1, 2] }

[[waive]]
reason = 'one \\'
[waive.more]
x = 1
[[waive]]
reason = "two"
[waive.more]
x = 2
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("top",), 2),
        (("quoted # key",), 3),
        (("class", "a.b"), 5),
        (("class", "a.b", "words"), 6),
        (("class", "a.b", "after"), 10),
        (("class", "a.b", "text"), 11),
        (("class", "a.b", "dotted", "key", "here"), 15),
        (("class", "a.b", "dotted", "key", "here", "in", "line"), 15),
        (("waive",), 17),
        (("waive", 0), 17),
        (("waive", 0, "reason"), 18),
        (("waive", 0, "more", "x"), 20),
        (("waive", 1), 21),
        (("waive", 1, "reason"), 22),
        (("waive", 1, "more", "x"), 24),
        (("class", "a.b", "missing"), 5),
        (("nothing",), 1),
    ],
)
def test_every_key_has_its_line(path: tuple[str | int, ...], line: int) -> None:
    """Counted by hand in the text above; what has no line has that of what it is in."""
    read = read_toml(TEXT, "x.toml")
    assert read.line(*path) == line
    assert read.place(*path) == f"x.toml:{line}"


def test_nothing_inside_values_is_taken_for_a_key() -> None:
    """Strings, comments and brackets hold what looks like keys and headers."""
    known = {path[-1] for path in read_toml(TEXT, "x.toml").lines}
    assert not known & {"inside", "not", "a", "table", "key = 1"}


_keys = st.text("abZ_-.\"' #=[]\u00e9", min_size=1, max_size=6)
_values = st.one_of(
    st.integers(-9, 9), st.booleans(), st.text("ab=[]{}#'\"\\\n", max_size=8),
    st.lists(st.text("=[]#\n", max_size=3), max_size=3),
)  # fmt: skip


def _quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"').replace("\n", "\\n")
    return f'"{escaped}"'


def _written(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return _quoted(value)
    if isinstance(value, list):
        return "[\n" + "".join(f"  {_quoted(one)}, # ] =\n" for one in value) + "]"
    return str(value)


@given(st.dictionaries(_keys, st.dictionaries(_keys, _values, max_size=3), max_size=4))
def test_lines_are_where_the_writer_put_the_keys(tables: dict[str, dict[str, Any]]) -> None:
    """Any names, any values: a writer that counts its own lines agrees."""
    written: list[str] = []
    expected: dict[tuple[str, ...], int] = {}

    def put(text: str) -> int:
        line = sum(one.count("\n") for one in written) + 1
        written.append(text + "\n")
        return line

    for name, table in tables.items():
        put("# [comment]")
        expected[name,] = put(f"[{_quoted(name)}]")
        for key, value in table.items():
            expected[name, key] = put(f"{_quoted(key)} = {_written(value)}")
    read = read_toml("".join(written), "x.toml")
    assert read.data == tables
    for path, line in expected.items():
        assert read.line(*path) == line, path


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("a = \n", "x.toml:1: is not TOML"),
        ("a = 1\na = 2\n", "x.toml:2: is not TOML"),
        ("a = 1\n\n[b\n", "x.toml:3: is not TOML"),
        ("a = [1,", "x.toml:1: is not TOML"),
        ("a = " + "[" * 5000, "x.toml: brackets are nested too deep"),
        ("a = " + "9" * 5000, "x.toml:1: is not TOML"),
        ("a." * 5000 + "b = 1", "x.toml:1: a line with more than 200 dots"),
        ("#" * (LARGEST_BYTES + 1), "x.toml: has 1000001 characters"),
    ],
)
def test_faults_are_told_with_their_line(text: str, said: str) -> None:
    """Never a traceback, whatever the text."""
    with pytest.raises(SplitcheckError) as caught:
        read_toml(text, "x.toml")
    assert str(caught.value).startswith(said)


@pytest.mark.parametrize(
    "text",
    [
        "a" + " " * (LARGEST_BYTES - 10) + "=1",
        "\n".join(f"k{i} = [1, {{ a = 'x' }}]" for i in range(30_000)),
        "a = '''" + "\n=" * 400_000 + "'''",
        "[" + '"a b".' * 190 + "c]\n" + "\n".join(f"k{i} = 1" for i in range(30_000)),
    ],
)
def test_large_files_are_read_in_little_time(text: str) -> None:
    """No text of the largest size takes more than some seconds."""
    start = process_time()
    read_toml(text, "x.toml")
    assert process_time() - start < 15.0
