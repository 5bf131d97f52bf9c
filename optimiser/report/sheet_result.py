"""From a search's answer, fresh or saved, to bench sheets."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel, ConfigDict, Field

from optimiser.checking import validate
from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.prediction import predict
from optimiser.report.band import smooth_band
from optimiser.report.find import exchanged_shims
from optimiser.report.sheet import Exchange, Fact, Sheet, Source
from optimiser.report.sheet_from import About, program_name, sheet_of
from optimiser.report.sheet_steps import Drawer
from optimiser.results import Answer, SavedCircuit, SavedOrder, post_mm
from optimiser.search.find import Found
from optimiser.stack import Group, Shim, Stack
from optimiser.stock import Stock


class _SavedGroup(BaseModel):
    outer_mm: float
    thickness_mm: float
    quantity: int
    inner_mm: float | None = None


class _SavedTune(BaseModel):
    shims: tuple[_SavedGroup, ...]
    measured_shims: tuple[_SavedGroup, ...]
    clicks: int = Field(ge=0)


class _SavedPoint(BaseModel):
    sentence: str


class _SavedFound(BaseModel):
    stacks: tuple[_SavedTune, ...] = Field(min_length=1)
    outside: tuple[_SavedPoint, ...] = ()


class _SavedAnswer(BaseModel):
    """The part of a result document that a sheet is drawn from."""

    model_config = ConfigDict(extra="ignore")

    circuits: dict[Direction, _SavedFound] = Field(min_length=1)
    cut_short: bool = False
    ride: dict[str, Any] | None = None


@dataclass(frozen=True)
class Tune:
    """One stack of an answer: as written on the bins, as measured, and the needle's clicks."""

    nominal: Stack
    real: Stack
    clicks: int


@dataclass(frozen=True)
class Tunes:
    """The stacks of one direction, best first, and why the target cannot be met everywhere."""

    direction: Direction
    stacks: tuple[Tune, ...]
    outside: tuple[str, ...] = ()


@dataclass(frozen=True)
class Tuned:
    """An order with the stacks that answer it; ``ride`` as in ``report.ride.ride_document``."""

    order: SavedOrder
    tunes: tuple[Tunes, ...]
    cut_short: bool = False
    ride: Mapping[str, Any] | None = None


def tuned_of(answer: Answer, ride: Mapping[str, Any] | None = None) -> Tuned:
    """What a fresh answer holds."""
    tunes = tuple(_tunes_of(found) for found in answer.found)
    return Tuned(answer.order, tunes, answer.cut_short, ride)


def tuned_from(order: SavedOrder, document: Mapping[str, Any], where: str) -> Tuned:
    """What a saved document holds beside its order. Raises BadInput with every fault."""
    saved = validate(_SavedAnswer, document, where)
    faults: list[str] = []
    tunes = []
    for direction, found in saved.circuits.items():
        if direction not in {circuit.direction for circuit in order.circuits}:
            faults.append(f"{where}: circuits.{direction} is not in the saved order")
            continue
        stacks = []
        for number, one in enumerate(found.stacks, start=1):
            try:
                stacks.append(_tune(one))
            except BadInput as error:
                place = f"{where}: circuits.{direction}.stacks[{number}]"
                faults += [f"{place}: {fault}" for fault in error.faults]
        sentences = tuple(point.sentence for point in found.outside)
        tunes.append(Tunes(direction, tuple(stacks), sentences))
    if faults:
        raise BadInput(faults)
    return Tuned(order, tuple(tunes), saved.cut_short, saved.ride)


def sheets_of(tuned: Tuned, command: str = "", ranks: Sequence[int] = (1,)) -> list[Sheet]:
    """One sheet a rank and direction. Raises BadInput for a rank that no direction has.

    Each direction draws from what stack 1 of the ones before it leaves in the drawer.
    """
    _check_ranks(tuned, ranks)
    sheets = []
    stock = tuned.order.whole_drawer
    for tunes in tuned.tunes:
        for rank in sorted(set(ranks)):
            if rank <= len(tunes.stacks):
                sheets.append(_sheet(tuned, tunes, rank, stock, command))
        stock = _without(stock, tuned.order, tunes)
    return sheets


def _check_ranks(tuned: Tuned, ranks: Iterable[int]) -> None:
    most = max(len(tunes.stacks) for tunes in tuned.tunes)
    faults = [
        f"--rank is {rank}; allowed: 1 to {most}, the stacks of this result"
        for rank in ranks
        if not 1 <= rank <= most
    ]
    if faults:
        raise BadInput(faults)


