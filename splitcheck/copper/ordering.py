"""From what is claimed of each copper file to their order from top to bottom."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping, Sequence
from itertools import pairwise
from typing import NamedTuple

from splitcheck.copper.naming import Role
from splitcheck.errors import SplitcheckError

_MOST_ARRANGEMENTS = 50_000
#: Counts whose numbers do not say from which layer they count, or that planes are counted too.
_UNSURE = frozenset({"g", "gp", "signal", "ground", "supply"})


class Candidate(NamedTuple):
    """One copper file to be ordered."""

    file: str
    words: str
    """The part of its name that tells the layer."""
    side: str | None
    family: str
    number: int | None
    role: Role | None
    source: str
    """Where the claim comes from: ``attribute``, ``comment``, ``job`` or ``name``."""


def order(candidates: Sequence[Candidate]) -> tuple[tuple[Candidate, ...], tuple[str, ...]]:
    """Order copper files from top to bottom.

    Parameters
    ----------
    candidates
        One or more, no two of them for the same layer.

    Returns
    -------
    The files from top to bottom, and what had to be assumed, in sentences.

    Raises
    ------
    SplitcheckError
        If declared layer numbers leave a gap, or nothing bounds the number of possible orders.
    """
    outer = {c.side: c for c in candidates if c.side in ("top", "bottom")}
    inner = [c for c in candidates if c.side not in ("top", "bottom")]
    _check_gaps(candidates)
    assumptions: list[str] = []
    families = {c.family for c in inner}
    names = ", ".join(c.file for c in sorted(inner, key=_leading))
    if len(families) <= 1 and all(c.number is not None for c in inner):
        inner.sort(key=_number)
        if len(inner) > 1 and families <= _UNSURE:
            names = ", ".join(c.file for c in inner)
            assumptions.append(
                f"The inner layers are taken in the order of their numbers ({names});"
                " --stack FILE.toml sets another order."
            )
    elif len({_leading(c) for c in candidates if c.words[:1].isdecimal()}) == len(candidates):
        inner.sort(key=_leading)
        assumptions.append(
            f"The inner layers are taken in the order of the numbers that their names begin with"
            f" ({names}); --stack FILE.toml sets another order."
        )
    else:
        inner = list(_arranged(inner, outer))
        names = ", ".join(c.file for c in inner)
        assumptions.append(
            "The order of the inner layers is stated nowhere and was assumed from their names"
            f" and the custom of stacks ({names}); --stack FILE.toml sets it."
        )
    ends = [outer[side] for side in ("top", "bottom") if side in outer]
    if len(ends) < 2 and inner and any(c.family != "layer" for c in inner):
        missing = " and ".join(s for s in ("top", "bottom") if s not in outer)
        assumptions.append(f"No file says that it is the {missing} copper.")
    top, bottom = ([outer[s]] if s in outer else [] for s in ("top", "bottom"))
    return (*top, *inner, *bottom), tuple(assumptions)


def _number(candidate: Candidate) -> int:
    return candidate.number if candidate.number is not None else 0


def _leading(candidate: Candidate) -> int:
    """The number that the name begins with, or 0."""
    digits = re.match(r"\d{1,3}", candidate.words)
    return int(digits[0]) if digits else 0


def _check_gaps(candidates: Sequence[Candidate]) -> None:
    """Layer numbers declared inside the files must run without a gap.

    Those of a job file or of file names are only used for their order: some writers count
    there by other rules.
    """
    declared = [
        c for c in candidates if c.family == "layer" and c.source in ("attribute", "comment")
    ]
    numbers = {_number(c) for c in declared}
    if len(declared) < len(candidates) or not numbers:
        return
    missing = [f"L{n}" for n in range(1, min(max(numbers), 999) + 1) if n not in numbers]
    if missing:
        last = max(declared, key=_number)
        wrong = f"is copper layer L{last.number}, but no file is {', '.join(missing[:20])}"
        do = "add the missing file, or list the layers with --stack FILE.toml"
        raise SplitcheckError(last.file, wrong, do)


def _arranged(inner: Sequence[Candidate], outer: Mapping[str, Candidate]) -> tuple[Candidate, ...]:
    """The most customary of all orders that keep the numbers within each family rising."""
    families: dict[str, list[Candidate]] = {}
    for c in sorted(inner, key=lambda c: (c.family, _number(c), c.file)):
        key = c.family if c.number is not None else f"{c.family} {c.file}"
        families.setdefault(key, []).append(c)
    rows = [tuple(row) for _, row in sorted(families.items())]
    count = math.factorial(len(inner)) // math.prod(math.factorial(len(row)) for row in rows)
    if count > _MOST_ARRANGEMENTS:
        wrong = f"nothing tells the order of the {len(inner)} inner copper layers"
        raise SplitcheckError(inner[0].file, wrong, "list the layers with --stack FILE.toml")
    ends = ("top" in outer, "bottom" in outer)
    return min(_merges(rows), key=lambda stack: _oddness(stack, ends))


def _merges(rows: Sequence[tuple[Candidate, ...]]) -> Iterator[tuple[Candidate, ...]]:
    if not any(rows):
        yield ()
        return
    for i, row in enumerate(rows):
        if row:
            rest = [*rows[:i], row[1:], *rows[i + 1 :]]
            for tail in _merges(rest):
                yield (row[0], *tail)


def _oddness(stack: tuple[Candidate, ...], ends: tuple[bool, bool]) -> tuple[object, ...]:
    """How far a stack is from custom (common practice, no source), worst point first.

    1. each signal layer, outer ones too, lies next to a plane; 2. planes and signal layers lie
    the same way from either side, against warp; 3. each supply plane lies next to a ground
    plane; 4. neighbours -X and -Y stay together; 5. ground comes before supply; 6. names rise.
    """
    plane = [c.role in ("ground", "supply") for c in stack]
    roles: list[str] = [c.role or "signal" for c in stack]
    whole = [*([False] * ends[0]), *plane, *([False] * ends[1])]
    bare = sum(
        not is_plane and not any(whole[max(0, i - 1) : i + 2]) for i, is_plane in enumerate(whole)
    )
    skew = sum(a != b for a, b in zip(plane, reversed(plane), strict=True))
    lone = sum(
        role == "supply" and "ground" not in roles[max(0, i - 1) : i + 2]
        for i, role in enumerate(roles)
    )
    axes = [c.words.casefold()[-2:] for c in stack]
    together = sum(a[-1:] == "x" and b[-1:] == "y" for a, b in pairwise(axes))
    supply_height = -sum(i for i, role in enumerate(roles) if role == "supply")
    return bare, skew, lone, -together, supply_height, [c.file for c in stack]
