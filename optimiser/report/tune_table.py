"""The report of ``table`` on a terminal, laid out for 100 columns."""

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from optimiser.report.look import Look
from optimiser.report.paragraph import kept, paragraph
from optimiser.report.stock import count_tables
from optimiser.report.tables import new_table
from optimiser.stock import StockItem
from optimiser.tuning.buying import Purchase
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.cells import Place
from optimiser.tuning.changes import moved, sentence
from optimiser.tuning.kit import Kit
from optimiser.tuning.shelf import Shelf
from optimiser.tuning.table import TuneTable

WIDTH = 100
LEGEND = (
    "kg: rider with kit; N/mm: coil rate. In every cell the error at the clicks out from closed, "
    "and the stack, face first: number x diameter x thickness, mm."
)
#: Columns of stacks beside the riders' mass and spring.
STACKS_ACROSS = 6
#: Purchases shown.
PURCHASES = 8


def show_table(
    table: TuneTable, purchases: Sequence[Purchase[Place]] | None, look: Look, quiet: bool = False
) -> None:
    """Print the report."""
    look.console.width = WIDTH
    for item in table_report(table, purchases, look, quiet):
        look.console.print(item)


def table_report(
    table: TuneTable, purchases: Sequence[Purchase[Place]] | None, look: Look, quiet: bool
) -> Iterable[RenderableType]:
    """The parts of the report in order, ready to print."""
    yield from _heading(table, look)
    for feels in _side_by_side(table):
        yield ""
        yield stack_table(table, feels, look)
    yield ""
    yield from paragraph(LEGEND, look)
    yield from _poor_cells(table, look)
    yield ""
    yield from _changes(table, look, quiet)
    yield from _kits(table, look, quiet)
    if purchases is not None:
        yield ""
        yield from _purchases(table, purchases, look)


def _heading(table: TuneTable, look: Look) -> Iterable[Text]:
    request, setup = table.materials.request, table.materials.setups[0]
    yield Text(request.name, style="bold")
    text = (
        f"{table.materials.frame.name}; {setup.damper.name} with {setup.oil.name} oil at "
        f"{setup.oil_temp_c:g} C; stock {request.stock}; tolerance "
        f"{request.tolerance_percent:g} %; seed {request.seed}"
    )
    if request.one_drawer:
        text += "; every cell at once from one drawer"
    yield from paragraph(text, look)


