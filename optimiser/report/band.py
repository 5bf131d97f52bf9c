"""The likely spread of a prediction, for tables, charts and sheets."""

from collections.abc import Sequence

from rich.table import Table

from optimiser.fitting.bands import Bands
from optimiser.fitting.spread import Spread
from optimiser.prediction import Prediction, predict
from optimiser.report.curve_line import Floats
from optimiser.report.look import Look
from optimiser.report.sheet_from import smooth_velocities
from optimiser.report.tables import SIDE_BY_SIDE, edges_of, new_table


def bands_tables(
    seen: Sequence[Prediction], bands: Sequence[Bands | None], names: Sequence[str], look: Look
) -> list[Table]:
    """Where the force of every stack lies, for stacks that are compared; N over m/s."""
    tables = []
    for start in range(0, len(seen), SIDE_BY_SIDE):
        shown = range(start, min(start + SIDE_BY_SIDE, len(seen)))
        table = new_table(look, "velocity\nm/s", *(f"{names[n]} likely\nN" for n in shown))
        for row, velocity in enumerate(seen[0].velocity_m_s):
            cells = [" to ".join(cell.plain for cell in edges_of(bands[n], row)) for n in shown]
            table.add_row(f"{velocity:g}", *cells)
        tables.append(table)
    return tables


def smooth_band(seen: Prediction, spread: Spread | None) -> tuple[Floats, Floats] | None:
    """5 and 95 % (n,), N, at ``smooth_velocities`` of a prediction; None without a band."""
    if spread is None:
        return None
    velocity = smooth_velocities(seen.velocity_m_s)
    found = spread.bands(predict(seen.setup, seen.stack, velocity, seen.clicks))
    return None if found is None else (found.p05_n, found.p95_n)
