"""Why a crossing is a finding, in one sentence for a person."""

from __future__ import annotations

from splitcheck.loops.ways import Route
from splitcheck.verdict.around import layers_beyond
from splitcheck.verdict.scene import Scene, Weighed


def reason(scene: Scene, item: Weighed) -> str:
    """What is missing, where the return goes instead, and what else bears on it."""
    crossing = item.crossing
    plane = scene.planes[crossing.plane]
    one, other = (plane.islands[i] for i in crossing.islands)
    name = scene.board.stack.layers[crossing.plane - 1].name
    if item.kind == "split-crossing":
        start = (
            f"{name} is split here between {one.net_name} ({one.id}) and "
            f"{other.net_name} ({other.id})"
        )
    else:
        start = f"{name} ({one.net_name}) is open for {item.bare_mm:.2f} mm under the trace"
        if len(item.runs) > 1:
            start += f", in {len(item.runs)} places"
    way = _way_in_words(scene, item.route, item.share)
    return "; ".join([start, way, *_extras(scene, item)])


def _way_in_words(scene: Scene, route: Route, share: float) -> str:
    best = route.best
    if not route.joined or best is None:
        if share < 1.0:
            return (
                "neither copper nor a plated hole joins the two sides: the return must leave for "
                "the plane on the trace's other side"
            )
        return "neither copper nor a plated hole joins the two sides: no galvanic way back"
    detour = route.detour_mm or 0.0
    if not best.bridges:
        return f"the return walks {detour:.1f} mm more round the gap"
    x, y = best.bridges[0]
    via = f"plated holes from ({x:.2f}, {y:.2f}) over {best.bridge_net}"
    if best.bridge_layer:
        via += f" on {scene.board.stack.layers[best.bridge_layer - 1].name}"
    return f"the return walks {detour:.1f} mm more through {via}"


def _extras(scene: Scene, item: Weighed) -> list[str]:
    extras = []
    names = [layer.name for layer in scene.board.stack.layers]
    if item.share < 1.0:
        extras.append(f"{100 * item.share:.0f} % of the return flows on this plane")
    if item.beyond is not None:
        apart = scene.board.stack.height_mm(item.crossing.plane, item.beyond)
        extras.append(
            f"{names[item.beyond - 1]} is whole {apart:.2f} mm beyond and shields the gap"
        )
    if item.beside is not None and item.beside != item.other:
        extras.append(f"{names[item.beside - 1]} on the trace's other side is open here as well")
    passed = [layer for layer in layers_beyond(scene, item.crossing) if layer in scene.planes]
    if passed and passed[0] != item.beyond:
        extras.append(f"the next plane, {names[passed[0] - 1]}, is open here as well")
    return extras
