"""Aperture macros (AM): from their text and parameters to the copper they stand for."""

from __future__ import annotations

import re
from collections.abc import Callable
from math import cos, isfinite, pi, sin, sqrt
from typing import NoReturn

import numpy as np
import shapely
from shapely import Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import curves, fills
from splitcheck.errors import SplitcheckError
from splitcheck.units import Floats

#: Most statements of one macro; real ones have up to some hundred.
MOST_STATEMENTS = 10_000
#: Most corners of one outline (the format says 5000) or rings of one moire.
MOST_CORNERS = 50_000
MOST_DEPTH = 50

_TOKEN = re.compile(r"\s*(?:(\d+\.?\d*|\.\d+)|\$(\d+)|([-+xX/()]))")
_AGAIN = "export the file again, or without this macro"


def instantiate(
    body: str, parameters: tuple[float, ...], unit_mm: float, place: str
) -> tuple[Polygon, ...]:
    """Draw a macro with its parameters.

    Parameters
    ----------
    body
        Statements after the macro's name, each ended by ``*``.
    parameters
        Values of ``$1``, ``$2`` ...; a variable without value is 0 (format, clause 4.5.4.1).
    unit_mm
        One file unit in mm: 1 or 25.4.
    place
        ``file:line`` of the definition, for errors.

    Returns
    -------
    Connected pieces, mm, on the 1 nm grid. Later primitives with exposure off cut earlier ones.

    Raises
    ------
    SplitcheckError
        An unknown primitive, missing or extra values, a wrong expression, or absurd counts.

    Examples
    --------
    >>> [p.area for p in instantiate("21,1,$1,$1-0.5-0.5,0,0,0*", (2.0,), 1.0, "a.gbr:1")]
    [2.0]
    """
    values = dict(enumerate(parameters, 1))
    image: list[BaseGeometry] = []
    statements = (" ".join(part.split()) for part in body.split("*"))
    for statement in filter(None, statements):
        _obey(statement, values, unit_mm, place, image)
    return _pieces(shapely.union_all(image)) if image else ()


def check_size(body: str, place: str) -> None:
    """Refuse a macro of absurdly many statements before any of them is drawn."""
    count = body.count("*")
    if count > MOST_STATEMENTS:
        _fail(place, f"{count} statements, more than the limit of {MOST_STATEMENTS}")


def _obey(
    statement: str,
    values: dict[int, float],
    unit_mm: float,
    place: str,
    image: list[BaseGeometry],
) -> None:
    if statement[0] == "0" and not re.match(r"0+[1-9]", statement):
        return
    if statement[0] == "$":
        name, sign, expression = statement.partition("=")
        number = name[1:].strip()
        if not sign or not number.isdigit():
            _fail(place, f"the statement {statement[:40]!r}")
        values[int(number)] = evaluate(expression, values, place)
        return
    code, *texts = statement.split(",")
    if len(texts) > 2 * MOST_CORNERS + 5:
        _fail(place, f"a primitive of {len(texts)} values, limit {2 * MOST_CORNERS + 5}")
    numbers = [evaluate(text, values, place) for text in texts]
    draw = _PRIMITIVES.get(code.strip().lstrip("0"))
    if draw is None:
        _fail(place, f"the unknown primitive {code.strip()[:20]!r}")
    dark, shape = draw(numbers, unit_mm, place)
    if dark:
        image.append(shape)
    elif image:
        # Exposure off cuts what stands so far, and nothing of what comes.
        left = shapely.difference(shapely.union_all(image), shape)
        image[:] = [left]


def evaluate(text: str, values: dict[int, float], place: str) -> float:
    """Value of a macro expression: ``x`` and ``/`` before ``+`` and ``-``, each left to right.

    Raises
    ------
    SplitcheckError
        If the text is no expression, divides by zero or leaves the numbers.

    Examples
    --------
    >>> evaluate("5-2-$1x2", {1: 1.0}, "a.gbr:1"), evaluate("8/2/2+$9", {}, "a.gbr:1")
    (1.0, 2.0)
    """
    try:
        value = float(text)
    except ValueError:
        value = _Expression(text, values, place).value()
    if not isfinite(value):
        _fail(place, f"the value {text.strip()[:40]!r}, which is not a number")
    return value


