"""A road that leads nowhere: it hands out the small report and remembers how it was asked."""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from types import ModuleType

import pytest

import splitcheck
from splitcheck.verdict.findings import Report
from tests.report import made


@dataclass(frozen=True, slots=True)
class Options:
    """The options of the road, as the commands must fill them."""

    nets: tuple[str, ...] = ()
    layers: tuple[str, ...] = ()
    min_nh: float = 0.05
    stack: Path | None = None
    jobs: int | None = None


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


def write_demo(folder: Path) -> Path:
    """Make the folder."""
    folder.mkdir(parents=True, exist_ok=True)
    return folder


@pytest.fixture
def road(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Road:
    """The commands run over this road, in an empty folder, without colour wishes around."""
    fake = Road(made.pump())
    module = ModuleType("splitcheck.road")
    parts: dict[str, Callable[..., object]] = {
        "Options": Options,
        "rank": fake.rank,
        "read": fake.read,
        "write_demo": write_demo,
    }
    for name, part in parts.items():
        setattr(module, name, part)
    monkeypatch.setitem(sys.modules, "splitcheck.road", module)
    monkeypatch.setattr(splitcheck, "road", module, raising=False)
    for name in ("NO_COLOR", "FORCE_COLOR", "CLICOLOR", "CLICOLOR_FORCE", "TERM", "COLUMNS"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.chdir(tmp_path)
    return fake
