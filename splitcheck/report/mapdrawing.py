"""The map of a board in, its drawing out: layers as groups that a page shows or hides."""

from __future__ import annotations

from collections.abc import Sequence

from splitcheck.report.drawing import Frame, element, filled, joined, name, text
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.views import BoardView, LayerView

#: One unit of the drawing, mm.
UNIT_MM = 0.01
#: The drawing shows this much round the board, as a share of its larger side.
_ROOM = 0.02

STYLE = """
#map .edge{fill:var(--void);stroke:var(--rule);stroke-width:1.5;vector-effect:non-scaling-stroke}
#map .cu{fill:var(--copper);stroke:var(--copper-rim);stroke-width:.6;
vector-effect:non-scaling-stroke}
#map .tk{fill:none;stroke:var(--beside);stroke-width:1;vector-effect:non-scaling-stroke}
#map .gp{fill:url(#hatch-map);stroke:var(--ink);stroke-width:1.2;vector-effect:non-scaling-stroke}
#map .hatch{stroke:var(--hatch);stroke-width:1}
#map .nt{fill:none;stroke:var(--trace);stroke-width:3;stroke-linejoin:round;stroke-linecap:round;
vector-effect:non-scaling-stroke}
#map .wy{fill:none;stroke:var(--way);stroke-width:2.5;stroke-dasharray:7 4;
vector-effect:non-scaling-stroke}
#map .mk{fill:none;stroke-linecap:round;vector-effect:non-scaling-stroke;cursor:pointer}
#map .mk.error{stroke:var(--error);stroke-width:13}
#map .mk.warning{stroke:var(--warning);stroke-width:10;stroke-linecap:square}
#map .mk.note{stroke:var(--note);stroke-width:7}
#map .mk.waived{stroke:var(--rule);stroke-width:7}
#map .on{stroke:var(--ink);stroke-width:21;fill:none;stroke-linecap:round;
vector-effect:non-scaling-stroke}
#map .in{stroke:var(--chosen);stroke-width:17;fill:none;stroke-linecap:round;
vector-effect:non-scaling-stroke}
#map [hidden]{display:none}
"""


def frame_of(board: BoardView) -> Frame:
    """How the map turns mm into its units, with some room round the board."""
    x0, y0, x1, y1 = board.box_mm
    larger = max(x1 - x0, y1 - y0, 1.0)
    room = _ROOM * larger
    box = (x0 - room, y0 - room, x1 + room, y1 + room)
    return Frame(box, max(round((larger + 2 * room) / UNIT_MM), 100))


def draw(board: BoardView, findings: Sequence[Finding]) -> str:
    """Draw the map, without the svg element round it.

    Layers are groups ``p2`` (plane) and ``t2`` (traces) by their number; nets with findings, gaps
    and marks carry their number among the findings in ``data-f``, ``data-n`` and ``data-g``.
    """
    frame = frame_of(board)
    parts = [_pattern(), filled(frame.shapes(board.outline), "edge")]
    parts += [_plane(frame, layer) for layer in board.layers]
    parts += [_tracks(frame, layer) for layer in board.layers]
    gaps: dict[str, list[str]] = {}
    for gap, shape in board.gaps:
        gaps.setdefault(gap, []).append(frame.shapes([shape]))
    for gap, data in gaps.items():
        attributes = {"data-g": text(gap)}
        parts.append(
            element("path", d="".join(data), cls="gp", fill_rule="evenodd", hidden="", **attributes)
        )
    for net in board.nets:
        path = frame.path(line for _, line in net.lines)
        shown = {"data-n": name(net.name, 200)}
        parts.append(element("path", d=path, cls="nt", hidden="", **shown))
    parts.append(element("g", id="chosen"))
    marks = [_mark(frame, number, finding) for number, finding in enumerate(findings)]
    parts.append(element("g", "".join(reversed(marks)), id="marks") if marks else "")
    return joined(parts)


def _pattern() -> str:
    line = element("path", d="M0 0v6", cls="hatch")
    pattern = element(
        "pattern",
        line,
        id="hatch-map",
        width=6,
        height=6,
        patternUnits="userSpaceOnUse",
        patternTransform="rotate(45)",
    )
    return element("defs", pattern)


def _plane(frame: Frame, layer: LayerView) -> str:
    if not layer.islands:
        return ""
    data = frame.shapes(island.shape for island in layer.islands)
    return element("g", filled(data, "cu"), id=f"p{layer.number}")


def _tracks(frame: Frame, layer: LayerView) -> str:
    if not layer.traces:
        return ""
    path = element("path", d=frame.path(layer.traces), cls="tk")
    return element("g", path, id=f"t{layer.number}")


def _mark(frame: Frame, number: int, finding: Finding) -> str:
    """A mark of the same size at every zoom; worse ones are larger, and drawn later."""
    x, y = frame.at(*finding.at_mm)
    level = "waived" if finding.waived is not None else finding.level
    title = element("title", f"{finding.id} {name(finding.net)}")
    data = {"data-f": number}
    return element("path", title, d=f"M{x} {y}h0", cls=f"mk {level}", **data)
