"""``shimwright curve``: what a known stack does in a damper."""

from typing import TYPE_CHECKING, Annotated

import typer

from optimiser.cli.band_options import (
    BandsOption,
    check_seed,
    note_when_preparing_bands,
    record_for,
)
from optimiser.cli.notes import note, note_when_preparing, print_document
from optimiser.cli.options import (
    DEFAULT_DAMPER,
    ChartOption,
    CircuitChoice,
    ClicksOption,
    DamperOption,
    JsonOption,
    OilOption,
    OilTempOption,
    QuietOption,
    SeedOption,
    SteelOption,
    VelocitiesOption,
)
from optimiser.cli.sheet_options import SheetOption, check_page_path, command_of, write_page
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from pathlib import Path

    from optimiser.cli.inputs import Given
    from optimiser.damper import Direction
    from optimiser.prediction import Setup
    from optimiser.report.curve import Named
    from optimiser.stack import Stack

#: Labels of the stack fitted in the damper, and of the one given by ``--shim``.
FITTED = "fitted"
FROM_SHIMS = "--shim"


def curve(
    context: typer.Context,
    damper: DamperOption = DEFAULT_DAMPER,
    circuit: Annotated[
        CircuitChoice | None,
        typer.Option(
            "--circuit", help="Direction; both unless a stack is given, then compression."
        ),
    ] = None,
    stack: Annotated[
        list[str] | None,
        typer.Option(
            "--stack",
            metavar="NAME|FILE",
            help="Stack CSV, or the word fitted. Repeat it to compare stacks with the first.",
        ),
    ] = None,
    shim: Annotated[
        list[str] | None,
        typer.Option(
            "--shim",
            metavar="'N x D x T'",
            help="Shims of one stack, such as '3 x 24 x 0.15': quantity x outer mm x thickness mm. "
            "Repeat it, face first, clamp shim last.",
        ),
    ] = None,
    clicks: ClicksOption = None,
    oil_temp_c: OilTempOption = None,
    velocities: VelocitiesOption = None,
    bands: BandsOption = False,
    seed: SeedOption = 0,
    steel: SteelOption = None,
    oil: OilOption = None,
    chart: ChartOption = None,
    sheet: SheetOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """What a known stack does: force over velocity, lift, and the stress in every shim.

    Without --stack or --shim it is the stack fitted in the damper, both directions.
    """
    from optimiser.cli.inputs import check_clicks, parse_velocities, read_given
    from optimiser.report.chart import chart_format

    if chart is not None:
        chart_format(chart)
    if sheet is not None:
        check_page_path(sheet, "--sheet")
    check_seed(seed, bands)
    wanted = parse_velocities(velocities) if velocities is not None else None
    given = read_given(damper, steel, oil, oil_temp_c)
    jobs = curve_jobs(given, circuit, stack or [], shim or [])
    check_clicks([setup for _label, setup, _stack in jobs], clicks)
    note_when_preparing(quiet)
    results = predict_all(jobs, wanted, clicks)
    if bands:
        note_when_preparing_bands(quiet)
        results = with_bands(results, record_for(given, damper), seed)
    if chart is not None:
        _write_chart(chart, results)
        note(f"chart written to {chart}", quiet)
    if sheet is not None:
        from optimiser.cli.sheet import sheets_of_curves

        write_page(sheet, sheets_of_curves(results, given.files, command_of(context)))
        note(f"bench sheets written to {sheet}", quiet)
    if json:
        _print_json(given, results, quiet)
    else:
        from optimiser.report.curve import show_curves
        from optimiser.report.look import look_of

        show_curves(results, look_of(), quiet)


def curve_jobs(
    given: "Given", circuit: CircuitChoice | None, stacks: list[str], shims: list[str]
) -> "list[tuple[str, Setup, Stack]]":
    """Label, setup and stack of every curve to compute. Raises BadInput with all faults."""
    directions = _directions(given, circuit, bool(stacks or shims))
    setups = [given.setup(direction) for direction in directions]
    if not (stacks or shims):
        return [(FITTED, setup, _fitted(setup)) for setup in setups]
    faults: list[str] = []
    jobs: list[tuple[str, Setup, Stack]] = []
    for name in [*stacks, *([FROM_SHIMS] if shims else [])]:
        try:
            jobs.append(_job(given, setups[0], name, shims))
        except BadInput as error:
            faults += error.faults
    if faults:
        raise BadInput(faults)
    return jobs


def _job(given: "Given", setup: "Setup", name: str, shims: list[str]) -> "tuple[str, Setup, Stack]":
    from optimiser.cli.inputs import check_reaches, parse_shims, read_stack, short_name

    if name == FITTED:
        return name, setup, _fitted(setup)
    if name == FROM_SHIMS:
        stack = parse_shims(shims)
    else:
        stack = read_stack(name)
        given.add_file("stack", name)
    check_reaches(setup, stack, name)
    return short_name(name), setup, stack


def _directions(
    given: "Given", circuit: CircuitChoice | None, has_stack: bool
) -> "list[Direction]":
    if circuit is CircuitChoice.both and has_stack:
        raise BadInput(
            "--circuit is both, but a stack belongs to one direction; allowed: compression, rebound"
        )
    if circuit is None:
        return given.directions()[:1] if has_stack else given.directions()
    if circuit is CircuitChoice.both:
        return ["compression", "rebound"]
    return ["compression" if circuit is CircuitChoice.compression else "rebound"]


def _fitted(setup: "Setup") -> "Stack":
    fitted = setup.valve.fitted
    if fitted is None:
        raise TypeError(f"valve '{setup.valve.name}' is searched but has no shims")
    return fitted


def predict_all(
    jobs: "list[tuple[str, Setup, Stack]]", wanted: list[float] | None, clicks: int | None
) -> "list[Named]":
    """Every curve at the wanted velocities, m/s, or at the usual ones of its direction."""
    from optimiser.cli.inputs import USUAL_VELOCITIES
    from optimiser.prediction import predict
    from optimiser.report.curve import Named

    return [
        Named(label, predict(setup, stack, wanted or USUAL_VELOCITIES[setup.direction], clicks))
        for label, setup, stack in jobs
    ]


def with_bands(results: "list[Named]", record: "Path | None", seed: int) -> "list[Named]":
    """The same with their likely spread, drawn from the record of a fit or from usual errors."""
    from dataclasses import replace

    from optimiser.fit_records import spread_of

    shown = []
    for result in results:
        spread = spread_of(result.prediction.setup, record, seed=seed)
        bands = spread.bands(result.prediction)
        shown.append(replace(result, spread=spread, bands=bands))
    return shown


def _write_chart(path: "ChartOption", results: "list[Named]") -> None:
    import numpy as np

    from optimiser.files import atomic_write_bytes
    from optimiser.prediction import predict
    from optimiser.report.chart import chart_bytes, chart_format, panels_of
    from optimiser.report.curve import Named

    if path is None:
        return
    smooth = []
    for result in results:
        seen = result.prediction
        fastest = seen.velocity_m_s.max()
        between = fastest * np.linspace(0.0, 1.0, 61)[1:] ** 1.5
        velocity = np.unique(np.concatenate([between, seen.velocity_m_s]))
        fine = predict(seen.setup, seen.stack, velocity, seen.clicks)
        bands = result.spread.bands(fine) if result.spread else None
        smooth.append(Named(result.label, fine, result.spread, bands))
    atomic_write_bytes(path, chart_bytes(panels_of(smooth), chart_format(path)))


def _print_json(given: "Given", results: "list[Named]", quiet: bool) -> None:
    from optimiser.report.document import curve_document

    document = curve_document(results)
    document["inputs"] = [vars(file) for file in given.files]
    print_document(document)
    for result in results:
        for warning in result.prediction.warnings:
            note(f"warning: {result.prediction.setup.direction}, {result.label}: {warning}", quiet)
