"""splitcheck: where a trace's return path is broken, from exported Gerber files alone."""

__version__ = "0.1.0"
