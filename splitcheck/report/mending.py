"""What would mend findings, as text for people: each proposal with what it leaves, best first."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeAlias

from rich.text import Text

from splitcheck import __version__
from splitcheck.report.page import Page
from splitcheck.report.words import number, shorten, with_error
from splitcheck.verdict.findings import Finding, Point, Proposal, Report

KEPT = (
    "Proposals keep 0.2 mm to other nets, 0.25 mm between holes and 0.3 mm to the outline, as far "
    "as these files tell: bodies of parts, holes that are not plated, rules of the maker and what "
    "a supply has to carry are not known here. A void under a connector, a coupling capacitor, "
    "magnetics or an antenna is mostly meant. Nothing was changed: draw what you choose in your "
    "CAD system, export, and run `rank` again."
)
ISOLATION = (
    "CAUTION. Proposals marked (!) lie across two pieces of copper that share no net and no "
    "bridge: the gap may be an isolation barrier. Parts that bridge one must be safety-rated, and "
    "the applicable product-safety standard, local code and a qualified engineer decide whether "
    "anything may."
)
NOTHING = "Nothing to propose"
NO_WAY = f"{NOTHING}: for a finding of this kind no way to mend is known here."
TOO_LITTLE = " What takes away less than 5 % is not proposed."
#: What a way to mend is called where it failed.
WAYS = {"via": "vias", "capacitor": "capacitors", "copper": "copper", "move": "moving"}
_NAME_CELLS = 40

#: What makes two proposals the same: gap, kind and places.
_Key: TypeAlias = tuple[str, str, tuple[Point, ...]]


def render(
    report: Report, *, top: int, width: int, color: bool, ids: Sequence[str] | None = None
) -> str:
    """Write what would mend findings as text.

    Parameters
    ----------
    top
        How many proposals to show for each finding; 0 shows all.
    width
        Columns of the terminal.
    color
        Whether to colour; nothing is said by colour alone.
    ids
        Ids of the findings that were asked for; None: those that have proposals.
    """
    page = Page(width, color=color)
    asked = [
        finding
        for finding in report.findings
        if (finding.proposals if ids is None else finding.id in ids)
    ]
    wide, high = report.size_mm
    name = shorten(report.board, _NAME_CELLS)
    page.say(
        f"splitcheck {__version__}: {name}, {wide:.2f} x {high:.2f} mm", indent=0, style="bold"
    )
    told: dict[_Key, str] = {}
    for finding in asked:
        _finding(page, finding, top, told)
    if not asked:
        page.gap()
        page.say("Nothing to mend: no finding.", indent=0)
    page.gap()
    page.say(KEPT, indent=0)
    if any(proposal.isolation for finding in asked for proposal in finding.proposals):
        page.gap()
        page.say(ISOLATION, indent=0)
    return str(page)


def _finding(page: Page, finding: Finding, top: int, told: dict[_Key, str]) -> None:
    over = f" over {shorten(finding.plane_layer, _NAME_CELLS)}" if finding.plane_layer else ""
    net = shorten(finding.net, _NAME_CELLS)
    page.heading(f"{finding.id}  {finding.level}  {finding.kind}  {net}")
    x_mm, y_mm = (round(value, 3) + 0.0 for value in finding.at_mm)
    where = f"{shorten(finding.layer, _NAME_CELLS)}{over}, x {x_mm:.3f} y {y_mm:.3f} mm"
    page.say(f"{where}: {_now(finding)}")
    for place, proposal in enumerate(finding.proposals, start=1):
        if top and place > top:
            break
        key = (finding.gap, proposal.what, proposal.at_mm)
        _proposal(page, place, proposal, told.get(key))
        told.setdefault(key, f"the same as {finding.id}, {place}.")
    if not finding.proposals:
        page.say(_nothing(finding))


def _nothing(finding: Finding) -> str:
    """Why nothing is proposed: what was in the way of each way that was tried."""
    if not finding.misses:
        return NO_WAY
    told = "; ".join(f"{WAYS[miss.what]}: {miss.words}" for miss in finding.misses)
    valued = any(miss.share is not None for miss in finding.misses)
    return f"{NOTHING}. {told[0].upper()}{told[1:]}.{TOO_LITTLE if valued else ''}"


def _now(finding: Finding) -> str:
    if finding.added_nh is None:
        return "no way back"
    noise = "" if finding.noise_mv is None else f", {number(finding.noise_mv)} mV"
    return f"{with_error(finding.added_nh, finding.error_nh)} nH{noise}"


def _proposal(page: Page, place: int, proposal: Proposal, same: str | None) -> None:
    """A proposal with what it leaves; one that was told of another net over the gap in short."""
    mark = "(!) " if proposal.isolation else ""
    page.say_text(Text(f"{mark}{proposal.what}: {_left(proposal)}"), lead=f"{place}. ")
    page.say(same or proposal.words, indent=5)


def _left(proposal: Proposal) -> str:
    if proposal.added_nh == 0.0:
        return "leaves nothing that would be a finding"
    left = with_error(proposal.added_nh, proposal.error_nh)
    return f"leaves {left} nH, {number(proposal.noise_mv)} mV"
