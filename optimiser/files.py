"""The only door between files and the program: find, read, check and write.

A bare name ("workshop") is looked up in the bundled data, a path (anything with a slash or a file
ending) works everywhere. Everything wrong with a file is raised as BadInput, one plain sentence a
fault, all faults at once. Files that are written appear whole or not at all.
"""

import os
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path
from secrets import token_hex
from typing import Any, Literal, TypeVar

import numpy as np
from pydantic import BaseModel

from optimiser.checking import validate
from optimiser.damper import Damper
from optimiser.faults import BadInput
from optimiser.materials import Oil, Steel
from optimiser.parsing import Columns, Floats, Table, decode, nearest, parse_table, parse_toml
from optimiser.stack import Group, Shim, Stack
from optimiser.stock import Stock, StockItem

__all__ = [
    "KINDS",
    "Columns",
    "Kind",
    "Table",
    "atomic_write_bytes",
    "atomic_write_text",
    "bundled_names",
    "find_data",
    "fingerprint",
    "read_damper",
    "read_model",
    "read_oil",
    "read_points",
    "read_stack",
    "read_steel",
    "read_stock",
    "read_table",
    "read_text",
    "read_toml",
    "validate",
    "write_stack",
]

Kind = Literal[
    "damper", "stock", "steel", "oil", "stack", "target", "frame", "feel", "rider", "request"
]
Record = TypeVar("Record", bound=BaseModel)


@dataclass(frozen=True)
class Place:
    """Where one kind of data lies: a folder of files, or one file of named tables."""

    title: str
    path: str
    ending: str = ".toml"


KINDS: dict[Kind, Place] = {
    "damper": Place("damper", "catalogue/dampers"),
    "stock": Place("stock list", "catalogue/stock", ".csv"),
    "steel": Place("shim steel", "catalogue/steels.toml"),
    "oil": Place("oil", "catalogue/oils.toml"),
    "stack": Place("stack", "catalogue/stacks", ".csv"),
    "target": Place("target", "targets/curves", ".csv"),
    "frame": Place("frame", "targets/frames"),
    "feel": Place("feel", "targets/feels"),
    "rider": Place("rider", "targets/riders"),
    "request": Place("tune-table request", "targets/requests"),
}


def data_root() -> Path:
    """Folder of ``catalogue`` and ``targets``: inside an installed package, or the checkout."""
    package = Path(__file__).resolve().parent
    installed = package / "_data"
    return installed if installed.is_dir() else package.parent


def bundled_names(kind: Kind) -> list[str]:
    """Names of all bundled data of a kind, sorted."""
    place = KINDS[kind]
    path = data_root() / place.path
    if path.suffix:
        return sorted(read_toml(path)) if path.is_file() else []
    return sorted(file.stem for file in path.glob(f"*{place.ending}"))


def find_data(kind: Kind, name_or_path: str | Path) -> Path:
    """File that holds the data: of a bundled name, or of a path.

    For steels and oils a bare name leads to the file of all of them. Raises BadInput when there
    is none, naming the nearest and listing what there is.
    """
    place = KINDS[kind]
    if is_path(name_or_path):
        path = Path(name_or_path).expanduser()
        if path.is_dir():
            raise BadInput(f"{path}: is a folder; allowed: a {place.title} file")
        if not path.is_file():
            raise BadInput(f"{path}: there is no such file; allowed: a {place.title} file")
        return path
    name = str(name_or_path)
    names = bundled_names(kind)
    if name not in names:
        listed = ", ".join(names) or "none"
        raise BadInput(
            f'there is no {place.title} named "{name}"{nearest(name, names)}; allowed: {listed}, '
            f"or the path of a file, such as ./{name or 'mine'}{place.ending}"
        )
    path = data_root() / place.path
    return path if path.suffix else path / f"{name}{place.ending}"


def is_path(name_or_path: str | Path) -> bool:
    """True for a path (a Path, or text with a slash or a file ending), False for a bare name."""
    text = str(name_or_path)
    separators = [os.sep, os.altsep or os.sep, "/"]
    return (
        isinstance(name_or_path, Path)
        or any(mark in text for mark in separators)
        or text.lower().endswith((".toml", ".csv", ".txt", ".json"))
    )


def read_text(path: str | Path) -> str:
    """A UTF-8 text file, without byte-order mark. Raises BadInput when it cannot be read."""
    try:
        raw = Path(path).read_bytes()
    except OSError as error:
        raise BadInput(
            f"{path}: cannot be read ({(error.strerror or 'unknown').lower()})"
        ) from None
    return decode(raw, str(path))


def read_toml(path: str | Path) -> dict[str, Any]:
    """A TOML file as a dictionary. Raises BadInput (unreadable, empty, syntax, duplicate keys)."""
    return parse_toml(read_text(path), str(path))


