"""The report of ``find`` on a terminal: what limits the answer, the list, the best in full."""

from collections.abc import Iterable, Sequence

import numpy as np
from rich.console import RenderableType
from rich.text import Text

from optimiser.fitting.bands import Bands
from optimiser.fitting.spread import Likely
from optimiser.mechanics.deflect import RISE_LIMIT
from optimiser.prediction import Prediction
from optimiser.report.cautions import CAUTION
from optimiser.report.curve_line import CurveLine, Panel
from optimiser.report.find_tables import envelope_table, ranked_table, stacks_side_by_side
from optimiser.report.look import Look
from optimiser.report.paragraph import kept, paragraph
from optimiser.report.small_chart import small_chart
from optimiser.report.tables import stack_table
from optimiser.report.target import outside_lines
from optimiser.results import Answer
from optimiser.search.evaluate import middle_clicks
from optimiser.search.find import Found, Proposal
from optimiser.stack import Group, Shim, Stack
from optimiser.wanted.bands import band_edges_m_s

#: Up to so many points beyond a limit are named one by one, more are gathered by reason.
NAMED_ONE_BY_ONE = 10
#: An error above this, %, is worth a word on its reason; a rise above this share of the limit too.
FAR_OFF_PERCENT, NEAR_LIMIT = 5.0, 0.9
#: Best stacks in a chart.
CHARTED = 3

_CUT_SHORT = "cut short by Ctrl-C: these are the best stacks so far"
_WITHIN = "The target lies within what this damper can do with this stock."
_BOUNDS = (
    "possible: no shim at all and the needle open, or shims that never lift and the needle "
    "closed; in stock: the softest stack from this stock, needle open, and the firmest, needle "
    "closed (without --click-range)."
)
_TOGETHER = (
    "Stack 1 of compression and stack 1 of rebound can be built together from {stock}; every "
    "other stack can be built beside stack 1 of the other direction."
)
_ONE_NEEDLE = (
    "note: each direction is at its own best click; where one needle serves both, fix it by "
    "--clicks N"
)


def show_answer(answer: Answer, look: Look, quiet: bool = False) -> None:
    """Print the report."""
    for item in find_report(answer, look, quiet):
        look.console.print(item)


def find_report(answer: Answer, look: Look, quiet: bool) -> Iterable[RenderableType]:
    """The parts of the report in order, ready to print."""
    if answer.cut_short:
        yield from paragraph(_CUT_SHORT, look, "bold yellow")
        yield ""
    for place in range(len(answer.found)):
        yield from _circuit(answer, place, look, quiet)
        yield ""
    for line in _about_both(answer, quiet):
        yield from paragraph(line, look, "yellow" if line.startswith("note:") else "")
    if not quiet:
        yield from paragraph(statistics(answer), look)
        yield ""
        yield from paragraph(CAUTION, look, "italic")


def heading(answer: Answer, place: int) -> str:
    """One line of what this is: damper, direction, oil and its temperature, stock."""
    setup = answer.found[place].order.setup
    return (
        f"{setup.damper.name}, {setup.direction}: {setup.oil.name} oil at {setup.oil_temp_c:g} C, "
        f"shims of {answer.order.stock_name}"
    )


def statistics(answer: Answer) -> str:
    """What the search cost, and how to repeat it."""
    found = answer.found
    own = sum(one.seconds for one in found)
    model = sum(one.seconds_model for one in found)
    library = sum(one.seconds_library for one in found)
    shares = [100.0 * part / own for part in (model, library, own - model - library)]
    whole = "every buildable stack, " if all(one.complete for one in found) else ""
    workers = f"{answer.workers} worker{'s' * (answer.workers > 1)}"
    return (
        f"{answer.evaluations} stacks tried, {whole}in {answer.seconds:.1f} s on {workers}: "
        f"{shares[0]:.0f} % model, {shares[1]:.0f} % library, {shares[2]:.0f} % rest. "
        f"Seed {answer.order.seed}."
    )


