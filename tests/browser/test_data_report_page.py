"""The data report in a real browser: offline, quiet, without scripts, accessible, on a phone, dark and printed."""

from __future__ import annotations

from pathlib import Path

import pytest
from playwright.sync_api import Browser
from tests.browser.conftest import DESKTOP, PHONE, asked_and_said, opened, violations
from tests.unit import record_examples as examples
from tests.unit.paper_examples import facts, ranked_facts

from lineproof.paper.data_report import make_data_report

MAKERS = [examples.usual, examples.daily, examples.hostile, examples.clean]


@pytest.fixture(scope="module", params=MAKERS, ids=lambda make: make.__name__)
def report(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("report") / "data_report.html"
    text = make_data_report(request.param(), facts({"ten": ranked_facts()}))
    path.write_text(text, encoding="utf-8")
    return path


def test_one_request_and_a_clean_console(browser: Browser, report: Path) -> None:
    assert asked_and_said(browser, report) == ([report.as_uri()], [])


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("size", [PHONE, DESKTOP], ids=["phone", "desktop"])
def test_page_never_scrolls_sideways(
    browser: Browser, report: Path, size: dict[str, int], scheme: str
) -> None:
    page = opened(browser, report, viewport=size, color_scheme=scheme)
    assert page.evaluate("document.documentElement.scrollWidth") == size["width"]


def test_tables_fit_a_desktop_page(browser: Browser, report: Path) -> None:
    page = opened(browser, report, viewport=DESKTOP)
    wide = page.evaluate(
        "[...document.querySelectorAll('.scroll')].filter(b => b.scrollWidth > b.clientWidth)"
        ".map(b => b.getAttribute('aria-label'))"
    )
    assert wide == []


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("size", [PHONE, DESKTOP], ids=["phone", "desktop"])
def test_nothing_against_accessibility(
    browser: Browser, report: Path, size: dict[str, int], scheme: str
) -> None:
    assert violations(browser, report, viewport=size, color_scheme=scheme) == []


def test_reads_the_same_without_scripts(browser: Browser, report: Path) -> None:
    with_scripts = opened(browser, report).inner_text("main")
    without = opened(browser, report, java_script_enabled=False).inner_text("main")
    assert with_scripts == without
    assert "In short" in without


def test_contents_lead_to_headings(browser: Browser, report: Path) -> None:
    page = opened(browser, report, viewport=DESKTOP)
    for link in page.query_selector_all("nav a"):
        link.click()
        target = page.url.split("#")[1]
        top = page.evaluate(f"document.getElementById({target!r}).getBoundingClientRect().top")
        at_end = page.evaluate("scrollY + innerHeight >= document.body.scrollHeight - 1")
        assert 0 <= top <= 60 or at_end


def test_prints_without_contents_and_in_light(browser: Browser, report: Path) -> None:
    page = opened(browser, report, color_scheme="dark")
    page.emulate_media(media="print")
    assert not page.is_visible("nav")
    shade = page.evaluate("getComputedStyle(document.body).backgroundColor")
    assert shade == "rgb(255, 255, 255)"
    assert page.pdf(format="A4").startswith(b"%PDF")
