"""The day it is: for waivers that end."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import UTC, date, datetime

from splitcheck.errors import SplitcheckError

#: The variable that builds meant to be repeated byte by byte are told their time by, in seconds
#: since 1970 (reproducible-builds.org).
VARIABLE = "SOURCE_DATE_EPOCH"


def today(environment: Mapping[str, str]) -> date:
    """The day of ``SOURCE_DATE_EPOCH``, if it is set, else the day of the clock; both in UTC.

    Raises
    ------
    SplitcheckError
        If the variable is no number of seconds.

    Examples
    --------
    >>> today({"SOURCE_DATE_EPOCH": "86400"}).isoformat()
    '1970-01-02'
    """
    stated = environment.get(VARIABLE, "")
    if not stated:
        return datetime.now(UTC).date()
    try:
        return datetime.fromtimestamp(int(stated), UTC).date()
    except (ValueError, OverflowError, OSError) as error:
        wrong = f"{stated[:40]!a} is no number of seconds"
        raise SplitcheckError(VARIABLE, wrong, "give seconds since 1970, or unset it") from error
