"""A field solve in, the magnetic field above the board and what the gap adds to it in dB out."""

from __future__ import annotations

from collections.abc import Sequence
from math import log10, pi
from typing import NamedTuple

import numpy as np
import shapely
from shapely import LineString
from shapely import Point as Place

from splitcheck.copper.marks import Point
from splitcheck.loops.panels import Panels
from splitcheck.loops.solution import Solution, Strap, TraceOver, ViaBridge
from splitcheck.units import MU0, Floats

#: Height of the loop probe over the trace, mm.
PROBE_MM = 10.0
#: Places of the probe either way from the crossing, in heights of the probe.
_PLACES = np.array([-1.0, -0.5, 0.0, 0.5, 1.0])
#: Traces are carried on straight beyond their ends for so many heights of the probe.
_ON = 1000.0
#: Panels larger than this share of their distance from the probe count as four points.
_LARGE = 0.3


class Wire(NamedTuple):
    """A thread of current over the plane."""

    line: Floats
    """Shape (p, 2), mm."""
    height_mm: float
    amps: float


def field_of_wires(places: Floats, wires: Sequence[Wire]) -> Floats:
    """Field of currents over a whole plane that is a perfect conductor.

    Parameters
    ----------
    places
        Points above the plane, off the wires, shape (k, 3), mm.
    wires
        Currents over the plane; what enters and leaves at their ends is left out.

    Returns
    -------
    H, shape (k, 3), A/mm.

    Notes
    -----
    The law of Biot and Savart for each straight stretch, and for its image of opposite sign: with
    a and b from its ends to the point, H = I/4pi (a x b)(|a| + |b|)/(|a| |b| (|a| |b| + a . b)).

    Examples
    --------
    Over a long wire 1 mm above the plane, 10 mm up: 1/2pi (1/9 - 1/11) mA/mm for 1 mA.

    >>> wire = Wire(np.array([[-1e5, 0.0], [1e5, 0.0]]), 1.0, 1.0)
    >>> field_of_wires(np.array([[0.0, 0.0, 10.0]]), [wire]).round(6) + 0.0
    array([[ 0.      , -0.003215,  0.      ]])
    """
    total = np.zeros_like(places)
    for wire in wires:
        for side in (1.0, -1.0):
            points = np.column_stack((wire.line, np.full(len(wire.line), side * wire.height_mm)))
            away = places[:, None, :] - points
            far = np.sqrt((away * away).sum(axis=2))
            a, b = away[:, :-1], away[:, 1:]
            both = far[:, :-1] * far[:, 1:]
            weight = (far[:, :-1] + far[:, 1:]) / (both * (both + (a * b).sum(axis=2)))
            total += side * wire.amps / (4 * pi) * (np.cross(a, b) * weight[:, :, None]).sum(axis=1)
    return total


def field_of_gaps(places: Floats, mesh: Panels, flux_nwb: Floats) -> Floats:
    """Field above the plane of the flux through its gaps.

    Parameters
    ----------
    places
        Points above the plane, on the side of the traces, shape (k, 3), mm.
    mesh
        Panels of the gaps.
    flux_nwb
        Flux through each panel away from the traces, as `Solution.flux_nwb` has it, shape (n,).

    Returns
    -------
    H, shape (k, 3), A/mm.

    Notes
    -----
    On the plane the normal flux density is that of the gaps, b, and 0 on copper. A half space with
    this on its border holds the field of a magnetic charge 2 b/mu0 per area without the plane:
    H = 1/(2 pi mu0) sum of flux R/R^3, twice that of a charge in free space, as all of it goes to
    one side. Planes beyond and vias to them act on b alone. `Solution` counts flux away from the
    traces, so that here it enters with a minus.
    """
    height_mm = float(places[:, 2].min(initial=np.inf))
    large = mesh.radius > _LARGE * height_mm
    spots = np.concatenate([mesh.centre[~large], mesh.points[large].reshape(-1, 2)])
    charge = np.concatenate([flux_nwb[~large], np.repeat(flux_nwb[large] / 4, 4)])
    x = places[:, 0, None] - spots[:, 0]
    y = places[:, 1, None] - spots[:, 1]
    z = places[:, 2, None]
    square = x * x + y * y + z * z
    pull = charge / (square * np.sqrt(square))
    field = np.stack([(x * pull).sum(axis=1), (y * pull).sum(axis=1), places[:, 2] * pull.sum(1)])
    gaps: Floats = field.T / (-2 * pi * MU0)
    return gaps


