"""From the options of ``find`` to a complete order, and what is checked before searching."""

from collections.abc import Sequence
from dataclasses import dataclass

from optimiser.cli.band_options import MOST_SEED, record_for
from optimiser.cli.find_options import Rank, StageChoice
from optimiser.cli.inputs import Given, check_clicks, read_given, short_name
from optimiser.cli.options import CircuitChoice
from optimiser.cli.wish_options import FITTED, wanted_from
from optimiser.damper import Direction
from optimiser.faults import BadInput, NothingBuildable
from optimiser.files import read_stack, read_stock
from optimiser.fit_records import spread_of
from optimiser.fitting.spread import USUAL_WITHIN
from optimiser.prediction import Setup
from optimiser.results import (
    SavedBands,
    SavedCircuit,
    SavedInput,
    SavedOrder,
    SavedTarget,
    post_mm,
)
from optimiser.search.evaluate import ModelEvaluator, middle_clicks
from optimiser.search.extremes import limits_of
from optimiser.search.find import Order
from optimiser.search.obstacles import obstacles
from optimiser.search.repair import Repair
from optimiser.search.rules import Limits
from optimiser.search.space import Space
from optimiser.stack import Stack
from optimiser.stock import BORE_PLAY_MM, Stock
from optimiser.wanted.feasible import Limits as Envelope
from optimiser.wanted.feasible import feasibility
from optimiser.wanted.said import Said
from optimiser.wanted.target import Target

FEWEST_EVALUATIONS, MOST_EVALUATIONS = 100, 100_000_000
MOST_ROWS = 100
MOST_WORKERS = 64


@dataclass(frozen=True)
class Asked:
    """The options of ``find`` that do not say what is wanted; lengths mm."""

    damper: str
    steel: str | None
    oil: str | None
    oil_temp_c: float | None
    circuit: CircuitChoice | None
    stock: str
    revalve: bool
    clicks: int | None
    click_range: str | None
    parts: int
    face_min: int
    stages: StageChoice
    height_min_mm: float | None
    height_max_mm: float | None
    rank_by: Rank
    rows: int
    seed: int
    evaluations: int
    bands: bool = False
    within_percent: float | None = None

    @property
    def banded(self) -> bool:
        """Whether bands are wanted."""
        return self.bands or self.rank_by is Rank.chance


def check_numbers(asked: Asked, workers: int | None) -> None:
    """Raise BadInput with everything that can be seen without reading a file."""
    bounds = [
        ("--rows", asked.rows, 1, MOST_ROWS),
        ("--seed", asked.seed, 0, MOST_SEED),
        ("--evaluations", asked.evaluations, FEWEST_EVALUATIONS, MOST_EVALUATIONS),
        ("--workers", workers, 1, MOST_WORKERS),
    ]
    faults = [
        f"{option} is {value}; allowed: {low} to {high}"
        for option, value, low, high in bounds
        if value is not None and not low <= value <= high
    ]
    for option, height in (
        ("--height-min-mm", asked.height_min_mm),
        ("--height-max-mm", asked.height_max_mm),
    ):
        if height is not None and not 0.0 <= height <= 100.0:
            faults.append(f"{option} is {height:g}; allowed: 0 to 100 mm")
    if asked.within_percent is not None and not 0.0 < asked.within_percent <= 100.0:
        faults.append(f"--within is {asked.within_percent:g}; allowed: above 0 up to 100 %")
    if asked.within_percent is not None and not asked.banded:
        faults.append("--within needs a band; allowed: beside --bands or --rank-by chance")
    if asked.clicks is not None and asked.click_range is not None:
        faults.append("--clicks and --click-range both say where the adjuster is; allowed: one")
    for check in (lambda: _limits(asked), lambda: _parse_range(asked.click_range)):
        try:
            check()
        except BadInput as error:
            faults += error.faults
    if faults:
        raise BadInput(faults)


