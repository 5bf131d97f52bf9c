"""Files of tune tables: the request, the journal of finished cells, and what is written out."""

import csv
import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from io import StringIO
from pathlib import Path
from typing import Any, TypeVar

import numpy as np

from optimiser.checking import validate
from optimiser.damper import Damper
from optimiser.faults import BadInput
from optimiser.files import (
    Kind,
    atomic_write_text,
    find_data,
    fingerprint,
    is_path,
    read_damper,
    read_oil,
    read_steel,
    read_stock,
    read_text,
    read_toml,
)
from optimiser.prediction import Setup
from optimiser.tuning.cells import Materials, clicks_faults
from optimiser.tuning.changes import sentence
from optimiser.tuning.kit import Kit
from optimiser.tuning.request import TableRequest
from optimiser.tuning.shelf import Shelf
from optimiser.tuning.table import TuneTable
from optimiser.wanted_files import read_feel, read_frame

Record = TypeVar("Record")

#: Folder of finished cells inside the folder of a table.
CELLS = "cells"


@dataclass(frozen=True)
class TableFile:
    """One file a table was made from."""

    kind: str
    name: str
    fingerprint: str


@dataclass(frozen=True)
class ReadTable:
    """A request with everything it names, read and checked."""

    materials: Materials
    files: tuple[TableFile, ...]


def read_request(
    name_or_path: str | Path, changes: Mapping[str, object] | None = None
) -> ReadTable:
    """A tune-table request and all it names. ``changes`` replace keys of the file.

    Paths in a request count from its own folder. Raises BadInput with the faults of all files.
    """
    path = find_data("request", name_or_path)
    request = validate(TableRequest, {**read_toml(path), **(changes or {})}, str(path))
    reader = _Reader(path, [TableFile("request", str(name_or_path), fingerprint(path))])
    frame = reader.read("frame", request.frame, read_frame)
    feels = [reader.read("feel", name, read_feel) for name in request.feels]
    damper = reader.read("damper", request.damper, read_damper)
    stock = reader.read("stock", request.stock, read_stock)
    setups = reader.setups(request, damper) if damper else ()
    if reader.faults or frame is None or stock is None:
        raise BadInput(reader.faults)
    known = tuple(feel for feel in feels if feel is not None)
    materials = Materials(request, frame, known, setups, stock)
    return ReadTable(materials, tuple(reader.files))


@dataclass
class _Reader:
    """Reads what a request names, beside it or bundled, and gathers the faults."""

    path: Path
    files: list[TableFile]
    faults: list[str] = field(default_factory=list)

    def read(self, kind: Kind, name: str, read: Callable[[str], Record]) -> Record | None:
        """The data of a name, None with its faults gathered."""
        place = str(self.path.parent / Path(name).expanduser()) if is_path(name) else name
        try:
            found = read(place)
        except BadInput as error:
            self.faults += [f"{self.path}: key {kind}: {fault}" for fault in error.faults]
            return None
        self.files.append(TableFile(kind, name, fingerprint(find_data(kind, place))))
        return found

    def setups(self, request: TableRequest, damper: Damper) -> tuple[Setup, ...]:
        """The damper in the directions asked for."""
        oil_temp_c = damper.oil_temp_c if request.oil_temp_c is None else request.oil_temp_c
        steel, oil = read_steel(damper.steel), read_oil(damper.oil)
        missing = [circuit for circuit in request.circuits if getattr(damper, circuit) is None]
        self.faults += [
            f"{self.path}: key circuits: damper {damper.name} has no {circuit} circuit"
            for circuit in missing
        ]
        setups = tuple(
            Setup(damper, circuit, steel, oil, oil_temp_c)
            for circuit in request.circuits
            if circuit not in missing
        )
        self.faults += [f"{self.path}: {fault}" for fault in clicks_faults(request, setups)]
        return setups


