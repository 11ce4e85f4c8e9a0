"""Everything read, put together: outline, polarity, stack, plated holes, nets and names."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import shapely
from shapely import MultiPolygon, Polygon

from splitcheck.board.board import Board
from splitcheck.board.drills import Drilling, read_drills
from splitcheck.board.layers import ReadLayer, copper_box, pad_places
from splitcheck.board.listed import listed_names
from splitcheck.board.negative import looks_negative, turn_round
from splitcheck.board.nets import PlatedHole, join, name_nets
from splitcheck.board.parts import CopperLayer, parts_of
from splitcheck.board.populate import populate
from splitcheck.board.stack import CopperEntry, Stack, default_build, from_entries, from_job
from splitcheck.copper import gerber
from splitcheck.copper.intake import Export
from splitcheck.copper.outline import outline
from splitcheck.errors import SplitcheckError

#: Below this share of plated holes on copper of two layers something was read wrongly.
LEAST_ON_COPPER = 0.95
#: How far a board without an outline is taken to reach beyond its copper, mm.
MARGIN_MM = 0.2


@dataclass(frozen=True, slots=True)
class Assembled:
    """The board, and what is to be said of how it was put together."""

    board: Board
    assumptions: tuple[str, ...]
    remarks: tuple[str, ...]
    facts: tuple[str, ...]


def assemble(
    export: Export,
    read: Sequence[ReadLayer],
    stack_file: tuple[str, Sequence[CopperEntry]] | None,
) -> Assembled:
    """Put the board together.

    Parameters
    ----------
    export
        The files.
    read
        Copper layers as drawn, top to bottom.
    stack_file
        Name and entries of a stack file, if one was given.

    Raises
    ------
    SplitcheckError
        If the layers do not lie over one another or hold no copper.
    """
    drawn = tuple(layer.layer for layer in read)
    _check_overlap(drawn)
    edge, edge_said, edge_remarks = find_outline(export, drawn)
    pads = pad_places(drawn)
    drilling = read_drills(export, drawn, pads)
    layers, turned = _turn_negatives(export, read, drilling, edge, stack_file)
    layers, outside = _inside(layers, edge)
    stack = _stack(export, layers, stack_file)
    parts = parts_of(layers)
    holes, net_of = join(layers, parts, drilling.holes)
    listed = listed_names(export, layers, pads, drilling.holes)
    nets, naming = name_nets(parts, net_of, listed.names)
    populated = populate(export, layers, net_of, drilling.holes, listed.pins, edge.bounds[:2])
    board = Board(
        export.name, edge, stack, layers, parts, net_of, nets, holes, populated.components
    )
    return Assembled(
        board,
        (
            *export.assumptions,
            *stack.assumptions,
            *turned,
            *edge_said,
            *drilling.assumptions,
            *listed.assumptions,
            *populated.assumptions,
            *_off_copper(holes),
        ),
        (
            *export.remarks,
            *(remark for layer in read for remark in layer.remarks),
            *edge_remarks,
            *outside,
            *drilling.remarks,
            *listed.remarks,
            *populated.remarks,
            *naming,
        ),
        (f"Layer spacing: {stack.origin}", *drilling.facts, *_on_copper(holes)),
    )


def _check_overlap(layers: Sequence[CopperLayer]) -> None:
    """Refuse layers that lie beside one another: they were exported with different origins."""
    boxes = {
        layer.file: shapely.box(*shapely.total_bounds(np.array(layer.pieces, dtype=object)))
        for layer in layers
        if layer.pieces
    }
    if not boxes:
        raise SplitcheckError("copper", "no layer draws any copper", "export the copper layers")
    first, first_box = max(boxes.items(), key=lambda item: item[1].area)
    for file, box in boxes.items():
        shared = box.intersection(first_box).area
        if shared < 0.2 * box.area and shared < 0.2 * first_box.area:
            raise SplitcheckError(
                file,
                f"lies at {_span(box)} but {first} lies at {_span(first_box)}: "
                "the layers do not lie over one another",
                "export all layers with the same origin",
            )


def _span(box: Polygon) -> str:
    x0, y0, x1, y1 = box.bounds
    return f"x {x0:.1f} to {x1:.1f}, y {y0:.1f} to {y1:.1f} mm"


def find_outline(
    export: Export, layers: tuple[CopperLayer, ...]
) -> tuple[Polygon | MultiPolygon, tuple[str, ...], tuple[str, ...]]:
    """The board's outline, or the box of its copper as an assumption.

    Returns
    -------
    The outline, assumptions, and remarks.
    """
    box = copper_box(layers)
    remarks: list[str] = []
    for file in export.of_kind("profile"):
        drawing = gerber.read(file.text, file.name)
        copper = [piece for layer in layers for piece in layer.pieces]
        found = outline(drawing, box.bounds, copper)
        remarks.extend((*drawing.remarks, *found.remarks))
        if found.shape is not None:
            return found.shape, (), tuple(remarks)
    said = (
        f"No outline was found: the box of all copper, {MARGIN_MM} mm wider, stands for the "
        "board; gaps that reach its edge depend on it."
    )
    return box.buffer(MARGIN_MM, join_style="mitre"), (said,), tuple(remarks)


def _inside(
    layers: tuple[CopperLayer, ...], board: Polygon | MultiPolygon
) -> tuple[tuple[CopperLayer, ...], tuple[str, ...]]:
    """Leave out copper that lies wholly outside the board: frames, titles, coupons."""
    kept, remarks = [], []
    shapely.prepare(board)
    for layer in layers:
        inside = shapely.intersects(board, np.array(layer.pieces, dtype=object))
        if bool(inside.all()):
            kept.append(layer)
            continue
        remarks.append(
            f"{layer.file}: {int((~inside).sum())} pieces of copper lie outside the board and "
            "are left out"
        )
        kept.append(_only(layer, np.flatnonzero(inside).tolist()))
    return tuple(kept), tuple(remarks)


def _only(layer: CopperLayer, pieces: list[int]) -> CopperLayer:
    new = {old: number for number, old in enumerate(pieces)}
    return replace(
        layer,
        pieces=tuple(layer.pieces[i] for i in pieces),
        names=tuple(layer.names[i] for i in pieces),
        lines=tuple(
            line._replace(piece=new[line.piece]) for line in layer.lines if line.piece in new
        ),
    )


def _turn_negatives(
    export: Export,
    read: Sequence[ReadLayer],
    drilling: Drilling,
    board: Polygon | MultiPolygon,
    stack_file: tuple[str, Sequence[CopperEntry]] | None,
) -> tuple[tuple[CopperLayer, ...], tuple[str, ...]]:
    """Turn negative images round: by the stack file, what the files say, or what they show."""
    stated = {file.copper_number: file.negative for file in export.copper()}
    layers, said = [], []
    for number, found in enumerate(read, start=1):
        layer = found.layer
        wanted = None
        if stack_file is not None and len(stack_file[1]) == len(read):
            wanted = stack_file[1][number - 1].negative
        if wanted is None:
            wanted = stated.get(number)
        if wanted is None and found.negative:
            wanted = True
        if wanted is None and looks_negative(layer, len(read), board, drilling.holes):
            wanted = True
            said.append(
                f"{layer.file} was taken as a negative image (what it draws is clearance): as "
                "copper it would join no two plated holes. Set polarity in --stack FILE.toml "
                "if that is wrong."
            )
        layers.append(turn_round(layer, board) if wanted else layer)
    return tuple(layers), tuple(said)


def _stack(
    export: Export,
    layers: Sequence[CopperLayer],
    stack_file: tuple[str, Sequence[CopperEntry]] | None,
) -> Stack:
    names = [layer.name for layer in layers]
    if stack_file is not None:
        return from_entries(stack_file[1], names, stack_file[0])
    if export.job is not None:
        stack = from_job(export.job, names)
        if stack is not None:
            return stack
    thickness = export.job.thickness_mm if export.job is not None else None
    return default_build(names, thickness)


def _share_on_copper(holes: Sequence[PlatedHole]) -> tuple[int, int]:
    return sum(1 for hole in holes if len(set(hole.layers)) >= 2), len(holes)


def _on_copper(holes: Sequence[PlatedHole]) -> tuple[str, ...]:
    good, count = _share_on_copper(holes)
    if not count:
        return ()
    share = 100 * good / count
    return (f"{good} of {count} plated holes land on copper of two layers or more ({share:.1f} %)",)


def _off_copper(holes: Sequence[PlatedHole]) -> tuple[str, ...]:
    good, count = _share_on_copper(holes)
    if not count or good >= LEAST_ON_COPPER * count:
        return ()
    said = (
        f"Only {good} of {count} plated holes land on copper of two layers: the drill file may "
        "have another origin or belong to another board, and ways over other layers are missing."
    )
    return (said,)
