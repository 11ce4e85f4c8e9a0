"""What rules make of returns on supply planes: counted if discouraged, found if forbidden."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from splitcheck.board.names import is_ground, is_power
from splitcheck.planes.carriers import carried
from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Tracks
from splitcheck.verdict.findings import Count, Finding, Point, Source
from splitcheck.verdict.places import fingerprint
from splitcheck.verdict.scene import Scene

#: Shorter stretches go to a pin or a via of the net there, mm.
LEAST_MM = 3.0


class Stretch(NamedTuple):
    """What one net has on one layer over the supply planes of another, nearest plane first."""

    net: int
    layer: int
    plane_layer: int
    plane_net: int
    length_mm: float
    at: Point
    line: int


def is_supply_plane(name: str) -> bool:
    """Whether the name of a plane is a supply's and no ground's.

    Examples
    --------
    >>> is_supply_plane("+3V3"), is_supply_plane("GND"), is_supply_plane("SHIELD_COPPER")
    (True, False, False)
    """
    return is_power(name) and not any(is_ground(one) for one in name.split("|"))


def over_supplies(scene: Scene, tracks: Sequence[Tracks]) -> tuple[Stretch, ...]:
    """Nets of which more than a bit runs nearer to a supply plane than to any other, sorted."""
    planes: tuple[Plane, ...] = tuple(scene.planes.values())
    supplies = {net.number for net in scene.board.nets if is_supply_plane(net.name)}
    total: dict[tuple[int, int, int, int], float] = defaultdict(float)
    first: dict[tuple[int, int, int, int], tuple[float, float, int]] = {}
    for layer in tracks:
        on = carried(scene.board, planes, layer)
        for piece, net in enumerate(layer.net.tolist()):
            looks = on.state[on.first[piece] : on.first[piece + 1]].tolist()
            step = float(layer.length_mm[piece]) / max(len(looks), 1)
            for state in looks:
                nearest = on.carriers[state][:1]
                if not nearest or nearest[0].net not in supplies:
                    continue
                key = (net, layer.layer, nearest[0].layer, nearest[0].net)
                total[key] += step
                x, y = layer.start[piece].tolist()
                first.setdefault(key, (x, y, int(layer.line[piece])))
    return tuple(
        Stretch(*key, round(length, 4), first[key][:2], first[key][2])
        for key, length in sorted(total.items())
        if length >= LEAST_MM and not scene.drive_of(key[0]).exempt
    )


def supply_findings(
    scene: Scene, tracks: Sequence[Tracks]
) -> tuple[tuple[Finding, ...], tuple[Count, ...]]:
    """What the rules make of returns on supply planes.

    Parameters
    ----------
    scene
        The board and its rules: ``supply_reference`` decides.
    tracks
        The traces that are judged.

    Returns
    -------
    One finding for each net, layer and supply plane if the rules forbid it: nothing is broken
    there, so it adds nothing and is a warning by rule alone. And, unless they allow it, how many
    nets there are.
    """
    if scene.rules.supply_reference == "allowed":
        return (), ()
    stretches = over_supplies(scene, tracks)
    nets = len({stretch.net for stretch in stretches})
    counts = (Count(f"nets whose return runs on a supply plane, {_by_rule(scene)}", nets),)
    if scene.rules.supply_reference == "discouraged":
        return (), counts
    return tuple(_finding(scene, stretch) for stretch in stretches), counts


def with_rule(scene: Scene, findings: Sequence[Finding]) -> list[Finding]:
    """Findings on supply planes say what the rules make of that; forbidden, none is a mere note."""
    if scene.rules.supply_reference == "allowed":
        return list(findings)
    supplies = {
        island.id: island.net_name
        for plane in scene.planes.values()
        for island in plane.islands
        if is_supply_plane(island.net_name)
    }
    told = []
    for finding in findings:
        names = [supplies[island] for island in finding.islands if island in supplies]
        if names:
            said = f"a reference on {' and '.join(dict.fromkeys(names))} is {_by_rule(scene)}"
            raised = scene.rules.supply_reference == "forbidden" and finding.level == "note"
            told.append(
                replace(
                    finding,
                    reason=f"{finding.reason}; {said}",
                    level="warning" if raised else finding.level,
                )
            )
        else:
            told.append(finding)
    return told


def _by_rule(scene: Scene) -> str:
    return f"{scene.rules.supply_reference} by the rules"


def _finding(scene: Scene, stretch: Stretch) -> Finding:
    layers = scene.board.stack.layers
    drive = scene.drive_of(stretch.net)
    net = scene.board.nets[stretch.net].name
    plane_net = scene.board.nets[stretch.plane_net].name
    layer, plane = layers[stretch.layer - 1].name, layers[stretch.plane_layer - 1].name
    at = (round(stretch.at[0], 4), round(stretch.at[1], 4))
    return Finding(
        id="",
        kind="plane-change",
        level="warning",
        net=net,
        net_class=drive.name,
        layer=layer,
        plane_layer=plane,
        plane_net=plane_net,
        at_mm=at,
        gap_mm=0.0,
        detour_mm=None,
        added_nh=0.0,
        error_nh=0.0,
        method="estimated",
        noise_mv=0.0,
        rise_ns=drive.rise_ns,
        corner_khz=None,
        stray_db=None,
        islands=(),
        bridges=(),
        gap=f"supply {plane} {plane_net}",
        shares_gap_with=(),
        pair=None,
        source=Source(scene.board.layers[stretch.layer - 1].file, stretch.line),
        waived=None,
        fingerprint=fingerprint("plane-change", net, layer, at),
        reason=(
            f"{stretch.length_mm:.1f} mm of its return run on a supply plane, {plane} "
            f"({plane_net}), which the rules forbid: nothing is broken there, but the return must "
            "change to ground at both ends"
        ),
    )