class _Expression:
    """Recursive descent over one expression; no tree is kept."""

    def __init__(self, text: str, values: dict[int, float], place: str) -> None:
        self.text = text
        self.values = values
        self.place = place
        self.tokens: list[float | str] = []
        self.depth = 0
        end = len(text.rstrip())
        at = 0
        while at < end:
            match = _TOKEN.match(text, at)
            if match is None:
                self.wrong()
            number, variable, sign = match.groups()
            if number is not None:
                self.tokens.append(float(number))
            elif variable is not None:
                self.tokens.append(values.get(int(variable), 0.0))
            else:
                self.tokens.append(sign.lower())
            at = match.end()
        self.tokens.reverse()

    def wrong(self) -> NoReturn:
        _fail(self.place, f"{self.text.strip()[:40]!r}, which is no expression")

    def value(self) -> float:
        value = self.sum()
        if self.tokens:
            self.wrong()
        return value

    def sum(self) -> float:
        value = self.product()
        while self.tokens and self.tokens[-1] in ("+", "-"):
            sign = self.tokens.pop()
            right = self.product()
            value = value + right if sign == "+" else value - right
        return value

    def product(self) -> float:
        value = self.factor()
        while self.tokens and self.tokens[-1] in ("x", "/"):
            sign = self.tokens.pop()
            right = self.factor()
            if sign == "x":
                value *= right
            elif right == 0:
                _fail(self.place, f"{self.text.strip()[:40]!r}, which divides by zero")
            else:
                value /= right
        return value

    def factor(self) -> float:
        negative = False
        while self.tokens and self.tokens[-1] in ("+", "-"):
            negative ^= self.tokens.pop() == "-"
        if not self.tokens:
            self.wrong()
        token = self.tokens.pop()
        if token == "(":
            self.depth += 1
            if self.depth > MOST_DEPTH:
                _fail(self.place, f"brackets more than {MOST_DEPTH} deep")
            value = self.sum()
            self.depth -= 1
            if not self.tokens or self.tokens.pop() != ")":
                self.wrong()
        elif isinstance(token, str):
            self.wrong()
        else:
            value = token
        return -value if negative else value


_Drawn = tuple[bool, BaseGeometry]


def _circle(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 4, 5, "1 (circle)", place)
    turn = v[4] if len(v) > 4 else 0.0
    if v[1] <= 0:
        return v[0] != 0, Polygon()
    x, y = _turned(np.array([[v[2], v[3]]]), turn)[0]
    return v[0] != 0, Polygon(curves.circle(v[1] * unit, (x * unit, y * unit)))


def _vector_line(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 6, 7, "20 (vector line)", place)
    start, end = np.array(v[2:4]), np.array(v[4:6])
    along = end - start
    length = float(np.hypot(*along))
    if length == 0 or v[1] <= 0:
        return v[0] != 0, Polygon()
    side = np.array([-along[1], along[0]]) * (v[1] / 2 / length)
    corners = np.array([start - side, end - side, end + side, start + side])
    return v[0] != 0, _polygon(corners, _last(v, 7), unit)


def _centre_line(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 5, 6, "21 (centre line)", place)
    return v[0] != 0, _box(v[3] - v[1] / 2, v[4] - v[2] / 2, v[1], v[2], _last(v, 6), unit)


def _lower_left_line(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 5, 6, "22 (lower left line)", place)
    return v[0] != 0, _box(v[3], v[4], v[1], v[2], _last(v, 6), unit)


def _outline(v: list[float], unit: float, place: str) -> _Drawn:
    if len(v) < 2 or v[1] != int(v[1]) or not 1 <= v[1] <= MOST_CORNERS:
        _fail(place, f"an outline of {v[1] if len(v) > 1 else 'no'} corners, limit {MOST_CORNERS}")
    corners = int(v[1])
    v = _counted(v, 4 + 2 * corners, 5 + 2 * corners, f"4 (outline of {corners})", place)
    ring = np.array(v[2 : 4 + 2 * corners]).reshape(-1, 2)
    ring = np.round(_turned(ring, _last(v, 5 + 2 * corners)) * unit, 6)
    return v[0] != 0, fills.filled(ring)