def order_of(said: Said, asked: Asked) -> SavedOrder:
    """The complete order. Raises BadInput with every fault that can be told at once."""
    given, stock = _read(asked)
    try:
        setups, wished = wanted_from(said, given, _circuit(said, asked.circuit, given))
    except BadInput as error:
        # there, --clicks is the setting the fitted stack is taken at
        raise BadInput(
            fault.replace("--clicks", "--fitted-clicks") for fault in error.faults
        ) from None
    given.add_file("stock", asked.stock)
    ranges = _click_ranges(asked, setups)
    fitted = _fitted(said, asked, setups)
    limits = _limits(asked)
    banded = _bands(asked, given, setups)
    return SavedOrder(
        damper=given.damper,
        steel=given.steel,
        oil=given.oil,
        oil_temp_c=given.oil_temp_c,
        stock_name=short_name(asked.stock),
        stock=stock.items,
        circuits=tuple(
            SavedCircuit(
                direction=setup.direction,
                target=SavedTarget.of(target),
                fitted=fitted.get(setup.direction),
                click_range=clicks,
                bands=banded.get(setup.direction),
            )
            for setup, target, clicks in zip(setups, wished.targets, ranges, strict=True)
        ),
        parts=limits.parts,
        face_min=limits.face_min,
        stages=limits.stages,
        height_min_mm=limits.height_min_mm,
        height_max_mm=limits.height_max_mm,
        rank_by=asked.rank_by.value,
        rows=asked.rows,
        seed=asked.seed,
        evaluations=asked.evaluations,
        notes=wished.notes,
        inputs=tuple(SavedInput(**vars(file)) for file in given.files),
    )


def _bands(asked: Asked, given: Given, setups: Sequence[Setup]) -> dict[Direction, SavedBands]:
    """What bands are drawn from, by direction; empty where none are wanted. Raises BadInput."""
    if not asked.banded:
        return {}
    within = USUAL_WITHIN if asked.within_percent is None else asked.within_percent
    record = record_for(given, asked.damper)
    return {setup.direction: SavedBands.of(spread_of(setup, record), within) for setup in setups}


def _read(asked: Asked) -> tuple[Given, Stock]:
    """Damper, steel, oil and stock. Raises BadInput with the faults of all files."""
    faults: list[str] = []
    stock = Stock()
    try:
        stock = read_stock(asked.stock)
    except BadInput as error:
        faults += error.faults
    try:
        given = read_given(asked.damper, asked.steel, asked.oil, asked.oil_temp_c)
    except BadInput as error:
        raise BadInput([*error.faults, *faults]) from None
    if faults:
        raise BadInput(faults)
    return given, stock


def check_buildable(order: SavedOrder) -> None:
    """Raise NothingBuildable, with the rule that stops it, where no stack can be built at all."""
    barred = []
    for one in order.orders():
        reason = _nothing_fits(one, order) or _nothing_possible(one)
        if reason is not None:
            barred.append(f"{one.setup.direction}: {reason}")
    if barred:
        raise NothingBuildable("\n".join(barred))


def check_within_reach(order: SavedOrder) -> None:
    """Raise BadInput for a target so far off that it must be a mistake."""
    far = []
    for one in order.orders():
        sentence = _far_outside(one)
        if sentence is not None:
            far.append(f"{one.target.origin}, {one.setup.direction}: {sentence}")
    if far:
        raise BadInput(far)


def _nothing_fits(order: Order, saved: SavedOrder) -> str | None:
    """Why no shim goes on the post, if none does."""
    post = post_mm(order.setup)
    if order.fitted is not None or any(line.quantity for line in order.lines):
        return None
    if order.lines:
        return f"{saved.stock_name}: every shim for the {post:g} mm post has quantity 0."
    bores = sorted({item.inner_mm for item in saved.stock})
    listed = ", ".join(f"{bore:g}" for bore in bores) or "none"
    return (
        f"{saved.stock_name}: no shim fits the {post:g} mm post of {order.setup.damper.name}; "
        f"bores in stock: {listed} mm; allowed: {post:g} to {post + BORE_PLAY_MM:g} mm."
    )


