"""From a file's name to the layer it claims to be, by the file-name conventions of the trade."""

from __future__ import annotations

import re
from collections.abc import Iterable
from itertools import pairwise
from typing import Literal, NamedTuple, TypeAlias

Kind: TypeAlias = Literal[
    "copper", "drill", "profile", "job", "netlist", "placement",
    "mask", "paste", "legend", "readme", "tools", "other",
]  # fmt: skip
Side: TypeAlias = Literal["top", "inner", "bottom"]
Role: TypeAlias = Literal["ground", "supply", "signal"]


class Claim(NamedTuple):
    """What one piece of evidence says of a file."""

    kind: Kind
    reason: str
    """One short sentence in plain words."""
    side: Side | None = None
    family: str = ""
    """Which count ``number`` belongs to: ``layer`` (1 = top) or a word such as ``gnd``, ``g``."""
    number: int | None = None
    role: Role | None = None
    strength: int = 1
    """Among outlines that only their names tell: the strongest is taken."""


_EXTENSIONS: dict[str, tuple[Kind, Side | None, str]] = {
    "gtl": ("copper", "top", "top copper"),
    "cmp": ("copper", "top", "component-side copper"),
    "top": ("copper", "top", "top copper"),
    "gbl": ("copper", "bottom", "bottom copper"),
    "sol": ("copper", "bottom", "solder-side copper"),
    "bot": ("copper", "bottom", "bottom copper"),
    "gko": ("profile", None, "keep-out, by custom the board outline"),
    "gm1": ("profile", None, "mechanical layer 1, by custom the board outline"),
    "gml": ("profile", None, "milling, by custom the board outline"),
    "oln": ("profile", None, "board outline"),
    "outline": ("profile", None, "board outline"),
    "gts": ("mask", None, "solder mask"), "gbs": ("mask", None, "solder mask"),
    "stc": ("mask", None, "solder mask"), "sts": ("mask", None, "solder mask"),
    "smt": ("mask", None, "solder mask"), "smb": ("mask", None, "solder mask"),
    "stoptop": ("mask", None, "solder mask"), "stopbot": ("mask", None, "solder mask"),
    "gtp": ("paste", None, "solder paste"), "gbp": ("paste", None, "solder paste"),
    "crc": ("paste", None, "solder paste"), "crs": ("paste", None, "solder paste"),
    "pastetop": ("paste", None, "solder paste"), "pastebot": ("paste", None, "solder paste"),
    "gto": ("legend", None, "legend"), "gbo": ("legend", None, "legend"),
    "plc": ("legend", None, "legend"), "pls": ("legend", None, "legend"),
    "sst": ("legend", None, "legend"), "ssb": ("legend", None, "legend"),
    "positop": ("legend", None, "legend"), "posibot": ("legend", None, "legend"),
    "gpt": ("other", None, "pad master"), "gpb": ("other", None, "pad master"),
    "drd": ("drill", None, "drill"),
}  # fmt: skip

#: Endings that promise Gerber or drill data: such a file must be readable, or the user is told.
_GERBER_ENDINGS = frozenset(
    {"gbr", "ger", "gerber", "gbx", "gb", "pho", "art", "gdo", "gbrx", "rs274x", *_EXTENSIONS}
)
_DRILL_ENDINGS = frozenset({"drl", "xln", "exc", "drill", "drd", "ncd", "xnc", "ncdrill"})
_INNER_ENDING = re.compile(r"(g|gl|gp|in|ly|lyr|l|inner)(\d{1,2})(l?)$")
_OTHER_ENDING = re.compile(r"(gm|gd|gg)\d{1,2}$")

_TOKEN = re.compile(r"[a-z]+\d*|\d+")
_CAMEL = re.compile(r"(?<=[a-z0-9])(?=[A-Z][a-z])")
_NON_PLATED = re.compile(r"(?<![a-z])n(?:on)?[-_ ]?p(?:th|lated)(?![a-z])", re.IGNORECASE)
_PLATED = re.compile(r"(?<![a-z])p(?:th|lated)(?![a-z])", re.IGNORECASE)
_NUMBERED = re.compile(r"([a-z]+?)(\d{0,3})$")

