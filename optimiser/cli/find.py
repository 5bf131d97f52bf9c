"""``shimwright find``: from a wanted curve and a drawer to stacks that can be built."""

from pathlib import Path
from typing import TYPE_CHECKING

import typer

from optimiser.cli.band_options import BandsOption, WithinOption, note_when_preparing_bands
from optimiser.cli.find_options import (
    DEFAULT_EVALUATIONS,
    MOST_USUAL_WORKERS,
    AgainOption,
    ClickRangeOption,
    EvaluationsOption,
    FaceMinOption,
    FixedClicksOption,
    HeightMaxOption,
    HeightMinOption,
    OutFolderOption,
    PartsOption,
    Rank,
    RankByOption,
    RevalveOption,
    RowsOption,
    SearchedCircuitOption,
    StageChoice,
    StagesOption,
    TakenAtOption,
    WorkersOption,
)
from optimiser.cli.notes import note, print_document
from optimiser.cli.options import (
    DEFAULT_DAMPER,
    ChartOption,
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
from optimiser.cli.wish_options import (
    DEFAULT_STOCK,
    CopyOption,
    CopyStaticOption,
    FeelOption,
    FittedOption,
    FrameOption,
    HighOption,
    KneeOption,
    LowOption,
    MidOption,
    ResampleOption,
    RiderKgOption,
    RiderOption,
    SagOption,
    StockOption,
    TargetOption,
)
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from optimiser.report.chart import Format
    from optimiser.results import Answer, SavedOrder

#: Options that may stand beside ``--again``: they do not change what is searched.
_BESIDE_AGAIN = {"again", "workers", "chart", "sheet", "json", "out", "quiet"}


def find(
    context: typer.Context,
    damper: DamperOption = DEFAULT_DAMPER,
    circuit: SearchedCircuitOption = None,
    stock: StockOption = DEFAULT_STOCK,
    target: TargetOption = None,
    copy: CopyOption = None,
    copy_static_n: CopyStaticOption = None,
    low: LowOption = None,
    mid: MidOption = None,
    high: HighOption = None,
    knee: KneeOption = None,
    rider_kg: RiderKgOption = None,
    rider: RiderOption = None,
    frame: FrameOption = None,
    feel: FeelOption = None,
    sag: SagOption = None,
    velocities: VelocitiesOption = None,
    resample: ResampleOption = None,
    fitted: FittedOption = None,
    fitted_clicks: TakenAtOption = None,
    revalve: RevalveOption = False,
    clicks: FixedClicksOption = None,
    click_range: ClickRangeOption = None,
    parts: PartsOption = 14,
    height_max_mm: HeightMaxOption = None,
    height_min_mm: HeightMinOption = None,
    face_min: FaceMinOption = 1,
    stages: StagesOption = StageChoice.both,
    rank_by: RankByOption = Rank.default,
    bands: BandsOption = False,
    within: WithinOption = None,
    rows: RowsOption = 8,
    seed: SeedOption = 0,
    workers: WorkersOption = None,
    evaluations: EvaluationsOption = DEFAULT_EVALUATIONS,
    oil_temp_c: OilTempOption = None,
    steel: SteelOption = None,
    oil: OilOption = None,
    again: AgainOption = None,
    out: OutFolderOption = None,
    chart: ChartOption = None,
    sheet: SheetOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """From a wanted curve and a drawer of shims to stacks that can be built, best first.

    With no options it solves the bundled example. What is wanted is said as in target. Ctrl-C
    ends the search and shows the best so far.
    """
    from optimiser.cli.find_request import Asked, check_numbers, order_of
    from optimiser.cli.inputs import parse_velocities
    from optimiser.cli.result_files import check_folder
    from optimiser.report.chart import chart_format
    from optimiser.results import read_result
    from optimiser.wanted.said import Said

    if chart is not None:
        chart_format(chart)
    if sheet is not None:
        check_page_path(sheet, "--sheet")
    if out is not None:
        check_folder(out)
    asked = Asked(
        damper, steel, oil, oil_temp_c, circuit, stock, revalve, clicks, click_range, parts,
        face_min, stages, height_min_mm, height_max_mm, rank_by, rows, seed, evaluations,
        bands, within,
    )  # fmt: skip
    check_numbers(asked, workers)
    if again is not None:
        _check_beside_again(context)
        order = read_result(again)
    else:
        said = Said(
            targets=tuple(target or ()),
            copies=tuple(copy or ()),
            copy_static_n=copy_static_n,
            fitted=tuple(fitted or ()),
            low_percent=low,
            mid_percent=mid,
            high_percent=high,
            knee_percent=knee,
            clicks=fitted_clicks,
            velocity_m_s=None if velocities is None else tuple(parse_velocities(velocities)),
            rider_kg=rider_kg,
            rider=rider,
            frame=frame,
            feel=feel,
            sag_percent=sag,
            resample=resample,
        )
        order = order_of(said, asked)
    answer = _answer(order, workers, out, chart, json, quiet)
    if sheet is not None:
        from optimiser.report.sheet_result import sheets_of, tuned_of

        write_page(sheet, sheets_of(tuned_of(answer), command_of(context)))
        note(f"bench sheets written to {sheet}", quiet)


def _answer(
    order: "SavedOrder",
    workers: int | None,
    out: Path | None,
    chart: Path | None,
    json: bool,
    quiet: bool,
) -> "Answer":
    """Search, write the files asked for and show what was found."""
    from optimiser.cli.find_request import check_buildable, check_within_reach
    from optimiser.cli.progress import note_when_preparing
    from optimiser.cli.result_files import write_folder
    from optimiser.files import atomic_write_bytes
    from optimiser.report.chart import chart_format
    from optimiser.report.find import show_answer
    from optimiser.report.find_document import find_document
    from optimiser.report.look import look_of

    check_buildable(order)
    note_when_preparing(quiet)
    check_within_reach(order)
    if order.circuits[0].bands is not None:
        note_when_preparing_bands(quiet)
    answer = _search(order, workers or _usual_workers(), quiet or json)
    if out is not None:
        for file in write_folder(out, answer, _chart(answer, "svg")):
            note(f"written: {file}", quiet)
    if chart is not None:
        atomic_write_bytes(chart, _chart(answer, chart_format(chart)))
        note(f"chart written to {chart}", quiet)
    if json:
        print_document(find_document(answer))
        if answer.cut_short:
            note("cut short by Ctrl-C: these are the best stacks so far", quiet)
    else:
        show_answer(answer, look_of(), quiet)
    return answer


def _search(order: "SavedOrder", workers: int, silent: bool) -> "Answer":
    """Run the search, with a line of progress, until it is done or cut short."""
    from time import perf_counter

    from optimiser.chances import weighed
    from optimiser.cli.progress import Interrupts, ProgressLine
    from optimiser.results import Answer
    from optimiser.search.find import find as find_one
    from optimiser.search.pair import find_pair

    began = perf_counter()
    with Interrupts() as interrupts, ProgressLine(interrupts, order.evaluations, silent) as line:
        if len(order.circuits) > 1:
            pair = find_pair(order.pair_order(workers), line, interrupts.stop)
            found = [pair.first, pair.second]
        else:
            found = [find_one(order.orders(workers)[0], line, interrupts.stop)]
    shown, likely = weighed(order, found, workers)
    return Answer(
        order,
        shown,
        tuple(one.details(0) for one in shown),
        perf_counter() - began,
        interrupts.heeded or any(one.cut_short for one in found),
        workers,
        likely,
    )


def _chart(answer: "Answer", file_format: "Format") -> bytes:
    """Picture of the target and the best stacks, on velocities close together."""
    import numpy as np

    from optimiser.prediction import predict
    from optimiser.report.chart import chart_bytes
    from optimiser.report.find import CHARTED, panels_of

    curves, bands = [], []
    for place, found in enumerate(answer.found):
        wanted = found.order.target.velocity_m_s
        velocity = np.unique(np.concatenate([np.geomspace(wanted[0], wanted[-1], 50), wanted]))
        curves.append(
            [
                predict(found.order.setup, proposal.real_stack, velocity, proposal.clicks)
                for proposal in found.proposals[:CHARTED]
            ]
        )
        bands.append(answer.likely[place].spread.bands(curves[-1][0]) if answer.likely else None)
    return chart_bytes(panels_of(answer, curves, bands), file_format)


def _usual_workers() -> int:
    """All cores this process may use, but few."""
    import os

    allowed = getattr(os, "sched_getaffinity", None)  # not on every system
    cores = len(allowed(0)) if allowed else os.cpu_count() or 1
    return max(1, min(MOST_USUAL_WORKERS, cores))


def _check_beside_again(context: typer.Context) -> None:
    """Raise BadInput for options that a saved order answers already."""
    given = [
        parameter.opts[0]
        for parameter in context.command.params
        if parameter.name not in _BESIDE_AGAIN
        and parameter.name is not None
        and _is_given(context, parameter.name)
    ]
    if given:
        raise BadInput(
            f"--again repeats a saved search, which {', '.join(given)} would change; allowed "
            "beside it: --workers, --out, --chart, --sheet, --json, --quiet"
        )


def _is_given(context: typer.Context, name: str) -> bool:
    source = context.get_parameter_source(name)
    return source is not None and source.name == "COMMANDLINE"
