"""From a folder, .zip or job file to what each file is: copper in order, drill, outline."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from hashlib import sha256
from pathlib import Path

from splitcheck.copper import archive, jobfile, naming, ordering, sniff
from splitcheck.copper.jobfile import Job
from splitcheck.copper.judging import Judged, Read, judge
from splitcheck.copper.naming import Claim, Kind
from splitcheck.errors import SplitcheckError

_NO_COPPER_DO = "give the folder, .zip or .gbrjob of the exported Gerber files"
_SPAN_NAME = re.compile(r"[-_ ](?:L)?(\d{1,2})[-_](?:L)?(\d{1,2})$", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class InputFile:
    """One file of the export and what it was taken for."""

    name: str
    """Path inside the folder or archive."""
    text: str
    """Whole text; empty for binary files that are not used."""
    sha256: str
    kind: Kind
    reason: str
    """Why it was taken for that, in one short sentence."""
    copper_number: int | None = None
    """Layer number of a copper file, 1 = top, after ordering."""
    layer_name: str = ""
    negative: bool | None = None
    """Whether the image is stated to be negative; ``None``: not stated."""
    plated: bool | None = None
    """Whether the holes of a drill file are plated; ``None``: not stated or mixed."""
    span: tuple[int, int] | None = None
    """First and last copper layer that a drill file goes through, where stated."""


@dataclass(frozen=True, slots=True)
class Export:
    """All files of one export."""

    name: str
    files: tuple[InputFile, ...]
    """Sorted by name."""
    job: Job | None
    assumptions: tuple[str, ...]
    """What was assumed and changes results."""
    remarks: tuple[str, ...]
    """Oddities that change nothing."""

    def of_kind(self, kind: Kind) -> tuple[InputFile, ...]:
        """The files of one kind, sorted by name."""
        return tuple(f for f in self.files if f.kind == kind)

    def copper(self) -> tuple[InputFile, ...]:
        """The copper files from top to bottom."""
        return tuple(sorted(self.of_kind("copper"), key=lambda f: f.copper_number or 0))

    def drill_tools(self) -> dict[int, float]:
        """Diameters from a separate list of drill tools, mm, by tool number; often empty."""
        sizes: dict[int, float] = {}
        for file in self.of_kind("tools"):
            sizes |= sniff.tool_sizes(file.text)
        return sizes


def open_export(path: Path, *, layers: Sequence[tuple[int, str]] | None = None) -> Export:
    """Find out what each file of an export is.

    Parameters
    ----------
    path
        A folder (files may lie one folder deeper), a .zip, or a .gbrjob (then its folder).
    layers
        Copper layers as (number, file name), 1 = top; overrides what the files say.

    Returns
    -------
    All files with their kind and the reason; copper files numbered from the top.

    Raises
    ------
    SplitcheckError
        If nothing can be read, there is no copper, two files claim one layer, a layer that is
        listed is missing, or a file that promises Gerber data holds none.

    Notes
    -----
    Each file is judged in this order: its X2 attributes (plain or in ``G04 #@!``), the job
    file, its name, comments of its writer, its content.
    """
    folder, wanted_job = _folder_of(path)
    remarks: list[str] = []
    reads = _readable(_load(folder, remarks), str(path), remarks)
    job = _job(reads, wanted_job, remarks)
    start = naming.shared_start(r.name for r in reads if r.language == "gerber")
    judged = [judge(read, job, start) for read in reads]
    if layers is not None:
        judged = _override(judged, layers)
    judged = _one_outline(judged, remarks)
    judged = _drop_twins(judged, remarks)
    coppers = [j for j in judged if j.claim.kind == "copper"]
    if not coppers:
        raise _no_copper(str(path), judged)
    if layers is None:
        _check_job(job, judged, len(coppers), remarks)
    numbers, assumptions = _numbers(coppers, reads)
    names = _layer_names(coppers, numbers, reads, job)
    files, implied = _pair_drills([_file(j, numbers, names, len(coppers), job) for j in judged])
    remarks += [
        f"{f.name} is left out: {f.reason}"
        for f in files
        if f.kind == "other" and sniff.language(f.text) == "gerber" and "nothing" in f.reason
    ]
    return Export(
        name=job.name if job else folder.stem if folder.is_file() else folder.resolve().name,
        files=tuple(sorted(files, key=lambda f: f.name)),
        job=job,
        assumptions=(*assumptions, *implied),
        remarks=(*remarks, *(job.remarks if job else ())),
    )


def _folder_of(path: Path) -> tuple[Path, str | None]:
    """Folder or archive to read, and the name of the job file if that was given."""
    if path.suffix.casefold() == ".gbrjob":
        if path.is_file():
            return path.parent, path.name
        if path.exists():
            raise SplitcheckError(str(path), "is a folder, not a job file", _NO_COPPER_DO)
        raise SplitcheckError(str(path), "does not exist", "check the path of the job file")
    return path, None


def _load(folder: Path, remarks: list[str]) -> tuple[archive.Loaded, ...]:
    """The files of the top, or with those one folder down when the top holds no layer."""
    loaded = archive.load(folder, deep=False)
    top = tuple(f for f in loaded if f.unread != archive.DEEPER)
    below = [f for f in loaded if f.unread == archive.DEEPER]
    if not any(_is_layer(f) for f in top) and below:
        return archive.load(folder, deep=True)
    unread = sorted({f.name.partition("/")[0] for f in below if naming.promises_layer(f.name)})
    if unread:
        remarks.append(f"Folders inside were not read: {', '.join(unread)}")
    return top


def _is_layer(file: archive.Loaded) -> bool:
    head = sniff.decode(file.data[:20_000])
    return naming.promises_layer(file.name) or (
        head is not None and sniff.language(head) in ("gerber", "excellon")
    )


def _readable(loaded: Iterable[archive.Loaded], place: str, remarks: list[str]) -> list[Read]:
    reads: list[Read] = []
    do = "export it again, or take it out of the folder"
    for file in loaded:
        promised = naming.promises_layer(file.name)
        if file.unread is not None:
            if promised or naming.ending(file.name) == "gbrjob":
                raise SplitcheckError(file.name, file.unread, do)
            if file.unread not in (archive.FOLDER, archive.BINARY):
                remarks.append(f"{file.name} {file.unread}")
            continue
        text = sniff.decode(file.data)
        language = "binary" if text is None else sniff.language(text)
        if promised and language in ("binary", "empty", "text"):
            what = {
                "binary": "binary data",
                "empty": "nothing",
                "text": "neither Gerber nor drill commands",
            }
            raise SplitcheckError(
                file.name, f"holds {what[language]} although its name promises a layer", do
            )
        digest = sha256(file.data).hexdigest()
        reads.append(Read(file.name, text or "", digest, language))
    if not reads:
        raise SplitcheckError(place, "holds no files", _NO_COPPER_DO)
    return reads


def _job(reads: Sequence[Read], wanted: str | None, remarks: list[str]) -> Job | None:
    named = [r for r in reads if naming.ending(r.name) == "gbrjob"]
    if wanted is not None:
        named = [r for r in named if r.name == wanted]
    if len(named) > 1:
        names = " and ".join(r.name for r in named[:2])
        do = "give the one that counts instead of the folder"
        raise SplitcheckError(named[1].name, f"there is more than one job file ({names})", do)
    for read in named:
        return jobfile.read(read.text, read.name)
    unnamed = [r.name for r in reads if r.language == "job" and naming.ending(r.name) == "json"]
    remarks += [f"{n} looks like a job file but is not named .gbrjob; left out" for n in unnamed]
    return None


def _override(judged: list[Judged], layers: Sequence[tuple[int, str]]) -> list[Judged]:
    """Let the stack given by the user say which files are copper, and in which order."""
    do = "correct the stack file"
    by_file: dict[str, int] = {}
    for number, name in layers:
        found = [j.read.name for j in judged if _same_file(j.read.name, name)]
        if not found:
            raise SplitcheckError(name, "is listed as a copper layer but is not in the export", do)
        if found[0] in by_file:
            raise SplitcheckError(name, "is listed for two copper layers", do)
        if number in by_file.values():
            raise SplitcheckError(name, f"is the second file listed for layer {number}", do)
        by_file[found[0]] = number
    changed = []
    for j in judged:
        if j.read.name in by_file:
            number = by_file[j.read.name]
            claim = Claim("copper", f"the stack file says layer {number}", None, "layer", number)
            changed.append(Judged(j.read, claim, "stack"))
        elif j.claim.kind == "copper":
            claim = Claim("other", "the stack file does not list it")
            changed.append(Judged(j.read, claim, "stack"))
        else:
            changed.append(j)
    return changed


def _same_file(name: str, wanted: str) -> bool:
    return wanted in (name, name.rsplit("/", 1)[-1]) or name.casefold() == wanted.casefold()


def _one_outline(judged: list[Judged], remarks: list[str]) -> list[Judged]:
    """Of files that only custom calls an outline, keep the likeliest."""
    outlines = [j for j in judged if j.claim.kind == "profile"]
    best = max((j.claim.strength for j in outlines), default=0)
    chosen = next((j.read.name for j in outlines if j.claim.strength == best), "")
    weak = {j.read.name for j in outlines if j.claim.strength < best}
    remarks += [f"{n} is not taken for the outline: {chosen} is likelier" for n in sorted(weak)]
    spare = Claim("other", f"{chosen} is the likelier outline")
    return [j._replace(claim=spare) if j.read.name in weak else j for j in judged]


def _drop_twins(judged: list[Judged], remarks: list[str]) -> list[Judged]:
    """Refuse two different files for one layer; of two equal ones keep the first."""
    seen: dict[tuple[object, ...], Judged] = {}
    kept: list[Judged] = []
    for j in judged:
        keys = _layer_keys(j.claim) if j.claim.kind == "copper" else []
        other = next((seen[key] for key in keys if key in seen), None)
        if other is None:
            seen |= dict.fromkeys(keys, j)
            kept.append(j)
        elif other.read.digest == j.read.digest:
            remarks.append(f"{j.read.name} is the same file as {other.read.name}; taken once")
            kept.append(j._replace(claim=Claim("other", f"same as {other.read.name}")))
        else:
            which = j.claim.side if keys[0][0] == "side" else f"layer {j.claim.number}"
            wrong = f"claims the same copper layer ({which}) as {other.read.name}"
            do = "take one of them out, or list the layers with --stack FILE.toml"
            raise SplitcheckError(j.read.name, wrong, do)
    return kept


def _layer_keys(claim: Claim) -> list[tuple[object, ...]]:
    if claim.side in ("top", "bottom"):
        return [("side", claim.side)]
    return [] if claim.number is None else [("number", claim.family, claim.number)]


def _check_job(job: Job | None, judged: Sequence[Judged], found: int, remarks: list[str]) -> None:
    """A copper file that the job lists must be there; other missing files are a remark."""
    if job is None:
        return
    there = {j.read.name.rsplit("/", 1)[-1].casefold() for j in judged}
    missing = [e for e in job.files if e.path.casefold() not in there]
    lost = [e.path for e in missing if e.function[0].casefold() == "copper"]
    listed = sum(e.function[0].casefold() == "copper" for e in job.files)
    if lost and found < max(listed, job.layer_count or 0):
        wrong = f'lists copper "{lost[0]}", which is not in the export'
        do = "add that file, or take the job file out of the folder"
        raise SplitcheckError(job.source, wrong, do)
    if missing:
        names = ", ".join(sorted(e.path for e in missing))
        remarks.append(f"{job.source} lists files that are not here: {names}")
    if job.layer_count is not None and job.layer_count != found:
        remarks.append(f"{job.source} says {job.layer_count} copper layers, {found} were found")


def _numbers(
    coppers: Sequence[Judged], reads: Sequence[Read]
) -> tuple[dict[str, int], tuple[str, ...]]:
    """Number of each copper file from the top, and what had to be assumed for it."""
    start = naming.shared_start(r.name for r in reads if r.language == "gerber")
    if all(j.source == "stack" for j in coppers):
        ranked = sorted(coppers, key=lambda j: j.claim.number or 0)
        return {j.read.name: i for i, j in enumerate(ranked, 1)}, ()
    candidates = [
        ordering.Candidate(
            j.read.name, naming.layer_words(j.read.name, start), j.claim.side,
            j.claim.family, j.claim.number, j.claim.role, j.source,
        )
        for j in coppers
    ]  # fmt: skip
    ordered, assumptions = ordering.order(candidates)
    return {c.file: i for i, c in enumerate(ordered, 1)}, assumptions


def _layer_names(
    coppers: Sequence[Judged], numbers: dict[str, int], reads: Sequence[Read], job: Job | None
) -> dict[str, str]:
    """A name for each copper file that a person knows the layer by; no two alike."""
    start = naming.shared_start(r.name for r in reads if r.language == "gerber")
    listed = job.copper_names() if job else ()
    if len(listed) != len(coppers) or len(set(listed)) != len(listed) or not all(listed):
        listed = ()
    names: dict[str, str] = {}
    for j in sorted(coppers, key=lambda j: numbers[j.read.name]):
        number = numbers[j.read.name]
        name = listed[number - 1] if listed else _own_name(j, start, number, len(coppers))
        names[j.read.name] = f"{name} (L{number})" if name in names.values() else name
    return names


def _own_name(judged: Judged, start: str, number: int, count: int) -> str:
    film = sniff.film_layer(judged.read.text)
    words = film or naming.layer_words(judged.read.name, start)
    if words and naming.by_words(words) is not None:
        return re.sub(r"^(F|B|In\d+)[_.]Cu$", r"\1.Cu", words)
    return "Top" if number == 1 else "Bottom" if number == count else f"L{number}"


def _file(
    judged: Judged, numbers: dict[str, int], names: dict[str, str], count: int, job: Job | None
) -> InputFile:
    read, claim = judged.read, judged.claim
    file = InputFile(read.name, read.text, read.digest, claim.kind, claim.reason)
    if claim.kind == "copper":
        negative = sniff.polarity_negative(read.text)
        entry = job.entry(read.name) if job else None
        if negative is None and entry and entry.polarity:
            negative = entry.polarity.casefold() == "negative"
        number = numbers[read.name]
        return replace(file, copper_number=number, layer_name=names[read.name], negative=negative)
    if claim.kind == "drill":
        plated, span = _drill_function(read, count)
        return replace(file, plated=plated, span=span)
    return file


def _drill_function(read: Read, count: int) -> tuple[bool | None, tuple[int, int] | None]:
    """Plating and span of a drill file, from its attributes or else its name."""
    function = sniff.file_attributes(read.text).get(".FileFunction", ())
    if function:
        kind = function[0].casefold()
        plated = {"plated": True, "nonplated": False}.get(kind)
        ends = [int(f) for f in function[1:3] if f.isdecimal() and len(f) <= 3]
        return plated, (min(ends), max(ends)) if len(ends) == 2 else None
    stem = read.name.rsplit("/", 1)[-1].rpartition(".")[0]
    plated = naming.plating(read.name)
    match = _SPAN_NAME.search(stem)
    if match and 1 <= int(match[1]) < int(match[2]) <= count:
        return plated, (int(match[1]), int(match[2]))
    return plated, None


def _pair_drills(files: list[InputFile]) -> tuple[tuple[InputFile, ...], tuple[str, ...]]:
    """One drill file beside one that is non-plated by its name holds the plated holes."""
    drills = [f for f in files if f.kind == "drill"]
    unsaid = [f for f in drills if f.plated is None and not _says_plating(f.text)]
    if len(unsaid) != 1 or len(drills) != 2 or not any(f.plated is False for f in drills):
        return tuple(files), ()
    other = next(f for f in drills if f is not unsaid[0])
    paired = tuple(replace(f, plated=True) if f is unsaid[0] else f for f in files)
    text = (
        f"The holes of {unsaid[0].name} are taken as plated, because {other.name} beside it"
        " holds the non-plated ones."
    )
    return paired, (text,)


def _says_plating(text: str) -> bool:
    return bool(
        re.search(r"\bnon[-_ ]?plated\b|\bplated\b|MixedPlating", text[:20_000], re.IGNORECASE)
    )


def _no_copper(place: str, judged: Sequence[Judged]) -> SplitcheckError:
    found = ", ".join(f"{j.read.name} ({j.claim.kind})" for j in judged[:6])
    more = f" and {len(judged) - 6} more" if len(judged) > 6 else ""
    return SplitcheckError(place, f"holds no copper layer; found {found}{more}", _NO_COPPER_DO)
