"""Arguments in, text and exit code out; the only room that prints or exits."""

import os

# The road spreads its work over the cores itself; threads inside each small matrix would only
# fight for them. It must be said before numpy is first imported.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from splitcheck.cli.entry import main, run

__all__ = ["main", "run"]