def _side_by_side(table: TuneTable) -> list[range]:
    """Feels in the same table, as many as there is room for."""
    feels, circuits = len(table.materials.feels), len(table.materials.setups)
    across = max(1, STACKS_ACROSS // circuits)
    return [range(first, min(first + across, feels)) for first in range(0, feels, across)]


def stack_table(table: TuneTable, feels: Sequence[int], look: Look) -> Table:
    """Masses down, feels across, every stack face first under its error and clicks."""
    request = table.materials.request
    headings = ["kg", "N/mm"]
    for feel in feels:
        name = table.materials.feels[feel].name[:14]
        headings += [f"{name}\n{circuit}" for circuit in request.circuits]
    shown = new_table(look, *headings, left=range(2, len(headings)))
    for mass, rider in enumerate(request.rider_masses_kg):
        ride = table.derived[mass, 0].ride
        coil = "air" if ride.coil_n_mm is None else f"{ride.coil_n_mm:.1f}"
        places = [
            Place(mass, feel, circuit) for feel in feels for circuit in range(len(request.circuits))
        ]
        cells = [_cell(table, place) for place in places]
        shown.add_row(Text(f"{rider:g}", style="bold"), coil, *cells, end_section=False)
        if mass + 1 < len(request.rider_masses_kg):
            shown.add_row()
    return shown


def _cell(table: TuneTable, place: Place) -> Text:
    one = table.chosen.get(place)
    if one is None:
        return Text("none: see below", style="yellow")
    poor = one.error_percent > table.materials.request.tolerance_percent or not one.sound
    head = f"{one.error_percent:.1f} %{'!' if poor else ''} {_clicks(table, place, one)}"
    text = Text(head, style="yellow" if poor else "bold")
    for line in one.stack.lines():
        text.append(f"\n{line}", style="not bold default")
    return text


def _clicks(table: TuneTable, place: Place, one: Candidate) -> str:
    return f"at {one.clicks}" if table.materials.setups[place.circuit].clicks_range else ""


def where(table: TuneTable, place: Place) -> str:
    """``82 kg, balanced, rebound``."""
    request = table.materials.request
    return (
        f"{request.rider_masses_kg[place.mass]:g} kg, {table.materials.feels[place.feel].name}, "
        f"{request.circuits[place.circuit]}"
    )


def _poor_cells(table: TuneTable, look: Look) -> Iterable[RenderableType]:
    for place, reason in sorted(table.reasons.items()):
        yield from paragraph(f"{where(table, place)}: no stack; {reason}", look, "yellow")
    poor = [place for place in table.short if place in table.chosen]
    if poor:
        yield ""
        beyond = [place for place in poor if not table.cells[place].feasible.reachable]
        yield from paragraph(
            f"! {len(poor)} of {len(table.cells)} stacks are not within "
            f"{table.materials.request.tolerance_percent:g} %; for {len(beyond)} of them part of "
            "the wish lies outside what the damper can do.",
            look,
            "yellow",
        )
    worn = [place for place, one in table.chosen.items() if not one.sound]
    for place in worn:
        one = table.chosen[place]
        yield from paragraph(
            f"! {where(table, place)}: utilisation {one.utilisation:.2f}, rise {one.rise:.1f} "
            "thicknesses: a short life, or outside what the model was checked for",
            look,
            "yellow",
        )


def _changes(table: TuneTable, look: Look, quiet: bool) -> Iterable[RenderableType]:
    if not table.changes:
        return
    arrow = "→" if look.unicode else "->"
    masses = table.materials.request.rider_masses_kg
    total = sum(_moved(table, *pair) for pair in table.changes)
    yield Text(
        f"From row to row: {total} shims taken out or put in over {len(table.changes)} steps",
        style="bold",
    )
    if quiet:
        return
    heading = None
    for before, after in table.changes:
        title = (before.feel, before.circuit)
        if title != heading:
            heading = title
            name = table.materials.feels[before.feel].name
            yield Text(f"{name}, {table.materials.request.circuits[before.circuit]}")
        text = sentence(table.chosen[before].stack, table.chosen[after].stack)
        old, new = table.chosen[before].clicks, table.chosen[after].clicks
        clicks = "" if old == new else f"; clicks {old} {arrow} {new}"
        line = f"  {masses[before.mass]:g} {arrow} {masses[after.mass]:g} kg: {text}{clicks}"
        yield from paragraph(line.replace(" x ", kept(" x ")), look)


def _moved(table: TuneTable, before: Place, after: Place) -> int:
    out, into = moved(table.chosen[before].stack, table.chosen[after].stack)
    return sum(group.quantity for group in (*out, *into))


def _kits(table: TuneTable, look: Look, quiet: bool) -> Iterable[RenderableType]:
    if table.kit is None:
        return
    kits = [one.kit for one in table.kits]
    yield ""
    yield Text("Kits that build any one mass and feel", style="bold")
    yield kit_table(table.kit.kit, kits, look)
    if not all(kit.proven for kit in kits):
        yield from paragraph(
            "~ the solver stopped before it was sure that no smaller kit is as good", look
        )
    if quiet:
        return
    shown = kits[0] if kits else table.kit.kit
    yield ""
    yield Text("The smallest kit, pieces by diameter and thickness" if kits else "This table's kit")
    yield from count_tables(kit_items(shown, table.shelf), look)


def kit_table(own: Kit, kits: Sequence[Kit], look: Look) -> Table:
    """This table's kit and the front of smaller ones: shims, sizes, cost, errors."""
    priced = own.cost is not None or any(kit.cost is not None for kit in kits)
    headings = ["kit", "shims", "sizes", *(["cost"] if priced else []), "mean\nerror %"]
    shown = new_table(look, *headings, "worst\nerror %", left=[0])
    named = [("this table", own), *((f"kit {k}", kit) for k, kit in enumerate(kits, start=1))]
    for name, kit in named:
        cost = ["-" if kit.cost is None else f"{kit.cost:.2f}"] if priced else []
        errors = [f"{kit.error_percent:.2f}", f"{kit.worst_percent:.2f}"]
        mark = "" if kit.proven else " ~"
        shown.add_row(f"{name}{mark}", str(kit.pieces), str(kit.sizes), *cost, *errors)
    return shown


def kit_items(kit: Kit, shelf: Shelf) -> list[StockItem]:
    """A kit as lines of a stock list."""
    return [
        StockItem(*_size(shelf, number), int(kit.quantity[number]))
        for number in np.flatnonzero(kit.quantity)
    ]


def _size(shelf: Shelf, number: Any) -> tuple[float, float, float]:
    outer, thickness, post = shelf.sizes[number]
    return outer, post, thickness


def _purchases(
    table: TuneTable, purchases: Sequence[Purchase[Place]], look: Look
) -> Iterable[RenderableType]:
    count = len(table.short)
    yield Text("What to buy", style="bold")
    if not count:
        yield Text("Nothing: every cell is within the tolerance.")
        return
    if not purchases:
        yield from paragraph("No single size that can be bought helps any of the cells.", look)
        return
    yield purchase_table(purchases, look, "cells\nfixed")
    yield from paragraph(
        f"Of {count} cells out of tolerance; ranked by cells fixed per size, then by their mean "
        "error. Number of shims: the most that one cell takes beyond what it has.",
        look,
    )


def purchase_table(purchases: Sequence[Purchase[Any]], look: Look, fixed: str) -> Table:
    """Sizes to buy, what they fix and the error that is left."""
    shown = new_table(look, "buy", fixed, "per\nsize", "mean\nerror %", left=[0])
    for one in purchases[:PURCHASES]:
        sizes = zip(one.pieces, one.sizes, strict=True)
        shown.add_row(
            " + ".join(f"{pieces} x {shim}" for pieces, shim in sizes),
            str(len(one.fixed)),
            f"{one.fixed_per_size:.2f}",
            f"{one.mean_percent:.2f}",
        )
    return shown
