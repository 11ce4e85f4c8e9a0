"""Where the process begins and ends: every error becomes one line and an exit code."""

from __future__ import annotations

import sys
import traceback
from collections.abc import Sequence
from pathlib import Path
from typing import NoReturn

import typer

from splitcheck.cli import gate, mend, show, streams
from splitcheck.cli.commands import app
from splitcheck.errors import SplitcheckError

#: Rooms that add commands of their own to the app when they are imported.
MORE_COMMANDS = (gate, mend, show)
#: Exit codes; they are told in every help text and in README.
CLEAN, FOUND, AT_FAULT, CRASHED, STOPPED = 0, 1, 2, 3, 130


def main() -> NoReturn:
    """Run the command line of this process."""
    sys.exit(run(sys.argv[1:]))


def run(arguments: Sequence[str]) -> int:
    """Run one command and return its exit code; nothing but ``SystemExit`` by Python itself leaves.

    Returns
    -------
    0 nothing at or above the threshold, 1 findings, 2 the input or the call is at fault, 3 our own
    crash, 130 stopped from the keyboard.
    """
    streams.prepare()
    command = typer.main.get_command(app)
    try:
        code = command.main(list(arguments), prog_name="splitcheck", standalone_mode=False)
    except (KeyboardInterrupt, typer.Abort):
        streams.complain("stopped")
        return STOPPED
    except Exception as error:
        code = _at_fault(error) if _is_fault_of_input(error) else _crashed(error)
        if "--debug" in arguments:
            streams.complain_raw("".join(traceback.format_exception(error)))
        return code
    return code if isinstance(code, int) else CLEAN


def _is_fault_of_input(error: Exception) -> bool:
    """Whether an error is about the input or the call, not about this program."""
    if isinstance(error, OSError):
        return error.filename is not None
    return isinstance(error, SplitcheckError | typer.TyperException)


def _at_fault(error: Exception) -> int:
    """Say in one line what is wrong with the input or the call."""
    match error:
        case SplitcheckError():
            streams.complain(str(error))
        case OSError():
            what = f"{error.filename}: {error.strerror or error}"
            streams.complain(f"{what}; check that it exists and may be read or written")
        case typer.TyperException():
            streams.complain(_call(error))
    return AT_FAULT


def _call(error: typer.TyperException) -> str:
    """A wrong call in our own form: place, what is wrong, what to do."""
    context = getattr(error, "ctx", None)
    path = context.command_path if context is not None else "splitcheck"
    wrong = " ".join(error.format_message().split()).removesuffix(".")
    return f"call: {wrong[:1].lower()}{wrong[1:]}; see {path} --help"


def _crashed(error: Exception) -> int:
    """Say in one line that the fault is ours, and where it is."""
    frames = traceback.extract_tb(error.__traceback__)
    where = f" at {Path(frames[-1].filename).name}:{frames[-1].lineno}" if frames else ""
    what = f"{type(error).__name__}: {error}"
    streams.complain(
        f"crash{where}: this is our fault, not your board's ({what}); "
        "run it again with --debug and report the traceback"
    )
    return CRASHED
