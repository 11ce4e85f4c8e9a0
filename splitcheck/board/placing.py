"""Placed parts onto the copper: the two pads on either side of each part's centre."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import shapely

from splitcheck.board.components import prefix
from splitcheck.board.parts import CopperLayer
from splitcheck.board.traces import locate
from splitcheck.copper import drill_fit
from splitcheck.copper.holes import Hole
from splitcheck.copper.marks import Point
from splitcheck.copper.placement import Placed, Placement, Side
from splitcheck.units import Floats

#: Parts whose centre alone is known have two pads if their reference begins so.
TWO_PAD = frozenset({"C", "R", "L", "FB"})
#: The two pads of a part lie no farther apart than this, mm, ...
PADS_APART_MM = 8.0
#: ... their sizes differ by no more than this share, ...
PADS_ALIKE = 0.05
#: ... their middle lies this near to its centre, mm (places in 0.001 inch, uneven footprints), ...
MIDDLE_MM = 0.1
#: ... and they lie along its angle or across it, within this, degrees.
TURNED_DEG = 8.0
#: So many of the pads nearest to a pad are its neighbours.
NEIGHBOURS = 10
#: Below this share of centres between two pads a list belongs to another board, ...
LEAST_SHARE = 0.5
#: ... and from this on no other unit or origin is tried.
GOOD_SHARE = 0.9
#: Painted pads are looked for out to here from a part's centre, in steps, mm, ...
PROBED_MM = 3.0
PROBE_MM = 0.04
#: ... the rims of the two are equally far off but for this, mm, ...
PROBE_UNEVEN_MM = 0.09
#: ... and the pad is this deep inside its rim at least, mm.
INSIDE_MM = 0.15
#: Fiducial marks are called so, and are smaller than this, mm2.
MARKS = frozenset({"FM", "FID", "FD", "FIDUCIAL"})
MARK_MM2 = 5.0
#: A pad this near to a plated hole is that of a via or of a wired part, mm.
ON_HOLE_MM = 0.02


class Laid(NamedTuple):
    """A part and its two pads."""

    ref: str
    top: bool
    pads: tuple[Point, Point]


@dataclass(frozen=True, slots=True)
class Laying:
    """What became of a list of placed parts."""

    parts: tuple[Laid, ...]
    assumptions: tuple[str, ...]
    remarks: tuple[str, ...]


class _Pairs(NamedTuple):
    """Pads of one side that may be the two of a part."""

    middle: Floats
    one: Floats
    other: Floats


class _Fit(NamedTuple):
    unit: str
    mirrored: bool
    dx_mm: float
    dy_mm: float
    share: float


def find_pads(
    listed: Placement, layers: Sequence[CopperLayer], holes: Sequence[Hole], corner: Point
) -> Laying:
    """Find the two pads of each placed part that has two.

    Parameters
    ----------
    listed
        Parts as placed. Their origin may differ from that of the Gerber files; the bottom may be
        seen from below; the unit may be left out or wrong.
    layers
        All copper, top to bottom.
    holes
        Plated holes: pads on them belong to vias and wired parts.
    corner
        Lower left corner of the board, mm: a usual origin of such lists.

    Returns
    -------
    Parts whose reference begins with C, R, L or FB and whose centre lies midway between two pads
    of one size that are not on holes.
    """
    found: list[Laid] = []
    assumptions: list[str] = []
    remarks: list[str] = []
    sides: tuple[tuple[Side, CopperLayer], ...] = (("top", layers[0]), ("bottom", layers[-1]))
    for side, layer in sides:
        parts = [part for part in listed.parts if prefix(part.ref) in TWO_PAD and part.side == side]
        if not parts:
            continue
        pairs = _pairs(layer, holes)
        fit = _fitted(listed, parts, pairs, top=side == "top")
        laid = _laid(parts, _moved(listed, parts, fit), pairs, top=side == "top")
        if fit.share < LEAST_SHARE:
            laid, fit = _probed(listed, parts, layer, corner, top=side == "top")
        words = f"{listed.name}: {fit.share:.0%} of {len(parts)} parts on the {side}"
        if fit.share < LEAST_SHARE:
            said = f"{words} lie between two pads, so that no component was taken from it there."
            assumptions.append(said)
            continue
        remarks.append(f"{words} lie between two pads, {_shift(fit)}")
        if listed.stated and fit.unit != listed.unit:
            assumptions.append(
                f"{listed.name} was read in {fit.unit}, as its places fit no pads in "
                f"{listed.unit}, which it states."
            )
        found.extend(laid)
    unknown = sum(prefix(part.ref) in TWO_PAD and part.side is None for part in listed.parts)
    if unknown:
        remarks.append(f"{listed.name}: {unknown} parts are on no side that it tells")
    return Laying(tuple(found), tuple(assumptions), tuple(remarks))


def _shift(fit: _Fit) -> str:
    moved = f"moved by ({fit.dx_mm:g}, {fit.dy_mm:g}) mm" if fit.dx_mm or fit.dy_mm else "as it is"
    return f"{moved}{', seen from below' if fit.mirrored else ''}"


def _pairs(layer: CopperLayer, holes: Sequence[Hole]) -> _Pairs:
    """All pairs of neighbouring pads of one size."""
    from scipy.spatial import KDTree  # noqa: PLC0415 (0.1 s, only where needed)

    pads = {pad.at: pad.size_mm for pad in layer.pads}
    at = np.array(sorted(pads)).reshape(-1, 2)
    size = np.array([pads[place] for place in sorted(pads)])
    drilled = np.array([hole.path[0] for hole in holes]).reshape(-1, 2)
    if len(drilled) and len(at):
        free = KDTree(drilled).query(at, distance_upper_bound=ON_HOLE_MM)[0] > ON_HOLE_MM
        at, size = at[free], size[free]
    if len(at) < 2:
        return _Pairs(*(np.empty((0, 2)) for _ in range(3)))
    count = min(NEIGHBOURS + 1, len(at))
    far, near = KDTree(at).query(at, k=count, distance_upper_bound=PADS_APART_MM)
    one = np.repeat(np.arange(len(at)), count)
    other, apart = np.ravel(near), np.ravel(far)
    real = (apart <= PADS_APART_MM) & (apart > 0.0)
    one, other = one[real], other[real]
    ends = np.unique(np.sort(np.stack([one, other], axis=1), axis=1), axis=0)
    one, other = ends[:, 0], ends[:, 1]
    alike = np.abs(size[one] - size[other]) <= PADS_ALIKE * np.maximum(size[one], size[other])
    one, other = one[alike], other[alike]
    return _Pairs((at[one] + at[other]) / 2, at[one], at[other])


def _places(parts: Sequence[Placed], factor: float, *, mirrored: bool) -> Floats:
    sign = -1.0 if mirrored else 1.0
    return np.array([(sign * factor * part.x_mm, factor * part.y_mm) for part in parts])


def _fitted(listed: Placement, parts: Sequence[Placed], pairs: _Pairs, *, top: bool) -> _Fit:
    """The unit, shift and view that bring most centres between two pads; as read if it will do."""
    best = _Fit(listed.unit, False, 0.0, 0.0, -1.0)
    if not len(pairs.middle):
        return best._replace(share=0.0)
    units = [listed.unit, *(unit for unit in ("mm", "in", "mil") if unit != listed.unit)]
    for unit in units:
        for mirrored in (False,) if top else (False, True):
            places = _places(parts, listed.factor(unit), mirrored=mirrored)
            share = drill_fit.share_on_pads(places, pairs.middle)
            fits = [_Fit(unit, mirrored, 0.0, 0.0, share)]
            if share < GOOD_SHARE:
                moved = drill_fit.shift_between(places, pairs.middle)
                fits.append(_Fit(unit, mirrored, *moved))
            best = max((best, *fits), key=lambda fit: fit.share)
            if best.share >= GOOD_SHARE:
                return best
    return best


def _moved(listed: Placement, parts: Sequence[Placed], fit: _Fit) -> Floats:
    places = _places(parts, listed.factor(fit.unit), mirrored=fit.mirrored)
    return np.asarray(places + np.array([fit.dx_mm, fit.dy_mm]))


def _laid(parts: Sequence[Placed], places: Floats, pairs: _Pairs, *, top: bool) -> list[Laid]:
    """For each part the nearest two pads that are midway round its centre, along its angle."""
    from scipy.spatial import KDTree  # noqa: PLC0415

    if not len(pairs.middle):
        return []
    step = pairs.other - pairs.one
    span = np.hypot(step[:, 0], step[:, 1])
    angle = np.degrees(np.arctan2(step[:, 1], step[:, 0]))
    tree = KDTree(pairs.middle)
    found = []
    for part, place in zip(parts, places, strict=True):
        rows: list[int] = tree.query_ball_point(place, MIDDLE_MM)
        fitting = [
            row
            for row in sorted(rows)
            if part.turn_deg is None
            or abs((angle[row] - part.turn_deg + 45.0) % 90.0 - 45.0) <= TURNED_DEG
        ]
        if fitting:
            row = min(fitting, key=lambda row: (span[row], row))
            (x0, y0), (x1, y1) = pairs.one[row].tolist(), pairs.other[row].tolist()
            found.append(Laid(part.ref, top, ((x0, y0), (x1, y1))))
    return found


def _probed(
    listed: Placement, parts: Sequence[Placed], layer: CopperLayer, corner: Point, *, top: bool
) -> tuple[list[Laid], _Fit]:
    """Where pads are painted rather than flashed: the first copper on either side of a centre.

    Both must be equally far off, along the part's angle or else across it. The origin is that of
    the Gerber files, the lower left corner of the board, or told by fiducial marks.
    """
    best: tuple[list[Laid], _Fit] = ([], _Fit(listed.unit, False, 0.0, 0.0, 0.0))
    for unit in dict.fromkeys((listed.unit, "mm", "in", "mil")):
        for dx, dy in ((0.0, 0.0), corner, _by_marks(listed, layer, unit, top=top)):
            fit = _Fit(unit, False, dx, dy, 0.0)
            found = _either_sides(parts, _moved(listed, parts, fit), layer, top=top)
            share = len(found) / len(parts)
            if share > best[1].share:
                best = (found, fit._replace(share=share))
            if share >= GOOD_SHARE:
                return best
    return best


def _by_marks(listed: Placement, layer: CopperLayer, unit: str, *, top: bool) -> Point:
    """The shift that brings fiducial marks onto pieces of copper that stand alone."""
    side = "top" if top else "bottom"
    marks = [part for part in listed.parts if prefix(part.ref) in MARKS and part.side == side]
    alone = [piece for piece in layer.pieces if piece.area < MARK_MM2]
    if len(marks) < 2 or not alone:
        return 0.0, 0.0
    places = _places(marks, listed.factor(unit), mirrored=False)
    centres = shapely.get_coordinates(shapely.centroid(np.array(alone, dtype=object)))
    dx, dy, share = drill_fit.shift_between(places, centres)
    return (dx, dy) if share >= GOOD_SHARE else (0.0, 0.0)


def _either_sides(
    parts: Sequence[Placed], places: Floats, layer: CopperLayer, *, top: bool
) -> list[Laid]:
    along = np.radians([part.turn_deg or 0.0 for part in parts])
    found: dict[int, Laid] = {}
    for across in (0.0, np.pi / 2):
        left = [i for i in range(len(parts)) if i not in found]
        step = np.stack([np.cos(along[left] + across), np.sin(along[left] + across)], axis=1)
        for i, pads in zip(left, _either_side(places[left], step, layer), strict=True):
            if pads is not None:
                found[i] = Laid(parts[i].ref, top, pads)
    return [found[i] for i in sorted(found)]


def _either_side(
    places: Floats, step: Floats, layer: CopperLayer
) -> list[tuple[Point, Point] | None]:
    """Places just inside the first copper on either side of each place, if equally far off."""
    far = np.arange(0.0, PROBED_MM, PROBE_MM)
    met = []
    for sign in (-1.0, 1.0):
        at = places[:, None, :] + sign * far[None, :, None] * step[:, None, :]
        on = locate(at[..., 0].ravel(), at[..., 1].ravel(), layer.pieces).reshape(at.shape[:2]) >= 0
        met.append(np.where(on.any(axis=1), far[on.argmax(axis=1)], np.inf))
    found: list[tuple[Point, Point] | None] = []
    for place, way, one, other in zip(places, step, *met, strict=True):
        if not 0.0 < max(one, other) < np.inf or abs(one - other) > PROBE_UNEVEN_MM:
            found.append(None)
            continue
        (x0, y0), (x1, y1) = place - (one + INSIDE_MM) * way, place + (other + INSIDE_MM) * way
        found.append(((float(x0), float(y0)), (float(x1), float(y1))))
    return found
