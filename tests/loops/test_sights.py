"""Steps between corners that are kept for all ways: the same as found anew, and never too many."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import LineString, Polygon

from splitcheck.copper.marks import Point
from splitcheck.loops import terrain as terrains
from splitcheck.loops.sights import Patch
from splitcheck.loops.taut import CLEAR_MM, shortest
from splitcheck.loops.terrain import Terrain
from tests.making.hand import Line, Sheet, board, plane

WHOLE = shapely.box(0, 0, 40, 30)
EVERYWHERE = (0.0, 0.0, 40.0, 30.0)
shapes = st.lists(
    st.tuples(st.integers(2, 16), st.integers(2, 11), st.integers(1, 7), st.integers(1, 7)),
    min_size=1,
    max_size=5,
).map(lambda some: [shapely.box(2 * x, 2 * y, 2 * x + w, 2 * y + h) for x, y, w, h in some])
spots = st.tuples(st.integers(0, 39), st.integers(0, 29)).map(lambda p: (p[0] + 0.53, p[1] + 0.47))


def _terrain(holes: list[Polygon]) -> Terrain:
    pieces = shapely.get_parts(WHOLE.difference(shapely.union_all(holes)))
    sheet = Sheet(tuple(("GND", piece) for piece in pieces))
    made = board(Sheet(lines=(Line("CLK", ((1, 1), (2, 1))),)), sheet, outline=WHOLE)
    return Terrain(plane(made, 2))


def _patches(terrain: Terrain) -> list[Patch]:
    gaps = range(len(terrain.plane.gaps))
    return [p for gap in gaps for p in terrain.patches(gap, CLEAR_MM[0], EVERYWHERE)]


@given(shapes)
@settings(max_examples=40)
def test_kept_steps_are_those_of_the_definition(holes: list[Polygon]) -> None:
    """Both corners touched as by a string, own gaps free: pair by pair, without the tables."""
    terrain = _terrain(holes)
    patches = _patches(terrain)
    for patch in patches:
        for corner, (x, y) in enumerate(patch.points.tolist()):
            rows = terrain.steps(patch, corner, patches)
            for other, row in zip(patches, rows, strict=True):
                own = shapely.union_all([terrain.shape(patch.gap), terrain.shape(other.gap)])
                truth = {
                    to
                    for to, end in enumerate(other.points.tolist())
                    if (patch, corner) != (other, to)
                    and _one_sided(patch, corner, end)
                    and _one_sided(other, to, (x, y))
                    and not LineString([(x, y), end]).intersects(own)
                }
                assert {step.to for step in row} == truth


def _one_sided(patch: Patch, corner: int, other: Point) -> bool:
    """Whether the corners before and after a corner lie on one side of a line through it."""
    (x, y), (ax, ay) = patch.points[corner].tolist(), patch.sides[0, :, corner].tolist()
    bx, by = patch.sides[1, :, corner].tolist()
    dx, dy = other[0] - x, other[1] - y
    slack = 1e-15 * (1.0 + dx * dx + dy * dy)
    return bool((dx * ay - dy * ax) * (dx * by - dy * bx) >= -slack)


@given(shapes, st.lists(st.tuples(spots, spots), min_size=2, max_size=5))
@settings(max_examples=40)
def test_ways_do_not_depend_on_those_looked_for_before(
    holes: list[Polygon], ends: list[tuple[Point, Point]]
) -> None:
    """To the bit, as workers come by their ways in any order."""
    used = _terrain(holes)
    for one, other in ends:
        anew = shortest(_terrain(holes), one, other)
        assert shortest(used, one, other) == anew


@pytest.mark.parametrize("most", [0, 3, 10])
def test_no_more_steps_are_kept_than_the_cap_allows(
    most: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A row of slots one after the other: the same way, however little is kept."""
    holes = [shapely.box(3 * i + 4, 2 + i, 3 * i + 5, 20 + i) for i in range(9)]
    free = _terrain(holes)
    way = shortest(free, (2.0, 15.0), (38.0, 15.0))
    monkeypatch.setattr(terrains, "MOST_STEPS", most)
    terrain = _terrain(holes)
    assert shortest(terrain, (2.0, 15.0), (38.0, 15.0)) == way
    assert _kept(terrain) < _kept(free) / 2


def _kept(terrain: Terrain) -> int:
    return sum(len(row) for p in _patches(terrain) for known in p.known for row in known.values())


@given(st.floats(0.1, 5.0), st.floats(-6.0, 6.0), st.booleans())
@settings(max_examples=60)
def test_wall_across_the_gap_changes_no_way(across: float, y: float, up: bool) -> None:
    """What of the wall lies inside the gap is in nobody's way."""
    slot = shapely.box(19, 15 - 7, 21, 15 + 7)
    terrain, sign = _terrain([slot]), 1 if up else -1
    start, goal = (18.9, 15 + y), (21.1, 15 + y)
    walls = [
        LineString([(20, 15 + y - sign * inside), (20, 15 + y + sign * 2000)])
        for inside in (0.0, min(across, 7 + sign * y - 1e-3))
    ]
    plain, longer = (shortest(terrain, start, goal, wall, (1,)) for wall in walls)
    assert plain is not None
    assert plain == longer
    reach = 7 + sign * y
    assert plain[0] == pytest.approx(2 * np.hypot(reach, 0.1) + 2.0, abs=8 * CLEAR_MM[0])
