"""What is known of capacitors between planes, in a sentence."""

from __future__ import annotations

from collections.abc import Sequence

from splitcheck.board.board import Board
from splitcheck.board.populate import sources_of
from splitcheck.loops.bridges import PartBridge
from splitcheck.planes.islands import Plane


def coupling_facts(board: Board, parts: Sequence[PartBridge]) -> tuple[str, ...]:
    """How many capacitors and links join planes, from what they are known, and what they add.

    Parameters
    ----------
    board
        The board.
    parts
        Every part between two islands, once for each pair of them.

    Returns
    -------
    One sentence; none if no file tells the components.
    """
    if not board.components:
        return ()
    source = sources_of(board.components)
    said = []
    for kind, one, many in (
        ("capacitor", "capacitor", "capacitors"),
        ("copper", "link of 0 ohm", "links of 0 ohm"),
    ):
        least: dict[str, float] = {}
        for part in parts:
            if part.kind == kind:
                least[part.ref] = min(part.mounted_nh, least.get(part.ref, part.mounted_nh))
        if least:
            low, high = (f"{value:.1f}" for value in (min(least.values()), max(least.values())))
            span = low if low == high else f"{low} to {high}"
            words = one if len(least) == 1 else many
            said.append(f"{len(least)} {words} between planes, {span} nH as mounted")
    if not said:
        return (f"No capacitor between planes among {len(board.components)} parts, from {source}",)
    return (f"{'; '.join(said)}; parts from {source}",)


def coupling_unknown(board: Board, planes: Sequence[Plane]) -> tuple[str, ...]:
    """The assumption where nothing tells the components and planes are of several nets."""
    nets = {island.net for plane in planes for island in plane.islands}
    if board.components or len(nets) < 2:
        return ()
    sentence = (
        "No file tells the components: capacitors between planes are unknown, so a split that "
        "only they bridge counts as one with no way back; X2 attributes, an IPC-D-356A netlist or "
        "a placement file would tell."
    )
    return (sentence,)
