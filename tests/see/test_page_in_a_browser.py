"""What a person meets who opens the page: in headless Chromium, over the demo board."""

from __future__ import annotations

import base64
import shutil
import subprocess
from pathlib import Path
from typing import Any

import pytest

from splitcheck.report import htmlpage
from splitcheck.verdict.findings import Report
from splitcheck.verdict.views import Pictures
from tests.see.browser import complaints, opened, programs
from tests.see.conftest import HOSTILE


def cells(window: Any, column: int) -> list[str]:
    """Words in one column of the table, as they stand."""
    script = (
        "return [...document.querySelectorAll('#table tbody tr')]"
        f".map(row => row.children[{column}].textContent)"
    )
    return list(window.execute_script(script))


def box(window: Any) -> list[float]:
    """What the map shows: x, y, width, height in its units."""
    shown = window.execute_script("return document.getElementById('map').getAttribute('viewBox')")
    return [float(part) for part in shown.split()]


def press(window: Any, *keys: str) -> None:
    """Type keys, wherever the focus is."""
    from selenium.webdriver import ActionChains  # noqa: PLC0415

    ActionChains(window).send_keys(*keys).perform()


def heading(window: Any) -> str:
    """What the detail is about."""
    return str(window.execute_script("return document.getElementById('detail-h').textContent"))


def fill(window: Any, field: str, words: str) -> None:
    """Type into a filter, or choose from it."""
    element = window.find_element("id", field)
    if element.tag_name == "input":
        element.clear()
    element.send_keys(words)


def test_it_opens_without_complaints_and_asks_no_network(window: Any) -> None:
    """No error on the console, and nothing is loaded beside the file."""
    assert complaints(window) == []
    assert window.execute_script("return performance.getEntriesByType('resource').length") == 0


def test_its_policy_stops_other_scripts(window: Any) -> None:
    """A script that got in all the same would not run."""
    window.execute_script(
        "const s = document.createElement('script'); s.textContent = 'window.hit = 1';"
        "document.body.append(s)"
    )
    assert window.execute_script("return window.hit") is None
    assert any("Content Security Policy" in words for words in complaints(window))


def test_it_answers_the_four_questions(window: Any, demo: tuple[Report, Pictures]) -> None:
    """Which net is worst, where, why, what would mend it: in words, before anything is clicked."""
    worst = demo[0].findings[0]
    shown = window.find_element("id", "short").text
    assert worst.net in shown
    assert f"x {worst.at_mm[0]:.3f} y {worst.at_mm[1]:.3f} mm" in shown
    assert worst.reason in shown
    assert worst.proposals[0].words[1:] in shown
    assert f"{worst.source.file}:{worst.source.line}" in shown


def test_the_table_filters(window: Any, demo: tuple[Report, Pictures]) -> None:
    """By net, level, kind, layer and gap; one way back to all."""
    findings = demo[0].findings
    assert cells(window, 0) == [f.id for f in findings]
    fill(window, "f-net", "lcd")
    assert cells(window, 2) == ["LCD_E"]
    window.find_element("css selector", "button[type=reset]").click()
    window.implicitly_wait(1)
    assert len(cells(window, 0)) == len(findings)
    for field, value, expected in (
        ("f-level", "warning", [f.id for f in findings if f.level == "warning"]),
        ("f-kind", "no-plane", [f.id for f in findings if f.kind == "no-plane"]),
        ("f-layer", "L4-bottom", [f.id for f in findings if f.layer == "L4-bottom"]),
        ("f-gap", findings[0].gap, [f.id for f in findings if f.gap == findings[0].gap]),
    ):
        fill(window, field, value)
        assert cells(window, 0) == expected, field
        assert str(len(expected)) in window.find_element("id", "count").text
        window.find_element("css selector", "button[type=reset]").click()
    window.find_element("id", "f-one").click()
    assert len(cells(window, 0)) == len({f.gap for f in findings})
    hidden = window.execute_script("return document.querySelectorAll('#marks [hidden]').length")
    assert hidden == len(findings) - len({f.gap for f in findings})


def test_the_table_sorts(window: Any) -> None:
    """By every column, either way; a column says how it is sorted."""
    window.find_element("css selector", "[data-sort=net]").click()
    names = cells(window, 2)
    assert names == sorted(names)
    head = window.find_element("css selector", "[data-sort=net]").find_element("xpath", "..")
    assert head.get_attribute("aria-sort") == "ascending"
    window.find_element("css selector", "[data-sort=net]").click()
    assert cells(window, 2) == names[::-1]
    window.find_element("css selector", "[data-sort=mm]").click()
    lengths = [float(words) for words in cells(window, 6)]
    assert lengths == sorted(lengths, reverse=True)
    window.find_element("css selector", "[data-sort=detour]").click()
    assert cells(window, 5)[0] == "none"  # no way back at all is worse than any way


