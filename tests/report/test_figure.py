"""Figures of findings: well-formed, safe, the same every time, and shown by notebooks."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest

from splitcheck import road
from splitcheck.cli.entry import run
from splitcheck.errors import SplitcheckError
from splitcheck.report import charts, figure, pngfile
from splitcheck.report.indepth import of_finding, of_net
from splitcheck.report.sketch import LEGEND, sketch
from splitcheck.verdict.closeup import LINES
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.views import FindingView, ImpedanceView
from tests.report.made import finding, pump

Capture = pytest.CaptureFixture[str]

#: A slot of 8 by 2 mm across a trace along x, as a picture knows it.
VIEW = FindingView(
    id="F1",
    window_mm=(-10.0, -6.0, 10.0, 6.0),
    gaps=(((((-1.0, -4.0), (1.0, -4.0), (1.0, 4.0), (-1.0, 4.0))),),),
    crossed=(((((-1.0, -4.0), (1.0, -4.0), (1.0, 4.0), (-1.0, 4.0))),),),
    foreign=(),
    islands=(("GND", (-6.0, 4.0)),),
    runs=(((-1.0, 0.0), (1.0, 0.0)),),
    own=(),
    others=(),
    ways=(),
    whole=None,
    broken=None,
    impedance=ImpedanceView((1.0, 1000.0), (0.001, 0.1), (0.002, 0.4), 50.0),
    fed_mm=None,
    facts=(("Which plane", "Inner 1, 0.2 mm from the trace"),),
)


def words(svg: str) -> str:
    """All that is written in a figure, as an XML reader understands it."""
    return " ".join(node.text or "" for node in ET.fromstring(svg).iter())


def test_a_figure_is_xml_and_says_what_it_shows() -> None:
    """Net, cost with its error, place, reason."""
    shown = words(figure.render(finding(1, "CLK"), VIEW))
    for part in (
        "CLK",
        "+3.21 \u00b10.64 nH",
        "x 12.300 y 45.100 mm",
        "35 mm long",
        "corner 50 kHz",
    ):
        assert part in shown


@pytest.mark.parametrize(
    "name",
    ["<script>alert(1)</script>", 'a"b&c', "]]>", "\x00\x1b[31m", "\ud800", "\ufffe", "&#0;"],
)
def test_names_cannot_break_a_figure(name: str) -> None:
    """Whatever a file calls a net, the figure stays XML without a script."""
    svg = figure.render(finding(1, name, plane_net=name), replace(VIEW, islands=((name, (0, 0)),)))
    root = ET.fromstring(svg)
    assert not [node for node in root.iter() if node.tag.endswith("script")]


def test_a_figure_needs_nothing_else() -> None:
    """No address but that of its own language, no variable that only a page knows."""
    svg = figure.render(finding(1, "CLK"), VIEW)
    assert set(re.findall(r"https?://[^\"' ]+", svg)) == {"http://www.w3.org/2000/svg"}
    assert "var(" not in svg


def test_notebooks_show_a_figure_by_themselves() -> None:
    """By the method that they look for."""
    shown = figure.Figure(finding(1, "CLK"), VIEW)
    assert shown._repr_svg_() == shown.svg() == figure.render(shown.finding, VIEW)


def test_a_figure_becomes_a_picture() -> None:
    """PNG, two pixels a unit."""
    pytest.importorskip("resvg_py")
    svg = figure.render(finding(1, "CLK"), VIEW)
    png = pngfile.render(svg)
    assert png.startswith(b"\x89PNG")
    assert int.from_bytes(png[16:20]) == 2 * 1200


def test_without_the_library_a_picture_says_what_to_install(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """And that SVG needs none."""
    monkeypatch.setitem(__import__("sys").modules, "resvg_py", None)
    with pytest.raises(SplitcheckError, match=r"splitcheck\[png\]"):
        pngfile.render("<svg/>")


def test_bars_hold_value_and_error() -> None:
    """The whisker reaches from value less error to value and error, on one scale."""
    shown = charts.bars_of(finding(1, "CLK", added_nh=4.0, error_nh=1.0))
    assert [(bar.value, bar.error) for bar in shown] == [(4.0, 1.0)]
    svg, _, _ = charts.bars(shown)
    low, high = re.search(r"M([\d.]+) \d+v12m0-6H([\d.]+)m", svg).groups()  # type: ignore[union-attr]
    wide = float(re.search(r'width="([\d.]+)" height="20"', svg).group(1))  # type: ignore[union-attr]
    assert (float(low) - 190) / wide == pytest.approx(3 / 4, abs=0.01)
    assert (float(high) - 190) / wide == pytest.approx(5 / 4, abs=0.01)


def test_the_sketch_shows_slot_and_trace() -> None:
    """Copper all round a hole, and the run across it."""
    lines = sketch(VIEW)
    assert {char for line in lines for char in line} <= set(". =X-*o")
    assert all(sign in LEGEND for sign in ".=X-*o")
    middle = lines[len(lines) // 2]
    assert "X" in middle
    assert middle.strip().startswith(".")
    above = lines[len(lines) // 4 + 1]
    assert re.fullmatch(r"\.+ +\.+", above)


def test_in_depth_tells_numbers_reasons_and_assumptions() -> None:
    """All of it, in 80 columns."""
    report = pump()
    row = replace(report.findings[0], corner_khz=48.0, stray_db=6.5, estimated_nh=1.0)
    text = of_finding(report, row, VIEW, width=80, color=False)
    for part in ("3.21 +-0.64 nH", "129 mV", "48.0 kHz", "+6.5 dB", "closed forms say 1.00 nH"):
        assert part in text
    for part in ("Which plane: Inner 1", "pump-top.gbr:118", "Why it counts", "never bridge one"):
        assert part in text
    assert all(assumption[:40] in text for assumption in report.assumptions)
    assert max(map(len, text.splitlines())) <= 80


def test_the_journey_of_a_net_is_told() -> None:
    """Each leg with its length and plane."""
    report = pump()
    text = of_net(report.nets[0], report.findings, width=80, color=False)
    assert "BUS0: 41.2 mm, 1 finding" in text
    assert re.search(r"0\.0 +41\.2 +F1 +Top +Inner 1 +3\.21", text)


def test_show_on_the_demo_board(tmp_path: Path, capsys: Capture) -> None:
    """A finding with its figure; its net; and what to do about a name that is neither."""
    demo = str(road.fixtures_folder() / "demo")
    file = tmp_path / "f1.svg"
    assert run(["show", "f1", demo, "--jobs", "1", "--out", f"svg={file}"]) == 0
    text = capsys.readouterr().out
    assert text.startswith("F1  ")
    assert "X" in text
    svg = file.read_text(encoding="utf-8")
    assert "return current" in words(svg)
    streams = re.findall(r'<path d="([^"]*)" class="st"', svg)
    assert len(streams) == 2
    assert streams[0].count("M") >= LINES - 2
    net = text.split("  ", 1)[1].split(":")[0]
    assert run(["show", net, demo, "--jobs", "1"]) == 0
    assert "Journey" in capsys.readouterr().out
    assert run(["show", net + "x", demo, "--jobs", "1"]) == 2
    said = capsys.readouterr().err
    assert said.count("\n") == 1
    assert f"try {net}" in said or net in said
    bare = next(f.id for f in _findings(demo) if f.kind == "no-plane")
    assert run(["show", bare, demo, "--jobs", "1"]) == 0
    assert "No layer has reference copper" in " ".join(capsys.readouterr().out.split())
    assert run(["show", bare, demo, "--jobs", "1", "--out", f"svg={file}"]) == 2
    assert "no gap to draw" in capsys.readouterr().err


def _findings(board: str) -> tuple[Finding, ...]:
    return road.rank(Path(board), road.Options(jobs=1)).findings
