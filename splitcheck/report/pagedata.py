"""A report and its pictures in, what the page's script needs out: plain lists and names."""

from __future__ import annotations

import json
from typing import Any, TypeAlias

from splitcheck.report.mapdrawing import frame_of
from splitcheck.report.sentences import place, source
from splitcheck.report.words import number, shorten, visible, with_error
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import Finding, Leg, NetRow, Proposal, Report
from splitcheck.verdict.views import Pictures

Json: TypeAlias = dict[str, Any]

#: Longer names and sentences are cut in their middle.
NAME, SENTENCE = 120, 1200
#: Legs of a journey that are shown.
MOST_LEGS = 60
#: A finding zooms the map to no less than this, mm.
LEAST_ZOOM_MM = 4.0


def data(report: Report, comparison: Comparison | None, pictures: Pictures) -> str:
    """All that the script of the page works on, as JSON that is safe inside a script element."""
    changes = {} if comparison is None else comparison.by_id()
    broken = {finding.net for finding in report.findings}
    content = {
        "findings": [
            _finding(
                finding, pictures, changes[finding.id].verdict if finding.id in changes else ""
            )
            for finding in report.findings
        ],
        "nets": {_name(net.name): _net(net) for net in report.nets if net.name in broken},
        "layers": {_name(layer.name): layer.number for layer in report.layers},
    }
    return embedded(content)


def embedded(content: Json) -> str:
    r"""JSON that cannot end the script element it stands in, nor open a comment in it.

    Examples
    --------
    >>> embedded({"a": "</script><!--"})
    '{"a":"\\u003c/script\\u003e\\u003c!--"}'
    """
    plain = json.dumps(content, ensure_ascii=True, separators=(",", ":"), allow_nan=False)
    return plain.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")


def sentence(words: str) -> str:
    """A sentence as it stands by itself: safe, not too long, with a capital.

    Examples
    --------
    >>> sentence("the trace goes on")
    'The trace goes on'
    """
    shown = shorten(words, SENTENCE)
    return shown[:1].upper() + shown[1:]


def _name(words: str) -> str:
    return shorten(words, NAME)


def _finding(finding: Finding, pictures: Pictures, change: str) -> Json:
    """A finding: what is sorted by as numbers, what is read as words."""
    x, y = frame_of(pictures.board).at(*finding.at_mm)
    return {
        "id": finding.id,
        "kind": finding.kind,
        "level": finding.level,
        "net": _name(finding.net),
        "cls": _name(finding.net_class),
        "layer": _name(finding.layer),
        "plane": _name(finding.plane_layer),
        "gap": visible(finding.gap),
        "mm": _pair(finding.gap_mm),
        "detour": _pair(finding.detour_mm),
        "added": [finding.added_nh, _added(finding)],
        "noise": _pair(finding.noise_mv),
        "place": place(finding),
        "source": source(finding),
        "reason": sentence(finding.reason),
        "more": _more(finding),
        "shares": [
            [_name(s.net), None if s.mutual_nh is None else number(s.mutual_nh)]
            for s in finding.shares_gap_with
        ],
        "proposals": [_proposal(proposal) for proposal in finding.proposals],
        "waived": None if finding.waived is None else shorten(finding.waived, SENTENCE),
        "change": change,
        "at": [x, y],
        "zoom": _zoom(finding, pictures),
        "drawn": pictures.of(finding.id) is not None,
    }


def _pair(value: float | None) -> list[Any]:
    return [None, "none"] if value is None else [round(value, 6), number(value)]


def _added(finding: Finding) -> str:
    if finding.added_nh is None:
        return "no plane" if finding.kind == "no-plane" else "no way back"
    return with_error(finding.added_nh, finding.error_nh).replace("+-", "\u00b1")


def _more(finding: Finding) -> list[list[str]]:
    """Numbers that only some findings have, as question and answer."""
    rows = [
        ("Number comes from", _METHODS[finding.method]),
        ("Rise time", f"{number(finding.rise_ns)} ns"),
    ]
    if finding.estimated_nh is not None:
        said = with_error(finding.estimated_nh, finding.estimated_error_nh)
        rows.append(("Closed forms say", f"{said} nH"))
    if finding.corner_khz is not None:
        khz = f"{number(finding.corner_khz)} kHz"
        rows.append(("Corner", f"above {khz} the return follows inductance, not resistance"))
    if finding.stray_db is not None:
        rows.append(("Stray field 10 mm above", f"{finding.stray_db:+.1f} dB"))
    if finding.crosstalk_mv is not None:
        rows.append(("All other nets together induce", f"{number(finding.crosstalk_mv)} mV"))
    if finding.pair is not None:
        rows.append(("Pair with", _name(finding.pair)))
    if finding.odd_nh is not None:
        rows.append(("Pair in odd mode", f"{number(finding.odd_nh)} nH"))
    if finding.unbalance_nh is not None:
        rows.append(("Legs differ by", f"{number(finding.unbalance_nh)} nH"))
    if finding.capped:
        rows.append(("Limit", "the noise stands at the limit of the gap as a line"))
    return [list(row) for row in rows]


_METHODS = {
    "solved": "a field solution of this gap",
    "estimated": "closed forms",
    "none": "no number: there is no way back",
}


def _proposal(proposal: Proposal) -> Json:
    left = with_error(proposal.added_nh, proposal.error_nh).replace("+-", "\u00b1")
    return {
        "what": proposal.what,
        "words": shorten(proposal.words, SENTENCE),
        "left": f"{left} nH, {number(proposal.noise_mv)} mV",
        "isolation": proposal.isolation,
    }


def _zoom(finding: Finding, pictures: Pictures) -> list[int]:
    """The part of the map to look at: x, y, width, height in its units."""
    view = pictures.of(finding.id)
    frame = frame_of(pictures.board)
    if view is None:
        x, y = finding.at_mm
        half = max(LEAST_ZOOM_MM, 1.5 * finding.gap_mm)
        box = (x - half, y - half, x + half, y + half)
    else:
        box = view.window_mm
    (left, top), (right, bottom) = frame.at(box[0], box[3]), frame.at(box[2], box[1])
    return [left, top, max(right - left, 1), max(bottom - top, 1)]


def _net(net: NetRow) -> Json:
    return {
        "mm": number(net.length_mm),
        "sum": None if net.sum_nh is None else number(net.sum_nh),
        "n": net.findings,
        "legs": [_leg(leg) for leg in net.journey[:MOST_LEGS]],
        "left": max(len(net.journey) - MOST_LEGS, 0),
    }


def _leg(leg: Leg) -> list[Any]:
    return [
        leg.kind,
        _name(leg.layer),
        ", ".join(_name(layer) for layer in leg.plane_layers),
        round(leg.length_mm, 2),
        "no way back" if leg.added_nh is None else number(leg.added_nh),
        leg.finding,
    ]
