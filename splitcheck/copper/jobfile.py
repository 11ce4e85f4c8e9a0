"""From the text of a Gerber job file (JSON) to what it says of files, size and stack-up."""

from __future__ import annotations

import json
import math
import re
from dataclasses import dataclass
from typing import Any, NamedTuple

from splitcheck.errors import SplitcheckError

_SUBLAYER = re.compile(r"\s*\((\d{1,3})/(\d{1,3})\)\s*$")
_MAX_ENTRIES = 1000
#: Longest job file, characters.
SIZE_CAP = 16 * 2**20


class JobEntry(NamedTuple):
    """One file that the job file lists."""

    path: str
    """Its name without folders."""
    function: tuple[str, ...]
    """Fields of its file function: ``("Copper", "L1", "Top")``."""
    polarity: str | None
    """``Positive``, ``Negative`` or ``None`` where not said."""


class JobLayer(NamedTuple):
    """One layer of the material stack-up."""

    type: str
    """``Copper``, ``Dielectric``, ``SolderMask``, ``Legend``, ``SolderPaste`` ..., as written."""
    name: str
    thickness_mm: float | None
    """``None`` where the file does not say."""
    material: str | None
    er: float | None
    """Relative permittivity, ``None`` where the file does not say."""
    loss_tangent: float | None = None


@dataclass(frozen=True, slots=True)
class Job:
    """A Gerber job file as read; lengths in mm."""

    name: str
    """Name of the project, or the file's own name without its ending."""
    source: str
    """Name of the file it was read from."""
    size_mm: tuple[float, float] | None
    layer_count: int | None
    """Number of copper layers, as stated."""
    thickness_mm: float | None
    """Thickness of the board, as stated."""
    files: tuple[JobEntry, ...]
    stackup: tuple[JobLayer, ...]
    """From top to bottom; sub-layers of one dielectric are already summed."""
    remarks: tuple[str, ...]

    def entry(self, name: str) -> JobEntry | None:
        """What the job says of the file of that name (case does not matter), or ``None``."""
        wanted = name.rsplit("/", 1)[-1].casefold()
        return next((e for e in self.files if e.path.casefold() == wanted), None)

    def copper_names(self) -> tuple[str, ...]:
        """Names of the copper layers of the stack-up, from top to bottom."""
        return tuple(layer.name for layer in self.stackup if layer.type.casefold() == "copper")


def read(text: str, name: str) -> Job:
    """Read a Gerber job file.

    Parameters
    ----------
    text
        The whole file.
    name
        Name of the file, for messages.

    Returns
    -------
    What it says. Fields that are missing are ``None`` or empty, with a remark where a
    calculation would have used them.

    Raises
    ------
    SplitcheckError
        If it is not JSON, or not the JSON of a job file.

    References
    ----------
    Ucamco, "Gerber Job Format Specification" (fields from memory, and as common writers fill
    them: numbers may be strings, a dielectric may be split into ``(1/2)``, ``(2/2)``).

    Examples
    --------
    >>> job = read('{"GeneralSpecs": {"LayerNumber": 4, "BoardThickness": 1.6}}', "a.gbrjob")
    >>> job.layer_count, job.thickness_mm, job.name
    (4, 1.6, 'a')
    """
    root = _parse(text, name)
    general = _object(root.get("GeneralSpecs"))
    project = _object(general.get("ProjectId"))
    size = _object(general.get("Size"))
    width_mm, height_mm = _number(size.get("X")), _number(size.get("Y"))
    count = _number(general.get("LayerNumber"))
    remarks: list[str] = []
    files = _files(root.get("FilesAttributes"), name, remarks)
    stackup = _sum_sublayers(_stackup(root.get("MaterialStackup"), name, remarks))
    return Job(
        name=_text(project.get("Name")) or re.sub(r"\.gbrjob$", "", name, flags=re.IGNORECASE),
        source=name,
        size_mm=None if width_mm is None or height_mm is None else (width_mm, height_mm),
        layer_count=None if count is None else int(count),
        thickness_mm=_number(general.get("BoardThickness")),
        files=files,
        stackup=stackup,
        remarks=tuple(remarks),
    )


