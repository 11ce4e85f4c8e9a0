"""From a drill file and the copper pads to the number format it is read by, and why."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from splitcheck.copper import drill_fit
from splitcheck.copper.drill_fit import Fit, Format
from splitcheck.copper.drill_play import play
from splitcheck.copper.drill_script import Script
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.units import Floats

#: Share of holes on pads from which a format counts as right.
_RIGHT = 0.5
#: ... from which it overrules what the file states.
_CLEAR = 0.6
#: ... from which a shift is believed.
_SHIFT_CLEAR = 0.8
#: So many holes tell a format; more only take time.
_SAMPLE = 4000
#: Fewer holes than this on pads overrule nothing.
_FEW = 5


class Choice(NamedTuple):
    """How the numbers of a drill file are read."""

    format: Format
    shift_mm: Point
    """Added to every place; (0, 0) unless the file has another origin than the copper."""
    remarks: tuple[str, ...]


def choose(script: Script, pads: Floats) -> Choice:
    """Choose the format to read the numbers of a drill file by.

    Parameters
    ----------
    script
        The file taken apart.
    pads
        Pad centres, shape (n, 2), mm, each place once; may be empty.

    Returns
    -------
    The format, the shift to the copper's origin, and what led to them in sentences; what was
    assumed says so.

    Raises
    ------
    SplitcheckError
        If the copper contradicts a stated format by its scale and no other fits.
    """
    base = drill_fit.default(script)
    stated = drill_fit.states_all(script)
    if not play(script, base, 1):
        return Choice(base, (0.0, 0.0), (f"{script.name}: drills no holes",))
    words = base.words(script.all_decimal())
    if not len(pads):
        guess = f"{script.name}: the number format is not stated; read as {words}, unchecked"
        return Choice(base, (0.0, 0.0), () if stated else (guess,))
    first = Fit(base, drill_fit.share_on_pads(_centres(script, base), pads))
    if stated and first.share >= _RIGHT:
        return Choice(base, (0.0, 0.0), (_said(script, first),))
    ranked = drill_fit.rank(drill_fit.candidates(script), pads, lambda f: _centres(script, f))
    best = ranked[0]
    count = len(_centres(script, base))
    if stated:
        return _overruled(script, first, best, pads, count)
    if best.share >= _RIGHT or (best.share >= 0.3 and count >= 10):
        return Choice(best.format, (0.0, 0.0), (_said(script, best, ranked),))
    moved = _shifted(script, [fit.format for fit in ranked], pads)
    return moved or _by_spread(script, ranked, pads)


def _overruled(script: Script, first: Fit, best: Fit, pads: Floats, count: int) -> Choice:
    """What to do with a stated format that few pads bear out.

    Non-plated holes rarely have pads, so a low share alone contradicts nothing.
    """
    all_decimal = script.all_decimal()
    words = first.format.words(all_decimal)
    if best.share >= _CLEAR and best.share > 3 * first.share and best.share * count >= _FEW:
        text = (
            f"{script.name}: states {words}, by which {first.share:.0%} of its {count} holes lie on"
            f" pads; assumed to be {best.format.words(all_decimal)} instead ({best.share:.0%})"
        )
        return Choice(best.format, (0.0, 0.0), (text,))
    if moved := _shifted(script, [first.format], pads):
        return moved
    holes_mm = drill_fit.spread_mm(_centres(script, first.format))
    copper_mm = drill_fit.spread_mm(pads)
    scale = max(h / max(c, 1.0) for h, c in zip(holes_mm, copper_mm, strict=True))
    if scale > 2.5 and first.share < 0.1:
        wrong = (
            f"read as it states ({words}) its holes spread over {holes_mm[0]:.0f} x"
            f" {holes_mm[1]:.0f} mm, {scale:.1f} times the copper"
            f" ({copper_mm[0]:.0f} x {copper_mm[1]:.0f} mm)"
        )
        raise SplitcheckError(script.name, wrong, "export the drill file in the right format")
    return Choice(first.format, (0.0, 0.0), (_said(script, first),))


def _shifted(script: Script, formats: Sequence[Format], pads: Floats) -> Choice | None:
    """Holes from another origin: a shift that brings nearly all of them onto pads."""
    size_mm = drill_fit.spread_mm(pads)
    for form in formats:
        centres = _centres(script, form)
        spread_mm = drill_fit.spread_mm(centres)
        fitting = all(s <= c + 5 for s, c in zip(spread_mm, size_mm, strict=True))
        if len(centres) < 8 or not fitting or max(spread_mm) < max(size_mm) / 10:
            continue
        dx_mm, dy_mm, share = drill_fit.shift_between(centres, pads)
        if share >= _SHIFT_CLEAR:
            text = (
                f"{script.name}: its holes have another origin than the copper; assumed to be moved"
                f" by ({dx_mm:g}, {dy_mm:g}) mm, by which {share:.0%} of {len(centres)} lie on pads"
                f" (read as {form.words(script.all_decimal())})"
            )
            return Choice(form, (dx_mm, dy_mm), (text,))
    return None


def _by_spread(script: Script, ranked: Sequence[Fit], pads: Floats) -> Choice:
    """Where no pad tells, the format by which the holes lie within the copper and fill it best."""
    low, high = pads.min(axis=0) - 5.0, pads.max(axis=0) + 5.0

    def key(fit: Fit) -> tuple[float, float]:
        centres = _centres(script, fit.format)
        inside = float(np.mean(np.all((centres >= low) & (centres <= high), axis=1)))
        return -round(inside, 2), -sum(drill_fit.spread_mm(centres))

    best = min(ranked, key=key)
    words = best.format.words(script.all_decimal())
    text = (
        f"{script.name}: the number format is not stated and few holes have pads"
        f" ({best.share:.0%}); assumed to be {words}, by which they lie within the copper"
    )
    return Choice(best.format, (0.0, 0.0), (text,))


def _said(script: Script, fit: Fit, ranked: Sequence[Fit] = ()) -> str:
    """How the file was read, and how many of its holes bear it out."""
    words = fit.format.words(script.all_decimal())
    count = len(_centres(script, fit.format))
    text = f"read as {words}; {fit.share:.0%} of {count} holes lie on pads"
    if fit.share < _RIGHT and script.plated() is False:
        text += ", but holes without plating need none"
    if not ranked:
        return f"{script.name}: {text}"
    other = next((r for r in ranked[1:] if r.share < fit.share), None)
    rest = f" (next best format {other.share:.0%})" if other else ""
    return f"{script.name}: the number format is not stated in full; {text}{rest}"


def _centres(script: Script, form: Format) -> Floats:
    """Middle of the first some thousand holes and slots, shape (n, 2), mm, each place once."""
    raws = play(script, form, _SAMPLE)
    middles = [
        ((r.path[0][0] + r.path[-1][0]) / 2, (r.path[0][1] + r.path[-1][1]) / 2) for r in raws
    ]
    return drill_fit.unique_places(middles)
