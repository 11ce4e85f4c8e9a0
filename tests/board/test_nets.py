"""Parts joined through plated holes, and the names of nets."""

from __future__ import annotations

from random import Random

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.board.nets import name_nets
from splitcheck.board.parts import Part
from splitcheck.copper.holes import Hole
from tests.making.hand import Line, Sheet, board, via


def _less(shape: Polygon, x: float, y: float, radius_mm: float) -> Polygon:
    left = shape.difference(shapely.Point(x, y).buffer(radius_mm))
    assert isinstance(left, Polygon)
    return left


def _pad(x: float, y: float) -> shapely.Polygon:
    return shapely.box(x - 0.3, y - 0.3, x + 0.3, y + 0.3)


def _pads(*nets: tuple[str, float, float]) -> Sheet:
    return Sheet(tuple((net, _pad(x, y)) for net, x, y in nets))


def _joined(made: Board) -> list[list[int]]:
    """Layers of the parts of every net with more than one."""
    return [[made.parts[i].layer for i in net.parts] for net in made.nets if len(net.parts) > 1]


def test_hole_joins_what_it_goes_through() -> None:
    """One hole through pads on three layers; a second pad aside stays alone."""
    made = board(
        _pads(("A", 0, 0), ("B", 3, 0)),
        _pads(("A", 0, 0)),
        _pads(("A", 0, 0), ("B", 3, 0)),
        holes=[via(0, 0)],
    )
    assert _joined(made) == [[1, 2, 3]]
    assert made.holes[0].layers == (1, 2, 3)
    assert [net.name for net in made.nets] == ["A", "B", "B"]


@pytest.mark.parametrize(
    ("span", "layers"), [((1, 2), (1, 2)), ((2, 3), (2, 3)), ((3, 4), (3, 4)), (None, (1, 2, 3, 4))]
)
def test_blind_and_buried_holes_join_their_span_only(
    span: tuple[int, int] | None, layers: tuple[int, ...]
) -> None:
    """Pads of all four layers lie over one another; the hole goes through some of them."""
    made = board(*[_pads(("", 0, 0))] * 4, holes=[via(0, 0, span)])
    assert made.holes[0].layers == layers
    assert _joined(made) == [list(layers)]


def test_hole_in_an_antipad_joins_nothing_there() -> None:
    """The barrel of 0.3 mm stands in a clearance of 1 mm on the inner layer."""
    pour = _less(shapely.box(-5, -5, 5, 5), 0, 0, 0.5)
    made = board(_pads(("A", 0, 0)), Sheet((("GND", pour),)), _pads(("A", 0, 0)), holes=[via(0, 0)])
    assert made.holes[0].layers == (1, 3)
    assert {net.name: len(net.parts) for net in made.nets} == {"A": 2, "GND": 1}


def test_hole_wider_than_its_pad_joins_by_its_rim() -> None:
    """Half the pad is drilled away and the barrel still meets the pour round it."""
    ring = _less(shapely.box(-1, -1, 1, 1), 0, 0, 0.45)
    hole = Hole(((0.0, 0.0),), 1.0, plated=True, span=None, line=1)
    made = board(Sheet((("A", ring),)), Sheet((("A", ring),)), holes=[hole])
    assert _joined(made) == [[1, 2]]


def test_slot_joins_all_along_its_way() -> None:
    """A routed slot 4 mm long: pads lie at its two ends, on different layers."""
    slot = Hole(((0.0, 0.0), (4.0, 0.0)), 0.6, plated=True, span=None, line=1)
    made = board(_pads(("A", 0, 0)), _pads(("A", 4, 0)), holes=[slot])
    assert _joined(made) == [[1, 2]]
    assert made.holes[0].at == (2.0, 0.0)


def test_hole_in_nothing_has_no_net() -> None:
    """It is kept, so that the share of holes on copper can be told."""
    made = board(_pads(("A", 0, 0)), _pads(("A", 0, 0)), holes=[via(5, 5)])
    assert (made.holes[0].net, made.holes[0].parts) == (-1, ())


def test_net_without_a_name_is_called_by_its_place() -> None:
    """Layer and middle of its topmost part, whatever the order of parts."""
    made = board(
        Sheet((("", _pad(7, 2)),)), Sheet((("", _pad(7, 2)), ("", _pad(1, 1)))), holes=[via(7, 2)]
    )
    assert sorted((net.name, net.given) for net in made.nets) == [
        ("@L1(7.00,2.00)", False),
        ("@L2(1.00,1.00)", False),
    ]


def _parts(*names: tuple[str, ...]) -> tuple[Part, ...]:
    return tuple(Part(i, 1, _pad(2 * i, 0), some) for i, some in enumerate(names))


def test_two_names_on_one_net_are_told() -> None:
    """The net carries both names, and a remark says where."""
    nets, remarks = name_nets(_parts(("GND",), ("AGND",)), (0, 0), {})
    assert [net.name for net in nets] == ["AGND|GND"]
    assert "2 net names ('AGND', 'GND')" in remarks[0]
    assert "x 0.00, y 0.00" in remarks[0]


def test_net_in_two_pieces_is_told() -> None:
    """Each piece is a net of its own with the same name, and a remark counts them."""
    nets, remarks = name_nets(_parts(("A",), ("A",), ("B",)), (0, 1, 2), {})
    assert [net.name for net in nets] == ["A", "A", "B"]
    assert remarks == ("Net 'A' lies in 2 pieces that neither copper nor plated holes join",)


def test_netlist_names_parts_that_carry_none() -> None:
    """Names by part id join those in the files."""
    nets, remarks = name_nets(_parts((), (), ("B",)), (0, 0, 1), {1: ("A",), 2: ("B",)})
    assert [(net.name, net.given) for net in nets] == [("A", True), ("B", True)]
    assert remarks == ()


@given(
    st.lists(st.lists(st.integers(0, 11), min_size=1, max_size=4), max_size=12),
    st.randoms(use_true_random=False),
)
def test_order_of_holes_does_not_matter(groups: list[list[int]], random: Random) -> None:
    """Twelve pads on one layer, joined in groups by bars of the other: the same nets."""
    pads = _pads(*(("", 3 * i, 0) for i in range(12)))
    bars = tuple(("", shapely.box(-1, -row, 40, -row - 0.5)) for row in range(1, len(groups) + 1))
    holes = [
        Hole(((3.0 * x, 0.0), (3.0 * x, -row - 0.25)), 0.3, plated=True, span=None, line=1)
        for row, group in enumerate(groups, 1)
        for x in group
    ]
    as_listed = board(pads, Sheet(bars), holes=holes)
    shuffled = board(pads, Sheet(bars), holes=random.sample(holes, len(holes)))
    assert as_listed.net_of == shuffled.net_of


def test_trace_belongs_to_the_net_of_its_pads() -> None:
    """A stroke between two pads makes one part of them."""
    made = board(
        Sheet((("A", _pad(0, 0)), ("A", _pad(8, 0))), (Line("A", ((0, 0), (8, 0))),)),
        Sheet((("GND", shapely.box(-2, -2, 10, 2)),)),
    )
    assert [(net.name, len(net.parts)) for net in made.nets] == [("A", 1), ("GND", 1)]
    assert made.layers[0].lines[0].piece == 0
