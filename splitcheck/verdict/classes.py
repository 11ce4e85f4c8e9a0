"""Nets in, the class of each out: by the board's own rules, by name, by what they lead to."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from difflib import get_close_matches
from functools import cache
from typing import Literal, TypeAlias

from splitcheck.board.board import Board
from splitcheck.board.components import prefix
from splitcheck.board.nets import Net
from splitcheck.errors import SplitcheckError
from splitcheck.verdict.findings import InputRow
from splitcheck.verdict.patterns import (
    Names,
    Words,
    is_pattern,
    part_spelling,
    spellings,
    ways_to_write,
)
from splitcheck.verdict.rules import Assignment, Class, Rules
from splitcheck.verdict.rulesfile import PlacedCapacitor, RulesFile
from splitcheck.verdict.wide import wide_nets

#: How the class of a net is known.
KnownBy: TypeAlias = Literal["rules", "name", "component", "width", "nothing"]

#: References of crystals and oscillators begin with these letters (IEEE 315, IEC 81346-2: Y, X).
_CRYSTALS = frozenset({"Y", "X", "XTAL", "OSC"})
#: A crystal has no more pins than this; what has more and is called X is a connector.
_CRYSTAL_PINS = 4


#: What chips call their pins: it says nothing of what the pin is used for.
_PORT = re.compile(r"^P[A-Z]_?\d{1,2}$")
#: Classes of memory that are called as other names of a board tell them.
_GENERATIONS = ("ddr3", "ddr4")


@dataclass(frozen=True, slots=True)
class Known:
    """The rules of a board, and what they make of its nets."""

    rules: Rules
    """With the nets of its pairs by the names that the board has for them."""
    drives: tuple[Class, ...] = ()
    """The class of each net, by its number, with what is known of that net alone."""
    known_by: tuple[KnownBy, ...] = ()
    """How the class of each net is known, by its number."""
    references: frozenset[int] = frozenset()
    """Numbers of the nets that the rules say carry returns."""
    placed: tuple[PlacedCapacitor, ...] = ()
    """Capacitors that the rules place."""
    file: InputRow | None = None
    """The board's own file of rules, if it has one."""

    def drive_of(self, net: int) -> Class:
        """The class of a net."""
        return self.drives[net] if self.drives else self.rules.default


def know(board: Board, rules: Rules, own: RulesFile | None = None) -> Known:
    """Find the class of every net, and what else the rules say of this board.

    Parameters
    ----------
    board
        The board.
    rules
        How it is judged.
    own
        The board's own file, whose names and patterns must all be those of something.

    Notes
    -----
    (1) An assignment by a net's very name has it; else the first assignment whose pattern matches.
    (2) Else every name of the net is asked of the classes in their order. Of several classes it has
    the fastest, where a name that no class knows counts as ``default``; it is exempt only if all
    its names are. Of a name that a schematic program made up from a pad, the part's own name is
    asked, if it is a word (``DBG_UART1``); no net is exempt by it. What other nets of the board are
    called bears on two names: see `_by_others`.
    (3) Else, of a net at a crystal, the class ``clock``, if there is one.
    (4) Else, of a net whose name says nothing and whose lines are far wider than the usual ones,
    the class ``wide``, if there is one: see ``wide.py``.
    (5) Else the class ``default``.

    Raises
    ------
    SplitcheckError
        With file and line: a name or pattern that matches nothing here, an unknown class, two
        assignments of one net.
    """
    _check_classes(rules)
    if own is not None:
        _check(board, own)
    crystals = _at_crystals(board)
    wide = wide_nets(board)
    by_name = {one.name: one for one in rules.classes}
    assigned = _assigned(board, rules)
    others = frozenset(spelling for net in board.nets for spelling in _spelled(net))
    drives: list[Class] = []
    known_by: list[KnownBy] = []
    for net in board.nets:
        found, how = class_of(net.name if net.given else "", rules)
        if how == "nothing" and net.number in crystals and "clock" in by_name:
            found, how = by_name["clock"], "component"
        elif how == "nothing" and net.number in wide and "wide" in by_name and not _spelled(net):
            found, how = by_name["wide"], "width"
        found = _by_others(net, found, others, by_name)
        told = assigned.get(net.number)
        if told is not None:
            found, how = _told(told, found, by_name), "rules"
        drives.append(found)
        known_by.append(how)
    return Known(
        replace(rules, pairs=tuple(_on_board(board, pair) for pair in rules.pairs)),
        tuple(drives),
        tuple(known_by),
        frozenset(net.number for net in board.nets if Names(rules.references).match(net.name))
        if rules.references
        else frozenset(),
        () if own is None else own.placed,
    )


