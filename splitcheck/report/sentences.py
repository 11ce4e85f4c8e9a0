"""A finding in one line and in one paragraph, for formats that give it no table of its own."""

from __future__ import annotations

from collections.abc import Sequence

from splitcheck.report.words import number, plural, shorten, with_error
from splitcheck.verdict.changes import Change
from splitcheck.verdict.findings import Finding

#: Columns a name may take in a sentence; where a format has room for it the whole name stands in
#: a field of its own.
NAME_CELLS = 60
_REASON_CELLS = 600
_NETS_NAMED = 12


def name(text: str) -> str:
    """A name from a file, safe to read and not too long for a sentence."""
    return shorten(text, NAME_CELLS)


def cost(finding: Finding) -> str:
    """What the finding costs, in a few words.

    Examples
    --------
    >>> from splitcheck.report.sentences import added
    >>> added(3.2145, 0.643)
    '+3.21 +-0.64 nH'
    """
    if finding.added_nh is None:
        return "no plane" if finding.kind == "no-plane" else "no way back"
    noise = "" if finding.noise_mv is None else f", {number(finding.noise_mv)} mV"
    return f"{added(finding.added_nh, finding.error_nh)}{noise}"


def added(added_nh: float, error_nh: float | None) -> str:
    """Added inductance with its error."""
    return f"+{with_error(added_nh, error_nh)} nH"


def place(finding: Finding) -> str:
    """Layer, plane and place.

    The place is rounded to 1 um; a negative zero is none.
    """
    over = ""
    if finding.plane_layer:
        net = f" ({name(finding.plane_net)})" if finding.plane_net else ""
        over = f" over {name(finding.plane_layer)}{net}"
    x_mm, y_mm = (round(value, 3) + 0.0 for value in finding.at_mm)
    return f"{name(finding.layer)}{over} at x {x_mm:.3f} y {y_mm:.3f} mm"


def source(finding: Finding) -> str:
    """File and line of the trace."""
    return f"{shorten(finding.source.file, 2 * NAME_CELLS)}:{finding.source.line}"


def paragraph(finding: Finding, change: Change | None = None) -> str:
    """Everything a reader needs, in one paragraph without line ends."""
    parts = [
        f"{name(finding.net)}: {cost(finding)}; {place(finding)}; gap {number(finding.gap_mm)} mm"
    ]
    if finding.detour_mm is not None:
        parts.append(f"; the return walks {number(finding.detour_mm)} mm more")
    parts.append(f". {shorten(finding.reason, _REASON_CELLS)}")
    if change is not None and change.why:
        verdict = f"{change.verdict[:1].upper()}{change.verdict[1:]}"
        parts.append(f" {verdict}: {shorten(change.why, _REASON_CELLS)}.")
    if finding.waived is not None:
        parts.append(f" Waived: {shorten(finding.waived, _REASON_CELLS)}")
    return "".join(parts)


def nets(group: Sequence[Finding]) -> str:
    """The nets of findings over one gap, or as many as a line holds and the count of the rest."""
    found = list(dict.fromkeys(finding.net for finding in group))
    shown = ", ".join(shorten(net, NAME_CELLS // 2) for net in found[:_NETS_NAMED])
    left = len(found) - _NETS_NAMED
    return f"{plural(len(found), 'net')}: {shown}" + (f" and {left} more" if left > 0 else "")