def _parse(text: str, name: str) -> dict[str, Any]:
    again = "export the job file again, or take it out of the folder"
    if len(text) > SIZE_CAP:
        wrong = f"has {len(text)} characters, over the cap of {SIZE_CAP}"
        raise SplitcheckError(name, wrong, again)
    try:
        root = json.loads(text)
    except json.JSONDecodeError as fault:
        if "TF." in text[:4000] or "TJ." in text[:4000]:
            wrong = "is a job file of the old kind, with TF and TJ lines instead of JSON"
            raise SplitcheckError(name, wrong, again) from None
        wrong = f"is named as a job file but is not JSON ({fault.msg.lower()})"
        raise SplitcheckError(f"{name}:{fault.lineno}", wrong, again) from None
    except (RecursionError, ValueError):
        raise SplitcheckError(name, "is JSON nested or sized beyond reason", again) from None
    if not isinstance(root, dict):
        wrong = f"holds a JSON {type(root).__name__} where a job file holds an object"
        raise SplitcheckError(name, wrong, again)
    known = {"Header", "GeneralSpecs", "FilesAttributes", "MaterialStackup"}
    if not known & root.keys():
        wrong = "is JSON but holds none of the parts of a job file (GeneralSpecs, FilesAttributes)"
        raise SplitcheckError(name, wrong, again)
    return root


def _files(value: object, name: str, remarks: list[str]) -> tuple[JobEntry, ...]:
    if value is None:
        remarks.append(f"{name}: lists no files")
    entries = []
    for item in _objects(value, name, "FilesAttributes"):
        path = _text(item.get("Path")).replace("\\", "/").rsplit("/", 1)[-1]
        if not path:
            remarks.append(f"{name}: lists a file without a path; that entry is left out")
            continue
        function = tuple(f.strip() for f in _text(item.get("FileFunction")).split(","))
        entries.append(JobEntry(path, function, _text(item.get("FilePolarity")) or None))
    return tuple(entries)


def _stackup(value: object, name: str, remarks: list[str]) -> tuple[JobLayer, ...]:
    if value is None:
        remarks.append(f"{name}: has no material stack-up")
    layers = tuple(
        JobLayer(
            type=_text(item.get("Type")),
            name=_text(item.get("Name")),
            thickness_mm=_positive(item.get("Thickness")),
            material=_text(item.get("Material")) or None,
            er=_positive(item.get("DielectricConstant")),
            loss_tangent=_number(item.get("LossTangent")),
        )
        for item in _objects(value, name, "MaterialStackup")
    )
    for kind in ("Copper", "Dielectric"):
        bare = [y.name for y in layers if y.type == kind and y.thickness_mm is None]
        if bare:
            remarks.append(f"{name}: gives no thickness for {kind.lower()} {', '.join(bare)}")
    return layers


def _sum_sublayers(layers: tuple[JobLayer, ...]) -> tuple[JobLayer, ...]:
    """Join the parts ``X (1/2)``, ``X (2/2)`` of one dielectric.

    Permittivities join as capacitors in series: thickness over the sum of thickness over er.
    """
    groups: list[list[JobLayer]] = []
    for layer in layers:
        part = _SUBLAYER.search(layer.name)
        bare = layer._replace(name=_SUBLAYER.sub("", layer.name))
        if part and int(part[1]) > 1 and groups and groups[-1][0].name == bare.name:
            groups[-1].append(bare)
        else:
            groups.append([bare])
    return tuple(group[0] if len(group) == 1 else _joined(group) for group in groups)


def _joined(group: list[JobLayer]) -> JobLayer:
    thick_mm = [layer.thickness_mm for layer in group]
    total_mm = None if None in thick_mm else round(sum(t for t in thick_mm if t), 9)
    materials = dict.fromkeys(layer.material for layer in group if layer.material)
    parts = [(y.thickness_mm, y.er) for y in group if y.thickness_mm and y.er]
    er = None
    if total_mm and len(parts) == len(group):
        er = total_mm / sum(t / e for t, e in parts)
    return group[0]._replace(thickness_mm=total_mm, material=" + ".join(materials) or None, er=er)


def _object(value: object) -> dict[str, Any]:
    return value if isinstance(value, dict) else {}


def _objects(value: object, name: str, part: str) -> list[dict[str, Any]]:
    if value is None:
        return []
    do = "export the job file again, or take it out of the folder"
    if not isinstance(value, list) or not all(isinstance(item, dict) for item in value):
        raise SplitcheckError(name, f"{part} is not a list of objects", do)
    if len(value) > _MAX_ENTRIES:
        raise SplitcheckError(name, f"{part} has {len(value)} entries, over {_MAX_ENTRIES}", do)
    return value


def _text(value: object) -> str:
    return value.strip() if isinstance(value, str) else ""


def _number(value: object) -> float | None:
    """A finite number, or a string that holds one; else ``None``."""
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        return None
    try:
        number = float(value)
    except (ValueError, OverflowError):
        return None
    return number if math.isfinite(number) else None


def _positive(value: object) -> float | None:
    number = _number(value)
    return number if number is not None and number > 0 else None