def read_table(
    path: str | Path,
    required: Sequence[str],
    optional: Sequence[str] = (),
    *,
    texts: Sequence[str] = (),
    signed: Sequence[str] = (),
    collect: list[str] | None = None,
) -> Table:
    """A CSV file with a header line. Raises BadInput; see :func:`parsing.parse_table`."""
    columns = Columns(required, optional, texts, signed)
    return parse_table(read_text(path), columns, str(path), collect)


def read_model(kind: Kind, name_or_path: str | Path, model: type[Record]) -> Record:
    """A TOML file of a kind, checked against its model. Raises BadInput."""
    path = find_data(kind, name_or_path)
    return validate(model, read_toml(path), str(path))


def read_damper(name_or_path: str | Path) -> Damper:
    """A damper, by bundled name or path. Raises BadInput.

    Its oil and steel must exist; where they are given as paths, those count from the damper's file.
    """
    path = find_data("damper", name_or_path)
    data = read_toml(path)
    faults: list[str] = []
    kinds: tuple[tuple[Literal["oil", "steel"], type[Oil] | type[Steel]], ...]
    kinds = (("oil", Oil), ("steel", Steel))
    for kind, model in kinds:
        named = data.get(kind)
        if not isinstance(named, str) or not named:
            continue
        if is_path(named):
            data[kind] = named = str(path.parent / Path(named).expanduser())
        try:
            _read_record(kind, named, model)
        except BadInput as error:
            faults += [f"{path}: key {kind}: {fault}" for fault in error.faults]
    try:
        damper = validate(Damper, data, str(path))
    except BadInput as error:
        raise BadInput([*error.faults, *faults]) from None
    if faults:
        raise BadInput(faults)
    return damper


def read_steel(name_or_path: str | Path) -> Steel:
    """A shim steel, by bundled name or by the path of a file with one such table."""
    return _read_record("steel", name_or_path, Steel)


def read_oil(name_or_path: str | Path) -> Oil:
    """A damper oil, by bundled name or by the path of a file with one such table."""
    return _read_record("oil", name_or_path, Oil)


def _read_record(
    kind: Literal["steel", "oil"], name_or_path: str | Path, model: type[Record]
) -> Record:
    path = find_data(kind, name_or_path)
    tables = read_toml(path)
    if is_path(name_or_path):
        if len(tables) != 1:
            raise BadInput(
                f"{path}: holds {len(tables)} entries; allowed: one table, such as [my-{kind}]"
            )
        name = next(iter(tables))
    else:
        name = str(name_or_path)
    table = tables[name]
    if not isinstance(table, dict):
        raise BadInput(f"{path}: key {name} stands alone; allowed: one table, such as [my-{kind}]")
    if "name" in table:
        raise BadInput(f"{path}: key {name}.name is not known; the table's own name is the name")
    return validate(model, {"name": name, **table}, f"{path} [{name}]")


def read_stack(name_or_path: str | Path) -> Stack:
    """A stack CSV: ``outer_mm,thickness_mm,quantity[,inner_mm]``, face first, clamp shim last.

    ``inner_mm`` is given only for ring shims. Raises BadInput.
    """
    path = find_data("stack", name_or_path)
    faults: list[str] = []
    table = read_table(path, ["outer_mm", "thickness_mm", "quantity"], ["inner_mm"], collect=faults)
    groups = []
    for row in range(len(table.lines)):
        quantity = table.number("quantity", row) or 0.0
        if not quantity.is_integer():
            faults.append(f"{table.where(row)}: quantity {quantity:g}; allowed: a whole number")
            continue
        outer, thickness = table.number("outer_mm", row), table.number("thickness_mm", row)
        shim = Shim(outer or 0.0, thickness or 0.0, table.number("inner_mm", row))
        groups.append(Group(int(quantity), shim))
    if faults:
        raise BadInput(faults)
    try:
        return Stack(tuple(groups))
    except BadInput as error:
        raise BadInput(f"{path}: {fault}" for fault in error.faults) from None


def write_stack(path: str | Path, stack: Stack) -> None:
    """Write a stack as CSV that :func:`read_stack` reads back."""
    rings = any(group.shim.inner_mm is not None for group in stack.groups)
    lines = ["outer_mm,thickness_mm,quantity" + (",inner_mm" if rings else "")]
    for quantity, shim in ((group.quantity, group.shim) for group in stack.groups):
        hole = "" if shim.inner_mm is None else f"{shim.inner_mm!r}"
        line = f"{shim.outer_mm!r},{shim.thickness_mm!r},{quantity}"
        lines.append(f"{line},{hole}" if rings else line)
    atomic_write_text(path, "\n".join(lines) + "\n")


