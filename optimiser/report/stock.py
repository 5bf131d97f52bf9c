"""The report of ``stock``: what is on the shelf, what a build takes, what is missing."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from optimiser.damper import Valve, warnings_for
from optimiser.report.document import as_json
from optimiser.report.look import Look
from optimiser.report.paragraph import paragraph
from optimiser.report.tables import new_table
from optimiser.stack import Shim, Stack
from optimiser.stock import SAME_DIAMETER_MM, SAME_THICKNESS_MM, Stock, StockItem

#: Thicknesses side by side in one table of 80 columns.
ACROSS = 10
#: Up to so many sizes of one bore are listed in a line instead of a table.
FEW = 4


@dataclass(frozen=True)
class Need:
    """One size of a build; ``left`` in the drawer afterwards, ``bins`` where it lies."""

    shim: Shim
    needed: int
    available: int
    missing: int
    left: int
    bins: tuple[str, ...]


@dataclass(frozen=True)
class Build:
    """What a stack takes from the drawer; ``price`` None where a size has none."""

    label: str
    stack: Stack
    needs: tuple[Need, ...]
    price: float | None
    warnings: tuple[str, ...]

    @property
    def missing(self) -> list[str]:
        """What is missing, ``quantity x outer x thickness`` each."""
        return [f"{need.missing} x {need.shim}" for need in self.needs if need.missing]


@dataclass(frozen=True)
class Shelf:
    """A stock list as asked for: whole, or for one post; ``valve`` where a damper is named."""

    name: str
    stock: Stock
    post_mm: float | None = None
    valve: Valve | None = None


def build_of(shelf: Shelf, stack: Stack, label: str) -> Build:
    """What ``stack`` takes, size by size, face first. Raises BadInput (see ``Stock.shortage``)."""
    stock, post = shelf.stock, shelf.post_mm
    short = {group.shim: group.quantity for group in stock.shortage(stack, post)}
    after = stock if short else stock.take(stack, post)
    needed: dict[Shim, int] = {}
    for group in stack.groups:
        needed[group.shim] = needed.get(group.shim, 0) + group.quantity
    needs = []
    for shim, count in needed.items():
        places = _lying(stock, shim, stack.clamp_mm, post)
        available = sum(item.quantity for item in places)
        left = sum(item.quantity for item in _lying(after, shim, stack.clamp_mm, post))
        if short:
            left = max(available - count, 0)
        bins = tuple(dict.fromkeys(item.bin for item in places if item.bin))
        needs.append(Need(shim, count, available, short.get(shim, 0), left, bins))
    warnings = tuple(warnings_for(shelf.valve, stack)) if shelf.valve else ()
    return Build(label, stack, tuple(needs), stock.price_of(stack, post), warnings)


def show_stock(shelf: Shelf, build: Build | None, look: Look, quiet: bool = False) -> None:
    """Print the report."""
    for item in stock_report(shelf, build, look, quiet):
        look.console.print(item)


def stock_report(
    shelf: Shelf, build: Build | None, look: Look, quiet: bool
) -> Iterable[RenderableType]:
    """The parts of the report in order, ready to print."""
    stock = shelf.stock
    yield Text(
        f"{shelf.name}: {stock.pieces} shims, {len(stock)} lines; number of shims by outer "
        "diameter and thickness",
        style="bold",
    )
    yield ""
    few: list[str] = []
    for title, items in _parts_of(shelf):
        if len(items) <= FEW:
            few.append(f"{title}: {_listed(items)}")
            continue
        yield Text(f"{title}: {_amount(items)}")
        for table in count_tables(items, look):
            yield table
            yield ""
    for line in few if quiet else [*few, *stock_notes(shelf)]:
        yield from paragraph(line, look)
    if build is not None:
        yield ""
        yield from _build(build, look)


def count_tables(items: Sequence[StockItem], look: Look) -> list[Table]:
    """Diameters down, thicknesses across, pieces in the cells; blank: no such line."""
    counts: dict[tuple[float, float], int] = {}
    for item in items:
        key = item.outer_mm, item.thickness_mm
        counts[key] = counts.get(key, 0) + item.quantity
    outers = sorted({outer for outer, _ in counts}, reverse=True)
    thicknesses = sorted({thickness for _, thickness in counts})
    tables = []
    for start in range(0, len(thicknesses), ACROSS):
        across = thicknesses[start : start + ACROSS]
        last = start + ACROSS >= len(thicknesses)
        headings = [f"{_thickness_text(thickness)}\nmm" for thickness in across]
        table = new_table(look, "dia.\nmm", *headings, *(["all\n"] if last else []))
        for outer in outers:
            found = [counts.get((outer, thickness)) for thickness in across]
            cells = [Text("" if count is None else str(count)) for count in found]
            total = sum(count for (diameter, _), count in counts.items() if diameter == outer)
            cells += [Text(str(total), style="dim")] if last else []
            table.add_row(Text(f"{outer:g}", style="bold"), *cells)
        tables.append(table)
    return tables


def stock_notes(shelf: Shelf) -> list[str]:
    """What is worth knowing about the list: empty lines, measured shims, what fits the valve."""
    items = shelf.stock.items
    notes = []
    empty = sum(1 for item in items if not item.quantity)
    if empty:
        notes.append(f"{empty} of {len(items)} lines have 0 shims.")
    measured = [item for item in items if item.measured_mm is not None]
    if measured:
        furthest = max(measured, key=lambda item: abs(item.real_mm - item.thickness_mm))
        notes.append(
            f"{len(measured)} lines have a measured thickness, which counts instead of the nominal "
            f"one; furthest off: {furthest.outer_mm:g} x "
            f"{_thickness_text(furthest.thickness_mm)} mm is "
            f"{furthest.real_mm:.3f} mm."
        )
    if shelf.valve is not None:
        notes += valve_notes(shelf.stock, shelf.valve)
    return notes


def valve_notes(stock: Stock, valve: Valve) -> list[str]:
    """How many of the shims on its post can face or clamp a valve's stack."""
    if valve.seat is None or valve.post is None or valve.ports is None:
        return []
    cover, clearance, inner = valve.seat.cover_mm, valve.post.clearance_mm, valve.ports.inner_mm
    fitting = stock.for_post(valve.post.post_mm).items
    faces = [item for item in fitting if cover - 1e-6 <= item.outer_mm <= clearance]
    clamps = [item for item in fitting if item.outer_mm < inner]
    return [
        f"As face shim of {valve.name}, {cover:g} to {clearance:g} mm: {_amount(faces)}.",
        f"As its clamp shim, less than {inner:g} mm: {_amount(clamps)}.",
    ]


