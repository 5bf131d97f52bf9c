"""``shimwright table``: a tune table for a frame, riders down and feels across."""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from optimiser.cli.notes import note, print_document
from optimiser.cli.options import JsonOption, QuietOption
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from collections.abc import Callable
    from concurrent.futures import Executor
    from contextlib import AbstractContextManager

    from optimiser.stock import Stock
    from optimiser.table_files import ReadTable
    from optimiser.tuning.buying import Purchase
    from optimiser.tuning.cells import Place
    from optimiser.tuning.runner import Journal
    from optimiser.tuning.table import TuneTable
    from optimiser.tuning.tasks import Result

MOST_USUAL_WORKERS, MOST_WORKERS = 4, 256
DEFAULT_REQUEST = "example-table"
EXIT_WITHOUT_A_STACK = 1


def table(
    request: Annotated[
        str,
        typer.Argument(metavar="REQUEST", help="Tune-table request: a bundled name or TOML file."),
    ] = DEFAULT_REQUEST,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out",
            metavar="DIR",
            help="Save table.json, table.csv, changes.csv, kit.csv and every finished cell: after "
            "a break the same command goes on.",
        ),
    ] = None,
    tolerance: Annotated[
        float | None,
        typer.Option("--tolerance", metavar="PERCENT", help="Error up to which a stack will do."),
    ] = None,
    one_drawer: Annotated[
        bool, typer.Option("--one-drawer", help="Build every cell at once from the stock.")
    ] = False,
    what_to_buy: Annotated[
        bool,
        typer.Option(
            "--what-to-buy", help="Also look for sizes that bring cells into the tolerance."
        ),
    ] = False,
    to_buy: Annotated[
        str | None,
        typer.Option(
            "--to-buy",
            metavar="NAME|FILE",
            help="Stock list of what can be bought; without it every 2 mm in usual thicknesses.",
        ),
    ] = None,
    seed: Annotated[
        int | None, typer.Option("--seed", metavar="N", help="Same seed, same table.")
    ] = None,
    evaluations: Annotated[
        int | None,
        typer.Option("--evaluations", metavar="N", help="About how many stacks a cell tries."),
    ] = None,
    workers: Annotated[
        int | None,
        typer.Option(
            "--workers", metavar="N", help="Processes to use; all cores, but at most 4, by default."
        ),
    ] = None,
    scheduler: Annotated[
        str | None,
        typer.Option(
            "--scheduler",
            metavar="ADDRESS",
            help="Run the cells on a Dask scheduler, tcp://host:port, instead.",
        ),
    ] = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """A tune table for a frame: riders down, feels across, both stacks in every cell.

    The stacks are chosen so that moving a row changes few shims. Below the table: the changes from
    row to row and the smallest kits that build any one cell. Without REQUEST it is the bundled
    example. The exit code is 1 when no cell has a stack.
    """
    from optimiser.cli.progress import note_when_preparing
    from optimiser.files import read_stock
    from optimiser.table_files import open_journal, read_request
    from optimiser.tuning.runner import Forgetful

    if workers is not None and not 1 <= workers <= MOST_WORKERS:
        raise BadInput(f"--workers is {workers}; allowed: 1 to {MOST_WORKERS}")
    if workers is not None and scheduler is not None:
        raise BadInput("--workers and --scheduler both say where to run; allowed: one of them")
    changes = {"tolerance_percent": tolerance, "seed": seed, "evaluations": evaluations}
    given = {key: value for key, value in changes.items() if value is not None}
    read = read_request(request, {**given, **({"one_drawer": True} if one_drawer else {})})
    buyable = read_stock(to_buy) if to_buy is not None else None
    journal = open_journal(out) if out is not None else Forgetful()
    note_when_preparing(quiet)
    with _where(workers, scheduler)() as executor:
        made = _made(read, executor, journal, quiet or json)
        found = None
        if what_to_buy or buyable is not None:
            found = _purchases(made, buyable, executor, journal)
    _show(made, found, read, out, json, quiet)
    if not made.chosen:
        raise typer.Exit(EXIT_WITHOUT_A_STACK)


def _where(
    workers: int | None, address: str | None
) -> "Callable[[], AbstractContextManager[Executor]]":
    from functools import partial

    from optimiser.tuning.executors import local, scheduler

    if address is not None:
        return partial(scheduler, address)
    return partial(local, workers or _usual_workers())


def _usual_workers() -> int:
    import os

    allowed = getattr(os, "sched_getaffinity", None)  # not on every system
    cores = len(allowed(0)) if allowed else os.cpu_count() or 1
    return max(1, min(MOST_USUAL_WORKERS, cores))


def _made(read: "ReadTable", executor: "Executor", journal: "Journal", silent: bool) -> "TuneTable":
    """The table, with a line on stderr for every cell."""
    from optimiser.tuning.table import make_table

    request = read.materials.request
    done = 0

    def tell(stage: str, place: "Place", result: "Result", known: bool) -> None:
        nonlocal done
        done += 1
        best = result.candidates[0] if result.candidates else None
        said = result.reason or "nothing" if best is None else f"{best.error_percent:.1f} %"
        took = "kept from before" if known else f"{result.seconds:.1f} s"
        note(
            f"{done:4d}  {_STAGES[stage]} {request.rider_masses_kg[place.mass]:g} kg, "
            f"{read.materials.feels[place.feel].name}, {request.circuits[place.circuit]}: "
            f"{said}, {took}",
            silent,
        )

    return make_table(read.materials, executor, journal, tell)


_STAGES = {
    "search": "searched",
    "settle": "compared with the others",
    "again": "searched again",
    "rest": "searched in what is left",
}


def _purchases(
    made: "TuneTable", buyable: "Stock | None", executor: "Executor", journal: "Journal"
) -> "tuple[Purchase[Place], ...]":
    from optimiser.tuning.buying import usual_sizes, what_to_buy
    from optimiser.tuning.shortage import needs_of

    sizes = buyable or usual_sizes(setup.valve for setup in made.materials.setups)
    tolerance = made.materials.request.tolerance_percent
    return what_to_buy(needs_of(made), sizes, tolerance, executor, journal)


def _show(
    made: "TuneTable",
    purchases: "tuple[Purchase[Place], ...] | None",
    read: "ReadTable",
    out: Path | None,
    json: bool,
    quiet: bool,
) -> None:
    from optimiser.report.look import look_of
    from optimiser.report.tune_table import show_table
    from optimiser.report.tune_table_document import table_document
    from optimiser.table_files import write_table

    document = table_document(made, purchases)
    document["inputs"] = [vars(file) for file in read.files]
    if out is not None:
        for file in write_table(out, made, document):
            note(f"written: {file}", quiet)
    if json:
        print_document({**document, "worker_seconds": made.seconds})
    else:
        show_table(made, purchases, look_of(), quiet)
