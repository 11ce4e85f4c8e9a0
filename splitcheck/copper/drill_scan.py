"""From the text of an Excellon or XNC drill file to its commands, numbers still unread."""

from __future__ import annotations

import re

from splitcheck.copper import sniff
from splitcheck.copper.drill_script import Code, Op, Script, Tool, Unit
from splitcheck.errors import SplitcheckError

#: Most commands in one file.
COMMANDS_CAP = 1_000_000
#: Most repeats by one command.
REPEATS_CAP = 10_000
_AGAIN = "export the drill file again"

_WORD = re.compile(r"([A-Z])([-+]?[\d.]*)")
_NUMBER = re.compile(r"[-+]?(?:\d{1,18}(?:\.\d{0,18})?|\.\d{1,18})")
_PLACE = re.compile(rf"(?:X({_NUMBER.pattern}))?(?:Y({_NUMBER.pattern}))?")
_HOLESIZE = re.compile(
    r"(?:T(\d{1,4})\s+)?Holesize\s+(\d{1,4})\.?\s*=\s*([\d.]{1,12})\b.{0,80}?"
    r"\b(NON_PLATED|PLATED|OPTIONAL)\s+(MM|MILS|INCH|INCHES)\b(?:\s+Quantity\s*=\s*(\d{1,9}))?",
    re.IGNORECASE,
)
_FORMAT = re.compile(r"FORMAT\s*[=:]\s*\{?\s*(\d)\s*[:.]\s*(\d)", re.IGNORECASE)
_PICTURE = re.compile(r"(0{1,6})\.(0{1,6})")
#: Settings that change nothing about where holes are.
_SILENT = frozenset({"DETECT", "ATC", "VER", "FMAT", "OM48", "SBK", "SG", "CCW", "CP", "R"})


class _State:
    """What the scan has to remember from line to line."""

    def __init__(self, name: str) -> None:
        self.script = Script(name)
        self.header = False
        self.ended = False
        self.motion: Code = "hit"
        self.arc_way = 1
        self.plunges = False
        self.tag_plated: bool | None = None
        self.tag_via: bool | None = None
        self.type_plated: bool | None = None
        self.skip_text = False
        self.ignored: dict[str, int] = {}
        self.stops: list[int] = []
        self.placed = False
        self.chosen: set[int] = set()

    def add(self, op: Op) -> None:
        self.script.ops.append(op)
        self.placed |= op.x is not None or op.y is not None
        if op.code == "tool":
            self.chosen.add(op.number)
        if len(self.script.ops) > COMMANDS_CAP:
            wrong = f"holds over {COMMANDS_CAP} commands"
            raise SplitcheckError(self.script.name, wrong, "split the drill file")

    def set_unit(self, unit: Unit, line: int) -> None:
        if self.placed and self.script.unit not in (None, unit):
            wrong = "changes units after the first coordinate"
            raise SplitcheckError(f"{self.script.name}:{line}", wrong, _AGAIN)
        if self.script.unit not in (None, unit) and not self.script.remarks:
            self.script.remarks.append(
                f"{self.script.name}:{line}: the unit changes from {self.script.unit} to {unit};"
                " coordinates are read in the second, tools in the one they are listed under"
            )
        self.script.unit = unit


def scan(text: str, name: str) -> Script:
    """Take a drill file apart.

    Parameters
    ----------
    text
        The whole file.
    name
        Its name, for messages.

    Returns
    -------
    Its commands in order, tools, and what it states of units and number format.

    Raises
    ------
    SplitcheckError
        At a command or number that cannot be understood and would move holes.

    References
    ----------
    Command letters: IPC-NC-349 and "XNC Format Specification" (Ucamco, 2019), from memory.
    """
    state = _State(name)
    state.script.function = sniff.file_attributes(text).get(".FileFunction", ())
    state.plunges = "M15" in text or "M14" in text
    for number, raw in enumerate(text.splitlines(), 1):
        line = raw.strip()
        if not line or state.ended:
            continue
        place = _PLACE.fullmatch(line)
        if place and state.motion == "hit" and not state.skip_text:
            state.add(Op("hit", number, place[1], place[2]))
            continue
        if line.startswith((";", "(")):
            _comment(state, line[1:].strip())
            continue
        _command(state, line.partition(";")[0].strip().upper(), number)
    _tools_by_stops(state)
    if state.ignored:
        listed = ", ".join(f"{code} (line {n})" for code, n in sorted(state.ignored.items()))
        state.script.remarks.append(
            f"{name}: commands that move no hole were passed over: {listed}"
        )
    return state.script


