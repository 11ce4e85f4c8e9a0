"""A file of rules in, checked, out: the packs that ship and a board's own ``splitcheck.toml``.

Both are written in the same keys; see README for them. What needs the board (whether a pattern
matches a net) is checked in ``classes.py``.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, get_args

from splitcheck.errors import SplitcheckError
from splitcheck.verdict.entries import Table, check_pattern, shown
from splitcheck.verdict.findings import Kind, Point, Source
from splitcheck.verdict.rules import WAIVED_RADIUS_MM, Assignment, SupplyReference, Waiver
from splitcheck.verdict.tomltext import read_toml

#: The name of a board's own file of rules.
RULES_FILE = "splitcheck.toml"

_NUMBERS: dict[str, tuple[float, float]] = {
    "rise_ns": (0.001, 1e5),
    "wave_mv": (0.1, 1e6),
    "line_ohm": (1.0, 1000.0),
    "error_mv": (0.0, 1e6),
    "warning_mv": (0.0, 1e6),
    "note_mv": (0.0, 1e6),
    "error_nh": (0.0, 1e6),
    "warning_nh": (0.0, 1e6),
    "change_mm": (0.0, 1000.0),
    "change_warning_nh": (0.0, 1e6),
}
_LISTS = ("words", "names", "unless")
_FLAGS = ("differential", "exempt")
_CLASS_KEYS = (*_NUMBERS, *_LISTS, *_FLAGS, "about", "like", "source")
_FILE_KEYS = (
    "class", "nets", "reference", "supply_reference", "capacitors", "capacitor", "pair", "waive",
    "plane_change", "edge_run", "error_share", "warning_share", "never_exempt", "source",
)  # fmt: skip
_PLACED = ("ref", "pads_mm", "side")
_ASSIGNED = ("class", "rise_ns", "current_ma")
_WAIVED = ("net", "kind", "at_mm", "radius_mm", "fingerprint", "reason", "until")


@dataclass(frozen=True, slots=True)
class Listed:
    """One text of a list, and where it stands."""

    text: str
    place: str


@dataclass(frozen=True, slots=True)
class ClassEntry:
    """What a file says of one class: only the keys that it gives."""

    name: str
    place: str
    like: str | None
    changes: tuple[tuple[str, Any], ...]
    places: tuple[tuple[str, str], ...] = ()
    """Where each of its lists stands."""

    def listed(self, key: str) -> tuple[str, ...]:
        """Patterns of one of its lists."""
        found: tuple[str, ...] = dict(self.changes).get(key, ())
        return found

    def place_of(self, key: str) -> str:
        """Where one of its lists stands."""
        return dict(self.places).get(key, self.place)


@dataclass(frozen=True, slots=True)
class PairEntry:
    """Two nets that are a pair, as written."""

    nets: tuple[str, str]
    place: str


@dataclass(frozen=True, slots=True)
class PlacedCapacitor:
    """A capacitor by the places of its two pads."""

    ref: str
    pads_mm: tuple[Point, Point]
    top: bool
    """Whether it is on the upper side of the board."""
    place: str


@dataclass(frozen=True, slots=True)
class RulesFile:
    """A file of rules, each value checked for itself."""

    name: str
    classes: tuple[ClassEntry, ...] = ()
    assignments: tuple[Assignment, ...] = ()
    numbers: tuple[tuple[str, float], ...] = ()
    """Fields of ``Rules`` that are numbers, and the shares for thresholds."""
    supply_reference: SupplyReference | None = None
    references: tuple[Listed, ...] = ()
    capacitors: tuple[Listed, ...] = ()
    placed: tuple[PlacedCapacitor, ...] = ()
    pairs: tuple[PairEntry, ...] = ()
    waivers: tuple[Waiver, ...] = ()


def read_rules(text: str, name: str) -> RulesFile:
    r"""Read a file of rules.

    Parameters
    ----------
    text
        Its contents, TOML.
    name
        Its name, for messages and for where a waiver stands.

    Raises
    ------
    SplitcheckError
        With file and line: not TOML, an unknown key, a wrong unit, a value that cannot be.

    Examples
    --------
    >>> read = read_rules('reference = ["PE"]\n[class.spi]\nrise_ns = 0.8', "splitcheck.toml")
    >>> read.references[0].text, read.classes[0].changes
    ('PE', (('rise_ns', 0.8),))
    """
    toml = read_toml(text, name)
    top = Table(toml, (), toml.data)
    top.allow(_FILE_KEYS)
    never = top.texts("never_exempt") or ()
    classes = top.table("class")
    nets = top.table("nets")
    return RulesFile(
        name,
        tuple(_class(classes, key, never) for key in classes.data) if classes else (),
        tuple(_assignment(nets, key) for key in nets.data) if nets else (),
        tuple(_top_numbers(top)),
        top.choice("supply_reference", get_args(SupplyReference)),
        _listed(top, "reference"),
        _listed(top, "capacitors"),
        tuple(_placed(table, number) for number, table in enumerate(top.tables("capacitor"), 1)),
        tuple(_pair(table) for table in top.tables("pair")),
        tuple(_waiver(table) for table in top.tables("waive")),
    )


def _listed(top: Table, key: str) -> tuple[Listed, ...]:
    return tuple(Listed(text, top.place(key)) for text in top.texts(key) or ())


def _class(classes: Table, name: str, never: tuple[str, ...]) -> ClassEntry:
    table = classes.table(name)
    assert table is not None
    if not name.strip() or len(name) > 40 or not name.isascii() or not name.isprintable():
        raise SplitcheckError(
            table.place(), f"class {shown(name)}", "name it with 1 to 40 plain characters"
        )
    table.allow(_CLASS_KEYS)
    changes: dict[str, Any] = {key: table.number(key, *span) for key, span in _NUMBERS.items()}
    changes.update({key: table.texts(key) for key in _LISTS})
    changes.update({key: table.flag(key) for key in _FLAGS})
    changes["source"] = _source(table)
    if changes["exempt"] and never:
        changes["unless"] = (*(changes["unless"] or ()), *never)
    table.words("about")
    _in_order(table, "warning_mv", "error_mv")
    _in_order(table, "warning_nh", "error_nh")
    given = tuple((key, value) for key, value in changes.items() if value is not None)
    places = tuple((key, table.place(key)) for key in _LISTS if key in table.data)
    return ClassEntry(name, table.place(), table.words("like"), given, places)


def _in_order(table: Table, low: str, high: str) -> None:
    """A warning comes before an error."""
    least, most = table.data.get(low), table.data.get(high)
    if least is not None and most is not None and least > most:
        wrong = f"{low} = {least:g} is more than {high} = {most:g}"
        raise SplitcheckError(table.place(low), wrong, "a warning begins below an error")


def _source(table: Table) -> str | None:
    """Where the numbers of a class come from, as one text: a text, or one for each key."""
    given = table.data.get("source")
    if not isinstance(given, dict):
        return table.words("source")
    inner = table.table("source")
    assert inner is not None
    inner.allow(_CLASS_KEYS)
    by_text: dict[str, list[str]] = {}
    for key in inner.data:
        by_text.setdefault(inner.words(key) or "", []).append(key)
    return "; ".join(f"{', '.join(keys)}: {text}" for text, keys in by_text.items()) or None


def _assignment(nets: Table, key: str) -> Assignment:
    check_pattern(key, nets.place(key))
    source = Source(nets.text.name, nets.line(key))
    value = nets.data[key]
    if isinstance(value, str) and value.strip():
        return Assignment(key, source, value)
    if not isinstance(value, dict) or not value:
        wrong = f"{shown(key)} = {shown(value)}"
        do = 'write the name of a class, or { class = "spi", rise_ns = 0.8 }'
        raise SplitcheckError(nets.place(key), wrong, do)
    table = nets.table(key)
    assert table is not None
    table.allow(_ASSIGNED)
    return Assignment(
        key,
        source,
        table.words("class"),
        table.number("rise_ns", *_NUMBERS["rise_ns"]),
        table.number("current_ma", 0.001, 1e6),
    )


def _top_numbers(top: Table) -> list[tuple[str, float]]:
    found = [(key, top.number(key, 0.0, 2.0)) for key in ("error_share", "warning_share")]
    change = top.table("plane_change")
    if change is not None:
        change.allow(("within_mm", "warning_nh"))
        found.append(("change_mm", change.number("within_mm", *_NUMBERS["change_mm"])))
        found.append(("change_warning_nh", change.number("warning_nh", 0.0, 1e6)))
    edge = top.table("edge_run")
    if edge is not None:
        edge.allow(("heights", "mm"))
        found.append(("edge_heights", edge.number("heights", 0.0, 100.0)))
        found.append(("edge_mm", edge.number("mm", 0.0, 100.0)))
    return [(key, value) for key, value in found if value is not None]


def _placed(table: Table, number: int) -> PlacedCapacitor:
    table.allow(_PLACED)
    pads = table.points("pads_mm")
    if pads is None or len(pads) != 2 or pads[0] == pads[1]:
        wrong = "a capacitor has two pads at two places"
        do = "write pads_mm = [[x, y], [x, y]], in mm"
        raise SplitcheckError(table.place("pads_mm"), wrong, do)
    side = table.choice("side", ("top", "bottom")) or "top"
    ref = table.pattern("ref") or f"capacitor {number}"
    return PlacedCapacitor(ref, (pads[0], pads[1]), side == "top", table.place("pads_mm"))


def _pair(table: Table) -> PairEntry:
    table.allow(("nets",))
    nets = table.texts("nets") or ()
    if len(nets) != 2 or nets[0] == nets[1]:
        wrong = f"a pair of {len(set(nets))} nets"
        raise SplitcheckError(table.place("nets"), wrong, 'write nets = ["one leg", "other leg"]')
    return PairEntry((nets[0], nets[1]), table.place("nets"))


def _waiver(table: Table) -> Waiver:
    table.allow(_WAIVED)
    reason = table.words("reason")
    if reason is None:
        do = 'write reason = "why it may stay"'
        raise SplitcheckError(table.place(), "a waiver without a reason", do)
    at_mm = table.point("at_mm")
    radius = table.number("radius_mm", 0.001, 1000.0)
    if radius is not None and at_mm is None:
        raise SplitcheckError(table.place("radius_mm"), "radius_mm without a place", "add at_mm")
    waiver = Waiver(
        " ".join(reason.split()),
        Source(table.text.name, table.line()),
        table.pattern("net"),
        table.choice("kind", get_args(Kind)),
        at_mm,
        WAIVED_RADIUS_MM if radius is None else radius,
        table.words("fingerprint"),
        table.day("until"),
    )
    if (waiver.net, waiver.kind, waiver.at_mm, waiver.fingerprint) == (None, None, None, None):
        wrong = "a waiver of everything"
        do = "say what it waives by net, kind, at_mm or fingerprint"
        raise SplitcheckError(table.place(), wrong, do)
    return waiver
