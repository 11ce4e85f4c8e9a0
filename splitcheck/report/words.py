"""Numbers and names as a person can read them: nothing hostile, nothing lost."""

from __future__ import annotations

import re
import unicodedata
from math import floor, isfinite, log10

from rich.cells import cell_len

#: Categories that move the cursor, change the direction of the text, or show nothing at all.
_UNSEEN = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})
_RIGHT_TO_LEFT = frozenset({"R", "AL", "AN"})
#: Ends a stretch written from right to left, so that the numbers after it keep their order.
_LEFT_TO_RIGHT_MARK = "\N{LEFT-TO-RIGHT MARK}"
#: A space at which no line ends. It stands for itself only until the page is written: no name can
#: hold it, for `visible` writes characters of private use as escapes.
STICKY = "\ue000"
_DOTS = "..."
_MARKED = re.compile(r"#(?=#(?:\[|vso\[))", re.IGNORECASE)
_LONGEST = 2000
_COMMAND = re.compile(r"^(\s*)(?=::)")


def visible(text: str) -> str:
    r"""Text with every character that cannot be seen written as its escape.

    A name comes from a file that anybody can have written: it may hold terminal commands, line
    ends, or marks that swap the order of what follows. A name in a script that runs from right to
    left stays as it is and is closed by a left-to-right mark.

    Examples
    --------
    >>> visible("clk\x1b[31m")
    'clk\\x1b[31m'
    >>> visible("a\u202eb")
    'a\\u202eb'
    >>> visible("##[error]x")
    '\\x23#[error]x'
    >>> visible("")
    ''
    """
    if "##" in text:  # how some CI hosts know a command, anywhere in a line
        text = _MARKED.sub(lambda found: _escape(found.group()), text)
    if text.isascii() and text.isprintable():
        return text
    seen = "".join(
        _escape(char) if unicodedata.category(char) in _UNSEEN else char for char in text
    )
    if any(unicodedata.bidirectional(char) in _RIGHT_TO_LEFT for char in seen):
        return seen + _LEFT_TO_RIGHT_MARK
    return seen


def _escape(char: str) -> str:
    code = ord(char)
    if code < 0x100:
        return f"\\x{code:02x}"
    return f"\\u{code:04x}" if code < 0x10000 else f"\\U{code:08x}"


def shorten(text: str, cells: int) -> str:
    """Text made visible and cut in its middle to at most ``cells`` columns of a terminal.

    Both ends stay, because the ends of net names are what tells them apart.

    Examples
    --------
    >>> shorten("/mcu/interface/bus_data_0", 16)
    '/mcu/in...data_0'
    >>> shorten("short", 16)
    'short'
    """
    clipped = text if len(text) <= _LONGEST else text[: _LONGEST // 2] + text[-_LONGEST // 2 :]
    whole = visible(clipped)
    if len(text) <= _LONGEST and _fits(whole, cells):
        return whole
    room = max(cells - len(_DOTS), 2)
    closing = _LEFT_TO_RIGHT_MARK if whole.endswith(_LEFT_TO_RIGHT_MARK) else ""
    whole = whole.removesuffix(_LEFT_TO_RIGHT_MARK)
    head = _ahead(whole, (room + 1) // 2)
    tail = _ahead(whole[::-1], room // 2)[::-1]
    return f"{head}{closing}{_DOTS}{tail}{closing}"


def _fits(text: str, cells: int) -> bool:
    """Whether text takes at most so many columns; marks that take none are counted too."""
    return max(cell_len(text), len(text.removesuffix(_LEFT_TO_RIGHT_MARK))) <= cells


def _ahead(text: str, cells: int) -> str:
    """The longest beginning that fits."""
    end = min(len(text), cells)
    while end and not _fits(text[:end], cells):
        end -= 1
    return text[:end]


def inert(line: str) -> str:
    r"""A line of a log that no CI host takes for a command: it does not begin with two colons.

    A name that two colons begin may come to stand first where a sentence is wrapped.

    Examples
    --------
    >>> inert("  ::error::x"), inert("a::b")
    ('  \\::error::x', 'a::b')
    """
    return _COMMAND.sub(r"\1\\", line)


def quiet(text: str) -> str:
    r"""JSON that means the same and holds no command for a CI host that shows it in a log.

    Examples
    --------
    >>> quiet('{"net": "##[error]x"}')
    '{"net": "\\u0023#[error]x"}'
    """
    return _MARKED.sub(r"\\u0023", text)


def number(value: float) -> str:
    """A number with three significant digits and no exponent below ten million.

    Examples
    --------
    >>> number(0.034567), number(3.14159), number(128.4), number(12345.0), number(0.0)
    ('0.0346', '3.14', '128', '12345', '0')
    """
    if not isfinite(value):
        raise ValueError(f"{value} is not a number that a report may show")
    if value == 0:
        return "0"
    digits = 2 - floor(log10(abs(value)))
    if abs(value) >= 1e7:
        return f"{value:.3g}"
    return f"{value:.{min(max(digits, 0), 6)}f}"


def with_error(value: float, error: float | None) -> str:
    """A value and its error, both to the second digit of the error.

    Examples
    --------
    >>> with_error(3.2145, 0.643), with_error(128.4, 51.0), with_error(0.5, None)
    ('3.21 +-0.64', '128 +-51', '0.500')
    """
    if error is None:
        return number(value)
    if not isfinite(error):
        raise ValueError(f"{error} is not an error that a report may show")
    if error <= 0:
        return f"{number(value)} +-0"
    decimals = min(max(1 - floor(log10(error)), 0), 4)
    return f"{value:.{decimals}f} +-{error:.{decimals}f}"


def plural(count: int, thing: str, many: str = "") -> str:
    """A count with its noun.

    Examples
    --------
    >>> plural(1, "net"), plural(30, "net"), plural(2, "copper-free gap")
    ('1 net', '30 nets', '2 copper-free gaps')
    """
    return f"{count} {thing if count == 1 else many or thing + 's'}"
