"""The report of ``fit`` on a terminal, and as a document: numbers, errors, doubts."""

from collections.abc import Iterable, Sequence
from textwrap import wrap
from typing import Any

from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from optimiser.fitting.calibrate import Calibration, RunError
from optimiser.fitting.estimate import Estimate
from optimiser.fitting.identify import Confusion
from optimiser.fitting.parameters import value_of
from optimiser.fitting.uncertainty import fitted_uncertainty, uncertainty_record
from optimiser.report.cautions import CAUTION
from optimiser.report.document import as_json
from optimiser.report.look import Look
from optimiser.report.tables import new_table

#: Pairs of estimates more correlated than this are worth a line.
SHOWN_CORRELATION = 0.8
_RUN_WIDTH = 22


def show_fit(result: Calibration, notes: Sequence[str], look: Look, quiet: bool = False) -> None:
    """Print the report; ``notes``: how the files were read."""
    for item in fit_report(result, notes, look, quiet):
        look.console.print(item)


def fit_report(
    result: Calibration, notes: Sequence[str], look: Look, quiet: bool
) -> Iterable[RenderableType]:
    """The parts of the report in order, ready to print."""
    points = sum(run.points for run in result.runs)
    title = f"{result.original.name}: {_many(len(result.runs), 'run')}, {points} points"
    yield Text(title, style="bold")
    if not quiet:
        for note in notes:
            yield from _sentence(f"- {note}", look)
    yield ""
    yield parameter_table(result, look)
    yield ""
    yield run_table(result.runs, look)
    yield ""
    yield from _accuracy(result, look)
    for doubt in (*result.held, *result.doubts):
        yield from _sentence(f"note: {_doubt_text(doubt)}", look, "yellow")
    for pair in correlated_pairs(result.found):
        yield from _sentence(f"note: {pair}", look)
    for note in result.notes:
        yield from _sentence(f"warning: {note}", look, "yellow")
    if not quiet:
        yield ""
        yield from _sentence(CAUTION, look, "italic")


def parameter_table(result: Calibration, look: Look) -> Table:
    """Fitted numbers with the damper file's own, standard error and 95 % interval."""
    found = result.found
    table = new_table(look, "fitted number", "unit", "was", "now", "error", "95 %", left=[0, 1])
    rows = zip(
        found.parameters, found.values, found.errors, found.half_width, found.at_limit, strict=True
    )
    for item, value, error, half, limit in rows:
        spread = "at its limit" if limit else f"{value - half:.4g} to {value + half:.4g}"
        table.add_row(
            item.name,
            item.unit,
            f"{value_of(result.original, item.key, item.direction):.4g}",
            Text(f"{value:.4g}", style="bold"),
            f"{error:.2g}",
            spread,
        )
    return table


def run_table(runs: Sequence[RunError], look: Look) -> Table:
    """Error of every run before, in and left out of the fit."""
    table = new_table(
        look,
        "run",
        "stroke",
        "clicks",
        "oil\nC",
        "points\n/bad",
        "before\n%",
        "fitted\n%",
        "left\nout %",
        left=[0, 1],
    )
    for run in runs:
        left = "-" if run.left_out_percent is None else f"{run.left_out_percent:.1f}"
        name = run.label.removesuffix(".csv")
        table.add_row(
            name if len(name) <= _RUN_WIDTH else f"..{name[2 - _RUN_WIDTH :]}",
            "compr." if run.direction == "compression" else run.direction,
            f"{run.clicks}",
            f"{run.oil_temp_c:g}",
            f"{run.points}/{run.outliers}",
            f"{run.before_percent:.1f}",
            f"{run.fitted_percent:.1f}",
            left,
        )
    return table


def _accuracy(result: Calibration, look: Look) -> Iterable[Text]:
    yield from _sentence(
        f"Scatter of the points {result.scatter_percent:.1f} %; gas force in the runs "
        f"{result.steady_n:.0f} N, friction {result.damper.friction_n:.0f} N.",
        look,
    )
    yield from _sentence(_expected(result), look, "bold")


