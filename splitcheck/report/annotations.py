"""Findings as workflow commands, which a CI host shows as annotations beside the changed files.

One line a gap, worst first, at most as many of each level as the host shows of one step.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import Literal

from splitcheck.report import sentences, tally
from splitcheck.report.kinds import RULES
from splitcheck.report.words import plural, visible
from splitcheck.verdict.changes import Change, Comparison
from splitcheck.verdict.findings import LEVELS, Finding, Level, Report

#: The host shows no more of one level in one step.
MOST_OF_A_LEVEL = 10
_COMMANDS: dict[Level, Literal["error", "warning", "notice"]] = {
    "error": "error",
    "warning": "warning",
    "note": "notice",
}


def render(report: Report, comparison: Comparison | None = None) -> str:
    """Write what stands, or against an earlier revision what is new or worse, as commands.

    Notes
    -----
    ``::error file=F,line=N,title=T::message``. In the message percent, CR and LF are escaped, in
    the properties colon and comma, too, as the host's toolkit does. Before that, control
    characters and marks of direction are made visible: a name cannot begin a line, and so no
    command.

    Examples
    --------
    >>> render(Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ()))
    ''
    """
    changes = {} if comparison is None else comparison.by_id()
    standing = tally.standing(report.findings)
    if comparison is not None:
        standing = tuple(f for f in standing if changes[f.id].verdict in {"new", "worse"})
    told: Counter[Level] = Counter()
    hidden: Counter[Level] = Counter()
    lines = []
    for group in tally.over_one_gap(standing):
        worst = group[0]
        if told[worst.level] == MOST_OF_A_LEVEL:
            hidden[worst.level] += 1
            continue
        told[worst.level] += 1
        lines.append(_command(group, changes.get(worst.id)))
    rest = ", ".join(f"{hidden[level]} {level}" for level in LEVELS if hidden[level])
    if rest:
        gaps = plural(sum(hidden.values()), "more gap")
        lines.append(f"splitcheck: and {gaps} ({rest}): the summary lists them")
    return "".join(f"{line}\n" for line in lines)


def _command(group: Sequence[Finding], change: Change | None) -> str:
    worst = group[0]
    sharers = f" {sentences.nets(group)} over this gap." if len(group) > 1 else ""
    verdict = "" if change is None else f"{change.verdict}: "
    title = f"{verdict}{RULES[worst.kind].title}, {sentences.name(worst.net)}"
    where = f"file={_property(visible(worst.source.file))},line={worst.source.line}"
    message = _data(sentences.paragraph(worst, change) + sharers)
    return f"::{_COMMANDS[worst.level]} {where},title={_property(title)}::{message}"


def _data(text: str) -> str:
    """The message of a command, from text that is visible already.

    Examples
    --------
    >>> _data("50 %")
    '50 %25'
    """
    return text.replace("%", "%25").replace("\r", "%0D").replace("\n", "%0A")


def _property(text: str) -> str:
    """The value of a property of a command.

    Examples
    --------
    >>> _property("a:b,c")
    'a%3Ab%2Cc'
    """
    return _data(text).replace(":", "%3A").replace(",", "%2C")
