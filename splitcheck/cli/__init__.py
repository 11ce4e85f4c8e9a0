"""Arguments in, text and exit code out; the only room that prints or exits."""

from splitcheck.cli.entry import main, run

__all__ = ["main", "run"]
