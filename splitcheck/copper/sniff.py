"""From the bytes of one file to what its content is: its language, attributes and vendor notes."""

from __future__ import annotations

import re
from typing import Literal, TypeAlias

Language: TypeAlias = Literal[
    "gerber", "excellon", "netlist", "job", "placement", "tools", "text", "binary", "empty"
]

_HEAD = 60_000
_CONTROL = bytes(set(range(32)) - {9, 10, 12, 13, 26, 27})
_GERBER = re.compile(
    r"%\s*(?:FS[LTD]?[AI]|MO(?:IN|MM)|ADD\d{2}|AM[\w.$-]|LP[DC]|TF\.)"
    r"|^G04[ #:=]|[XY]-?\d+D0?[123]\*",
    re.MULTILINE,
)
_EXCELLON = re.compile(
    r"^\s*(?:M48|T\d{1,4}(?:[FSCHBZ].{0,60})?|M7[12]|INCH|METRIC|%)\s*(?:[,;].*)?$"
)
_DRILL_LINE = re.compile(r"^\s*(?:G\d\d?)?(?:[XY][-+]?[\d.]+){1,2}(?:G85.*)?\s*$")
_NETLIST = re.compile(
    r"^(?:[0-3][0-9]7.{23,}X[-+ ]?\d|P  (?:JOB|CODE|UNITS|VER|NUM)\b)", re.MULTILINE
)
_PLACEMENT = re.compile(
    r"^#{2,3} ?(?:Footprint|Module) positions"
    r"|^\s*\"?(?:Ref(?:Des|erence)?|Designator)\b.{0,300}"
    r"(?:(?<![a-z])(?:Mid|Pos|Center|Ref|Location|Loc)?[ _-]?X\b|\bRot)",
    re.MULTILINE | re.IGNORECASE,
)
_TOOL_LINE = re.compile(
    r"^T0*(\d{1,4})\s+([\d.]{1,12})\s*(mm|in|inch|mil)\b", re.MULTILINE | re.IGNORECASE
)
_ATTRIBUTE = re.compile(r"TF(\.[A-Za-z_.$][\w.$]*)((?:,[^*%\r\n]*)?)")
_ORDER = re.compile(r"^G04[ :]?\s*Layer_Physical_Order=(\d{1,3})\*", re.MULTILINE)
_FILM = re.compile(r"^G04\s+Layer:\s+(?:ETCH|CONDUCTOR)/([^*\r\n]{1,80})\*", re.MULTILINE)
_FILM_TOTAL = re.compile(
    r"^G04\s+(?:Mode|Polarity):\s*(Positive|Negative)\b", re.MULTILINE | re.IGNORECASE
)
_IMAGE_NAME = re.compile(r"%IN([^*%\r\n]{1,120})\*")


def decode(data: bytes) -> str | None:
    r"""Text of a file, or ``None`` if it is binary data.

    Examples
    --------
    >>> decode(b"G04 caf\xc3\xa9*"), decode(b"G04 caf\xe9*"), decode(bytes(99))
    ('G04 café*', 'G04 café*', None)
    """
    if data[:2] in (b"\xff\xfe", b"\xfe\xff"):
        try:
            return data.decode("utf-16")
        except UnicodeDecodeError:
            return None
    if b"\0" in data:
        return None
    sample = data[:_HEAD]
    if len(sample) - len(sample.translate(None, _CONTROL)) > len(sample) // 50:
        return None
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return data.decode("latin-1")


def language(text: str) -> Language:
    r"""Which language a text is written in, by what stands in it.

    Examples
    --------
    >>> language("M48\nMETRIC\nT1C0.3\n%\nT1\nX1.0Y2.0\nM30\n")
    'excellon'
    >>> language("Drill all holes plated, 0.3 mm.")
    'text'
    """
    head = text[:_HEAD]
    if not head.strip():
        return "empty"
    if head.lstrip()[0] == "{" and re.search(r'"(?:GeneralSpecs|FilesAttributes|Header)"', head):
        return "job"
    if _GERBER.search(head):
        return "gerber"
    if _NETLIST.search(head):
        return "netlist"
    if _PLACEMENT.search(head[:4000]):
        return "placement"
    if _is_excellon(head):
        return "excellon"
    if _TOOL_LINE.search(head):
        return "tools"
    return "text"


def _is_excellon(head: str) -> bool:
    """A drill file has commands and coordinates alone on their lines; prose has neither."""
    lines = [line for line in head.splitlines()[:400] if line.strip()]
    commands = sum(bool(_EXCELLON.match(line)) for line in lines)
    places = sum(bool(_DRILL_LINE.match(line)) for line in lines)
    comments = sum(line.lstrip().startswith(";") for line in lines)
    return commands >= 1 and 2 * (commands + places + comments) >= len(lines)


def tool_sizes(text: str) -> dict[int, float]:
    r"""Diameters of a separate list of drill tools, mm, by tool number.

    Examples
    --------
    >>> tool_sizes("T1 0.300000mm  362x\nT2 15.7 mil")
    {1: 0.3, 2: 0.39878}
    """
    unit_mm = {"mm": 1.0, "in": 25.4, "inch": 25.4, "mil": 0.0254}
    sizes: dict[int, float] = {}
    for number, size, unit in _TOOL_LINE.findall(text[:_HEAD]):
        if size.count(".") <= 1 and size != ".":
            sizes[int(number)] = round(float(size) * unit_mm[unit.lower()], 6)
    return sizes


def file_attributes(text: str) -> dict[str, tuple[str, ...]]:
    """File attributes (X2) of a Gerber or drill file, plain or in structured comments.

    Examples
    --------
    >>> file_attributes("G04 #@! TF.FileFunction,Copper,L2,Inr*")
    {'.FileFunction': ('Copper', 'L2', 'Inr')}
    >>> file_attributes("; #@! TF.FileFunction,Plated,1,4,PTH")
    {'.FileFunction': ('Plated', '1', '4', 'PTH')}
    """
    found: dict[str, tuple[str, ...]] = {}
    at = text.find("TF.")
    while at >= 0:
        before = text[max(0, at - 12) : at].rstrip()
        match = _ATTRIBUTE.match(text, at) if before.endswith(("%", "#@!")) else None
        if match:
            fields = tuple(field.strip() for field in match[2][1:].split(","))
            found.setdefault(match[1], fields)
        at = text.find("TF.", at + 3)
    return found


def physical_order(text: str) -> int | None:
    """Place of the layer from the top, where the writer states it in a comment."""
    match = _ORDER.search(text[:_HEAD])
    return int(match[1]) if match else None


def film_layer(text: str) -> str | None:
    """Name of the etch layer that a film's own header says it shows, if it is just one."""
    names = dict.fromkeys(name.strip() for name in _FILM.findall(text[:_HEAD]))
    return next(iter(names)) if len(names) == 1 else None


def image_name(text: str) -> str | None:
    """What the deprecated image-name command says."""
    match = _IMAGE_NAME.search(text[:_HEAD])
    return match[1].strip() if match else None


def polarity_negative(text: str) -> bool | None:
    """Whether the file itself says that its image is negative; ``None`` if it says nothing."""
    stated = file_attributes(text[:_HEAD]).get(".FilePolarity")
    if stated:
        return stated[0].casefold() == "negative"
    head = text[:_HEAD]
    if "%IPNEG*%" in head:
        return True
    film = _FILM_TOTAL.search(head)
    if film and film[1].casefold() == "negative":
        return True
    return False if "%IPPOS*%" in head or film else None
