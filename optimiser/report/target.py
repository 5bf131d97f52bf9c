"""The report of ``target`` on a terminal, its chart and its JSON document."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import log
from typing import Any

import numpy as np
from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from optimiser.envelope import place_percent
from optimiser.prediction import Prediction, Setup
from optimiser.report.curve_line import CurveLine, Floats, Panel
from optimiser.report.document import as_json
from optimiser.report.look import Look
from optimiser.report.paragraph import paragraph
from optimiser.report.ride import (
    feel_document,
    feel_lines,
    ride_document,
    ride_heading,
    ride_table,
    road_table,
)
from optimiser.report.small_chart import small_chart
from optimiser.report.tables import force_text, new_table
from optimiser.wanted.feasible import Feasibility, Limits, Outside, Reason
from optimiser.wanted.target import Target
from optimiser.wish import RideWish, Wished

#: Limits further from the target than this are not drawn, and not printed to the newton.
_DRAWN_UP_TO = 1.6
_MOST_PRINTED_N = 99_999.0

#: What stops the damper, in a word; the sentences below the table say more.
_SHORT: dict[Reason, str] = {
    "bleed_too_large": "bleed",
    "ports_too_small": "ports",
    "other_parts_too_firm": "other parts",
    "no_preload": "no preload",
    "preload_too_small": "preload",
    "preload_too_high": "preload",
    "no_shim_thick_enough": "stock",
    "no_shim_thin_enough": "stock",
}
_LEGEND = (
    "Softest: no shim at all, needle open. Firmest: shims that never lift, needle closed. Lies at: "
    "0 is the softest, 100 the firmest possible, by the ratio of forces."
)
_WITHIN = (
    "At every point this lies within what the damper can do; whether the shims in stock reach it, "
    "a search tells."
)


@dataclass(frozen=True)
class Seen:
    """One direction's target against the damper's limits; ``now`` is the fitted stack or None."""

    setup: Setup
    target: Target
    limits: Limits
    feasible: Feasibility
    now: Prediction | None

    @property
    def place_percent(self) -> Floats:
        """Where every point lies between softest and firmest, %, (n,); NaN where nothing passes."""
        return place_percent(self.target.force_n, self.limits)


def show_target(seen: Sequence[Seen], wished: Wished, look: Look, quiet: bool = False) -> None:
    """Print the report."""
    for item in target_report(seen, wished, look, quiet):
        look.console.print(item)


def target_report(
    seen: Sequence[Seen], wished: Wished, look: Look, quiet: bool
) -> Iterable[RenderableType]:
    """The parts of the report in order, ready to print."""
    for number, one in enumerate(seen):
        yield from [""] * (number > 0)
        yield from _single(one, look)
    for note in wished.notes:
        yield from paragraph(f"note: {note}", look, "yellow")
    if not quiet:
        yield ""
        yield from paragraph(_LEGEND, look, "dim")
    if wished.ride is not None:
        yield from _ride(wished.ride, look, quiet)
    if not quiet:
        yield ""
        for line in small_chart([_wanted(one, len(seen) > 1) for one in seen], look.unicode):
            yield Text(line, no_wrap=True)


def heading(seen: Seen) -> str:
    """One line of what this is: damper, direction, oil and its temperature."""
    setup = seen.setup
    return f"{setup.damper.name}, {setup.direction}: {setup.oil.name} oil at {setup.oil_temp_c:g} C"


def target_table(seen: Seen, look: Look) -> Table:
    """Wanted force over velocity and where it lies between softest and firmest."""
    target, limits = seen.target, seen.limits
    headings = ["velocity\nm/s", "wanted\nN", "weight\n"]
    headings += ["fitted\nN", "change\n%"] if seen.now else []
    headings += ["softest\nN", "firmest\nN", "lies at\n%"]
    table = new_table(look, *headings, left=[len(headings) - 1])
    places = _place_cells(seen)
    for row, velocity in enumerate(target.velocity_m_s):
        table.add_row(
            Text(f"{velocity:.4g}"),
            Text(force_text(target.force_n[row]), style="bold"),
            Text(f"{target.weight[row]:.3g}"),
            *_now_cells(target.force_n[row], seen.now, row),
            Text(_limit_text(limits.softest_n[row]), style="dim"),
            Text(_limit_text(limits.firmest_n[row]), style="dim"),
            places[row],
        )
    return table


def outside_lines(feasible: Feasibility) -> list[str]:
    """A sentence a reason, about the point furthest beyond its limit."""
    reasons: dict[Reason, list[Outside]] = {}
    for point in feasible.outside:
        reasons.setdefault(point.reason, []).append(point)
    lines = []
    for points in reasons.values():
        worst = max(points, key=lambda point: abs(log(point.wanted_n / point.limit_n)))
        many = f"outside at {len(points)} points, most " if len(points) > 1 else "outside "
        lines.append(many + worst.sentence)
    return lines


def panels_of(seen: Sequence[Seen]) -> list[Panel]:
    """One panel a direction: the target, the fitted stack if it plays a part, the limits."""
    return [Panel(heading(one), tuple(_lines(one))) for one in seen]


def target_document(seen: Sequence[Seen], wished: Wished) -> dict[str, Any]:
    """Every target under ``targets``, and the first one's keys at the top as well."""
    targets = [_one(one) for one in seen]
    document = {
        **targets[0],
        "way": wished.way,
        "targets": targets,
        "ride": ride_document(wished.ride) if wished.ride else None,
        "feel": feel_document(wished.ride) if wished.ride else None,
        "remarks": list(wished.notes),
    }
    converted: dict[str, Any] = as_json(document)
    return converted


