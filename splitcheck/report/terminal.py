"""The report as text for people: what was read, what was assumed, what is broken, worst first."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import get_args

from rich.cells import cell_len
from rich.text import Text

from splitcheck import __version__
from splitcheck.board.names import in_words
from splitcheck.report import tally
from splitcheck.report.page import Column, Page
from splitcheck.report.sums import say_sums
from splitcheck.report.words import STICKY, number, plural, shorten, with_error
from splitcheck.verdict.findings import (
    LEVELS,
    Finding,
    Kind,
    Level,
    Method,
    Report,
    WaiverRow,
)

#: How each level is coloured; its word always stands beside it.
LEVEL_STYLES: dict[Level, str] = {"error": "bold red", "warning": "yellow", "note": "cyan"}

CAUTION = (
    "Added inductance, noise and detour are screening estimates: they rank places, they do not "
    "replace measurement or accredited EMC testing. A gap can be there for safety (isolation, "
    "creepage): never bridge one before the applicable product-safety standard, local code and a "
    "qualified engineer have been asked."
)

_COLUMNS = (
    Column("id"),
    Column("level"),
    Column("kind"),
    Column("net", gives=True),
    Column("gap\nmm", "right"),
    Column("detour\nmm", "right"),
    Column("added\nnH", "right"),
    Column("noise\nmV", "right"),
)
_METHODS: dict[Method, str] = {
    "solved": "solved from the field",
    "estimated": "estimated by closed forms",
    "none": "without a way back to put a number on",
}
#: How nets that are told together are so, where not over one gap.
_SHARED: dict[Kind, str] = {
    "no-plane": "without a plane",
    "plane-change": "changing planes at one place",
    "edge-run": "along one edge",
}
_NET = 3
_ASSUMPTIONS_SHOWN = 10
_FACTS_SHOWN = 12
_REASONS_SHOWN = 5
_NET_CELLS = 28
_PLANE_CELLS = 60
_LONGEST_NAME = 120


def render(report: Report, *, top: int, width: int, color: bool) -> str:
    """Write the report of a board as text.

    Parameters
    ----------
    top
        How many rows to show, worst first; 0 shows all.
    width
        Columns of the terminal.
    color
        Whether to colour; nothing is said by colour alone.
    """
    page = Page(width, color=color)
    _read(page, report)
    _assumed(page, report)
    _found(page, report, top)
    say_sums(page, report.nets)
    _in_all(page, report)
    page.gap()
    page.say(CAUTION, indent=0)
    return str(page)


def _read(page: Page, report: Report) -> None:
    wide, high = report.size_mm
    page.say(
        f"splitcheck {__version__}: {shorten(report.board, 40)}, {wide:.2f} x {high:.2f} mm",
        indent=0,
        style="bold",
    )
    page.heading("Read")
    layers = ", ".join(
        f"{layer.number}{STICKY}{shorten(layer.name, _NET_CELLS)}{STICKY}({layer.role})"
        for layer in report.layers
    )
    kinds = Counter(row.kind for row in report.inputs)
    files = ", ".join(f"{kinds[kind]} {kind}" for kind in sorted(kinds))
    broken = sum(net.findings > 0 for net in report.nets)
    page.say_text(Text(layers or "none"), lead="layers  ")
    page.say(f"{len(report.nets)}, {broken} of them with findings", lead="nets    ")
    page.say(f"{len(report.inputs)}: {files}" if files else "0", lead="files   ")
    for fact in report.facts[:_FACTS_SHOWN]:
        page.say(fact, lead="- ")
    _more(page, len(report.facts) - _FACTS_SHOWN, "fact")
    if report.remarks:
        page.say(f"{plural(len(report.remarks), 'remark')} on the files: `read` shows them")


def _assumed(page: Page, report: Report) -> None:
    page.heading("Assumed")
    for place, assumption in enumerate(report.assumptions[:_ASSUMPTIONS_SHOWN], start=1):
        page.say(assumption, lead=f"{place}. ")
    _more(page, len(report.assumptions) - _ASSUMPTIONS_SHOWN, "assumption")
    if not report.assumptions:
        page.say("Nothing that changes results.")


def _more(page: Page, left: int, thing: str) -> None:
    if left > 0:
        page.say(f"and {plural(left, 'more ' + thing)}: `read` shows them all")


def _found(page: Page, report: Report, top: int) -> None:
    page.heading("Found, worst first")
    repeated = _alike(tally.over_one_gap(report.findings))
    if not repeated:
        page.say("Nothing: no finding within what was read and assumed above.")
        return
    shown = repeated[:top] if top else repeated
    rows = [_cells(groups[0][0]) for groups in shown]
    widths = page.widths(_COLUMNS, rows)
    page.titles(_COLUMNS, widths)
    for place, (groups, row) in enumerate(zip(shown, rows, strict=True)):
        group = groups[0]
        page.row(_COLUMNS, widths, row, ["", LEVEL_STYLES[group[0].level]])
        name = shorten(row[_NET], _LONGEST_NAME)
        if cell_len(name) > widths[_NET]:
            page.say_text(Text(f"net {name}"), indent=widths[0] + 4)
        _below(page, group, widths[0] + 4, why=place < _REASONS_SHOWN)
        for line in _repeats(groups, 2 * (page.width - widths[0] - 4)):
            page.say_text(Text(line), indent=widths[0] + 4)
    hidden = [group for groups in repeated[len(shown) :] for group in groups]
    if hidden:
        places = sum(len(group) for group in hidden)
        gaps = plural(len(hidden), "more gap")
        page.say(f"and {plural(places, 'finding')} over {gaps}: --top 0 shows all of them")


def _alike(groups: Sequence[Sequence[Finding]]) -> list[list[Sequence[Finding]]]:
    """Gaps whose worst findings are one thing to a reader, each in one row.

    They are at one place, where both planes of a stripline are open, or read the same, as those of
    channels laid out alike.
    """
    rows: dict[tuple[object, ...], list[Sequence[Finding]]] = {}
    places: dict[tuple[object, ...], list[Sequence[Finding]]] = {}
    for group in groups:
        worst = group[0]
        cells = (cell for place, cell in enumerate(_cells(worst)) if place not in {0, _NET})
        seen = (
            worst.layer,
            worst.plane_layer,
            worst.plane_net,
            worst.net_class,
            worst.pair is None,
        )
        alone = worst.id if len(group) > 1 or not worst.gap else ""  # told in full
        read = (*cells, *seen, worst.waived, alone)
        row = places.get(_place(worst)) or rows.get(read) or []
        places.setdefault(_place(worst), row)
        rows.setdefault(read, row)
        row.append(group)
    return list({id(row): row for row in rows.values()}.values())


def _place(finding: Finding) -> tuple[object, ...]:
    alone = "" if finding.gap else finding.id
    return finding.net, finding.layer, finding.at_mm, finding.waived, alone


def _repeats(groups: Sequence[Sequence[Finding]], room: int) -> list[str]:
    """The other gaps of a row: over the other plane at its place, and elsewhere alike."""
    here = _place(groups[0][0])
    others = [group[0] for group in groups[1:]]
    told = [
        f"over {shorten(finding.plane_layer or '', _NET_CELLS)} at the same place as well:"
        f" {finding.id}, {_added(finding)} nH"
        for finding in others
        if _place(finding) == here
    ]
    alike = [finding for finding in others if _place(finding) != here]
    if alike:
        named = [f"{finding.id} {shorten(finding.net, _NET_CELLS)}" for finding in alike]
        start = f"the same at {plural(len(alike), 'more place')}: "
        told.append(_as_many_as_fit(start, named, room))
    return told


def _as_many_as_fit(start: str, names: Sequence[str], room: int) -> str:
    """A list of at least one name and at most so many columns, and the count of the rest."""
    taken = len(start)
    shown: list[str] = []
    for name in names:
        taken += len(name) + 2
        if shown and taken > room - len(" and 99999 more"):
            break
        shown.append(name)
    rest = f" and {len(names) - len(shown)} more" if len(shown) < len(names) else ""
    return start + ", ".join(shown) + rest


def _cells(worst: Finding) -> tuple[str, ...]:
    """One row of numbers: those of the worst finding over the gap."""
    return (
        worst.id,
        worst.level,
        worst.kind,
        worst.net,
        number(worst.gap_mm),
        "none" if worst.detour_mm is None else number(worst.detour_mm),
        _added(worst),
        "-" if worst.noise_mv is None else number(worst.noise_mv),
    )


def _added(finding: Finding) -> str:
    if finding.method == "none" or finding.added_nh is None:
        return "no plane" if finding.kind == "no-plane" else "no way back"
    return with_error(finding.added_nh, finding.error_nh)


def _below(page: Page, group: Sequence[Finding], indent: int, *, why: bool) -> None:
    """The lines under a row: where it is, which nets share the gap, why it counts."""
    worst = group[0]
    page.say_text(Text(_where(worst)), indent=indent)
    if len(group) > 1:
        room = 2 * (page.width - indent)
        page.say_text(Text(_sharers(group, room)), indent=indent)
    extras = _extras(worst)
    if extras:
        page.say_text(Text(extras), indent=indent)
    if worst.waived is not None:
        page.say(f"waived: {worst.waived}", indent=indent)
    if why and worst.reason:
        page.say(worst.reason, indent=indent)


def _where(finding: Finding) -> str:
    layer = shorten(finding.layer, _NET_CELLS)
    over = ""
    if finding.plane_layer:
        nets = " to ".join(in_words(net) for net in finding.plane_net.split(" to "))
        net = f" ({shorten(nets, _PLANE_CELLS)})" if nets else ""
        over = f" over {shorten(finding.plane_layer, _NET_CELLS)}{net}"
    x_mm, y_mm = (round(value, 3) + 0.0 for value in finding.at_mm)
    source = f"{shorten(finding.source.file, 60)}:{finding.source.line}".replace(" ", STICKY)
    place = f"x {x_mm:.3f} y {y_mm:.3f} mm".replace(" ", STICKY)
    return f"{layer}{over}, {place}, {source}"


def _extras(finding: Finding) -> str:
    """What only a field solution knows, the partner of a pair, and what others over the gap do."""
    parts = []
    if finding.stray_db is not None:
        parts.append(f"stray field {finding.stray_db:+.1f} dB")
    if finding.corner_khz is not None:
        corner = number(finding.corner_khz)
        parts.append(f"above {corner} kHz the return follows inductance, not resistance")
    if finding.pair is not None:
        parts.append(_as_pair(finding, finding.pair))
    if finding.common_nh is not None:
        parts.append(f"{number(finding.common_nh)} nH in common mode along the plane")
    if finding.crosstalk_mv is not None:
        heard = number(finding.crosstalk_mv)
        parts.append(f"{heard} mV from the others over the gap when they switch together")
    if finding.capped:
        parts.append(
            "a gap so long for this rise time that the noise stands at its limit as a line"
        )
    return "; ".join(parts)


def _as_pair(finding: Finding, other: str) -> str:
    """The other leg, and what both are worth together."""
    said = f"pair with {shorten(other, _NET_CELLS)}"
    if finding.odd_nh is not None:
        said += f": {number(finding.odd_nh)} nH in odd mode"
    if finding.unbalance_nh is not None:
        said += f", {number(finding.unbalance_nh)} nH unbalanced"
    return said


def _sharers(group: Sequence[Finding], room: int) -> str:
    """All nets over a gap in at most ``room`` columns, or as many as fit and the count of the rest.

    A gap that one net crosses several times is told as so many places.
    """
    nets = tally.nets_of(group)
    levels = ", ".join(f"{count} {level}" for level, count in tally.by_level(group))
    places = f" at {len(group)} places" if len(group) > len(nets) else ""
    shared = _SHARED.get(group[0].kind, "over one gap")
    start = f"{plural(len(nets), 'net')} {shared}{places} ({levels}): "
    return _as_many_as_fit(start, [shorten(net, _NET_CELLS) for net in nets], room)


def _idle_waiver(row: WaiverRow) -> str:
    """A waiver that waives nothing, and why."""
    where = f"{shorten(row.source.file, 60)}:{row.source.line}"
    why = f"expired on {row.until}" if row.state == "expired" else "matches nothing"
    return f"waiver {where} {why}: {shorten(row.reason, _LONGEST_NAME)}"


def _in_all(page: Page, report: Report) -> None:
    page.heading("In all")
    found = tally.standing(report.findings)
    kinds = [kind for kind in get_args(Kind) if any(f.kind == kind for f in found)]
    if kinds:
        columns = (Column("kind"), *(Column(level, "right") for level in LEVELS))
        rows = [
            (
                kind,
                *(str(sum(f.kind == kind and f.level == level for f in found)) for level in LEVELS),
            )
            for kind in kinds
        ]
        total = ("all", *(str(sum(f.level == level for f in found)) for level in LEVELS))
        page.table(columns, [*rows, total])
    gaps = plural(len(tally.over_one_gap(found)), "gap")
    nets = plural(len(tally.nets_of(found)), "net")
    page.say(f"{plural(len(found), 'finding')} over {gaps} on {nets}")
    methods = Counter(f.method for f in found)
    told = [f"{methods[m]} {word}" for m, word in _METHODS.items() if methods[m]]
    if told:
        page.say(f"added inductance: {', '.join(told)}")
    waived = len(report.findings) - len(found)
    if waived:
        page.say(f"{plural(waived, 'waived finding')}, not counted above")
    for row in report.waivers:
        if row.state != "used":
            page.say(_idle_waiver(row))
    for count in report.counts:
        if count.number:
            page.say(f"{count.number} {count.what}")
