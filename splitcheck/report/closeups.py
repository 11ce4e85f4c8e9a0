"""A finding seen from near in, its panels as SVG text out: plane, gap, trace, return current."""

from __future__ import annotations

from typing import Literal, TypeAlias

from splitcheck.report.drawing import Frame, element, filled, joined, name, nice_mm, text
from splitcheck.report.words import number
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.views import FindingView, StreamView, TraceView

Side: TypeAlias = Literal["whole", "broken"]

SIDES: tuple[Side, ...] = ("whole", "broken")

#: Length of the larger side of a panel in its drawing.
UNITS = 2000
#: Height of letters, and thickness of thin lines, in the same.
LETTER, THIN = 58, 5
_MOST_LABELS = 6
_FED = "It is let in and out where the trace was followed to; a gap right there is left to itself."

#: How everything in a panel looks; the colours are variables of the page or written out.
STYLE = """
.cu{fill:var(--copper)}
.gap{fill:var(--void);stroke:var(--copper-rim);stroke-width:3}
.cut{fill:url(#hatch);stroke:var(--ink);stroke-width:6}
.hatch{stroke:var(--hatch);stroke-width:5}
.fo{fill:var(--foreign)}
.st{fill:none;stroke:var(--stream);stroke-width:6;stroke-linejoin:round}
.tr,.tro,.run{fill:none;stroke-linecap:round;stroke-linejoin:round}
.tr{stroke:var(--trace);opacity:.45}
.tro{stroke:var(--beside);opacity:.4}
.mid{fill:none;stroke:var(--trace);stroke-width:8}
.run{stroke:var(--trace);stroke-width:18}
.way{fill:none;stroke:var(--way);stroke-width:15;stroke-dasharray:44 22;stroke-linejoin:round}
.way2{fill:none;stroke:var(--way);stroke-width:8;stroke-dasharray:10 22}
.ring{fill:var(--paper);stroke:var(--way);stroke-width:12}
.mend{fill:none;stroke:var(--mend);stroke-width:16}
.mendno{fill:var(--mend);font:bold 62px sans-serif}
.lbl{fill:var(--ink);font:58px sans-serif;paint-order:stroke;stroke:var(--paper);stroke-width:14;
stroke-linejoin:round}
.bar{stroke:var(--ink);stroke-width:10;fill:none}
"""


def hatch() -> str:
    """The pattern that marks the gap in question."""
    line = element("path", d="M0 0v36", cls="hatch")
    return element(
        "defs",
        element(
            "pattern",
            line,
            id="hatch",
            width=36,
            height=36,
            patternUnits="userSpaceOnUse",
            patternTransform="rotate(45)",
        ),
    )


def panel(finding: Finding, view: FindingView, side: Side) -> str:
    """What one panel shows, without the svg element round it.

    Parameters
    ----------
    finding, view
        The finding.
    side
        "whole": the return current, were the plane whole; "broken": as it is.
    """
    frame = Frame(view.window_mm, UNITS)
    wide, high = frame.size
    streams = view.whole if side == "whole" else view.broken
    parts = [element("rect", width=wide, height=high, cls="cu")]
    if side == "broken":
        parts.append(filled(frame.shapes(view.gaps), "gap"))
        parts.append(filled(frame.shapes(view.foreign), "fo"))
        parts.append(filled(frame.shapes(view.crossed), "cut"))
        parts.append(filled(frame.shapes(view.foreign), "fo"))
    parts += [_trace(frame, trace, "tro") for trace in view.others]
    parts += [_trace(frame, trace, "tr") for trace in view.own]
    if streams is not None and streams.lines:
        parts.append(element("path", d=frame.path(streams.lines), cls="st"))
    parts.append(element("path", d=frame.path(trace.line for trace in view.own), cls="mid"))
    if side == "broken":
        parts += _ways(frame, view)
        parts.append(element("path", d=frame.path(view.runs), cls="run"))
        parts += _vias(frame, streams)
        parts += _proposals(frame, finding)
        parts += _labels(frame, view)
    parts.append(_scale(frame, view))
    return joined(parts)


