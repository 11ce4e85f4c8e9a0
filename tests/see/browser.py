"""A headless browser for the tests that look at pages, if this machine has one."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pytest

BROWSERS = ("chromium", "chromium-browser", "google-chrome")
DRIVER = "chromedriver"


def programs() -> tuple[str, str]:
    """Browser and driver; skips the test, saying so, where one is missing."""
    browser = next((path for name in BROWSERS if (path := shutil.which(name))), None)
    driver = shutil.which(DRIVER)
    if browser is None or driver is None:
        pytest.skip("no browser here: apt-get install chromium chromium-driver")
    return browser, driver


@contextmanager
def opened(page: Path, *, wide: int = 1500, high: int = 1000) -> Iterator[Any]:
    """A window with a page in it."""
    from selenium import webdriver  # noqa: PLC0415  # only where there is a browser
    from selenium.webdriver.chrome.service import Service  # noqa: PLC0415

    browser, driver = programs()
    options = webdriver.ChromeOptions()
    options.binary_location = browser
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    for argument in (
        "--headless=new",
        "--no-sandbox",  # Chromium as root, as in CI, runs in no other way
        "--disable-gpu",
        "--disable-dev-shm-usage",
        "--hide-scrollbars",
        f"--window-size={wide},{high}",
    ):
        options.add_argument(argument)
    window = webdriver.Chrome(options=options, service=Service(driver))
    try:
        window.get(page.as_uri())
        yield window
    finally:
        window.quit()


def complaints(window: Any) -> list[str]:
    """What the console has said that is not mere information."""
    return [row["message"] for row in window.get_log("browser") if row["level"] != "INFO"]
