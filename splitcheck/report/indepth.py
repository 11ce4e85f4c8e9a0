"""One finding, or the journey of one net, in; all that is known of it as text out."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from splitcheck.report.kinds import CAUTION, RULES
from splitcheck.report.page import Column, Page
from splitcheck.report.sentences import name, place, source
from splitcheck.report.sketch import LEGEND, sketch
from splitcheck.report.terminal import LEVEL_STYLES
from splitcheck.report.words import number, plural, shorten, with_error
from splitcheck.verdict.findings import Finding, NetRow, Report
from splitcheck.verdict.views import FindingView

_LEGS = (
    Column("from\nmm", "right"),
    Column("length\nmm", "right"),
    Column("what"),
    Column("layer", gives=True),
    Column("return on", gives=True),
    Column("added\nnH", "right"),
)
_WAYS = {"stretch": "over plane", "bare": "no plane", "change": "changes plane"}
_SHARERS = 12


def of_finding(
    report: Report, finding: Finding, view: FindingView | None, *, width: int, color: bool
) -> str:
    """Tell all about one finding.

    Parameters
    ----------
    report
        The report it is of, for what was assumed.
    finding, view
        The finding, and what is drawn of it, if it lies over a plane at all.
    width, color
        Columns of the terminal, and whether to colour.
    """
    page = Page(width, color=color)
    rule = RULES[finding.kind]
    page.say(f"{finding.id}  {name(finding.net)}: {rule.title}", indent=0, style="bold")
    level = Text(finding.level, style=LEVEL_STYLES[finding.level])
    page.say_text(level + Text(f", {place(finding)}"))
    page.say(source(finding))
    page.heading("What it costs")
    for words in _numbers(finding):
        page.say(words)
    page.heading("Why it counts")
    page.say(rule.what)
    for question, answer in view.facts if view is not None else ():
        page.say(answer, lead=f"{question}: ")
    page.say(f"{finding.reason}.")
    if view is not None:
        page.heading("What it looks like")
        for line in sketch(view):
            page.say_text(Text(line))
        page.say(LEGEND)
    _sharing(page, finding)
    page.heading("What would mend it")
    for row, proposal in enumerate(finding.proposals, start=1):
        left = with_error(proposal.added_nh, proposal.error_nh)
        page.say(f"{proposal.words}; leaves {left} nH", lead=f"{row}. ")
    if not finding.proposals:
        page.say(rule.help)
        page.say(f"`splitcheck mend PATH {finding.id}` looks for places and says what is left.")
    page.heading("Assumed")
    for row, assumption in enumerate(report.assumptions, start=1):
        page.say(assumption, lead=f"{row}. ")
    if not report.assumptions:
        page.say("Nothing that changes results.")
    page.gap()
    page.say(CAUTION, indent=0)
    return str(page)


def _numbers(finding: Finding) -> list[str]:
    """Every number of a finding with its unit and error."""
    told = [f"{number(finding.gap_mm)} mm of the trace have no plane"]
    if finding.kind == "void-crossing" and not finding.gap_mm:
        told = ["the gap lies beside the trace, not under its centre line"]
    elif finding.detour_mm is None:
        told.append("no way back was found for the return")
    else:
        told.append(f"the return walks {number(finding.detour_mm)} mm more")
    if finding.added_nh is not None:
        value = with_error(finding.added_nh, finding.error_nh)
        told.append(f"adds {value} nH to the loop ({finding.method})")
    if finding.noise_mv is not None:
        rise = f"at a rise time of {number(finding.rise_ns)} ns"
        capped = ", held to the limit of the gap as a line" if finding.capped else ""
        told.append(f"makes {number(finding.noise_mv)} mV {rise}{capped}")
    if finding.estimated_nh is not None:
        value = with_error(finding.estimated_nh, finding.estimated_error_nh)
        told.append(f"closed forms say {value} nH instead")
    if finding.corner_khz is not None:
        khz = number(finding.corner_khz)
        told.append(f"above {khz} kHz the return follows inductance, not resistance")
    if finding.stray_db is not None:
        told.append(f"a loop probe 10 mm above finds {finding.stray_db:+.1f} dB")
    if finding.crosstalk_mv is not None:
        told.append(f"all other nets over the gap induce {number(finding.crosstalk_mv)} mV")
    if finding.pair is not None:
        told.append(f"is a leg of a pair with {name(finding.pair)}")
    if finding.waived is not None:
        told.append(f"waived: {shorten(finding.waived, 400)}")
    return told


def _sharing(page: Page, finding: Finding) -> None:
    if not finding.shares_gap_with:
        return
    page.heading("Nets that share the gap")
    shown = []
    for share in finding.shares_gap_with[:_SHARERS]:
        mutual = "" if share.mutual_nh is None else f" ({number(share.mutual_nh)} nH)"
        shown.append(f"{name(share.net)}{mutual}")
    left = len(finding.shares_gap_with) - _SHARERS
    page.say(", ".join(shown) + (f" and {left} more" if left > 0 else ""))
    page.say("In brackets the mutual inductance over the gap.")


def of_net(net: NetRow, findings: Sequence[Finding], *, width: int, color: bool) -> str:
    """Tell the journey of one net: its stretches, their planes, and its findings.

    Parameters
    ----------
    net
        The net.
    findings
        All findings of the board.
    width, color
        Columns of the terminal, and whether to colour.
    """
    page = Page(width, color=color)
    found = plural(net.findings, "finding")
    page.say(f"{name(net.name)}: {number(net.length_mm)} mm, {found}", indent=0, style="bold")
    if net.exempt is not None:
        page.say(f"It is not judged: {shorten(net.exempt, 400)}")
    if net.findings:
        total = "no way back somewhere" if net.sum_nh is None else f"{number(net.sum_nh)} nH in all"
        page.say(f"It adds {total}." if net.sum_nh is not None else f"There is {total}.")
    page.heading("Journey")
    if not net.journey:
        page.say("No trace of it is judged.")
        return str(page)
    rows, along = [], 0.0
    for leg in net.journey:
        what = leg.finding if leg.kind == "finding" and leg.finding else _WAYS.get(leg.kind, "")
        planes = ", ".join(leg.plane_layers) or "nothing"
        added = "none" if leg.added_nh is None else number(leg.added_nh)
        rows.append((f"{along:.1f}", f"{leg.length_mm:.1f}", what, leg.layer, planes, added))
        along += leg.length_mm
    page.table(_LEGS, rows)
    own = [finding for finding in findings if finding.net == net.name]
    if own:
        page.heading("Findings on it")
        for finding in own:
            page.say(f"{finding.kind}, {place(finding)}: {finding.reason}", lead=f"{finding.id}  ")
    return str(page)
