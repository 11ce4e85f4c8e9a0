"""The report: findings together with what was read, assumed and counted."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

from splitcheck.board.assemble import Assembled
from splitcheck.board.board import Board
from splitcheck.board.names import is_power
from splitcheck.board.pairs import Pair
from splitcheck.copper.intake import Export
from splitcheck.loops.bridges import PartBridge
from splitcheck.planes.islands import Plane, reference_nets
from splitcheck.planes.tracks import Tracks
from splitcheck.verdict.class_rows import (
    class_rows,
    class_sentences,
    exempt_counts,
    exempt_reason,
    rules_fact,
)
from splitcheck.verdict.classes import Known
from splitcheck.verdict.coupling import coupling_facts, coupling_unknown
from splitcheck.verdict.findings import (
    Count,
    Finding,
    InputRow,
    IslandRow,
    LayerRow,
    NetRow,
    Report,
    Role,
)
from splitcheck.verdict.journey import MOST_LEGS, Journeys, journeys, sum_nh
from splitcheck.verdict.pairs import pair_rows
from splitcheck.verdict.rules import PLAIN_RULES
from splitcheck.verdict.scene import Judged

#: What is known of nets where nobody asks.
PLAINLY_KNOWN = Known(PLAIN_RULES)
#: A layer is a plane from this share of the board on, a signal layer below the second, else mixed.
PLANE_SHARE = 0.6
SIGNAL_SHARE = 0.25


@dataclass(frozen=True, slots=True)
class Seen:
    """What the stages before judging have made."""

    export: Export
    assembled: Assembled
    planes: tuple[Plane, ...]
    tracks: tuple[Tracks, ...]
    pairs: tuple[Pair, ...] = ()
    parts: tuple[PartBridge, ...] = ()
    """Capacitors and links between islands."""
    known: Known = PLAINLY_KNOWN
    """The rules, and what they make of the nets."""


def summarise(
    seen: Seen,
    judged: Judged,
    seconds: tuple[tuple[str, float], ...],
) -> Report:
    """Bring everything into the report."""
    board = seen.assembled.board
    x0, y0, x1, y1 = board.outline.bounds
    known = seen.known
    traced = {net for layer in seen.tracks for net in layer.net.tolist()}
    ways = journeys(board, seen.planes, seen.tracks, judged.findings)
    return Report(
        board=board.name,
        size_mm=(round(x1 - x0, 4), round(y1 - y0, 4)),
        layers=_layers(board, seen.planes),
        assumptions=(
            *_no_plane(seen.planes),
            *_no_names(board),
            *coupling_unknown(board, seen.planes),
            *seen.assembled.assumptions,
            *class_sentences(known, traced),
        ),
        remarks=seen.assembled.remarks,
        facts=(
            *_facts(board),
            rules_fact(known, board),
            *seen.assembled.facts,
            *coupling_facts(board, seen.parts),
        ),
        inputs=_inputs(seen),
        islands=tuple(
            IslandRow(
                island.id,
                board.stack.layers[island.layer - 1].name,
                island.net_name,
                round(island.shape.area, 4),
            )
            for plane in seen.planes
            for island in plane.islands
        ),
        nets=_nets(board, seen, judged.findings, ways),
        findings=judged.findings,
        counts=(*_exempt(board), *exempt_counts(known, traced), *judged.counts, *_not_told(ways)),
        seconds=seconds,
        corner_mm=(round(x0, 4), round(y0, 4)),
        pairs=pair_rows(board, seen.pairs),
        classes=class_rows(known, traced),
        waivers=judged.waivers,
    )


def _inputs(seen: Seen) -> tuple[InputRow, ...]:
    """The files of the export, and the board's own rules: once, if they lie among them."""
    files = [InputRow(file.name, file.kind, file.sha256, file.reason) for file in seen.export.files]
    rules = seen.known.file
    if rules is None:
        return tuple(files)
    others = [row for row in files if (row.file, row.sha256) != (rules.file, rules.sha256)]
    return (*others, rules)


