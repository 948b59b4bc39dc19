"""The report in a real browser: quiet, offline, without scripts, on a phone and in the dark."""

from __future__ import annotations

from pathlib import Path

import pytest
from playwright.sync_api import Browser
from tests.browser.conftest import DESKTOP, PHONE, asked_and_said, opened, violations
from tests.unit import paper_examples as examples

from lineproof.paper.figures import draw_figures
from lineproof.paper.report import write_report


@pytest.fixture(scope="module", params=[examples.usual, examples.hostile], ids=["usual", "hostile"])
def report(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Path:
    context = request.param()
    path = tmp_path_factory.mktemp("report") / "report.html"
    path.write_text(write_report(context, draw_figures(context)), encoding="utf-8")
    return path


def test_one_request_and_a_clean_console(browser: Browser, report: Path) -> None:
    assert asked_and_said(browser, report) == ([report.as_uri()], [])


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_nothing_against_accessibility(browser: Browser, report: Path, scheme: str) -> None:
    assert violations(browser, report, color_scheme=scheme) == []


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("size", [PHONE, DESKTOP], ids=["phone", "desktop"])
def test_page_never_scrolls_sideways(
    browser: Browser, report: Path, size: dict[str, int], scheme: str
) -> None:
    page = opened(browser, report, viewport=size, color_scheme=scheme)
    assert page.evaluate("document.documentElement.scrollWidth") == size["width"]


def test_wide_tables_scroll_in_their_own_boxes(browser: Browser, report: Path) -> None:
    page = opened(browser, report, viewport=PHONE)
    boxes = page.evaluate(
        "[...document.querySelectorAll('.scroll')].map(b => [b.scrollWidth, b.clientWidth,"
        " getComputedStyle(b).overflowX, b.tabIndex])"
    )
    assert any(inner > outer for inner, outer, _, _ in boxes)
    assert {(overflow, tab) for _, _, overflow, tab in boxes} == {("auto", 0)}


def test_tables_fit_a_desktop_page(browser: Browser, report: Path) -> None:
    page = opened(browser, report, viewport=DESKTOP)
    wide = page.evaluate(
        "[...document.querySelectorAll('.scroll')].filter(b => b.scrollWidth > b.clientWidth)"
        ".map(b => b.getAttribute('aria-labelledby'))"
    )
    assert wide == []


@pytest.mark.parametrize("name", ["table-joint_tests", "table-market_line"])
def test_columns_of_panels_line_up(browser: Browser, report: Path, name: str) -> None:
    page = opened(browser, report, viewport=DESKTOP)
    edges = page.evaluate(
        f"[...document.querySelectorAll('#{name} table')].map(t =>"
        " [...t.querySelectorAll('.heads > *')].map(c => c.getBoundingClientRect().right))"
    )
    assert edges
    for others in edges[1:]:
        # A pixel: where the page is narrow, text of another length moves a column by less than that.
        assert others == pytest.approx(edges[0], abs=1.0)


def test_a_label_that_is_set_in_keeps_its_indent_on_every_line(
    browser: Browser, report: Path
) -> None:
    page = opened(browser, report, viewport=PHONE)
    starts = page.evaluate(
        "[...document.querySelectorAll('th.under')].map(c => { const r = document.createRange();"
        " r.selectNodeContents(c); return [c.getBoundingClientRect().left,"
        " ...[...r.getClientRects()].slice(1).map(b => b.left)]; })"
    )
    assert all(line > left + 5 for left, *lines in starts for line in lines)


def test_the_page_has_no_script(browser: Browser, report: Path) -> None:
    page = opened(browser, report)
    handlers = "[...document.querySelectorAll('*')].flatMap(e => e.getAttributeNames())"
    assert page.evaluate("document.scripts.length") == 0
    assert [name for name in page.evaluate(handlers) if name.startswith("on")] == []
    assert "The answer" in page.inner_text("main")


def test_ids_are_unique_and_contents_lead_to_headings(browser: Browser, report: Path) -> None:
    page = opened(browser, report, viewport=DESKTOP)
    ids = page.evaluate("[...document.querySelectorAll('[id]')].map(e => e.id)")
    assert len(ids) == len(set(ids))
    for link in page.query_selector_all("nav a"):
        link.click()
        target = page.url.split("#")[1]
        top = page.evaluate(f"document.getElementById({target!r}).getBoundingClientRect().top")
        at_end = page.evaluate("scrollY + innerHeight >= document.body.scrollHeight - 1")
        assert 0 <= top <= 60 or at_end


def test_dark_pages_are_dark_and_figures_follow(browser: Browser, report: Path) -> None:
    shades = {}
    for scheme in ("light", "dark"):
        page = opened(browser, report, color_scheme=scheme)
        shades[scheme] = page.evaluate(
            "[getComputedStyle(document.body).backgroundColor,"
            " getComputedStyle(document.querySelector('.plot path')).fill]"
        )
    assert shades["light"] == ["rgb(255, 255, 255)"] * 2
    assert shades["dark"] == ["rgb(21, 23, 27)"] * 2


def test_numbers_show_their_address(browser: Browser, report: Path) -> None:
    page = opened(browser, report)
    count = page.evaluate("document.querySelectorAll('td[title], .n[title]').length")
    plain = page.evaluate(
        "[...document.querySelectorAll('figure.table tbody td')]"
        ".filter(c => /\\d/.test(c.textContent) && !c.title).length"
    )
    assert count > 100
    assert plain == 0


def test_prints_without_contents_and_in_light(browser: Browser, report: Path) -> None:
    page = opened(browser, report, color_scheme="dark")
    page.emulate_media(media="print")
    assert not page.is_visible("nav")
    shade = page.evaluate("getComputedStyle(document.body).backgroundColor")
    assert shade == "rgb(255, 255, 255)"
    assert page.pdf(format="A4").startswith(b"%PDF")