def stock_document(shelf: Shelf, build: Build | None) -> dict[str, Any]:
    """The stock list and the build for JSON."""
    items, rings = _chosen(shelf)
    document = {
        "stock": shelf.name,
        "post_mm": shelf.post_mm,
        "lines": len(shelf.stock),
        "pieces": shelf.stock.pieces,
        "items": [vars(item) for item in items],
        "ring_shims": [vars(item) for item in rings],
        "notes": stock_notes(shelf),
        "build": _build_document(build) if build else None,
    }
    converted: dict[str, Any] = as_json(document)
    return converted


def _build_document(build: Build) -> dict[str, Any]:
    return {
        "label": build.label,
        "stack": build.stack.lines(),
        "parts": build.stack.parts,
        "height_mm": build.stack.height_mm,
        "buildable": not build.missing,
        "price": build.price,
        "warnings": list(build.warnings),
        "shims": [
            {
                "outer_mm": need.shim.outer_mm,
                "thickness_mm": need.shim.thickness_mm,
                "inner_mm": need.shim.inner_mm,
                "needed": need.needed,
                "available": need.available,
                "missing": need.missing,
                "left": need.left,
                "bins": list(need.bins),
            }
            for need in build.needs
        ],
    }


def _chosen(shelf: Shelf) -> tuple[tuple[StockItem, ...], tuple[StockItem, ...]]:
    """Items that fit the post and ring shims around it; all of them without a post."""
    if shelf.post_mm is None:
        return shelf.stock.items, ()
    fitting = shelf.stock.for_post(shelf.post_mm).items
    return fitting, shelf.stock.ring_shims(shelf.post_mm).items


