"""Hypothesis profiles and the folder of real boards."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from hypothesis import HealthCheck, settings

settings.register_profile(
    "ci", derandomize=True, deadline=None, suppress_health_check=[HealthCheck.too_slow]
)
settings.register_profile("default", deadline=None, suppress_health_check=[HealthCheck.too_slow])
settings.load_profile("default")


@pytest.fixture(scope="session")
def corpus() -> Path:
    """The folder of real boards named by SPLITCHECK_CORPUS; skips, saying so, without it."""
    folder = os.environ.get("SPLITCHECK_CORPUS")
    if not folder:
        pytest.skip("SPLITCHECK_CORPUS is not set: tests over real boards need their folder")
    return Path(folder)
