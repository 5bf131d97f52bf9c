"""Bench sheets and tune tables in a real browser: quiet, printable, readable, narrow and wide."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from io import BytesIO
from pathlib import Path
from typing import Any

import pytest

from optimiser.report.sheet_page import sheet_html, table_html
from optimiser.report.sheet_table import pages_of
from tests.report.sheets import crowded, hostile, overfull, plain, tune_page, usual

#: Paper, and whether the browser prints backgrounds, which it does not unless told to.
PRINTS = [("A4", False), ("Letter", False), ("Letter", True)]
#: Name, page, and how many printed pages it must have.
PAGES = {
    "several": (lambda: sheet_html([usual(), crowded(), overfull(), plain(), hostile()]), 5),
    "table": (lambda: table_html(tune_page(), [usual(), plain()]), 3),
}


@dataclass
class Shown:
    """A page in the browser, with what its console and its requests said."""

    page: Any
    sheets: int
    said: list[str] = field(default_factory=list)
    asked: list[str] = field(default_factory=list)


@pytest.fixture(scope="module", params=PAGES)
def shown(
    request: pytest.FixtureRequest, browser: Any, tmp_path_factory: pytest.TempPathFactory
) -> Iterator[Shown]:
    make, sheets = PAGES[request.param]
    file: Path = tmp_path_factory.mktemp("page") / "page.html"
    file.write_text(make(), encoding="utf-8")
    page = browser.new_page(viewport={"width": 1280, "height": 900})
    opened = Shown(page, sheets)
    page.on("console", lambda message: opened.said.append(message.text))
    page.on("pageerror", lambda error: opened.said.append(str(error)))
    page.on("dialog", lambda dialog: (opened.said.append(dialog.message), dialog.dismiss()))
    page.on("request", lambda asked: opened.asked.append(asked.url))
    page.goto(file.as_uri())
    yield opened
    page.close()


def test_quiet_and_self_contained(shown: Shown) -> None:
    assert shown.said == []
    assert len(shown.asked) == 1
    assert shown.asked[0].startswith("file:")


@pytest.mark.parametrize(("paper", "backgrounds"), PRINTS)
def test_one_printed_page_a_sheet(shown: Shown, paper: str, backgrounds: bool) -> None:
    from pypdf import PdfReader

    pdf = PdfReader(BytesIO(shown.page.pdf(format=paper, print_background=backgrounds)))
    assert len(pdf.pages) == shown.sheets
    titles = shown.page.locator("article h2").all_inner_texts()
    for page, title in zip(pdf.pages, titles, strict=True):
        assert title.split()[0] in page.extract_text()


def test_nothing_is_cut_off_in_print(shown: Shown) -> None:
    """No sheet is fuller than its page, and all of its parts lie inside it."""
    shown.page.emulate_media(media="print")
    shown.page.set_viewport_size({"width": 750, "height": 1000})
    over = shown.page.evaluate(
        """() => [...document.querySelectorAll('.sheet')].flatMap(sheet => {
            const box = sheet.getBoundingClientRect();
            return [...sheet.querySelectorAll('*')].filter(part => {
                const at = part.getBoundingClientRect();
                return at.bottom > box.bottom + 1 || at.right > box.right + 1;
            }).map(part => part.outerHTML.slice(0, 80));
        })"""
    )
    shown.page.emulate_media(media="null")
    assert over == []


def test_tables_are_printed_across(shown: Shown) -> None:
    from pypdf import PdfReader

    pdf = PdfReader(BytesIO(shown.page.pdf(format="A4")))
    tables = shown.page.locator(".tune-table").count()
    across = [page.mediabox.width > page.mediabox.height for page in pdf.pages]
    assert across == [place < tables for place in range(shown.sheets)]


@pytest.mark.parametrize("width", [360, 768, 1280])
def test_no_horizontal_overflow(shown: Shown, width: int) -> None:
    shown.page.set_viewport_size({"width": width, "height": 900})
    assert shown.page.evaluate("document.documentElement.scrollWidth") <= width


def test_every_picture_says_what_it_shows(shown: Shown) -> None:
    silent = shown.page.evaluate(
        """() => [...document.querySelectorAll('svg, img')].filter(picture => {
            const label = picture.getAttribute('aria-label') || picture.getAttribute('alt')
                || document.getElementById(picture.getAttribute('aria-labelledby'))?.textContent;
            return picture.getAttribute('role') !== 'img' || !(label || '').trim();
        }).map(picture => picture.outerHTML.slice(0, 80))"""
    )
    assert silent == []


@pytest.mark.parametrize("width", [360, 1280])
def test_accessibility(shown: Shown, width: int) -> None:
    """Contrast and all other rules of axe-core for WCAG 2.1 A and AA."""
    playwright = pytest.importorskip("axe_playwright_python.sync_playwright")
    shown.page.set_viewport_size({"width": width, "height": 900})
    rules = {"runOnly": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa"]}
    found = playwright.Axe().run(shown.page, options=rules).response
    assert [(fault["id"], fault["nodes"][0]["html"][:120]) for fault in found["violations"]] == []
    checked = {rule["id"] for rule in found["passes"]}
    assert {"color-contrast", "svg-img-alt", "document-title", "html-has-lang"} <= checked


def test_ids_are_unique(shown: Shown) -> None:
    names = shown.page.evaluate("[...document.querySelectorAll('[id]')].map(part => part.id)")
    assert len(names) == len(set(names))


def test_hostile_texts_are_texts(shown: Shown) -> None:
    assert shown.page.locator("script").count() == 0
    assert shown.page.locator("b[x]").count() == 0


def test_a_large_table_takes_as_many_landscape_pages_as_it_was_cut_into(browser: Any) -> None:
    from pypdf import PdfReader

    table = tune_page(masses=20, feels=4, groups=12)
    page = browser.new_page()
    page.set_content(table_html(table))
    for paper in ("A4", "Letter"):
        pdf = PdfReader(BytesIO(page.pdf(format=paper)))
        assert len(pdf.pages) == len(pages_of(table)) == 6
    page.close()