def _spelled(net: Net) -> tuple[str, ...]:
    """All names of a net as words; none if the files give it none."""
    return tuple(s for one in net.name.split("|") for s in spellings(one)) if net.given else ()


def _by_others(net: Net, found: Class, others: frozenset[str], by_name: dict[str, Class]) -> Class:
    """What the names of other nets make of the class of one.

    (1) A serial clock beside a net that is called the same but for ``SDA`` is the clock of that
    two-wire bus, not of SPI. (2) Memory whose name does not say which is of the generation that
    other names of the board tell (``VREF_DDR3``), if they tell but one. Common practice, no source.
    """
    if found.name == "spi" and "i2c" in by_name:
        clocks = [one for one in _spelled(net) if one.endswith("SCK")]
        if clocks and all(one.removesuffix("SCK") + "SDA" in others for one in clocks):
            return by_name["i2c"]
    if found.name == "ddr":
        told = [one for one in _GENERATIONS if any(one.upper() in other for other in others)]
        if len(told) == 1 and told[0] in by_name:
            return by_name[told[0]]
    return found


def class_of(name: str, rules: Rules) -> tuple[Class, KnownBy]:
    r"""The class of a net by its name alone.

    Examples
    --------
    >>> from splitcheck.verdict.packs import shipped_rules
    >>> def named(name):
    ...     return class_of(name, shipped_rules())[0].name
    >>> [named(name) for name in ("/mcu/I2C_SDA", "LED2", "LED_CLK", "PE17\\LED2", "PE17\\INT")]
    ['i2c', 'led', 'clock', 'default', 'gpio']
    """
    asked: list[Class | None] = []
    for part in name.split("|"):
        whole = [one for one in rules.classes if _names_match(one, part)]
        words = spellings(part) or ("",) * bool(whole)
        asked.extend(_first(rules, spelling, whole) for spelling in words)
    known = [one for one in asked if one is not None]
    if not known:
        parts = [_first(rules, part_spelling(part), ()) for part in name.split("|")]
        told = [one for one in parts if one is not None and not one.exempt]
        if told:
            return min(told, key=lambda one: one.rise_ns), "name"
        return rules.default, "nothing"
    all_of = [rules.default if one is None else one for one in asked]
    if any(not one.exempt for one in known):  # then a port's name is no second use of the net
        ports = [bool(_PORT.match(word)) for part in name.split("|") for word in spellings(part)]
        if len(ports) == len(asked):
            all_of = [
                one
                for one, raw, port in zip(all_of, asked, ports, strict=True)
                if not (port and raw is None)
            ]
    awake = [one for one in all_of if not one.exempt]
    best = min(awake or all_of, key=lambda one: one.rise_ns)
    return best, "name" if best in known else "nothing"


def _first(rules: Rules, spelling: str, whole: Sequence[Class]) -> Class | None:
    """The first class that knows a spelling of a name, or the whole name."""
    for one in rules.classes:
        if one in whole:
            return one
        if _words(one.words).match(spelling) and not _words(one.unless).match(spelling):
            return one
    return None


def _names_match(one: Class, name: str) -> bool:
    if not one.names or not _names(one.names).match(name):
        return False
    return not any(_words(one.unless).match(spelling) for spelling in spellings(name))


@cache
def _words(patterns: tuple[str, ...]) -> Words:
    return Words(patterns)


@cache
def _names(patterns: tuple[str, ...]) -> Names:
    return Names(patterns)


def _told(told: Assignment, found: Class, by_name: dict[str, Class]) -> Class:
    """The class that an assignment makes of a net, with its own rise time and current."""
    net_class = found if told.net_class is None else by_name[told.net_class]
    if told.rise_ns is not None:
        net_class = replace(net_class, rise_ns=told.rise_ns, exempt=False)
    if told.current_ma is not None:
        wave = told.current_ma * net_class.line_ohm
        net_class = replace(net_class, wave_mv=wave, exempt=False)
    return net_class


