"""The page: what it says, that it is escaped, and that it stands alone."""

import re
from dataclasses import replace
from html.parser import HTMLParser

import numpy as np
import pytest

from optimiser.report.cautions import CAUTIONS
from optimiser.report.curve_line import CurveLine
from optimiser.report.sheet import ForceRow, Sheet, Worked
from optimiser.report.sheet_page import MOST_ROWS, MOST_WARNINGS, chosen, sheet_html, table_html
from tests.report.sheets import HOSTILE, crowded, hostile, plain, tune_page, usual

VOID = {"meta", "br", "col", "img", "rect", "path", "circle", "use"}


class _Reader(HTMLParser):
    """Collects text and attributes, and checks that tags are closed in order."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.words: list[str] = []
        self.attributes: list[tuple[str, str | None]] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.attributes += attrs
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.attributes += attrs

    def handle_endtag(self, tag: str) -> None:
        if tag not in VOID:
            assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        self.words.append(data)


def _read(page: str) -> _Reader:
    reader = _Reader()
    reader.feed(page)
    reader.close()
    assert reader.open == []
    return reader


def _text(page: str) -> str:
    return " ".join(" ".join(_read(page).words).split())


@pytest.mark.parametrize("make", [usual, plain, crowded, hostile])
def test_well_formed_and_without_anything_from_outside(make: "type[Sheet]") -> None:
    page = sheet_html([make()])
    reader = _read(page)
    assert page.startswith("<!doctype html>")
    outside = {"src", "srcset", "data", "action", "style-src"}
    names = {name for name, _value in reader.attributes}
    assert not names & outside
    links = {value for name, value in reader.attributes if name in ("href", "xlink:href")}
    assert all(link is not None and link.startswith("#") for link in links)
    assert "@import" not in page
    assert re.findall(r"url\((?!#)", page) == []


def test_says_what_is_needed_at_the_bench() -> None:
    text = _text(sheet_html([usual()]))
    for words in (
        "rear-monotube compression",
        "9 of 22",
        "1.45 mm",
        "light, 40 °C",
        "2 x 40 x 0.20",
        "A 3 + A 4",
        "real 0.152",
        "7 shims",
        "5 sizes",
        "post: 1.8 to 6",
        "out 1 x 36 x 0.20",
        "in 1 x 34 x 0.15",
        "crossover",
        "seed 3",
        "0123456789ab",
        "shimwright find",
        "thickness drawn",
        "likely spread",
        "click range, open to closed",
        "measured: run.csv",
        "1.20!",
        "Worst -2.0 % at 0.1 m/s.",
    ):
        assert words in text, words


def test_every_caution_is_there_and_warnings_stand_before_them() -> None:
    text = _text(sheet_html([usual()]))
    for caution in CAUTIONS:
        assert re.sub(r": *", ": ", caution) in re.sub(r" *: *", ": ", text)
    assert text.index("Before you open anything") < text.index("fatigue: at least one")
    assert text.index("fatigue: at least one") < text.index("Gas pressure")


def test_texts_of_files_are_escaped_everywhere() -> None:
    page = sheet_html([hostile()], title=HOSTILE)
    assert "<script" not in page
    assert "<b x=" not in page
    assert page.count("&lt;script&gt;") > 15
    reader = _read(page)
    assert HOSTILE in "".join(reader.words)


def test_texts_of_a_table_are_escaped() -> None:
    table = tune_page()
    cells = tuple(replace(row, rider=HOSTILE, detail=HOSTILE) for row in table.rows)
    page = table_html(replace(table, title=HOSTILE, rows=cells, kit_note=HOSTILE, notes=(HOSTILE,)))
    assert "<script" not in page
    _read(page)


def test_same_sheets_same_page() -> None:
    assert sheet_html([usual(), plain()]) == sheet_html([usual(), plain()])


def test_ids_of_several_sheets_do_not_meet() -> None:
    ids = [v for name, v in _read(sheet_html([usual(), usual()])).attributes if name == "id"]
    assert len(ids) == len(set(ids))


def test_a_page_needs_a_sheet() -> None:
    with pytest.raises(ValueError, match="at least one sheet"):
        sheet_html([])


def test_without_target_stock_or_adjuster_nothing_is_made_up() -> None:
    text = _text(sheet_html([plain()]))
    assert "adjuster none" in text
    for words in ("wanted", "bin", "left", "closed", "Error against"):
        assert f" {words} " not in text
    assert "0.15 mm above the clamp face" in text


def test_locked_and_infinite_forces_are_words() -> None:
    sheet = usual()
    rows = (ForceRow(0.05, np.inf, 100.0, 200.0, np.inf), *sheet.rows[1:])
    errors = replace(sheet.errors, low_percent=np.inf, total_percent=np.inf)
    force = np.where(np.arange(7) < 1, np.inf, 100.0)
    line = CurveLine("predicted", sheet.lines[0].velocity_m_s, force)
    page = sheet_html([replace(sheet, rows=rows, errors=errors, lines=(line,), spread_n=None)])
    text = _text(page)
    assert "locked" in text
    assert "inf" not in text.replace("information", "")


def test_many_points_are_thinned_evenly_with_both_ends() -> None:
    rows = [ForceRow(float(v), 1.0) for v in range(1, 61)]
    kept = chosen(rows)
    assert len(kept) == MOST_ROWS
    assert (kept[0], kept[-1]) == (rows[0], rows[-1])
    assert tuple(chosen(rows[:5])) == tuple(rows[:5])
    assert "11 of 60 points" in _text(sheet_html([crowded()]))


def test_too_many_warnings_are_counted() -> None:
    sheet = replace(usual(), warnings=tuple(f"warning {n}" for n in range(MOST_WARNINGS + 3)))
    text = _text(sheet_html([sheet]))
    assert f"warning {MOST_WARNINGS - 1}" in text
    assert f"warning {MOST_WARNINGS} " not in text
    assert "3 more; see the result on the terminal" in text


def test_a_bar_a_piece_and_over_the_limit_is_marked_without_colour() -> None:
    sheet = usual()
    page = sheet_html([sheet])
    pieces = sum(len(step.worked) for step in sheet.steps)
    over = sum(w.utilisation >= 1 for step in sheet.steps for w in step.worked)
    assert len(re.findall(r'class="bar(?: over)?"', page)) == pieces + 4  # and four error bands
    assert page.count('class="bar over"') == over == 1
    calm = tuple(replace(s, worked=(Worked(1, 0.1),) * len(s.worked)) for s in sheet.steps)
    assert "1.20!" not in sheet_html([replace(sheet, steps=calm)])


def test_table_shows_cells_changes_and_kit() -> None:
    text = _text(table_html(tune_page(), [usual()]))
    for words in (
        "opening table",
        "compression rebound",
        "58 kg",
        "9 clicks",
        "off 2.3 %",
        "take out 1×40×0.15; put in 1×34×0.20",
        "no stack",
        "outside the model",
        "72 shims build any cell",
        "3 x 19 x 0.20",
        "buy 1",
        "rear-monotube compression",
    ):
        assert words in text, words
