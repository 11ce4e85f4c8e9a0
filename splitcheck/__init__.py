"""splitcheck: where a trace's return path is broken, from exported Gerber files alone."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from splitcheck.loops.of_polygons import added_inductance

__all__ = ["__version__", "added_inductance"]

__version__ = "0.1.0"


def __getattr__(name: str) -> object:
    """Load the field solve only when it is asked for: the command line starts without it."""
    if name == "added_inductance":
        from splitcheck.loops.of_polygons import added_inductance  # noqa: PLC0415

        return added_inductance
    message = f"module {__name__!r} has no attribute {name!r}"
    raise AttributeError(message)
