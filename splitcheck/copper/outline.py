"""From the drawing of the board's edge to the polygon of the board, cut-outs left out."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable, Sequence
from typing import NamedTuple

import numpy as np
import shapely
from shapely import LineString, MultiPolygon, Polygon

from splitcheck.copper.marks import Drawing, Fill, Point, Stroke
from splitcheck.units import GRID_MM, Floats

Bounds = tuple[float, float, float, float]

#: Ends of lines closer than this are joined; tried in this order, mm.
SNAPS_MM = (0.001, 0.01, 0.03, 0.1)
#: Most line pieces; an edge with more is no edge.
PIECES_CAP = 50_000
#: Most closed areas between lines.
FACES_CAP = 2000
#: Only this many of the largest loops are looked at.
_LOOPS_CAP = 500
#: A loop that holds this share of the copper is the board.
_HOLDS = 0.95
_SOME = 0.5
#: A loop with less than this share of it covered by copper is a cut-out.
_BARE = 0.02
_SMALLEST_MM2 = 0.05


class Outline(NamedTuple):
    """The board as drawn."""

    shape: Polygon | MultiPolygon | None
    """Area of the board, mm; several polygons for several boards, ``None`` if no loop closes."""
    remarks: tuple[str, ...]


def outline(drawing: Drawing, copper_bounds: Bounds, copper: Sequence[Polygon] = ()) -> Outline:
    """Find the board in a drawing of its edge.

    Parameters
    ----------
    drawing
        The outline file; it may hold other lines, such as a sheet frame, rails or notes.
    copper_bounds
        Box round all copper: least x, least y, largest x, largest y, mm.
    copper
        The copper, if it is known; tells boards from cut-outs better than the box alone.

    Returns
    -------
    The smallest closed loop that holds the copper, without the loops inside it that hold none;
    all loops with copper if no single one holds it all.

    Notes
    -----
    Lines are joined at their ends, first within 1 um, then more generously up to 0.1 mm, until
    a loop that holds the copper closes.
    """
    lines, remarks = _lines(drawing)
    if not lines:
        return Outline(None, (*remarks, f"{drawing.name}: draws no line; it gives no outline"))
    weights = _Copper.of(copper_bounds, copper)
    found: Outline | None = None
    most = 0.0
    for snap_mm in SNAPS_MM:
        faces = _faces(lines, snap_mm)
        if len(faces) > FACES_CAP:
            wrong = f"{drawing.name}: its lines close over {FACES_CAP} loops; it is no edge"
            return Outline(None, (*remarks, wrong))
        shape, share = _board(faces, weights)
        if shape is None:
            continue
        said = list(remarks)
        if snap_mm > SNAPS_MM[0]:
            said.append(
                f"{drawing.name}: gaps of up to {snap_mm:g} mm between its lines are closed"
            )
        what = "copper" if copper else "box round the copper"
        said += _said(drawing.name, shape, share, what, faces)
        if share >= _HOLDS:
            return Outline(shape, tuple(said))
        if share > most:
            found, most = Outline(shape, tuple(said)), share
    if found is not None:
        return found
    wrong = f"{drawing.name}: its lines close no loop round the copper; it gives no outline"
    return Outline(None, (*remarks, wrong))


class _Copper(NamedTuple):
    """Where the copper is: places with weights that sum to 1, and pieces to test loops with."""

    places: Floats
    """Shape (n, 2), mm."""
    weights: Floats
    tree: shapely.STRtree | None
    pieces: Sequence[Polygon]
    bounds: Bounds

    @classmethod
    def of(cls, bounds: Bounds, copper: Sequence[Polygon]) -> _Copper:
        pieces = [piece for piece in copper if piece.area > 0]
        total_mm2 = sum(piece.area for piece in pieces)
        rows = [_sample(piece, piece.area > total_mm2 / 100) for piece in pieces]
        shares = [np.full(len(r), p.area / len(r)) for p, r in zip(pieces, rows, strict=True)]
        places = np.concatenate([np.empty((0, 2)), *rows])
        weights = np.concatenate([np.empty(0), *shares]) / max(total_mm2, 1e-12)
        tree = shapely.STRtree(pieces) if pieces else None
        return cls(places, weights, tree, pieces, bounds)

    def share_in(self, loop: Polygon | MultiPolygon) -> float:
        """Share of the copper inside a loop, 0 to 1; without copper, of its box."""
        if not self.pieces:
            box = shapely.box(*self.bounds)
            return shapely.box(*loop.bounds).intersection(box).area / max(box.area, 1e-12)
        shapely.prepare(loop)
        inside = shapely.contains_xy(loop, self.places[:, 0], self.places[:, 1])
        return float(np.dot(inside.astype(np.float64), self.weights))

    def covers(self, loop: Polygon) -> float:
        """Share of a loop that copper covers on its fullest layer at least, 0 to 1."""
        if self.tree is None:
            return 0.0
        near = [self.pieces[i] for i in self.tree.query(loop, predicate="intersects")]
        covered_mm2 = max((piece.intersection(loop).area for piece in near), default=0.0)
        return covered_mm2 / loop.area


def _sample(piece: Polygon, large: bool) -> Floats:
    """Places spread over a large piece of copper, or one place inside a small one, mm."""
    if large:
        x0, y0, x1, y1 = piece.bounds
        steps = (np.arange(24) + 0.5) / 24
        x, y = (a.ravel() for a in np.meshgrid(x0 + (x1 - x0) * steps, y0 + (y1 - y0) * steps))
        inside = shapely.contains_xy(piece, x, y)
        if inside.any():
            return np.column_stack((x[inside], y[inside]))
    point = piece.representative_point()
    return np.array([[point.x, point.y]])


def _lines(drawing: Drawing) -> tuple[list[list[Point]], list[str]]:
    """Centre lines of all strokes and contours; flashes and clear marks are no edge."""
    lines: list[list[Point]] = []
    flashes = 0
    for mark in drawing.marks:
        if isinstance(mark, Stroke) and mark.dark:
            lines.append(
                [p for i, p in enumerate(mark.points) if i == 0 or p != mark.points[i - 1]]
            )
        elif isinstance(mark, Fill) and mark.dark:
            lines.append(list(mark.ring))
        elif mark.dark:
            flashes += 1
    kept = [line for line in lines if len(line) > 1]
    remarks = [f"{drawing.name}: {flashes} flashes in it are no edge"] if flashes else []
    if sum(len(line) for line in kept) > PIECES_CAP:
        remarks.append(f"{drawing.name}: has over {PIECES_CAP} line pieces; it is no edge")
        return [], remarks
    return kept, remarks


def _faces(lines: Sequence[Sequence[Point]], snap_mm: float) -> list[Polygon]:
    """The closed areas between lines whose ends are joined within ``snap_mm``."""
    ends = np.array([p for line in lines for p in (line[0], line[-1])])
    joined = _join(ends, snap_mm)
    moved = []
    for i, line in enumerate(lines):
        points = [joined[2 * i], *line[1:-1], joined[2 * i + 1]]
        if len(points) > 2 or points[0] != points[1]:
            moved.append(LineString(points))
    network = shapely.unary_union([*moved, *_bridges(moved, snap_mm)], grid_size=GRID_MM)
    faces = [face for face in shapely.polygonize([network]).geoms if isinstance(face, Polygon)]
    return [face for face in faces if face.area > _SMALLEST_MM2]


def _bridges(lines: Sequence[LineString], snap_mm: float) -> list[LineString]:
    """Short lines from ends that meet nothing to the middle of the line they just miss."""
    ends = [(i, p) for i, line in enumerate(lines) for p in (line.coords[0], line.coords[-1])]
    met = Counter(place for _, place in ends)
    tree = shapely.STRtree(lines)
    bridges = []
    for i, place in ends:
        if met[place] > 1:
            continue
        point = shapely.Point(place)
        for j in sorted(tree.query(point, predicate="dwithin", distance=snap_mm))[:8]:
            foot = lines[j].interpolate(lines[j].project(point))
            if j != i and foot.distance(point) > 0:
                # Drawn a little past the foot, so that the two surely cross.
                past = [foot.coords[0][k] + 0.01 * (foot.coords[0][k] - place[k]) for k in (0, 1)]
                bridges.append(LineString([place, (past[0], past[1])]))
    return bridges


def _join(ends: Floats, snap_mm: float) -> list[Point]:
    """Ends moved onto the first end within reach, so that they meet."""
    cells: dict[tuple[int, int], list[Point]] = {}
    joined: list[Point] = []
    for x, y in ends.tolist():
        column, row = math.floor(x / snap_mm), math.floor(y / snap_mm)
        around = ((column + i, row + j) for i in (-1, 0, 1) for j in (-1, 0, 1))
        near = (p for cell in around for p in cells.get(cell, ()))
        known = next((p for p in near if math.dist(p, (x, y)) <= snap_mm), None)
        if known is None:
            known = (x, y)
            cells.setdefault((column, row), []).append(known)
        joined.append(known)
    return joined


def _board(
    faces: Sequence[Polygon], copper: _Copper
) -> tuple[Polygon | MultiPolygon | None, float]:
    """The smallest loop that holds the copper, or all loops that hold some."""
    loops = _loops(faces)
    best: tuple[float, Polygon] | None = None
    for loop in loops:
        share = copper.share_in(loop)
        if share >= _HOLDS:
            return _without_cutouts(loop, faces, copper), share
        if best is None or share > best[0]:
            best = share, loop
    several = _several(loops, copper)
    if several is not None:
        share = copper.share_in(several)
        if share >= _HOLDS or (best and share > best[0] + 0.1):
            parts = [_without_cutouts(part, faces, copper) for part in several.geoms]
            return MultiPolygon(parts), share
    if best is not None and best[0] >= _SOME:
        return _without_cutouts(best[1], faces, copper), best[0]
    return None, 0.0


def _loops(faces: Sequence[Polygon]) -> list[Polygon]:
    """Closed loops, smallest first: round each face, and round all faces that hang together."""
    filled = [Polygon(face.exterior) for face in faces]
    whole = shapely.unary_union(filled)
    hulls = [Polygon(part.exterior) for part in _parts(whole)]
    keyed = {(round(loop.area, 6), loop.bounds): loop for loop in [*filled, *hulls]}
    return [loop for _, loop in sorted(keyed.items(), key=lambda item: item[0])][-_LOOPS_CAP:]


def _several(loops: Sequence[Polygon], copper: _Copper) -> MultiPolygon | None:
    """The loops that each hold some copper and lie in no other such loop."""
    holding = [loop for loop in loops if copper.pieces and copper.share_in(loop) >= 0.02]
    if not copper.pieces:
        holding = [loop for loop in loops if loop.intersects(shapely.box(*copper.bounds))]
    outer = [
        loop
        for i, loop in enumerate(holding)
        if not any(other.covers(loop) for j, other in enumerate(holding) if j > i)
    ]
    outer.sort(key=lambda loop: loop.bounds)
    return MultiPolygon(outer) if len(outer) > 1 else None


def _without_cutouts(loop: Polygon, faces: Sequence[Polygon], copper: _Copper) -> Polygon:
    """The loop less what is cut out of it: loops free of its edge with no copper in them."""
    holes = [Polygon(face.exterior) for face in faces]
    shapely.prepare(loop)
    free = shapely.contains_properly(loop, np.array(holes, dtype=object))
    inner = [h for h, f in zip(holes, free, strict=True) if f and copper.covers(h) < _BARE]
    cut = loop.difference(shapely.unary_union(inner)) if inner else loop
    parts = _parts(cut)
    return max(parts, key=lambda part: part.area) if parts else loop


def _parts(shape: shapely.Geometry) -> list[Polygon]:
    return [part for part in shapely.get_parts(shape).tolist() if isinstance(part, Polygon)]


def _said(
    name: str, shape: Polygon | MultiPolygon, share: float, what: str, faces: Iterable[Polygon]
) -> list[str]:
    said = []
    boards = len(_parts(shape))
    if boards > 1:
        said.append(f"{name}: shows {boards} boards")
    if share < _HOLDS:
        said.append(f"{name}: {1 - share:.0%} of the {what} lies outside the outline")
    filled = shapely.unary_union([Polygon(part.exterior) for part in _parts(shape)])
    shapely.prepare(filled)
    beside = sum(not filled.contains(face.representative_point()) for face in faces)
    if beside:
        said.append(f"{name}: {beside} closed loops beside the board are ignored")
    cuts = sum(len(part.interiors) for part in _parts(shape))
    if cuts:
        said.append(f"{name}: {cuts} cut-outs inside the board")
    return said
