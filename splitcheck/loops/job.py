"""Gaps, traces and bridges in, a job of the field solve out: what counts, and its panels."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from math import isfinite

import numpy as np
import shapely
from shapely import LineString, Point, Polygon

from splitcheck.errors import SplitcheckError
from splitcheck.loops.angles import Known, islands
from splitcheck.loops.grading import Grading, TooManyPanelsError
from splitcheck.loops.panels import Panels, cut
from splitcheck.loops.relevant import Scene
from splitcheck.loops.share import via_matrix
from splitcheck.loops.solution import Strap, TraceOver, ViaBridge
from splitcheck.loops.sources import Strip
from splitcheck.units import Floats

#: Size of a panel at the trace, in heights of the trace over the plane.
_NEAR = 0.6
_SLOPE = 0.4
#: From this many panel sizes on they grow faster than in proportion to the distance.
_FAR = 25.0
#: Panels are this much larger where more than a few traces ask for small ones.
_FEW_TRACES, _BUS = 6, 1.5
#: For a second look panels are made this many times smaller, up to so many of them.
_FINER, _REFINE_UP_TO = 2.0, 600
#: ... unless there are not even so many times as many as at first.
_MORE = 1.5
#: More unknowns than this are not solved for: the panels are made coarser instead.
MAX_PANELS = 900
_COARSEN = 7
_COARSER_STEP = 1.7
#: Into how many panels to cut the longer side of a gap at least: one far from all traces, one near
#: them, and one that is crossed.
_LEAST = (2.1, 4.2, 8.4)
_SLENDER = 12.0
#: Where a gap was cut off is looked for this far from its rim, mm.
_ON_RIM_MM = 0.05


def check(
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
class Job:
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
    held: tuple[tuple[int, Floats], ...]
    """Which islands hold which ends of strips and which vias; see `islands`."""
    balances: Floats
    """What a unit of each source brings to each of them, shape (islands, sources)."""
    remarks: tuple[str, ...]
    ends: tuple[tuple[int, Floats], ...]
    """Gaps that go on beyond what is given, and where each was cut off."""
    inner: Polygon | None
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


def job_of(
    scene: Scene,
    traces: Sequence[TraceOver],
    bridges: Sequence[ViaBridge | Strap],
    height_mm: float,
    beyond_mm: float | None,
    above_mm: float | None,
    ends: Sequence[Point] = (),
    inner: Polygon | None = None,
) -> Job:
    """Sort out which traces and bridges count; the parameters are those of `solve.added`."""
    remarks: list[str] = []
    strips: list[Strip] = []
    on = [k for k, line in enumerate(scene.lines) if line is not None]
    for k in on:
        line = scene.lines[k]
        assert line is not None
        strips.append(Strip(line, traces[k].width_mm, height_mm, above_mm))
    straps, vias = [], []
    for k, bridge in enumerate(bridges):
        feet = bridge.at if isinstance(bridge, ViaBridge) else bridge.line.boundary
        if shapely.intersects(list(scene.gaps), feet).any():
            remarks.append(f"bridge {k + 1} does not stand on copper and is left out")
        elif isinstance(bridge, Strap):
            plate_mm = beyond_mm if bridge.beyond else above_mm
            if plate_mm is not None and bridge.height_mm >= plate_mm:
                remarks.append(f"bridge {k + 1} stands beyond another plane and is left out")
            else:
                straps.append(k)
        elif (above_mm if bridge.above else beyond_mm) is None:
            remarks.append(f"bridge {k + 1} leads to a plane that is not there and is left out")
        else:
            vias.append(k)
    for k in straps:
        strap = bridges[k]
        assert isinstance(strap, Strap)
        line = shapely.get_coordinates(strap.line)
        over_mm = beyond_mm if strap.beyond else above_mm
        strips.append(Strip(line, strap.width_mm, strap.height_mm, over_mm))
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
    plates_mm = tuple(d for d in (above_mm, beyond_mm) if d is not None)
    held, balances = _balances(scene.gaps, strips, places)
    return Job(
        scene=scene,
        count=len(traces),
        traces=tuple(on),
        strips=tuple(strips),
        vias=places,
        cavities=cavities,
        bridges=(*straps, *(k for k, _ in standing)),
        bridge_count=len(bridges),
        own_nh=own,
        plates_mm=plates_mm,
        height_mm=height_mm,
        near_mm=_NEAR * height_mm * (1.0 if len(on) <= _FEW_TRACES else _BUS),
        held=held,
        balances=balances,
        remarks=tuple(remarks),
        ends=() if plates_mm else _cut_off(scene, ends),
        inner=inner,
    )


def _balances(
    gaps: Sequence[Polygon], strips: Sequence[Strip], vias: Floats
) -> tuple[tuple[tuple[int, Floats], ...], Floats]:
    """What `islands` says of all ends and vias; and what a unit of each source brings there."""
    held = islands(gaps, np.concatenate([*(strip.line[[0, -1]] for strip in strips), vias]))
    ends = 2 * len(strips)
    rows = np.zeros((len(held), len(strips) + len(vias)))
    for row, (_, inside) in zip(rows, held, strict=True):
        row[: len(strips)] = inside[1:ends:2] - inside[0:ends:2]
        row[: len(strips)] *= [strip.share for strip in strips]
        row[len(strips) :] = inside[ends:]
    return tuple(held), rows


def mesh_of(
    job: Job, fineness: float, most: int = MAX_PANELS, coarsest: float = np.inf
) -> tuple[Panels, float]:
    """Cut the gaps, coarser and coarser until there are not too many panels; how much coarser."""
    # images in planes are averaged over a few points of each panel, potentials exactly
    slender = _SLENDER if job.plates_mm else np.inf
    lines = _lines(job.strips)
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


def finer(job: Job, fineness: float, count: int) -> Panels | None:
    """Panels of half the size; None if those are too many, or hardly more than `count`."""
    if count > _REFINE_UP_TO / _MORE:
        return None
    try:
        mesh = mesh_of(job, fineness * _FINER, _REFINE_UP_TO, coarsest=1.0)[0]
    except SplitcheckError:
        return None
    return mesh if len(mesh) >= _MORE * count else None


def _lines(strips: Sequence[Strip]) -> tuple[LineString, ...]:
    """Centre lines, all at once."""
    counts = [len(strip.line) for strip in strips]
    points = np.concatenate([strip.line for strip in strips])
    owner = np.repeat(np.arange(len(strips)), counts)
    lines = shapely.linestrings(points, indices=owner)
    return tuple(np.atleast_1d(np.asarray(lines, dtype=object)))
