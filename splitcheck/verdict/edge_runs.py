"""Edge runs as findings: what the loop gains beside the edge of a plane, and the common mode."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np
import shapely

from splitcheck.board.names import in_words
from splitcheck.loops.estimate import beside_edge_nh_mm
from splitcheck.loops.finite_plane import common_nh_mm
from splitcheck.planes.crossings import Crossing
from splitcheck.planes.edges import EdgeRun, widths_across
from splitcheck.units import Floats
from splitcheck.verdict.around import SUPPLY_RATIO
from splitcheck.verdict.findings import Finding, Source
from splitcheck.verdict.listing import near_enough
from splitcheck.verdict.places import fingerprint
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import level, noise_mv

#: Steps within this distance of the stretch of a crossing of the same gap are in its solve, mm.
IN_SOLVE_MM = 1e-3
#: How far the closed form may be off: the edge is taken as straight and the plane as half of one.
ERROR = 0.3
SUPPLY_LINES = f"edge runs of lines wider than {SUPPLY_RATIO:g} times their height (supply lines)"
#: Where another plane covers a run beyond the edge of the nearest one, it is none of the board's.
COVERED = "runs beyond the rim of a plane that another whole plane covers (edge runs)"
#: The common mode is reckoned at no more places than this along a run.
MOST_PLACES = 40


def edge_findings(
    scene: Scene,
    runs: Sequence[EdgeRun],
    crossings: Sequence[Crossing],
    dropped: dict[str, int],
) -> list[Finding]:
    """Judge traces that run along the edge of a plane.

    Parameters
    ----------
    scene
        The board and its planes.
    runs
        Traces along edges: one for each net and edge.
    crossings
        Those that are findings; what their solves hold already is not counted again.
    dropped
        Counts of what is no finding; added to.

    Returns
    -------
    Findings with the loop's share as ``added_nh`` and the common mode apart as ``common_nh``.
    """
    solved: dict[tuple[int, int, int, int], list[shapely.LineString]] = defaultdict(list)
    for c in crossings:
        solved[c.net, c.layer, c.plane, c.gap].append(shapely.LineString(c.stretch))
    findings = []
    for run in runs:
        if run.width_mm > SUPPLY_RATIO * scene.board.stack.height_mm(run.layer, run.plane):
            dropped[SUPPLY_LINES] += 1
            continue
        rows = _not_solved(run, solved[run.net, run.layer, run.plane, run.gap])
        added = _loop_nh(scene, run, rows)
        if not len(rows) or added < scene.min_nh:
            dropped[near_enough("edge-run")] += 1
        else:
            findings.append(_finding(scene, run, rows, added))
    return findings


def _not_solved(run: EdgeRun, stretches: Sequence[shapely.LineString]) -> np.ndarray:
    """Steps of a run that no solve of a crossing holds."""
    points = np.asarray(shapely.points(run.places), dtype=object)
    free = np.ones(len(run.places), dtype=np.bool_)
    for stretch in stretches:
        free &= ~shapely.dwithin(points, stretch, IN_SOLVE_MM)
    return np.flatnonzero(free)


def _loop_nh(scene: Scene, run: EdgeRun, rows: np.ndarray) -> float:
    """What the loop gains beside the edge, nH: the half-plane's, step by step."""
    height = scene.board.stack.height_mm(run.layer, run.plane)
    each = [beside_edge_nh_mm(float(s), height) for s in run.inside_mm[rows]]
    return float(np.array(each) @ run.step_mm[rows]) if each else 0.0