def stray_db(
    solution: Solution,
    number: int,
    trace: TraceOver,
    height_mm: float,
    at: Point,
    *,
    bridges: Sequence[ViaBridge | Strap] = (),
    probe_mm: float = PROBE_MM,
) -> float | None:
    """How much more field a small loop probe finds above a crossing than without the gaps.

    Parameters
    ----------
    solution
        Solved without a plane above the traces, which would shield them and the probe.
    number
        Which of its traces carries current.
    trace
        That trace.
    height_mm
        Height of the trace over the plane, > 0.
    at
        Place of the crossing, mm.
    bridges
        Those the solution was solved with, in the same order.
    probe_mm
        Height of the probe over the trace, > 0.

    Returns
    -------
    20 log10(with/without), dB; None if the trace has no way back.

    Notes
    -----
    The probe is turned to where it finds most, and held at 25 places: each is the largest length
    of H over a square grid above the crossing, along and aside of the trace, two heights of the
    probe wide. Without the gaps H is that of trace and image, with them the field of the gaps and
    of the currents in straps is added. The trace is carried on straight beyond both its ends:
    where it happens to end is not the gap's doing.
    """
    if solution.cut_off[number]:
        return None
    places = _probe_places(trace.line, at, height_mm + probe_mm, probe_mm)
    path = shapely.get_coordinates(shapely.remove_repeated_points(trace.line, 1e-6))
    if len(path) < 2:
        return None
    line = _carried_on(path, _ON * (probe_mm + height_mm))
    without = field_of_wires(places, [Wire(line, height_mm, 1.0)])
    straps = [
        Wire(np.asarray(bridge.line.coords)[:, :2], bridge.height_mm, float(amps))
        for bridge, amps in zip(bridges, solution.bridge_a[:, number], strict=False)
        if isinstance(bridge, Strap) and not bridge.beyond
    ]
    added = field_of_gaps(places, solution.mesh, solution.flux_nwb[:, number])
    added += field_of_wires(places, straps)
    return 20 * log10(_largest(without + added) / _largest(without))


def _largest(field: Floats) -> float:
    return float(np.sqrt((field * field).sum(axis=1).max()))


def _probe_places(line: LineString, at: Point, z_mm: float, probe_mm: float) -> Floats:
    """The grid of the probe, laid along the trace so that turning a board changes nothing."""
    along = line.project(Place(at))
    first, last = (line.interpolate(max(along + step, 0.0)) for step in (-probe_mm, probe_mm))
    dx, dy = last.x - first.x, last.y - first.y
    length = float(np.hypot(dx, dy))
    ux, uy = (dx / length, dy / length) if length > 0 else (1.0, 0.0)
    s, t = (part.ravel() * probe_mm for part in np.meshgrid(_PLACES, _PLACES))
    x, y = at[0] + s * ux - t * uy, at[1] + s * uy + t * ux
    return np.column_stack((x, y, np.full(len(s), z_mm)))


def _carried_on(line: Floats, length_mm: float) -> Floats:
    """A polyline with both its end stretches made longer."""
    first, last = line[0] - line[1], line[-1] - line[-2]
    start = line[0] + first / np.hypot(*first) * length_mm
    stop = line[-1] + last / np.hypot(*last) * length_mm
    return np.concatenate([[start], line, [stop]])
