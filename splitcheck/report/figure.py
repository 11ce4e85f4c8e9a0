"""One finding in, a figure of its own out: an SVG file that needs nothing beside it."""

from __future__ import annotations

from dataclasses import dataclass

from splitcheck.report import charts, closeups
from splitcheck.report.drawing import LIGHT, Frame, element, joined, resolved, rows, text
from splitcheck.report.sentences import cost, paragraph, place
from splitcheck.report.words import shorten
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.views import FindingView

_WIDE = 1200
_GAP = 24

_STYLE = """
.paper{fill:var(--paper)}
.h{fill:var(--ink);font:bold 26px sans-serif}
.p{fill:var(--ink);font:16px sans-serif}
.m{fill:var(--muted);font:15px sans-serif}
"""


@dataclass(frozen=True, slots=True)
class Figure:
    """A finding as a picture; notebooks show it by themselves.

    Examples
    --------
    ``Figure(finding, walked_pictures.of("F1"))`` at the end of a cell shows it, and
    ``Path("f1.svg").write_text(figure.svg())`` keeps it.
    """

    finding: Finding
    view: FindingView

    def svg(self) -> str:
        """The figure as the text of an SVG file."""
        return render(self.finding, self.view)

    def _repr_svg_(self) -> str:
        return self.svg()


def render(finding: Finding, view: FindingView) -> str:
    """Draw a finding: both panels, its numbers with error bars, and both impedances.

    Returns
    -------
    The text of an SVG file, on white; names from files are escaped.
    """
    parts: list[str] = []
    y = 44
    price = cost(finding).replace("+-", "\u00b1")
    head = f"{finding.id}  {shorten(finding.net, 50)}: {price}"
    parts.append(element("text", text(head), x=_GAP, y=y, cls="h"))
    y += 28
    parts.append(element("text", text(f"{finding.kind}, {place(finding)}"), x=_GAP, y=y, cls="m"))
    y += 20
    panel_wide = (_WIDE - 3 * _GAP) // 2
    wide, high = Frame(view.window_mm, closeups.UNITS).size
    scale = min(panel_wide / wide, 640 / high)
    for column, side in enumerate(closeups.SIDES):
        x = _GAP + column * (panel_wide + _GAP)
        inner = element("g", closeups.panel(finding, view, side), clip_path="url(#frame)")
        moved = f"translate({x} {y}) scale({scale:.6f})"
        parts.append(element("g", inner, transform=moved))
        said = closeups.caption(finding, view, side)
        for row, line in enumerate(rows(said, 70)):
            at = y + round(high * scale) + 22 + 20 * row
            parts.append(element("text", text(line), x=x, y=at, cls="p"))
    y += round(high * scale) + 62
    y = _numbers(parts, finding, view, y)
    style = resolved(_STYLE + closeups.STYLE + charts.STYLE, LIGHT)
    frame = element("clipPath", element("rect", width=wide, height=high), id="frame")
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_WIDE} {y + 10}" '
        f'width="{_WIDE}" height="{y + 10}" role="img" aria-label="{text(head)}">\n'
        f"<style>{style}</style>\n{closeups.hatch()}\n{element('defs', frame)}\n"
        f"{element('rect', width=_WIDE, height=y + 10, cls='paper')}\n{joined(parts)}\n</svg>\n"
    )


def _numbers(parts: list[str], finding: Finding, view: FindingView, y: int) -> int:
    """Bars and words on the left, impedances on the right; where the figure ends."""
    left = y
    bars = charts.bars_of(finding)
    if bars:
        inner, _, high = charts.bars(bars)
        parts.append(element("g", inner, transform=f"translate({_GAP} {left})"))
        left += high + 24
    right = y
    if view.impedance is not None:
        inner, wide, high = charts.impedance(view.impedance)
        parts.append(element("g", inner, transform=f"translate({_WIDE - wide - _GAP} {y})"))
        right += high
    for line in rows(paragraph(finding).replace("+-", "\u00b1"), 70 if right > y else 150):
        parts.append(element("text", text(line), x=_GAP, y=left, cls="m"))
        left += 21
    return max(left, right) + 10
