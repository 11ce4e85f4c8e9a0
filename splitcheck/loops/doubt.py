"""The flux of a field solve in, its solution out: how far off it may be, for all who asked."""

from __future__ import annotations

import numpy as np

from splitcheck.loops.flux import Flux
from splitcheck.loops.job import Job
from splitcheck.loops.solution import Solution
from splitcheck.units import MU0, Floats

#: This part of what is lost by merging panels up to fours is what halving them may bring: over 179
#: crossings of three boards halving added 0.2 to 0.8 % in the middle, merging took 2.4 to 5.9 %.
_LOST_BY_MERGING = 0.35
#: Where that is more than so much and the method's own error, smaller panels are tried, nH.
_SETTLED_NH = 4e-3
#: What a mesh that had to be made coarser by one time itself may be off by.
_COARSE_ERROR = 0.15
#: What the method itself is off by where mesh and truncation are not: against the independent
#: field solves of tests/loops/reference.csv, mostly because a real strip crowds its current.
_METHOD_ERROR = 0.03
#: Where gaps were cut off, what lies further out adds up to this part of what the outer half of the
#: way there does, at 13 of the 14 crossings of four boards whose windows still cut gaps off.
_FURTHER_OUT = 0.5
#: Less than this is not told from nothing.
_FLOOR_NH = 1e-3
#: How much of the difference between an evenly filled strip and a thread of current is in doubt.
_WIDTH_ERROR = 0.2


def lost_by_merging_nh(flux: Flux) -> Floats:
    """What the panels may be off by, from how much the value falls with merged ones."""
    lost: Floats = _LOST_BY_MERGING * np.abs(flux.added_nh - flux.merged_nh)
    return lost


def settled(flux: Flux, mesh_nh: Floats) -> bool:
    """Whether halving the panels would not matter."""
    own, off = np.diag(flux.added_nh), np.diag(mesh_nh)
    return bool((off < _METHOD_ERROR * own + _SETTLED_NH).all())


def judged(job: Job, flux: Flux, mesh_nh: Floats, coarser: float = 1.0) -> Solution:
    """Put an error on a solve and spread it over all traces that were asked for.

    `mesh_nh` is what the panels are off by.
    """
    own = np.diag(flux.added_nh)
    scale = np.sqrt(np.maximum(np.outer(own, own), 0.0))
    mesh_nh = mesh_nh + _COARSE_ERROR * (coarser - 1.0) * scale
    left = job.scene.left_out_nh[list(job.traces)]
    short = np.array([job.scene.cut_short_mm[k] for k in job.traces])
    alone = _FLOOR_NH + left + _short_nh(short, job.height_mm)
    alone = alone + _FURTHER_OUT * flux.beyond_nh
    alone = alone + _WIDTH_ERROR * np.abs(flux.filament_nh)
    error = mesh_nh + _METHOD_ERROR * scale + np.sqrt(np.outer(alone, alone))
    added_nh = np.zeros((job.count, job.count))
    error_nh = np.zeros_like(added_nh)
    nwb = np.zeros((len(flux.mesh), job.count))
    bridge_a = np.zeros((job.bridge_count, job.count))
    cut_off = np.ones(job.count, dtype=bool)
    on = list(job.traces)
    added_nh[np.ix_(on, on)] = flux.added_nh
    error_nh[np.ix_(on, on)] = error
    nwb[:, on] = flux.flux
    bridge_a[np.ix_(list(job.bridges), on)] = flux.bridge_a
    cut_off[on] = flux.cut_off
    lost = np.flatnonzero(cut_off)
    error_nh[lost] = error_nh[:, lost] = 0.0
    added_nh[lost, lost] = error_nh[lost, lost] = np.inf
    return Solution(
        added_nh=added_nh,
        error_nh=error_nh,
        panels=len(flux.mesh),
        cut_off=tuple(bool(c) for c in cut_off),
        remarks=job.remarks,
        mesh=flux.mesh,
        flux_nwb=nwb,
        bridge_a=bridge_a,
        coarser=coarser,
        gaps=job.scene.gaps,
        lines=job.scene.lines,
    )


def _short_nh(short_mm: Floats, height_mm: float) -> Floats:
    """What the end of a trace over a gap may add: no more than a wire far from any plane."""
    beyond = np.maximum(short_mm - 2 * height_mm, 0.0)
    value: Floats = MU0 / (2 * np.pi) * beyond * np.log1p(beyond / height_mm)
    return value