def _expected(result: Calibration) -> str:
    """What to expect of a stack never measured, from the runs left out of the fit."""
    left, new = result.left_out_percent, result.new_stack_percent
    if left is None:
        return (
            "No run could be left out, so nothing is known of how well a stack never measured is "
            "predicted: add runs of other stacks."
        )
    text = f"A run left out of the fit is predicted within {left:.1f} % (r.m.s.)"
    if new is None:
        return f"{text}, but every stack was in another run too: add a run of another stack."
    return f"{text}; a stack no other run has, within {new:.1f} %: expect that of a new stack."


def _doubt_text(doubt: Confusion) -> str:
    if not doubt.extra_run:
        return doubt.sentence
    return (
        f"{doubt.sentence}; {doubt.extra_run} would tell (error {doubt.before:.2g} to "
        f"{doubt.after:.2g})"
    )


def correlated_pairs(found: Estimate) -> list[str]:
    """Sentences on estimates that depend on each other."""
    correlation, names = found.correlation, [item.name for item in found.parameters]
    return [
        f"{names[i]} and {names[j]} are correlated by {correlation[i, j]:+.2f}"
        for i in range(len(names))
        for j in range(i + 1, len(names))
        if abs(correlation[i, j]) > SHOWN_CORRELATION
    ]


def _many(count: int, word: str) -> str:
    return f"{count} {word}" if count == 1 else f"{count} {word}s"


def _sentence(text: str, look: Look, style: str = "") -> Iterable[Text]:
    for line in wrap(text, look.console.width - 1, subsequent_indent="  "):
        yield Text(line, style=style)


def fit_document(result: Calibration, notes: Sequence[str]) -> dict[str, Any]:
    """The result as one JSON document; ``uncertainty`` is what prediction bands are drawn from."""
    found = result.found
    document = {
        "damper": result.original.name,
        "parameters": [
            {
                "name": item.name,
                "unit": item.unit,
                "was": value_of(result.original, item.key, item.direction),
                "start": item.start,
                "value": value,
                "standard_error": error,
                "low_95": value - half,
                "high_95": value + half,
                "at_limit": limit,
            }
            for item, value, error, half, limit in zip(
                found.parameters,
                found.values,
                found.errors,
                found.half_width,
                found.at_limit,
                strict=True,
            )
        ],
        "correlation": found.correlation,
        "runs": [_run_record(result, place) for place in range(len(result.runs))],
        "friction_n": result.damper.friction_n,
        "gas_offset_n": result.steady_n,
        "scatter_percent": result.scatter_percent,
        "left_out_percent": result.left_out_percent,
        "new_stack_percent": result.new_stack_percent,
        "cannot_be_told": [
            {
                "numbers": list(doubt.names),
                "kept": doubt in result.held,
                "sentence": doubt.sentence,
                "extra_run": doubt.extra_run or None,
            }
            for doubt in (*result.held, *result.doubts)
        ],
        "notes": [*notes, *result.notes],
        "uncertainty": uncertainty_record(fitted_uncertainty(result)),
    }
    converted: dict[str, Any] = as_json(document)
    return converted


def _run_record(result: Calibration, place: int) -> dict[str, Any]:
    run, error = result.measured[place], result.runs[place]
    return {
        "label": run.label,
        "circuit": run.direction,
        "stack": run.stack.lines(),
        "clicks": run.clicks,
        "oil_temp_c": run.oil_temp_c,
        "velocity_m_s": run.velocity_m_s,
        "force_n": run.force_n,
        "hysteresis_n": run.hysteresis_n,
        "predicted_n": result.predicted_n[place],
        "outliers": error.outliers,
        "before_percent": error.before_percent,
        "fitted_percent": error.fitted_percent,
        "middle_percent": error.middle_percent,
        "left_out_percent": error.left_out_percent,
    }