def _parts_of(shelf: Shelf) -> list[tuple[str, Sequence[StockItem]]]:
    """Titled parts of the list: for a post and ring shims around it, or bore by bore."""
    items, rings = _chosen(shelf)
    if shelf.post_mm is not None:
        parts: list[tuple[str, Sequence[StockItem]]] = [(f"on a {shelf.post_mm:g} mm post", items)]
        if rings:
            parts.append((f"wider bores, as ring shims on a {shelf.post_mm:g} mm post", rings))
        return parts
    bores = sorted({item.inner_mm for item in items})
    by_bore = [(bore, [item for item in items if item.inner_mm == bore]) for bore in bores]
    by_bore.sort(key=lambda part: -len(part[1]))
    return [(f"bore {bore:g} mm", part) for bore, part in by_bore]


def _listed(items: Sequence[StockItem]) -> str:
    sizes = [
        f"{item.quantity} of {item.outer_mm:g} x {_thickness_text(item.thickness_mm)}"
        for item in items
    ]
    return ", ".join(sizes) or "none"


def _build(build: Build, look: Look) -> Iterable[RenderableType]:
    stack = build.stack
    yield Text(
        f"{build.label} takes {stack.parts} shims, {stack.height_mm:.2f} mm high:", style="bold"
    )
    binned = any(need.bins for need in build.needs)
    headings = ["shim, mm", "takes", "in stock", "left", "missing", *(["bin"] if binned else [])]
    table = new_table(look, *headings, left=[0, 5])
    for need in build.needs:
        missing = Text(str(need.missing), style="bold red") if need.missing else Text("")
        cells = [str(need.shim), str(need.needed), str(need.available), str(need.left)]
        place = [_clipped(", ".join(need.bins), 30)] if binned else []
        table.add_row(*cells, missing, *place)
    yield table
    if build.missing:
        yield from paragraph(f"missing: {', '.join(build.missing)}", look, "bold red")
    elif build.price is not None:
        yield Text(f"price of these shims: {build.price:.2f}")
    for warning in build.warnings:
        yield from paragraph(f"warning: {warning}", look, "yellow")


def _lying(stock: Stock, shim: Shim, clamp_mm: float, post_mm: float | None) -> list[StockItem]:
    """The lines of a size: by nominal or measured thickness, with a bore that suits it."""
    found = []
    for item in stock:
        thicknesses = (item.thickness_mm, item.real_mm)
        same = abs(item.outer_mm - shim.outer_mm) <= SAME_DIAMETER_MM and any(
            abs(thickness - shim.thickness_mm) <= SAME_THICKNESS_MM for thickness in thicknesses
        )
        if shim.inner_mm is not None:
            suits = abs(item.inner_mm - shim.inner_mm) <= SAME_DIAMETER_MM
        else:
            suits = item.inner_mm < clamp_mm if post_mm is None else item.fits(post_mm)
        if same and suits:
            found.append(item)
    return found


def _amount(items: Sequence[StockItem]) -> str:
    sizes = len({(item.outer_mm, item.thickness_mm) for item in items if item.quantity})
    pieces = sum(item.quantity for item in items)
    return f"{pieces} shims in {sizes} sizes" if pieces else "none in stock"


def _thickness_text(thickness_mm: float) -> str:
    """Two decimals as shims are sold; more only where a list has them."""
    short = f"{thickness_mm:.2f}"
    return short if abs(float(short) - thickness_mm) < 1e-9 else f"{thickness_mm:g}"


def _clipped(text: str, width: int) -> str:
    return text if len(text) <= width else text[: width - 3] + "..."
