"""From a folder or a .zip to the bytes of its files, with caps and without leaving it."""

from __future__ import annotations

import stat
import zipfile
import zlib
from pathlib import Path, PurePosixPath, PureWindowsPath
from typing import IO, NamedTuple

from splitcheck.copper import naming
from splitcheck.errors import SplitcheckError

#: Largest single file, bytes.
FILE_CAP_BYTES = 256 * 2**20
#: Largest sum of all files, bytes.
TOTAL_CAP_BYTES = 2**30
#: Largest number of files.
COUNT_CAP = 1000
#: An archive entry that grows past the first figure and by more than this factor is refused.
_BOMB_FLOOR_BYTES = 4 * 2**20
_BOMB_RATIO = 200
_CHUNK_BYTES = 2**18


class Loaded(NamedTuple):
    """One file as it lies in the folder or archive."""

    name: str
    """Path inside the folder or archive, with forward slashes."""
    data: bytes
    unread: str | None
    """Why it could not be read, in words; ``data`` is then empty."""


#: Why a file of a folder inside was not read.
DEEPER = "lies in a folder inside"
#: A larger file whose start is binary and whose name promises no layer stays unread.
BINARY = "is binary data"
FOLDER = "is a folder, not a file"
_BINARY_BYTES = 2**20


def load(path: Path, *, deep: bool) -> tuple[Loaded, ...]:
    """Read the files of a folder or a .zip.

    Parameters
    ----------
    path
        A folder or a .zip file.
    deep
        Whether to read files one folder down as well; else they are only named.

    Returns
    -------
    Its files sorted by name; hidden files and what is nested deeper are left out.

    Raises
    ------
    SplitcheckError
        If the path is missing or unreadable, if the archive is broken, encrypted or reaches
        outside itself, or if a cap on size, growth or number is passed.
    """
    if path.is_dir():
        return _load_folder(path, deep=deep)
    if path.is_file():
        return _load_zip(path, deep=deep)
    if path.is_symlink():
        raise SplitcheckError(str(path), "is a link to nowhere", "give the folder itself")
    do = "give the folder, .zip or .gbrjob of the exported Gerber files"
    raise SplitcheckError(str(path), "does not exist", do)


def _load_folder(folder: Path, *, deep: bool) -> tuple[Loaded, ...]:
    try:
        entries = [e for e in sorted(folder.iterdir()) if not e.name.startswith(".")]
    except OSError as fault:
        wrong = f"the folder cannot be read ({fault.strerror})"
        raise SplitcheckError(str(folder), wrong, "check its permissions") from None
    below = [f for entry in entries if entry.is_dir() for f in _inside(entry)]
    _check_count(str(folder), len(entries) + (len(below) if deep else 0))
    loaded: list[Loaded] = []
    left_bytes = TOTAL_CAP_BYTES
    for file in [*entries, *below]:
        name = file.relative_to(folder).as_posix()
        one = Loaded(name, b"", DEEPER) if "/" in name and not deep else _load_file(file, name)
        left_bytes -= len(one.data)
        if left_bytes < 0:
            raise _too_much(str(folder))
        loaded.append(one)
    return tuple(sorted(loaded))


def _inside(folder: Path) -> list[Path]:
    """Files of a sub-folder; a folder that carries a file's name is judged by its own name."""
    try:
        files = sorted(p for p in folder.iterdir() if not p.name.startswith("."))
        return [p for p in files if not p.is_dir()]
    except OSError:
        return []


def _load_file(file: Path, name: str) -> Loaded:
    try:
        status = file.stat()
        if stat.S_ISDIR(status.st_mode):
            return Loaded(name, b"", FOLDER)
        if not stat.S_ISREG(status.st_mode):
            return Loaded(name, b"", "is not a regular file")
        if status.st_size > FILE_CAP_BYTES:
            return Loaded(name, b"", _over(status.st_size))
        with file.open("rb") as stream:
            data = stream.read(4096)
            foreign = b"\0" in data and not naming.promises_layer(name)
            if foreign and status.st_size > _BINARY_BYTES:
                return Loaded(name, b"", BINARY)
            data += stream.read(FILE_CAP_BYTES)
    except FileNotFoundError:
        return Loaded(name, b"", "is a link to nowhere")
    except OSError as fault:
        return Loaded(name, b"", f"cannot be read ({fault.strerror})")
    if len(data) > FILE_CAP_BYTES:
        return Loaded(name, b"", _over(len(data)))
    return Loaded(name, data, None)


