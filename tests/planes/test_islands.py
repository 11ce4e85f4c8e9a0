"""Reference copper as islands, and the gaps that are left."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.planes.islands import FRAME_MM, find_planes, is_plane_like, reference_nets
from tests.making.hand import Line, Sheet, board, plane

TOP = Sheet(lines=(Line("CLK", ((1, 1), (3, 1))),))


def _with(*areas: tuple[str, Polygon], outline: Polygon | None = None) -> Board:
    return board(TOP, Sheet(areas), outline=outline or shapely.box(0, 0, 40, 30))


def _holed(outer: Polygon, *holes: Polygon) -> Polygon:
    return Polygon(outer.exterior, [hole.exterior for hole in holes])


def test_whole_plane_is_one_island_and_one_gap_outside() -> None:
    """The outside reaches 5 mm beyond the copper on all sides."""
    found = plane(_with(("GND", shapely.box(0, 0, 40, 30))), 2)
    assert [(i.id, i.net_name, i.shape.area) for i in found.islands] == [("L2.1", "GND", 1200.0)]
    (gap,) = found.gaps
    assert gap.open
    assert gap.shape.area == pytest.approx((40 + 2 * FRAME_MM) * (30 + 2 * FRAME_MM) - 1200)


def test_hole_of_an_island_is_a_closed_gap() -> None:
    """The outside comes first, then closed gaps from large to small."""
    small, large = shapely.box(5, 5, 6, 6), shapely.box(10, 10, 20, 12)
    found = plane(_with(("GND", _holed(shapely.box(0, 0, 40, 30), small, large))), 2)
    assert [(gap.open, round(gap.shape.area, 6)) for gap in found.gaps[1:]] == [
        (False, 20),
        (False, 1),
    ]
    assert found.gaps[0].open


def test_island_nested_in_a_hole_makes_the_hole_a_ring() -> None:
    """The gap between supply and ground goes all round the supply; it is closed."""
    moat, inner = shapely.box(10, 10, 20, 20), shapely.box(11, 11, 19, 19)
    found = plane(_with(("GND", _holed(shapely.box(0, 0, 40, 30), moat)), ("+5V", inner)), 2)
    assert [island.net_name for island in found.islands] == ["GND", "+5V"]
    assert [gap.open for gap in found.gaps] == [True, False]
    ring = found.gaps[1].shape
    assert ring.area == pytest.approx(100 - 64)
    assert len(ring.interiors) == 1


def test_island_within_an_island_within_an_island() -> None:
    """Two moats, three islands: each moat is a ring of its own."""
    moats = shapely.box(5, 5, 35, 25), shapely.box(15, 10, 25, 20)
    middle = _holed(shapely.box(6, 6, 34, 24), moats[1])
    found = plane(
        _with(
            ("GND", _holed(shapely.box(0, 0, 40, 30), moats[0])),
            ("+5V", middle),
            ("+3V3", shapely.box(16, 11, 24, 19)),
        ),
        2,
    )
    assert [round(gap.shape.area, 6) for gap in found.gaps[1:]] == [600 - 28 * 18, 100 - 64]


def test_plane_larger_than_the_ring_round_it() -> None:
    """A thin guard ring, a plane inside it, an island in that plane: two rings of gap."""
    ring = _holed(shapely.box(0, 0, 40, 30), shapely.box(1, 1, 39, 29))
    middle = _holed(shapely.box(2, 2, 38, 28), shapely.box(15, 10, 25, 20))
    inner = shapely.box(16, 11, 24, 19)
    found = plane(_with(("GND", ring), ("+5V", middle), ("+3V3", inner)), 2)
    assert [island.net_name for island in found.islands] == ["+5V", "GND", "+3V3"]
    areas = [round(gap.shape.area, 6) for gap in found.gaps[1:]]
    assert areas == [38 * 28 - 36 * 26, 100 - 64]


def test_foreign_copper_in_a_hole_is_gap() -> None:
    """A signal's area within a ground plane carries no return: the hole stays a whole gap."""
    moat = shapely.box(10, 10, 14, 14)
    found = plane(
        _with(
            ("GND", _holed(shapely.box(0, 0, 40, 30), moat)), ("SDA", shapely.box(11, 11, 13, 13))
        ),
        2,
    )
    assert [island.net_name for island in found.islands] == ["GND"]
    assert found.gaps[1].shape.area == pytest.approx(16)
    assert found.island_at(np.array([12.0]), np.array([12.0])).tolist() == [-1]


