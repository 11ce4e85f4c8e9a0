"""Polygons and lines in, the matrix of added inductance out: the solve without any files."""

from __future__ import annotations

from collections.abc import Sequence

import shapely
from shapely import LineString, MultiPolygon, Polygon

from splitcheck.errors import SplitcheckError
from splitcheck.loops.solve import Strap, TraceOver, ViaBridge, added
from splitcheck.units import Floats


def added_inductance(
    gap: Polygon | MultiPolygon | Sequence[Polygon],
    traces: LineString | Sequence[LineString],
    height_mm: float,
    *,
    width_mm: float = 0.0,
    beyond_mm: float | None = None,
    above_mm: float | None = None,
    bridges: Sequence[ViaBridge | Strap] = (),
    outside: Polygon | None = None,
) -> Floats:
    """Loop inductance that a gap in a plane adds to the traces over it.

    Parameters
    ----------
    gap
        Where the plane has no copper, mm; holes of a polygon are copper.
    traces
        Centre lines of the traces, mm, running from copper to copper.
    height_mm
        Distance between the plane and the traces, > 0.
    width_mm
        Width of the traces, >= 0.
    beyond_mm
        Distance from the plane to a whole plane on its other side, or None.
    above_mm
        Distance from the plane to a whole plane above the traces (stripline), or None.
    bridges
        Vias to the plane beyond, and parts across the gap.
    outside
        Outline of the plane, if it ends near by; all outside it counts as a gap.

    Returns
    -------
    Matrix, shape (n, n), nH: what each trace gains on the diagonal, what one induces in another
    off it (their crosstalk by the shared gap; as a pair they gain L11 + L22 - 2 L12).

    Raises
    ------
    SplitcheckError
        If a distance is not positive, or a trace has no way back round the gap or over a bridge.

    Notes
    -----
    Copper is a perfect conductor, as it is for fast edges. See `splitcheck.loops.solve.added` for
    the equation, and for the error of the values.

    Examples
    --------
    Two traces 1 mm apart over a slot of 20 mm by 1 mm, 0.2 mm above the plane, and the same with a
    whole plane 0.2 mm beyond, which shields the slot:

    >>> from shapely import LineString, box
    >>> slot = box(-0.5, -10, 0.5, 10)
    >>> pair = [LineString([(-25, y), (25, y)]) for y in (-0.5, 0.5)]
    >>> added_inductance(slot, pair, height_mm=0.2).round(1)
    array([[3.3, 2.9],
           [2.9, 3.3]])
    >>> added_inductance(slot, pair, height_mm=0.2, beyond_mm=0.2).round(1)
    array([[0.6, 0.5],
           [0.5, 0.6]])
    """
    gaps = [gap] if isinstance(gap, Polygon | MultiPolygon) else list(gap)
    polygons = [p for p in shapely.get_parts(gaps) if isinstance(p, Polygon) and not p.is_empty]
    lines = [traces] if isinstance(traces, LineString) else list(traces)
    solution = added(
        polygons,
        [TraceOver(line, width_mm) for line in lines],
        height_mm,
        beyond_mm=beyond_mm,
        above_mm=above_mm,
        bridges=bridges,
        outside=outside,
    )
    for number, lost in enumerate(solution.cut_off, start=1):
        if lost:
            wrong = "the return current has no way back, neither round the gap nor over a bridge"
            raise SplitcheckError(
                f"trace {number}", wrong, "give bridges, or the gap with its ends"
            )
    return solution.added_nh
