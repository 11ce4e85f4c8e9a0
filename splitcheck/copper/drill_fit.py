"""From the numbers of a drill file and the pads of the copper to the format that fits them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import NamedTuple, TypeAlias

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.copper.drill_script import Script, Unit, Zeros
from splitcheck.units import INCH_MM, Floats

Bools: TypeAlias = NDArray[np.bool_]
Ints: TypeAlias = NDArray[np.int64]

#: A hole sits on a pad if their centres are this close, mm.
NEAR_MM = 0.06


class Format(NamedTuple):
    """One way to read the numbers of a drill file."""

    unit: Unit
    whole: int
    """Digits before the decimal point."""
    decimal: int
    """Digits after it."""
    zeros: Zeros
    """Which zeros are kept."""

    def words(self, all_decimal: bool) -> str:
        """The format in words.

        Examples
        --------
        >>> Format("mm", 4, 4, "leading").words(False), Format("inch", 2, 4, "leading").words(True)
        ('metric, 4.4, leading zeros kept', 'inch, decimal points')
        """
        unit = "metric" if self.unit == "mm" else "inch"
        if all_decimal:
            return f"{unit}, decimal points"
        return f"{unit}, {self.whole}.{self.decimal}, {self.zeros} zeros kept"

    def value_mm(self, word: str) -> float:
        """Value of a number as written, mm, on the 1 nm grid.

        Examples
        --------
        >>> Format("mm", 3, 3, "leading").value_mm("0125")
        12.5
        >>> Format("mm", 3, 3, "trailing").value_mm("1250")
        1.25
        """
        unit_mm = 1.0 if self.unit == "mm" else INCH_MM
        if "." in word:
            return round(float(word) * unit_mm, 6)
        digits = word.lstrip("+-")
        number = int(digits)
        # Leading zeros kept: digits count from the left. Trailing kept: from the right.
        places = len(digits) - self.whole if self.zeros == "leading" else self.decimal
        value = number / 10**places if places >= 0 else float(number * 10**-places)
        return round(value * unit_mm * (-1 if word.startswith("-") else 1), 6)


class Fit(NamedTuple):
    """How well one format fits the copper."""

    format: Format
    share: float
    """Share of holes whose centre lies on a pad, 0 to 1; each pad counts once."""


def default(script: Script) -> Format:
    """The stated format, filled up with the defaults of the trade.

    Notes
    -----
    Without digits: 2.4 in inch, 3.3 in metric; without LZ or TZ: leading zeros kept
    (IPC-NC-349, from memory); without units: inch, the machine's power-up state.
    """
    unit: Unit = script.unit or "inch"
    whole, decimal = script.digits or ((3, 3) if unit == "mm" else (2, 4))
    return Format(unit, whole, decimal, script.zeros or "leading")


def states_all(script: Script) -> bool:
    """Whether the file itself says how its numbers are to be read."""
    if script.unit is None:
        return False
    return script.all_decimal() or (script.digits is not None and script.zeros is not None)


def candidates(script: Script) -> list[Format]:
    """Formats worth trying, likeliest first; what the file states comes before what it does not."""
    first = default(script)
    units: Sequence[Unit] = (first.unit, "inch" if first.unit == "mm" else "mm")
    found = [first]
    longest = script.longest_number()
    for unit in units:
        if script.all_decimal():
            found.append(first._replace(unit=unit))
            continue
        wholes = (3, 4, 2, 5) if unit == "mm" else (2, 3, 1)
        decimals = (3, 4, 2, 5, 6) if unit == "mm" else (4, 5, 3, 6)
        kept: Sequence[Zeros] = (first.zeros, "trailing" if first.zeros == "leading" else "leading")
        if script.digits:
            found += [Format(unit, *script.digits, zeros) for zeros in kept]
        for zeros in kept:
            if zeros == "leading":
                found += [
                    Format(unit, whole, max(decimals[0], longest - whole), zeros)
                    for whole in wholes
                ]
            else:
                found += [Format(unit, wholes[0], decimal, zeros) for decimal in decimals]
    return list(dict.fromkeys(found))


def share_on_pads(centres: Floats, pads: Floats) -> float:
    """Share of hole centres that lie on a pad, 0 to 1.

    Parameters
    ----------
    centres
        Hole centres, shape (n, 2), mm.
    pads
        Pad centres, shape (m, 2), mm, each place once.

    Notes
    -----
    A pad counts once, or a wrong scale that draws all holes together on one pad would win.
    """
    if not len(centres) or not len(pads):
        return 0.0
    hit, index = _nearest(_tree(pads), centres, NEAR_MM)
    return min(float(np.mean(hit)), len(np.unique(index)) / len(np.unique(centres, axis=0)))


def _tree(places: Floats) -> shapely.STRtree:
    return shapely.STRtree(_points(places))


def _points(places: Floats) -> NDArray[np.object_]:
    return np.asarray(shapely.points(places.reshape(-1, 2)), dtype=object).reshape(-1)


def _nearest(tree: shapely.STRtree, points: Floats, reach_mm: float) -> tuple[Bools, Ints]:
    """Which points have a neighbour in reach, and the number of that neighbour for those."""
    found = tree.query_nearest(_points(points), max_distance=reach_mm, all_matches=False)
    hit: Bools = np.zeros(len(points), dtype=np.bool_)
    hit[found[0]] = True
    return hit, np.asarray(found[1], dtype=np.int64)


def rank(
    formats: Iterable[Format], pads: Floats, centres_of: Callable[[Format], Floats]
) -> list[Fit]:
    """Score formats against the pads, best first; among equals the earlier comes first."""
    fits = [Fit(form, share_on_pads(centres_of(form), pads)) for form in formats]
    return sorted(fits, key=lambda fit: -round(fit.share, 3))


def shift_between(centres: Floats, pads: Floats) -> tuple[float, float, float]:
    """Shift that brings most hole centres onto pads, and the share that then lies on one.

    Parameters
    ----------
    centres, pads
        Places, shape (n, 2) and (m, 2), mm.

    Returns
    -------
    dx and dy in mm, and the share, 0 to 1; (0, 0, 0) if there is nothing to compare.

    Notes
    -----
    Differences of a spread sample vote in two grids; the fullest cells are refined and checked
    against all.
    """
    if not len(centres) or not len(pads):
        return 0.0, 0.0, 0.0
    few = centres[:: max(1, len(centres) // 150)]
    many = pads[:: max(1, len(pads) // 20_000)]
    differences = (many[None, :, :] - few[:, None, :]).reshape(-1, 2)
    best = (0.0, 0.0, 0.0)
    tree = _tree(pads)
    for first in _fullest(differences):
        shift = first
        for _ in range(2):
            hit, index = _nearest(tree, centres + shift, 3 * NEAR_MM)
            if hit.any():
                shift = shift + np.median(pads[index] - centres[hit] - shift, axis=0)
        share = share_on_pads(centres + shift, pads)
        if share > best[2]:
            best = (round(float(shift[0]), 6), round(float(shift[1]), 6), share)
    return best


def _fullest(differences: Floats) -> list[Floats]:
    """Medians of the fullest cells of two grids, half a cell apart: none is parted by both."""
    cell_mm = 2 * NEAR_MM
    fullest: list[Floats] = []
    for offset in (0.0, 0.5):
        cells = np.floor(differences / cell_mm + offset).astype(np.int64)
        cells -= cells.min(axis=0)
        keys = cells[:, 0] * (int(cells[:, 1].max()) + 1) + cells[:, 1]
        values, votes = np.unique(keys, return_counts=True)
        fullest.extend(
            np.median(differences[keys == key], axis=0)
            for key in values[np.argsort(-votes, kind="stable")[:6]]
        )
    return fullest


def unique_places(points: object) -> Floats:
    """Places as an array of shape (n, 2), mm, each once, sorted."""
    array = np.asarray(points, dtype=np.float64).reshape(-1, 2)
    return np.unique(np.round(array, 3), axis=0) if len(array) else array


def spread_mm(points: Floats) -> tuple[float, float]:
    """Width and height of the box round places, mm."""
    if not len(points):
        return 0.0, 0.0
    width, height = points.max(axis=0) - points.min(axis=0)
    return float(width), float(height)
