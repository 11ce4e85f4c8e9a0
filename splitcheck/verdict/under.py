"""Which other copper lies under a trace in a gap: a supply's line is no open place to a reader."""

from __future__ import annotations

import numpy as np
import shapely
from shapely import LineString, STRtree

from splitcheck.board.board import Board
from splitcheck.board.names import is_power
from splitcheck.planes.crossings import Crossing
from splitcheck.verdict.scene import Scene

#: Copper is told that lies under so much of a run.
MOST_OF_IT = 0.5
#: A run at least this long along the line of a supply has it as its reference, mm, ...
ALONG_MM = 5.0
#: ... if it covers this share of what lies within a height of the trace.
COVERS = 0.8
#: The class of nets that are supplies by their width: see ``wide.py``.
WIDE = "wide"


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
    tree, nets = _copper(scene, crossing.plane)
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


def runs_along_a_supply(scene: Scene, crossing: Crossing) -> bool:
    """Whether a long run has the line of a supply under it that carries its return there.

    Parameters
    ----------
    scene
        The board with the classes of its nets.
    crossing
        A run of a trace over a gap.

    Returns
    -------
    True if a run of 5 mm or more lies along copper of one net that is a supply by its name or by
    the width of its lines, in the layer of the broken plane or in a nearer one, and four fifths of
    what lies within a height of the trace are that copper.

    Notes
    -----
    Within a height on either side half of the return of a trace over a plane flows, and over a line
    no wider than that all of it: to the trace such a line is a plane, whether or not it is one to
    the board (common practice, no source).
    """
    if crossing.aside_mm or crossing.run_mm < ALONG_MM:
        return False
    step = 1 if crossing.plane > crossing.layer else -1
    for layer in range(crossing.layer + step, crossing.plane + step, step):
        height = scene.board.stack.height_mm(crossing.layer, layer)
        near = LineString(crossing.path).buffer(height, cap_style="flat")
        tree, nets = _copper(scene, layer)
        covered: dict[int, float] = {}
        for number in np.sort(tree.query(near, predicate="intersects")).tolist():
            net = nets[number]
            if is_power(scene.board.nets[net].name) or scene.drive_of(net).name == WIDE:
                area = float(shapely.area(shapely.intersection(near, tree.geometries[number])))
                covered[net] = covered.get(net, 0.0) + area
        if max(covered.values(), default=0.0) >= COVERS * near.area:
            return True
    return False


def _copper(scene: Scene, layer: int) -> tuple[STRtree, list[int]]:
    if not _last or _last[0].board is not scene.board:
        _last[:] = [_Parts(scene.board)]
    return _last[0].of(layer)