def test_choosing_a_finding_zooms_and_tells(window: Any, demo: tuple[Report, Pictures]) -> None:
    """The map shows its window; the detail names it, draws it and gives its file and line."""
    report, pictures = demo
    finding = next(f for f in report.findings if f.kind == "void-crossing")
    whole = box(window)
    window.find_element("xpath", f"//tbody//button[text()='{finding.id}']").click()
    x, y, wide, high = box(window)
    assert wide < whole[2] / 2
    view = pictures.of(finding.id)
    assert view is not None
    assert wide * 0.01 == pytest.approx(view.window_mm[2] - view.window_mm[0], rel=0.02)
    at = window.execute_script(f"return data.findings[{report.findings.index(finding)}].at")
    assert x < at[0] < x + wide
    assert y < at[1] < y + high
    assert finding.id in heading(window)
    assert finding.net in heading(window)
    shown = window.find_element("id", "detail").text
    assert f"{finding.source.file}:{finding.source.line}" in shown
    assert "Journey of the net" in shown
    drawn = window.find_elements("css selector", "#detail svg.close .st")
    assert len(drawn) == 2  # with the gap and without
    assert window.execute_script("return location.hash") == f"#{finding.id}"
    assert complaints(window) == []


def test_a_link_to_a_finding_opens_it(page: Path) -> None:
    """As mailed to somebody."""
    programs()
    with opened(page) as window:
        window.get(page.as_uri() + "#F3")
        window.refresh()
        assert heading(window).startswith("F3 ")


def test_marks_on_the_map_choose_too(window: Any) -> None:
    """A click on a mark is a click on its row."""
    mark = window.find_element("css selector", "#marks [data-f='9']")
    window.execute_script(
        "arguments[0].dispatchEvent(new MouseEvent('click', {bubbles: true}))", mark
    )
    assert heading(window).startswith("F10 ")


def test_it_works_by_keyboard_alone(window: Any) -> None:
    """Tab leads to the table, arrows from row to row, Enter chooses; keys move and zoom the map."""
    from selenium.webdriver.common.keys import Keys  # noqa: PLC0415

    for _ in range(60):
        press(window, Keys.TAB)
        focused = window.switch_to.active_element
        if (focused.tag_name, focused.text) == ("button", "F1"):
            break
    assert window.switch_to.active_element.text == "F1"
    press(window, Keys.ARROW_DOWN, Keys.ARROW_DOWN)
    assert window.switch_to.active_element.text == "F3"
    press(window, Keys.ENTER)
    assert heading(window).startswith("F3 ")
    assert window.switch_to.active_element.get_attribute("id") == "detail"
    window.execute_script("document.getElementById('map').focus()")
    wide = box(window)[2]
    press(window, "+")
    assert box(window)[2] < wide
    press(window, "0")
    full = box(window)
    assert full[2] > wide
    press(window, Keys.ARROW_RIGHT)
    assert box(window)[0] > full[0]
    assert complaints(window) == []


def test_what_has_the_focus_is_seen(window: Any) -> None:
    """An outline of two pixels or more."""
    from selenium.webdriver.common.keys import Keys  # noqa: PLC0415

    for _ in range(4):
        press(window, Keys.TAB)
    script = (
        "const s = getComputedStyle(document.activeElement);return [s.outlineStyle, s.outlineWidth]"
    )
    style, width = window.execute_script(script)
    assert style == "solid"
    assert float(width.removesuffix("px")) >= 2


def test_the_wheel_zooms_at_the_pointer(window: Any) -> None:
    """What is under the pointer stays there."""
    from selenium.webdriver import ActionChains  # noqa: PLC0415
    from selenium.webdriver.common.actions.wheel_input import ScrollOrigin  # noqa: PLC0415

    element = window.find_element("id", "map")
    window.execute_script("arguments[0].scrollIntoView()", element)
    before = box(window)
    origin = ScrollOrigin.from_element(element, 60, 40)
    under = "const p = place(arguments[0], arguments[1]); return [p.x, p.y]"
    rect = window.execute_script(
        "return document.getElementById('map').getBoundingClientRect().toJSON()"
    )
    spot = (rect["x"] + rect["width"] / 2 + 60, rect["y"] + rect["height"] / 2 + 40)
    was = window.execute_script(under, *spot)
    ActionChains(window).scroll_from_origin(origin, 0, -200).perform()
    window.execute_async_script("requestAnimationFrame(() => arguments[0]())")
    assert box(window)[2] < before[2]
    is_now = window.execute_script(under, *spot)
    assert is_now == pytest.approx(was, abs=0.02 * before[2])


