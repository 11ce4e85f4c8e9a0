"""Gaps, traces and bridges in, the matrix of added loop inductance out: the field solve."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from math import isfinite

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely import LineString, Point, Polygon

from splitcheck.errors import SplitcheckError
from splitcheck.loops.grading import Grading, TooManyPanelsError
from splitcheck.loops.matrix import interaction
from splitcheck.loops.merged import merged, on_merged
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels, cut
from splitcheck.loops.relevant import Scene, arrange
from splitcheck.loops.share import share_out, via_matrix
from splitcheck.loops.sources import (
    Known,
    Strip,
    islands,
    point_angles,
    still_afar,
    strip_sources,
)
from splitcheck.units import MU0, Floats

#: Size of a panel at the trace, in heights of the trace over the plane.
_NEAR = 0.6
_SLOPE = 0.4
#: From this many panel sizes on they grow faster than in proportion to the distance.
_FAR = 25.0
#: Panels are this much larger where more than a few traces ask for small ones.
_FEW_TRACES, _BUS = 6, 1.5
#: This part of what is lost by merging panels up to fours is what halving them may bring: over 179
#: crossings of three boards halving added 0.2 to 0.8 % in the middle, merging took 2.4 to 5.9 %.
_LOST_BY_MERGING = 0.35
#: Where this is more than so much and the method's own error, the panels are halved,
_FINER = 2.0
_SETTLED_NH = 4e-3
#: up to this many; the change is then taken instead.
_REFINE_UP_TO = 600
#: More unknowns than this are not solved for: the panels are made coarser instead.
MAX_PANELS = 900
_COARSEN = 7
_COARSER_STEP = 1.7
#: What a mesh that had to be made coarser by one time itself may be off by.
_COARSE_ERROR = 0.15
#: Into how many panels to cut the longer side of a gap at least: one far from all traces, one near
#: them, and one that is crossed.
_LEAST = (2.1, 4.2, 8.4)
_SLENDER = 12.0
#: What the method itself is off by where mesh and truncation are not: against the independent
#: field solves of tests/loops/reference.csv, mostly because a real strip crowds its current.
_METHOD_ERROR = 0.03
#: Where gaps were cut off, what lies further out adds up to this part of what the outer half of the
#: way there does, at 13 of the 14 crossings of four boards whose windows still cut gaps off.
_FURTHER_OUT = 0.5
#: Where a gap was cut off is looked for this far from its rim, mm.
_ON_RIM_MM = 0.05
#: Less than this is not told from nothing.
_FLOOR_NH = 1e-3
#: How much of the difference between an evenly filled strip and a thread of current is in doubt.
_WIDTH_ERROR = 0.2


@dataclass(frozen=True, slots=True)
class TraceOver:
    """One trace over a gap."""

    line: LineString
    """Centre line, mm, with its ends over copper on both sides of the gap."""
    width_mm: float


@dataclass(frozen=True, slots=True)
class ViaBridge:
    """A plated hole that joins this plane and the plane beyond, or a part that does.

    Or else one to the plane above, if `above`.
    """

    at: Point
    diameter_mm: float
    mounted_nh: float = 0.0
    """Inductance of a part in its way, as mounted; 0 for a mere hole."""
    above: bool = False


@dataclass(frozen=True, slots=True)
class Strap:
    """A two-pad part across the gap, as a short wide trace: capacitor, resistor, link."""

    line: LineString
    """From pad to pad, mm, both ends over copper."""
    width_mm: float
    height_mm: float
    """Height of its current over the plane."""
    mounted_nh: float
    """Inductance of the part as mounted over a whole plane."""


@dataclass(frozen=True, slots=True)
class Solution:
    """Added inductance of all traces over the same gaps, and the flux that makes it."""

    added_nh: Floats
    """Matrix, shape (n, n): added loop inductance on the diagonal, mutual off it. A trace that is
    cut off has infinity on the diagonal and 0 elsewhere."""
    error_nh: Floats
    """How far each entry may be off, shape (n, n)."""
    panels: int
    cut_off: tuple[bool, ...]
    """For each trace: no way back, neither by copper nor by a bridge."""
    remarks: tuple[str, ...]
    """What was done to the input that may change the value, each a full sentence."""
    mesh: Panels
    flux_nwb: Floats
    """Flux through each panel per ampere in each trace, shape (panels, n), nWb/A."""
    bridge_a: Floats
    """Current in each bridge per ampere in each trace, shape (bridges, n)."""
    coarser: float = 1.0
    """How many times coarser than they should be the panels were made, so as not to be too many."""
    gaps: tuple[Polygon, ...] = ()
    """The gaps as they were solved."""
    lines: tuple[Floats | None, ...] = ()
    """The centre lines as they were solved, shape (p, 2); None: nowhere over copper."""

    def of(self, trace: int) -> float | None:
        """Added inductance of one trace in nH, or None where it has no way back."""
        return None if self.cut_off[trace] else float(self.added_nh[trace, trace])


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

    >>> slot = shapely.box(-0.2, -4, 0.2, 4)
    >>> trace = TraceOver(LineString([(-15, 0), (15, 0)]), width_mm=0.4)
    >>> solution = added([slot], [trace], height_mm=0.2)
    >>> round(float(solution.added_nh[0, 0]), 2)
    1.1
    """
    _check(traces, height_mm, beyond_mm, above_mm, bridges)
    scene = arrange(
        gaps,
        [trace.line for trace in traces],
        height_mm,
        outside,
        [bridge.line for bridge in bridges if isinstance(bridge, Strap)],
        beyond_mm or above_mm,
        disjoint=disjoint,
    )
    job = _job(scene, traces, bridges, height_mm, beyond_mm, above_mm)
    if not job.plates_mm:
        job = replace(job, ends=_cut_off(scene, ends))
    job = replace(job, inner=inner)
    if not job.traces or _lost(job).all():
        return _judged(job, _nothing(job), np.zeros((len(job.traces),) * 2))
    mesh, coarser = _panels(job, fineness, coarsest=coarsest)
    raw = _solved(job, mesh)
    mesh_nh = _LOST_BY_MERGING * np.abs(raw.added_nh - raw.merged_nh)
    if not _settled(raw, mesh_nh):
        finer = _finer(job, fineness)
        if finer is not None and len(finer) >= 1.5 * len(mesh):
            before, raw = raw, _solved(job, finer)
            mesh_nh = np.abs(raw.added_nh - before.added_nh)
    return _judged(job, raw, mesh_nh, coarser)


