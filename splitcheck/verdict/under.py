"""Which other copper lies in a gap under a trace: a supply's line is no open place to a reader."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import LineString, STRtree

from splitcheck.board.board import Board
from splitcheck.planes.crossings import Crossing
from splitcheck.verdict.scene import Scene

#: Copper is told that lies under so much of a run.
MOST_OF_IT = 0.5


class _Parts:
    """The copper of one board by layer, kept from one question to the next."""

    def __init__(self, board: Board) -> None:
        self.board = board
        self._layers: dict[int, tuple[STRtree, list[int]]] = {}

    def of(self, layer: int) -> tuple[STRtree, list[int]]:
        """An index of the copper of a layer, and the net of each piece."""
        if layer not in self._layers:
            parts = [part for part in self.board.parts if part.layer == layer]
            nets = [self.board.net_of[part.id] for part in parts]
            self._layers[layer] = (STRtree([part.shape for part in parts]), nets)
        return self._layers[layer]


_last: list[_Parts] = []


def net_under(scene: Scene, crossing: Crossing) -> str | None:
    """The net whose copper lies under most of a run in the layer of the plane, if any does.

    Parameters
    ----------
    scene
        The board.
    crossing
        A run of a trace over a gap.

    Returns
    -------
    The name of the net; None if less than half of the run has copper of one net under it, or the
    gap lies beside the trace.
    """
    if crossing.aside_mm or crossing.run_mm <= 0.0:
        return None
    if not _last or _last[0].board is not scene.board:
        _last[:] = [_Parts(scene.board)]
    tree, nets = _last[0].of(crossing.plane)
    line = LineString(crossing.path)
    covered: dict[int, float] = {}
    for number in np.sort(tree.query(line, predicate="intersects")).tolist():
        length = float(shapely.length(shapely.intersection(line, tree.geometries[number])))
        covered[nets[number]] = covered.get(nets[number], 0.0) + length
    carriers = {scene.planes[crossing.plane].islands[i].net for i in crossing.islands}
    most = max(
        ((length, -net) for net, length in covered.items() if net not in carriers),
        default=(0.0, 0),
    )
    if most[0] < MOST_OF_IT * line.length:
        return None
    return scene.board.nets[-most[1]].name
