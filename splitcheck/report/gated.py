"""What a revision changes, as text for people: new and worse first, then better and gone."""

from __future__ import annotations

from collections import Counter

from rich.text import Text

from splitcheck import __version__
from splitcheck.report import sentences, tally
from splitcheck.report.kinds import CAUTION
from splitcheck.report.page import Column, Page
from splitcheck.report.words import number, plural, shorten, with_error
from splitcheck.verdict.changes import VERDICTS, Change, Comparison, Move, Verdict
from splitcheck.verdict.findings import LEVELS, Finding, Level, Report

_STYLES: dict[Verdict, str] = {
    "new": "bold red",
    "worse": "bold red",
    "better": "green",
    "gone": "green",
    "unchanged": "",
}
_COLUMNS = (
    Column("id"),
    Column("verdict"),
    Column("level"),
    Column("kind"),
    Column("net", gives=True),
    Column("gap\nmm", "right"),
    Column("added\nnH", "right"),
)
_NET = 4
_ASSUMPTIONS_SHOWN = 5


def render(
    report: Report,
    *,
    comparison: Comparison | None,
    fail_at: Level | None,
    top: int,
    width: int,
    color: bool,
) -> str:
    """Write what became of the findings.

    Parameters
    ----------
    report
        The newer revision.
    comparison
        None where there is no earlier revision: every finding is new then.
    fail_at
        Lowest level at which what is new or worse fails the gate; None: none does.
    top
        How many gaps to show of what is new or worse, and how many findings of what is better or
        gone; 0 shows all.
    width
        Columns of the terminal.
    color
        Whether to colour; nothing is said by colour alone.
    """
    page = Page(width, color=color)
    wide, high = report.size_mm
    title = f"splitcheck {__version__}: {shorten(report.board, 40)}, {wide:.2f} x {high:.2f} mm"
    page.say(title, indent=0, style="bold")
    _against(page, report, comparison)
    if comparison is None:
        every = tuple(Change("new", "", finding, None) for finding in report.findings)
        comparison = Comparison(report, Move(), every, ())
    _fresh(page, report, comparison, top)
    _mended(page, comparison, top)
    _in_all(page, comparison)
    _verdict(page, comparison, fail_at)
    page.gap()
    page.say(f"Screening estimates that rank places. {CAUTION}", indent=0)
    return str(page)


def _against(page: Page, report: Report, comparison: Comparison | None) -> None:
    page.heading("Compared with")
    if comparison is None:
        page.say("No earlier revision (--was): every finding counts as new.")
    else:
        was = comparison.was
        found = plural(len(was.findings), "finding")
        page.say(f"{shorten(was.board, 40)}, {found}; this revision: {len(report.findings)}")
        for remark in comparison.remarks:
            page.say(remark, lead="- ")
    for place, assumption in enumerate(report.assumptions[:_ASSUMPTIONS_SHOWN], start=1):
        page.say(assumption, lead=f"assumed {place}: ")
    left = len(report.assumptions) - _ASSUMPTIONS_SHOWN
    if left > 0:
        page.say(f"and {plural(left, 'more assumption')}: `rank` shows them all")


def _fresh(page: Page, report: Report, comparison: Comparison, top: int) -> None:
    """What is new or worse, one row a gap."""
    page.heading("New or worse, worst first")
    changes = comparison.by_id()
    fresh = [f for f in report.findings if changes[f.id].verdict in {"new", "worse"}]
    groups = tally.over_one_gap(fresh)
    if not groups:
        page.say("Nothing.")
        return
    shown = groups[:top] if top else groups
    rows = [_cells(group[0], changes[group[0].id]) for group in shown]
    widths = page.widths(_COLUMNS, rows)
    page.titles(_COLUMNS, widths)
    for group, row in zip(shown, rows, strict=True):
        worst = group[0]
        change = changes[worst.id]
        page.row(_COLUMNS, widths, row, ["", _STYLES[change.verdict]])
        indent = widths[0] + 4
        where = f"{sentences.place(worst)}, {sentences.source(worst)}"
        page.say_text(Text(where), indent=indent)
        if change.why:
            page.say(change.why, indent=indent)
        if len(group) > 1:
            page.say_text(Text(f"{sentences.nets(group)} over one gap"), indent=indent)
        if worst.waived is not None:
            page.say(f"waived: {worst.waived}", indent=indent)
        page.say(worst.reason, indent=indent)
    hidden = len(groups) - len(shown)
    if hidden:
        page.say(f"and {plural(hidden, 'more gap')}: --top 0 shows all of them")


def _mended(page: Page, comparison: Comparison, top: int) -> None:
    """What is better or gone, one row a finding."""
    mended = comparison.of("better", "gone")
    if not mended:
        return
    page.heading("Better or gone")
    shown = mended[:top] if top else mended
    rows = [_cells(change.finding, change) for change in shown]
    widths = page.widths(_COLUMNS, rows)
    page.titles(_COLUMNS, widths)
    for change, row in zip(shown, rows, strict=True):
        page.row(_COLUMNS, widths, row, ["", _STYLES[change.verdict]])
        if change.why:
            page.say(change.why, indent=widths[0] + 4)
    hidden = len(mended) - len(shown)
    if hidden:
        page.say(f"and {plural(hidden, 'more finding')}: --top 0 shows all of them")


def _cells(finding: Finding, change: Change) -> tuple[str, ...]:
    if finding.added_nh is None:
        added = "no plane" if finding.kind == "no-plane" else "no way back"
    else:
        added = with_error(finding.added_nh, finding.error_nh)
    gone = change.now is None
    return (
        "-" if gone else finding.id,
        change.verdict,
        finding.level,
        finding.kind,
        finding.net,
        number(finding.gap_mm),
        added,
    )


def _in_all(page: Page, comparison: Comparison) -> None:
    page.heading("In all")
    counts = Counter((change.verdict, change.finding.level) for change in comparison.changes)
    rows = [
        (verdict, *(str(counts[verdict, level]) for level in LEVELS))
        for verdict in VERDICTS
        if any(counts[verdict, level] for level in LEVELS)
    ]
    if not rows:
        page.say("No finding in either revision.")
        return
    page.table((Column("verdict"), *(Column(level, "right") for level in LEVELS)), rows)


def _verdict(page: Page, comparison: Comparison, fail_at: Level | None) -> None:
    """One sentence: whether the gate holds, and why not."""
    page.gap()
    if fail_at is None:
        page.say("Passed: --fail-at never.", indent=0, style="bold")
        return
    failing = comparison.failing(fail_at)
    or_above = "" if fail_at == "error" else " or above"
    if not failing:
        words = f"Passed: nothing of level {fail_at}{or_above} is new or worse."
    else:
        words = (
            f"Failed: {plural(len(failing), 'finding')} of level {fail_at}{or_above} "
            f"{'is' if len(failing) == 1 else 'are'} new or worse."
        )
    page.say(words, indent=0, style="bold")