def _finer(job: _Job, fineness: float) -> Panels | None:
    """Panels of half the size, if those are not too many."""
    try:
        return _panels(job, fineness * _FINER, _REFINE_UP_TO, coarsest=1.0)[0]
    except SplitcheckError:
        return None


def _settled(raw: _Raw, mesh_nh: Floats) -> bool:
    """Whether halving the panels would not matter."""
    own, off = np.diag(raw.added_nh), np.diag(mesh_nh)
    return bool((off < _METHOD_ERROR * own + _SETTLED_NH).all())


def _check(
    traces: Sequence[TraceOver],
    height_mm: float,
    beyond_mm: float | None,
    above_mm: float | None,
    bridges: Sequence[ViaBridge | Strap],
) -> None:
    """Refuse what has no meaning."""
    given = {"height_mm": height_mm, "beyond_mm": beyond_mm, "above_mm": above_mm}
    for name, value in given.items():
        if value is not None and not (isfinite(value) and value > 0):
            wrong = f"{value} is not a distance between a trace or plane and a plane"
            raise SplitcheckError(name, wrong, "give millimetres greater than 0")
    if above_mm is not None and above_mm <= height_mm:
        wrong = f"the plane above lies at {above_mm} mm, not above the trace at {height_mm} mm"
        raise SplitcheckError("above_mm", wrong, "give the distance between the two planes")
    strips: list[TraceOver | Strap] = [*traces]
    strips += [bridge for bridge in bridges if isinstance(bridge, Strap)]
    for strip in strips:
        if not (isfinite(strip.line.length) and strip.line.length > 0):
            raise SplitcheckError(
                "line", "a trace or part has no length", "give two points or more"
            )
        if not (isfinite(strip.width_mm) and strip.width_mm >= 0):
            wrong = f"{strip.width_mm} is not a width"
            raise SplitcheckError("width_mm", wrong, "give millimetres, 0 or more")


