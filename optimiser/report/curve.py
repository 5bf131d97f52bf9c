"""The report of ``curve`` on a terminal: what a tuner needs first comes first."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from rich.console import RenderableType
from rich.text import Text

from optimiser.mechanics.deflect import RISE_LIMIT
from optimiser.prediction import Prediction
from optimiser.report.cautions import CAUTION
from optimiser.report.curve_line import CurveLine
from optimiser.report.look import Look
from optimiser.report.paragraph import paragraph
from optimiser.report.small_chart import small_chart
from optimiser.report.tables import compare_tables, force_table, stack_table

if TYPE_CHECKING:
    from optimiser.fitting.bands import Bands
    from optimiser.fitting.spread import Spread

#: What stands in place of a band.
NO_BAND = "no band: too many of the samples lie outside the model"


@dataclass(frozen=True)
class Named:
    """A prediction with the name its stack goes by.

    ``spread`` what its band is drawn from, None where none is wanted; ``bands`` at the prediction's
    velocities, None as well where it cannot be computed.
    """

    label: str
    prediction: Prediction
    spread: "Spread | None" = None
    bands: "Bands | None" = None


def show_curves(results: Sequence[Named], look: Look, quiet: bool = False) -> None:
    """Print the report: one stack in one or both directions, or several stacks compared."""
    for item in curve_report(results, look, quiet):
        look.console.print(item)


def curve_report(results: Sequence[Named], look: Look, quiet: bool) -> Iterable[RenderableType]:
    """The parts of the report in order, ready to print."""
    directions = {result.prediction.setup.direction for result in results}
    if len(results) > len(directions):
        yield from _comparison(results, look)
    else:
        for result in results:
            yield from _single(result, look)
    if quiet:
        return
    for line in small_chart(lines_of(results), look.unicode):
        yield Text(line, no_wrap=True)
    yield ""
    yield from paragraph(CAUTION, look, "italic")


def lines_of(results: Sequence[Named]) -> list[CurveLine]:
    """Curves to draw, with the click range as band."""
    directions = {result.prediction.setup.direction for result in results}
    lines = []
    for place, result in enumerate(results):
        seen = result.prediction
        label = result.label
        if len(directions) > 1:
            label = f"{seen.setup.direction}, {label}"
        elif len(results) > 1:
            label = f"{_letter(place)}  {label}"
        adjuster = seen.setup.clicks_range > 0
        lines.append(
            CurveLine(
                label,
                seen.velocity_m_s,
                seen.force_n,
                "predicted",
                seen.force_open_n if adjuster else None,
                seen.force_closed_n if adjuster else None,
                result.bands.p05_n if result.bands else None,
                result.bands.p95_n if result.bands else None,
            )
        )
    return lines


def _single(result: Named, look: Look) -> Iterable[RenderableType]:
    seen = result.prediction
    yield Text(heading(seen), style="bold")
    yield ""
    yield force_table(seen, look, result.bands)
    yield from _about_band(result, look)
    yield ""
    yield Text(f"{result.label} stack: {_size(seen)}", style="bold")
    yield stack_table(seen, look)
    yield ""
    yield from _remarks(seen, look)
    yield ""


def _comparison(results: Sequence[Named], look: Look) -> Iterable[RenderableType]:
    predictions = [result.prediction for result in results]
    names = [_letter(place) for place in range(len(results))]
    yield Text(heading(predictions[0]), style="bold")
    for name, result in zip(names, results, strict=True):
        yield Text(f"  {name}  {result.label}: {_size(result.prediction)}")
    yield ""
    for table in compare_tables(predictions, names, look):
        yield table
        yield ""
    yield from _bands_compared(results, names, look)
    widest = max(group.shim.outer_mm for seen in predictions for group in seen.stack.groups)
    for name, result in zip(names, results, strict=True):
        yield Text(f"{name}  {result.label}", style="bold")
        yield stack_table(result.prediction, look, widest)
        yield ""
        yield from _remarks(result.prediction, look)
        yield ""


def _about_band(result: Named, look: Look) -> Iterable[RenderableType]:
    if result.spread is not None:
        text = result.spread.sentence if result.bands is not None else NO_BAND
        yield from paragraph(text, look, "dim")


def _bands_compared(
    results: Sequence[Named], names: Sequence[str], look: Look
) -> Iterable[RenderableType]:
    spread = results[0].spread
    if spread is None:
        return
    from optimiser.report.band import bands_tables

    seen, bands = [one.prediction for one in results], [one.bands for one in results]
    yield from bands_tables(seen, bands, names, look)
    yield from paragraph(f"likely: {spread.sentence}", look, "dim")
    yield ""


def heading(seen: Prediction) -> str:
    """One line of what this is: damper, direction, oil, temperature, clicks."""
    setup = seen.setup
    if setup.clicks_range:
        clicks = f"{seen.clicks} of {setup.clicks_range} clicks out from closed"
    else:
        clicks = "no adjuster"
    return (
        f"{setup.damper.name}, {setup.direction}: {setup.oil.name} oil at {setup.oil_temp_c:g} C, "
        f"{clicks}"
    )


def _size(seen: Prediction) -> str:
    return f"{seen.stack.parts} shims, {seen.stack.height_mm:.2f} mm high"


def _remarks(seen: Prediction, look: Look) -> Iterable[RenderableType]:
    highest = seen.rise_thicknesses.argmax()
    yield from paragraph(
        f"The face shim's edge rises {seen.edge_rise_mm[highest]:.2f} mm, "
        f"{seen.rise_thicknesses[highest]:.1f} of its thicknesses (model checked up to "
        f"{RISE_LIMIT:g}).",
        look,
    )
    for warning in seen.warnings:
        yield from paragraph(f"warning: {warning}", look, "yellow")


def _letter(place: int) -> str:
    letters = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"
    return letters[place] if place < len(letters) else f"S{place + 1}"