def _load_zip(path: Path, *, deep: bool) -> tuple[Loaded, ...]:
    again = "pack the exported files again as a plain .zip, or give the folder"
    try:
        with zipfile.ZipFile(path) as archive:
            return _entries(archive, path.name, deep=deep)
    except zipfile.BadZipFile as fault:
        wrong = f"is not a readable .zip ({str(fault) or 'broken'})"
        if path.suffix.casefold() != ".zip":
            wrong = "is one single file"
            again = "give the folder, .zip or .gbrjob of the exported Gerber files"
        raise SplitcheckError(path.name, wrong, again) from None
    except OSError as fault:
        wrong = f"cannot be read ({fault.strerror or fault})"
        raise SplitcheckError(path.name, wrong, "check its permissions") from None
    except (zlib.error, EOFError, NotImplementedError, RuntimeError, ValueError) as fault:
        raise SplitcheckError(path.name, f"cannot be unpacked ({fault})", again) from None


def _entries(archive: zipfile.ZipFile, place: str, *, deep: bool) -> tuple[Loaded, ...]:
    infos = [info for info in archive.infolist() if not info.is_dir()]
    _check_count(place, len(infos))
    loaded: dict[str, Loaded] = {}
    left_bytes = TOTAL_CAP_BYTES
    for info in infos:
        name = _safe_name(info, place)
        parts = PurePosixPath(name).parts
        if any(part.startswith(".") or part == "__MACOSX" for part in parts) or len(parts) > 2:
            continue
        if info.flag_bits & 0x1:
            wrong = f"is encrypted ({name})"
            raise SplitcheckError(place, wrong, "unpack it and give the folder")
        if name in loaded:
            wrong = f"holds two files named {name}"
            raise SplitcheckError(place, wrong, "pack the exported files again")
        if len(parts) > 1 and not deep:
            loaded[name] = Loaded(name, b"", DEEPER)
            continue
        with archive.open(info) as stream:
            loaded[name] = _read_capped(stream, name, info.compress_size, left_bytes, place)
        left_bytes -= len(loaded[name].data)
    return tuple(sorted(loaded.values()))


def _safe_name(info: zipfile.ZipInfo, place: str) -> str:
    """Path of an entry, refused if it would leave the archive once unpacked."""
    raw = info.filename
    name = raw.replace("\\", "/")
    windows = PureWindowsPath(name)
    if name.startswith("/") or windows.drive or windows.root or ".." in PurePosixPath(name).parts:
        wrong = f'holds an entry that points outside the archive: "{raw[:200]}"'
        raise SplitcheckError(place, wrong, "do not unpack it; ask for a clean archive")
    return str(PurePosixPath(name))


def _read_capped(
    stream: IO[bytes], name: str, packed_bytes: int, left_bytes: int, place: str
) -> Loaded:
    """Unpack piece by piece, so that a header that lies about the size gains nothing."""
    pieces: list[bytes] = []
    size = 0
    while piece := stream.read(_CHUNK_BYTES):
        size += len(piece)
        if size > _BOMB_FLOOR_BYTES and size > _BOMB_RATIO * max(packed_bytes, 1):
            wrong = f"{name} grows more than {_BOMB_RATIO} times on unpacking"
            raise SplitcheckError(place, wrong, "unpack it with care and give the folder")
        if size > FILE_CAP_BYTES:
            return Loaded(name, b"", f"is over {FILE_CAP_BYTES // 2**20} MB once unpacked")
        if size > left_bytes:
            raise _too_much(place)
        pieces.append(piece)
    return Loaded(name, b"".join(pieces), None)


def _check_count(place: str, count: int) -> None:
    if count > COUNT_CAP:
        wrong = f"holds {count} files, over the cap of {COUNT_CAP}"
        raise SplitcheckError(place, wrong, "give the folder that holds the Gerber files alone")


def _over(size: int) -> str:
    return f"has {size // 2**20} MB, over the cap of {FILE_CAP_BYTES // 2**20} MB"


def _too_much(place: str) -> SplitcheckError:
    wrong = f"holds over {TOTAL_CAP_BYTES // 2**20} MB in all"
    return SplitcheckError(place, wrong, "give the folder that holds the Gerber files alone")
