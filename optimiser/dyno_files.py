"""Dyno files and fit requests: find, read, convert units, question odd sizes.

A dyno file is a CSV with a header line: force over velocity (``velocity_m_s,force_n``), or a time
series (``time_s,displacement_mm,force_n``). Column names end in their unit (``velocity_mm_s``,
``force_lbf``) unless the request names columns and units. Further columns are passed over.
"""

from json import loads
from pathlib import Path
from typing import NamedTuple

import numpy as np

from optimiser.damper import Damper, Direction
from optimiser.faults import BadInput
from optimiser.files import data_root, is_path, read_stack, read_text, read_toml, validate
from optimiser.fitting.request import FITTED, FitRequest, RunRequest
from optimiser.fitting.runs import Run, run_faults
from optimiser.fitting.series import motion_of
from optimiser.fitting.strokes import Strokes, strokes_of
from optimiser.fitting.uncertainty import Uncertainty, uncertainty_of_record
from optimiser.fitting.units import SUFFIXES, UNITS, Quantity, question
from optimiser.hydraulics.lift import Floats
from optimiser.parsing import Columns, Table, nearest, parse_table
from optimiser.stack import Stack

#: Folder of the bundled example request and its runs.
FOLDER = "targets/dyno"


class DynoColumns(NamedTuple):
    """Where each quantity stands in a file: column name and unit."""

    names: dict[Quantity, str]
    units: dict[Quantity, str]

    @property
    def is_series(self) -> bool:
        """True for displacement over time, False for force over velocity."""
        return "time" in self.names


def find_fit_request(name_or_path: str | Path) -> Path:
    """File of a fit request: of a bundled name or of a path. Raises BadInput."""
    if is_path(name_or_path):
        path = Path(name_or_path).expanduser()
        if not path.is_file():
            raise BadInput(f"{path}: there is no such file; allowed: a fit request (TOML)")
        return path
    folder = data_root() / FOLDER
    names = sorted(file.stem for file in folder.glob("*.toml"))
    if name_or_path not in names:
        raise BadInput(
            f'there is no fit request named "{name_or_path}"{nearest(str(name_or_path), names)}; '
            f"allowed: {', '.join(names) or 'none'}, or the path of a file, such as ./mine.toml"
        )
    return folder / f"{name_or_path}.toml"


def read_fit_request(name_or_path: str | Path) -> FitRequest:
    """A fit request, by bundled name or path. Raises BadInput with every fault."""
    path = find_fit_request(name_or_path)
    return validate(FitRequest, read_toml(path), str(path))


def read_uncertainty(path: str | Path) -> Uncertainty:
    """Spread of a calibrated damper's numbers, from the ``.fit.json`` that ``fit --out`` writes.

    Raises BadInput.
    """
    try:
        document = loads(read_text(path))
    except ValueError as error:
        if isinstance(error, BadInput):
            raise
        raise BadInput(f"{path}: is not JSON; allowed: the .fit.json of a fit") from None
    record = document.get("uncertainty") if isinstance(document, dict) else None
    return uncertainty_of_record(record if isinstance(record, dict) else {}, str(path))


def damper_of(path: Path, request: FitRequest) -> str:
    """Name or path of a request's damper; a path counts from the request's folder."""
    return str(path.parent / request.damper) if is_path(request.damper) else request.damper


class DynoRuns(NamedTuple):
    """Runs of a request, what was found out about each file, and every file read."""

    runs: tuple[Run, ...]
    notes: tuple[str, ...]
    files: tuple[Path, ...]
    strokes: tuple[Strokes, ...]


def read_runs(path: Path, request: FitRequest, damper: Damper) -> DynoRuns:
    """Every run of the request at ``path``. Raises BadInput with the faults of all of them."""
    faults: list[str] = []
    runs: list[Run] = []
    notes: dict[str, dict[str, None]] = {}
    strokes: list[Strokes] = []
    for number, wanted in enumerate(request.runs, start=1):
        where = f"{path} run {number} ({wanted.file})"
        try:
            found = read_strokes(path.parent / wanted.file, wanted)
            strokes.append(found)
            for note in found.notes:
                notes.setdefault(note, {})[wanted.file] = None
            made = _runs_of(wanted, found, damper, path.parent)
        except BadInput as error:
            faults += [f"{where}: {fault}" for fault in error.faults]
            continue
        faults += [f"{where}: {fault}" for run in made for fault in run_faults(damper, run)]
        runs += made
    if faults:
        raise BadInput(dict.fromkeys(faults))
    files = tuple(dict.fromkeys(path.parent / wanted.file for wanted in request.runs))
    return DynoRuns(
        tuple(runs),
        tuple(f"{', '.join(names)}: {note}" for note, names in notes.items()),
        files,
        tuple(strokes),
    )


def read_strokes(path: str | Path, wanted: RunRequest) -> Strokes:
    """Compression and rebound of one dyno file, in m/s and N. Raises BadInput."""
    if not Path(path).is_file():
        raise BadInput("there is no such file; allowed: a dyno run (CSV)")
    text = read_text(path)
    places = columns_of(_header(text), wanted)
    table = _table(text, places, str(path))
    values = {quantity: _converted(table, places, quantity) for quantity in places.names}
    odd = [
        question(quantity, table.numbers[name], places.units[quantity])
        for quantity, name in places.names.items()
    ]
    if any(odd):
        raise BadInput(sentence for sentence in odd if sentence)
    only: Direction | None = None if wanted.circuit == "both" else wanted.circuit
    if not places.is_series:
        velocity = values["velocity"]
        gain = np.gradient(np.abs(velocity)) if velocity.size > 1 else np.zeros(1)
        return strokes_of(velocity, values["force"], gain, wanted.positive, only)
    motion = motion_of(values["time"], values["displacement"], values["force"], wanted.smoothing_s)
    return strokes_of(motion.velocity_m_s, motion.force_n, motion.speed_gain, wanted.positive, only)


