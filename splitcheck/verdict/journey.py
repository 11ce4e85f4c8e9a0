"""Journeys: for every net its stretches, reference planes, changes and findings, end to end."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from functools import partial
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from splitcheck.board.board import Board
from splitcheck.planes.carriers import Carried, Carrier, carried
from splitcheck.planes.courses import Course, courses
from splitcheck.planes.islands import Plane
from splitcheck.planes.tracks import Ints, Tracks
from splitcheck.units import Floats
from splitcheck.verdict.bare import OWN_END_MM
from splitcheck.verdict.findings import Finding, Leg, Point

#: Other planes over less than this are antipads and rims, not stretches, mm.
SHORT_MM = 1.0
#: No plane over less than this is an end at a net's own pads, as in what counts as a finding, mm.
SHORT_BARE_MM = OWN_END_MM
#: A finding is on a trace of its net this near to it, mm.
ON_TRACE_MM = 0.5
#: No more legs of one net are told.
MOST_LEGS = 100


@dataclass(frozen=True, slots=True)
class Journeys:
    """The journeys of a board's nets."""

    legs: dict[str, tuple[Leg, ...]]
    """By name of the net."""
    left_out: int
    """Legs beyond the most that are told of a net."""


class _Run(NamedTuple):
    """A part of a course on one layer over the same planes."""

    start_mm: float
    stop_mm: float
    layer: int
    carriers: tuple[Carrier, ...]


class _Spot(NamedTuple):
    """A finding on a course."""

    start_mm: float
    stop_mm: float
    finding: Finding


def journeys(
    board: Board, planes: Sequence[Plane], tracks: Sequence[Tracks], findings: Sequence[Finding]
) -> Journeys:
    """Tell the way of every net that is judged.

    Parameters
    ----------
    board, planes, tracks
        The board, its planes, and the traces that are judged.
    findings
        All findings, with their ids.

    Notes
    -----
    (1) A stretch goes on while the layer and the planes that carry the return stay the same; other
    planes for less than ``SHORT_MM``, and round a finding, do not end it.
    (2) A finding takes its length out of the stretch it lies in; of two at one place, one in each
    plane of a stripline, the second has what the first leaves, maybe nothing.
    (3) Where layer or planes change with no finding in between, there is a change.
    (4) A trace without any plane is bare. The bare part in which a finding "no-plane" has its
    place is that finding; others on the layer, for which it stands too, carry its id and add
    nothing more.
    """
    tables = [_table(layer, carried(board, planes, layer)) for layer in tracks]
    by_net: dict[str, list[Finding]] = defaultdict(list)
    for finding in findings:
        by_net[finding.net].append(finding)
    told: dict[str, list[Leg]] = defaultdict(list)
    grouped: dict[str, list[Course]] = defaultdict(list)
    for course in courses(board, tracks):
        grouped[board.nets[course.net].name].append(course)
    left_out = 0
    for name, own in sorted(grouped.items()):
        lines = [_Line(course, tables) for course in own]
        spots = _spots(board, lines, by_net[name])
        bare = tuple(finding for finding in by_net[name] if finding.kind == "no-plane")
        legs = [
            leg
            for line, on in zip(lines, spots, strict=True)
            for leg in _legs(board, line, on, bare)
        ]
        left_out += max(len(legs) - MOST_LEGS, 0)
        told[name] = legs[:MOST_LEGS]
    return Journeys({name: tuple(legs) for name, legs in told.items()}, left_out)


def sum_nh(findings: Sequence[Finding]) -> float | None:
    """What the findings of a net add, nH; None if one of them has no way back.

    Findings in both planes of a stripline each hold their plane's share already.
    """
    added = [finding.added_nh for finding in findings]
    known = [value for value in added if value is not None]
    return sum(known) if len(known) == len(added) else None


class _Table(NamedTuple):
    """Tracks and what carries their return, as lists: courses ask for single pieces."""

    layer: int
    ends: tuple[list[list[float]], list[list[float]]]
    """Where each piece starts, and where it ends."""
    length_mm: list[float]
    first: list[int]
    state: list[int]
    carriers: tuple[tuple[Carrier, ...], ...]


def _table(tracks: Tracks, way: Carried) -> _Table:
    return _Table(
        tracks.layer,
        (tracks.start.tolist(), tracks.end.tolist()),
        tracks.length_mm.tolist(),
        way.first.tolist(),
        way.state.tolist(),
        way.carriers,
    )


