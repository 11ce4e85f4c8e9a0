"""Components by attributes, netlist pins and placed centres, on copper made by hand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from math import cos, radians, sin
from pathlib import Path

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.components import Component, Pin, capacitors_of, links_of
from splitcheck.board.listed import ListedPin
from splitcheck.board.parts import CopperLayer, Pad
from splitcheck.board.populate import Populated, populate, sources_of
from splitcheck.copper.holes import Hole
from splitcheck.copper.intake import Export, InputFile
from splitcheck.copper.marks import Point
from splitcheck.errors import SplitcheckError
from splitcheck.road import Clock, Options, build, load, read_copper

#: Centres and angles of two-pad parts far enough apart to tell their pads by eye.
PARTS = [
    (f"C{number}", (10.0 + 7 * column + 0.37 * row, 12.0 + 9 * row), 90.0 * ((row + column) % 2))
    for number, (row, column) in enumerate((row, column) for row in range(4) for column in range(5))
]
PITCH_MM = 1.5


def _ends(at: Point, turn_deg: float) -> tuple[Point, Point]:
    dx, dy = cos(radians(turn_deg)) * PITCH_MM / 2, sin(radians(turn_deg)) * PITCH_MM / 2
    return (
        (round(at[0] - dx, 6), round(at[1] - dy, 6)),
        (round(at[0] + dx, 6), round(at[1] + dy, 6)),
    )


def _layer(number: int, pads: Sequence[Pad], flashed: Sequence[Pad] | None = None) -> CopperLayer:
    """Copper of square pads; which of them count as flashed may be told apart from it."""
    pieces = tuple(shapely.box(x - 0.4, y - 0.4, x + 0.4, y + 0.4) for (x, y), *_ in pads)
    shown = tuple(pads if flashed is None else flashed)
    return CopperLayer(number, f"L{number}", "", pieces, ((),) * len(pieces), (), shown, len(pads))


def _pads(named: bool = False) -> list[Pad]:
    return [
        Pad(end, None, ref if named else None, str(pin) if named else None, None, 0.8, True)
        for ref, at, turn in PARTS
        for pin, end in enumerate(_ends(at, turn), start=1)
    ]


def _export(*texts: tuple[str, str]) -> Export:
    files = tuple(InputFile(name, text, "", "placement", "") for name, text in texts)
    return Export("made", files, None, (), ())


def _found(
    export: Export,
    pads: Sequence[Pad],
    *,
    flashed: Sequence[Pad] | None = None,
    bottom: Sequence[Pad] = (),
    listed: Sequence[ListedPin] = (),
    holes: Sequence[Hole] = (),
    corner: Point = (0.0, 0.0),
) -> Populated:
    layers = (_layer(1, pads, flashed), _layer(2, bottom))
    count = sum(len(layer.pieces) for layer in layers)
    return populate(export, layers, tuple(range(count)), holes, listed, corner)


def _list(
    factor: float = 1.0,
    shift: Point = (0.0, 0.0),
    side: str = "top",
    head: str = "",
    sign: int = 1,
) -> str:
    rows = [
        f"{ref},{sign * factor * (x + shift[0]):.5f},{factor * (y + shift[1]):.5f},{turn},{side},1u"
        for ref, (x, y), turn in PARTS
    ]
    return "\n".join([*([head] if head else []), "Ref,X,Y,Rot,Side,Val", *rows])


def _expected() -> dict[str, set[Point]]:
    return {ref: set(_ends(at, turn)) for ref, at, turn in PARTS}


def _places(found: Populated) -> dict[str, set[Point]]:
    return {part.ref: {pin.at for pin in part.pins} for part in found.components}


def test_pads_name_their_component_and_pin() -> None:
    """Each pin with its place and the net of the copper under it."""
    found = _found(_export(), _pads(named=True))
    assert _places(found) == _expected()
    first = found.components[0]
    assert (first.ref, first.layer, first.value, first.source) == ("C0", 1, None, "attributes")
    assert [(pin.number, pin.net, pin.part) for pin in first.pins] == [("1", 0, 0), ("2", 1, 1)]


def test_component_named_without_pins_is_told_by_its_pads() -> None:
    """Two pads of one reference are two pins, whatever they are called."""
    pads = [pad._replace(pin=None) for pad in _pads(named=True)]
    assert _places(_found(_export(), pads)) == _expected()


def test_netlist_pins_are_components_where_no_pad_tells() -> None:
    """Pins from below are on the bottom; those through the board tell no side."""
    listed = [
        ListedPin("C0", "1", PARTS[0][1], bottom=True, through=False),
        ListedPin("J1", "1", PARTS[1][1], bottom=False, through=True),
        ListedPin("J1", None, (99.0, 99.0), bottom=False, through=True),
    ]
    found = _found(_export(), _pads(), listed=listed)
    assert [(part.ref, part.layer, part.source) for part in found.components] == [
        ("C0", 2, "netlist"),
        ("J1", 1, "netlist"),
    ]
    assert [pin.part for pin in found.components[1].pins] == [-1, -1]


def test_attributes_go_before_the_netlist() -> None:
    """A reference that both know is that of its pads; what only one knows is kept."""
    listed = [ListedPin(ref, "1", PARTS[0][1], bottom=False, through=False) for ref in ("C0", "X9")]
    found = {
        part.ref: part for part in _found(_export(), _pads(named=True), listed=listed).components
    }
    assert found["C0"].source == "attributes"
    assert found["X9"].source == "netlist"


def test_values_come_from_the_list_whatever_knows_the_pads() -> None:
    """The list is then not needed for the places."""
    found = _found(_export(("a.csv", _list())), _pads(named=True))
    assert {part.value for part in found.components} == {"1u"}
    assert {part.source for part in found.components} == {"attributes"}


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (_list(), None),
        (_list(1 / 25.4, head="Units: inch"), None),
        (_list(1 / 0.0254, head="Units: mil"), None),
        (_list(1 / 25.4), None),
        (_list(1 / 25.4, head="Units: mm"), "was read in in"),
        (_list(shift=(-31.3, 17.2)), None),
    ],
    ids=["as it is", "inch", "mil", "inch not stated", "wrong unit stated", "other origin"],
)
def test_centres_find_the_two_pads_round_them(text: str, said: str | None) -> None:
    """Whatever the unit and the origin; a unit stated wrongly is an assumption."""
    found = _found(_export(("a.csv", text)), _pads())
    assert _places(found) == _expected()
    assert {part.source for part in found.components} == {"placement"}
    assert [said is not None and said in words for words in found.assumptions] == (
        [] if said is None else [True]
    )


@pytest.mark.parametrize("sign", [1, -1], ids=["seen from above", "seen from below"])
def test_bottom_may_be_mirrored(sign: int) -> None:
    """Both habits of exporters are met; the parts are on the last layer."""
    text = _list(side="bottom", sign=sign)
    found = _found(_export(("a.csv", text)), [], bottom=_pads())
    assert _places(found) == _expected()
    assert {part.layer for part in found.components} == {2}


def test_list_of_another_board_gives_nothing_and_says_so() -> None:
    """Centres that lie between no two pads."""
    rows = "\n".join(
        f"C{i},{(i * 7919) % 977 / 10},{(i * 104729) % 883 / 10},0,top" for i in range(40)
    )
    found = _found(_export(("a.csv", f"Ref,X,Y,Rot,Side\n{rows}")), _pads())
    assert found.components == ()
    assert "no component was taken from it" in found.assumptions[0]


def test_pads_of_vias_are_not_those_of_parts() -> None:
    """Two vias nearer round a centre than the part's own pads."""
    (ref, (x, y), turn), *_ = PARTS
    assert turn == 0.0
    near = [Pad((x + dx, y), None, None, None, None, 0.8, True) for dx in (-0.6, 0.6)]
    holes = [Hole((pad.at,), 0.3, plated=True, span=None, line=1) for pad in near]
    export = _export(("a.csv", _list()))
    assert _places(_found(export, [*_pads(), *near], holes=holes))[ref] == _expected()[ref]
    assert _places(_found(export, [*_pads(), *near]))[ref] == {pad.at for pad in near}