def _regular(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 5, 6, "5 (polygon)", place)
    if v[1] != int(v[1]) or not 3 <= v[1] <= 1000:
        _fail(place, f"a polygon of {v[1]:g} corners, which must be 3 to 12")
    turn = np.arange(int(v[1])) * (2 * pi / v[1])
    corners = np.column_stack((v[2] + v[4] / 2 * np.cos(turn), v[3] + v[4] / 2 * np.sin(turn)))
    return v[0] != 0, _polygon(corners, _last(v, 6), unit) if v[4] > 0 else Polygon()


def _moire(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 8, 9, "6 (moire)", place)
    rings = v[5]
    if not 0 <= rings <= 1000:
        _fail(place, f"a moire of {rings:g} rings, limit 1000")
    x, y, outer, thick, gap, _, cross_width, cross_length = (unit * value for value in v[:8])
    parts: list[BaseGeometry] = []
    for number in range(int(rings)):
        diameter = outer - 2 * number * (thick + gap)
        if diameter <= 0:
            break
        parts.append(_ring(diameter, diameter - 2 * thick))
    for width, height in ((cross_length, cross_width), (cross_width, cross_length)):
        parts.append(_box(-width / 2, -height / 2, width, height, 0.0, 1.0))
    return True, _set_down(shapely.union_all(parts), x, y, _last(v, 9))


def _thermal(v: list[float], unit: float, place: str) -> _Drawn:
    v = _counted(v, 5, 6, "7 (thermal)", place)
    x, y, outer, inner, gap = (unit * value for value in v[:5])
    if outer <= inner or inner < 0 or gap >= outer / sqrt(2):
        return True, Polygon()
    ring = _ring(outer, inner)
    for width, height in ((2 * outer, gap), (gap, 2 * outer)):
        ring = shapely.difference(ring, _box(-width / 2, -height / 2, width, height, 0.0, 1.0))
    return True, _set_down(ring, x, y, _last(v, 6))


def _ring(outer_mm: float, inner_mm: float) -> BaseGeometry:
    disc = Polygon(curves.circle(outer_mm))
    if inner_mm <= 0:
        return disc
    return shapely.difference(disc, Polygon(curves.circle(inner_mm)))


_PRIMITIVES: dict[str, Callable[[list[float], float, str], _Drawn]] = {
    "1": _circle,
    "2": _vector_line,
    "20": _vector_line,
    "21": _centre_line,
    "22": _lower_left_line,
    "4": _outline,
    "5": _regular,
    "6": _moire,
    "7": _thermal,
}


def _counted(v: list[float], fewest: int, most: int, name: str, place: str) -> list[float]:
    if not fewest <= len(v) <= most:
        _fail(place, f"primitive {name} with {len(v)} values where {most} belong")
    return v


def _last(v: list[float], most: int) -> float:
    """The rotation, degrees: the last value of a primitive, 0 where it was left out."""
    return v[most - 1] if len(v) == most else 0.0


def _turned(points: Floats, degrees: float) -> Floats:
    if degrees == 0:
        return points
    quarters = {90.0: (0.0, 1.0), 180.0: (-1.0, 0.0), 270.0: (0.0, -1.0)}
    turn = degrees * pi / 180
    c, s = quarters.get(degrees % 360, (cos(turn), sin(turn)))
    return np.column_stack(
        (c * points[:, 0] - s * points[:, 1], s * points[:, 0] + c * points[:, 1])
    )


def _polygon(corners: Floats, degrees: float, unit: float) -> Polygon:
    return Polygon(np.round(_turned(corners, degrees) * unit, 6))


def _box(x: float, y: float, width: float, height: float, degrees: float, unit: float) -> Polygon:
    if width <= 0 or height <= 0:
        return Polygon()
    corners = np.array([[x, y], [x + width, y], [x + width, y + height], [x, y + height]])
    return _polygon(corners, degrees, unit)


def _set_down(shape: BaseGeometry, x: float, y: float, degrees: float) -> BaseGeometry:
    return shapely.transform(shape, lambda p: _turned(p + np.array([x, y]), degrees))


def _pieces(shape: BaseGeometry) -> tuple[Polygon, ...]:
    snapped = shapely.set_precision(shape, 1e-6)
    parts = [p for p in shapely.get_parts(snapped) if isinstance(p, Polygon) and p.area > 0]
    return tuple(sorted(parts, key=lambda p: (p.bounds, p.area)))


def _fail(place: str, what: str) -> NoReturn:
    raise SplitcheckError(place, f"the aperture macro holds {what}", _AGAIN)
