"""``shimwright sheet``: a page to print and pin up above the vice."""

from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from optimiser.cli.notes import note, note_when_preparing, print_document
from optimiser.cli.options import (
    DEFAULT_DAMPER,
    CircuitChoice,
    ClicksOption,
    DamperOption,
    JsonOption,
    OilOption,
    OilTempOption,
    QuietOption,
    SteelOption,
    VelocitiesOption,
)
from optimiser.cli.sheet_options import check_page_path, command_of, write_page
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from collections.abc import Sequence

    from optimiser.cli.inputs import Given, InputFile
    from optimiser.prediction import Setup
    from optimiser.report.curve import Named
    from optimiser.report.curve_line import CurveLine
    from optimiser.report.sheet import Sheet
    from optimiser.stock import Stock
    from optimiser.wanted.target import Target


@dataclass
class Beside:
    """What a curve is shown with: stock list with its name, target, measured runs."""

    stock: "tuple[str, Stock] | None" = None
    target: "Target | None" = None
    measured: "list[CurveLine]" = field(default_factory=list)

    @property
    def velocity_m_s(self) -> list[float] | None:
        """The target's velocities, m/s; None without a target."""
        return None if self.target is None else self.target.velocity_m_s.tolist()


#: Options that may stand beside a result: everything else is in it.
_BESIDE_RESULT = {"result", "out", "rank", "json", "quiet"}


def sheet(
    context: typer.Context,
    result: Annotated[
        Path | None, typer.Argument(metavar="RESULT", help="A result.json that find --out wrote.")
    ] = None,
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE.html", help="Page to write; needed.")
    ] = None,
    rank: Annotated[
        list[int] | None,
        typer.Option("--rank", metavar="N", help="Which stack of the result; 1 is the best."),
    ] = None,
    damper: DamperOption = DEFAULT_DAMPER,
    circuit: Annotated[
        CircuitChoice | None,
        typer.Option("--circuit", help="Direction; both unless a stack or target is given."),
    ] = None,
    stack: Annotated[
        list[str] | None,
        typer.Option(
            "--stack",
            metavar="NAME|FILE",
            help="Stack CSV, or the word fitted, which is what is drawn without a result.",
        ),
    ] = None,
    shim: Annotated[
        list[str] | None,
        typer.Option(
            "--shim", metavar="'N x D x T'", help="Shims of one stack, as in curve; repeat it."
        ),
    ] = None,
    clicks: ClicksOption = None,
    stock: Annotated[
        str | None,
        typer.Option("--stock", metavar="NAME|FILE", help="Stock list: bins, and what is left."),
    ] = None,
    target: Annotated[
        str | None,
        typer.Option("--target", metavar="NAME|FILE", help="Wanted curve to compare with."),
    ] = None,
    measured: Annotated[
        list[str] | None,
        typer.Option(
            "--measured",
            metavar="FILE",
            help="Measured run to draw: a CSV of velocity_m_s and force_n, slowest first.",
        ),
    ] = None,
    oil_temp_c: OilTempOption = None,
    velocities: VelocitiesOption = None,
    steel: SteelOption = None,
    oil: OilOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """A page to print and pin up: the stack in section, build order, forces, cautions.

    RESULT is what find --out wrote; without it, name damper and stack as in curve.
    """
    from optimiser.cli.curve import curve_jobs, predict_all
    from optimiser.cli.inputs import check_clicks, parse_velocities, read_given

    if out is None:
        raise BadInput("--out is missing; allowed: the page to write, such as --out sheet.html")
    check_page_path(out, "--out")
    if result is not None:
        _check_beside_result(context)
        note_when_preparing(quiet)
        sheets = _of_result(result, tuple(rank or (1,)), quiet)
    else:
        if rank:
            raise BadInput("--rank belongs to a RESULT; name one, or leave it out")
        given = read_given(damper, steel, oil, oil_temp_c)
        wanted = parse_velocities(velocities) if velocities is not None else None
        jobs = curve_jobs(given, _one_direction(given, circuit, target), stack or [], shim or [])
        check_clicks([setup for _label, setup, _stack in jobs], clicks)
        beside = _read_beside(given, jobs[0][1], stock, target, measured or [], wanted)
        note_when_preparing(quiet)
        results = predict_all(jobs, beside.velocity_m_s or wanted, clicks)
        sheets = sheets_of_curves(results, given.files, command_of(context), beside)
    write_page(out, sheets)
    if json:
        print_document(_document(out, sheets))
    else:
        typer.echo(f"{out}: {len(sheets)} {'sheet' if len(sheets) == 1 else 'sheets'}")
        note("print it at 100 % on A4 or Letter: one page a sheet", quiet)


