"""The shared small report as a fixture."""

from __future__ import annotations

import pytest

from splitcheck.verdict.findings import Report
from tests.report import made


@pytest.fixture
def pump() -> Report:
    """A four-layer board: a bus of four over one slot, a split, and a corner without plane."""
    return made.pump()
