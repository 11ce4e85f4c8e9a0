"""What the report says of classes: the sentences, one row a class, and how many nets are exempt."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection

from splitcheck.board.board import Board
from splitcheck.verdict.classes import Known
from splitcheck.verdict.findings import ClassRow, Count
from splitcheck.verdict.rules import Class

#: So many classes are named in the sentence.
_NAMED = 8


def class_sentences(known: Known, judged: Collection[int]) -> tuple[str, ...]:
    """What is assumed of the drivers of the nets that are judged, in full sentences."""
    default = known.rules.default
    drives = _drives(known, judged)
    by_default = [net for net, one in drives.items() if one.name == default.name]
    sentences = []
    if by_default or not drives:
        which = "Every net is" if len(by_default) == len(drives) else _nets(len(by_default))
        sentences.append(
            f"{which} taken to switch in {default.rise_ns:g} ns (10 to 90 %) and to launch "
            f"{default.wave_mv:g} mV into {default.line_ohm:g} ohm; an error is "
            f"{default.error_mv:g} mV of noise or no way back, a warning {default.warning_mv:g} mV "
            "(common practice, no source)."
        )
    named = Counter(one.name for one in drives.values() if one.name != default.name)
    if named:
        ranked = sorted(named.items(), key=lambda item: (-item[1], item[0]))
        shown = ", ".join(f"{count} {name}" for name, count in ranked[:_NAMED])
        more = f" and {len(ranked) - _NAMED} more classes" if len(ranked) > _NAMED else ""
        known_by = Counter(_known_by(known, net) for net in drives)
        by = [
            f"{words} ({known_by[how]})"
            for how, words in (
                ("name", "name"),
                ("component", "crystal"),
                ("width", "the width of their lines"),
                ("rules", "rules"),
            )
            if known_by[how]
        ]
        sentences.append(
            f"{sum(named.values())} nets are judged, or exempt, by their class, known by "
            f"{', '.join(by)}: {shown}{more}; rise times are the fast limits of the interfaces, "
            "and splitcheck.toml can say otherwise."
        )
    return tuple(sentences)


def _nets(count: int) -> str:
    if count == 1:
        return "1 net that no class knows is"
    return f"{count} nets that no class knows are"


def class_rows(known: Known, judged: Collection[int]) -> tuple[ClassRow, ...]:
    """Every class with nets among those that are looked at, by name."""
    counts = Counter(one.name for one in _drives(known, judged).values())
    return tuple(
        ClassRow(
            one.name,
            counts[one.name],
            one.rise_ns,
            one.wave_mv,
            one.line_ohm,
            one.error_mv,
            one.warning_mv,
            one.exempt,
            one.source,
        )
        for one in sorted(known.rules.classes, key=lambda one: one.name)
        if counts[one.name]
    )


def exempt_counts(known: Known, judged: Collection[int]) -> tuple[Count, ...]:
    """How many nets are exempt, class by class."""
    counts = Counter(one.name for one in _drives(known, judged).values() if one.exempt)
    return tuple(
        Count(f"nets exempt by class: {name}", number) for name, number in sorted(counts.items())
    )


def exempt_reason(drive: Class) -> str | None:
    """Why a net is not judged, if it is not."""
    return f"class {drive.name}" if drive.exempt else None


def rules_fact(known: Known, board: Board) -> str:
    """Where the rules come from, and what they say of this board, in one line."""
    if known.file is None:
        return "rules: the shipped ones; no splitcheck.toml was found"
    named = len(known.references)
    references = f", {named} of {len(board.nets)} nets named as references" if named else ""
    waivers = len(known.rules.waivers)
    return f"rules: {known.file.file}, {known.file.reason}{references}, {waivers} waivers"


def _drives(known: Known, judged: Collection[int]) -> dict[int, Class]:
    return {net: known.drive_of(net) for net in sorted(judged)}


def _known_by(known: Known, net: int) -> str:
    return known.known_by[net] if known.known_by else "nothing"
