"""Which other copper lies under a trace in a gap: a supply's line is no open place to a reader."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from shapely import LineString, STRtree
from shapely.ops import substring

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
#: So many heights of the trace the line of a supply must go on beyond a run over a farther plane.
ON_HEIGHTS = 3.0
#: Why such a run is no finding.
ALONG_SUPPLY = "runs along lines of supplies, which carry the return (changes of plane, not judged)"
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
    """Whether a run has the line of a supply under it that carries its return there.

    Parameters
    ----------
    scene
        The board with the classes of its nets.
    crossing
        A run of a trace over a gap.

    Returns
    -------
    True if copper of one net that is a supply, by its name or by the width of its lines, makes up
    four fifths of what lies within a height of the trace, along

    (1) a run of 5 mm or more, in the layer of the broken plane, or
    (2) a run and three heights of the trace on either side of it, in a nearer layer.

    Notes
    -----
    Within a height on either side half of the return of a trace over a plane flows, and over a line
    no wider than that all of it: to the trace such a line is a plane, whether or not it is one to
    the board (common practice, no source).
    """
    if crossing.aside_mm:
        return False
    path = LineString(crossing.path)
    if crossing.run_mm >= ALONG_MM and lies_over_a_supply(
        scene, crossing.layer, crossing.plane, [path]
    ):
        return True
    step = 1 if crossing.plane > crossing.layer else -1
    for layer in range(crossing.layer + step, crossing.plane, step):
        beyond = ON_HEIGHTS * scene.board.stack.height_mm(crossing.layer, layer)
        if lies_over_a_supply(scene, crossing.layer, layer, [_longer(crossing, beyond)]):
            return True
    return False


def lies_over_a_supply(scene: Scene, layer: int, other: int, lines: Sequence[LineString]) -> bool:
    """Whether the line of a supply on another layer lies under a trace: see `runs_along_a_supply`.

    Parameters
    ----------
    scene
        The board with the classes of its nets.
    layer, other
        Numbers of the trace's layer and of that which is looked at.
    lines
        Centre lines of the trace.
    """
    height = scene.board.stack.height_mm(layer, other)
    near = shapely.union_all([line.buffer(height, cap_style="flat") for line in lines])
    tree, nets = _copper(scene, other)
    covered: dict[int, float] = {}
    for number in np.sort(tree.query(near, predicate="intersects")).tolist():
        net = nets[number]
        if is_power(scene.board.nets[net].name) or scene.drive_of(net).name == WIDE:
            area = float(shapely.area(shapely.intersection(near, tree.geometries[number])))
            covered[net] = covered.get(net, 0.0) + area
    return max(covered.values(), default=0.0) >= COVERS * near.area > 0.0


def _longer(crossing: Crossing, beyond_mm: float) -> LineString:
    """A run with so much of the trace on either side of it, as far as it was followed."""
    stretch = LineString(crossing.stretch)
    ends = sorted(stretch.project(shapely.Point(end)) for end in (crossing.before, crossing.after))
    first, last = max(ends[0] - beyond_mm, 0.0), min(ends[1] + beyond_mm, stretch.length)
    longer = substring(stretch, first, last)
    return longer if isinstance(longer, LineString) else stretch


def _copper(scene: Scene, layer: int) -> tuple[STRtree, list[int]]:
    if not _last or _last[0].board is not scene.board:
        _last[:] = [_Parts(scene.board)]
    return _last[0].of(layer)