def columns_of(header: list[str], wanted: RunRequest) -> DynoColumns:
    """Column and unit of every quantity a run needs. Raises BadInput with every fault."""
    named = {q: getattr(wanted.columns, q) for q in UNITS}
    seen = {q: named[q] or _own_name(q, header) for q in UNITS}
    velocity = named["velocity"] or (seen["velocity"] and not seen["time"])
    needed: tuple[Quantity, ...]
    needed = ("velocity", "force") if velocity else ("time", "displacement", "force")
    if not (seen["velocity"] or seen["time"] or seen["displacement"]):
        needed = ("velocity", "force")
    faults: list[str] = []
    names: dict[Quantity, str] = {}
    units: dict[Quantity, str] = {}
    for quantity in needed:
        name = seen[quantity]
        column = "" if name is None else str(name).strip().lower()
        if column not in header:
            faults.append(_missing(quantity, column, header))
            continue
        unit = getattr(wanted.units, quantity) or SUFFIXES[quantity].get(_ending(quantity, column))
        if unit is None:
            allowed = ", ".join(UNITS[quantity])
            faults.append(
                f'the unit of column "{column}" is not known; allowed: units = {{ {quantity} = '
                f'"..." }} with one of {allowed}'
            )
            continue
        names[quantity], units[quantity] = column, unit
    if faults:
        raise BadInput(faults)
    return DynoColumns(names, units)


def _missing(quantity: Quantity, column: str, header: list[str]) -> str:
    listed = ", ".join(header)
    if column:
        return f'there is no column "{column}"{nearest(column, header)}; the file has: {listed}'
    usual = " or ".join(f"{quantity}_{suffix}" for suffix in SUFFIXES[quantity])
    return (
        f"there is no column of {quantity}; allowed: {usual}, or columns = {{ {quantity} = "
        f'"..." }} with one of the file\'s: {listed}'
    )


def _ending(quantity: Quantity, column: str) -> str:
    """The part of a column's name that may be a unit, such as ``mm_s`` of ``speed_mm_s``."""
    endings = sorted(SUFFIXES[quantity], key=len, reverse=True)
    return next((end for end in endings if column.endswith(f"_{end}")), "")


def _own_name(quantity: Quantity, header: list[str]) -> str | None:
    usual = [f"{quantity}_{suffix}" for suffix in SUFFIXES[quantity]]
    return next((name for name in header if name in usual), None)


def _header(text: str) -> list[str]:
    lines = (line for line in text.splitlines() if line.strip() and not line.startswith("#"))
    return [name.strip().strip('"').lower() for name in next(lines, "").split(",")]


def _table(text: str, places: DynoColumns, file: str) -> Table:
    header = _header(text)
    used = list(places.names.values())
    others = [name for name in header if name not in used]
    return parse_table(text, Columns(used, (), others, used), file)


def _converted(table: Table, places: DynoColumns, quantity: Quantity) -> Floats:
    values: Floats = table.numbers[places.names[quantity]]
    return values * UNITS[quantity][places.units[quantity]]


def _runs_of(wanted: RunRequest, found: Strokes, damper: Damper, folder: Path) -> list[Run]:
    """The runs a request's table means: one, or one a stroke."""
    both: tuple[Direction, ...] = ("compression", "rebound")
    if wanted.circuit == "both" and wanted.stack != FITTED:
        raise BadInput(
            "circuit both means the fitted stacks; allowed: a table [[runs]] for each circuit, "
            "each with its own stack and the same file"
        )
    directions = both if wanted.circuit == "both" else (wanted.circuit,)
    return [_run_of(wanted, found, damper, direction, folder) for direction in directions]


def _run_of(
    wanted: RunRequest, found: Strokes, damper: Damper, direction: Direction, folder: Path
) -> Run:
    if direction not in found.curves:
        raise BadInput(f"holds no {direction} stroke")
    if getattr(damper, direction) is None:
        raise BadInput(f"damper {damper.name} has no {direction} circuit")
    valve = damper.circuit(direction).searched
    fitted_clicks = valve.fitted_clicks
    if fitted_clicks is None:
        fitted_clicks = valve.bleed.needle.clicks // 2 if valve.bleed.needle else 0
    curve = found.curves[direction]
    return Run(
        wanted.file,
        direction,
        _stack_of(wanted.stack, valve.fitted, folder),
        fitted_clicks if wanted.clicks is None else wanted.clicks,
        wanted.oil_temp_c,
        curve.velocity_m_s,
        curve.force_n,
        curve.hysteresis_n,
        found.friction_n,
        found.gas_n,
        wanted.units_are_right,
    )


def _stack_of(named: str | tuple[str, ...], fitted: Stack | None, folder: Path) -> Stack:
    if isinstance(named, tuple):
        return Stack.parse(named)
    if named == FITTED:
        if fitted is None:
            raise BadInput("the damper has no fitted stack")
        return fitted
    return read_stack(folder / named if is_path(named) else named)