def test_dragging_moves_the_map(window: Any) -> None:
    """By as much as the pointer moves."""
    from selenium.webdriver import ActionChains  # noqa: PLC0415

    element = window.find_element("id", "map")
    before = box(window)
    ActionChains(window).move_to_element_with_offset(
        element, 150, 100
    ).click_and_hold().move_by_offset(-80, 0).release().perform()
    after = box(window)
    assert after[0] > before[0]
    assert after[2] == pytest.approx(before[2], rel=1e-3)


def test_two_fingers_zoom(window: Any) -> None:
    """Spread apart, the map comes nearer."""
    element = window.find_element("id", "map")
    window.execute_script("arguments[0].scrollIntoView()", element)
    rect = window.execute_script(
        "return document.getElementById('map').getBoundingClientRect().toJSON()"
    )
    x, y = rect["x"] + rect["width"] / 2, rect["y"] + rect["height"] / 2
    before = box(window)

    def touch(kind: str, *apart: float) -> None:
        points = [
            {"x": x + side * a, "y": y, "id": n} for a in apart for n, side in enumerate((-1, 1))
        ]
        window.execute_cdp_cmd("Input.dispatchTouchEvent", {"type": kind, "touchPoints": points})

    touch("touchStart", 30)
    for apart in (45, 60, 80):
        touch("touchMove", apart)
    touch("touchEnd")
    assert box(window)[2] < 0.8 * before[2]


@pytest.mark.parametrize(("wish", "dark"), [("dark", True), ("light", False)])
def test_it_is_dark_where_the_reader_wishes_so(window: Any, wish: str, *, dark: bool) -> None:
    """By the setting of the system."""
    features = [{"name": "prefers-color-scheme", "value": wish}]
    window.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": features})
    colour = window.execute_script(
        "return getComputedStyle(document.documentElement).backgroundColor"
    )
    light = sum(int(part) for part in colour.strip("rgb()").split(",")) > 380
    assert light is not dark


def test_it_fits_a_narrow_window(page: Path) -> None:
    """A telephone: nothing makes the page wider than the screen."""
    programs()
    with opened(page, wide=500, high=900) as window:
        width = window.execute_script("return document.documentElement.scrollWidth")
        assert width <= window.execute_script("return window.innerWidth")


def test_printed_it_is_legible(window: Any, demo: tuple[Report, Pictures], tmp_path: Path) -> None:
    """The PDF says which net, where, why, what was assumed and every row; on light paper."""
    if shutil.which("pdftotext") is None:
        pytest.skip("no pdftotext here: apt-get install poppler-utils")
    dark = [{"name": "prefers-color-scheme", "value": "dark"}]
    window.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": dark})
    file = tmp_path / "page.pdf"
    file.write_bytes(base64.b64decode(window.print_page()))
    found = subprocess.run(
        ["pdftotext", "-layout", str(file), "-"], capture_output=True, text=True, check=True
    ).stdout
    told = " ".join(found.split())
    worst = demo[0].findings[0]
    for words in (worst.net, worst.id, "Caution", "Assumed", "Why it counts", "What would mend it"):
        assert words in told
    for finding in demo[0].findings:
        assert f"{finding.id} " in told
    assert demo[0].assumptions[0][:60] in told


def test_hostile_names_stay_text(hostile: tuple[Report, Pictures], tmp_path: Path) -> None:
    """Nothing that a file calls a net, a layer or a board runs or becomes an element."""
    file = tmp_path / "hostile.html"
    file.write_text(htmlpage.render(hostile[0], None, hostile[1]), encoding="utf-8")
    programs()
    with opened(file) as window:
        assert complaints(window) == []
        shown = cells(window, 2)
        assert HOSTILE[0] in shown
        assert HOSTILE[1] in shown
        for row in range(len(hostile[0].findings)):
            window.execute_script(f"choose({row}, true)")
            assert window.execute_script("return window.hit") is None
        assert not window.find_elements("css selector", "img, [onerror], [onload], [onmouseover]")
        assert window.execute_script("return document.scripts.length") == 3
        title = window.execute_script("return document.title")
        assert title.startswith(HOSTILE[1])
        assert complaints(window) == []
