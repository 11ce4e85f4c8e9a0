"""Patterns of net names: of whole names, and of words in them.

A net's name is written in as many ways as there are tools. ``spellings`` brings it into one: the
last part of its path, in capitals, its words joined by ``_``, ``+`` and ``-`` at the end as ``P``
and ``N``, marks of active-low signals dropped. In patterns ``*`` stands for any text, ``?`` for one
character and ``#`` for a number; capitals and small letters are the same.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from functools import lru_cache

from splitcheck.board.names import last_part

#: Longer patterns are refused; with so few characters a match takes no time to speak of.
LONGEST_PATTERN = 120
#: Names of parts with fewer letters are designators.
LEAST_LETTERS = 4
#: Longer names are cut before they are compared with words.
LONGEST_NAME = 300

#: What a schematic program makes up where nobody names a net: a reference and a pin.
_MADE_UP = re.compile(r"^(?:NET|UNCONNECTED)-\([^-]+-(?P<pin>.+)\)$")
_MADE_UP_PAD = re.compile(r"^(?:NET|UNCONNECTED)-\((?P<part>.+)-PAD[A-Z]{0,2}\d*(?:\.\d+)?\)$")
_PAD_ONLY = re.compile(r"^(?:PAD[A-Z]{0,2}\d*(?:\.\d+)?|.)$")
_NOT_WORD = re.compile(r"[^A-Z0-9]+")
_PLUS = re.compile(r"\+(?=$|[^A-Z0-9+])")
_MINUS = re.compile(r"(?<=[A-Z0-9\])])-$")
_LOW = re.compile(r"(?<=[A-Z0-9\])])[#*]+$")


def spellings(name: str) -> tuple[str, ...]:
    r"""The names of a net as words: one spelling for each name it has.

    Copper that ties nets has their names joined by ``|``; pins of several uses have theirs joined
    by ``\`` or ``{slash}``. Of a name that a schematic program made up from a pin, the pin's name
    is kept, if it has one; a mere pad number says nothing and is left out.

    Examples
    --------
    >>> spellings("/mcu/I2C1.SDA"), spellings("USB_D-"), spellings("MDI[0]+"), spellings("PERST#")
    (('I2C1_SDA',), ('USB_D_N',), ('MDI_0_P',), ('PERST',))
    >>> spellings("Net-(U17-SW)"), spellings("Net-(R1-Pad2)"), spellings("GPIO5\\LED1|CLK")
    (('SW',), (), ('GPIO5', 'LED1', 'CLK'))
    """
    found: list[str] = []
    for one in name[:LONGEST_NAME].upper().replace("{SLASH}", "\\").split("|"):
        made_up = _MADE_UP.match(one)
        if made_up is None:
            plain = last_part(one)
        else:
            plain = re.sub(r"-PAD\w*$", "", made_up["pin"])
            if _PAD_ONLY.match(plain):
                continue
        found.extend(_words(part) for part in plain.split("\\"))
    return tuple(dict.fromkeys(word for word in found if word))


def part_spelling(name: str) -> str:
    """The name of the part that a made-up name of a net tells, if it is a word; else "".

    Designators of one to three letters (R, FB, LED, CON) say what a part is, not what it carries.

    Examples
    --------
    >>> [part_spelling(name) for name in ("Net-(DBG_UART1-Pad1)", "Net-(R12-Pad2)", "Net-(U3-SW)")]
    ['DBG_UART1', '', '']
    """
    made_up = _MADE_UP_PAD.match(name[:LONGEST_NAME].upper())
    if made_up is None:
        return ""
    part = last_part(made_up["part"])
    return _words(part) if sum(map(str.isalpha, part)) >= LEAST_LETTERS else ""


def _words(name: str) -> str:
    name = _LOW.sub("", name.strip())
    name = _MINUS.sub("_N", _PLUS.sub("_P_", name))
    return _NOT_WORD.sub("_", name).strip("_")


class Words:
    """Patterns of words: one matches if its words stand somewhere in a name, whole, in a row."""

    def __init__(self, patterns: Iterable[str]) -> None:
        parts = [_in_words(pattern) for pattern in patterns]
        self._any = re.compile("|".join(parts)) if parts else None

    def match(self, spelling: str) -> bool:
        """Whether any of the patterns matches one spelling of a name.

        Examples
        --------
        >>> words = Words(["SCL", "SCL#", "USB*_D_P"])
        >>> [words.match(name) for name in ("I2C1_SCL", "SCL2", "SCLK", "USB_OTG_D_P", "USB2_D_P")]
        [True, True, False, False, True]
        """
        return bool(spelling and self._any and self._any.search(spelling))


def _in_words(pattern: str) -> str:
    words = re.sub(r"[^A-Z0-9*?#]+", "_", pattern.upper()).strip("_")
    return rf"(?:^|_){_expression(words, one='[^_]')}(?=_|$)"


class Names:
    """Patterns of whole names, with their path or without it."""

    def __init__(self, patterns: Iterable[str]) -> None:
        self._patterns = [(pattern.upper(), _whole(pattern.upper())) for pattern in patterns]

    def match(self, name: str) -> bool:
        """Whether any of the patterns matches a net's name, or one of the names that it has.

        Examples
        --------
        >>> names = Names(["ddr_*", "/cam/D?"])
        >>> [names.match(name) for name in ("/ram/DDR_A0", "/cam/D3", "D3", "X|DDR_CK")]
        [True, True, False, True]
        """
        ways = ways_to_write(name)
        return any(
            way == literal or expression.match(way)
            for literal, expression in self._patterns
            for way in ways
        )


def ways_to_write(name: str) -> tuple[str, ...]:
    r"""A net's name as patterns of whole names may call it, in capitals.

    Examples
    --------
    >>> ways_to_write("/io/Sync|LED")
    ('/IO/SYNC|LED', '/IO/SYNC', 'SYNC', 'LED')
    """
    ways = [name.upper()]
    for one in name.upper().split("|"):
        ways.extend((one, one.rsplit("/", 1)[-1]))
    return tuple(dict.fromkeys(ways))


def is_pattern(text: str) -> bool:
    """Whether a text has a character that stands for others."""
    return any(mark in text for mark in "*?#")


@lru_cache(maxsize=4096)
def _whole(pattern: str) -> re.Pattern[str]:
    return re.compile(_expression(pattern, one=".") + r"\Z", re.DOTALL)


def _expression(pattern: str, *, one: str) -> str:
    """A regular expression for a pattern; ``one`` is what any one character may be.

    Between two ``*`` the first place that fits is as good as any later one, so nothing is tried
    twice (``(?>``, ``++``): the time is the length of the name for every piece, whatever they are.
    """
    first, *rest = [_piece(piece, one) for piece in re.split(r"\*+", pattern)]
    if not rest:
        return first
    middle: Sequence[str] = rest[:-1]
    return first + "".join(f"(?>{one}*?{piece})" for piece in middle) + f"{one}*{rest[-1]}"


def _piece(text: str, one: str) -> str:
    marks = {"?": one, "#": r"\d++"}
    return "".join(marks.get(letter) or re.escape(letter) for letter in text)
