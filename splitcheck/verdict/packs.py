"""The rules that ship, and how a board's own file changes them."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from pathlib import Path
from typing import Any

from splitcheck.errors import SplitcheckError
from splitcheck.verdict.rules import DEFAULT_CLASS, Class, Rules, SupplyReference
from splitcheck.verdict.rulesfile import ClassEntry, RulesFile, read_rules


def rules_folder() -> Path:
    """Where the shipped rules are: in the installed package, or at the top of a checkout.

    Raises
    ------
    SplitcheckError
        If they are in neither.
    """
    package = Path(__file__).resolve().parent.parent
    for folder in (package / "_data" / "rules", package.parent / "rules"):
        if folder.is_dir():
            return folder
    raise SplitcheckError("rules", "the shipped rules are not installed", "install it again")


@cache
def shipped_files() -> tuple[RulesFile, ...]:
    """The shipped files of rules, by name."""
    files = sorted(rules_folder().glob("*.toml"))
    return tuple(read_rules(file.read_text(encoding="utf-8"), file.name) for file in files)


@cache
def shipped_rules() -> Rules:
    """The rules that hold where a board has none of its own.

    Examples
    --------
    >>> [one.rise_ns for one in shipped_rules().classes if one.name in ("i2c", "lvds")]
    [0.3, 20.0]
    """
    return rules_of(shipped_files())


def rules_of(files: Sequence[RulesFile], own: RulesFile | None = None) -> Rules:
    """Put files of rules together.

    Parameters
    ----------
    files
        The shipped ones.
    own
        The board's, which goes before them: key by key for classes that both have; its classes with
        patterns of their own are asked first.

    Raises
    ------
    SplitcheckError
        If the own file names a class that nobody describes.
    """
    known: dict[str, ClassEntry] = {entry.name: entry for one in files for entry in one.classes}
    numbers: dict[str, float] = {key: value for one in files for key, value in one.numbers}
    stated = (one.supply_reference for one in files if one.supply_reference)
    supply: SupplyReference = next(stated, "allowed")
    merged = {name: dict(entry.changes) for name, entry in known.items()}
    first: list[str] = []
    if own is not None:
        numbers.update(own.numbers)
        supply = own.supply_reference or supply
        for entry in own.classes:
            merged[entry.name] = {**_base(entry, merged), **dict(entry.changes)}
            if entry.listed("words") or entry.listed("names") or entry.name not in known:
                first.append(entry.name)
    shares = (numbers.pop("error_share", 0.06), numbers.pop("warning_share", 0.02))
    order = [*first, *(name for name in merged if name not in first)]
    return Rules(
        classes=tuple(_built(name, merged[name], shares) for name in order),
        assignments=() if own is None else own.assignments,
        supply_reference=supply,
        pairs=() if own is None else tuple(pair.nets for pair in own.pairs),
        references=() if own is None else tuple(one.text for one in own.references),
        capacitors=() if own is None else tuple(one.text for one in own.capacitors),
        waivers=() if own is None else own.waivers,
        **numbers,
    )


def _base(entry: ClassEntry, merged: dict[str, dict[str, Any]]) -> dict[str, Any]:
    """What a class of the own file starts from: itself as shipped, or the one that it is like."""
    if entry.like is None:
        return merged.get(entry.name, {})
    if entry.like not in merged:
        place = f"{entry.place}: class {entry.name}"
        known = ", ".join(sorted(merged))
        raise SplitcheckError(place, f"there is no class {entry.like!r}", f"take one of {known}")
    patterns = ("words", "names", "unless")
    return {key: value for key, value in merged[entry.like].items() if key not in patterns}


def _built(name: str, given: dict[str, Any], shares: tuple[float, float]) -> Class:
    wave = given.get("wave_mv", DEFAULT_CLASS.wave_mv)
    start = {
        "rise_ns": DEFAULT_CLASS.rise_ns,
        "line_ohm": DEFAULT_CLASS.line_ohm,
        "error_mv": round(shares[0] * wave, 6),
        "warning_mv": round(shares[1] * wave, 6),
    }
    return Class(name=name, **{**start, "wave_mv": wave, **given})
