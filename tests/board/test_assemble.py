"""A board put together from its files: polarity, holes, names from a netlist, what is assumed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from fixtures.making.plan import BoardPlan, Cut, Dielectric, Hole, Pad, Pour, Sheet, Trace, box
from fixtures.making.write import write_board
from splitcheck.board.assemble import Assembled
from splitcheck.errors import SplitcheckError
from splitcheck.road import Clock, Options, build, load, read_copper
from tests.making.boards import slotted_board, split_board


def _assembled(folder: Path, stack: Path | None = None) -> Assembled:
    options = Options(stack=stack, jobs=1)
    export = load(folder, options)
    return build(export, read_copper(export, 1, Clock(lambda *_: None)), options)


def _nets(found: Assembled) -> dict[str, int]:
    """Number of layers of every net that a file names."""
    board = found.board
    return {
        net.name: len({board.parts[i].layer for i in net.parts}) for net in board.nets if net.given
    }


def _grid_board() -> BoardPlan:
    """Four layers, ground on the second; twelve vias of ground, twelve of signals."""
    vias = [
        Hole((4.0 + 3 * i, y), net, component="J1", pin=f"{n}{i}")
        for n, (y, net) in enumerate(((6.0, "GND"), (14.0, None)))
        for i in range(12)
    ]
    vias = [v if v.net else v._replace(net=f"S{i}") for i, v in enumerate(vias)]
    return BoardPlan(
        name="grid",
        outline=box(0, 0, 42, 20),
        sheets=(Sheet("top"), Sheet("plane", "Plane"), Sheet("inner"), Sheet("bottom")),
        dielectrics=(Dielectric(0.2), Dielectric(0.8), Dielectric(0.2)),
        pours=(Pour(2, "GND", box(0.5, 0.5, 41.5, 19.5)),),
        holes=tuple(vias),
    )


def _negative(folder: Path, *, declared: bool) -> None:
    """Draw the plane's clearances instead of its copper."""
    path = next(folder.glob("*-plane.gbr"))
    lines = ["%FSLAX46Y46*%", "%MOMM*%", "%TF.FileFunction,Copper,L2,Inr,Plane*%"]
    if declared:
        lines.append("%TF.FilePolarity,Negative*%")
    lines += ["%ADD10C,1.000000*%", "%ADD11C,0.500000*%", "%LPD*%", "G01*", "D10*"]
    lines += [f"X{4000000 + 3000000 * i}Y14000000D03*" for i in range(12)]
    ring = ((250000, 250000), (41750000, 250000), (41750000, 19750000), (250000, 19750000))
    lines += ["D11*", "X250000Y250000D02*", *(f"X{x}Y{y}D01*" for x, y in (*ring, ring[0]))]
    path.write_text("\n".join([*lines, "M02*\n"]), encoding="ascii")


@pytest.mark.parametrize("declared", [True, False])
def test_negative_plane_becomes_what_its_positive_twin_is(
    tmp_path: Path, *, declared: bool
) -> None:
    """Same island, same joined holes, declared or shown; undeclared, that is an assumption."""
    write_board(_grid_board(), tmp_path / "positive")
    write_board(_grid_board(), tmp_path / "negative")
    _negative(tmp_path / "negative", declared=declared)
    if not declared:  # the job file would say that all layers are positive
        next((tmp_path / "negative").glob("*.gbrjob")).unlink()
    positive, negative = (_assembled(tmp_path / kind) for kind in ("positive", "negative"))
    plane, twin = (
        max(f.board.layers[1].pieces, key=lambda p: p.area) for f in (negative, positive)
    )
    assert plane.area == pytest.approx(twin.area, rel=0.005)
    assert _nets(negative)["GND"] == _nets(positive)["GND"] == 4
    assert _nets(negative).keys() == _nets(positive).keys()
    said = [text for text in negative.assumptions if "negative image" in text]
    assert len(said) == (0 if declared else 1)