class _Line:
    """A course with a measure along it."""

    def __init__(self, course: Course, tables: Sequence[_Table]) -> None:
        self.layers = np.array([tables[step.tracks].layer for step in course.steps])
        starts, ends, states, marks = [], [], [], [0.0]
        self.carriers: list[tuple[Carrier, ...]] = []
        known: dict[tuple[Carrier, ...], int] = {}
        layers = []
        for number, piece, forward in course.steps:
            table = tables[number]
            starts.append(table.ends[0 if forward else 1][piece])
            ends.append(table.ends[1 if forward else 0][piece])
            looks = table.state[table.first[piece] : table.first[piece + 1]]
            each_mm = table.length_mm[piece] / len(looks)
            for state in looks if forward else looks[::-1]:
                states.append(known.setdefault(table.carriers[state], len(known)))
                layers.append(table.layer)
                marks.append(marks[-1] + each_mm)
        self.carriers = list(known)
        self.start, self.end = np.array(starts), np.array(ends)
        lengths = np.hypot(*(self.end - self.start).T)
        self.reached: Floats = np.concatenate([[0.0], np.cumsum(lengths)])
        self.marks: Floats = np.array(marks)
        self.state: Ints = np.array(states, dtype=np.intp)
        self.layer: Ints = np.array(layers, dtype=np.intp)

    def at(self, along_mm: float) -> Point:
        """The place so far along."""
        step = int(np.searchsorted(self.reached, along_mm, side="right")) - 1
        step = min(max(step, 0), len(self.start) - 1)
        length = float(self.reached[step + 1] - self.reached[step]) or 1.0
        part = min(max((along_mm - float(self.reached[step])) / length, 0.0), 1.0)
        x, y = self.start[step] + part * (self.end[step] - self.start[step])
        return round(float(x), 4), round(float(y), 4)

    def nearest(self, at: Point, layer: int) -> tuple[float, float]:
        """How near a place is on a layer, and how far along; mm."""
        step = self.end - self.start
        square = np.maximum((step**2).sum(axis=1), 1e-18)
        part = np.clip(((np.asarray(at) - self.start) * step).sum(axis=1) / square, 0.0, 1.0)
        off = np.hypot(*(self.start + part[:, None] * step - np.asarray(at)).T)
        off = np.where(self.layers == layer, off, off + 2 * ON_TRACE_MM)
        best = int(np.argmin(off))
        length = float(self.reached[best + 1] - self.reached[best])
        return float(off[best]), float(self.reached[best]) + float(part[best]) * length


def _spots(board: Board, lines: Sequence[_Line], findings: Sequence[Finding]) -> list[list[_Spot]]:
    """The findings of a net on its courses, in order along each."""
    numbers = {layer.name: layer.number for layer in board.stack.layers}
    found: list[list[_Spot]] = [[] for _ in lines]
    for finding in findings:
        near = [line.nearest(finding.at_mm, numbers.get(finding.layer, 0)) for line in lines]
        which = min(range(len(near)), key=lambda i: (round(near[i][0], 6), i))
        _, along = near[which]
        half = 0.0 if finding.kind in {"plane-change", "no-plane"} else finding.gap_mm / 2
        end = float(lines[which].marks[-1])
        found[which].append(_Spot(max(along - half, 0.0), min(along + half, end), finding))
    return [sorted(spots, key=lambda spot: (spot.start_mm, spot.finding.id)) for spots in found]


def _legs(board: Board, line: _Line, spots: Sequence[_Spot], bare: Sequence[Finding]) -> list[Leg]:
    """The legs of one course; `bare` are the findings of its net without any plane."""
    runs = _runs(line, spots)
    legs: list[Leg] = []
    broken = [spot for spot in spots if spot.finding.kind != "no-plane"]
    own = [spot for spot in spots if spot.finding.kind == "no-plane"]
    stretch = partial(_stretch, board, line, own, bare)
    here, at = 0, 0.0
    for number, run in enumerate(runs):
        if number and _changes(runs[number - 1], run, broken):
            legs.append(_leg(board, line, "change", run, run.start_mm, run.start_mm))
        at = max(at, run.start_mm)
        last = number == len(runs) - 1
        while here < len(broken) and (broken[here].start_mm < run.stop_mm or last):
            spot = broken[here]
            legs.extend(stretch(run, at, spot.start_mm))
            at = max(at, spot.start_mm)
            length = max(spot.stop_mm - at, 0.0)
            legs.append(_finding_leg(spot.finding, length))
            at, here = at + length, here + 1
        legs.extend(stretch(run, at, run.stop_mm))
    return legs


