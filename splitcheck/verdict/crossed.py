"""From a weighed crossing and its solve to its finding."""

from __future__ import annotations

from collections.abc import Sequence

from splitcheck.loops.corner import detour_corner_khz
from splitcheck.loops.estimate import Inductance
from splitcheck.loops.fields import Field
from splitcheck.loops.ways import Way
from splitcheck.verdict.beside import least_nh
from splitcheck.verdict.findings import BridgeUse, Finding, GapShare, Source
from splitcheck.verdict.places import fingerprint
from splitcheck.verdict.reason import reason
from splitcheck.verdict.scene import Scene, Weighed
from splitcheck.verdict.score import Noise, level, noise_over_gap, slot_ns_mm
from splitcheck.verdict.weighing import reach_mm


def crossing_finding(
    scene: Scene, item: Weighed, field: Field | None, weighed: Sequence[Weighed]
) -> Finding | None:
    """The finding of a crossing; None if it adds too little."""
    value = item.estimate if field is None else field.value
    if value is not None and value.added_nh < least_nh(scene, item.crossing):
        return None
    noise = None if value is None else noise_of(scene, item, value)
    return _finding(scene, item, value, noise, field, weighed)


def noise_of(scene: Scene, item: Weighed, value: Inductance) -> Noise:
    """What an inductance over the gap of a crossing makes of the edges of its net."""
    drive = scene.drive_of(item.crossing.net)
    return noise_over_gap(value.added_nh, drive, _along_ns(scene, item))


def _along_ns(scene: Scene, item: Weighed) -> float:
    """How long a wave runs along the gap to where the return gets round, on the longer side, ns."""
    crossing, route = item.crossing, item.route
    ways = [way for way in (route.left, route.right) if way is not None]
    layers = scene.board.stack.layers
    below = layers[crossing.plane - 1].er_below if crossing.plane < len(layers) else 1.0
    above = layers[crossing.plane - 2].er_below if crossing.plane > 1 else 1.0
    along_mm = max((reach_mm(crossing, route, way) for way in ways), default=0.0)
    return along_mm * slot_ns_mm(above, below)


def _finding(
    scene: Scene,
    item: Weighed,
    value: Inductance | None,
    noise: Noise | None,
    field: Field | None,
    weighed: Sequence[Weighed],
) -> Finding:
    crossing, route = item.crossing, item.route
    drive = scene.drive_of(crossing.net)
    plane = scene.planes[crossing.plane]
    layers = scene.board.stack.layers
    islands = [plane.islands[i] for i in crossing.islands]
    net = scene.board.nets[crossing.net].name
    at = (round(crossing.at[0], 4), round(crossing.at[1], 4))
    apart = _disagreement(item.estimate, field)
    mv, capped = (None, False) if noise is None else noise
    return Finding(
        id="",
        kind=item.kind,
        level=level(mv, drive, None if value is None else value.added_nh),
        net=net,
        net_class=drive.name,
        layer=layers[crossing.layer - 1].name,
        plane_layer=layers[crossing.plane - 1].name,
        plane_net=" to ".join(dict.fromkeys(island.net_name for island in islands)),
        at_mm=at,
        gap_mm=item.bare_mm,
        detour_mm=route.detour_mm if route.joined else None,
        added_nh=None if value is None else value.added_nh,
        error_nh=None if value is None else value.error_nh,
        method="solved" if field is not None else "none" if value is None else "estimated",
        noise_mv=mv,
        rise_ns=drive.rise_ns,
        corner_khz=_corner_khz(scene, item, field),
        stray_db=None if field is None else field.stray_db,
        islands=(islands[0].id, islands[1].id),
        bridges=_bridges(scene, route.best),
        gap=plane.gaps[crossing.gap].id,
        shares_gap_with=_mutual(scene, crossing.net, field, weighed),
        pair=None,
        source=Source(scene.board.layers[crossing.layer - 1].file, crossing.line),
        waived=None,
        fingerprint=fingerprint(item.kind, net, layers[crossing.layer - 1].name, at),
        reason=reason(scene, item, _handed_over(item, field)),
        estimated_nh=None if apart is None else apart.added_nh,
        estimated_error_nh=None if apart is None else apart.error_nh,
        capped=capped,
    )


def _corner_khz(scene: Scene, item: Weighed, field: Field | None) -> float | None:
    """From where on the return follows inductance; None if nothing was solved."""
    detour_mm = item.route.detour_mm
    if field is None or detour_mm is None or item.crossing.aside_mm:
        return None
    stack, crossing = scene.board.stack, item.crossing
    layer = item.other if item.beside is None else item.beside
    return detour_corner_khz(
        detour_mm,
        field.value.added_nh,
        height_mm=stack.height_mm(crossing.layer, crossing.plane),
        copper_um=stack.layers[crossing.plane - 1].copper_um,
        above_mm=None if layer is None else stack.height_mm(crossing.plane, layer),
    )


def _handed_over(item: Weighed, field: Field | None) -> float:
    """Part of the return on the broken plane that gets past the gap on the other plane."""
    if field is None:
        return 1.0 if item.by_holes else 0.0
    return min(field.handed_over / item.share, 1.0)


def _disagreement(first: Inductance | None, field: Field | None) -> Inductance | None:
    """The closed-form value, to be kept beside a solved one that it does not agree with."""
    if first is None or field is None:
        return None
    agree = abs(first.added_nh - field.value.added_nh) <= first.error_nh + field.value.error_nh
    return None if agree else first


def _mutual(
    scene: Scene, own: int, field: Field | None, weighed: Sequence[Weighed]
) -> tuple[GapShare, ...]:
    """The largest mutual inductance with every other net that shares the gap."""
    best: dict[str, float] = {}
    for number, mutual in field.mutual_nh if field is not None else ():
        net = weighed[number].crossing.net
        name = scene.board.nets[net].name
        if net != own and abs(mutual) > abs(best.get(name, 0.0)):
            best[name] = mutual
    return tuple(GapShare(name, mutual) for name, mutual in sorted(best.items()))


def _bridges(scene: Scene, way: Way | None) -> tuple[BridgeUse, ...]:
    if way is None:
        return ()
    holes = (BridgeUse("via", (round(x, 4), round(y, 4)), way.bridge_net) for x, y in way.bridges)
    parts = (
        BridgeUse(
            part.kind,
            (round(part.at[0], 4), round(part.at[1], 4)),
            " to ".join(
                scene.graph.nodes[end]["island"].net_name for end in (part.one, part.other)
            ),
        )
        for part in way.capacitors
    )
    return (*holes, *parts)