def _assigned(board: Board, rules: Rules) -> dict[int, Assignment]:
    """The assignment of each net that has one."""
    exact: dict[int, Assignment] = {}
    loose: dict[int, Assignment] = {}
    for told in rules.assignments:
        names = Names([told.key])
        for net in board.nets:
            if told.key.upper() in ways_to_write(net.name):
                before = exact.setdefault(net.number, told)
                if not _same(before, told):
                    _contradict(before, told, net.name)
            elif is_pattern(told.key) and names.match(net.name):
                loose.setdefault(net.number, told)
    return {**loose, **exact}


def _same(one: Assignment, other: Assignment) -> bool:
    return replace(one, key="", source=other.source) == replace(other, key="")


def _contradict(one: Assignment, other: Assignment, name: str) -> None:
    wrong = f"the net {name!a} is told something else in line {one.source.line}"
    place = f"{other.source.file}:{other.source.line}"
    raise SplitcheckError(place, wrong, "leave one of the two")


def _check_classes(rules: Rules) -> None:
    names = [one.name for one in rules.classes]
    for told in rules.assignments:
        if told.net_class is not None and told.net_class not in names:
            near = get_close_matches(told.net_class[:100], names, 1, 0.5)
            do = (
                f"did you mean {near[0]}" if near else f"the classes are {', '.join(sorted(names))}"
            )
            place = f"{told.source.file}:{told.source.line}"
            raise SplitcheckError(place, f"there is no class {told.net_class[:60]!a}", do)


def _check(board: Board, own: RulesFile) -> None:
    """Refuse names and patterns of a board's own file that match nothing on it."""
    names = [net.name for net in board.nets]
    words = [spelling for name in names for spelling in spellings(name)]
    for entry in own.classes:
        for pattern in entry.listed("names"):
            _must(Names([pattern]), names, pattern, entry.place_of("names"))
        for pattern in entry.listed("words"):
            _must(Words([pattern]), words, pattern, entry.place_of("words"))
    for told in own.assignments:
        _must(Names([told.key]), names, told.key, f"{told.source.file}:{told.source.line}")
    for one in own.references:
        _must(Names([one.text]), names, one.text, one.place)
    seen: dict[str, str] = {}
    for pair in own.pairs:
        for leg in pair.nets:
            _must(Names([leg]), names, leg, pair.place)
            if seen.setdefault(leg, pair.place) != pair.place:
                wrong = f"the net {leg!a} is in another pair, {seen[leg]}"
                raise SplitcheckError(pair.place, wrong, "a net is in one pair at most")
    refs = {part.ref for part in board.components}
    for one in own.capacitors:
        if one.text not in refs:
            near = get_close_matches(one.text, sorted(refs), 1, 0.5)
            do = f"did you mean {near[0]}" if near else "splitcheck read tells the components"
            if not refs:
                do = "take it out: no file of this export names any component"
            raise SplitcheckError(one.place, f"no component is called {one.text!a}", do)


def _must(pattern: Names | Words, texts: Sequence[str], written: str, place: str) -> None:
    if any(pattern.match(text) for text in texts):
        return
    plain = sorted({text.rsplit("/", 1)[-1] for text in texts})
    near = get_close_matches(written.upper(), [text.upper() for text in plain], 1, 0.6)
    do = f"did you mean {near[0][:60]!a}" if near else "splitcheck read lists the nets"
    raise SplitcheckError(place, f"{written!a} matches no net of this board", do)


def _on_board(board: Board, pair: tuple[str, str]) -> tuple[str, str]:
    """The two nets of a pair by the names that the board has for them, if it has any."""
    names = [
        next((net.name for net in board.nets if leg.upper() in ways_to_write(net.name)), leg)
        for leg in pair
    ]
    return names[0], names[1]


def _at_crystals(board: Board) -> frozenset[int]:
    """Nets at the pins of crystals and oscillators."""
    return frozenset(
        pin.net
        for part in board.components
        if prefix(part.ref) in _CRYSTALS and len(part.pins) <= _CRYSTAL_PINS
        for pin in part.pins
        if pin.net >= 0
    )


def count_by_class(drives: Iterable[Class]) -> tuple[tuple[str, int], ...]:
    """How many nets each class has, by name."""
    counts: dict[str, int] = {}
    for one in drives:
        counts[one.name] = counts.get(one.name, 0) + 1
    return tuple(sorted(counts.items()))
