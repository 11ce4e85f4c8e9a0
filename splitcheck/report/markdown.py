"""The findings as Markdown for a comment or a job summary: what changed, what was assumed."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Sequence

from splitcheck import __version__
from splitcheck.report import sentences, tally
from splitcheck.report.kinds import CAUTION
from splitcheck.report.words import number, plural, shorten
from splitcheck.verdict.changes import VERDICTS, Change, Comparison
from splitcheck.verdict.findings import Finding, Report

#: A comment may hold 65,536 characters; bytes are counted here, which are never fewer.
LARGEST_BYTES = 60_000
#: Kept free for what stands under the tables.
_TAIL_BYTES = 12_000
_SENTENCES_SHOWN = 12
_REASONS_SHOWN = 5
#: Lets a script find the comment that it wrote before, to write it anew.
MARKER = "<!-- splitcheck -->"
#: Characters that mean something in Markdown, HTML, or to the host (names of people, numbers of
#: issues, emoji, addresses).
_ACTIVE = re.compile(
    r"[^A-Za-z0-9 _/+.,;:()=\u0080-\U0010ffff-]|:(?! )|(?<![A-Za-z0-9])_|_(?![A-Za-z0-9])"
    r"|[=+-]{2,}|www|http",
    re.IGNORECASE,
)


def render(report: Report, comparison: Comparison | None = None) -> str:
    """Write a summary of less than 60 kB; what does not fit is counted.

    Notes
    -----
    Names stand between ``<code>`` and ``</code>``, where hosts neither link nor mention, with all
    that means something in Markdown or HTML as numeric character references, which CommonMark
    never takes for markup (section 2.5).

    Examples
    --------
    >>> render(Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())).splitlines()[0]
    '<!-- splitcheck -->'
    """
    wide, high = report.size_mm
    layers = plural(len(report.layers), "copper layer")
    nets = plural(len(report.nets), "net")
    head = [
        MARKER,
        f"### splitcheck: {_headline(report, comparison)}",
        "",
        f"Board {_code(report.board)}, {wide:.2f} x {high:.2f} mm, {layers}, {nets}.",
        "",
    ]
    tail = _tail(report, comparison)
    room = LARGEST_BYTES - _size(head) - min(_size(tail), _TAIL_BYTES) - 1000
    body = _listed(report, room) if comparison is None else _changed(report, comparison, room)
    text = "\n".join([*head, *body, *_fitting(tail, _TAIL_BYTES)]) + "\n"
    assert len(text.encode()) < LARGEST_BYTES
    return text


def _headline(report: Report, comparison: Comparison | None) -> str:
    if comparison is None:
        found = tally.standing(report.findings)
        levels = ", ".join(f"{count} {level}" for level, count in tally.by_level(found))
        gaps = plural(len(tally.over_one_gap(found)), "gap")
        return f"{plural(len(found), 'finding')} over {gaps} ({levels})" if found else "no finding"
    counts = Counter(change.verdict for change in comparison.changes)
    told = [f"{counts[verdict]} {verdict}" for verdict in VERDICTS if counts[verdict]]
    return ", ".join(told) or "no finding in either revision"


def _listed(report: Report, room: int) -> list[str]:
    """All that stands, one row a gap."""
    groups = tally.over_one_gap(tally.standing(report.findings))
    rows = [_row(group, "") for group in groups]
    return [*_table(rows, "", room, "gap"), *_reasons([group[0] for group in groups])]


def _changed(report: Report, comparison: Comparison, room: int) -> list[str]:
    """What is new or worse in full, then what is better or gone."""
    changes = comparison.by_id()
    lines: list[str] = []
    fresh = [f for f in report.findings if changes[f.id].verdict in {"new", "worse"}]
    groups = tally.over_one_gap(fresh)
    if groups:
        rows = [_row(group, _verdict(group, changes)) for group in groups]
        lines += ["**New or worse**", "", *_table(rows, "verdict", room * 2 // 3, "gap")]
        lines += _reasons([group[0] for group in groups], changes)
    else:
        lines += ["Nothing is new and nothing is worse.", ""]
    mended = comparison.of("better", "gone")
    if mended:
        rows = [_row([change.finding], change.verdict) for change in mended]
        table = _table(rows, "verdict", room // 4, "finding")
        lines += _folded(f"Better or gone: {len(mended)}", table)
    same = len(comparison.of("unchanged"))
    if same:
        lines += [f"{plural(same, 'finding')} as before.", ""]
    return lines


def _verdict(group: Sequence[Finding], changes: dict[str, Change]) -> str:
    return " + ".join(dict.fromkeys(changes[finding.id].verdict for finding in group))


def _row(group: Sequence[Finding], verdict: str) -> str:
    """One row of the table; its first cell only where there are verdicts."""
    worst = group[0]
    more = f" and {len(tally.nets_of(group)) - 1} more" if len(tally.nets_of(group)) > 1 else ""
    level = worst.level if worst.waived is None else f"{worst.level}, waived"
    x_mm, y_mm = (round(value, 3) + 0.0 for value in worst.at_mm)
    over = f" over {_code(worst.plane_layer)}" if worst.plane_layer else ""
    cells = (
        *([verdict] if verdict else []),
        level,
        worst.kind,
        f"{_code(worst.net)}{more}",
        f"{_code(worst.layer)}{over}<br>{x_mm:.3f}, {y_mm:.3f}",
        number(worst.gap_mm),
        sentences.cost(worst),
        _code(f"{worst.source.file}:{worst.source.line}"),
    )
    return f"| {' | '.join(cells)} |"


def _table(rows: Sequence[str], first: str, room: int, thing: str) -> list[str]:
    """Rows under their titles, as many as fit."""
    titles = (
        *([first] if first else []),
        "level",
        "kind",
        "net",
        "where, mm",
        "gap mm",
        "cost",
        "drawn in",
    )
    if not rows:
        return []
    lines = [f"| {' | '.join(titles)} |", f"|{' --- |' * len(titles)}"]
    shown = _fitting(rows, room - _size(lines))
    left = len(rows) - len(shown)
    more = [f"and {plural(left, 'more ' + thing)}", ""] if left else []
    return [*lines, *shown, "", *more]


def _reasons(worst: Sequence[Finding], changes: dict[str, Change] | None = None) -> list[str]:
    """Why the first rows count, in words."""
    lines = []
    for finding in worst[:_REASONS_SHOWN]:
        change = None if changes is None else changes.get(finding.id)
        why = f" ({change.verdict}: {_safe(change.why)})" if change and change.why else ""
        lines.append(f"- {_code(finding.net)}: {_safe(shorten(finding.reason, 400))}{why}")
    return [*lines, ""] if lines else []


def _tail(report: Report, comparison: Comparison | None) -> list[str]:
    lines: list[str] = []
    waived = sum(finding.waived is not None for finding in report.findings)
    if waived:
        lines += [f"{plural(waived, 'waived finding')}, listed in the full report.", ""]
    told = () if comparison is None else comparison.remarks
    if told:
        lines += [*(f"- {_safe(shorten(remark, 400))}" for remark in told), ""]
    assumed = [f"{n}. {_safe(shorten(a, 500))}" for n, a in enumerate(report.assumptions, 1)]
    left = len(assumed) - _SENTENCES_SHOWN
    more = [f"and {plural(left, 'more')} in the full report"] if left > 0 else []
    body = [*assumed[:_SENTENCES_SHOWN], *more] or ["Nothing that changes results."]
    lines += _folded("What was assumed", [*body, ""])
    counts = [f"- {count.number} {_safe(count.what)}" for count in report.counts if count.number]
    if counts:
        lines += _folded("Seen, and no finding", [*counts[: 2 * _SENTENCES_SHOWN], ""])
    words = "Screening estimates that rank places; they do not replace measurement. " + CAUTION
    return [*lines, f"<sub>{words} splitcheck {__version__}</sub>"]


def _folded(title: str, lines: Iterable[str]) -> list[str]:
    """Lines that a reader unfolds."""
    return ["<details>", f"<summary>{title}</summary>", "", *lines, "</details>", ""]


def _fitting(lines: Sequence[str], room: int) -> list[str]:
    """The first lines that take no more than so many bytes."""
    kept: list[str] = []
    for line in lines:
        room -= len(line.encode()) + 1
        if room < 0:
            break
        kept.append(line)
    return kept


def _size(lines: Sequence[str]) -> int:
    return sum(len(line.encode()) + 1 for line in lines)


def _code(text: str) -> str:
    """A name from a file, as it is and without effect.

    Examples
    --------
    >>> _code("D0"), _code("a|b"), _code("<img src=x>")
    ('<code>D0</code>', '<code>a&#124;b</code>', '<code>&#60;img src=x&#62;</code>')
    """
    return f"<code>{_safe(sentences.name(text))}</code>"


def _safe(text: str) -> str:
    """Text in which nothing is markup, link or mention."""
    return _ACTIVE.sub(lambda found: "".join(f"&#{ord(c)};" for c in found.group()), text)
