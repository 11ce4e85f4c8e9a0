"""Gaps, traces and bridges in, the matrix of added loop inductance out: the field solve."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from shapely import Point, Polygon

from splitcheck.loops.doubt import judged, lost_by_merging_nh, settled
from splitcheck.loops.flux import cut_off, flux_of, no_flux
from splitcheck.loops.job import MAX_PANELS, check, finer, job_of, mesh_of
from splitcheck.loops.relevant import arrange
from splitcheck.loops.solution import Solution, Strap, TraceOver, ViaBridge

__all__ = ["MAX_PANELS", "Solution", "Strap", "TraceOver", "ViaBridge", "added"]


def added(
    gaps: Sequence[Polygon],
    traces: Sequence[TraceOver],
    height_mm: float,
    *,
    beyond_mm: float | None = None,
    above_mm: float | None = None,
    bridges: Sequence[ViaBridge | Strap] = (),
    outside: Polygon | None = None,
    ends: Sequence[Point] = (),
    disjoint: bool = False,
    fineness: float = 1.0,
    coarsest: float = np.inf,
    inner: Polygon | None = None,
) -> Solution:
    """Solve for the loop inductance that gaps in a plane add to the traces over them.

    Parameters
    ----------
    gaps
        Where the plane has no copper, mm. Polygons may touch, overlap or be degenerate; their
        holes are copper.
    traces
        Traces over the plane, all at the same height.
    height_mm
        Distance from the plane to the traces, > 0.
    beyond_mm
        Distance to a whole plane on the other side, or None.
    above_mm
        Distance to a whole plane on the traces' side, > `height_mm`, or None. It takes its share
        of the current, and is taken to be joined to this plane at the ends of the traces.
    bridges
        What can carry current from one side of a gap to the other: over it, or by way of the plane
        beyond or above.
    outside
        Outline of the plane: all outside it counts as a gap. None: the plane has no end.
    ends
        Where gaps that go on to the outside were cut off, on their rims: flux that leaves through
        them there comes back outside. Without effect where another plane shuts it in.
    disjoint
        The gaps are known to be valid polygons that do not touch; this saves time.
    fineness
        Panels per length, against the usual, > 0.
    coarsest
        How many times coarser than that panels may be made, so as not to be too many, >= 1.
    inner
        Where gaps were cut off though they go on: a region that ends about half way out to there.
        A part of what the gaps add beyond it goes into the error, for what they add further out.

    Returns
    -------
    The solution; see `Solution`.

    Raises
    ------
    SplitcheckError
        If a height or distance is not a positive number, a trace has no length, or there would be
        too many panels.

    Notes
    -----
    The unknown is the flux density b normal to the plane in the gaps. It makes the tangential
    field continuous there: integral of (g_up + g_down) b / (2 pi mu0) = f + c in each gap, with no
    net flux through any gap, g = 1/r with its images in the planes, and f the source function of
    the traces over a whole plane. The added inductance is the integral of f b. Bridges share the
    current so that the energy is least (Thomson's principle). Vias have the field of line currents
    between the two planes that they join; a trace between those has none of it, for its ends give
    each plane just its share.

    Examples
    --------
    A slot of 8 mm by 0.4 mm across a trace 0.2 mm above the plane:

    >>> from shapely import LineString, box
    >>> slot = box(-0.2, -4, 0.2, 4)
    >>> trace = TraceOver(LineString([(-15, 0), (15, 0)]), width_mm=0.4)
    >>> solution = added([slot], [trace], height_mm=0.2)
    >>> round(float(solution.added_nh[0, 0]), 2)
    1.1
    """
    check(traces, height_mm, beyond_mm, above_mm, bridges)
    scene = arrange(
        gaps,
        [trace.line for trace in traces],
        height_mm,
        outside,
        [bridge.line for bridge in bridges if isinstance(bridge, Strap)],
        beyond_mm or above_mm,
        disjoint=disjoint,
    )
    job = job_of(scene, traces, bridges, height_mm, beyond_mm, above_mm, ends, inner)
    if not job.traces or cut_off(job).all():
        return judged(job, no_flux(job), np.zeros((len(job.traces),) * 2))
    mesh, coarser = mesh_of(job, fineness, coarsest=coarsest)
    flux = flux_of(job, mesh)
    mesh_nh = lost_by_merging_nh(flux)
    if not settled(flux, mesh_nh):
        smaller = finer(job, fineness, len(mesh))
        if smaller is not None:
            before, flux = flux, flux_of(job, smaller)
            mesh_nh = np.abs(flux.added_nh - before.added_nh)
    return judged(job, flux, mesh_nh, coarser)
