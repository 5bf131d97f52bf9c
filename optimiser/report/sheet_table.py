"""The tune table as plain data for the page: masses down the side, feels and circuits across."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

#: A landscape page holds this many columns and rows; wider or longer tables take more pages.
MOST_COLUMNS = 6
MOST_ROWS = 10


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
    """A whole table: ``facts`` are (label, value) pairs, ``kit_note`` what the kit does and costs."""

    title: str
    facts: tuple[tuple[str, str], ...]
    columns: tuple[TuneColumn, ...]
    rows: tuple[TuneRow, ...]
    kit: tuple[KitLine, ...] = ()
    kit_note: str = ""
    notes: tuple[str, ...] = ()


def pages_of(page: TunePage) -> list[TunePage]:
    """The table cut into landscape pages that each hold what can be read; the kit on the last."""
    parts = [
        replace(
            page,
            columns=page.columns[across],
            rows=tuple(replace(row, cells=row.cells[across]) for row in page.rows[down]),
            kit=(),
            kit_note="",
            notes=(),
        )
        for down in _spans(len(page.rows), MOST_ROWS)
        for across in _spans(len(page.columns), MOST_COLUMNS)
    ]
    parts[-1] = replace(parts[-1], kit=page.kit, kit_note=page.kit_note, notes=page.notes)
    return parts


def spanned(columns: Sequence[TuneColumn]) -> list[tuple[str, int]]:
    """Circuits with the number of neighbouring columns each stands over."""
    spans: list[tuple[str, int]] = []
    for column in columns:
        if spans and spans[-1][0] == column.circuit:
            spans[-1] = (column.circuit, spans[-1][1] + 1)
        else:
            spans.append((column.circuit, 1))
    return spans


def _spans(count: int, most: int) -> Iterator[slice]:
    for start in range(0, max(count, 1), most):
        yield slice(start, start + most)
