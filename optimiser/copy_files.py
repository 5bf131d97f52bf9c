"""Read a measured table of another damper, to copy its feel."""

from collections.abc import Iterable

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.files import Table, find_data, read_table
from optimiser.wanted.dyno_copy import copied
from optimiser.wanted.target import Target

FASTEST_M_S, HARDEST_N = 20.0, 1e5
_COLUMN = "direction"
_DIRECTIONS = ("compression", "rebound")


def read_copy(name: str, direction: Direction, static_n: float = 0.0, alone: bool = True) -> Target:
    """Target of one direction from a measured table: ``velocity_m_s,force_n[,direction]``.

    Rows in any order, repeats allowed. With a ``direction`` column the file may hold both
    strokes; without one it holds one of them, and must be ``alone``. ``static_n``, N, (gas and
    friction of the measured damper) is taken off every force. Raises BadInput.
    """
    path = find_data("target", name)
    faults: list[str] = []
    table = read_table(path, ["velocity_m_s", "force_n"], texts=[_COLUMN], collect=faults)
    if _COLUMN not in table.texts and not alone:
        faults.append(f'{path}: has no column "{_COLUMN}"; allowed: one --copy file a direction')
    rows = range(len(table.lines))
    faults += [f"{table.where(row)}: {fault}" for row in rows for fault in _faults(table, row)]
    chosen = [row for row in rows if table.text(_COLUMN, row) in (None, direction)]
    if not faults and not chosen:
        faults.append(f"{path}: holds no {direction} row; allowed: two or more")
    if faults:
        raise BadInput(faults)
    try:
        return copied(
            table.numbers["velocity_m_s"][chosen],
            table.numbers["force_n"][chosen],
            direction=direction,
            static_force_n=static_n,
            origin=f"copy of {name}",
        )
    except BadInput as error:
        raise BadInput(f"{path}, {direction}: {fault}" for fault in error.faults) from None


def _faults(table: Table, row: int) -> Iterable[str]:
    word = table.text(_COLUMN, row)
    if word not in (None, *_DIRECTIONS):
        yield f'direction "{word}" is not known; allowed: {" or ".join(_DIRECTIONS)}'
    velocity = table.numbers["velocity_m_s"][row]
    force = table.numbers["force_n"][row]
    if not 0.0 < velocity <= FASTEST_M_S:
        hint = " (is it in mm/s?)" if velocity > FASTEST_M_S else ""
        yield f"velocity_m_s {velocity:g}; allowed: above 0 up to {FASTEST_M_S:g}{hint}"
    if not 0.0 < force <= HARDEST_N:
        yield f"force_n {force:g}; allowed: above 0 up to {HARDEST_N:g}"
