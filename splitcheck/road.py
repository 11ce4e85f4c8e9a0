"""The table of contents: from a folder of exported files to a ranked report, one call a stage."""

from __future__ import annotations

import gc
import multiprocessing
import os
import shutil
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, replace
from datetime import date
from functools import partial
from hashlib import sha256
from pathlib import Path
from time import perf_counter
from typing import Any, TypeAlias

from splitcheck.board.assemble import Assembled, assemble
from splitcheck.board.board import Board
from splitcheck.board.layers import CopperFile, ReadLayer, read_layer
from splitcheck.board.pairs import Pair, find_pairs
from splitcheck.board.stack import read_stack_file
from splitcheck.copper.intake import Export, open_export
from splitcheck.errors import SplitcheckError
from splitcheck.loops.beside import find_beside
from splitcheck.loops.bridges import IslandGraph, all_parts, join_islands
from splitcheck.loops.terrain import Terrain
from splitcheck.planes.changes import find_changes
from splitcheck.planes.crossings import BareTrace, Crossing, find_crossings, judged_nets
from splitcheck.planes.edges import find_edge_runs
from splitcheck.planes.islands import Plane, find_planes, reference_nets
from splitcheck.planes.tracks import Tracks, lay_all
from splitcheck.report.tally import worst_ids
from splitcheck.verdict.beside import LEAST_BESIDE_NH
from splitcheck.verdict.classes import Known, know
from splitcheck.verdict.findings import InputRow, Report
from splitcheck.verdict.judge import judge
from splitcheck.verdict.mend import mend as proposals
from splitcheck.verdict.packs import rules_of, shipped_files, shipped_rules
from splitcheck.verdict.pictures import draw
from splitcheck.verdict.placed import with_capacitors
from splitcheck.verdict.rulesfile import RULES_FILE, read_rules
from splitcheck.verdict.scene import Judged, Scene
from splitcheck.verdict.summary import Seen, summarise
from splitcheck.verdict.supplies import supply_findings
from splitcheck.verdict.tomltext import LARGEST_BYTES
from splitcheck.verdict.views import Pictures
from splitcheck.verdict.waivers import waive

Progress: TypeAlias = Callable[[str, int, int], None]

#: Gaps whose worst finding is mended for a page.
MENDED = 3
#: Less text than this is read faster by one process than by several.
ALONE_BYTES = 400_000
#: Fewer items than this are worked off faster by one process.
FEW_ITEMS = 24
#: More items than this are not handed to a process at once: the last ones would be waited for.
MOST_AT_ONCE = 8


@dataclass(frozen=True, slots=True)
class Options:
    """What the user asked for."""

    nets: tuple[str, ...] = ()
    """Patterns of net names to judge; empty: all."""
    layers: tuple[str, ...] = ()
    """Names of layers whose traces are judged; empty: all."""
    min_nh: float = 0.05
    """Crossings that add less are counted, not listed."""
    stack: Path | None = None
    jobs: int | None = None
    """Processes that read files; None: one a core."""
    rules: Path | None = None
    """The board's own rules; None: its ``splitcheck.toml``, if there is one."""
    today: date | None = None
    """The day it is, for waivers that end; None: they hold."""


@dataclass(frozen=True, slots=True)
class Walked:
    """A board at the end of the road: the report and what it was made from."""

    report: Report
    seen: Seen
    scene: Scene
    judged: Judged


def rank(path: Path, options: Options, progress: Progress | None = None) -> Report:
    """Rank the broken return paths of a board, worst first.

    Parameters
    ----------
    path
        Folder, .zip or job file of an export.
    options
        What to judge.
    progress
        Called with a stage, how much of it is done, and how much there is.

    Raises
    ------
    SplitcheckError
        If the input cannot be read or judged.
    """
    return look(path, options, progress).report


def look(path: Path, options: Options, progress: Progress | None = None) -> Walked:
    """Rank as ``rank`` does, and keep what lies behind the report: for pictures and for mending."""
    with _uncollected():
        return _walk(path, options, progress, judging=True)