def test_stack_file_decides_polarity_against_what_the_layer_shows(tmp_path: Path) -> None:
    """``polarity = "positive"`` keeps the clearances as copper."""
    write_board(_grid_board(), tmp_path / "board", job=False)
    _negative(tmp_path / "board", declared=False)
    tables = ['[[copper]]\nbelow_mm = 0.2\npolarity = "positive"\n'] * 3 + ["[[copper]]\n"]
    stack = tmp_path / "stack.toml"
    stack.write_text("".join(tables), encoding="utf-8")
    found = _assembled(tmp_path / "board", stack)
    assert len(found.board.layers[1].pieces) == 13
    assert found.board.stack.origin == "stack file stack.toml"


def test_whole_plane_is_not_taken_for_a_negative_one(tmp_path: Path) -> None:
    """A pour that joins the ground vias is positive without being asked."""
    write_board(_grid_board(), tmp_path, job=False)
    found = _assembled(tmp_path)
    assert not any("negative" in text for text in found.assumptions)
    assert _nets(found)["GND"] == 4


def _record(net: str, ref: str, pin: str, at: tuple[float, float], access: int) -> str:
    """One surface pad record of IPC-D-356 (fixed columns, 0.001 mm)."""
    x, y = (round(1000 * v) for v in at)
    return (
        f"327{net:<14}   {ref:<6}-{pin:<4}       A{access:02d}X{x:+07d}Y{y:+07d}X0800Y0800R000 S0"
    )


@pytest.mark.parametrize("moved", [(0.0, 0.0), (31.75, -12.7)])
def test_netlist_names_the_copper_where_its_points_lie(
    tmp_path: Path, moved: tuple[float, float]
) -> None:
    """Gerbers without a name, a netlist with another origin: the nets are named all the same."""
    plan = slotted_board()
    write_board(plan, tmp_path, attributes="none")
    records = [
        _record(
            pad.net or "",
            pad.component or "",
            pad.pin or "",
            (pad.at[0] + moved[0], pad.at[1] + moved[1]),
            1,
        )
        for pad in plan.pads
    ]
    lines = ["P  JOB slotted", "P  UNITS CUST 1", *records, "999"]
    (tmp_path / "slotted.ipc").write_text("\n".join(lines) + "\n", encoding="ascii")
    found = _assembled(tmp_path)
    assert sorted(_nets(found)) == ["CLK", "DATA", "EN"]


def test_netlist_of_another_board_names_nothing(tmp_path: Path) -> None:
    """Its points lie on nothing: no names, and an assumption says so."""
    write_board(slotted_board(), tmp_path, attributes="none")
    points = [(1.7 * n * n % 83, 2.3 * n * n % 61) for n in range(1, 40)]
    lines = [_record(f"N{n}", "U1", str(n), at, 1) for n, at in enumerate(points)]
    text = "\n".join(["P  UNITS CUST 1", *lines, "999\n"])
    (tmp_path / "other.ipc").write_text(text, encoding="ascii")
    found = _assembled(tmp_path)
    assert _nets(found) == {}
    assert any("no net names were taken" in text for text in found.assumptions)


def _without_drills(folder: Path) -> None:
    for path in folder.glob("*.drl"):
        path.unlink()


def test_without_a_drill_file_the_layers_are_joined_by_nothing(tmp_path: Path) -> None:
    """It is assumed and said first of all."""
    write_board(split_board(), tmp_path)
    _without_drills(tmp_path)
    found = _assembled(tmp_path)
    assert found.board.holes == ()
    assert any(text.startswith("There is no drill file") for text in found.assumptions)


def _moved(folder: Path, shift_mm: Callable[[int], float]) -> None:
    """Move each hole of the drill file along x."""
    path = next(folder.glob("*-PTH.drl"))
    lines = path.read_text(encoding="ascii").splitlines()
    for n, line in enumerate(lines):
        if line.startswith("X") and "." in line:
            x, y = line[1:].split("Y")
            lines[n] = f"X{float(x) + shift_mm(n):.3f}Y{y}"
    path.write_text("\n".join(lines) + "\n", encoding="ascii")


def test_drill_file_with_another_origin_is_moved_onto_the_pads(tmp_path: Path) -> None:
    """All holes 1.7 mm aside: found, and stated as an assumption."""
    write_board(_grid_board(), tmp_path)
    _moved(tmp_path, lambda _: 1.7)
    found = _assembled(tmp_path)
    assert any("moved by (-1.7, 0) mm" in text for text in found.assumptions)
    assert any("24 of 24 plated holes land" in text for text in found.facts)