def panels_of(
    answer: Answer,
    curves: Sequence[Sequence[Prediction]],
    bands: Sequence[Bands | None] | None = None,
) -> list[Panel]:
    """One panel a direction: the target and smooth curves of its best stacks, with the likely
    spread of the first (``bands``, one a direction, at the velocities of its curve)."""
    panels = []
    for place, (found, seen) in enumerate(zip(answer.found, curves, strict=True)):
        lines = [_wanted(found)]
        alone = len(seen) == 1 and seen[0].setup.clicks_range > 0
        for number, one in enumerate(seen, start=1):
            band = bands[place] if bands and number == 1 else None
            lines.append(
                CurveLine(
                    _label(number, one),
                    one.velocity_m_s,
                    one.force_n,
                    "predicted",
                    one.force_open_n if alone else None,
                    one.force_closed_n if alone else None,
                    band.p05_n if band else None,
                    band.p95_n if band else None,
                )
            )
        panels.append(Panel(heading(answer, place), tuple(lines)))
    return panels


def _label(number: int, seen: Prediction) -> str:
    if not seen.setup.clicks_range:
        return f"stack {number}"
    return f"stack {number}, {seen.clicks} of {seen.setup.clicks_range} clicks"


def _circuit(answer: Answer, place: int, look: Look, quiet: bool) -> Iterable[RenderableType]:
    found, best = answer.found[place], answer.best[place]
    likely = answer.likely[place] if answer.likely else None
    yield Text(heading(answer, place), style="bold")
    yield from paragraph(f"wanted: {found.order.target.origin}", look)
    yield from _what_limits(found, look)
    yield ""
    yield ranked_table(found, look, likely)
    if not quiet:
        yield ""
        for line in (answer.order.rank_rule, *_legend(found, likely)):
            yield from paragraph(line, look, "dim")
    yield ""
    yield Text("stacks, face first: number x diameter x thickness, mm", style="bold")
    for table in stacks_side_by_side(found, look):
        yield table
        yield ""
    yield from _best(found, best, look)
    yield ""
    yield envelope_table(found, look, likely)
    if likely:
        yield from paragraph(likely.spread.sentence, look, "dim")
    if not quiet:
        yield from paragraph(_BOUNDS, look, "dim")
        yield ""
        for line in small_chart([_wanted(found), _reached(found)], look.unicode):
            yield Text(line, no_wrap=True)


def _what_limits(found: Found, look: Look) -> Iterable[Text]:
    feasible = found.feasibility
    if feasible.reachable:
        yield from paragraph(_WITHIN, look)
    elif len(feasible.outside) <= NAMED_ONE_BY_ONE:
        for point in feasible.outside:
            yield from paragraph(f"outside {point.sentence}", look, "yellow")
    else:
        for line in outside_lines(feasible):
            yield from paragraph(line, look, "yellow")
    for note in found.order.target.notes:
        yield from paragraph(f"note: {note}", look, "yellow")


def _legend(found: Found, likely: Likely | None) -> Iterable[str]:
    setup, clicks = found.order.setup, found.order.click_range
    if setup.clicks_range and clicks is not None:
        span = f"{clicks[0]}" if clicks[0] == clicks[1] else f"{clicks[0]} to {clicks[1]}"
        middle = clicks == middle_clicks(setup)
        yield f"Clicks: {span} of {setup.clicks_range}, out from closed" + (
            ": the middle half, so that the rider keeps room both ways (--click-range)."
            if middle
            else "."
        )
    low, mid = band_edges_m_s(found.order.target.velocity_m_s)
    yield (
        f"error: r.m.s. over the points; low up to {low:.2g} m/s, high from {mid:.2g} m/s. util.: "
        "stress over what the steel endures, ! from 1 on. variants: near-twins not listed."
        + (" changed: shims taken out plus shims put in." if found.order.fitted else "")
    )
    if likely:
        yield (
            f"within {likely.within_percent:g} %: the chance that the real damper's error is "
            "that or less."
        )