@dataclass(frozen=True, slots=True)
class _Job:
    """What is solved, once or on finer panels again."""

    scene: Scene
    count: int
    """Number of traces."""
    traces: tuple[int, ...]
    """Those of them that lie over copper at both ends."""
    strips: tuple[Strip, ...]
    """These traces, then the straps."""
    vias: Floats
    """Places of the vias that count, shape (v, 2)."""
    cavities: tuple[int, int]
    """How many of them lead to the plane beyond, and then how many to that above."""
    bridges: tuple[int, ...]
    """Which bridges count, straps first."""
    bridge_count: int
    own_nh: Floats
    """Inductance matrix of the bridges over a whole plane."""
    plates_mm: tuple[float, ...]
    height_mm: float
    near_mm: float
    remarks: tuple[str, ...]
    ends: tuple[tuple[int, Floats], ...] = ()
    """Gaps that go on beyond what is given, and where each was cut off."""
    inner: Polygon | None = None
    """Where gaps go on beyond what is given: what ends half way out."""
    known: Known = field(default_factory=dict)
    """Cuts through the gaps, filled by the first solve and used again by the next."""


def _cut_off(scene: Scene, ends: Sequence[Point]) -> tuple[tuple[int, Floats], ...]:
    """Which gaps were cut off, and where; one place for each."""
    found: dict[int, Floats] = {}
    for end in ends:
        for number, gap in enumerate(scene.gaps):
            if shapely.dwithin(gap, end, _ON_RIM_MM):
                found.setdefault(number, np.array(end.coords[0][:2]))
    return tuple(sorted(found.items(), key=lambda pair: pair[0]))


def _job(
    scene: Scene,
    traces: Sequence[TraceOver],
    bridges: Sequence[ViaBridge | Strap],
    height_mm: float,
    beyond_mm: float | None,
    above_mm: float | None,
) -> _Job:
    """Sort out which traces and bridges count."""
    remarks: list[str] = []
    strips: list[Strip] = []
    on = [k for k, line in enumerate(scene.lines) if line is not None]
    for k in on:
        line = scene.lines[k]
        assert line is not None
        strips.append(Strip(line, traces[k].width_mm, height_mm, above_mm))
    straps, vias = [], []
    for k, bridge in enumerate(bridges):
        ends = bridge.at if isinstance(bridge, ViaBridge) else bridge.line.boundary
        if shapely.intersects(list(scene.gaps), ends).any():
            remarks.append(f"bridge {k + 1} does not stand on copper and is left out")
        elif isinstance(bridge, Strap):
            straps.append(k)
        elif (above_mm if bridge.above else beyond_mm) is None:
            remarks.append(f"bridge {k + 1} leads to a plane that is not there and is left out")
        else:
            vias.append(k)
    for k in straps:
        strap = bridges[k]
        assert isinstance(strap, Strap)
        line = shapely.get_coordinates(strap.line)
        strips.append(Strip(line, strap.width_mm, strap.height_mm, above_mm))
    standing = [(k, b) for k in vias if isinstance(b := bridges[k], ViaBridge)]
    standing.sort(key=lambda pair: pair[1].above)
    chosen = [via for _, via in standing]
    places = np.array([via.at.coords[0][:2] for via in chosen]).reshape(-1, 2)
    upward = sum(via.above for via in chosen)
    cavities = (len(chosen) - upward, upward)
    own = np.diag([bridges[k].mounted_nh for k in straps] + [via.mounted_nh for via in chosen])
    first = len(straps)
    for plate_mm, several in zip((beyond_mm, above_mm), cavities, strict=True):
        if plate_mm is not None and several:
            mine = slice(first - len(straps), first - len(straps) + several)
            wide_mm = [via.diameter_mm for via in chosen[mine]]
            both = slice(first, first + several)
            own[both, both] += via_matrix(places[mine], wide_mm, plate_mm)
        first += several
    for k, short in enumerate(scene.cut_short_mm):
        if scene.lines[k] is None:
            remarks.append(f"trace {k + 1} is nowhere over copper of this plane")
        elif short > 0:
            remarks.append(f"trace {k + 1} ends in a gap; {short:.3f} mm of it are left out")
    return _Job(
        scene=scene,
        count=len(traces),
        traces=tuple(on),
        strips=tuple(strips),
        vias=places,
        cavities=cavities,
        bridges=(*straps, *(k for k, _ in standing)),
        bridge_count=len(bridges),
        own_nh=own,
        plates_mm=tuple(d for d in (above_mm, beyond_mm) if d is not None),
        height_mm=height_mm,
        near_mm=_NEAR * height_mm * (1.0 if len(on) <= _FEW_TRACES else _BUS),
        remarks=tuple(remarks),
    )


