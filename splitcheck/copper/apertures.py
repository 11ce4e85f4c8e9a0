"""Apertures: what an AD command defines, as outlines at the origin ready to draw with."""

from __future__ import annotations

from math import cos, isfinite, pi, sin
from typing import NamedTuple

import numpy as np
import shapely
from shapely import Polygon
from shapely.geometry.base import BaseGeometry

from splitcheck.copper import curves, macros
from splitcheck.copper.marks import Mark
from splitcheck.errors import SplitcheckError

#: Largest aperture that is believed, mm.
MOST_MM = 2000.0
_AGAIN = "export the file again with its aperture list"


class Definition(NamedTuple):
    """An AD command taken apart, in file units."""

    code: int
    template: str
    parameters: tuple[float, ...]


class Brush(NamedTuple):
    """An aperture as it is drawn with: mirrored, turned and scaled already."""

    shapes: tuple[Polygon, ...]
    """Connected pieces at the origin, mm; empty for an aperture of no size."""
    diameter_mm: float | None
    """Diameter of a plain circle, else ``None``."""
    width_mm: float
    """Diameter, or the smaller side of the box."""
    function: str | None
    """First field of its ``.AperFunction``."""
    block: tuple[Mark, ...] | None = None
    """Marks of a block aperture."""


class Setting(NamedTuple):
    """How objects are transformed before they are set down: LM, LR and LS, in that order."""

    mirror_x: bool = False
    mirror_y: bool = False
    turn_deg: float = 0.0
    scale: float = 1.0

    def matrix(self) -> tuple[float, float, float, float]:
        """Rows (a, b), (c, d) that take (x, y) to (a x + b y, c x + d y)."""
        exact = {0.0: (1.0, 0.0), 90.0: (0.0, 1.0), 180.0: (-1.0, 0.0), 270.0: (0.0, -1.0)}
        turn = self.turn_deg * pi / 180
        c, s = exact.get(self.turn_deg % 360, (cos(turn), sin(turn)))
        flip_x = -self.scale if self.mirror_x else self.scale
        flip_y = -self.scale if self.mirror_y else self.scale
        return (c * flip_x, -s * flip_y, s * flip_x, c * flip_y)


PLAIN = Setting()


def brush(
    definition: Definition, body: str | None, unit_mm: float, function: str | None, place: str
) -> Brush:
    """Build an aperture.

    Parameters
    ----------
    definition
        Template name and parameters.
    body
        Body of its macro; ``None`` for a standard template.
    unit_mm
        One file unit in mm.
    function
        ``.AperFunction`` in force at the definition.
    place
        ``file:line`` of the definition, for errors.

    Raises
    ------
    SplitcheckError
        Wrong parameters, or a size that no board has.

    Examples
    --------
    >>> brush(Definition(10, "R", (1.0, 2.0)), None, 1.0, None, "a.gbr:1").width_mm
    1.0
    """
    _, template, parameters = definition
    name = f"aperture D{definition.code}"
    largest = max((abs(value) for value in parameters), default=0.0)
    if not isfinite(largest) or (body is None and largest * unit_mm > MOST_MM):
        wrong = f"{name} has the size {largest * unit_mm:g} mm, limit {MOST_MM:g} mm"
        raise SplitcheckError(place, wrong, "check the units of the export")
    if body is None:
        return _standard(name, template, parameters, unit_mm, function, place)
    shapes = macros.instantiate(body, parameters, unit_mm, place)
    reach = float(np.max(np.abs([shape.bounds for shape in shapes]), initial=0.0))
    if reach > MOST_MM:
        wrong = f"{name} reaches {reach:g} mm, limit {MOST_MM:g} mm"
        raise SplitcheckError(place, wrong, "check the units of the export")
    return Brush(shapes, None, _smaller_side(shapes), function)


STANDARD = {"C": (1, 2), "R": (1, 3), "O": (1, 3), "P": (2, 4)}
"""Standard templates: fewest and most parameters, one hole diameter included."""


