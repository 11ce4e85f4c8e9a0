"""Numbers in, small charts as SVG text out: impedance against frequency, values with error bars."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import ceil, floor, log10
from typing import NamedTuple

from splitcheck.report.drawing import element, joined, text
from splitcheck.report.words import with_error
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.views import ImpedanceView

STYLE = """
.axis{stroke:var(--rule);stroke-width:1;fill:none}
.grid{stroke:var(--rule);stroke-width:.5;fill:none;opacity:.5}
.tick{fill:var(--muted);font:12px sans-serif}
.said{fill:var(--ink);font:13px sans-serif}
.direct{stroke:var(--stream);stroke-width:2.5;fill:none}
.round{stroke:var(--way);stroke-width:2.5;fill:none;stroke-dasharray:8 4}
.corner{stroke:var(--ink);stroke-width:1.5;stroke-dasharray:2 3;fill:none}
.now{fill:var(--way)}
.then{fill:var(--mend)}
.whisker{stroke:var(--ink);stroke-width:2;fill:none}
"""

_WIDE, _HIGH = 520, 300
_LEFT, _TOP, _RIGHT, _BOTTOM = 62, 34, 14, 44
_ROW = 34


def impedance(view: ImpedanceView) -> tuple[str, int, int]:
    """Impedance of both ways against frequency, both axes logarithmic; its width and height."""
    x0, x1 = (log10(view.frequency_khz[end]) for end in (0, -1))
    values = [z for z in (*view.direct_ohm, *view.round_ohm) if z > 0]
    y0, y1 = floor(log10(min(values))), ceil(log10(max(values)))
    y1 = max(y1, y0 + 1)

    def x(khz: float) -> float:
        return round(_LEFT + (log10(khz) - x0) / (x1 - x0) * (_WIDE - _LEFT - _RIGHT), 1)

    def y(ohm: float) -> float:
        share = (log10(max(ohm, 10.0**y0)) - y0) / (y1 - y0)
        return round(_HIGH - _BOTTOM - share * (_HIGH - _TOP - _BOTTOM), 1)

    parts = []
    for power in range(ceil(x0), floor(x1) + 1):
        at = x(10.0**power)
        parts.append(element("path", d=f"M{at} {_TOP}V{_HIGH - _BOTTOM}", cls="grid"))
        label = _frequency(10.0**power)
        anchor = "end" if power == floor(x1) else "middle"
        parts.append(
            element("text", label, x=at, y=_HIGH - _BOTTOM + 17, cls="tick", text_anchor=anchor)
        )
    for power in range(y0, y1 + 1):
        at = y(10.0**power)
        parts.append(element("path", d=f"M{_LEFT} {at}H{_WIDE - _RIGHT}", cls="grid"))
        parts.append(
            element("text", _ohm(power), x=_LEFT - 6, y=at + 4, cls="tick", text_anchor="end")
        )
    for values_ohm, cls in ((view.direct_ohm, "direct"), (view.round_ohm, "round")):
        places = [f"{x(f)} {y(z)}" for f, z in zip(view.frequency_khz, values_ohm, strict=True)]
        parts.append(element("path", d="M" + "L".join(places), cls=cls))
    parts += _corner(view, x)
    parts += _legend()
    return joined(parts), _WIDE, _HIGH


def _corner(view: ImpedanceView, x: Callable[[float], float]) -> list[str]:
    khz = view.corner_khz
    if khz is None or not view.frequency_khz[0] <= khz <= view.frequency_khz[-1]:
        return []
    at = x(khz)
    turned = at > _WIDE * 0.6
    return [
        element("path", d=f"M{at} {_TOP}V{_HIGH - _BOTTOM}", cls="corner"),
        element(
            "text",
            f"corner {_frequency(khz)}",
            x=at + (-6 if turned else 6),
            y=_TOP + 15,
            cls="said",
            text_anchor="end" if turned else "start",
        ),
    ]


def _legend() -> list[str]:
    parts = []
    for at, cls, words in ((_LEFT, "direct", "plane whole"), (_LEFT + 150, "round", "as it is")):
        parts.append(element("path", d=f"M{at} 16h34", cls=cls))
        parts.append(element("text", words, x=at + 42, y=20, cls="said"))
    parts.append(
        element(
            "text", "|Z| of the loop, ohm", x=_WIDE - _RIGHT, y=20, cls="tick", text_anchor="end"
        )
    )
    return parts


def _frequency(khz: float) -> str:
    """A frequency in the unit that suits it.

    Examples
    --------
    >>> _frequency(1.0), _frequency(1000.0), _frequency(1e6), _frequency(53.21)
    ('1 kHz', '1 MHz', '1 GHz', '53.2 kHz')
    """
    for unit, size in (("GHz", 1e6), ("MHz", 1e3), ("kHz", 1.0), ("Hz", 1e-3)):
        if khz >= size or unit == "Hz":
            return f"{float(f'{khz / size:.3g}'):g} {unit}"
    raise AssertionError


def _ohm(power: int) -> str:
    if power < -3:
        return f"{10 ** (power + 6):g} u"
    if power < 0:
        return f"{10 ** (power + 3):g} m"
    return f"{10**power:g}" if power < 3 else f"{10 ** (power - 3):g} k"


class Bar(NamedTuple):
    """A value with its error."""

    words: str
    value: float
    error: float | None
    cls: str


def bars_of(finding: Finding) -> list[Bar]:
    """What a finding adds now, by closed forms if they differ, and after each proposal."""
    if finding.added_nh is None:
        return []
    bars = [Bar("as it is", finding.added_nh, finding.error_nh, "now")]
    if finding.estimated_nh is not None:
        error = finding.estimated_error_nh
        bars.append(Bar("closed forms say", finding.estimated_nh, error, "now"))
    for row, proposal in enumerate(finding.proposals, start=1):
        left = f"after proposal {row} ({proposal.what})"
        bars.append(Bar(left, proposal.added_nh, proposal.error_nh, "then"))
    return bars


def bars(shown: Sequence[Bar]) -> tuple[str, int, int]:
    """Values as bars with whiskers from value less error to value and error; width and height."""
    left, room = 190, 210
    most = max((bar.value + (bar.error or 0.0) for bar in shown), default=1.0) or 1.0
    parts = []
    for row, bar in enumerate(shown):
        y = row * _ROW + 8
        wide = round(bar.value / most * room, 1)
        parts.append(
            element("text", text(bar.words), x=left - 8, y=y + 15, cls="said", text_anchor="end")
        )
        parts.append(element("rect", x=left, y=y, width=max(wide, 1), height=20, cls=bar.cls))
        if bar.error:
            low = left + max(bar.value - bar.error, 0.0) / most * room
            high = left + (bar.value + bar.error) / most * room
            data = f"M{low:.1f} {y + 4}v12m0-6H{high:.1f}m0-6v12"
            parts.append(element("path", d=data, cls="whisker"))
        end = left + round((bar.value + (bar.error or 0.0)) / most * room, 1)
        words = f"{with_error(bar.value, bar.error)} nH".replace("+-", "\u00b1")
        parts.append(element("text", words, x=end + 8, y=y + 15, cls="said"))
    return joined(parts), _WIDE, _ROW * len(shown) + 6