def test_painted_pads_are_found_by_the_copper_itself() -> None:
    """No pad is flashed: the first copper on either side of a centre, along its angle."""
    found = _found(_export(("a.csv", _list())), _pads(), flashed=())
    for ref, places in _expected().items():
        seen = next(part for part in found.components if part.ref == ref)
        assert len(seen.pins) == 2
        for (x, y), pin in zip(
            sorted(places), sorted(seen.pins, key=lambda pin: pin.at), strict=True
        ):
            assert abs(x - pin.at[0]) <= 0.4
            assert abs(y - pin.at[1]) <= 0.4
            assert pin.part >= 0


def test_painted_pads_with_the_corner_or_marks_as_origin() -> None:
    """The lower left corner of the board is a usual origin; fiducial marks tell any other."""
    corner = _found(
        _export(("a.csv", _list(shift=(-5.0, -3.0)))), _pads(), flashed=(), corner=(5, 3)
    )
    assert len(corner.components) == len(PARTS)
    marks = [Pad(at, None, None, None, None, 0.8, False) for at in ((2.0, 50.0), (47.0, 3.0))]
    rows = "\n".join(
        f"FM{i},{x - 8.25:.3f},{y + 1.5:.3f},0,top,mark" for i, ((x, y), *_) in enumerate(marks)
    )
    text = f"{_list(shift=(-8.25, 1.5))}\n{rows}"
    assert len(_found(_export(("a.csv", text)), [*_pads(), *marks], flashed=()).components) == len(
        PARTS
    )
    assert (
        _found(_export(("a.csv", _list(shift=(-8.25, 1.5)))), _pads(), flashed=()).components == ()
    )


