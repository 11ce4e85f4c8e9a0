"""Two revisions of a board in; for each finding out whether it is new, worse, better or gone."""

from __future__ import annotations

from collections.abc import Iterator

from splitcheck.verdict.changes import VERDICTS, Change, Comparison, Move, Verdict
from splitcheck.verdict.findings import LEVELS, Finding, Report
from splitcheck.verdict.match import layer_keys, match
from splitcheck.verdict.move import find_move
from splitcheck.verdict.score import worst_first

#: A value has changed if it did by more than both error bars together, this share, and this much.
CHANGE_SHARE, CHANGE_NH = 0.1, 0.1
#: The same for the length of a gap that has no value, mm.
CHANGE_MM = 1.0


def compare(was: Report, now: Report) -> Comparison:
    """Say what became of each finding of an earlier revision, and which are new.

    Parameters
    ----------
    was, now
        The earlier and the newer revision, ranked or read back.

    Notes
    -----
    A finding that is in both (see `match`) is judged by these rules in turn:

    1. Its waiver was taken away or has ended: worse. It has been waived since: better.
    2. There is no way back any more: worse. There is one again: better.
    3. Its value, the added inductance (of a leg of a pair that of both), has risen or fallen by
       more than both error bars together, by more than 10 % of what it was, and by more than
       0.1 nH: worse or better. Where no value is on either side, the length of the gap counts, by
       more than 10 % and 1 mm.
    4. Its level has risen: worse if the rules that judge it have changed (its class, rise time, or
       the numbers of the class), or if the value rose by more than 10 % and 0.1 nH, whatever the
       error bars; a level that fell likewise: better. A value that has hardly changed and happens
       to lie at a threshold is neither.
    5. Else unchanged.

    Quantities are rounded to four decimals first, as in the JSON, so that a report read back
    compares like the board it was made from.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> compare(empty, empty).changes
    ()
    """
    layers = layer_keys(was, now)
    move = find_move(was, now, layers)
    pairs = match(was, now, move, layers)
    rules = _changed_classes(was, now)
    changes = [_judged(was.findings[i], now.findings[j], rules) for i, j in pairs]
    older, newer = ({pair[side] for pair in pairs} for side in (0, 1))
    changes += [Change("new", "", f, None) for j, f in enumerate(now.findings) if j not in newer]
    changes += [Change("gone", "", None, f) for i, f in enumerate(was.findings) if i not in older]
    ranked = sorted(
        changes, key=lambda change: (VERDICTS.index(change.verdict), worst_first(change.finding))
    )
    return Comparison(was, move, tuple(ranked), tuple(_remarks(was, now, move, changes, rules)))


def _judged(was: Finding, now: Finding, rules: frozenset[str]) -> Change:
    for verdict, why in _reasons(was, now, rules):
        return Change(verdict, why, now, was)
    return Change("unchanged", "", now, was)


def _reasons(was: Finding, now: Finding, rules: frozenset[str]) -> Iterator[tuple[Verdict, str]]:
    """What makes a finding worse or better, by the rules of `compare`, first things first."""
    if (was.waived is None) != (now.waived is None):  # 1
        yield ("worse", "its waiver is gone") if now.waived is None else ("better", "it is waived")
    if was.added_nh is None and now.added_nh is not None:  # 2
        yield "better", f"there is a way back again, {_told(now.added_nh, now.error_nh)}"
    if was.added_nh is not None and now.added_nh is None:
        yield "worse", f"there is no way back any more, before {_told(was.added_nh, was.error_nh)}"
    rise, threshold, bars, words = _rise(was, now)  # 3
    if abs(rise) > threshold + 1e-9 and abs(rise) > bars:
        yield ("worse" if rise > 0 else "better"), words
    steps = LEVELS.index(was.level) - LEVELS.index(now.level)  # 4
    ruled = (was.net_class, was.rise_ns) != (now.net_class, now.rise_ns) or now.net_class in rules
    if steps and (ruled or abs(rise) > threshold + 1e-9):
        by = "by other rules" if ruled else words
        yield ("worse" if steps > 0 else "better"), f"{was.level} to {now.level}, {by}"


def _rise(was: Finding, now: Finding) -> tuple[float, float, float, str]:
    """By how much the value rose, from where on that counts, both error bars, and in words."""
    if was.added_nh is None or now.added_nh is None:
        before, after = round(was.gap_mm, 4), round(now.gap_mm, 4)
        threshold = max(CHANGE_SHARE * before, CHANGE_MM)
        return after - before, threshold, 0.0, f"a gap of {before:.2f} mm is {after:.2f} mm now"
    older, newer = was.added_nh, now.added_nh
    if was.odd_nh is not None and now.odd_nh is not None:
        older, newer = was.odd_nh, now.odd_nh
    before, after = round(older, 4), round(newer, 4)
    bars = round(was.error_nh or 0.0, 4) + round(now.error_nh or 0.0, 4)
    words = f"{_told(before, was.error_nh)} to {_told(after, now.error_nh)}"
    return after - before, max(CHANGE_SHARE * before, CHANGE_NH), bars, words


def _told(value: float, error: float | None) -> str:
    return f"{value:.2f} +-{error or 0.0:.2f} nH"


def _changed_classes(was: Report, now: Report) -> frozenset[str]:
    """Classes of nets that both revisions have, judged by other numbers."""
    before, after = ({row.name: row for row in report.classes} for report in (was, now))
    numbers = ("rise_ns", "wave_mv", "line_ohm", "error_mv", "warning_mv", "exempt")
    return frozenset(
        name
        for name in before.keys() & after.keys()
        if any(getattr(before[name], key) != getattr(after[name], key) for key in numbers)
    )


def _remarks(
    was: Report, now: Report, move: Move, changes: list[Change], rules: frozenset[str]
) -> Iterator[str]:
    if not move.is_nothing:
        x, y = move.shift_mm
        turned = "" if abs(move.turned_deg) < 0.005 else f" turned by {move.turned_deg:.2f} degrees"
        moved = f"{' and' if turned else ''} moved by ({x:.2f}, {y:.2f}) mm"
        yield (
            f"The board is{turned}{moved} in its files; earlier places were taken along before "
            "they were compared."
        )
    renamed = sum(
        change.was.net != change.now.net
        for change in changes
        if change.was is not None and change.now is not None
    )
    if renamed:
        yield (
            f"{renamed} of the findings that are in both revisions are on nets that have another "
            "name now."
        )
    if len(was.layers) != len(now.layers):
        yield (
            f"There were {len(was.layers)} copper layers and are {len(now.layers)}: layers were "
            "matched by name, or from the nearer side."
        )
    if rules:
        yield f"Other numbers than before judge {len(rules)} of the classes of nets."
