"""A browser for the tests of pages, and what every page must satisfy in it."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, sync_playwright

CHROMIUM = (
    shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
)
PHONE = {"width": 390, "height": 844}
DESKTOP = {"width": 1400, "height": 900}


@pytest.fixture(scope="session")
def browser() -> Iterator[Browser]:
    if CHROMIUM is None:
        assert "LINEPROOF_NEEDS_BROWSER" not in os.environ, "chromium is not installed"
        pytest.skip("needs Chromium, as from Debian's package chromium")
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=["--no-sandbox"])
        yield browser
        browser.close()


def opened(browser: Browser, file: Path, **options: object) -> Page:
    """The file in a page of its own."""
    page = browser.new_context(**options).new_page()
    page.goto(file.as_uri())
    return page


def asked_and_said(browser: Browser, file: Path) -> tuple[list[str], list[str]]:
    """Every request the page makes, and every message, error or dialogue it causes."""
    page = browser.new_page()
    asked: list[str] = []
    said: list[str] = []
    page.on("request", lambda request: asked.append(request.url))
    page.on("console", lambda message: said.append(message.text))
    page.on("pageerror", lambda error: said.append(str(error)))
    page.on("dialog", lambda dialog: said.append(dialog.message))
    page.goto(file.as_uri())
    page.wait_for_load_state("networkidle")
    return asked, said


def violations(browser: Browser, file: Path, **options: object) -> list[str]:
    """What axe-core finds against the accessibility of a page, by rule and place; its policy of security is lifted
    for that, since it forbids scripts."""
    page = opened(browser, file, bypass_csp=True, **options)
    found = Axe().run(page).response["violations"]
    return [f"{each['id']}: {node['html'][:200]}" for each in found for node in each["nodes"]]