def picture(walked: Walked, options: Options, only: Sequence[str] | None = None) -> Pictures:
    """Draw a board that was looked at: its map, and the worst findings or `only` some."""
    with _uncollected():
        seen = walked.seen
        spread = Spread(options.jobs, few=2)
        return draw(walked.scene, seen.planes, seen.tracks, walked.judged, spread, only=only)


def illustrate(walked: Walked, options: Options) -> tuple[Report, Pictures]:
    """All that a page about a board shows: its report, with proposals for the worst, and pictures.

    Proposals are looked for where they are read first: at the worst finding of the worst gaps.
    """
    return mend(walked, worst_ids(walked.report, MENDED)), picture(walked, options)


def mend(walked: Walked, ids: Iterable[str]) -> Report:
    """The report of a board that was looked at, with what would mend some findings of it."""
    with _uncollected():
        return proposals(walked.report, walked.seen.tracks, walked.scene, walked.judged, tuple(ids))


def read(path: Path, options: Options, progress: Progress | None = None) -> Report:
    """Say how the files of a board were understood; the report has no findings."""
    with _uncollected():
        return _walk(path, options, progress, judging=False).report


@contextmanager
def _uncollected() -> Iterator[None]:
    """Do without the search for cycles meanwhile: marks and findings hold none, and are many."""
    enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if enabled:
            gc.enable()


def _walk(path: Path, options: Options, progress: Progress | None, *, judging: bool) -> Walked:
    clock = Clock(progress or (lambda stage, done, total: None))
    with clock.stage("files"):
        export = load(path, options)
    with clock.stage("copper"):
        layers = read_copper(export, options.jobs, clock)
    with clock.stage("board"):
        assembled = build(export, layers, options)
        known = know_rules(path, assembled.board, options)
        board = with_capacitors(assembled.board, known.placed, known.rules.capacitors)
        board = replace(board, references=known.references)
        assembled = replace(assembled, board=board)
    with clock.stage("planes"):
        planes = find_planes(assembled.board)
        tracks = lay_tracks(assembled, options)
        graph = join_islands(assembled.board, planes)
        scene = set_scene(assembled, planes, graph, options, known)
        scene = replace(scene, pairs=pair_up(scene, tracks))
    judged = Judged((), (), {})
    if judging:
        with clock.stage("crossings"):
            crossings, bare = cross(tracks, planes, Spread(options.jobs, few=2))
            crossings += pass_by(tracks, planes, scene, Spread(options.jobs, few=2))
            changes = find_changes(assembled.board, planes, tracks)
            near = (scene.rules.edge_heights, scene.rules.edge_mm)
            edges = find_edge_runs(assembled.board, planes, tracks, *near)
        with clock.stage("loops"):
            by_rules, counts = supply_findings(scene, tracks)
            spread = Spread(options.jobs)
            judged = judge(
                scene, crossings, bare, spread, changes=changes, edges=edges, by_rules=by_rules
            )
            findings, waivers = waive(judged.findings, known.rules.waivers, options.today)
            counts = (*judged.counts, *counts)
            judged = replace(judged, findings=findings, counts=counts, waivers=waivers)
    seen = Seen(export, assembled, planes, tracks, scene.pairs, tuple(all_parts(graph)), known)
    return Walked(summarise(seen, judged, clock.seconds()), seen, scene, judged)


class Clock:
    """Wall time of each stage, and the progress told to whoever listens."""

    def __init__(self, tell: Progress) -> None:
        self.tell = tell
        self._stages: list[tuple[str, float]] = []

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        """Time a stage and tell of it as it starts and ends."""
        self.tell(name, 0, 1)
        start = perf_counter()
        yield
        self._stages.append((name, perf_counter() - start))
        self.tell(name, 1, 1)

    def seconds(self) -> tuple[tuple[str, float], ...]:
        """Stages with their seconds."""
        return tuple(self._stages)


