"""The page in a real browser: drawn, silent, fetching nothing, complete without scripts and on paper."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import pytest
from report_factory import make_result

from auditor.report.page import render_report

if TYPE_CHECKING:
    from playwright.sync_api import Browser, Page

pytestmark = pytest.mark.browser

BROWSERS = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable")
SHEET_PX = 674
"""Width of the text on an A4 sheet with the margins of the style sheet: 178 mm at 96 pixels an inch."""


def _missing(why: str) -> None:
    if os.environ.get("AUDITOR_BROWSER_TESTS") == "required":
        pytest.fail(f"browser tests are required here, but {why}")
    pytest.skip(f"BROWSER TESTS SKIPPED: {why}")


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """The system's Chromium, driven from outside."""
    path = next((found for name in BROWSERS if (found := shutil.which(name))), None)
    if path is None:
        _missing(f"none of {', '.join(BROWSERS)} is installed")
    try:
        from playwright.sync_api import sync_playwright
    except ImportError:
        _missing("playwright is not installed")
    with sync_playwright() as driver:
        opened = driver.chromium.launch(executable_path=path, args=["--no-sandbox"])
        yield opened
        opened.close()


@pytest.fixture(scope="module")
def address(tmp_path_factory: pytest.TempPathFactory) -> str:
    """The made-up month as a file, opened from disk as a person would."""
    path: Path = tmp_path_factory.mktemp("report") / "report.html"
    path.write_text(render_report(make_result()), encoding="utf-8")
    return path.as_uri()


def _opened(browser: Browser, address: str, width: int) -> Page:
    page = browser.new_page(viewport={"width": width, "height": 900})
    page.goto(address)
    page.wait_for_selector('html[data-pictures="drawn"]', state="attached", timeout=60_000)
    return page


def test_all_pictures_are_drawn_in_silence_and_nothing_is_fetched(browser: Browser, address: str) -> None:
    """Every chart has its drawing and its traces, the console is empty, and only the file itself is read."""
    page = browser.new_page(viewport={"width": 1400, "height": 900})
    said: list[str] = []
    fetched: list[str] = []
    page.on("console", lambda message: said.append(message.text))
    page.on("pageerror", lambda error: said.append(str(error)))
    page.on("request", lambda request: fetched.append(request.url))
    page.goto(address)
    page.wait_for_selector('html[data-pictures="drawn"]', state="attached", timeout=60_000)
    charts = page.locator(".chart")
    assert charts.count() == 8
    for index in range(charts.count()):
        chart = charts.nth(index)
        assert chart.locator("svg.main-svg").count() >= 1
        assert chart.locator(".trace, .bars .point").count() >= 1
    assert page.locator("svg.drawing").count() == 6
    assert said == []
    assert [url for url in fetched if not url.startswith("blob:")] == [address]
    page.close()


def test_no_button_sends_anything_away(browser: Browser, address: str) -> None:
    """The bars over the charts only zoom, reset and save a picture."""
    page = _opened(browser, address, 1400)
    titles = page.eval_on_selector_all(".modebar-btn", "all => all.map(b => b.dataset.title || '')")
    assert titles
    text = " ".join(titles).lower()
    assert not any(word in text for word in ("cloud", "share", "edit", "plotly", "upload"))
    page.close()


def test_names_do_not_run_as_scripts(browser: Browser, address: str) -> None:
    """The tag named like a script opens no dialogue, neither in the page nor in a chart."""
    page = browser.new_page()
    dialogues: list[str] = []
    page.on("dialog", lambda dialogue: (dialogues.append(dialogue.message), dialogue.dismiss()))
    page.goto(address)
    page.wait_for_selector('html[data-pictures="drawn"]', state="attached", timeout=60_000)
    assert dialogues == []
    page.close()


@pytest.mark.parametrize("width", [380, 900, 1400])
def test_the_page_never_scrolls_sideways(browser: Browser, address: str, width: int) -> None:
    """Wide tables scroll inside their own frame, on a telephone as on a desk."""
    page = _opened(browser, address, width)
    page.evaluate("document.querySelectorAll('details').forEach(part => part.open = true)")
    assert page.evaluate("document.documentElement.scrollWidth") <= width
    page.close()


def test_the_page_is_complete_without_scripts(browser: Browser, address: str) -> None:
    """All captions and tables are there, and no empty place stands for a missing picture."""
    context = browser.new_context(java_script_enabled=False, viewport={"width": 900, "height": 900})
    page = context.new_page()
    page.goto(address)
    assert page.locator(".chart:visible").count() == 0
    captions = page.locator("figcaption")
    assert captions.count() == 14
    assert all(captions.nth(index).is_visible() for index in range(captions.count()))
    shut = page.locator("details:not([open]) > summary")
    while shut.count():
        shut.first.click()
    tables = page.locator("table")
    assert tables.count() > 20
    assert all(tables.nth(index).is_visible() for index in range(tables.count()))
    context.close()


def test_charts_are_not_cut_on_paper(browser: Browser, address: str) -> None:
    """Printed from a wide window, every chart is scaled to the sheet and every folded table is opened."""
    page = _opened(browser, address, 1600)
    printed = page.pdf(prefer_css_page_size=True)
    assert (
        printed.startswith(b"%PDF") and printed.count(b"/Type /Page\n") + printed.count(b"/Type /Page ") >= 5
    )
    page.emulate_media(media="print")
    widths = page.eval_on_selector_all(
        ".chart .main-svg", "all => all.map(svg => svg.getBoundingClientRect().width)"
    )
    assert widths and max(widths) <= SHEET_PX
    assert page.locator(".modebar:visible").count() == 0
    page.close()


def test_no_table_is_wider_than_the_sheet(browser: Browser, address: str) -> None:
    """At the width of an A4 sheet nothing sticks out to the right; the printer does not shrink the page."""
    page = _opened(browser, address, 1400)
    page.emulate_media(media="print")
    page.set_viewport_size({"width": SHEET_PX, "height": 1000})
    page.evaluate("document.querySelectorAll('details').forEach(part => part.open = true)")
    out = page.eval_on_selector_all(
        "table, svg.drawing, pre, figcaption, dd",
        f"all => all.filter(e => e.getBoundingClientRect().right > {SHEET_PX} + 1).map(e => e.textContent)",
    )
    assert out == []
    page.close()


def test_a_browser_that_cannot_unpack_shows_words_and_tables(browser: Browser, address: str) -> None:
    """Without the means to unpack the plotting script the page says nothing and hides the empty places."""
    page = browser.new_page()
    said: list[str] = []
    page.on("console", lambda message: said.append(message.text))
    page.on("pageerror", lambda error: said.append(str(error)))
    page.add_init_script("delete window.DecompressionStream")
    page.goto(address)
    page.wait_for_selector('html[data-pictures="unsupported"]', state="attached")
    assert page.locator(".chart:visible").count() == 0
    assert said == []
    page.close()
