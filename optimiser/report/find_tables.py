"""Tables of a search's result, laid out for 80 columns."""

from collections.abc import Iterable

import numpy as np
from rich.table import Table
from rich.text import Text

from optimiser.fitting.spread import Likely
from optimiser.report.look import Look
from optimiser.report.tables import BAND_HEADINGS, edges_of, force_text, new_table
from optimiser.search.find import Found, Proposal

#: Limits beyond any damper are not worth their digits.
_MOST_PRINTED_N = 99_999.0
_GAP = 2
_SIZES = 7  # place of that column


def ranked_table(found: Found, look: Look, likely: Likely | None = None) -> Table:
    """One row a stack, best first; with the chance to be within an error where it is known."""
    revalve = any(proposal.changed is not None for proposal in found.proposals)
    marked = any(proposal.outside_model for proposal in found.proposals)
    headings = ["", "error\n%", "worst\n%", "low\n%", "mid\n%", "high\n%", "parts\n"]
    headings += [] if likely else ["sizes\n"]
    headings += ["util.\n", "clicks\n", "height\nmm", "vari-\nants"]
    headings += [f"within\n{likely.within_percent:g} %"] if likely else []
    headings += ["chan-\nged"] if revalve else []
    headings += [""] if marked else []
    table = new_table(look, *headings, left=[len(headings) - 1] if marked else [])
    if len(headings) > 12:
        table.padding = (0, 0, 0, 0)
    for place, proposal in enumerate(found.proposals, start=1):
        cells = _ranked_cells(place, proposal, found.order.setup.clicks_range > 0)
        if likely:
            del cells[_SIZES]  # there is no room for both
        cells += [chance_text(likely, place - 1)] if likely else []
        cells += [Text(str(proposal.changed))] if revalve else []
        cells += [Text("outside" * proposal.outside_model, style="yellow")] if marked else []
        table.add_row(*cells)
    return table


def _ranked_cells(place: int, proposal: Proposal, adjuster: bool) -> list[Text]:
    bands = proposal.bands
    worn, error = proposal.utilisation >= 1.0, proposal.error_percent
    return [
        Text(str(place)),
        Text(f"{error:.2f}" if error < 100.0 else f"{error:.0f}", style="bold"),
        Text(f"{proposal.worst.percent:+.1f}"),
        *(
            Text(percent_text(value))
            for value in (bands.low_percent, bands.mid_percent, bands.high_percent)
        ),
        Text(str(proposal.parts)),
        Text(str(proposal.sizes)),
        Text(f"{proposal.utilisation:.2f}{'!' if worn else ' '}", style="bold red" * worn),
        Text(str(proposal.clicks) if adjuster else "-"),
        Text(f"{proposal.stack.height_mm:.2f}"),
        Text(str(proposal.variants)),
    ]


def chance_text(likely: Likely, place: int) -> Text:
    """A stack's chance, %; a dash where its band cannot be computed."""
    if likely.bands[place] is None:
        return Text("-")
    return Text(f"{100.0 * likely.chance[place]:.0f} %", style="bold")


def percent_text(percent: float | None) -> str:
    """A per cent of error; a dash where no point lies in the band."""
    if percent is None:
        return "-"
    return f"{percent:.1f}" if abs(percent) < 100.0 else f"{percent:.0f}"


def stacks_side_by_side(found: Found, look: Look) -> Iterable[Table]:
    """Every stack face first, as many beside each other as the width holds."""
    columns = [proposal.stack.lines() for proposal in found.proposals]
    widest = max(len(line) for lines in columns for line in lines)
    across = max(1, (look.console.width + _GAP) // (widest + _GAP))
    for first in range(0, len(columns), across):
        shown = columns[first : first + across]
        headings = [f"stack {first + 1 + place}" for place in range(len(shown))]
        table = new_table(look, *headings, left=range(len(shown)))
        for row in range(max(len(lines) for lines in shown)):
            table.add_row(*(lines[row] if row < len(lines) else "" for lines in shown))
        yield table


def envelope_table(found: Found, look: Look, likely: Likely | None = None) -> Table:
    """The target, the best stack, its band where it is known, and what bounds every stack, at the
    target's velocities."""
    target, limits, best = found.order.target, found.limits, found.proposals[0]
    table = new_table(
        look,
        "velocity\nm/s",
        "wanted\nN",
        "stack 1\nN",
        *(BAND_HEADINGS if likely else []),
        "off\n%",
        "softest\npossible",
        "softest\nin stock",
        "firmest\nin stock",
        "firmest\npossible",
    )
    if likely:
        table.padding = (0, 0, 0, 0)
    off = 100.0 * target.relative(best.force_n)
    for row, velocity in enumerate(target.velocity_m_s):
        bounds = (limits.bare_n, limits.softest_n, limits.firmest_n, limits.shut_n)
        table.add_row(
            Text(f"{velocity:.4g}"),
            Text(force_text(target.force_n[row])),
            Text(force_text(best.force_n[row]), style="bold"),
            *(edges_of(likely.bands[0], row) if likely else []),
            Text(f"{off[row]:+.1f}"),
            *(Text(limit_text(float(bound[row])), style="dim") for bound in bounds),
        )
    return table


def limit_text(force_n: float) -> str:
    """A limit, N."""
    if np.isfinite(force_n) and force_n > _MOST_PRINTED_N:
        return "> 99999"
    return force_text(force_n)
