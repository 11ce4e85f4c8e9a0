"""The page as text: the same bytes every time, no way out for names, small, and well coloured."""

from __future__ import annotations

import os
import re
from itertools import product
from pathlib import Path

import pytest

from splitcheck import road
from splitcheck.cli.entry import run
from splitcheck.errors import SplitcheckError
from splitcheck.report import drawing, htmlpage
from splitcheck.report.drawing import DARK, LIGHT
from splitcheck.verdict.findings import Report
from splitcheck.verdict.views import Pictures

#: Contrast that text and graphics need: WCAG 2.2, 1.4.3 (AA) and 1.4.11.
TEXT, GRAPHIC = 4.5, 3.0
#: The largest page that may be written, bytes.
LARGEST = 5_000_000


def lightness(colour: str) -> float:
    """Relative luminance (WCAG 2.2, definition)."""
    parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Contrast ratio (WCAG 2.2, definition)."""
    lighter, darker = sorted((lightness(one), lightness(other)), reverse=True)
    return (lighter + 0.05) / (darker + 0.05)


def test_black_on_white_has_the_largest_contrast() -> None:
    """21 to 1 (WCAG 2.2)."""
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)


@pytest.mark.parametrize("colours", [LIGHT, DARK], ids=["light", "dark"])
def test_text_can_be_read(colours: dict[str, str]) -> None:
    """Every colour of letters on every paper it stands on."""
    inks, papers = ("ink", "muted", "error", "warning", "note"), ("paper", "panel")
    pairs = [*product(inks, papers), ("ink", "chosen"), ("ink", "copper"), ("stream", "paper")]
    pairs += [("error", "chosen"), ("warning", "chosen"), ("note", "chosen"), ("muted", "chosen")]
    for ink, paper in pairs:
        assert contrast(colours[ink], colours[paper]) >= TEXT, (ink, paper)


@pytest.mark.parametrize("colours", [LIGHT, DARK], ids=["light", "dark"])
def test_drawings_can_be_seen_without_their_hue(colours: dict[str, str]) -> None:
    """Lines on copper and where there is none; by lightness alone, so in print and to every eye."""
    for line in ("stream", "way", "trace", "mend"):
        for ground in ("copper", "void"):
            assert contrast(colours[line], colours[ground]) >= GRAPHIC, (line, ground)
    for line in ("hatch", "rule", "way", "mend", "stream"):
        assert contrast(colours[line], colours["paper"]) >= GRAPHIC, line


def test_both_papers_have_the_same_colours() -> None:
    """No name is missing on either."""
    assert LIGHT.keys() == DARK.keys()


def test_the_same_board_makes_the_same_bytes(demo: tuple[Report, Pictures]) -> None:
    """Drawn twice from the files on."""
    options = road.Options(jobs=1)
    walked = road.look(road.fixtures_folder() / "demo", options)
    again = road.illustrate(walked, options)
    assert htmlpage.render(again[0], None, again[1]) == htmlpage.render(demo[0], None, demo[1])


def test_nothing_on_it_leads_outside(page: Path) -> None:
    """No address but those that name a language of drawings."""
    text = page.read_text(encoding="utf-8")
    addresses = set(re.findall(r"https?://[^\s\"'<>)]+", text))
    assert addresses == {"http://www.w3.org/2000/svg"}
    assert not re.search(r"<(link|img|iframe|object|embed|base)\b", text)
    assert not re.search(r"\son\w+=", text.split('<script type="application/json"')[0])
    assert not re.search(r"\sstyle=", text)


def test_hostile_names_cannot_end_what_they_stand_in(hostile: tuple[Report, Pictures]) -> None:
    """Three scripts are opened and closed, ours all; no name opens an element."""
    text = htmlpage.render(hostile[0], None, hostile[1])
    assert text.count("<script") == text.count("</script>") == 3
    assert "<img" not in text
    assert "onload=window" not in re.sub(
        r"&lt;svg onload=window|\\u003csvg onload=window", "", text
    )
    assert "\u2028" not in text
    assert "\u202e" not in text


def test_a_report_alone_cannot_be_drawn(demo: tuple[Report, Pictures]) -> None:
    """It holds no shapes."""
    with pytest.raises(SplitcheckError, match="holds no shapes to draw"):
        htmlpage.render(demo[0])


def test_what_is_left_out_is_said(demo: tuple[Report, Pictures], page: Path) -> None:
    """How many are drawn from near, and how coarsely the map is."""
    text = " ".join(page.read_text(encoding="utf-8").split())
    _, pictures = demo
    assert f"{len(pictures.findings)} of {len(demo[0].findings)} findings are drawn" in text
    assert f"was looked for in {pictures.with_streams} of them" in text


def test_paths_hold_the_shape() -> None:
    """Read back, the corners are where they were, to one unit of the drawing."""
    frame = drawing.Frame((0.0, 0.0, 30.0, 20.0), 3000)
    line = ((1.0, 2.0), (4.25, 2.5), (4.25, 19.0), (29.99, 0.01))
    data = frame.path([line])
    start, steps = re.match(r"M(\d+ \d+)l(.*)", data).groups()  # type: ignore[union-attr]
    x, y = map(int, start.split())
    found = [(x, y)]
    numbers = [int(n) for n in re.findall(r"-?\d+", steps)]
    for right, down in zip(numbers[::2], numbers[1::2], strict=True):
        x, y = x + right, y + down
        found.append((x, y))
    assert found == [(round(100 * a), round(100 * (20 - b))) for a, b in line]


def largest_board() -> Path:
    """The real board with the most bytes, if there are any."""
    folder = os.environ.get("SPLITCHECK_CORPUS")
    if not folder:
        pytest.skip("no real boards: SPLITCHECK_CORPUS is not set")
    boards = [board for board in Path(folder).iterdir() if board.is_dir()]
    return max(
        boards, key=lambda board: sum(f.stat().st_size for f in board.rglob("*") if f.is_file())
    )


@pytest.mark.slow
def test_the_page_of_the_largest_board_is_small() -> None:
    """Under 5 MB, whatever there is to draw."""
    options = road.Options()
    walked = road.look(largest_board(), options)
    text = htmlpage.render(walked.report, None, road.picture(walked, options))
    assert len(text.encode()) < LARGEST


def test_rank_writes_the_page(tmp_path: Path, page: Path) -> None:
    """From the command line, the same bytes as from Python."""
    file = tmp_path / "demo.html"
    demo = str(road.fixtures_folder() / "demo")
    assert run(["rank", demo, "-q", "--jobs", "1", "--out", f"html={file}"]) == 1
    assert file.read_bytes() == page.read_bytes()


def test_what_reads_no_findings_writes_no_page(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Said before the work, not after it."""
    demo = str(road.fixtures_folder() / "demo")
    assert run(["read", demo, "--out", f"html={tmp_path / 'x.html'}"]) == 2
    assert 'no format "html"' in capsys.readouterr().err
