"""Why a crossing is a finding, in one sentence for a person."""

from __future__ import annotations

from math import hypot

from splitcheck.board.names import in_words
from splitcheck.loops.ways import Way
from splitcheck.verdict.around import layers_beyond
from splitcheck.verdict.scene import Scene, Weighed
from splitcheck.verdict.under import net_under

#: A capacitor helps if it is no farther off than this for each ns of rise time, mm/ns: 1 inch
#: (S. Weir, si-list, 16 Oct 2008; L. Smith there on 22 Sep 1999 has three inches, to and fro).
MM_PER_NS = 25.0
#: A part of the return that is less than this is not told, and one that is more is all of it.
LEAST_SHARE, MOST = 0.1, 0.995


def reason(scene: Scene, item: Weighed, handed_over: float = 0.0) -> str:
    """What is missing, where the return goes instead, and what else bears on it.

    Parameters
    ----------
    scene, item
        The board and the crossing.
    handed_over
        Part of the return on the broken plane, 0 to 1, that gets past the gap on the plane on the
        trace's other side.
    """
    crossing = item.crossing
    plane = scene.planes[crossing.plane]
    one, other = (plane.islands[i] for i in crossing.islands)
    name = scene.board.stack.layers[crossing.plane - 1].name
    between = net_under(scene, crossing)
    if item.kind == "split-crossing":
        start = (
            f"{name} is split here between {in_words(one.net_name)} ({one.id}) and "
            f"{in_words(other.net_name)} ({other.id})"
        )
        if between is not None:
            start += f", with copper of {in_words(between)} between them"
        if len(item.runs) > 1:
            start += f", and again close by, {len(item.runs)} times in all"
    elif crossing.aside_mm:
        start = beside_in_words(scene, item)
        return "; ".join([start, *_shares(scene, item, handed_over), *_extras(scene, item)])
    else:
        start = (
            f"{name} ({in_words(one.net_name)}) is open for {item.bare_mm:.2f} mm under the trace"
        )
        if between is not None:
            start += f", where copper of {in_words(between)} lies"
        if len(item.runs) > 1:
            start += f", in {len(item.runs)} places"
    shares, extras = _shares(scene, item, handed_over), _extras(scene, item)
    if len(shares) < 2:
        return "; ".join([start, _way_in_words(scene, item), *shares, *extras])
    who = "it would else walk" if handed_over > MOST else "the rest walks"
    return "; ".join([start, *shares, _way_in_words(scene, item, who), *extras])


def beside_in_words(scene: Scene, item: Weighed) -> str:
    """What is missing where the centre line stays over copper."""
    crossing = item.crossing
    plane = scene.planes[crossing.plane]
    name = scene.board.stack.layers[crossing.plane - 1].name
    height = scene.board.stack.height_mm(crossing.layer, crossing.plane)
    start = (
        f"{name} ({plane.islands[crossing.islands[0]].net_name}) is open beside the trace, "
        f"{crossing.aside_mm:.2f} mm from its centre line, which is {height:.2f} mm high"
    )
    if len(item.runs) > 1:
        start += f", in {len(item.runs)} places"
    return f"{start}; the return is crowded onto the copper that is left"


def _way_in_words(scene: Scene, item: Weighed, who: str = "the return walks") -> str:
    route = item.route
    best = route.best
    if not route.joined or best is None:
        islands = scene.planes[item.crossing.plane].islands
        one, other = (islands[i] for i in item.crossing.islands)
        copper = "plane copper" if one.net == other.net else "copper"
        nothing = (
            f"neither {copper}, a plated hole nor a capacitor"
            if scene.board.components
            else f"neither {copper} nor a plated hole"
        )
        if item.share < 1.0:
            return (
                f"{nothing} joins the two sides: the return must leave for the plane on the "
                "trace's other side"
            )
        if one.net == other.net:
            return f"{nothing} joins the two sides: the net comes together by traces elsewhere"
        return f"{nothing} joins the two sides: no galvanic way back"
    more = f"{who} {route.detour_mm or 0.0:.1f} mm more"
    over = ""
    if best.bridge_layer:
        over = f" on {scene.board.stack.layers[best.bridge_layer - 1].name}"
    if best.capacitors:
        return f"{more} through {_parts_in_words(scene, item, best, over)}"
    if not best.bridges:
        return f"{more} round the gap"
    x, y = best.bridges[0]
    over = f"over {in_words(best.bridge_net)}{over}"
    return f"{more} through plated holes from ({x:.2f}, {y:.2f}) {over}"


def _parts_in_words(scene: Scene, item: Weighed, way: Way, over: str) -> str:
    """The capacitors of a way, where the return goes between them, and whether they are near."""
    named = [
        f"{part.ref if part.kind == 'capacitor' else f'link {part.ref}'} "
        f"({part.at[0]:.2f}, {part.at[1]:.2f})"
        for part in way.capacitors
    ]
    words = " and ".join(named)
    if way.capacitors[0].kind == "capacitor":
        words = f"capacitor{'s' if len(named) > 1 else ''} {words}"
    if way.bridges:
        words += " and plated holes at " + " and ".join(
            f"({x:.2f}, {y:.2f})" for x, y in way.bridges
        )
    if over:
        words += f" over {in_words(way.bridge_net)}{over}"
    x, y = item.crossing.at
    words += f", {way.parts_nh:.1f} nH as mounted"
    far = max(hypot(part.at[0] - x, part.at[1] - y) for part in way.capacitors)
    rise = scene.drive_of(item.crossing.net).rise_ns
    if far > MM_PER_NS * rise:
        words += (
            f", but {far:.0f} mm off: farther than {MM_PER_NS:g} mm per ns of the rise of "
            f"{rise:g} ns, too far to help in time"
        )
    return words


def _over_in_words(scene: Scene, item: Weighed, handed_over: float) -> str:
    """How much of the return gets past the gap on the other plane, and where it goes over."""
    assert item.other is not None
    ends = (item.crossing.path[0], item.crossing.path[-1])
    far, (x, y) = min(
        (min(hypot(hole.at[0] - end[0], hole.at[1] - end[1]) for end in ends), hole.at)
        for hole in item.stitches
    )
    much = "all" if handed_over > MOST else f"{100 * handed_over:.0f} %"
    name = scene.board.stack.layers[item.other - 1].name
    return (
        f"{much} of that gets past the gap on {name}, over plated holes of which the nearest is "
        f"{far:.1f} mm from it at ({x:.2f}, {y:.2f})"
    )


def _shares(scene: Scene, item: Weighed, handed_over: float) -> list[str]:
    """How much of the return is concerned, and how much of it gets past on the other plane."""
    if item.share >= 1.0:
        return []
    shares = [f"{100 * item.share:.0f} % of the return flows on this plane"]
    if handed_over >= LEAST_SHARE and item.stitches:
        shares.append(_over_in_words(scene, item, handed_over))
    return shares


def _extras(scene: Scene, item: Weighed) -> list[str]:
    extras = []
    names = [layer.name for layer in scene.board.stack.layers]
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