def test_holes_off_their_copper_are_told(tmp_path: Path) -> None:
    """Each hole elsewhere by another distance: the share is a fact, its smallness assumed."""
    write_board(_grid_board(), tmp_path)
    _moved(tmp_path, lambda n: 0.9 + 0.037 * n * n % 1.2)
    found = _assembled(tmp_path)
    assert any("Only 0 of 24 plated holes land on copper" in text for text in found.assumptions)
    assert any("0 of 24 plated holes land" in text for text in found.facts)


@pytest.mark.parametrize("drilling", ["excellon", "xnc", "gerber"])
def test_all_holes_of_a_whole_board_land_on_copper(tmp_path: Path, drilling: str) -> None:
    """Every hole has pads on all four layers."""
    write_board(_grid_board(), tmp_path, drilling=drilling)  # type: ignore[arg-type]
    assert "24 of 24 plated holes land on copper of two layers or more (100.0 %)" in "\n".join(
        _assembled(tmp_path).facts
    )


def test_unplated_holes_join_nothing(tmp_path: Path) -> None:
    """A mounting hole through copper of two nets is no short."""
    plan = replace(
        slotted_board(),
        holes=(Hole((10.0, 25.0), None, 3.0, 0.0, 0.0, plated=False),),
    )
    write_board(plan, tmp_path)
    found = _assembled(tmp_path)
    assert found.board.holes == ()


def test_copper_outside_the_board_is_left_out(tmp_path: Path) -> None:
    """A title beside the board: told, and not a net."""
    plan = slotted_board()
    beside = Trace(1, None, ((50.0, 10.0), (60.0, 10.0)))
    write_board(replace(plan, traces=(*plan.traces, beside)), tmp_path)
    found = _assembled(tmp_path)
    assert all(net.given for net in found.board.nets)
    assert any("1 pieces of copper lie outside the board" in text for text in found.remarks)


def test_board_without_an_outline_is_the_box_of_its_copper(tmp_path: Path) -> None:
    """Stated as an assumption, since gaps that reach the edge depend on it."""
    write_board(slotted_board(), tmp_path, job=False)
    next(tmp_path.glob("*outline*")).unlink()
    found = _assembled(tmp_path)
    assert found.board.outline.bounds == pytest.approx((0.3, 0.3, 39.7, 29.7), abs=1e-3)
    assert any(text.startswith("No outline was found") for text in found.assumptions)


def _second_board_beside(folder: Path) -> None:
    """Move the bottom layer 100 mm aside."""
    path = next(folder.glob("*-bottom.gbr"))
    text = path.read_text(encoding="ascii")
    lines = [
        f"X{int(line[1:].split('Y')[0]) + 100_000_000}Y{line.split('Y')[1]}"
        if line.startswith("X")
        else line
        for line in text.splitlines()
    ]
    path.write_text("\n".join(lines) + "\n", encoding="ascii")


def test_layers_beside_one_another_are_refused(tmp_path: Path) -> None:
    """Both spans are in the message."""
    write_board(slotted_board(), tmp_path)
    _second_board_beside(tmp_path)
    with pytest.raises(SplitcheckError, match="do not lie over one another") as caught:
        _assembled(tmp_path)
    assert "x 100.5 to 139.5" in caught.value.wrong


def _swap(make: Callable[[], BoardPlan]) -> BoardPlan:
    plan = make()
    cut = Cut(2, ((20.0, 0.0), (20.0, 30.0)), 0.8)
    return replace(plan, cuts=(*plan.cuts, cut))


def test_plane_cut_through_falls_into_two_parts(tmp_path: Path) -> None:
    """One net that names both, in two pieces, as no hole joins them on another layer."""
    plan = _swap(slotted_board)
    plan = replace(plan, holes=(), pads=(*plan.pads, Pad(1, "GND", (2, 2), (1, 1), "C1", "1")))
    write_board(plan, tmp_path)
    found = _assembled(tmp_path)
    assert [net.name for net in found.board.nets].count("GND") == 3
    assert any("Net 'GND' lies in 3 pieces" in text for text in found.remarks)
