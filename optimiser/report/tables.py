"""Tables of a prediction, laid out for 80 columns."""

from collections.abc import Sequence
from math import isfinite, nan
from typing import TYPE_CHECKING

from rich.table import Table
from rich.text import Text

from optimiser.mechanics.deflect import RISE_LIMIT
from optimiser.prediction import Prediction, ShimState
from optimiser.report.drawing import side_view
from optimiser.report.look import Look

if TYPE_CHECKING:
    from optimiser.fitting.bands import Bands

#: Stacks side by side in one table of 80 columns.
SIDE_BY_SIDE = 4
#: Columns of a likely spread.
BAND_HEADINGS = ["5 %\nN", "95 %\nN"]


def new_table(look: Look, *headings: str, left: Sequence[int] = ()) -> Table:
    """An empty table of numbers; the columns in ``left`` hold text."""
    table = Table(
        box=look.frame, show_edge=False, pad_edge=False, padding=(0, 1, 0, 0), header_style="bold"
    )
    for place, heading in enumerate(headings):
        table.add_column(
            heading, justify="left" if place in left else "right", no_wrap=True, overflow="crop"
        )
    return table


def force_text(force_n: float) -> str:
    """A force, N, to a precision that means something; infinite where the oil cannot pass."""
    if not isfinite(force_n):
        return "locked"
    return f"{force_n:.1f}" if force_n < 100.0 else f"{force_n:.0f}"


def force_table(seen: Prediction, look: Look, bands: "Bands | None" = None) -> Table:
    """Force, its band, its click range, pressure, lift and the bleed's share over velocity."""
    adjuster = seen.setup.clicks_range > 0
    notes = [_row_note(seen, row) for row in range(seen.velocity_m_s.size)]
    headings = ["velocity\nm/s", "force\nN"] + (BAND_HEADINGS if bands else [])
    headings += ["closed\nN", "open\nN"] if adjuster else []
    headings += ["pressure\nMPa", "lift\nmm", "bleed\n%"]
    table = new_table(look, *headings, *([""] if any(notes) else []), left=[len(headings)])
    if bands and any(notes):
        table.padding = (0, 0, 0, 0)
    for row, velocity in enumerate(seen.velocity_m_s):
        cells = [Text(f"{velocity:g}"), Text(force_text(seen.force_n[row]), style="bold")]
        cells += edges_of(bands, row) if bands else []
        if adjuster:
            cells += [
                Text(force_text(seen.force_closed_n[row]), style="dim"),
                Text(force_text(seen.force_open_n[row]), style="dim"),
            ]
        cells += [
            Text(f"{seen.pressure_mpa[row]:.3f}"),
            Text(f"{seen.lift_mm[row]:.3f}"),
            Text(f"{100.0 * seen.bleed_share[row]:.0f}"),
        ]
        table.add_row(*cells, *([Text(notes[row], style="yellow")] if any(notes) else []))
    return table


def edges_of(bands: "Bands | None", row: int) -> list[Text]:
    """Two cells: 5 and 95 % of the force in one row, N; dashes without a band."""
    if bands is None:
        return [Text("-"), Text("-")]
    return [Text(force_text(bands.p05_n[row])), Text(force_text(bands.p95_n[row]))]


def _row_note(seen: Prediction, row: int) -> str:
    notes = []
    if seen.rise_thicknesses[row] > RISE_LIMIT:
        notes.append("outside")
    if seen.cavitation_m_s is not None and seen.velocity_m_s[row] >= seen.cavitation_m_s:
        notes.append("cavitates")
    return ", ".join(notes)


def stack_table(seen: Prediction, look: Look, widest_mm: float | None = None) -> Table:
    """The stack face first: side view, group, worst stress, its place, utilisation."""
    view = side_view(seen.stack, seen.setup.valve, look.unicode, widest_mm)
    table = new_table(
        look,
        "side view",
        "shims, face first\nnumber x dia. x mm",
        "stress\nMPa",
        "worst at\nmm dia.",
        "utili-\nsation",
        left=[0, 1],
    )
    table.add_row(Text(view.piston, style="dim"), Text("piston face", style="dim"), "", "", "")
    first = 0
    for line, group in zip(view.groups[:-1], seen.stack.groups[:-1], strict=True):
        members = seen.shims[first : first + group.quantity]
        first += group.quantity
        table.add_row(Text(line, style="cyan"), str(group), *_worst(members))
    table.add_row(Text(view.groups[-1], style="dim"), str(seen.stack.groups[-1]), "", "clamp", "")
    return table


def _worst(members: Sequence[ShimState]) -> list[Text]:
    worst = max(members, key=lambda shim: shim.utilisation)
    place = "clamp" if worst.at_clamp else f"{worst.peak_at_mm:.1f}"
    style = "bold red" if worst.utilisation >= 1.0 else ""
    mark = "!" if worst.utilisation >= 1.0 else " "
    return [
        Text(f"{worst.peak_stress_mpa:.0f}"),
        Text(place),
        Text(f"{worst.utilisation:.2f}{mark}", style=style),
    ]


def compare_tables(seen: Sequence[Prediction], names: Sequence[str], look: Look) -> list[Table]:
    """Force of every stack over velocity, each with its difference to the first, %."""
    tables = []
    for start in range(1, max(len(seen), 2), SIDE_BY_SIDE - 1):
        shown = [0, *range(start, min(start + SIDE_BY_SIDE - 1, len(seen)))]
        headings = ["velocity\nm/s"]
        for place in shown:
            headings += [f"{names[place]}\nN"] + (
                [f"{names[place]}-{names[0]}\n%"] if place else []
            )
        table = new_table(look, *headings)
        for row, velocity in enumerate(seen[0].velocity_m_s):
            cells = [f"{velocity:g}"]
            for place in shown:
                force = float(seen[place].force_n[row])
                cells.append(force_text(force))
                cells += [_percent(force, float(seen[0].force_n[row]))] if place else []
            table.add_row(*cells)
        tables.append(table)
    return tables


def _percent(force: float, reference: float) -> str:
    known = isfinite(force) and isfinite(reference) and reference != 0.0
    change = 100.0 * (force / reference - 1.0) if known else nan
    return f"{change:+.1f}" if isfinite(change) else "-"
