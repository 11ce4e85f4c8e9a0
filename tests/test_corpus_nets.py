"""Nets of real boards against the names that their own files give."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from functools import cache
from pathlib import Path
from typing import NamedTuple

import networkx as nx
import numpy as np
import pytest
import shapely

from splitcheck.board.assemble import Assembled, assemble
from splitcheck.board.layers import pad_places
from splitcheck.board.traces import locate
from splitcheck.copper import gerber, netlist
from splitcheck.copper.intake import Export, open_export
from splitcheck.copper.marks import Flash, Mark, Stroke
from splitcheck.errors import SplitcheckError
from splitcheck.road import Clock, read_copper

#: Copper that a plated hole is drawn to touch, as share of all plated holes.
LEAST_ON_COPPER = 0.95

pytestmark = pytest.mark.slow


class RealBoard(NamedTuple):
    """One board of the corpus, put together."""

    export: Export
    assembled: Assembled


@cache
def _boards(corpus: Path) -> tuple[RealBoard, ...]:
    """Every board that can be read, whatever its names."""
    found = []
    for folder in sorted(path for path in corpus.iterdir() if path.is_dir()):
        try:
            export = open_export(folder)
        except SplitcheckError as error:
            # an export in the folder that lacks layers is refused; that is tested with intake
            if "no file is L" not in error.wrong:
                raise
            continue
        layers = read_copper(export, None, Clock(lambda stage, done, total: None))
        found.append(RealBoard(export, assemble(export, layers, None)))
    assert found
    return tuple(found)


def _named_by_attributes(corpus: Path) -> list[RealBoard]:
    return [
        board
        for board in _boards(corpus)
        if any(names for layer in board.assembled.board.layers for names in layer.names)
    ]


def _shapes(marks: Sequence[Mark]) -> list[shapely.Geometry]:
    """Every mark as a shape of its own, as if nothing were ever cleared."""
    shapes: list[shapely.Geometry] = []
    for mark in marks:
        if isinstance(mark, Stroke):
            shapes.append(shapely.LineString(mark.points).buffer(mark.width_mm / 2 + 1e-3))
        elif isinstance(mark, Flash):
            shapes.append(shapely.affinity.translate(mark.shape, *mark.at).buffer(1e-3))
        else:
            shapes.append(shapely.Polygon(mark.ring).buffer(1e-3))
    return shapes


def _dark_named(board: RealBoard) -> Iterator[tuple[int, list[Mark]]]:
    for number, file in enumerate(board.export.copper(), start=1):
        marks = gerber.read(file.text, file.name).marks
        yield number, [mark for mark in marks if mark.dark and mark.tag.net]


def test_no_piece_of_copper_carries_two_names_but_where_the_file_draws_a_tie(corpus: Path) -> None:
    """Names that meet do so through copper that the file puts on no net.

    Bridges etched as parts and printed antennas carry no net name; without them no two marks of
    different names touch anywhere on the layer.
    """
    boards = _named_by_attributes(corpus)
    assert len(boards) >= 3
    for board in boards:
        if not any("|" in net.name for net in board.assembled.board.nets):
            continue
        for number, marks in _dark_named(board):
            shapes = _shapes(marks)
            one, other = shapely.STRtree(shapes).query(shapes, predicate="intersects")
            met = {
                (marks[i].tag.net, marks[j].tag.net)
                for i, j in zip(one.tolist(), other.tolist(), strict=True)
                if marks[i].tag.net != marks[j].tag.net
            }
            assert met == set(), f"{board.export.name}, layer {number}"


def test_no_named_net_falls_apart_but_where_nothing_is_drawn_between(corpus: Path) -> None:
    """A net in several pieces is so in the file: its marks and its holes do not hang together.

    The marks are taken as drawn, nothing cleared, so copper lost in painting would show.
    """
    boards = _named_by_attributes(corpus)
    assert len(boards) >= 3
    for board in boards:
        made = board.assembled.board
        pieces: dict[str, int] = defaultdict(int)
        for net in made.nets:
            pieces[net.name] += net.given
        for name in sorted(name for name, count in pieces.items() if count > 1):
            assert _pieces_as_drawn(board, set(name.split("|"))) >= pieces[name], name


def _pieces_as_drawn(board: RealBoard, names: set[str]) -> int:
    graph: nx.Graph[tuple[str, int, int]] = nx.Graph()
    barrels = [
        shapely.LineString([hole.hole.path[0], hole.hole.path[-1]]).buffer(
            hole.hole.diameter_mm / 2
        )
        for hole in board.assembled.board.holes
    ]
    for number, marks in _dark_named(board):
        wanted = [mark for mark in marks if mark.tag.net in names]
        shapes = _shapes(wanted)
        graph.add_nodes_from(("mark", number, i) for i in range(len(shapes)))
        tree = shapely.STRtree(shapes)
        for kind, others in (("mark", shapes), ("hole", barrels)):
            first, hit = tree.query(others, predicate="intersects")
            for i, j in zip(first.tolist(), hit.tolist(), strict=True):
                key = (kind, number if kind == "mark" else 0, i)
                graph.add_edge(key, ("mark", number, j))
    return nx.number_connected_components(graph)


def test_every_name_in_the_files_names_a_net(corpus: Path) -> None:
    """No name of the attributes is lost on the way from marks to nets."""
    for board in _named_by_attributes(corpus):
        drawn = {mark.tag.net for _, marks in _dark_named(board) for mark in marks}
        given = {
            name for net in board.assembled.board.nets if net.given for name in net.name.split("|")
        }
        assert drawn - given == set(), board.export.name


def test_places_of_a_netlist_lie_on_the_net_that_it_names(corpus: Path) -> None:
    """Every pad and hole of an IPC-D-356 netlist: on copper, of that one net, and all in one."""
    boards = [board for board in _boards(corpus) if board.export.of_kind("netlist")]
    assert boards
    for board in boards:
        made = board.assembled.board
        pads, drilled = pad_places(made.layers), np.array([hole.at for hole in made.holes])
        last = sum(len(layer.pieces) for layer in made.layers[:-1])
        for file in board.export.of_kind("netlist"):
            listed = netlist.read(file.text, file.name)
            fit = netlist.align(listed, pads, drilled)
            numbers: dict[str, set[int]] = defaultdict(set)
            for layer, first, top in ((made.layers[0], 0, True), (made.layers[-1], last, False)):
                points = [p for p in listed.points if p.through or (p.access == 1) == top]
                xs = np.array([point.x_mm + fit.dx_mm for point in points])
                ys = np.array([point.y_mm + fit.dy_mm for point in points])
                under = locate(xs, ys, layer.pieces)
                assert (under >= 0).all(), board.export.name
                for point, piece in zip(points, under.tolist(), strict=True):
                    net = made.nets[made.net_of[first + piece]]
                    assert net.name == point.net if point.net else not net.given, point
                    numbers[point.net].add(net.number)
            apart = {name for name, found in numbers.items() if name and len(found) > 1}
            assert apart == set(), board.export.name


def test_plated_holes_lie_on_copper_of_two_layers(corpus: Path) -> None:
    """A drill file in another scale or place would miss the copper of most layers."""
    for board in _boards(corpus):
        holes = board.assembled.board.holes
        good = sum(len(set(hole.layers)) >= 2 for hole in holes)
        assert good > LEAST_ON_COPPER * len(holes) > 0, board.export.name
