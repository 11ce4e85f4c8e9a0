"""Words of the user to the names they mean, exact or by ``*`` and ``?``; none is an error."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from difflib import get_close_matches
from fnmatch import fnmatchcase

from splitcheck.errors import SplitcheckError

_NEAR = 3
#: Comparing names costs the product of their lengths: longer ones are compared by their start.
_COMPARED = 80


def choose(names: Iterable[str], words: Sequence[str], option: str) -> frozenset[str]:
    """Choose the names that at least one word means.

    Parameters
    ----------
    names
        All there are.
    words
        Each an exact name or a pattern: ``*`` any text, ``?`` any character, ``[ab]`` one of
        these. If a name equals the word, that alone is meant: ``D[0]`` is the net D[0].
    option
        The option the words came with, for the message: ``--net``.

    Returns
    -------
    The names meant; empty only if there are no words.

    Raises
    ------
    SplitcheckError
        If a word means no name; the names nearest to it are told.

    Examples
    --------
    >>> sorted(choose(["CLK", "D[0]", "D[1]"], ["D*"], "--net"))
    ['D[0]', 'D[1]']
    >>> sorted(choose(["CLK", "D[0]", "D[1]"], ["D[0]"], "--net"))
    ['D[0]']
    >>> choose(["CLK"], [], "--net")
    frozenset()
    """
    there = sorted(set(names))
    meant: set[str] = set()
    for word in words:
        found = [word] if word in there else [name for name in there if fnmatchcase(name, word)]
        if not found:
            raise SplitcheckError(f"{option} {word}", "nothing of that name", _advice(there, word))
        meant.update(found)
    return frozenset(meant)


def _advice(there: Sequence[str], word: str) -> str:
    """What the user may have meant: the same in other letters, else the names nearest to it."""
    folded = word.casefold()
    same = [n for n in there if n.casefold() == folded or fnmatchcase(n.casefold(), folded)]
    by_start = {name[:_COMPARED].casefold(): name for name in reversed(there)}
    bare = folded.replace("*", "").replace("?", "")[:_COMPARED]
    near = same[:_NEAR] or [by_start[key] for key in get_close_matches(bare, by_start, _NEAR, 0.5)]
    if near:
        return f"near it are {', '.join(near)}"
    return "`splitcheck read` lists all names"