def _single(seen: Seen, look: Look) -> Iterable[RenderableType]:
    yield Text(heading(seen), style="bold")
    yield from paragraph(f"wanted: {seen.target.origin}", look)
    yield ""
    yield target_table(seen, look)
    yield ""
    if seen.feasible.far_outside:
        yield from paragraph(f"warning: {seen.feasible.far_outside}", look, "yellow")
    for line in outside_lines(seen.feasible):
        yield from paragraph(line, look, "yellow")
    if seen.feasible.reachable:
        yield from paragraph(_WITHIN, look)
    for note in seen.target.notes:
        yield from paragraph(f"note: {note}", look, "yellow")


def _ride(ride: RideWish, look: Look, quiet: bool) -> Iterable[RenderableType]:
    yield ""
    yield Text(ride_heading(ride), style="bold")
    for table in (ride_table(ride, look), road_table(ride, look)):
        yield ""
        yield table
    if quiet:
        return
    yield ""
    for line in feel_lines(ride):
        yield from paragraph(line, look)


def _place_cells(seen: Seen) -> list[Text]:
    """The place between the limits, %, or what stops the damper."""
    outside = {point.velocity_m_s: _SHORT[point.reason] for point in seen.feasible.outside}
    cells = []
    for velocity, place in zip(seen.target.velocity_m_s, seen.place_percent, strict=True):
        if float(velocity) in outside:
            cells.append(Text(f"outside: {outside[float(velocity)]}", style="yellow"))
        else:
            cells.append(Text(f"{place:7.0f}" if np.isfinite(place) else f"{'-':>7}"))
    return cells


def _now_cells(wanted_n: float, now: Prediction | None, row: int) -> list[Text]:
    if now is None:
        return []
    force = float(now.force_n[row])
    return [Text(force_text(force)), Text(_change_text(wanted_n, force))]


def _change_text(wanted_n: float, force_n: float) -> str:
    """Change from the fitted stack's force, %, without a minus before a zero."""
    if not np.isfinite(force_n):
        return "-"
    percent = 100.0 * (wanted_n / force_n - 1.0)
    return f"{percent:+.0f}" if percent >= 999.5 else f"{round(percent, 1) + 0.0:+.1f}"


def _limit_text(force_n: float) -> str:
    """A limit, N; those far beyond any damper are not worth their digits."""
    if np.isfinite(force_n) and force_n > _MOST_PRINTED_N:
        return "> 99999"
    return force_text(force_n)


def _wanted(seen: Seen, named: bool) -> CurveLine:
    label = f"{seen.setup.direction}, wanted" if named else "wanted"
    return CurveLine(label, seen.target.velocity_m_s, seen.target.force_n, "target")


def _lines(seen: Seen) -> list[CurveLine]:
    velocity = seen.target.velocity_m_s
    lines = [_wanted(seen, named=False)]
    if seen.now is not None:
        lines.append(CurveLine("fitted stack", velocity, seen.now.force_n))
    top = _DRAWN_UP_TO * float(seen.target.force_n.max())
    lines.append(CurveLine("softest: no shims, needle open", velocity, seen.limits.softest_n))
    firmest = np.where(seen.limits.firmest_n <= top, seen.limits.firmest_n, np.nan)
    if np.count_nonzero(np.isfinite(firmest)) > 1:
        lines.append(CurveLine("firmest: shims shut, needle closed", velocity, firmest))
    return lines


def _one(seen: Seen) -> dict[str, Any]:
    setup, limits = seen.setup, seen.limits
    return {
        "damper": setup.damper.name,
        "circuit": setup.direction,
        "oil": setup.oil.name,
        "oil_temp_c": setup.oil_temp_c,
        "origin": seen.target.origin,
        "velocity_m_s": seen.target.velocity_m_s,
        "force_n": seen.target.force_n,
        "weight": seen.target.weight,
        "softest_n": limits.softest_n,
        "firmest_n": limits.firmest_n,
        "others_n": limits.others_n,
        "place_percent": seen.place_percent,
        "reachable": seen.feasible.reachable,
        "far_outside": seen.feasible.far_outside is not None,
        "outside": [_outside(point) for point in seen.feasible.outside],
        "fitted": _fitted(seen.now) if seen.now else None,
        "notes": list(seen.target.notes),
    }


def _outside(point: Outside) -> dict[str, Any]:
    return {
        "velocity_m_s": point.velocity_m_s,
        "wanted_n": point.wanted_n,
        "limit_n": point.limit_n,
        "beyond_percent": point.beyond_percent,
        "reason": point.reason,
        "sentence": point.sentence,
    }


def _fitted(now: Prediction) -> dict[str, Any]:
    return {
        "stack": now.stack.lines(),
        "clicks": now.clicks,
        "clicks_range": now.setup.clicks_range,
        "force_n": now.force_n,
    }