def load(path: Path, options: Options) -> Export:
    """Find out what each file is; a stack file may say which file is which layer."""
    named = None
    if options.stack is not None:
        entries = read_stack_file(_text(options.stack), options.stack.name)
        files = [(number, entry.file) for number, entry in enumerate(entries, start=1)]
        named = [(number, file) for number, file in files if file is not None] or None
    export = open_export(path, layers=named)
    if len(export.copper()) < 2:
        only = export.copper()[0].name
        raise SplitcheckError(
            str(path),
            f"holds one copper layer only ({only}), so no trace has a plane over or under it",
            "export all copper layers",
        )
    return export


def _text(path: Path) -> str:
    try:
        return path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise SplitcheckError(str(path), f"cannot be read: {error}", "give a text file") from error


def read_copper(export: Export, jobs: int | None, clock: Clock) -> tuple[ReadLayer, ...]:
    """Read the copper layers, several at a time where that is faster; top to bottom."""
    files = [
        CopperFile(file.copper_number or 0, file.layer_name, file.name, file.text)
        for file in export.copper()
    ]
    workers = min(jobs or os.cpu_count() or 1, len(files))
    done: list[ReadLayer] = []
    if workers < 2 or sum(len(file.text) for file in files) < ALONE_BYTES:
        for file in files:
            done.append(read_layer(file))
            clock.tell("copper", len(done), len(files))
        return tuple(done)
    largest_first = sorted(files, key=lambda file: -len(file.text))
    with ProcessPoolExecutor(workers, mp_context=_processes()) as pool:
        for result in pool.map(read_layer, largest_first):
            done.append(result)
            clock.tell("copper", len(done), len(files))
    return tuple(sorted(done, key=lambda result: result.layer.number))


def _processes() -> multiprocessing.context.BaseContext:
    """Forked workers start without importing everything again; not every system has them."""
    forked = "fork" in multiprocessing.get_all_start_methods()
    return multiprocessing.get_context("fork" if forked else "spawn")


#: What the workers of ``Spread`` call; they inherit it when they are forked.
_work: Callable[[Any], Any] | None = None


