"""A Gerber text cut into words and extended commands, in linear time, each with its line."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from splitcheck.errors import SplitcheckError

#: One word: blank before it, G code, X, Y, I, J, D code, and whatever else, up to its star.
#: Every part is optional and the last takes anything, so a match never backtracks far.
WORD = re.compile(
    r"(\s*)(?:G0*(\d{1,3}))?(?:X([+-]?\d{1,18}))?(?:Y([+-]?\d{1,18}))?"
    r"(?:I([+-]?\d{1,18}))?(?:J([+-]?\d{1,18}))?(?:D0*(\d{1,9}))?([^*]*)\*"
)
#: Straight draws one after another, X and Y both given: most of any file, taken all at once.
_DRAW = r"X[+-]?\d{1,11}Y[+-]?\d{1,11}D0*1\*"
RUN = re.compile(rf"{_DRAW}(?:\s*{_DRAW}){{7,}}")
_RUN_SIGNS = str.maketrans("XYD*", "    ")
_COMMENT = re.compile(r"\s*G0*4(?!\d)")
_LETTERS = 4096


_PART = re.compile(r"([A-Z])([+-]?\d*\.?\d*)")
_MOST_DIGITS = 18


class Block(NamedTuple):
    """A stretch of words, or the inside of one ``%...%``."""

    extended: bool
    text: str
    line: int
    whole: bool = True
    """False if its last star or percent sign is missing."""
    last: bool = False
    """The text ends here."""


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
    at = 1 if text.startswith("\ufeff") else 3 if text.startswith("\xef\xbb\xbf") else 0
    line = 1
    while at < len(text):
        percent = text.find("%", at)
        end = len(text) if percent < 0 else percent
        words = text[at:end]
        if percent >= 0 and _COMMENT.match(words, words.rfind("*") + 1):
            star = text.find("*", percent)
            percent, end = -1, len(text) if star < 0 else star + 1
            words = text[at:end]
            # Some write a whole command into a comment, "G04 #@! %TF...*%*": its end belongs to it.
            if words.count("%") % 2 and text.startswith("%", end):
                end += 2 if text.startswith("%*", end) else 1
        if words:
            yield from _words(words, line, last=end == len(text))
            line += words.count("\n")
        at = end
        if percent < 0:
            continue
        close = text.find("%", percent + 1)
        inside = text[percent + 1 :] if close < 0 else text[percent + 1 : close]
        yield Block(True, inside, line, whole=close >= 0, last=close < 0)
        line += inside.count("\n")
        at = len(text) if close < 0 else close + 1


def _words(text: str, line: int, *, last: bool) -> Iterator[Block]:
    """Whole words, then what follows the last star, if it is more than blank."""
    star = text.rfind("*") + 1
    if star:
        yield Block(False, text[:star], line)
    rest = text[star:]
    if rest.strip(" \t\r\n\f\x1a\0"):
        before = len(text) - len(rest.lstrip())
        yield Block(False, rest.strip(), line + text.count("\n", 0, before), False, last)


def run_numbers(run: str) -> NDArray[np.int64]:
    """Digits of a run, shape (n, 2), in units of the file's last decimal.

    Examples
    --------
    >>> run_numbers("X1Y-2D01*X30Y4D1*").tolist()
    [[1, -2], [30, 4]]
    """
    numbers = np.fromstring(run.translate(_RUN_SIGNS), dtype=np.int64, sep=" ")
    return numbers.reshape(-1, 3)[:, :2]


def in_order(word: str) -> list[dict[str, str]] | None:
    """A word of any order and spacing as values by letter; a repeated letter starts another.

    Returns
    -------
    Values of G, X, Y, I, J, D or M, numbers all; ``None`` if it is no such word.

    Examples
    --------
    >>> in_order("G01 Y1 X2D2"), in_order("G01G75"), in_order("QQ")
    ([{'G': '01', 'Y': '1', 'X': '2', 'D': '2'}], [{'G': '01'}, {'G': '75'}], None)
    """
    compact = "".join(word.split()).upper()
    parts = _PART.findall(compact)
    if not parts or sum(1 + len(value) for _, value in parts) != len(compact):
        return None
    words: list[dict[str, str]] = [{}]
    for letter, value in parts:
        if letter == "N":
            # Sequence numbers of old files.
            continue
        if letter not in "GXYIJDM" or not 0 < sum(map(str.isdigit, value)) <= _MOST_DIGITS:
            return None
        if letter in "GDM" and (
            not value.isdigit() or len(value.lstrip("0")) > 3 + 6 * (letter == "D")
        ):
            return None
        if letter in words[-1]:
            words.append({})
        words[-1][letter] = value
    return words