def _standard(
    name: str,
    template: str,
    parameters: tuple[float, ...],
    unit_mm: float,
    function: str | None,
    place: str,
) -> Brush:
    fewest, most = STANDARD[template]
    # One more: old files give rectangular holes (historic, clause 8.2 of the format).
    if not fewest <= len(parameters) <= most + 1:
        wrong = f"{name} ({template}) has {len(parameters)} parameters, {fewest} to {most} belong"
        raise SplitcheckError(place, wrong, _AGAIN)
    sizes = parameters[:1] if template in "CP" else parameters[:2]
    if min(sizes) < 0:
        raise SplitcheckError(place, f"{name} has the negative size {min(sizes):g}", _AGAIN)
    if min(sizes) == 0:
        return Brush((), 0.0 if template == "C" else None, 0.0, function)
    body = _body(name, template, parameters, unit_mm, place)
    hole = _hole(parameters[{"C": 1, "P": 3}.get(template, 2) :], unit_mm)
    shape = body if hole is None else shapely.difference(body, hole)
    shapes = tuple(p for p in shapely.get_parts(shape) if not p.is_empty)
    round_mm = parameters[0] * unit_mm if template == "C" else None
    width = _smaller_side((body,)) if round_mm is None else round_mm
    return Brush(shapes, round_mm if hole is None else None, round(width, 6), function)


def _body(
    name: str, template: str, parameters: tuple[float, ...], unit_mm: float, place: str
) -> Polygon:
    if template == "C":
        return _snapped(curves.circle(parameters[0] * unit_mm))
    if template == "P":
        corners = parameters[1]
        if corners != int(corners) or not 3 <= corners <= 1000:
            wrong = f"{name} is a polygon of {corners:g} corners, which must be 3 to 12"
            raise SplitcheckError(place, wrong, _AGAIN)
        start = parameters[2] * pi / 180 if len(parameters) > 2 else 0.0
        turn = start + np.arange(int(corners)) * (2 * pi / corners)
        radius = parameters[0] * unit_mm / 2
        return _snapped(np.column_stack((radius * np.cos(turn), radius * np.sin(turn))))
    # A rectangle given by one side is a square (historic files).
    width = parameters[0] * unit_mm / 2
    height = (parameters[1] if len(parameters) > 1 else parameters[0]) * unit_mm / 2
    if template == "R":
        return _snapped(
            np.array([[-width, -height], [width, -height], [width, height], [-width, height]])
        )
    return _obround(width, height)


def _obround(half_width: float, half_height: float) -> Polygon:
    if half_width == half_height:
        return _snapped(curves.circle(2 * half_width))
    if half_width > half_height:
        end = curves.cap(2 * half_height) + np.array([half_width - half_height, 0.0])
        return _snapped(np.vstack((end, -end)))
    end = curves.cap(2 * half_width)
    # The same end, turned a quarter: from (+w, .) over the top to (-w, .).
    end = np.column_stack((-end[:, 1], end[:, 0] + half_height - half_width))
    return _snapped(np.vstack((end, -end)))


def _hole(parameters: tuple[float, ...], unit_mm: float) -> BaseGeometry | None:
    if not parameters or parameters[0] <= 0:
        return None
    if len(parameters) == 1 or parameters[1] <= 0:
        return _snapped(curves.circle(parameters[0] * unit_mm))
    width, height = parameters[0] * unit_mm / 2, parameters[1] * unit_mm / 2
    return shapely.box(-width, -height, width, height)


def transformed(tool: Brush, setting: Setting) -> Brush:
    """The same aperture, mirrored, turned and scaled; a block is left to whoever sets it down."""
    if setting == PLAIN:
        return tool
    a, b, c, d = setting.matrix()
    if tool.diameter_mm is not None:
        size = tool.diameter_mm * setting.scale
        round_shapes = (_snapped(curves.circle(size)),) if tool.shapes else ()
        return tool._replace(shapes=round_shapes, diameter_mm=size, width_mm=round(size, 6))
    shapes = tuple(linear(shape, (a, b, c, d)) for shape in tool.shapes)
    return tool._replace(shapes=shapes, width_mm=round(tool.width_mm * setting.scale, 6))


def linear(shape: Polygon, matrix: tuple[float, float, float, float]) -> Polygon:
    """A shape under a matrix, its corners back on the 1 nm grid."""
    turn = np.array(matrix).reshape(2, 2).T
    moved: Polygon = shapely.transform(shape, lambda p: np.round(p @ turn, 6))
    return moved


def _snapped(corners: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> Polygon:
    return Polygon(np.round(corners, 6))


def _smaller_side(shapes: tuple[Polygon, ...]) -> float:
    if not shapes:
        return 0.0
    low_x, low_y, high_x, high_y = shapely.total_bounds(np.array(shapes))
    return round(float(min(high_x - low_x, high_y - low_y)), 6)
