"""What classes make of findings, on boards made by hand."""

from __future__ import annotations

from dataclasses import replace

import pytest
import shapely
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.board.components import Component, Pin
from splitcheck.board.pairs import Pair
from splitcheck.verdict.classes import know
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.packs import rules_of, shipped_files, shipped_rules
from splitcheck.verdict.placed import with_capacitors
from splitcheck.verdict.rulesfile import read_rules
from splitcheck.verdict.scene import Judged
from splitcheck.verdict.score import crosstalk_mv
from tests.making.hand import Line, Sheet, board, crossings, scene, via

WHOLE = shapely.box(0, 0, 60, 40)


def _slotted(half_mm: float, *lanes: tuple[str, float]) -> Board:
    """Traces along x over a slot 1 mm wide, upright at x = 30, in a ground 0.2 mm beneath."""
    slot = shapely.box(29.5, 20 - half_mm, 30.5, 20 + half_mm)
    ground = WHOLE.difference(slot)
    assert isinstance(ground, Polygon)
    lines = tuple(Line(net, ((2, y), (58, y))) for net, y in lanes)
    return board(Sheet(lines=lines), Sheet((("GND", ground),)), outline=WHOLE)


def _judged(made: Board, rules: str = "", pairs: tuple[Pair, ...] = ()) -> Judged:
    own = read_rules(rules, "splitcheck.toml")
    known = know(made, rules_of(shipped_files(), own), own)
    plain = scene(made)
    set_up = replace(plain, rules=known.rules, drives=known.drives, pairs=pairs)
    return judge(set_up, *crossings(made))


def _by_net(judged: Judged) -> dict[str, Finding]:
    return {finding.net: finding for finding in judged.findings}


def test_nets_over_one_slot_hear_each_other_by_their_own_edges() -> None:
    """The mutual inductance is one number; the faster driver makes the more noise of it."""
    judged = _by_net(_judged(_slotted(8, ("MISC", 19.5), ("I2C_SDA", 20.5))))
    fast, slow = judged["MISC"], judged["I2C_SDA"]
    assert fast.crosstalk_mv is not None
    assert slow.crosstalk_mv is not None
    (heard,) = slow.shares_gap_with
    assert heard.mutual_nh is not None
    default = shipped_rules().default
    assert slow.crosstalk_mv == pytest.approx(crosstalk_mv([(heard.mutual_nh, default)]))
    assert slow.crosstalk_mv > 15 * fast.crosstalk_mv


def test_net_alone_over_a_slot_hears_nobody() -> None:
    """The negative twin: no other net, no crosstalk; and an exempt neighbour does not switch."""
    assert _by_net(_judged(_slotted(8, ("MISC", 19.5))))["MISC"].crosstalk_mv is None
    judged = _by_net(_judged(_slotted(8, ("MISC", 19.5), ("LED1", 20.5))))
    assert set(judged) == {"MISC"}
    assert judged["MISC"].crosstalk_mv is None


def test_slow_net_that_hears_a_fast_bus_is_a_warning() -> None:
    """By itself it is a note; with eight fast nets over its slot it says why it is more."""
    bus = [(f"X{bit}", 17 + 0.5 * bit) for bit in range(8)]
    alone = _by_net(_judged(_slotted(8, ("I2C_SDA", 21.5))))["I2C_SDA"]
    beside = _by_net(_judged(_slotted(8, ("I2C_SDA", 21.5), *bus)))["I2C_SDA"]
    assert (alone.level, beside.level) == ("note", "warning")
    assert beside.crosstalk_mv is not None
    assert f"{beside.crosstalk_mv:.0f} mV come from the other nets over the gap" in beside.reason


def test_legs_of_a_pair_nearly_cancel_for_others() -> None:
    """They switch against each other: what a third net hears is the difference."""
    made = _slotted(8, ("MISC", 18.0), ("A_P", 21.0), ("A_N", 21.4))
    numbers = {net.name: net.number for net in made.nets}
    pair = Pair((numbers["A_P"], numbers["A_N"]), "name", 0.4, 50.0, coupled=True)
    single, paired = _by_net(_judged(made)), _by_net(_judged(made, pairs=(pair,)))
    assert single["MISC"].crosstalk_mv is not None
    assert paired["MISC"].crosstalk_mv is not None
    assert paired["MISC"].crosstalk_mv < 0.2 * single["MISC"].crosstalk_mv
    legs = [paired[name].crosstalk_mv or 0.0 for name in ("A_P", "A_N")]
    assert legs == pytest.approx([single["MISC"].crosstalk_mv / 2] * 2, rel=0.1)


def test_gap_long_for_the_edge_is_at_its_limit() -> None:
    """A slot of 36 mm under a 50 ps edge is a line, not an inductance; under 1 ns it is lumped."""
    made = _slotted(18, ("X", 20.0))
    fast = _by_net(_judged(made, "[nets]\nX = { rise_ns = 0.05 }"))["X"]
    slow = _by_net(_judged(made))["X"]
    assert (fast.capped, slow.capped) == (True, False)
    assert fast.noise_mv == pytest.approx(2 * 1650 * 45 / 145)
    assert slow.noise_mv is not None
    assert slow.noise_mv < 2 * 1650 * 45 / 145