_OTHER_WORDS: tuple[tuple[Kind, str, tuple[str, ...]], ...] = (
    ("mask", "solder mask", ("mask", "solderstop", "stopmask", "stoptop", "stopbot", "resist")),
    ("paste", "solder paste", ("paste", "stencil", "cream")),
    ("legend", "legend", ("silk", "legend", "overlay", "posi", "ident", "nomenclature")),
    ("other", "a drawing", ("drillmap", "drawing", "assembly", "assy", "courtyard", "crtyd")),
    ("other", "glue", ("adhes", "glue")),
    ("profile", "board outline", ("outline", "profile", "edgecuts", "contour", "dimension")),
)
_OTHER_TOKENS: dict[str, tuple[Kind, str]] = {
    "fab": ("other", "a drawing"), "cmts": ("other", "notes"), "comments": ("other", "notes"),
    "margin": ("other", "a margin"), "user": ("other", "a user layer"),
    "sm": ("mask", "solder mask"), "smt": ("mask", "solder mask"), "smb": ("mask", "solder mask"),
    "sst": ("legend", "legend"), "ssb": ("legend", "legend"),
    "edge": ("profile", "board outline"), "edges": ("profile", "board outline"),
    "border": ("profile", "board outline"),
    "drill": ("drill", "drill"), "drills": ("drill", "drill"), "drl": ("drill", "drill"),
    "pth": ("drill", "drill"), "npth": ("drill", "drill"), "holes": ("drill", "drill"),
}  # fmt: skip
_TOP = {"top", "toplayer", "front", "topcopper", "coppertop", "componentside", "component", "cmp"}
_BOTTOM = {"bottom", "bot", "bottomlayer", "back", "bottomcopper", "copperbottom", "copperbot",
           "solderside"}  # fmt: skip
_LAYER = {"l", "layer", "lyr", "ly", "lay", "art"}
_INNER = {"in", "inner", "int", "internal", "mid", "midlayer", "innerlayer", "inr"}
_ROLES: dict[str, Role] = {
    "gnd": "ground", "ground": "ground", "agnd": "ground", "dgnd": "ground", "vss": "ground",
    "plane": "ground",
    "pwr": "supply", "power": "supply", "vcc": "supply", "vdd": "supply", "supply": "supply",
    "sig": "signal", "sign": "signal", "signal": "signal", "route": "signal",
}  # fmt: skip


def ending(name: str) -> str:
    """The file's ending in lower case, without the dot; empty if it has none."""
    base = name.rsplit("/", 1)[-1]
    return base.rpartition(".")[2].casefold() if "." in base[1:] else ""


def promises_layer(name: str) -> bool:
    """Whether the ending promises Gerber or drill data.

    Examples
    --------
    >>> [promises_layer(n) for n in ("a.GBR", "a.g2l", "a.drl", "a.pdf", "README")]
    [True, True, True, False, False]
    """
    end = ending(name)
    return end in _GERBER_ENDINGS | _DRILL_ENDINGS or bool(
        _INNER_ENDING.match(end) or _OTHER_ENDING.match(end)
    )


def shared_start(names: Iterable[str]) -> str:
    """What all names begin with, cut back to a separator; it names the project, not a layer.

    Examples
    --------
    >>> shared_start(["radio-top.gbr", "radio-gnd.gbr"]), shared_start(["top.gbr", "topmask.gbr"])
    ('radio-', '')
    """
    stems = [_stem(name) for name in names]
    if len(stems) < 2:
        return ""
    low, high = min(stems), max(stems)
    size = next((i for i, (a, b) in enumerate(zip(low, high, strict=False)) if a != b), len(low))
    if size == len(low) and size == len(high):
        return low
    cut = re.match(r"(.*[-_. ])?", low[:size])
    return cut[0] if cut else ""


def layer_words(name: str, start: str) -> str:
    """The part of a name that tells the layer: without folders, shared start and ending."""
    stem = _stem(name)
    return (stem.removeprefix(start)).strip(" -_.")


def _stem(name: str) -> str:
    base = name.rsplit("/", 1)[-1]
    return base.rpartition(".")[0] if "." in base[1:] else base


def plating(name: str) -> bool | None:
    """Whether a drill file's name says that its holes are plated; ``None`` if it does not say.

    Examples
    --------
    >>> [plating(n) for n in ("a-PTH.drl", "a_npth.drl", "ThruHoleNonPlated.ncd", "a.drl")]
    [True, False, False, None]
    """
    words = _CAMEL.sub(" ", name.rsplit("/", 1)[-1])
    if _NON_PLATED.search(words):
        return False
    return True if _PLATED.search(words) else None


