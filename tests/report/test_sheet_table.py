"""A tune table on landscape pages."""

from optimiser.report.sheet_table import LINES, MOST_COLUMNS, TuneColumn, pages_of, spanned
from tests.report.sheets import tune_page


def test_an_ordinary_table_takes_one_page() -> None:
    table = tune_page(masses=8, feels=3)
    assert pages_of(table) == [table]


def test_large_tables_keep_every_cell_once_and_the_kit_last() -> None:
    table = tune_page(masses=20, feels=5, groups=12)
    pages = pages_of(table)
    assert all(len(page.columns) <= MOST_COLUMNS for page in pages)
    shown = sum(len(row.cells) for page in pages for row in page.rows)
    assert shown == 20 * 10
    assert [bool(page.kit) for page in pages] == [False] * (len(pages) - 1) + [True]
    for page in pages:
        assert all(len(row.cells) == len(page.columns) for row in page.rows)


def test_a_row_larger_than_a_page_is_still_shown() -> None:
    table = tune_page(masses=2, feels=1, groups=4 * LINES)
    pages = pages_of(table)
    assert [len(page.rows) for page in pages] == [1, 1, 0]


def test_circuits_stand_over_their_feels() -> None:
    columns = [
        TuneColumn("compression", "a"),
        TuneColumn("compression", "b"),
        TuneColumn("rebound", "a"),
    ]
    assert spanned(columns) == [("compression", 2), ("rebound", 1)]
