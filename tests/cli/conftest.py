"""A road that leads nowhere: it hands out the small report and remembers how it was asked."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import pytest

from splitcheck.road import Options
from splitcheck.verdict.findings import Report
from tests.report import made


@dataclass
class Road:
    """What the commands see of the road."""

    report: Report
    asked: list[tuple[str, Path, Options]] = field(default_factory=list)
    error: BaseException | None = None

    def rank(self, path: Path, options: Options, progress: object = None) -> Report:
        """Hand out the report, or fail as told."""
        return self._answer("rank", path, options)

    def read(self, path: Path, options: Options, progress: object = None) -> Report:
        """Hand out the report, or fail as told."""
        return self._answer("read", path, options)

    def _answer(self, name: str, path: Path, options: Options) -> Report:
        self.asked.append((name, path, options))
        if self.error is not None:
            raise self.error
        return self.report


@pytest.fixture
def road(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Road:
    """The commands run over this road, in an empty folder, without colour wishes around."""
    fake = Road(made.pump())
    monkeypatch.setattr("splitcheck.road.rank", fake.rank)
    monkeypatch.setattr("splitcheck.road.read", fake.read)
    for name in ("NO_COLOR", "FORCE_COLOR", "CLICOLOR", "CLICOLOR_FORCE", "TERM", "COLUMNS"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.chdir(tmp_path)
    return fake