def test_split_plane_is_cut_by_the_outside() -> None:
    """A cut from edge to edge belongs to the outside: one open gap, two islands."""
    found = plane(
        _with(("+5V", shapely.box(0, 0, 19, 30)), ("+3V3", shapely.box(20, 0, 40, 30))), 2
    )
    assert [island.net_name for island in found.islands] == ["+3V3", "+5V"]
    assert [gap.open for gap in found.gaps] == [True]


def test_islands_are_numbered_by_area_then_place() -> None:
    """Ids do not depend on the order in the file."""
    areas = [("GND", shapely.box(0, 0, 10, 10)), ("GND", shapely.box(20, 0, 30, 10)),
             ("GND", shapely.box(0, 15, 20, 30))]  # fmt: skip
    forth, back = (plane(_with(*some), 2) for some in (areas, areas[::-1]))
    assert [i.shape.bounds for i in forth.islands] == [i.shape.bounds for i in back.islands]
    assert [i.id for i in forth.islands] == ["L2.1", "L2.2", "L2.3"]
    assert forth.islands[0].shape.area == 300


@pytest.mark.parametrize(
    ("name", "shape", "carries"),
    [
        ("GND", shapely.box(0, 0, 4, 2), True),
        ("+3V3", shapely.box(0, 0, 4, 2), True),
        ("GND", shapely.box(0, 0, 30, 0.3), False),
        ("GND", shapely.box(0, 0, 1, 1), False),
        ("PHASE", shapely.box(0, 0, 4, 2), False),
        ("", shapely.box(0, 0, 20, 20), True),
        ("PHASE", shapely.box(0, 0, 20, 20), True),
    ],
)
def test_what_carries_a_return(name: str, shape: Polygon, *, carries: bool) -> None:
    """Grounds and supplies with an area; any other net only with an area as planes have."""
    made = _with((name, shape))
    assert bool(reference_nets(made)) is carries
    assert bool(find_planes(made)) is carries


def test_thin_copper_of_a_ground_is_no_island() -> None:
    """The net carries returns, its trace on the layer does not."""
    found = plane(
        _with(("GND", shapely.box(0, 0, 40, 20)), ("GND", shapely.box(0, 25, 40, 25.2))), 2
    )
    assert [round(island.shape.area) for island in found.islands] == [800]


@given(st.floats(0.5, 50), st.floats(0.5, 50), st.floats(0, 180))
def test_being_plane_like_does_not_depend_on_how_it_lies(w: float, h: float, turn: float) -> None:
    """Area and mean width are the same however the copper is turned."""
    shape = shapely.box(0, 0, w, h)
    turned = shapely.affinity.rotate(shape, turn)
    wide = 2 * w * h / (2 * (w + h))
    if abs(w * h - 4) > 1e-6 and abs(wide - 0.5) > 1e-6:
        assert is_plane_like(shape) == is_plane_like(turned) == (w * h > 4 and wide > 0.5)


holes = st.lists(st.tuples(st.integers(0, 7), st.integers(0, 5)), unique=True, max_size=20)


@given(cells=holes, split=st.booleans())
def test_islands_and_gaps_fill_the_frame(cells: list[tuple[int, int]], *, split: bool) -> None:
    """Nothing is lost and nothing counted twice, whatever is cut out."""
    cut = [shapely.box(5 * i + 1, 5 * j + 1, 5 * i + 3, 5 * j + 4) for i, j in cells]
    whole = shapely.box(0, 0, 40, 30)
    if split:
        cut.append(shapely.box(19.5, -1, 20.25, 31))
    left = shapely.get_parts(whole.difference(shapely.union_all(cut)))
    found = plane(_with(*(("GND", piece) for piece in left)), 2)
    area = sum(i.shape.area for i in found.islands) + sum(g.shape.area for g in found.gaps)
    assert area == pytest.approx((40 + 2 * FRAME_MM) * (30 + 2 * FRAME_MM))
    tiles = sum(tile.shape.area for tile in found.tiles)
    assert tiles == pytest.approx(sum(gap.shape.area for gap in found.gaps))


def test_gap_of_many_corners_is_tiled_without_loss() -> None:
    """A comb-like gap: its tiles add up to it and each belongs to it."""
    teeth = [shapely.box(2 + n * 0.4, 2, 2.2 + n * 0.4, 20) for n in range(60)]
    comb = shapely.union_all([*teeth, shapely.box(2, 1, 26, 2)])
    assert isinstance(comb, Polygon)
    found = plane(_with(("GND", _holed(shapely.box(0, 0, 40, 30), comb))), 2)
    mine = [tile.shape for tile in found.tiles if tile.gap == 1]
    assert len(mine) > 1
    assert sum(tile.area for tile in mine) == pytest.approx(comb.area)
    assert shapely.union_all(mine).difference(comb.buffer(1e-6)).is_empty
