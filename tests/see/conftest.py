"""Pages of the demo board, and a window on each."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from splitcheck import road
from splitcheck.report import htmlpage
from splitcheck.verdict.findings import Report
from splitcheck.verdict.views import Pictures
from tests.see.browser import opened, programs

#: Names as somebody might write them who wishes the reader ill.
HOSTILE = (
    "<img src=x onerror=window.hit=1>",
    "</script><script>window.hit=1</script>",
    '"onmouseover="window.hit=1',
    "{{ 7*7 }}<!--",
    "a\u202eb\u2028c",
    "&lt;b&gt;",
    "';window.hit=1;//",
    "]]><svg onload=window.hit=1>",
)


@pytest.fixture(scope="session")
def demo() -> tuple[Report, Pictures]:
    """The demo board, looked at and drawn."""
    options = road.Options(jobs=1)
    walked = road.look(road.fixtures_folder() / "demo", options)
    return road.illustrate(walked, options)


@pytest.fixture(scope="session")
def page(demo: tuple[Report, Pictures], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The page of the demo board."""
    file = tmp_path_factory.mktemp("see") / "demo.html"
    file.write_text(htmlpage.render(demo[0], None, demo[1]), encoding="utf-8")
    return file


@pytest.fixture(scope="session")
def browser(request: pytest.FixtureRequest) -> Iterator[Any]:
    """One browser for all tests."""
    programs()
    with opened(request.getfixturevalue("page")) as opening:
        yield opening


@pytest.fixture
def window(browser: Any, page: Path) -> Any:
    """The page of the demo board in a browser, as when it is opened."""
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": []})
    browser.get("about:blank")
    browser.get_log("browser")
    browser.get(page.as_uri())
    return browser


@pytest.fixture(scope="session")
def hostile(demo: tuple[Report, Pictures]) -> tuple[Report, Pictures]:
    """The demo board with names of nets, layers and files that try to get out."""
    report, pictures = demo
    new = {f.net: HOSTILE[k % len(HOSTILE)] for k, f in enumerate(report.findings)}
    findings = tuple(
        replace(
            f,
            net=new[f.net],
            layer=HOSTILE[0],
            plane_net=HOSTILE[1],
            reason=HOSTILE[1] + f.reason,
            source=replace(f.source, file=HOSTILE[7]),
        )
        for f in report.findings
    )
    nets = tuple(replace(net, name=new.get(net.name, net.name)) for net in report.nets)
    board = replace(
        pictures.board,
        nets=tuple(replace(net, name=new[net.name]) for net in pictures.board.nets),
        layers=tuple(replace(layer, name=HOSTILE[0]) for layer in pictures.board.layers),
    )
    views = tuple(
        replace(view, islands=tuple((HOSTILE[7], at) for _, at in view.islands))
        for view in pictures.findings
    )
    return (
        replace(
            report,
            board=HOSTILE[1],
            findings=findings,
            nets=nets,
            assumptions=(HOSTILE[0], *report.assumptions),
        ),
        replace(pictures, board=board, findings=views),
    )
