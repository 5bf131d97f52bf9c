"""The tune table as plain data for the page: masses down the side, feels and circuits across."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import ceil

#: A landscape page holds this many columns and lines; larger tables take more pages.
MOST_COLUMNS = 6
LINES = 62
KIT_COLUMNS = 7


@dataclass(frozen=True)
class TuneCell:
    """One tune in short. ``changes`` from the row above; ``marks`` such as "outside the model"."""

    groups: tuple[str, ...]
    clicks: int | None
    error_percent: float | None
    utilisation: float | None
    changes: tuple[str, ...] = ()
    marks: tuple[str, ...] = ()


@dataclass(frozen=True)
class TuneColumn:
    """A column: circuit and feel."""

    circuit: str
    feel: str


@dataclass(frozen=True)
class TuneRow:
    """A row: rider mass with kit, and what follows from it. ``cells`` one a column, None: empty."""

    rider: str
    detail: str
    cells: tuple[TuneCell | None, ...]


@dataclass(frozen=True)
class KitLine:
    """One size of the kit. ``in_stock`` and ``to_buy`` None where there is no stock list."""

    size: str
    quantity: int
    bin: str = ""
    in_stock: int | None = None
    to_buy: int | None = None


@dataclass(frozen=True)
class TunePage:
    """A whole table: ``facts`` (label, value) pairs, ``kit_note`` what the kit does and costs."""

    title: str
    facts: tuple[tuple[str, str], ...]
    columns: tuple[TuneColumn, ...]
    rows: tuple[TuneRow, ...]
    kit: tuple[KitLine, ...] = ()
    kit_note: str = ""
    notes: tuple[str, ...] = ()


def pages_of(page: TunePage) -> list[TunePage]:
    """The table cut into landscape pages that can each be read; kit and notes at the end.

    How much fits is reckoned in lines of print, on the safe side.
    """
    parts = []
    for down in _rows_that_fit(page.rows):
        for start in range(0, max(len(page.columns), 1), MOST_COLUMNS):
            across = slice(start, start + MOST_COLUMNS)
            rows = tuple(replace(row, cells=row.cells[across]) for row in down)
            columns = page.columns[across]
            parts.append(TunePage(page.title, page.facts, columns, rows))
    if sum(map(_lines_of, parts[-1].rows)) + _lines_of_end(page) > LINES:
        parts.append(TunePage(page.title, page.facts, (), ()))
    parts[-1] = replace(parts[-1], kit=page.kit, kit_note=page.kit_note, notes=page.notes)
    return parts


def _rows_that_fit(rows: Sequence[TuneRow]) -> list[list[TuneRow]]:
    pages: list[list[TuneRow]] = [[]]
    for row in rows:
        if pages[-1] and sum(map(_lines_of, [*pages[-1], row])) > LINES:
            pages.append([])
        pages[-1].append(row)
    return pages


def _lines_of(row: TuneRow) -> float:
    """Printed lines of a row with its changes; the rules between rows count as well."""
    cells = [cell for cell in row.cells if cell is not None]
    tunes = max((ceil(len(cell.groups) / 3) + 1 + bool(cell.marks) for cell in cells), default=1)
    words = max((len(tight("; ".join(cell.changes))) for cell in cells), default=0)
    return max(tunes, 2) + ceil(words / 42) + 0.6


def _lines_of_end(page: TunePage) -> float:
    kit = ceil(len(page.kit) / KIT_COLUMNS) * 2 + 3 if page.kit else 0
    return kit + sum(ceil(len(note) / 180) for note in page.notes)


def tight(text: str) -> str:
    """Sizes without spaces, so that more of them fit on a line."""
    return text.replace(" x ", "\u00d7")


def spanned(columns: Sequence[TuneColumn]) -> list[tuple[str, int]]:
    """Circuits with the number of neighbouring columns each stands over."""
    spans: list[tuple[str, int]] = []
    for column in columns:
        if spans and spans[-1][0] == column.circuit:
            spans[-1] = (column.circuit, spans[-1][1] + 1)
        else:
            spans.append((column.circuit, 1))
    return spans