def _panels(
    job: _Job, fineness: float, most: int = MAX_PANELS, coarsest: float = np.inf
) -> tuple[Panels, float]:
    """Cut the gaps, coarser and coarser until there are not too many panels; how much coarser."""
    # images in planes are averaged over a few points of each panel, potentials exactly
    slender = _SLENDER if job.plates_mm else np.inf
    lines = tuple(LineString(strip.line) for strip in job.strips)
    near, slope = job.near_mm / fineness, _SLOPE / fineness
    least = np.array(_LEAST)[list(job.scene.weight)] * fineness
    for step in range(_COARSEN):
        if _COARSER_STEP**step > coarsest:
            break
        grading = Grading(
            lines, near, slope, _FAR * near, slender=slender, root_mm=job.near_mm, most=most
        )
        try:
            mesh = cut(job.scene.gaps, grading, [float(k) for k in np.maximum(least, 2.0)])
        except TooManyPanelsError:
            pass
        else:
            if len(mesh) <= most:
                return mesh, _COARSER_STEP**step
        near, slope, least = near * _COARSER_STEP, min(slope * 1.5, 4.0), least / _COARSER_STEP
    wrong = f"{len(job.scene.gaps)} gaps need more than {MAX_PANELS} panels"
    raise SplitcheckError("gaps", wrong, "give fewer or simpler gaps")


@dataclass(frozen=True, slots=True)
class _Raw:
    """One solve, for the traces that count."""

    added_nh: Floats
    merged_nh: Floats
    """The same on merged panels."""
    filament_nh: Floats
    """The diagonal if the whole current ran on the centre line."""
    beyond_nh: Floats
    """How much of the diagonal is due to what lies beyond `_Job.inner`."""
    cut_off: NDArray[np.bool_]
    mesh: Panels
    flux: Floats
    bridge_a: Floats


def _solved(job: _Job, mesh: Panels) -> _Raw:
    """Factor once, solve for all traces and bridges, and share the current among the bridges."""
    sources, centres, rows = _sources(job, mesh)
    matrix = interaction(mesh, job.plates_mm) if len(mesh) else np.zeros((0, 0))
    rough = on_merged(mesh, merged(mesh), matrix, sources)
    response = _response(job, matrix, np.concatenate([sources, centres], axis=1), mesh.gap)
    count, every = len(job.traces), sources.shape[1]
    energy = sources.T @ response[:, :every]
    added_nh, way, cut_off = _shared(job, energy, rows)
    line = (centres * response[:, every:]).sum(axis=0)
    return _Raw(
        added_nh=added_nh,
        merged_nh=_shared(job, rough[1].T @ _response(job, *rough), rows)[0],
        filament_nh=line - np.diag(energy)[:count],
        beyond_nh=np.diag(added_nh) - _within_nh(job, mesh, matrix, sources, rows, added_nh),
        cut_off=cut_off,
        mesh=mesh,
        flux=response[:, :every] @ way,
        bridge_a=way[count:],
    )


def _within_nh(
    job: _Job, mesh: Panels, matrix: Floats, sources: Floats, rows: Floats, added_nh: Floats
) -> Floats:
    """The diagonal if there were copper beyond `_Job.inner`, never more than it is without."""
    own: Floats = np.diag(added_nh)
    if job.inner is None or not len(mesh):
        return own
    near = shapely.contains_xy(job.inner, mesh.centre)
    if near.all():
        return own
    some = matrix[np.ix_(near, near)]
    response = _response(job, some, sources[near], mesh.gap[near])
    return np.minimum(np.diag(_shared(job, sources[near].T @ response, rows)[0]), own)