def svg(finding: Finding, view: FindingView, side: Side) -> str:
    """A panel as an element of a page that brings the style sheet and the hatch."""
    wide, high = Frame(view.window_mm, UNITS).size
    title = caption(finding, view, side)
    return (
        f'<svg class="close" viewBox="0 0 {wide} {high}" role="img" aria-label="{text(title)}">'
        f"{panel(finding, view, side)}</svg>"
    )


def caption(finding: Finding, view: FindingView, side: Side) -> str:
    """What a panel shows, in one sentence of our own words."""
    if side == "whole":
        return "If the plane were whole: the return current runs right beneath the trace."
    if view.broken is not None:
        said = "As it is: the return current leaves the trace and goes round what is missing."
        return f"{said} {_FED}" if view.fed_mm is not None else said
    if finding.detour_mm is None:
        return "As it is: the gap cuts the plane in two, and nothing brings the return across."
    return (
        "As it is: the return has to take the dashed way; its lines were not solved here."
        if view.whole is not None
        else "As it is: the gap beneath the trace, and the way round it."
    )


def _trace(frame: Frame, trace: TraceView, cls: str) -> str:
    width = max(frame.length(trace.width_mm), THIN)
    return element("path", d=frame.path([trace.line]), cls=cls, stroke_width=width)


def _ways(frame: Frame, view: FindingView) -> list[str]:
    parts = []
    for way in sorted(view.ways, key=lambda way: way.best):
        cls = "way" if way.best else "way2"
        parts.append(element("path", d=frame.path([way.path]), cls=cls))
    for way in view.ways:
        for x_mm, y_mm in way.bridges if way.best else ():
            x, y = frame.at(x_mm, y_mm)
            parts.append(element("circle", cx=x, cy=y, r=22, cls="ring"))
    return parts


def _vias(frame: Frame, streams: StreamView | None) -> list[str]:
    """Plated holes that carry the return, the larger ones with their part of it."""
    parts = []
    found = sorted(streams.vias if streams is not None else (), key=lambda via: -via[1])
    for place, ((x_mm, y_mm), part) in enumerate(found):
        x, y = frame.at(x_mm, y_mm)
        parts.append(element("circle", cx=x, cy=y, r=round(14 + 22 * part), cls="ring"))
        if place < _MOST_LABELS and part >= 0.05:
            parts.append(element("text", f"{100 * part:.0f} %", x=x + 40, y=y - 24, cls="lbl"))
    return parts


def _proposals(frame: Frame, finding: Finding) -> list[str]:
    parts = []
    for row, proposal in enumerate(finding.proposals, start=1):
        places = [frame.at(*at) for at in proposal.at_mm]
        if not places:
            continue
        data = "M" + "L".join(f"{x} {y}" for x, y in places)
        if len(places) > 1:
            parts.append(element("path", d=data, cls="mend"))
        parts += [element("circle", cx=x, cy=y, r=26, cls="mend") for x, y in places]
        x, y = places[0]
        parts.append(element("text", f"{row}", x=x + 36, y=y + 62, cls="mendno"))
    return parts


def _labels(frame: Frame, view: FindingView) -> list[str]:
    """Names of the pieces of plane, kept inside the drawing."""
    wide, high = frame.size
    parts = []
    for net, (x_mm, y_mm) in view.islands:
        shown = name(net, 24)
        x, y = frame.at(x_mm, y_mm)
        half = 17 * len(shown)
        x = min(max(x, half + 10), max(wide - half - 10, half + 10))
        y = min(max(y, LETTER + 10), high - 90)
        parts.append(element("text", shown, x=x, y=y, cls="lbl", text_anchor="middle"))
    return parts


def _scale(frame: Frame, view: FindingView) -> str:
    x0, _, x1, _ = view.window_mm
    mm = nice_mm((x1 - x0) / 4)
    _, high = frame.size
    length = round(mm * frame.scale)
    bar = element("path", d=f"M40 {high - 60}v24h{length}v-24", cls="bar")
    return bar + element("text", f"{number(mm)} mm", x=52, y=high - 74, cls="lbl")
