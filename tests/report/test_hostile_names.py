"""Names that anybody can have written into a file: each format carries them and none obeys them."""

from __future__ import annotations

import csv
import html
import io
import json
import re
import unicodedata
from dataclasses import replace
from typing import Any
from xml.etree import ElementTree as ET

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from markdown_it import MarkdownIt

from splitcheck.report import annotations as commands
from splitcheck.report import (
    codequality,
    csvfile,
    gated,
    jsonfile,
    junit,
    markdown,
    readout,
    sarif,
    terminal,
)
from splitcheck.report.words import shorten, visible
from splitcheck.verdict.findings import Report, Source
from tests.report import made
from tests.report.compared import compared

HOSTILE = (
    '"\'<>&"',
    "a\nb\r\nc",
    "::error::pwned",
    "##[error]pwned ##vso[task.setvariable]x",
    "a\n::error file=x,line=1::pwned",
    "%0A::stop-commands::x",
    "=cmd|' /C calc'!A0",
    "+1",
    "-2+3",
    "@SUM(1)",
    "a;=1",
    "'quoted",
    "\t=1",
    "\uff1d1",
    "\u0414\u0410\u041d\u041d\u042b\u0415",
    "\u05d0\u05d1\u05d2",
    "a\u202eb\u2066c",
    "a\x00b\x1b[31m\x07",
    "\ud800",
    "\ufffe\uffff",
    "]]>",
    "<!-- -->",
    "<script>alert(1)</script>",
    "<img src=x onerror=alert(1)>",
    "[a](http://x.example)",
    "![a](http://x.example)",
    "http://x.example www.x.example",
    "a|b|c",
    "`a` *b* _c_ ~~d~~ #1 @somebody :smile: $x$ \\|",
    "</code></details><b>",
    "&lt;b&gt;&#60;",
    "{0} {{1}}",
    "N" * 10_000,
    " ",
    "",
)
names = st.one_of(
    st.sampled_from(HOSTILE),
    st.text(st.characters(codec=None), max_size=60),
    st.text(st.sampled_from("=+-@;'\"<>&|`*_[]()#:%,\n\r\t \\{}!$~ab\u202e\u05d0"), max_size=30),
)
hostile = given(names)


def board(name: str) -> Report:
    """The small report with one name everywhere a file could have put it."""
    pump = made.pump()
    first, *rest = pump.findings
    spoiled = replace(
        first,
        net=name,
        layer=name,
        plane_layer=name,
        plane_net=name,
        source=Source(name, 7),
        reason=f"{name} is cut",
    )
    return replace(
        pump, board=name, findings=(spoiled, *rest), assumptions=(f"{name} is assumed.",)
    )


def is_seen(text: str) -> bool:
    """Whether it holds nothing that moves the cursor, turns the direction or cannot be seen."""
    unseen = {"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"} - {"\u200e"}
    return all(unicodedata.category(c) not in unseen or c == "\u200e" for c in text)


@hostile
def test_sarif_carries_any_name(name: str) -> None:
    """Whole in the properties; in messages neither links nor placeholders."""
    text = sarif.render(board(name))
    assert text.isascii()
    (first, *_) = json.loads(text)["runs"][0]["results"]
    assert first["properties"]["net"] == name
    message = first["message"]["text"]
    assert is_seen(message)
    assert "](" not in message
    assert not re.search(r"(?<!\{)\{\d+\}(?!\})", message)
    uri = first["locations"][0]["physicalLocation"]["artifactLocation"]["uri"]
    assert re.fullmatch(r"(?:[A-Za-z0-9_.~/-]|%[0-9A-F]{2})+", uri)


@hostile
def test_junit_carries_any_name(name: str) -> None:
    """It is well-formed, has as many tests as findings, and shows the name whole."""
    report = board(name)
    root = ET.fromstring(junit.render(report, compared(report)))
    cases = list(root.iter("testcase"))
    assert len(cases) == len(report.findings)
    assert {child.tag for case in cases for child in case} <= {"failure", "system-out", "skipped"}
    titles = [case.get("name") or "" for case in cases]
    shown = visible(name)
    assert any(title.startswith(f"{shown}: slot-crossing on {shown}") for title in titles)


@hostile
def test_code_quality_carries_any_name(name: str) -> None:
    """ASCII, and what is said of it can be seen."""
    text = codequality.render(board(name))
    assert text.isascii()
    (first, *_) = json.loads(text)
    assert first["location"]["path"] == name
    assert is_seen(first["description"])
    assert first["description"].startswith(shorten(name, 60))


def command(line: str) -> tuple[str, dict[str, str], str]:
    """A workflow command as the runner reads it: name, properties, message."""
    found = re.fullmatch(r"::(error|warning|notice) ([^:]*)::(.*)", line)
    assert found is not None, line
    properties = dict(pair.split("=", 1) for pair in found[2].split(","))
    unescaped = {
        key: value.replace("%2C", ",").replace("%3A", ":").replace("%25", "%")
        for key, value in properties.items()
    }
    return found[1], unescaped, found[3].replace("%25", "%")


