"""A Gerber text cut into words and extended commands, in linear time, each with its line."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import NamedTuple

from splitcheck.errors import SplitcheckError

#: One word: blank before it, G code, X, Y, I, J, D code, and whatever else, up to its star.
#: Every part is optional and the last takes anything, so a match never backtracks far.
WORD = re.compile(
    r"(\s*)(?:G0*(\d{1,3}))?(?:X([+-]?\d+))?(?:Y([+-]?\d+))?(?:I([+-]?\d+))?(?:J([+-]?\d+))?"
    r"(?:D0*(\d{1,9}))?([^*]*)\*"
)
_COMMENT = re.compile(r"\s*G0*4(?!\d)")
_LETTERS = 4096


class Block(NamedTuple):
    """A stretch of words, or the inside of one ``%...%``."""

    extended: bool
    text: str
    line: int
    whole: bool = True
    """False if the text ends in the middle of it."""


def check_is_text(text: str, name: str) -> None:
    """Refuse what is no Gerber file at all.

    Raises
    ------
    SplitcheckError
        Nothing in it, control characters as in a binary file, or no command at all.
    """
    head = text[:_LETTERS]
    if not head.strip():
        if not text.strip():
            raise SplitcheckError(name, "the file is empty", "export it again")
        head = text.lstrip()[:_LETTERS]
    odd = sum(1 for c in head if (c < " " and c not in "\t\r\n\f\x1a") or c in "\x7f\ufffd")
    if odd > len(head) // 50 + 1 or "\0" in head:
        wrong = f"{odd} of its first {len(head)} characters are not text: this is no Gerber file"
        raise SplitcheckError(name, wrong, "take it out of the folder or export it again")
    if "*" not in text:
        raise SplitcheckError(
            name, "no Gerber command in it", "take it out of the folder or export it again"
        )


def blocks(text: str) -> Iterator[Block]:
    """Cut a text at its percent signs; those inside ``G04`` comments do not count."""
    at = 0
    line = 1
    while at < len(text):
        percent = text.find("%", at)
        if percent < 0:
            yield from _words(text[at:], line)
            return
        words = text[at:percent]
        if words and _COMMENT.match(words, words.rfind("*") + 1):
            star = text.find("*", percent)
            percent = len(text) if star < 0 else star + 1
            words = text[at:percent]
            yield from _words(words, line)
            line += words.count("\n")
            at = percent
            continue
        if words:
            yield from _words(words, line)
            line += words.count("\n")
        end = text.find("%", percent + 1)
        inside = text[percent + 1 :] if end < 0 else text[percent + 1 : end]
        yield Block(True, inside, line, end >= 0)
        line += inside.count("\n")
        at = len(text) if end < 0 else end + 1


def _words(text: str, line: int) -> Iterator[Block]:
    """Whole words, then what follows the last star, if it is more than blank."""
    star = text.rfind("*") + 1
    if star:
        yield Block(False, text[:star], line)
    rest = text[star:]
    if rest.strip(" \t\r\n\f\x1a\0"):
        line += text.count("\n", 0, star) + (len(rest) - len(rest.lstrip()) and _newlines(rest))
        yield Block(False, rest.strip(), line, whole=False)


def _newlines(rest: str) -> int:
    return rest[: len(rest) - len(rest.lstrip())].count("\n")