def _no_plane(planes: Sequence[Plane]) -> tuple[str, ...]:
    if planes:
        return ()
    sentence = (
        "No layer has reference copper: no piece is both wide and large enough to be a plane, so "
        "every trace counts as one without a plane."
    )
    return (sentence,)


def _no_names(board: Board) -> tuple[str, ...]:
    if any(net.given for net in board.nets):
        return ()
    sentence = (
        "No file names the nets: copper was taken for a plane by its area and width alone, and "
        "every other net is judged as a signal; a netlist (IPC-D-356) or X2 attributes would tell."
    )
    return (sentence,)


def _layers(board: Board, planes: Sequence[Plane]) -> tuple[LayerRow, ...]:
    area: dict[int, float] = defaultdict(float)
    for plane in planes:
        area[plane.layer] = sum(island.shape.area for island in plane.islands)
    rows = []
    for layer, copper in zip(board.stack.layers, board.layers, strict=True):
        share = area[layer.number] / board.outline.area
        role: Role = "mixed"
        if share >= PLANE_SHARE:
            role = "plane" if len(copper.lines) < 0.2 * copper.marks else "mixed"
        elif share < SIGNAL_SHARE:
            role = "signal"
        rows.append(
            LayerRow(layer.name, copper.file, layer.number, layer.top_mm, layer.copper_um, role)
        )
    return tuple(rows)


def _facts(board: Board) -> tuple[str, ...]:
    given = sum(1 for net in board.nets if net.given)
    marks = sum(layer.marks for layer in board.layers)
    named = f"{len(board.nets)} nets, {given} of them named by the files"
    if given < len(board.nets):
        named += "; the others are called after a place on them, @L1(x,y): layer and mm"
    return (f"{marks} marks on {len(board.layers)} copper layers", named)


def _exempt(board: Board) -> tuple[Count, ...]:
    carriers = reference_nets(board)
    supplies = [net for net in board.nets if net.number not in carriers and is_power(net.name)]
    return (
        Count("nets that carry returns (ground and supply planes), not judged", len(carriers)),
        Count("nets that are supplies by name, not judged", len(supplies)),
    )


def _not_told(ways: Journeys) -> tuple[Count, ...]:
    if not ways.left_out:
        return ()
    what = f"legs of journeys left out, of nets with more than {MOST_LEGS}"
    return (Count(what, ways.left_out),)


def _nets(
    board: Board, seen: Seen, findings: Sequence[Finding], ways: Journeys
) -> tuple[NetRow, ...]:
    length: dict[str, float] = defaultdict(float)
    layers: dict[str, set[int]] = defaultdict(set)
    for layer in seen.tracks:
        for net, millimetres in zip(layer.net.tolist(), layer.length_mm.tolist(), strict=True):
            length[board.nets[net].name] += millimetres
            layers[board.nets[net].name].add(layer.layer)
    by_net: dict[str, list[Finding]] = defaultdict(list)
    for finding in findings:
        by_net[finding.net].append(finding)
    legs = [row.nets for row in pair_rows(board, seen.pairs)]
    partner = dict([*legs, *((other, one) for one, other in legs)])
    drives = {net.name: seen.known.drive_of(net.number) for net in board.nets}
    rows = []
    for name in sorted(length):
        found = by_net.get(name, [])
        added = [finding.added_nh for finding in found if finding.added_nh is not None]
        rows.append(
            NetRow(
                name,
                drives[name].name,
                round(length[name], 4),
                tuple(board.stack.layers[n - 1].name for n in sorted(layers[name])),
                len(found),
                max(added) if added else None,
                journey=ways.legs.get(name, ()),
                sum_nh=sum_nh(found),
                pair=partner.get(name),
                exempt=exempt_reason(drives[name]),
            )
        )
    return tuple(rows)