def read_stock(name_or_path: str | Path) -> Stock:
    """A stock list, by bundled name or path. Raises BadInput.

    Columns ``outer_mm,inner_mm,thickness_mm,quantity`` (``inner_mm`` is the bore), optional
    ``measured_mm,price,bin``; blank optional cells mean not known.
    """
    path = find_data("stock", name_or_path)
    faults: list[str] = []
    table = read_table(
        path,
        ["outer_mm", "inner_mm", "thickness_mm", "quantity"],
        ["measured_mm", "price"],
        texts=["bin"],
        collect=faults,
    )
    items: list[StockItem] = []
    first: dict[tuple[object, ...], int] = {}
    for row, line in enumerate(table.lines):
        try:
            item = _stock_item(table, row)
        except BadInput as error:
            faults += [f"{table.where(row)}: {fault}" for fault in error.faults]
            continue
        key = (item.outer_mm, item.inner_mm, item.thickness_mm, item.measured_mm, item.bin)
        if first.setdefault(key, line) != line:
            faults.append(
                f"{table.where(row)}: repeats line {first[key]}; allowed: one line a size and bin"
            )
        items.append(item)
    if not faults and not any(item.quantity for item in items):
        faults.append(f"{path}: every quantity is 0; allowed: at least one shim in stock")
    if faults:
        raise BadInput(faults)
    return Stock(items)


def _stock_item(table: Table, row: int) -> StockItem:
    quantity = table.number("quantity", row) or 0.0
    if not quantity.is_integer():
        raise BadInput(f"quantity {quantity:g}; allowed: a whole number, 0 or more")
    return StockItem(
        table.number("outer_mm", row) or 0.0,
        table.number("inner_mm", row) or 0.0,
        table.number("thickness_mm", row) or 0.0,
        int(quantity),
        table.number("measured_mm", row),
        table.number("price", row),
        table.text("bin", row),
    )


def read_points(name_or_path: str | Path) -> tuple[Floats, Floats, Floats]:
    """A target's points: ``velocity_m_s``, ``force_n``, ``weight``, (n,) each. Raises BadInput.

    Columns ``velocity_m_s,force_n`` and optional ``weight`` (blank or no column: 1). Velocities
    are positive and rise from line to line, forces are positive, some weight is not zero.
    """
    path = find_data("target", name_or_path)
    faults: list[str] = []
    table = read_table(path, ["velocity_m_s", "force_n"], ["weight"], collect=faults)
    velocity, force = table.numbers["velocity_m_s"], table.numbers["force_n"]
    given = [table.number("weight", row) for row in range(len(table.lines))]
    weight = np.array([1.0 if value is None else value for value in given])
    for row in range(len(table.lines)):
        faults += [f"{table.where(row)}: {f}" for f in _point_faults(velocity, force, row)]
    if not faults and velocity.size < 2:
        faults.append(f"{path}: holds one point only; allowed: two points or more")
    if weight.size and not np.any(weight > 0.0):
        faults.append(f"{path}: every weight is 0; allowed: at least one weight above 0")
    if faults:
        raise BadInput(faults)
    return velocity, force, weight


def _point_faults(velocity: Floats, force: Floats, row: int) -> Iterable[str]:
    if velocity[row] == 0.0:
        yield "velocity_m_s is 0; allowed: more than 0 (at rest a damper has no force)"
    if velocity[row] > 20.0:
        yield f"velocity_m_s {velocity[row]:g}; allowed: at most 20 (is it in mm/s?)"
    if force[row] == 0.0:
        yield "force_n is 0; allowed: more than 0"
    if force[row] > 1e5:
        yield f"force_n {force[row]:g}; allowed: at most 100000"
    if row and velocity[row] == velocity[row - 1]:
        yield f"velocity_m_s {velocity[row]:g} is given twice; allowed: once"
    if row and velocity[row] < velocity[row - 1]:
        yield (
            f"velocity_m_s {velocity[row]:g} comes after {velocity[row - 1]:g}; allowed: sorted, "
            "slowest first"
        )


def atomic_write_text(path: str | Path, text: str) -> None:
    """Write UTF-8 text so that the file appears whole or not at all. Raises BadInput."""
    atomic_write_bytes(path, text.encode("utf-8"))


def atomic_write_bytes(path: str | Path, content: bytes) -> None:
    """Write bytes so that the file appears whole or not at all. Raises BadInput."""
    goal = Path(path)
    if goal.is_dir():
        raise BadInput(f"{goal}: is a folder; allowed: the path of a file to write")
    if not goal.parent.is_dir():
        raise BadInput(f"{goal}: the folder {goal.parent} does not exist; make it first")
    part = goal.with_name(f".{goal.name}.{token_hex(4)}")
    try:
        with part.open("xb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        if goal.exists():
            part.chmod(goal.stat().st_mode & 0o777)
        part.replace(goal)
    except OSError as error:
        raise BadInput(f"{goal}: cannot be written ({_reason(error)})") from None
    finally:
        part.unlink(missing_ok=True)


def _reason(error: OSError) -> str:
    return (error.strerror or type(error).__name__).lower()


def fingerprint(content: bytes | str | Path) -> str:
    """First 12 hexadecimal digits of the SHA-256 of bytes, or of the file at a path."""
    raw = content if isinstance(content, bytes) else Path(content).read_bytes()
    return sha256(raw).hexdigest()[:12]
