"""Text to data, and faults to plain sentences. No files are opened here (see files.py).

Every function raises BadInput with all faults it can see; each sentence names the file, the line
or key, what is wrong and what is allowed.
"""

import csv
import difflib
import re
import tomllib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from math import isfinite, isnan, nan
from typing import Any

import numpy as np
from numpy.typing import NDArray

from optimiser.faults import BadInput

Floats = NDArray[np.float64]
_PLACE = re.compile(r"\(at line (\d+), column \d+\)")
_DECIMAL_COMMA = re.compile(r"=\s*\[?\s*[+-]?\d+,\d")
_NUMBER_WITH_COMMA = re.compile(r"^[+-]?\d*,\d+$")


def nearest(word: str, allowed: Iterable[str]) -> str:
    """``"; did you mean X?"`` for the allowed word most like this one, else nothing."""
    close = difflib.get_close_matches(word.lower(), list(allowed), n=1, cutoff=0.5)
    return f"; did you mean {close[0]}?" if close else ""


def decode(raw: bytes, file: str) -> str:
    """Bytes of a text file as text; a byte-order mark is dropped. Raises BadInput."""
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw[: error.start].count(b"\n") + 1
        raise BadInput(f"{file} line {line}: is not UTF-8 text: save the file as UTF-8") from None
    if "\0" in text:
        raise BadInput(f"{file}: holds binary data, not text")
    if not text.strip():
        raise BadInput(f"{file}: is empty")
    return text


def parse_toml(text: str, file: str) -> dict[str, Any]:
    """Parse TOML. Raises BadInput with the line of the first syntax error."""
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise BadInput(_toml_sentence(str(error), text, file)) from None
    if not data:
        raise BadInput(f"{file}: holds no keys, only comments or blank lines")
    return data


def _toml_sentence(message: str, text: str, file: str) -> str:
    found = _PLACE.search(message)
    lines = text.splitlines()
    number = int(found[1]) if found else len(lines)
    line = lines[number - 1] if 0 < number <= len(lines) else ""
    what = _PLACE.sub("", message).strip()
    if "overwrite" in what or "twice" in what or "mutate" in what:
        what = f'"{line.split("=")[0].strip()}" is given twice; allowed: once'
    elif _DECIMAL_COMMA.search(line):
        what = "a decimal comma; allowed: a point as the decimal mark, such as 0.15"
    else:
        what = f"not TOML ({what[:1].lower()}{what[1:]}); allowed: key = value"
    return f"{file} line {number}: {what}"


@dataclass(frozen=True)
class Table:
    """Columns of a CSV file: numbers (n,) as floats, NaN where an optional cell is blank."""

    file: str
    numbers: dict[str, Floats]
    texts: dict[str, list[str]]
    lines: list[int] = field(repr=False)

    def where(self, row: int) -> str:
        """How a sentence names a row: file and line."""
        return f"{self.file} line {self.lines[row]}"

    def number(self, name: str, row: int) -> float | None:
        """The number in a cell, None when it is blank or the column is not there."""
        value = float(self.numbers[name][row]) if name in self.numbers else nan
        return None if isnan(value) else value

    def text(self, name: str, row: int) -> str | None:
        """The words in a cell, None when it is blank or the column is not there."""
        return (self.texts[name][row] or None) if name in self.texts else None


@dataclass(frozen=True)
class Columns:
    """What a CSV file may hold: column names by what is allowed in them.

    ``required`` and ``optional`` hold numbers of zero or more, except those in ``signed``, which
    may be negative; ``texts`` are optional columns of words.
    """

    required: Sequence[str]
    optional: Sequence[str] = ()
    texts: Sequence[str] = ()
    signed: Sequence[str] = ()

    @property
    def figures(self) -> list[str]:
        """The columns that hold numbers."""
        return [*self.required, *self.optional]

    @property
    def all(self) -> list[str]:
        """Every column name allowed."""
        return [*self.required, *self.optional, *self.texts]