def _shared(job: _Job, energy: Floats, rows: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Share the current among the bridges; the inductance, the currents, and who has no way."""
    count = len(job.traces)
    way, cut_off = share_out(energy, job.own_nh, rows, count, job.cavities)
    full = energy.copy()
    full[count:, count:] += job.own_nh
    added_nh = way.T @ full @ way
    return (added_nh + added_nh.T) / 2, way, cut_off


def _balances(job: _Job) -> tuple[list[tuple[int, Floats]], Floats]:
    """What `islands` says of all ends and vias; and what a unit of each source brings there."""
    ends = [strip.line[[0, -1]] for strip in job.strips]
    held = islands(job.scene.gaps, np.concatenate([*ends, job.vias]))
    strips = len(ends)
    rows = np.zeros((len(held), strips + len(job.vias)))
    for row, (_, inside) in zip(rows, held, strict=True):
        row[:strips] = inside[1 : 2 * strips : 2] - inside[0 : 2 * strips : 2]
        row[:strips] *= [strip.share for strip in job.strips]
        row[strips:] = inside[2 * strips :]
    return held, rows


def _lost(job: _Job) -> NDArray[np.bool_]:
    """Which traces have no way back, before anything is solved."""
    _, rows = _balances(job)
    count, bridges = len(job.traces), len(job.bridges)
    nothing = np.zeros((count + bridges,) * 2)
    return share_out(nothing, np.eye(bridges), rows, count, job.cavities)[1]


def _nothing(job: _Job) -> _Raw:
    """The answer where no trace has a way back."""
    count = len(job.traces)
    return _Raw(
        added_nh=np.zeros((count, count)),
        merged_nh=np.zeros((count, count)),
        filament_nh=np.zeros(count),
        beyond_nh=np.zeros(count),
        cut_off=np.ones(count, dtype=bool),
        mesh=cut((), Grading((), job.near_mm)),
        flux=np.zeros((0, count)),
        bridge_a=np.zeros((len(job.bridges), count)),
    )


def _sources(job: _Job, mesh: Panels) -> tuple[Floats, Floats, Floats]:
    """Source functions of strips and vias; of the traces' centre lines; and island balances."""
    held, rows = _balances(job)
    points = np.concatenate([*(strip.line[[0, -1]] for strip in job.strips), job.vias])
    angles = point_angles(mesh, job.scene.gaps, points, held, job.known)
    ends = 2 * len(job.strips)
    between = still_afar(mesh, job.strips, angles[1:ends:2] - angles[:ends:2], job.ends)
    full, lines = strip_sources(mesh, job.strips, between)
    columns = [full, angles[ends:].T / (2 * np.pi)]
    return np.concatenate(columns, axis=1), lines[:, : len(job.traces)], rows


def _response(job: _Job, matrix: Floats, sources: Floats, gap: Ints) -> Floats:
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


def _judged(job: _Job, fine: _Raw, mesh_nh: Floats, coarser: float = 1.0) -> Solution:
    """Put an error on a solve and spread it over all traces that were asked for.

    `mesh_nh` is what the panels are off by.
    """
    own = np.diag(fine.added_nh)
    scale = np.sqrt(np.maximum(np.outer(own, own), 0.0))
    mesh_nh = mesh_nh + _COARSE_ERROR * (coarser - 1.0) * scale
    left = job.scene.left_out_nh[list(job.traces)]
    short = np.array([job.scene.cut_short_mm[k] for k in job.traces])
    alone = _FLOOR_NH + left + _short_nh(short, job.height_mm)
    alone = alone + _FURTHER_OUT * fine.beyond_nh
    alone = alone + _WIDTH_ERROR * np.abs(fine.filament_nh)
    error = mesh_nh + _METHOD_ERROR * scale + np.sqrt(np.outer(alone, alone))
    added_nh = np.zeros((job.count, job.count))
    error_nh = np.zeros_like(added_nh)
    flux = np.zeros((len(fine.mesh), job.count))
    bridge_a = np.zeros((job.bridge_count, job.count))
    cut_off = np.ones(job.count, dtype=bool)
    on = list(job.traces)
    added_nh[np.ix_(on, on)] = fine.added_nh
    error_nh[np.ix_(on, on)] = error
    flux[:, on] = fine.flux
    bridge_a[np.ix_(list(job.bridges), on)] = fine.bridge_a
    cut_off[on] = fine.cut_off
    lost = np.flatnonzero(cut_off)
    error_nh[lost] = error_nh[:, lost] = 0.0
    added_nh[lost, lost] = error_nh[lost, lost] = np.inf
    return Solution(
        added_nh=added_nh,
        error_nh=error_nh,
        panels=len(fine.mesh),
        cut_off=tuple(bool(c) for c in cut_off),
        remarks=job.remarks,
        mesh=fine.mesh,
        flux_nwb=flux,
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