class FolderJournal:
    """Finished cells, one file each, so that a run that was killed goes on where it was."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder

    def get(self, key: str) -> dict[str, Any] | None:
        """The record of a key; None when there is none or its file cannot be read."""
        path = self._folder / f"{key}.json"
        if not path.is_file():
            return None
        try:
            record = json.loads(read_text(path))
        except (BadInput, ValueError):
            return None
        return record if isinstance(record, dict) else None

    def put(self, key: str, record: dict[str, Any]) -> None:
        """Write a record, whole or not at all."""
        atomic_write_text(self._folder / f"{key}.json", json.dumps(record, allow_nan=False) + "\n")


def open_journal(folder: Path) -> FolderJournal:
    """The journal in a table's folder, which is made where needed.

    Raises BadInput for a folder that holds other things, or one that cannot be made.
    """
    cells = folder / CELLS
    if folder.exists() and not folder.is_dir():
        raise BadInput(f"--out {folder}: is a file; allowed: a folder")
    if folder.is_dir() and not cells.is_dir() and any(folder.iterdir()):
        raise BadInput(
            f"--out {folder}: holds other files; allowed: a new or empty folder, or one that holds "
            "a former table"
        )
    try:
        cells.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        reason = (error.strerror or "unknown").lower()
        raise BadInput(f"--out {folder}: cannot be made ({reason})") from None
    return FolderJournal(cells)


def write_table(folder: Path, table: TuneTable, document: Mapping[str, Any]) -> list[Path]:
    """Write a table's files, each whole or not at all; the files. Raises BadInput.

    ``table.json`` the document, ``table.csv`` a line a cell and circuit, ``changes.csv`` a line
    from row to row, ``kit.csv`` what the table needs to build any one cell, as a stock list.
    """
    text = json.dumps(document, indent=2, allow_nan=False, ensure_ascii=False) + "\n"
    contents = {
        "table.json": text,
        "table.csv": _csv(cell_rows(table)),
        "changes.csv": _csv(change_rows(table)),
    }
    if table.kit is not None:
        contents["kit.csv"] = _csv(kit_rows(table.kit.kit, table.shelf))
    for name, content in contents.items():
        atomic_write_text(folder / name, content)
    return [folder / name for name in contents]


def cell_rows(table: TuneTable) -> list[list[object]]:
    """A header and a line a cell and circuit; what a cell lacks is blank."""
    request = table.materials.request
    rows: list[list[object]] = [
        [
            "rider_kg", "feel", "circuit", "coil_n_mm", "sag_percent", "clicks", "error_percent",
            "worst_percent", "worst_m_s", "utilisation", "parts", "stack", "reason",
        ]
    ]  # fmt: skip
    for place in sorted(table.cells):
        ride = table.derived[place.mass, place.feel].ride
        one = table.chosen.get(place)
        found: list[object] = [""] * 7
        if one is not None:
            found = [
                one.clicks, f"{one.error_percent:.3f}", f"{one.worst_percent:.3f}",
                f"{one.worst_m_s:.4f}", f"{one.utilisation:.3f}", one.stack.parts,
                " + ".join(one.stack.lines()),
            ]  # fmt: skip
        rows.append(
            [
                f"{request.rider_masses_kg[place.mass]:g}",
                table.materials.feels[place.feel].name,
                request.circuits[place.circuit],
                "" if ride.coil_n_mm is None else f"{ride.coil_n_mm:.2f}",
                f"{ride.sag_percent:.2f}",
                *found,
                table.reasons.get(place, ""),
            ]
        )
    return rows


def change_rows(table: TuneTable) -> list[list[object]]:
    """A header and a line from each row to the next heavier one."""
    request = table.materials.request
    rows: list[list[object]] = [["feel", "circuit", "from_kg", "to_kg", "change"]]
    for before, after in table.changes:
        rows.append(
            [
                table.materials.feels[before.feel].name,
                request.circuits[before.circuit],
                f"{request.rider_masses_kg[before.mass]:g}",
                f"{request.rider_masses_kg[after.mass]:g}",
                sentence(table.chosen[before].stack, table.chosen[after].stack),
            ]
        )
    return rows


def kit_rows(kit: Kit, shelf: Shelf) -> list[list[object]]:
    """A header and a line a size, as a stock list."""
    priced = bool(np.isfinite(shelf.price[kit.quantity > 0]).all())
    head: list[object] = [
        "outer_mm",
        "inner_mm",
        "thickness_mm",
        "quantity",
        *(["price"] if priced else []),
    ]
    rows: list[list[object]] = [head]
    for number in np.flatnonzero(kit.quantity):
        outer, thickness, post = shelf.sizes[number]
        price = [repr(float(shelf.price[number]))] if priced else []
        rows.append([repr(outer), repr(post), repr(thickness), int(kit.quantity[number]), *price])
    return rows


def _csv(rows: Sequence[Sequence[object]]) -> str:
    text = StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    return text.getvalue()