def parse_table(text: str, columns: Columns, file: str, collect: list[str] | None = None) -> Table:
    """Parse comma-separated text with a header line; ``#`` starts a comment line.

    Raises BadInput with every fault: separator, header, ragged rows, cells that are no finite
    number or negative where that makes no sense. With ``collect`` those faults are added to that
    list instead and the faulty rows left out, so that the caller can check the rest and raise all;
    only a missing column still raises.
    """
    faults: list[str] = []
    rows = _rows(text, file)
    if not rows:
        raise BadInput(f"{file}: holds no header line; allowed: {', '.join(columns.all)}")
    (line, header), body = rows[0], rows[1:]
    names = [name.strip().lower() for name in header]
    _check_header(names, columns, f"{file} line {line}", faults)
    if not body:
        faults.append(f"{file}: has a header but no rows; allowed: one row or more")
    good: list[tuple[int, dict[str, float | str]]] = []
    for line, cells in body:
        row, wrong = _row(cells, names, columns)
        faults += [f"{file} line {line}: {fault}" for fault in wrong]
        if not wrong:
            good.append((line, row))
    if faults and (collect is None or not set(columns.required) <= set(names)):
        raise BadInput(faults)
    if collect is not None:
        collect += faults
    return Table(
        file,
        {n: np.array([row[n] for _, row in good], float) for n in names if n in columns.figures},
        {n: [str(row[n]) for _, row in good] for n in names if n in columns.texts},
        [line for line, _ in good],
    )


def _row(
    cells: list[str], names: list[str], columns: Columns
) -> tuple[dict[str, float | str], list[str]]:
    """One row's values by column name, and what is wrong with it."""
    if len(cells) != len(names):
        return {}, [_ragged(cells, names)]
    row: dict[str, float | str] = {}
    faults: list[str] = []
    for name, cell in zip(names, cells, strict=True):
        text = cell.strip()
        if name in columns.figures:
            fault = _number_fault(text, name, columns)
            faults += [fault] if fault else []
            row[name] = nan if fault or not text else float(text)
        else:
            row[name] = text
    return row, faults


def _rows(text: str, file: str) -> list[tuple[int, list[str]]]:
    """Line numbers and cells of all lines that are neither blank nor comments."""
    rows = []
    for number, line in enumerate(text.splitlines(), start=1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        try:
            rows.append((number, next(csv.reader([line], strict=True))))
        except csv.Error as error:
            raise BadInput(f"{file} line {number}: is not comma-separated ({error})") from None
    return rows


def _check_header(names: list[str], columns: Columns, where: str, faults: list[str]) -> None:
    """Add what is wrong with the header; raise at once when no cell can be understood."""
    allowed = ", ".join(columns.all)
    for mark, word in ((";", "semicolons"), ("\t", "tabs")):
        if len(names) == 1 and mark in names[0]:
            raise BadInput(
                f"{where}: the columns are separated by {word}; allowed: commas (and a point as "
                "the decimal mark)"
            )
    if all(_is_number(name) for name in names):
        raise BadInput(f"{where}: the first line must name the columns; allowed: {allowed}")
    for name in dict.fromkeys(names):
        if names.count(name) > 1:
            faults.append(f'{where}: the column "{name}" is given twice; allowed: once')
        if name not in columns.all:
            hint = nearest(name, columns.all)
            faults.append(f'{where}: the column "{name}" is not known{hint}; allowed: {allowed}')
    for name in columns.required:
        if name not in names:
            faults.append(f'{where}: the column "{name}" is missing; allowed: {allowed}')


def _is_number(cell: str) -> bool:
    try:
        float(cell)
    except ValueError:
        return False
    return "_" not in cell


def _ragged(cells: list[str], names: list[str]) -> str:
    hint = ""
    if len(cells) > len(names):
        hint = " (a decimal comma? write 0.15, not 0,15)"
    elif len(cells) == 1 and (";" in cells[0] or "\t" in cells[0]):
        hint = " (separate them by commas)"
    return f"{len(cells)} values for {len(names)} columns{hint}; allowed: one each"


def _number_fault(cell: str, name: str, columns: Columns) -> str:
    """What is wrong with a cell that should hold a number, or nothing."""
    if not cell:
        return f"{name} is blank; allowed: a number" if name in columns.required else ""
    if _NUMBER_WITH_COMMA.match(cell):
        return f'{name} "{cell}" has a decimal comma; allowed: a point, such as 0.15'
    if not _is_number(cell):
        return f'{name} "{cell}" is not a number; allowed: a number'
    if not isfinite(float(cell)):
        return f"{name} {cell} is not a finite number; allowed: a number"
    if float(cell) < 0.0 and name not in columns.signed:
        return f"{name} {cell} is negative; allowed: 0 or more"
    return ""