def _check_beside_result(context: typer.Context) -> None:
    given = [
        parameter.opts[0]
        for parameter in context.command.params
        if parameter.name is not None
        and parameter.name not in _BESIDE_RESULT
        and (source := context.get_parameter_source(parameter.name)) is not None
        and source.name == "COMMANDLINE"
    ]
    if given:
        raise BadInput(
            f"a RESULT says everything that {', '.join(given)} would; allowed beside it: --out, "
            "--rank, --json, --quiet"
        )


def _of_result(path: Path, ranks: tuple[int, ...], quiet: bool) -> "list[Sheet]":
    from json import loads

    from optimiser.files import read_text
    from optimiser.report.sheet_result import sheets_of, tuned_from
    from optimiser.results import read_result

    order = read_result(path)
    tuned = tuned_from(order, loads(read_text(path)), str(path))
    return sheets_of(tuned, f"shimwright find --again {path.name}", ranks)


def sheets_of_curves(
    results: "Sequence[Named]",
    files: "Sequence[InputFile]",
    command: str,
    beside: Beside | None = None,
) -> "list[Sheet]":
    """One sheet a predicted stack."""
    from optimiser.report.band import smooth_band
    from optimiser.report.sheet import Fact, Source
    from optimiser.report.sheet_from import About, program_name, sheet_of
    from optimiser.report.sheet_steps import Drawer

    shown = beside or Beside()
    inputs = tuple(Fact(f"{file.kind} {file.name}", file.fingerprint) for file in files)
    source = Source(program_name(), command, None, inputs)
    sheets = []
    for result in results:
        seen = result.prediction
        post = seen.setup.valve.post
        drawer = Drawer(*shown.stock, post.post_mm) if shown.stock and post else None
        wanted = "" if shown.target is None else f" \u00b7 wanted: {shown.target.origin}"
        about = About(
            f"stack: {result.label}{wanted}",
            source,
            shown.target,
            drawer=drawer,
            measured=tuple(shown.measured),
            spread_n=smooth_band(seen, result.spread),
        )
        sheets.append(sheet_of(seen, about))
    return sheets


def _one_direction(
    given: "Given", circuit: CircuitChoice | None, target: str | None
) -> CircuitChoice | None:
    """The direction a target is for; without a target, what was asked. Raises BadInput."""
    if target is None:
        return circuit
    if circuit is CircuitChoice.both:
        raise BadInput(
            "--circuit is both, but a target belongs to one direction; allowed: compression, "
            "rebound"
        )
    return circuit or CircuitChoice(given.directions()[0])


def _read_beside(
    given: "Given",
    setup: "Setup",
    stock: str | None,
    target: str | None,
    measured: list[str],
    wanted: list[float] | None,
) -> "Beside":
    """Stock list, target and measured runs. Raises BadInput with the faults of all files."""
    from optimiser.cli.inputs import short_name
    from optimiser.files import read_points, read_stock
    from optimiser.report.curve_line import CurveLine
    from optimiser.wanted_files import read_target

    faults: list[str] = []
    if target is not None and wanted is not None:
        faults.append("--velocities and --target both say at which velocities; allowed: one")
    beside = Beside()
    try:
        if stock is not None:
            beside.stock = (short_name(stock), read_stock(stock))
            given.add_file("stock", stock)
    except BadInput as error:
        faults += error.faults
    try:
        if target is not None:
            beside.target = read_target(target, setup.direction)
            given.add_file("target", target)
    except BadInput as error:
        faults += error.faults
    for name in measured:
        try:
            velocity, force, _weight = read_points(name)
        except BadInput as error:
            faults += error.faults
            continue
        label = f"measured: {short_name(name)}"
        beside.measured.append(CurveLine(label, velocity, force, "measured"))
        given.add_file("target", name)
    if faults:
        raise BadInput(faults)
    return beside


def _document(out: Path, sheets: "list[Sheet]") -> "dict[str, Any]":
    """Where the page is, and what is on it."""
    from dataclasses import asdict

    from optimiser.report.document import as_json

    return {"page": str(out), "sheets": [as_json(asdict(one)) for one in sheets]}
