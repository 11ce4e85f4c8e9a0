"""Traces without any plane: one finding for each net and layer."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from math import inf, pi

import numpy as np
import shapely

from splitcheck.loops import estimate
from splitcheck.loops.estimate import Inductance
from splitcheck.planes.crossings import BareTrace
from splitcheck.units import MU0
from splitcheck.verdict.findings import Finding, Source
from splitcheck.verdict.places import fingerprint
from splitcheck.verdict.scene import Scene
from splitcheck.verdict.score import level, noise_mv
from splitcheck.verdict.under import ALONG_SUPPLY, lies_over_a_supply

#: Bare trace shorter than this at a net's own pads and vias is not a finding, mm.
OWN_END_MM = 3.0
#: How far apart the places are where copper is looked for beside a trace, mm.
STEP_MM = 0.5


def bare_findings(
    scene: Scene, bare: Sequence[BareTrace], dropped: dict[str, int]
) -> list[Finding]:
    """One finding for each net and layer that runs over no plane at all."""
    groups: dict[tuple[int, int], list[BareTrace]] = defaultdict(list)
    for trace in bare:
        if trace.leaves:  # judged as a change of plane where it is long enough
            if trace.bare_mm < OWN_END_MM:
                dropped[f"ends of traces over a farther plane, shorter than {OWN_END_MM:g} mm"] += 1
        elif trace.bare_mm < OWN_END_MM:
            dropped[f"ends of traces without a plane, shorter than {OWN_END_MM:g} mm"] += 1
        else:
            groups[trace.layer, trace.net].append(trace)
    for key, traces in groups.items():
        groups[key] = [trace for trace in traces if not _over_a_supply(scene, trace)]
        if len(traces) > len(groups[key]):
            dropped[ALONG_SUPPLY] += len(traces) - len(groups[key])
    found = (_bare_finding(scene, traces) for _, traces in sorted(groups.items()) if traces)
    return [finding for finding in found if finding is not None]


def _over_a_supply(scene: Scene, trace: BareTrace) -> bool:
    """Whether the line of a supply in a layer next to it carries its return."""
    lines = [shapely.LineString(span) for span in trace.spans if span[0] != span[1]]
    last = len(scene.board.stack.layers)
    layers = [n for n in (trace.layer - 1, trace.layer + 1) if 1 <= n <= last]
    return any(lies_over_a_supply(scene, trace.layer, other, lines) for other in layers)


def _bare_finding(scene: Scene, traces: Sequence[BareTrace]) -> Finding | None:
    longest = max(traces, key=lambda trace: trace.bare_mm)
    total = sum(trace.bare_mm for trace in traces)
    value = _bare_estimate(scene, traces)
    if value is not None and value.added_nh < scene.min_nh:
        return None
    drive = scene.drive_of(longest.net)
    noise = None if value is None else noise_mv(value.added_nh, drive)
    net = scene.board.nets[longest.net].name
    layer = scene.board.stack.layers[longest.layer - 1].name
    at = (round(longest.at[0], 4), round(longest.at[1], 4))
    where = (
        ""
        if len(traces) == 1
        else f" in {len(traces)} places, the longest {longest.bare_mm:.1f} mm"
    )
    return Finding(
        id="",
        kind="no-plane",
        level=level(noise, drive),
        net=net,
        net_class=drive.name,
        layer=layer,
        plane_layer="",
        plane_net="",
        at_mm=at,
        gap_mm=total,
        detour_mm=None,
        added_nh=None if value is None else value.added_nh,
        error_nh=None if value is None else value.error_nh,
        method="none" if value is None else "estimated",
        noise_mv=noise,
        rise_ns=drive.rise_ns,
        corner_khz=None,
        stray_db=None,
        islands=(),
        bridges=(),
        gap=f"bare {layer}",
        shares_gap_with=(),
        pair=None,
        source=Source(scene.board.layers[longest.layer - 1].file, longest.line),
        waived=None,
        fingerprint=fingerprint("no-plane", net, layer, at),
        reason=f"{total:.1f} mm of the trace have no reference copper above or below{where}",
    )


def _bare_estimate(scene: Scene, traces: Sequence[BareTrace]) -> Inductance | None:
    """What running past the rim of the nearest plane costs; None if the board has no plane.

    The rim is taken as straight and as far away as the nearest reference copper of any layer.
    Copper of the trace's own layer beside it carries the return as well as copper beneath would
    from half a height on: a wire of radius a that is e away from the rim of a half plane in its own
    layer has mu0/(2 pi) ln(4 e / a) (see ``coplanar.py``), which is ln(2 e / h) more than over a
    plane at the height h.
    """
    total = 0.0
    for trace in traces:
        for start, stop in trace.spans:
            line = shapely.LineString([start, stop])
            best, over_mm = inf, inf
            for plane in scene.planes.values():
                if plane.layer == trace.layer:
                    continue
                height = scene.board.stack.height_mm(trace.layer, plane.layer)
                away = min(island.shape.distance(line) for island in plane.islands)
                best = min(best, estimate.beside_edge_nh_mm(-away, height))
                over_mm = min(over_mm, height)
            if best == inf:
                return None
            total += min(best, _beside_nh_mm(scene, trace.layer, line, over_mm)) * line.length
    return Inductance(total, 0.6 * total)


def _beside_nh_mm(scene: Scene, layer: int, line: shapely.LineString, height_mm: float) -> float:
    """What the return costs more in copper beside a line, in its own layer, nH/mm; mean of it."""
    own = scene.planes.get(layer)
    if own is None:
        return inf
    count = max(int(line.length / STEP_MM), 1)
    along = (np.arange(count) + 0.5) / count
    places = line.interpolate(along, normalized=True)
    away = np.min([shapely.distance(island.shape, places) for island in own.islands], axis=0)
    more = np.log(np.maximum(2.0 * away / height_mm, 1.0))
    return float(MU0 / (2.0 * pi) * np.mean(more))