def _sheet(tuned: Tuned, tunes: Tunes, rank: int, stock: Stock, command: str) -> Sheet:
    order, tune = tuned.order, tunes.stacks[rank - 1]
    circuit = _circuit(order, tunes.direction)
    setup = order.setup(circuit)
    target = circuit.target.target(tunes.direction)
    if tune.clicks > setup.clicks_range:
        raise BadInput(
            f"{tunes.direction}, stack {rank}: clicks is {tune.clicks}; allowed: 0 to "
            f"{setup.clicks_range}"
        )
    seen = predict(setup, tune.real, target.velocity_m_s, tune.clicks)
    about = About(
        f"wanted: {target.origin} \u00b7 stack {rank} of {len(tunes.stacks)}",
        source_of(order, command),
        target,
        tune.nominal,
        Drawer(order.stock_name, stock, post_mm(setup)),
        _exchange(circuit.fitted, tune.nominal),
        facts=ride_facts(tuned.ride or {}),
        warnings=tuple(_warnings(tuned, tunes)),
        spread_n=smooth_band(seen, order.spread(circuit)),
    )
    return sheet_of(seen, about)


def ride_facts(ride: Mapping[str, Any]) -> tuple[Fact, ...]:
    """Rider, frame, feel, spring and sag, as far as they are known."""
    found = [
        ("rider with kit", _text(ride, "rider_kg", "{:g} kg")),
        ("frame", _text(ride, "frame", "{}")),
        ("feel", _text(ride, "feel", "{}")),
        ("spring on the shaft", _spring(ride)),
        (
            "sag",
            _text(ride, "sag_percent", "{:.1f} %")
            + _text(ride, "sag_shaft_mm", ", {:.1f} mm of shaft"),
        ),
    ]
    return tuple(Fact(label, value) for label, value in found if value)


def _spring(ride: Mapping[str, Any]) -> str:
    if ride.get("coil_n_mm") is None:
        return _text(ride, "shaft_rate_n_mm", "air, {:.1f} N/mm at sag")
    return _text(ride, "coil_n_mm", "coil {:.1f} N/mm") + _text(
        ride, "preload_mm", ", {:g} mm preload"
    )


def _text(ride: Mapping[str, Any], key: str, form: str) -> str:
    value = ride.get(key)
    wanted = str if form == "{}" else (int, float)
    return form.format(value) if isinstance(value, wanted) else ""


def source_of(order: SavedOrder, command: str) -> Source:
    """Seed and fingerprints of everything the order was made from."""
    inputs = tuple(Fact(f"{file.kind} {file.name}", file.fingerprint) for file in order.inputs)
    return Source(program_name(), command, order.seed, inputs)


def _warnings(tuned: Tuned, tunes: Tunes) -> Iterable[str]:
    if tuned.cut_short:
        yield "the search was cut short: a longer one may find better stacks"
    if tunes.outside:
        more = f" (and at {len(tunes.outside) - 1} more)" if len(tunes.outside) > 1 else ""
        yield f"the target cannot be met everywhere: {tunes.outside[0]}{more}"
    yield from tuned.order.notes


def _exchange(fitted: Stack | None, stack: Stack) -> Exchange | None:
    if fitted is None:
        return None
    out, into = exchanged_shims(fitted, stack)
    return Exchange(tuple(map(str, out)), tuple(map(str, into)))


def _circuit(order: SavedOrder, direction: Direction) -> SavedCircuit:
    return next(circuit for circuit in order.circuits if circuit.direction == direction)


def _without(stock: Stock, order: SavedOrder, tunes: Tunes) -> Stock:
    """What stack 1 leaves for the other direction; all of it where the stack is not in stock."""
    post = post_mm(order.setup(_circuit(order, tunes.direction)))
    stack = tunes.stacks[0].nominal
    return stock if stock.shortage(stack, post) else stock.take(stack, post)


def _tunes_of(found: Found) -> Tunes:
    stacks = tuple(Tune(one.stack, one.real_stack, one.clicks) for one in found.proposals)
    sentences = tuple(point.sentence for point in found.feasibility.outside)
    return Tunes(found.order.setup.direction, stacks, sentences)


def _tune(saved: _SavedTune) -> Tune:
    """Raises BadInput."""
    nominal, real = _stack(saved.shims), _stack(saved.measured_shims)
    if nominal.parts != real.parts:
        raise BadInput(
            f"shims has {nominal.parts} pieces and measured_shims {real.parts}; allowed: as many"
        )
    return Tune(nominal, real, saved.clicks)


def _stack(groups: Iterable[_SavedGroup]) -> Stack:
    return Stack(
        tuple(Group(g.quantity, Shim(g.outer_mm, g.thickness_mm, g.inner_mm)) for g in groups)
    )