def test_what_a_class_does_not_want_to_see_is_counted() -> None:
    """note_mv of a class: below it a place is one of a count, above it a finding."""
    made = _slotted(8, ("I2C_SDA", 20.0))
    found = _by_net(_judged(made))["I2C_SDA"]
    assert found.noise_mv is not None
    for note_mv, expected in ((found.noise_mv * 0.9, 1), (found.noise_mv * 1.1, 0)):
        judged = _judged(made, f"[class.i2c]\nnote_mv = {note_mv}")
        assert len(judged.findings) == expected
        counted = {count.what: count.number for count in judged.counts}
        below = counted.get("places with less noise than the note_mv of their class", 0)
        assert below == 1 - expected


def test_classes_may_be_strict_by_inductance() -> None:
    """error_nh makes an error of what is a note by its noise; a larger one does not."""
    made = _slotted(8, ("I2C_SDA", 20.0))
    assert _by_net(_judged(made))["I2C_SDA"].level == "note"
    for threshold_nh, level in ((1.0, "error"), (100.0, "note")):
        judged = _judged(made, f"[class.i2c]\nerror_nh = {threshold_nh}")
        assert _by_net(judged)["I2C_SDA"].level == level


def test_nets_at_crystals_are_clocks_and_at_connectors_are_not() -> None:
    """Where names say nothing; X is a crystal only if it has no more than four pins."""
    made = _slotted(8, ("Net-(Y1-Pad1)", 19.0), ("Net-(X2-Pad1)", 20.0), ("Net-(J1-Pad1)", 21.0))
    pins = [Pin(str(n), (2.0, 19.0 + n), n, n) for n in range(3)]
    parts = (
        Component("Y1", 1, (pins[0],), None, "netlist"),
        Component("X2", 1, (pins[1],) * 5, None, "netlist"),
        Component("J1", 1, (pins[2],), None, "netlist"),
    )
    known = know(replace(made, components=parts), shipped_rules())
    told = {net.name: known.drive_of(net.number).name for net in made.nets[:3]}
    assert sorted(told.values()) == ["clock", "default", "default"]
    assert told[made.nets[0].name] == "clock"
    assert known.known_by[0] == "component"


def _split() -> Board:
    """Two supplies beside each other, X over the split, pads of a part on the trace's side."""
    pads = tuple((net, shapely.box(x - 1, 22, x + 1, 24)) for net, x in (("+5V", 26), ("+3V3", 34)))
    supplies = (("+5V", shapely.box(0, 0, 29.8, 40)), ("+3V3", shapely.box(30.2, 0, 60, 40)))
    return board(
        Sheet(pads, (Line("X", ((2, 20), (58, 20))),)),
        Sheet(supplies),
        holes=(via(26, 23), via(34, 23)),
        outline=WHOLE,
    )


PLACED = '[[capacitor]]\nref = "C7"\npads_mm = [[26, 22.5], [34, 22.5]]\n'


def test_capacitor_that_the_rules_place_carries_the_return() -> None:
    """Without it the split has no way back; the pads stand on copper of the two supplies."""
    made = _split()
    bare = _by_net(_judged(made))["X"]
    own = read_rules(PLACED, "splitcheck.toml")
    bridged = _by_net(_judged(with_capacitors(made, own.placed, ())))["X"]
    assert bare.added_nh is None
    assert bridged.added_nh is not None
    assert ("capacitor", "+5V to +3V3") in [(one.kind, one.net) for one in bridged.bridges]


def test_part_that_the_rules_call_a_capacitor_is_one() -> None:
    """By its reference; a part of that name alone is not."""
    made = _split()
    own = read_rules(PLACED.replace("C7", "Z7"), "splitcheck.toml")
    placed = with_capacitors(made, own.placed, ())
    stranger = replace(placed, capacitors=())
    assert _by_net(_judged(stranger))["X"].added_nh is None
    named = with_capacitors(stranger, (), ("Z7",))
    assert _by_net(_judged(named))["X"].added_nh is not None


def test_net_that_the_rules_name_is_a_reference() -> None:
    """A small area of an unknown name is none by itself; named, it carries the return."""
    area = shapely.box(10, 18, 16, 22)
    lines = (Line("X", ((11, 20), (15, 20))), Line("PE", ((16, 19), (20, 19))))
    made = board(Sheet(lines=lines[:1]), Sheet((("PE", area),)), outline=WHOLE)
    pe = next(net.number for net in made.nets if net.name == "PE")
    assert scene(made).planes == {}
    named = replace(made, references=frozenset({pe}))
    assert [island.net_name for island in scene(named).planes[2].islands] == ["PE"]