def common_nh(
    scene: Scene,
    plane: int,
    island: int,
    layer: int,
    places: Floats,
    ahead: Floats,
    step_mm: Floats,
) -> float | None:
    """Inductance that a stretch of trace shares with the island beneath it, nH.

    Parameters
    ----------
    scene
        The board and its planes.
    plane, island, layer
        Layer and island of the plane, layer of the trace.
    places, ahead, step_mm
        Steps of the trace: middle and direction, shape (n, 2), and length, shape (n,).

    Returns
    -------
    The sum over the steps; None if the plane lies across the trace nowhere.
    """
    shape = scene.planes[plane].islands[island].shape
    few = np.unique(np.linspace(0, len(places) - 1, MOST_PLACES).round().astype(int))
    x0, y0, x1, y1 = scene.board.outline.union(shape).bounds
    far = 2.0 * float(np.hypot(x1 - x0, y1 - y0)) + 1.0
    widths, offsets = widths_across(shape, places[few], ahead[few], far)
    known = widths > 0
    if not known.any():
        return None
    height = scene.board.stack.height_mm(layer, plane)
    each = common_nh_mm(widths[known], offsets[known], height)
    return float(each.mean() * step_mm.sum())


def common_of(scene: Scene, crossing: Crossing) -> float | None:
    """Common-mode inductance of a run beyond the edge of its plane, nH."""
    points = np.array(crossing.path)
    steps = np.diff(points, axis=0)
    lengths = np.hypot(*steps.T)
    kept = lengths > 0
    return common_nh(
        scene,
        crossing.plane,
        crossing.islands[0],
        crossing.layer,
        ((points[:-1] + points[1:]) / 2)[kept],
        steps[kept] / lengths[kept, None],
        lengths[kept],
    )


def _finding(scene: Scene, run: EdgeRun, rows: np.ndarray, added: float) -> Finding:
    drive = scene.drive_of(run.net)
    noise = noise_mv(added, drive)
    layers = scene.board.stack.layers
    plane = scene.planes[run.plane]
    island = plane.islands[run.island]
    net = scene.board.nets[run.net].name
    name = layers[run.layer - 1].name
    nearest = rows[int(np.argmin(np.round(run.inside_mm[rows], 6)))]
    at = (round(float(run.places[nearest, 0]), 4), round(float(run.places[nearest, 1]), 4))
    length = float(run.step_mm[rows].sum())
    common = common_nh(
        scene,
        run.plane,
        run.island,
        run.layer,
        run.places[rows],
        run.ahead[rows],
        run.step_mm[rows],
    )
    return Finding(
        id="",
        kind="edge-run",
        level=level(noise, drive, added),
        net=net,
        net_class=drive.name,
        layer=name,
        plane_layer=layers[run.plane - 1].name,
        plane_net=island.net_name,
        at_mm=at,
        gap_mm=0.0,
        detour_mm=0.0,
        added_nh=added,
        error_nh=ERROR * added + 0.01,
        method="estimated",
        noise_mv=noise,
        rise_ns=drive.rise_ns,
        corner_khz=None,
        stray_db=None,
        islands=(island.id, island.id),
        bridges=(),
        gap=plane.gaps[run.gap].id,
        shares_gap_with=(),
        pair=None,
        source=Source(scene.board.layers[run.layer - 1].file, run.line),
        waived=None,
        fingerprint=fingerprint("edge-run", net, name, at),
        reason=_reason(scene, run, rows, length, common),
        common_nh=common,
    )


def _reason(
    scene: Scene, run: EdgeRun, rows: np.ndarray, length: float, common: float | None
) -> str:
    height = scene.board.stack.height_mm(run.layer, run.plane)
    island = scene.planes[run.plane].islands[run.island]
    nearest = float(run.inside_mm[rows].min())
    said = (
        f"{length:.1f} mm of the trace run along the edge of "
        f"{scene.board.stack.layers[run.plane - 1].name} ({in_words(island.net_name)}), as near as "
        f"{nearest:.2f} mm at a height of {height:.2f} mm, and no other plane is there"
    )
    return said if common is None else f"{said}; {with_common(common)}"


def with_common(common: float) -> str:
    """The common mode in words."""
    return f"{common:.2f} nH in common mode along the plane, which drive cables at its ends"