def _changes(last: _Run, run: _Run, broken: Sequence[_Spot]) -> bool:
    """Whether a change of layer or planes is told between two runs."""
    if last.layer == run.layer and not (last.carriers and run.carriers):
        return False
    return not any(
        spot.start_mm - SHORT_MM <= run.start_mm <= spot.stop_mm + SHORT_MM for spot in broken
    )


def _stretch(
    board: Board,
    line: _Line,
    own: Sequence[_Spot],
    bare: Sequence[Finding],
    run: _Run,
    start: float,
    stop: float,
) -> Iterator[Leg]:
    """What of a run lies between two places, if anything."""
    if stop - start < 1e-6:
        return
    leg = _leg(board, line, "stretch" if run.carriers else "bare", run, start, stop)
    if not run.carriers:
        here = [s.finding for s in own if start - 1e-3 <= s.start_mm <= stop + 1e-3]
        told = [*here, *(finding for finding in bare if finding.layer == leg.layer)]
        added = here[0].added_nh if here else 0.0
        if told:
            leg = replace(leg, kind="finding", added_nh=added, finding=told[0].id)
    yield leg


def _leg(board: Board, line: _Line, kind: str, run: _Run, start: float, stop: float) -> Leg:
    layers = board.stack.layers
    return Leg(
        kind=kind,  # type: ignore[arg-type]  # one of the words of Leg, from this module alone
        layer=layers[run.layer - 1].name,
        plane_layers=tuple(layers[carrier.layer - 1].name for carrier in run.carriers),
        plane_nets=tuple(board.nets[carrier.net].name for carrier in run.carriers),
        length_mm=stop - start,
        at_mm=line.at(start),
        added_nh=0.0,
        finding=None,
    )


def _finding_leg(finding: Finding, length_mm: float) -> Leg:
    return Leg(
        kind="finding",
        layer=finding.layer,
        plane_layers=(finding.plane_layer,) if finding.plane_layer else (),
        plane_nets=(finding.plane_net,) if finding.plane_net else (),
        length_mm=length_mm,
        at_mm=finding.at_mm,
        added_nh=finding.added_nh,
        finding=finding.id,
    )


class _Raw(NamedTuple):
    """A run before weak ones are given away."""

    layer: int
    state: int
    start_mm: float
    stop_mm: float
    gives: int
    """0: it stands; 1: to what is before it; -1: to what is after it."""


def _runs(line: _Line, spots: Sequence[_Spot]) -> list[_Run]:
    """Parts of a course over the same planes; short ones and those at findings given away."""
    middles = (line.marks[:-1] + line.marks[1:]) / 2
    gives = np.zeros(len(middles), dtype=np.intp)
    for spot in spots:
        if spot.stop_mm > spot.start_mm:
            middle, half = (spot.start_mm + spot.stop_mm) / 2, (spot.stop_mm - spot.start_mm) / 2
            near = np.abs(middles - middle) < half + SHORT_MM / 2
            gives[near] = np.where(middles[near] < middle, 1, -1)
    key = np.stack([line.layer, np.where(gives != 0, -1, line.state), gives], axis=1)
    change = np.flatnonzero((key[1:] != key[:-1]).any(axis=1)) + 1
    edges = [0, *change.tolist(), len(key)]
    runs = []
    for first, last in pairwise(edges):
        start, stop, state = float(line.marks[first]), float(line.marks[last]), line.state[first]
        shortest = SHORT_MM if line.carriers[state] else SHORT_BARE_MM
        weak = int(gives[first]) or int(stop - start < shortest)
        runs.append(_Raw(int(line.layer[first]), int(state), start, stop, weak))
    return [
        _Run(run.start_mm, run.stop_mm, run.layer, line.carriers[run.state])
        for run in _merged(_given(runs))
    ]


def _given(runs: Sequence[_Raw]) -> list[_Raw]:
    """Weak runs take the planes of a strong neighbour on their layer, if there is one."""
    given = list(runs)
    there, back = range(len(given)), range(len(given) - 1, -1, -1)
    for order, takes in ((there, (1,)), (back, (-1,)), (there, (1, -1)), (back, (1, -1))):
        strong: _Raw | None = None
        for i in order:
            run = given[i]
            if strong is not None and strong.layer != run.layer:
                strong = None
            if run.gives == 0:
                strong = run
            elif strong is not None and run.gives in takes:
                given[i] = run._replace(state=strong.state, gives=0)
    return given


def _merged(runs: Sequence[_Raw]) -> list[_Raw]:
    merged: list[_Raw] = []
    for run in runs:
        if merged and merged[-1][:2] == run[:2]:
            merged[-1] = merged[-1]._replace(stop_mm=run.stop_mm)
        else:
            merged.append(run)
    return merged