class Spread:
    """Calls a function on many items, on several cores where that is faster; results in order."""

    def __init__(self, jobs: int | None, few: int = FEW_ITEMS) -> None:
        self.jobs = jobs or os.cpu_count() or 1
        self.few = few

    def __call__(self, work: Callable[[Any], Any], items: Iterable[Any]) -> Iterable[Any]:
        """Results in the order of the items."""
        listed = list(items)
        forked = "fork" in multiprocessing.get_all_start_methods()
        if self.jobs < 2 or len(listed) < self.few or not forked:
            return [work(item) for item in listed]
        global _work  # noqa: PLW0603  # forked workers inherit it; sending it would cost more than the work
        _work = work
        try:
            with ProcessPoolExecutor(self.jobs, mp_context=_processes()) as pool:
                size = max(1, min(MOST_AT_ONCE, len(listed) // (8 * self.jobs)))
                return list(pool.map(_worked, listed, chunksize=size))
        finally:
            _work = None


def _worked(item: Any) -> Any:
    assert _work is not None
    return _work(item)


def build(export: Export, layers: Sequence[ReadLayer], options: Options) -> Assembled:
    """Put the board together: stack, outline, holes, nets and their names."""
    entries = None
    if options.stack is not None:
        entries = (options.stack.name, read_stack_file(_text(options.stack), options.stack.name))
    return assemble(export, layers, entries)


def lay_tracks(assembled: Assembled, options: Options) -> tuple[Tracks, ...]:
    """Lay out the traces that are judged, layer by layer."""
    carriers = reference_nets(assembled.board)
    nets = judged_nets(assembled.board, carriers, options.nets)
    return lay_all(assembled.board, nets, options.layers)


def cross(
    tracks: Sequence[Tracks], planes: Sequence[Plane], spread: Spread
) -> tuple[tuple[Crossing, ...], tuple[BareTrace, ...]]:
    """Walk all traces over all planes, layer by layer."""
    found = list(spread(partial(_cross_layer, tracks, planes), range(len(tracks))))
    return (
        tuple(crossing for crossings, _ in found for crossing in crossings),
        tuple(trace for _, bare in found for trace in bare),
    )


def _cross_layer(
    tracks: Sequence[Tracks], planes: Sequence[Plane], number: int
) -> tuple[tuple[Crossing, ...], tuple[BareTrace, ...]]:
    return find_crossings(tracks[number], planes)


def pass_by(
    tracks: Sequence[Tracks], planes: Sequence[Plane], scene: Scene, spread: Spread
) -> tuple[Crossing, ...]:
    """Find the gaps that traces pass by, layer by layer."""
    least = max(scene.min_nh, LEAST_BESIDE_NH)
    height = scene.board.stack.height_mm
    found = list(spread(partial(_pass_by_layer, tracks, planes, height, least), range(len(tracks))))
    return tuple(place for places in found for place in places)


def _pass_by_layer(
    tracks: Sequence[Tracks],
    planes: Sequence[Plane],
    height_mm: Callable[[int, int], float],
    least_nh: float,
    number: int,
) -> tuple[Crossing, ...]:
    return find_beside(tracks[number], planes, height_mm, least_nh)


def know_rules(path: Path, board: Board, options: Options) -> Known:
    """Find the rules, and what they make of the nets of a board.

    The board's own file is the one that the options name; else the ``splitcheck.toml`` in the
    folder of the export, or in the current directory. One inside an archive is not asked: what is
    judged does not waive itself.
    """
    found = _rules_file(path, options)
    if found is None:
        return know(board, shipped_rules())
    file, where = found
    if file.is_file() and file.stat().st_size > LARGEST_BYTES:
        wrong = f"has more than {LARGEST_BYTES} bytes"
        raise SplitcheckError(str(file), wrong, "a file of rules has some hundred lines")
    text = _text(file)
    own = read_rules(text, file.name)
    row = InputRow(file.name, "rules", sha256(text.encode()).hexdigest(), where)
    return replace(know(board, rules_of(shipped_files(), own), own), file=row)


def _rules_file(path: Path, options: Options) -> tuple[Path, str] | None:
    """The board's own rules, and where they were found, in words."""
    if options.rules is not None:
        return options.rules, "named by --rules"
    folder = path if path.is_dir() else path.parent
    for place, words in (
        (folder, "found in the folder of the export"),
        (Path(), "found in the current directory"),
    ):
        if (place / RULES_FILE).is_file():
            return place / RULES_FILE, words
    return None


def set_scene(
    assembled: Assembled,
    planes: Sequence[Plane],
    graph: IslandGraph,
    options: Options,
    known: Known | None = None,
) -> Scene:
    """Bring together what judging needs."""
    known = known or know(assembled.board, shipped_rules())
    return Scene(
        assembled.board,
        {plane.layer: plane for plane in planes},
        {plane.layer: Terrain(plane) for plane in planes},
        graph,
        options.min_nh,
        known.rules,
        known.drives,
    )


def pair_up(scene: Scene, tracks: Sequence[Tracks]) -> tuple[Pair, ...]:
    """Find the differential pairs among the traces that are judged."""
    nets = {net for layer in tracks for net in layer.net.tolist()}
    return find_pairs(scene.board, nets, scene.rules.pairs)


def write_demo(folder: Path) -> Path:
    """Copy the demo board to a folder; it must not exist, be empty, or hold the demo already.

    Returns
    -------
    The folder with the board's files.
    """
    files = sorted((fixtures_folder() / "demo").iterdir())
    if folder.exists() and not folder.is_dir():
        raise SplitcheckError(str(folder), "exists and is not a folder", "name another one")
    strangers = {file.name for file in folder.iterdir()} if folder.exists() else set()
    strangers -= {file.name for file in files}
    if strangers:
        wrong = f"holds other files already ({min(strangers)})"
        raise SplitcheckError(str(folder), wrong, "name an empty or a new folder")
    folder.mkdir(parents=True, exist_ok=True)
    for file in files:
        shutil.copyfile(file, folder / file.name)
    return folder


def fixtures_folder() -> Path:
    """Where the demo boards are: in the installed package, or at the top of a checkout."""
    package = Path(__file__).resolve().parent
    for folder in (package / "_data" / "fixtures", package.parent / "fixtures"):
        if folder.is_dir():
            return folder
    raise SplitcheckError("fixtures", "the demo board is not installed", "install splitcheck again")
