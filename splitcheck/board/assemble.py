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
from splitcheck.board.negative import looks_negative, turn_round
from splitcheck.board.nets import PlatedHole, join, name_nets
from splitcheck.board.parts import CopperLayer, parts_of
from splitcheck.board.stack import CopperEntry, Stack, default_build, from_entries, from_job
from splitcheck.copper.intake import Export
from splitcheck.errors import SplitcheckError

#: Below this share of plated holes on copper of two layers something was read wrongly.
LEAST_ON_COPPER = 0.95


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
    outline, outline_said = find_outline(export, drawn)
    drilling = read_drills(export, drawn, pad_places(drawn))
    layers, turned = _turn_negatives(export, read, drilling, outline, stack_file)
    stack = _stack(export, layers, stack_file)
    parts = parts_of(layers)
    holes, net_of = join(layers, parts, drilling.holes)
    nets, naming = name_nets(parts, net_of, {})
    board = Board(export.name, outline, stack, layers, parts, net_of, nets, holes)
    return Assembled(
        board,
        (
            *export.assumptions,
            *stack.assumptions,
            *turned,
            *outline_said,
            *drilling.assumptions,
            *_off_copper(holes),
        ),
        (
            *export.remarks,
            *(remark for layer in read for remark in layer.remarks),
            *drilling.remarks,
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
) -> tuple[Polygon | MultiPolygon, tuple[str, ...]]:
    """The board's outline, or the box of its copper as an assumption."""
    box = copper_box(layers)
    return box.buffer(0.2, join_style="mitre"), (
        "No outline was found: the box of all copper stands for it.",
    )


def _turn_negatives(
    export: Export,
    read: Sequence[ReadLayer],
    drilling: Drilling,
    outline: Polygon | MultiPolygon,
    stack_file: tuple[str, Sequence[CopperEntry]] | None,
) -> tuple[tuple[CopperLayer, ...], tuple[str, ...]]:
    """Turn negative images round, by the stack file, by what the files say, or by what they show."""
    stated = {file.copper_number: file.negative for file in export.copper()}
    layers, said = [], []
    for number, found in enumerate(read, start=1):
        layer = found.layer
        wanted = stack_file[1][number - 1].negative if _fits(stack_file, len(read)) else None
        if wanted is None:
            wanted = stated.get(number)
        if wanted is None and found.negative:
            wanted = True
        if wanted is None and looks_negative(layer, len(read), outline, drilling.holes):
            wanted = True
            said.append(
                f"{layer.file} was taken as a negative image (what it draws is clearance): as "
                "copper it would join no two plated holes. Set polarity in --stack FILE.toml "
                "if that is wrong."
            )
        layers.append(turn_round(layer, outline) if wanted else layer)
    return tuple(layers), tuple(said)


def _fits(stack_file: tuple[str, Sequence[CopperEntry]] | None, count: int) -> bool:
    return stack_file is not None and len(stack_file[1]) == count


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
    stack = default_build(names, thickness)
    return replace(stack)


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
    return (
        f"Only {good} of {count} plated holes land on copper of two layers: the drill file may "
        "have another origin or belong to another board, and ways over other layers are missing.",
    )