@hostile
def test_annotations_carry_any_name(name: str) -> None:
    """One command a gap whatever the name is, and the name as it can be seen."""
    report = board(name)
    for comparison in (None, compared(report)):
        lines = commands.render(report, comparison).split("\n")
        assert lines.pop() == ""
        assert len(lines) == (3 if comparison is None else 1)
        kind, properties, message = command(lines[0])
        assert kind == "error"
        assert set(properties) == {"file", "line", "title"}
        assert properties["file"] == visible(name)
        assert properties["line"] == "7"
        assert message.startswith(f"{shorten(name, 60)}: ")
        assert is_seen(message)


OURS = {"code", "/code", "br", "details", "/details", "summary", "/summary", "sub", "/sub"}


@hostile
@example("x" * 57 + "\u05d0" * 10)
def test_markdown_carries_any_name(name: str) -> None:
    """No tag, link or picture but ours after a CommonMark reader has been over it."""
    report = board(name)
    for comparison in (None, compared(report)):
        text = markdown.render(report, comparison)
        page = MarkdownIt("commonmark", {"html": True}).enable(["table", "strikethrough"])
        shown = page.render(text.removeprefix(markdown.MARKER))
        tags = {tag.split()[0] for tag in re.findall(r"<([^>]+)>", shown)}
        tables = {
            "table",
            "thead",
            "tbody",
            "tr",
            "th",
            "td",
            "h3",
            "p",
            "strong",
            "ul",
            "ol",
            "li",
        }
        assert tags <= OURS | tables | {f"/{tag}" for tag in tables}
        assert page.parse(text) is not None
        rows = re.findall(r"<tr>(.*?)</tr>", shown, re.DOTALL)
        assert len({row.count("<td") for row in rows if "<td" in row}) == 1
        codes = [html.unescape(code) for code in re.findall(r"<code>(.*?)</code>", shown)]
        assert shorten(name, 60).strip() in [code.strip() for code in codes]
        for code in re.findall(r"<code>(.*?)</code>", text):
            assert not re.search(r"[@#`*\[\]<>|~$\\]", re.sub(r"&#\d+;", "", code))


@hostile
def test_csv_carries_any_name(name: str) -> None:
    """A cell of its own, no formula, and the name again without the apostrophe before it."""
    rows = list(csv.reader(io.StringIO(csvfile.render(board(name)), newline=""), strict=True))
    assert len(rows) == 7
    net = rows[1][csvfile.COLUMNS.index("net")]
    assert net.replace("'", "") == visible(name).replace("'", "")
    for cell in rows[1]:
        assert not re.match(r"\s*[=+@\uff1d\uff0b\uff0d\uff20]|\s*-(?![0-9.]+$)|[\t\r]", cell)
        assert not re.search(r";\s*[=+\-@]", cell)


@given(st.lists(names, max_size=40), st.integers(0, 2000))
@settings(max_examples=20)
def test_markdown_stays_below_60_kilobytes(found: list[str], more: int) -> None:
    """However long the names and however many the findings, what is left out is counted."""
    pump = made.pump()
    rows = [made.finding(n, name, gap=f"G{n}") for n, name in enumerate(found, 1)]
    rows += [made.finding(n, f"\u05d0{n}" * 20, gap=f"H{n}") for n in range(more)]
    said = tuple(f"{name} {'long ' * 300}" for name in found)
    text = markdown.render(replace(pump, findings=tuple(rows), assumptions=said))
    assert len(text.encode()) < 60_000
    if more > 1000:
        assert "more gaps" in text


def test_annotations_show_the_worst_and_count_the_rest() -> None:
    """Ten of each level, as many as the host shows of one step."""
    levels: tuple[Any, ...] = ("error", "warning", "note")
    rows = [
        made.finding(n + 100 * m, f"N{n}", level=level, gap=f"G{n}{level}")
        for m, level in enumerate(levels)
        for n in range(12)
    ]
    text = commands.render(replace(made.pump(), findings=tuple(rows)))
    lines = text.splitlines()
    assert [line.split(" ")[0] for line in lines[:-1]] == [
        *["::error"] * 10, *["::warning"] * 10, *["::notice"] * 10,
    ]  # fmt: skip
    assert lines[-1].endswith(
        "and 6 more gaps (2 error, 2 warning, 2 note): the summary lists them"
    )


@hostile
@example("::error::pwned")
def test_no_line_of_any_report_is_a_command(name: str) -> None:
    """Whatever is shown in a log: no line begins with two colons, none holds a marked command."""
    report = board(name)
    comparison = compared(report)
    pages = [
        terminal.render(report, top=0, width=80, color=False),
        readout.render(report, top=0, width=80, color=False),
        gated.render(report, comparison=comparison, fail_at="error", top=0, width=80, color=False),
        *(
            module.render(report, comparison)
            for module in (jsonfile, sarif, codequality, junit, markdown, csvfile)
        ),
    ]
    for text in pages:
        for line in text.splitlines():
            assert not line.lstrip().startswith("::")
            assert "##[" not in line
            assert "##vso[" not in line
    for line in commands.render(report, comparison).splitlines():
        assert "##[" not in line
        assert "##vso[" not in line


@pytest.mark.parametrize("render", [commands.render, markdown.render, junit.render])
def test_waived_findings_raise_no_alarm(render: Any) -> None:
    """They are left out, or skipped."""
    pump = made.pump()
    all_waived = tuple(replace(f, waived="known") for f in pump.findings)
    text = render(replace(pump, findings=all_waived))
    assert "::" not in text
    assert "<failure" not in text
    assert "| error |" not in text