@given(st.permutations(range(len(PARTS))), st.integers(0, 19))
def test_order_and_fewer_parts_do_not_matter(order: list[int], left_out: int) -> None:
    """Pads of a part that is not listed are nobody's; the rest is found as before."""
    rows = _list().splitlines()
    text = "\n".join([rows[0], *(rows[1 + i] for i in order if i != left_out)])
    expected = _expected()
    del expected[f"C{left_out}"]
    assert _places(_found(_export(("a.csv", text)), _pads())) == expected


def _part(ref: str, value: str | None = None, pins: int = 2) -> Component:
    return Component(ref, 1, (Pin("1", (0, 0), 0, 0),) * pins, value, "netlist")


def test_capacitors_have_two_pads_and_a_name_with_c() -> None:
    """One pad, three pads, or another letter: not one; unless it is named."""
    parts = [
        _part("C1"),
        _part("C2", pins=1),
        _part("C3", pins=3),
        _part("CN4"),
        _part("R5"),
        _part("R6"),
    ]
    assert [part.ref for part in capacitors_of(parts)] == ["C1"]
    assert [part.ref for part in capacitors_of(parts, ("R6",))] == ["C1", "R6"]


@pytest.mark.parametrize(
    ("ref", "value", "link"),
    [
        ("R1", "0R", True), ("R1", "0", True), ("FB1", "0 Ohm", True), ("L1", "0.0", True),
        ("R1", "10R", False), ("R1", None, False), ("FB1", "600R@100MHz", False),
        ("R1", "0.1R", False), ("R1", "DNP", False), ("U1", "0R", False), ("R1", "0R05", False),
    ],
)  # fmt: skip
def test_links_say_zero(ref: str, value: str | None, link: bool) -> None:
    """Only a resistor, inductor or ferrite whose value is 0 is copper."""
    assert bool(links_of([_part(ref, value)])) is link


def test_sources_in_words() -> None:
    """In the order of trust."""
    parts = [_part("C1"), replace(_part("C2"), source="attributes")]
    assert sources_of(parts) == "X2 attributes of pads and the netlist"
    assert sources_of([]) == ""


@pytest.mark.slow
def test_real_centres_find_the_pads_that_attributes_name(corpus: Path) -> None:
    """Independent of one another: centres of the list against attributes of the pads.

    On boards that have both, every part that the centres find must have the pads and the side
    that its attributes say.
    """
    compared = 0
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        options = Options(jobs=1)
        try:
            export = load(folder, options)
        except SplitcheckError:  # judged elsewhere
            continue
        if not export.of_kind("placement"):
            continue
        board = build(export, read_copper(export, 1, Clock(lambda *_: None)), options).board
        told = {part.ref: part for part in board.components if part.source == "attributes"}
        if not told:
            continue
        bare = [
            replace(
                layer,
                pads=tuple(pad._replace(component=None, pin=None) for pad in layer.pads),
            )
            for layer in board.layers
        ]
        holes = [hole.hole for hole in board.holes]
        for part in populate(export, bare, board.net_of, holes, ()).components:
            assert {pin.at for pin in part.pins} == {pin.at for pin in told[part.ref].pins}
            assert part.layer == told[part.ref].layer
            compared += 1
    if not compared:
        pytest.skip("no board of the corpus has both attributes and a placement list")
    assert compared >= 100