def _nothing_possible(order: Order) -> str | None:
    space = _space(order)
    return None if Repair(space).possible else " ".join(obstacles(space))


def _far_outside(order: Order) -> str | None:
    quick = ModelEvaluator(order.setup, _space(order), order.target)
    envelope = limits_of(quick, order.target)
    sentence = feasibility(order.target, envelope).far_outside
    if sentence is None:
        return None
    return f"{sentence} ({_in_numbers(order.target, envelope)})"


def _in_numbers(target: Target, envelope: Envelope) -> str:
    middle = len(target) // 2
    return (
        f"at {target.velocity_m_s[middle]:g} m/s {target.force_n[middle]:g} N is wanted, this "
        f"stock makes {envelope.softest_n[middle]:.0f} to {envelope.firmest_n[middle]:.0f} N"
    )


def _space(order: Order) -> Space:
    return Space.of(order.lines, order.setup.valve, order.limits, order.fitted)


def _circuit(said: Said, asked: CircuitChoice | None, given: Given) -> CircuitChoice:
    """The direction asked for; else both where two files are given, else the damper's first."""
    if asked is not None:
        return asked
    if any(len(names) > 1 for names in (said.targets, said.copies, said.fitted)):
        return CircuitChoice.both
    return CircuitChoice(given.directions()[0])


def _limits(asked: Asked) -> Limits:
    """What the user allows. Raises BadInput that names the options."""
    stages = {StageChoice.one: (1,), StageChoice.two: (2,), StageChoice.both: (1, 2)}
    try:
        return Limits(
            asked.parts,
            asked.face_min,
            stages[asked.stages],
            asked.height_min_mm,
            asked.height_max_mm,
        )
    except BadInput as error:
        raise BadInput(
            "--" + fault.replace("face_min:", "face-min:", 1) for fault in error.faults
        ) from None


def _click_ranges(asked: Asked, setups: Sequence[Setup]) -> list[tuple[int, int]]:
    """First and last click allowed in every direction. Raises BadInput."""
    check_clicks(setups, asked.clicks)
    if asked.clicks is not None:
        return [(asked.clicks, asked.clicks)] * len(setups)
    wanted = _parse_range(asked.click_range)
    if wanted is None:
        return [middle_clicks(setup) for setup in setups]
    faults = [
        f"--click-range is {asked.click_range} for {setup.direction}; "
        + (
            f"allowed: within 0 (closed) to {setup.clicks_range} (open)"
            if setup.clicks_range
            else "this valve has no adjuster: leave --click-range out"
        )
        for setup in setups
        if wanted[1] > setup.clicks_range
    ]
    if faults:
        raise BadInput(faults)
    return [wanted] * len(setups)


def _parse_range(text: str | None) -> tuple[int, int] | None:
    """``A-B`` as two clicks. Raises BadInput."""
    if text is None:
        return None
    first, dash, last = text.partition("-")
    if dash and first.strip().isdecimal() and last.strip().isdecimal():
        low, high = int(first), int(last)
        if low <= high:
            return low, high
    raise BadInput(f"--click-range is '{text}'; allowed: two clicks, the lower first, such as 4-12")


def _fitted(said: Said, asked: Asked, setups: Sequence[Setup]) -> dict[Direction, Stack]:
    """The stacks to revalve from; empty outside revalve mode."""
    if said.fitted:
        names = said.fitted
    elif asked.revalve:
        names = (FITTED,) * len(setups)
    else:
        return {}
    stacks: dict[Direction, Stack] = {}
    for name, setup in zip(names, setups, strict=True):
        stack = setup.valve.fitted if name == FITTED else read_stack(name)
        if stack is None:
            raise TypeError(f"valve '{setup.valve.name}' is searched but has no shims")
        stacks[setup.direction] = stack
    return stacks