def _tools_by_stops(state: _State) -> None:
    """Where no tool is ever chosen, each stop (M00) is a change to the next tool of the table."""
    script = state.script
    if not script.ops or not script.tools or any(op.code == "tool" for op in script.ops):
        return
    starts = [0, *(at for at in state.stops if at < len(script.ops))]
    changes = dict(zip(starts, sorted(script.tools), strict=False))
    ops: list[Op] = []
    for at, op in enumerate(script.ops):
        if at in changes:
            ops.append(Op("tool", op.line, number=changes[at]))
        ops.append(op)
    script.ops = ops
    script.remarks.append(
        f"{script.name}: chooses no tool; assumed that each stop (M00) changes to the next one"
    )


def _comment(state: _State, body: str) -> None:
    script = state.script
    size = _HOLESIZE.search(body)
    if size:
        _holesize(script, size)
        return
    if body.startswith("TYPE="):
        state.type_plated = _plating(body[5:].strip())
    if body.startswith("#@!"):
        fields = [f.strip() for f in body[3:].strip().split(",")]
        if fields[0] == "TA.AperFunction" and len(fields) > 1:
            state.tag_plated = _plating(fields[1])
            state.tag_via = "ViaDrill" in fields
        elif fields[0].startswith("TD"):
            state.tag_plated = state.tag_via = None
        return
    stated = _FORMAT.search(body)
    if stated:
        script.digits = int(stated[1]), int(stated[2])
    lower = body.casefold()
    if lower.startswith("format"):
        if "suppress leading" in lower or "keep trailing" in lower:
            script.zeros = "trailing"
        elif "suppress trailing" in lower or "keep leading" in lower or "keep zeros" in lower:
            script.zeros = "leading"


def _plating(word: str) -> bool | None:
    return {"PLATED": True, "NON_PLATED": False, "NONPLATED": False}.get(word.upper())


def _holesize(script: Script, found: re.Match[str]) -> None:
    """A tool that only a comment describes, or more about one that is listed."""
    number = int(found[1] or found[2])
    size, unit = found[3], "mm" if found[5].upper() == "MM" else "inch"
    if found[5].upper() == "MILS":
        size = f"{float(size) / 1000:.9f}"
    known = script.tools.get(number)
    script.tools[number] = Tool(
        size=known.size if known and known.size else size,
        unit=known.unit if known and known.size else "mm" if unit == "mm" else "inch",
        plated=_plating(found[4]),
        via=known.via if known else None,
        quantity=int(found[6]) if found[6] else None,
    )


def _command(state: _State, line: str, number: int) -> None:
    script = state.script
    if state.skip_text:  # the text that M97 or M98 would engrave
        state.skip_text = False
        return
    line = re.sub(r"^N\d{1,9}(?=[A-Z])", "", line)
    if line.startswith("%"):
        state.header = False
    elif line.startswith("M48"):
        state.header = True
    elif line.startswith(("METRIC", "INCH")):
        _units(state, line, number)
    elif line.startswith("ICI"):
        state.add(Op("relative" if "ON" in line else "absolute", number))
    elif line.startswith("T") and line[1:2].isdigit():
        _tool(state, line, number)
    elif re.match(r"R\d", line):
        _repeat(state, line, number)
    elif line.split(",")[0] in _SILENT or line[0] in "SF":
        pass  # among them spindle and feed
    elif line[0] in "GMXYIJA":
        _motion(state, line, number)
    elif state.header:
        pass
    else:
        wrong = f'"{line[:60]}" is not a drill command'
        raise SplitcheckError(f"{script.name}:{number}", wrong, _AGAIN)


def _units(state: _State, line: str, number: int) -> None:
    state.set_unit("inch" if line.startswith("INCH") else "mm", number)
    fields = line.split(",")[1:]
    if "LZ" in fields:
        state.script.zeros = "leading"
    elif "TZ" in fields:
        state.script.zeros = "trailing"
    picture = _PICTURE.search(line)
    if picture:
        state.script.digits = len(picture[1]), len(picture[2])


def _tool(state: _State, line: str, number: int) -> None:
    match = re.match(r"T(\d{1,6})(.*)", line)
    if match is None:
        return
    place = f"{state.script.name}:{number}"
    tool = int(match[1])
    words = dict(_WORD.findall(match[2].replace(",", "")))
    if len(match[1]) == 4 and tool not in state.script.tools and "C" not in words:
        tool = int(match[1][:2])  # T0103: tool 1, compensation 3
    if "C" in words:
        size = words["C"]
        if not _NUMBER.fullmatch(size):
            raise SplitcheckError(place, f'"{line[:60]}" gives no diameter', _AGAIN)
        old = state.script.tools.get(tool)
        plated = state.tag_plated if state.tag_plated is not None else state.type_plated
        known = plated if plated is not None else old.plated if old else None
        if old and old.size and float(old.size) != float(size) and tool in state.chosen:
            wrong = f"tool T{tool} is defined again with another diameter"
            raise SplitcheckError(place, wrong, _AGAIN)
        quantity = old.quantity if old else None
        state.script.tools[tool] = Tool(size, state.script.unit, known, state.tag_via, quantity)
        if state.header:
            return
    state.add(Op("tool", number, number=tool))
    if "X" in words or "Y" in words:
        place_words = [words[key] for key in "XY" if key in words]
        if not all(_NUMBER.fullmatch(word) for word in place_words):
            raise SplitcheckError(place, f'"{line[:60]}" is not a coordinate', _AGAIN)
        state.add(Op("hit", number, words.get("X"), words.get("Y")))


