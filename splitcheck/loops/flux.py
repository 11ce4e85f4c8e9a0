"""A job of the field solve and its panels in, the flux through them and what it adds out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from splitcheck.loops.angles import point_angles
from splitcheck.loops.grading import Grading
from splitcheck.loops.job import Job
from splitcheck.loops.matrix import interaction
from splitcheck.loops.merged import merged, on_merged
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels, cut
from splitcheck.loops.share import share_out
from splitcheck.loops.sources import still_afar, strip_sources
from splitcheck.units import MU0, Floats


@dataclass(frozen=True, slots=True)
class Flux:
    """One solve, for the traces that count."""

    added_nh: Floats
    merged_nh: Floats
    """The same on merged panels."""
    filament_nh: Floats
    """The diagonal if the whole current ran on the centre line."""
    beyond_nh: Floats
    """How much of the diagonal is due to what lies beyond `Job.inner`."""
    cut_off: NDArray[np.bool_]
    mesh: Panels
    flux: Floats
    bridge_a: Floats


def flux_of(job: Job, mesh: Panels) -> Flux:
    """Factor once, solve for all traces and bridges, and share the current among the bridges."""
    sources, centres = _sources(job, mesh)
    matrix = interaction(mesh, job.plates_mm) if len(mesh) else np.zeros((0, 0))
    rough = on_merged(mesh, merged(mesh), matrix, sources)
    response = _response(job, matrix, np.concatenate([sources, centres], axis=1), mesh.gap)
    count, every = len(job.traces), sources.shape[1]
    energy = sources.T @ response[:, :every]
    added_nh, way, off = _shared(job, energy)
    line = (centres * response[:, every:]).sum(axis=0)
    return Flux(
        added_nh=added_nh,
        merged_nh=_shared(job, rough[1].T @ _response(job, *rough))[0],
        filament_nh=line - np.diag(energy)[:count],
        beyond_nh=np.diag(added_nh) - _within_nh(job, mesh, matrix, sources, added_nh),
        cut_off=off,
        mesh=mesh,
        flux=response[:, :every] @ way,
        bridge_a=way[count:],
    )


def _within_nh(job: Job, mesh: Panels, matrix: Floats, sources: Floats, added_nh: Floats) -> Floats:
    """The diagonal if there were copper beyond `Job.inner`, never more than it is without."""
    own: Floats = np.diag(added_nh)
    if job.inner is None or not len(mesh):
        return own
    near = shapely.contains_xy(job.inner, mesh.centre)
    if near.all():
        return own
    some = matrix[np.ix_(near, near)]
    response = _response(job, some, sources[near], mesh.gap[near])
    return np.minimum(np.diag(_shared(job, sources[near].T @ response)[0]), own)


def _shared(job: Job, energy: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Share the current among the bridges; the inductance, the currents, and who has no way."""
    count = len(job.traces)
    way, off = share_out(energy, job.own_nh, job.balances, count, job.cavities)
    full = energy.copy()
    full[count:, count:] += job.own_nh
    added_nh = way.T @ full @ way
    return (added_nh + added_nh.T) / 2, way, off


def cut_off(job: Job) -> NDArray[np.bool_]:
    """Which traces have no way back, before anything is solved."""
    count, bridges = len(job.traces), len(job.bridges)
    none = np.zeros((count + bridges,) * 2)
    return share_out(none, np.eye(bridges), job.balances, count, job.cavities)[1]


def no_flux(job: Job) -> Flux:
    """The answer where no trace has a way back."""
    count = len(job.traces)
    return Flux(
        added_nh=np.zeros((count, count)),
        merged_nh=np.zeros((count, count)),
        filament_nh=np.zeros(count),
        beyond_nh=np.zeros(count),
        cut_off=np.ones(count, dtype=bool),
        mesh=cut((), Grading((), job.near_mm)),
        flux=np.zeros((0, count)),
        bridge_a=np.zeros((len(job.bridges), count)),
    )


def _sources(job: Job, mesh: Panels) -> tuple[Floats, Floats]:
    """Source functions of strips and vias, and of the traces' centre lines."""
    points = np.concatenate([*(strip.line[[0, -1]] for strip in job.strips), job.vias])
    angles = point_angles(mesh, job.scene.gaps, points, job.held, job.known)
    ends = 2 * len(job.strips)
    between = still_afar(mesh, job.strips, angles[1:ends:2] - angles[:ends:2], job.ends)
    full, lines = strip_sources(mesh, job.strips, between)
    columns = [full, angles[ends:].T / (2 * np.pi)]
    return np.concatenate(columns, axis=1), lines[:, : len(job.traces)]


def _response(job: Job, matrix: Floats, sources: Floats, gap: Ints) -> Floats:
    """Flux through each panel for each source, with no net flux through any closed gap, nWb/A."""
    if not len(matrix):
        return np.zeros_like(sources)
    # flux can go out over the open rim of the world, unless planes shut it in
    free = {job.scene.endless, *(gap for gap, _ in job.ends)} if not job.plates_mm else set()
    closed = [g for g in np.unique(gap).tolist() if g not in free]
    nets = (gap[:, None] == np.array(closed, dtype=np.int64)).astype(np.float64)
    solved = _cholesky_solve(matrix, np.concatenate([sources, nets], axis=1))
    flux, unit = solved[:, : sources.shape[1]], solved[:, sources.shape[1] :]
    if closed:
        flux = flux - unit @ np.linalg.solve(nets.T @ unit, nets.T @ flux)
    return 2 * np.pi * MU0 * flux


def _cholesky_solve(matrix: Floats, right: Floats) -> Floats:
    """Solve for all right sides with one factor.

    The matrix is positive definite but for what the averages over intricate panels miss; if that
    shows, the panels' own terms are raised a little, which merged panels will not agree with.
    """
    from scipy.linalg import cho_factor, cho_solve  # noqa: PLC0415 (0.25 s, only where needed)

    own = np.diag(matrix).copy()
    for raised in (0.0, 0.01, 0.03, 0.1, 0.3, 1.0, 10.0):
        np.fill_diagonal(matrix, own * (1 + raised))
        try:
            factor = cho_factor(matrix, lower=True, check_finite=False)
        except np.linalg.LinAlgError:
            continue
        solved: Floats = cho_solve(factor, right, check_finite=False)
        return solved
    message = "a field matrix could not be made positive definite"
    raise ArithmeticError(message)