def _best(found: Found, best: Prediction, look: Look) -> Iterable[RenderableType]:
    proposal = found.proposals[0]
    clicks = f", {proposal.clicks} clicks out" if best.setup.clicks_range else ""
    yield Text(
        f"stack 1: {proposal.parts} shims, {proposal.stack.height_mm:.2f} mm high{clicks}",
        style="bold",
    )
    yield stack_table(best, look)
    yield ""
    if found.order.fitted is not None:
        yield from paragraph(_exchange(found.order.fitted, proposal), look)
    highest = int(np.argmax(best.rise_thicknesses))
    yield from paragraph(
        f"The face shim's edge rises {best.edge_rise_mm[highest]:.2f} mm, "
        f"{best.rise_thicknesses[highest]:.1f} of its thicknesses (model checked up to "
        f"{RISE_LIMIT:g}).",
        look,
    )
    for line in _advice(found, best):
        yield from paragraph(line, look, "yellow")


def _advice(found: Found, best: Prediction) -> Iterable[str]:
    yield from (f"warning: {warning}" for warning in best.warnings)
    proposal = found.proposals[0]
    wide = proposal.error_percent > FAR_OFF_PERCENT
    firm = float(np.mean(found.order.target.relative(proposal.force_n))) > 0.0
    if wide and firm and NEAR_LIMIT * RISE_LIMIT < proposal.rise <= RISE_LIMIT:
        yield (
            "note: stack 1 is firmer than wanted and bends as far as the model is checked; softer "
            "stacks lie outside the model and come last"
        )
    first, last = found.order.click_range or (0, 0)
    full = best.setup.clicks_range
    bound = (best.clicks == last < full) or (best.clicks == first > 0)
    if first < last and bound:
        yield (
            f"note: stack 1 has its best click at the end of those allowed; --click-range 0-{full} "
            "may come nearer"
        )


def _exchange(fitted: Stack, proposal: Proposal) -> str:
    """What to do to the fitted stack to get stack 1."""
    out, into = exchanged_shims(fitted, proposal.stack)
    if not out and not into:
        return "Revalve: the shims stay as they are; set their order and the clicks."
    parts = [
        f"{what} {', '.join(kept(str(group)) for group in groups)}"
        for what, groups in (("take out", out), ("put in", into))
        if groups
    ]
    return f"Revalve: {'; '.join(parts)}."


def exchanged_shims(one: Stack, other: Stack) -> tuple[list[Group], list[Group]]:
    """Shims to take out and to put in, to make one stack the other; widest first."""
    counts: dict[Shim, int] = {}
    for stack, sign in ((one, -1), (other, 1)):
        for group in stack.groups:
            counts[group.shim] = counts.get(group.shim, 0) + sign * group.quantity
    ordered = sorted(counts, key=lambda shim: (-shim.outer_mm, -shim.thickness_mm))
    out = [Group(-counts[shim], shim) for shim in ordered if counts[shim] < 0]
    into = [Group(counts[shim], shim) for shim in ordered if counts[shim] > 0]
    return out, into


def _about_both(answer: Answer, quiet: bool) -> Iterable[str]:
    if len(answer.found) > 1:
        yield _TOGETHER.format(stock=answer.order.stock_name)
        clicks = {
            found.proposals[0].clicks
            for found in answer.found
            if found.order.setup.clicks_range > 0
        }
        if len(clicks) > 1 and not quiet:
            yield _ONE_NEEDLE
    for note in answer.order.notes:
        yield f"note: {note}"


def _wanted(found: Found) -> CurveLine:
    target = found.order.target
    return CurveLine("wanted", target.velocity_m_s, target.force_n, "target")


def _reached(found: Found) -> CurveLine:
    return CurveLine("stack 1", found.order.target.velocity_m_s, found.proposals[0].force_n)