def _repeat(state: _State, line: str, number: int) -> None:
    place = f"{state.script.name}:{number}"
    match = re.match(r"R(\d{1,9})", line)
    words = _words(line[match.end() :] if match else line, place)
    count = int(match[1]) if match else 0
    if count > REPEATS_CAP:
        wrong = f"repeats {count} times, over the cap of {REPEATS_CAP}"
        raise SplitcheckError(place, wrong, _AGAIN)
    state.add(Op("repeat", number, words.get("X"), words.get("Y"), number=count))


def _words(text: str, place: str) -> dict[str, str]:
    words: dict[str, str] = {}
    end = 0
    for match in _WORD.finditer(text):
        if match.start() != end:
            break
        end = match.end()
        words[match[1]] = match[2]
    bad = end != len(text) or any(
        not _NUMBER.fullmatch(value) for key, value in words.items() if key in "XYIJAR"
    )
    if bad:
        raise SplitcheckError(place, f'"{text[:60]}" is not a coordinate', _AGAIN)
    return words


def _motion(state: _State, line: str, number: int) -> None:
    """A line of G and M codes and coordinates."""
    place = f"{state.script.name}:{number}"
    rest = line.replace(" ", "")
    slot = rest.partition("G85")
    if slot[1]:
        first, second = _words(slot[0], place), _words(slot[2], place)
        xy = first.get("X"), first.get("Y"), second.get("X"), second.get("Y")
        state.add(Op("slot", number, *xy))
        return
    while rest[:1] in ("G", "M"):
        match = re.match(r"[GM](\d{1,3})", rest)
        if match is None:
            raise SplitcheckError(place, f'"{line[:60]}" is not a drill command', _AGAIN)
        code, rest = f"{rest[0]}{int(match[1]):02d}", rest[match.end() :]
        if _code(state, code, rest, number):
            return
    if rest:
        _move(state, _words(rest, place), number)


def _code(state: _State, code: str, rest: str, number: int) -> bool:
    """Carry out one G or M code; true if the rest of the line belongs to it."""
    place = f"{state.script.name}:{number}"
    motions: dict[str, Code] = {
        "G00": "move",
        "G01": "cut",
        "G02": "arc",
        "G03": "arc",
        "G05": "hit",
        "G81": "hit",
    }
    if code in motions:
        state.motion = motions[code]
        state.arc_way = -1 if code == "G03" else 1
        if code in ("G00", "G05"):
            state.add(Op("up", number))
    elif code in ("G90", "G91"):
        state.add(Op("relative" if code == "G91" else "absolute", number))
    elif code in ("M71", "M72", "G70", "G71", "G20", "G21"):
        state.set_unit("mm" if code in ("M71", "G71", "G21") else "inch", number)
    elif code in ("M15", "M14"):
        state.add(Op("down", number))
    elif code in ("M16", "M17"):
        state.add(Op("up", number))
    elif code == "M30":
        state.ended = True
        return True
    elif code == "M00":
        state.stops.append(len(state.script.ops))
        return True
    elif code in ("M97", "M98"):
        state.ignored.setdefault(code, number)
        state.skip_text = "," not in rest
        return True
    elif code in ("G92", "G93"):
        words = _words(rest, place)
        if any(float(words.get(key, "0")) for key in "XY"):
            wrong = f"moves the origin in the middle of the file ({code})"
            raise SplitcheckError(place, wrong, "export the drill file without it")
        return True
    elif (code in ("M02", "M08", "M70", "M80", "M90") and rest) or code in ("M70", "M80"):
        wrong = f"uses a repeated pattern ({code})"
        raise SplitcheckError(place, wrong, "export the drill file without step and repeat")
    else:
        state.ignored.setdefault(code, number)
        return code not in ("G40", "G41", "G42")
    return False


def _move(state: _State, words: dict[str, str], number: int) -> None:
    xy = words.get("X"), words.get("Y")
    if state.motion in ("cut", "arc") and not state.plunges:
        state.add(Op("down", number))
    if state.motion == "arc":
        op = Op("arc", number, *xy, words.get("I"), words.get("J"), state.arc_way, words.get("A"))
        state.add(op)
    elif xy != (None, None):
        state.add(Op(state.motion, number, *xy))
