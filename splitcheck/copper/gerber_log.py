"""Where the reader is in a file, what it found odd there, and how it gives up."""

from __future__ import annotations

from typing import NoReturn

from splitcheck.errors import SplitcheckError


class Log:
    """Name and present line of the file being read; oddities by kind, each told once."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.line = 1
        self._remarks: dict[str, list[int]] = {}

    def remark(self, text: str) -> None:
        """Note something odd that could be read all the same."""
        held = self._remarks.setdefault(text, [self.line, 0])
        held[1] += 1

    def told(self) -> tuple[str, ...]:
        """Remarks in file order: the first line of each kind, and how often it came."""
        told = []
        for text, (line, count) in self._remarks.items():
            more = f" ({count} times)" if count > 1 else ""
            told.append((line, f"{self.name}:{line}: {text}{more}"))
        return tuple(text for _, text in sorted(told))

    def place(self, line: int | None = None) -> str:
        """``file:line``, of the present line or another."""
        return f"{self.name}:{self.line if line is None else line}"

    def fail(
        self, wrong: str, do: str = "export the file again", line: int | None = None
    ) -> NoReturn:
        """Give up on the file."""
        raise SplitcheckError(self.place(line), wrong, do)

    def unreadable(self, command: str) -> NoReturn:
        """Give up on a command that makes no sense."""
        self.fail(f"the command {command[:40]!r} cannot be read")
