"""A field solve in, the return current of one trace in its plane out, as a stream function."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import pi

import numpy as np
import shapely
from shapely import LineString, Polygon

from splitcheck.loops.grading import Grading
from splitcheck.loops.kernels import outline_potential, plate_images_squared, wall_source
from splitcheck.loops.panels import Panels, cut
from splitcheck.loops.solution import Solution, Strap, TraceOver, ViaBridge
from splitcheck.loops.sources import Strip, filaments, run_beside
from splitcheck.units import MU0, Floats

#: Points looked at together.
_BLOCK = 256
#: Panels nearer to a point than this many radii are integrated in closed form,
_NEARBY = 2.0
#: those nearer than this are taken as four points, and all others as one.
_POINTS = 8.0
#: Points nearer to a trace than this many widths (or half heights) see how wide it is.
_CLOSE = 4.0


@dataclass(frozen=True, slots=True)
class Flow:
    """What makes the return current of one trace in its plane, per ampere in the trace."""

    strips: tuple[Strip, ...]
    """The trace, then the parts across the gap."""
    strip_a: Floats
    """Current in each of them, shape (s,)."""
    via_at: Floats
    """Vias to the planes beside, shape (v, 2), mm."""
    via_a: Floats
    """Current from the plane into each, shape (v,)."""
    gaps: tuple[Polygon, ...]
    mesh: Panels
    charge: Floats
    """Flux through each panel over 2 pi mu0, shape (n,), A mm."""
    plates_mm: tuple[float, ...]
    """Distances of the planes above and beyond."""

    @property
    def poles(self) -> tuple[Floats, Floats]:
        """Where current gets into the plane or out of it, shape (k, 2), and how much, shape (k,).

        Plus is into the plane: at the far end of the trace, where its current has arrived.
        """
        ends = [strip.line[end] for strip in self.strips for end in (0, -1)]
        amps = [
            sign * strip.share * float(a)
            for strip, a in zip(self.strips, self.strip_a, strict=True)
            for sign in (-1.0, 1.0)
        ]
        at = np.concatenate([np.reshape(ends, (-1, 2)), self.via_at])
        return at, np.concatenate([amps, self.via_a])


def flow_of(
    solution: Solution,
    number: int,
    traces: Sequence[TraceOver],
    height_mm: float,
    *,
    beyond_mm: float | None = None,
    above_mm: float | None = None,
    bridges: Sequence[ViaBridge | Strap] = (),
) -> Flow | None:
    """Take from a solve what makes the return current of one of its traces.

    Parameters
    ----------
    solution
        What `splitcheck.loops.solve.added` found.
    number
        Which of its traces carries the current.
    traces, height_mm, beyond_mm, above_mm, bridges
        What the solution was asked for, in the same order.

    Returns
    -------
    The flow; None if the trace has no way back.
    """
    line = solution.lines[number] if number < len(solution.lines) else None
    if solution.cut_off[number] or line is None:
        return None
    strips = [Strip(line, traces[number].width_mm, height_mm, above_mm)]
    amps, via_at, via_a = [1.0], [], []
    for bridge, current in zip(bridges, solution.bridge_a[:, number], strict=True):
        if isinstance(bridge, ViaBridge):
            via_at.append(bridge.at.coords[0][:2])
            via_a.append(float(current))
        elif abs(current) > 0.0:
            path = shapely.get_coordinates(bridge.line)
            over_mm = beyond_mm if bridge.beyond else above_mm
            strips.append(Strip(path, bridge.width_mm, bridge.height_mm, over_mm))
            amps.append(float(current))
    return Flow(
        strips=tuple(strips),
        strip_a=np.array(amps),
        via_at=np.reshape(via_at, (-1, 2)).astype(np.float64),
        via_a=np.array(via_a, dtype=np.float64),
        gaps=solution.gaps,
        mesh=solution.mesh,
        charge=solution.flux_nwb[:, number] / (2 * pi * MU0),
        plates_mm=tuple(mm for mm in (above_mm, beyond_mm) if mm is not None),
    )


def over_whole_plane(trace: TraceOver, height_mm: float, above_mm: float | None = None) -> Flow:
    """The return current of a trace over a plane without gaps.

    Parameters
    ----------
    trace
        The trace.
    height_mm
        Its height over the plane, > 0.
    above_mm
        Distance of a whole plane on its other side, or None.

    Examples
    --------
    Half of it flows within one height of either side of the trace:

    >>> trace = TraceOver(LineString([(-1e4, 0.0), (1e4, 0.0)]), 0.0)
    >>> flow = over_whole_plane(trace, 0.2)
    >>> round(current_across(flow, LineString([(0, 0.2), (0, -0.2)])), 3)
    0.5
    """
    strip = Strip(shapely.get_coordinates(trace.line), trace.width_mm, height_mm, above_mm)
    return _alone((strip,))


def without_gaps(flow: Flow) -> Flow:
    """The return current of the same trace, were the plane whole."""
    return _alone(flow.strips[:1])


def _alone(strips: tuple[Strip, ...]) -> Flow:
    """A trace with nothing else but its plane."""
    none = np.zeros(0)
    nothing = cut((), Grading((), 1.0))
    return Flow(strips, np.ones(1), np.zeros((0, 2)), none, (), nothing, none, ())


def smooth_part(flow: Flow, points: Floats) -> Floats:
    """Stream function at points of the plane, less the angles about the poles.

    Parameters
    ----------
    flow
        The flow.
    points
        Points of the plane, shape (n, 2), mm.

    Returns
    -------
    A/A, shape (n,). With amps/2 pi times the angle about each pole added it is the stream
    function, which in a plane with sources has one value only along a given way: `rises`.

    Notes
    -----
    Copper is a perfect conductor: the density of the current in it is K = n x H, with H the jump
    of the tangential field from one face to the other. H is the gradient of a potential off the
    currents, so that the jump of the potential, psi = f - S b, is the stream function of K: f from
    traces, straps and vias over a whole plane, S b from the flux b through the gaps (the equation
    f - S b = constant in a gap is what `splitcheck.loops.solve` solves). K is the gradient of psi
    turned by a right angle; what flows between two points is the difference of psi.
    """
    total = np.zeros(len(points))
    for strip, amps in zip(flow.strips, flow.strip_a, strict=True):
        total += float(amps) * _of_strip(strip, points)
    for start in range(0, len(points), _BLOCK):
        block = slice(start, start + _BLOCK)
        total[block] -= _of_gaps(flow, points[block])
    return total


def _of_strip(strip: Strip, points: Floats) -> Floats:
    """What a strip adds to f, less the angle between its ends."""
    value = _of_line(strip, strip.segments, points)
    reach = _CLOSE * max(strip.width_mm, strip.height_mm / 2)
    near = np.flatnonzero(shapely.dwithin(LineString(strip.line), shapely.points(points), reach))
    places, weights = filaments(strip.width_mm, strip.height_mm)
    if len(near) and len(places) > 1:
        paths = run_beside(strip.line, places)
        value[near] = sum(
            weight * _of_line(strip, path, points[near])
            for weight, path in zip(weights, paths, strict=True)
        )
    return value


def _of_line(strip: Strip, segments: Floats, points: Floats) -> Floats:
    value, seen = wall_source(points[:, 0], points[:, 1], segments, strip.height_mm, strip.above_mm)
    smooth: Floats = (value - strip.share / (2 * pi) * seen).sum(axis=1)
    return smooth


def _of_gaps(flow: Flow, points: Floats) -> Floats:
    """S b: potential of the flux through the gaps on both faces of the plane."""
    mesh = flow.mesh
    if not len(mesh):
        return np.zeros(len(points))
    square = _squares(points, mesh.centre)
    kernel = _kernel(square, flow.plates_mm)
    k, panel = np.nonzero(square < (_POINTS * mesh.radius) ** 2)
    if len(k):
        dx, dy = np.moveaxis(points[k, None] - mesh.points[panel], 2, 0)
        kernel[k, panel] = _kernel(dx * dx + dy * dy, flow.plates_mm).mean(axis=1)
    k, panel = np.nonzero(square < (_NEARBY * mesh.radius) ** 2)
    if len(k):
        dx, dy = np.moveaxis(points[k, None] - mesh.points[panel], 2, 0)
        kernel[k, panel] -= 2.0 * (1.0 / np.sqrt(np.maximum(dx * dx + dy * dy, 1e-12))).mean(axis=1)
        at = points[k]
        exact = outline_potential(at[:, :1], at[:, 1:], mesh.edges[panel])[:, 0]
        kernel[k, panel] += 2.0 * exact / mesh.area[panel]
    potential: Floats = kernel @ flow.charge
    return potential


def _squares(points: Floats, centres: Floats) -> Floats:
    dx, dy = (points[:, axis, None] - centres[:, axis] for axis in (0, 1))
    square: Floats = dx * dx + dy * dy
    return square


def _kernel(square: Floats, plates_mm: Sequence[float]) -> Floats:
    """Potential of a point charge on both faces, by the square of its distance."""
    square = np.maximum(square, 1e-12)
    value = 2.0 / np.sqrt(square)
    for plate_mm in plates_mm:
        value += plate_images_squared(square, plate_mm)
    return value


def rises(flow: Flow, starts: Floats, stops: Floats, start: Floats, stop: Floats) -> Floats:
    """By how much the stream function rises along straight ways.

    Parameters
    ----------
    flow
        The flow.
    starts, stops
        The ends of each way, shape (n, 2), mm; none runs through a pole.
    start, stop
        `smooth_part` there, shape (n,).

    Returns
    -------
    A/A, shape (n,): what crosses each way from its left to its right.
    """
    rise = stop - start
    for at, amps in zip(*flow.poles, strict=True):
        a, b = starts - at, stops - at
        turn = np.arctan2(a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0], (a * b).sum(axis=1))
        rise = rise + amps / (2 * pi) * turn
    return rise


def current_across(flow: Flow, line: LineString) -> float:
    """Current that crosses a line on copper.

    Parameters
    ----------
    flow
        The flow.
    line
        A line in the plane, mm, from copper to copper, through no pole.

    Returns
    -------
    Ampere per ampere in the trace. Plus is against the current of a trace that crosses the line
    from its right to its left.
    """
    points = shapely.get_coordinates(line)
    value = smooth_part(flow, points)
    return float(rises(flow, points[:-1], points[1:], value[:-1], value[1:]).sum())