def by_ending(name: str) -> Claim | None:
    """What the ending of a Gerber file's name says, or ``None``.

    Examples
    --------
    >>> by_ending("a.GTL").side, by_ending("a.g2l").number, by_ending("a.gbr")
    ('top', 2, None)
    """
    end = ending(name)
    if end in _EXTENSIONS:
        kind, side, words = _EXTENSIONS[end]
        return Claim(kind, f"the ending .{end} stands for {words}", side, strength=_strength(end))
    inner = _INNER_ENDING.match(end)
    if inner:
        # The l of .g2l counts all layers from the top; .g2 counts inner ones, or all.
        family = "layer" if inner[3] or inner[1] in ("ly", "lyr", "l", "gl") else inner[1]
        role: Role | None = "ground" if inner[1] == "gp" else None
        reason = f"the ending .{end} stands for an inner copper layer"
        return Claim("copper", reason, "inner", family, int(inner[2]), role)
    if _OTHER_ENDING.match(end):
        return Claim("other", f"the ending .{end} stands for a drawing")
    return None


def _strength(end: str) -> int:
    return {"gko": 2, "gm1": 3, "gml": 1}.get(end, 4)


def by_words(words: str) -> Claim | None:
    """What the words of a layer name say, or ``None`` if they say nothing.

    Examples
    --------
    >>> by_words("F_Cu").side, by_words("SIGNAL2-Y").role, by_words("GND_L4").number
    ('top', 'signal', 4)
    >>> by_words("B_Mask").kind, by_words("Edge_Cuts").kind, by_words("widget")
    ('mask', 'profile', None)
    """
    tokens = _TOKEN.findall(_CAMEL.sub(" ", words).casefold())
    joined = "".join(tokens)
    for kind, meaning, parts in _OTHER_WORDS:
        if any(part in joined for part in parts):
            return Claim(kind, f'its name says {meaning} ("{words}")', strength=4)
    if "solder" in tokens and "side" not in tokens:
        return Claim("mask", f'its name says solder mask ("{words}")', strength=4)
    for token in tokens:
        if token in _OTHER_TOKENS:
            kind, meaning = _OTHER_TOKENS[token]
            return Claim(kind, f'its name says {meaning} ("{words}")', strength=4)
    return _copper_words(tokens, words)


def _copper_words(tokens: list[str], words: str) -> Claim | None:
    found = set(tokens)
    reason = f'its name says copper ("{words}")'
    family, number, role = _numbered(tokens)
    if found & _TOP or _follows(tokens, "f", "cu"):
        return Claim("copper", f'its name says top copper ("{words}")', "top", role=role)
    if found & _BOTTOM or _follows(tokens, "b", "cu"):
        return Claim("copper", f'its name says bottom copper ("{words}")', "bottom", role=role)
    if family or role:
        side: Side | None = None if family == "layer" else "inner"
        return Claim("copper", reason, side, family, number, role)
    return None


def _numbered(tokens: list[str]) -> tuple[str, int | None, Role | None]:
    """Count, number and role in a layer name; a count of layers goes before one of roles."""
    role: Role | None = None
    best: tuple[int, str, int | None] = (9, "", None)
    for i, token in enumerate(tokens):
        match = _NUMBERED.match(token)
        if not match:
            continue
        word, digits = match[1], match[2]
        following = [t for t in tokens[i + 1 : i + 3] if t not in ("layer", "plane", "cu")]
        if not digits and following and following[0].isdecimal() and len(following[0]) <= 3:
            digits = following[0]
        number = int(digits) if digits else None
        if word in _ROLES:
            role = role or _ROLES[word]
            best = min(best, (3, _ROLES[word], number), key=lambda b: b[0])
        elif word in _INNER:
            best = min(best, (2, "inner", number), key=lambda b: b[0])
        elif word in _LAYER and number is not None:
            best = min(best, (1, "layer", number), key=lambda b: b[0])
    return best[1], best[2], role


def _follows(tokens: list[str], first: str, second: str) -> bool:
    return any(a == first and b == second for a, b in pairwise(tokens))
