"""Which few extra sizes bring the cells that are out of tolerance into it.

First every size that can be bought is tried by small changes of each cell's best stacks with the
quick model; then the most promising are put into the drawer and the cells searched again. One size
is looked at alone, then the best of them together with each other one.
"""

from collections.abc import Iterable, Mapping, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass, replace
from itertools import pairwise
from time import perf_counter
from typing import Any, Generic, Protocol, TypeVar

import numpy as np

from optimiser.damper import Valve
from optimiser.faults import NothingBuildable
from optimiser.search.find import Order
from optimiser.search.sizes import Ints, Sizes, StockLine
from optimiser.stack import Shim, Stack
from optimiser.stock import SAME_DIAMETER_MM, SAME_THICKNESS_MM, Stock, StockItem
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.judge import Judge
from optimiser.tuning.project import projected
from optimiser.tuning.runner import Journal, Step, carry_out
from optimiser.tuning.steps import Known
from optimiser.tuning.tasks import Result, SearchTask, fingerprint_of, order_record

#: Pieces of a size there would be after buying it.
ENOUGH = 6
#: Sizes searched for in earnest, how many may be bought together, and sets tried as a whole.
SHORTLIST, TOGETHER, BUNDLES = 6, 3, 4
#: A size that brings no cell into tolerance must lower the mean error by so much, points.
WORTH = 0.05
#: Stacks tried in a cell with a size put in.
EVALUATIONS = 800
#: Stacks of a cell that are changed by one shim, and those a search begins from.
CHANGED, BEGIN_WITH = 3, 8
#: Thicknesses of shims as sold, mm (common practice, no source).
USUAL_MM = (0.10, 0.15, 0.20, 0.25, 0.30)
_STEP_MM, _LEAST_WALL_MM = 2.0, 2.0


class _Ordered(Protocol):
    def __lt__(self, other: Any, /) -> bool:
        """Whether it comes first."""


K = TypeVar("K", bound=_Ordered)


@dataclass(frozen=True)
class Need:
    """A cell out of tolerance: its order (``lines`` what it can have now) and what it found."""

    order: Order
    post_mm: float
    candidates: tuple[Candidate, ...]
    error_percent: float


@dataclass(frozen=True)
class Purchase(Generic[K]):
    """Sizes to buy together, and the errors then, %, of the cells that were out of tolerance.

    ``pieces`` of each size: the most that one of the cells takes of it, at least 1.
    """

    sizes: tuple[Shim, ...]
    pieces: tuple[int, ...]
    error_percent: Mapping[K, float]
    fixed: tuple[K, ...]

    @property
    def fixed_per_size(self) -> float:
        """Cells brought into tolerance for each size bought."""
        return len(self.fixed) / len(self.sizes)

    @property
    def mean_percent(self) -> float:
        """Mean error of the cells that were out of tolerance, %."""
        return float(np.mean(list(self.error_percent.values())))


def need_of(order: Order, post_mm: float, executor: Executor, journal: Journal) -> Need:
    """A single search as a cell: what its drawer gives. Raises NothingBuildable.

    ``post_mm`` the valve's post.
    """
    found = carry_out({0: Step[int]((), Known(SearchTask(order)))}, executor, journal)[0]
    if not found.candidates:
        raise NothingBuildable(found.reason or "no stack can be built")
    return Need(order, post_mm, found.candidates, found.candidates[0].error_percent)


def usual_sizes(valves: Iterable[Valve]) -> Stock:
    """Every 2 mm of outer diameter in the usual thicknesses, for the posts of some valves."""
    items: dict[tuple[float, float, float], StockItem] = {}
    for valve in valves:
        if valve.post is None or valve.seat is None:
            continue
        bore = valve.post.post_mm
        widest = min(valve.post.clearance_mm, valve.seat.cover_mm + 4.0 * _STEP_MM)
        narrowest = _STEP_MM * np.ceil((bore + 2.0 * _LEAST_WALL_MM) / _STEP_MM)
        for outer in np.arange(narrowest, widest + 1e-6, _STEP_MM):
            for thickness in USUAL_MM:
                items[bore, outer, thickness] = StockItem(float(outer), bore, thickness, ENOUGH)
    return Stock(items.values())


@dataclass(frozen=True)
class ScreenTask:
    """Single changes of a cell's best stacks that use one size beyond the drawer."""

    order: Order
    stacks: tuple[Stack, ...]
    extras: tuple[StockItem, ...]

    @property
    def key(self) -> str:
        """Fingerprint of everything the answer depends on."""
        stacks = [stack.lines() for stack in self.stacks]
        extras = [vars(item) for item in self.extras]
        return fingerprint_of("screen", order_record(self.order), stacks, extras)

    def run(self) -> Result:
        """For every such size the best stack by the quick model, least error first.

        The clamp shims may be any: the curve does not depend on their thickness, and the search
        that follows chooses them anew.
        """
        began = perf_counter()
        judge = Judge(replace(self.order, lines=(*self.order.lines, *self.extras)), self.stacks[0])
        plans = judge.changed(self.stacks)
        counts = judge.space.decode(plans)
        used = counts.pieces.sum(axis=1)
        crossed = np.flatnonzero(counts.two_stage)
        used[crossed, counts.crossover[crossed]] += 1
        beyond = used > _had(judge.space.sizes, self.order)
        plans, beyond = plans[beyond.sum(axis=1) == 1], beyond[beyond.sum(axis=1) == 1]
        if len(plans) == 0:
            return Result((), judge.evaluations, perf_counter() - began)
        scores = judge.scores(plans)
        ranked = judge.ranked(scores)
        first = np.sort(np.unique(beyond[ranked].argmax(axis=1), return_index=True)[1])
        best = [judge.quick(plans[row], scores, int(row)) for row in ranked[first]]
        return Result(tuple(best), judge.evaluations, perf_counter() - began)


def what_to_buy(
    needs: Mapping[K, Need],
    buyable: Stock,
    tolerance_percent: float,
    executor: Executor,
    journal: Journal,
) -> tuple[Purchase[K], ...]:
    """Purchases that help, the most cells fixed per size first, then the least error.

    ``needs`` the cells out of tolerance; empty when no size helps any of them.
    """
    extras = {place: lacking(need, buyable) for place, need in needs.items()}
    screened = _screened(needs, extras, executor, journal)
    trials = _Trials(needs, screened, extras, tolerance_percent, executor, journal)
    wanted = _shortlist(needs, screened, extras, tolerance_percent)
    found: list[Purchase[K]] = []
    found += trials.purchases(_bundles(needs, screened, extras))
    base: tuple[Shim, ...] = ()
    before = float(np.mean([need.error_percent for need in needs.values()] or [0.0]))
    fixed, mean = 0, before
    for _ in range(TOGETHER):
        tried = trials.purchases([(*base, shim) for shim in wanted if shim not in base])
        better = [one for one in tried if len(one.fixed) > fixed or one.mean_percent < mean - WORTH]
        if not better:
            break
        found += better
        leader = min(better, key=_rank)
        base, fixed, mean = leader.sizes, len(leader.fixed), leader.mean_percent
        if len(leader.fixed) == len(needs):
            break
    helpful = [one for one in found if one.fixed or one.mean_percent < before - WORTH]
    return tuple(sorted({one.sizes: one for one in helpful}.values(), key=_rank))


def lacking(need: Need, buyable: Stock) -> tuple[StockItem, ...]:
    """The sizes to buy of which a cell has fewer than ``ENOUGH``, with the pieces missing."""
    found = []
    for item in buyable.for_post(need.post_mm):
        have = [line for line in need.order.lines if _same(line.outer_mm, line.thickness_mm, item)]
        missing = ENOUGH - sum(line.quantity for line in have)
        if missing > 0:
            real = have[0].real_mm if have else None
            found.append(replace(item, quantity=missing, measured_mm=real, bin=None))
    return tuple(found)


def _screened(
    needs: Mapping[K, Need],
    extras: Mapping[K, tuple[StockItem, ...]],
    executor: Executor,
    journal: Journal,
) -> dict[K, tuple[Candidate, ...]]:
    """Stacks of each cell that use sizes to buy: one change away, and with all of them there."""
    steps: dict[tuple[str, K], Step[tuple[str, K]]] = {}
    for place, need in needs.items():
        if not extras[place]:
            continue
        begin = _diverse(need.candidates)
        every = replace(need.order, lines=(*need.order.lines, *extras[place]))
        screen = ScreenTask(need.order, begin[:CHANGED], extras[place])
        steps["one", place] = Step((), Known(screen))
        steps["all", place] = Step((), Known(SearchTask(replace(every, start=()))))
    found = carry_out(steps, executor, journal)
    empty = Result(())
    return {
        place: tuple(
            one for kind in ("one", "all") for one in found.get((kind, place), empty).candidates
        )
        for place in needs
    }


def _diverse(candidates: Sequence[Candidate]) -> tuple[Stack, ...]:
    """Stacks to begin from: the best of each number of stages, then the best of all."""
    leaders: dict[int, Candidate] = {}
    for one in candidates:
        leaders.setdefault(_stages(one.stack), one)
    rest = [one for one in candidates if one not in leaders.values()]
    return _stacks([*leaders.values(), *rest], BEGIN_WITH)


def _stages(stack: Stack) -> int:
    """1 for a plain taper, 2 where it widens again behind a crossover shim."""
    outer = [shim.outer_mm for shim in stack.bending]
    return 1 + any(after > before for before, after in pairwise(outer))


class _Trials(Generic[K]):
    """Searches with sizes put into the drawer."""

    def __init__(
        self,
        needs: Mapping[K, Need],
        screened: Mapping[K, tuple[Candidate, ...]],
        extras: Mapping[K, tuple[StockItem, ...]],
        tolerance_percent: float,
        executor: Executor,
        journal: Journal,
    ) -> None:
        self._needs, self._screened, self._extras = needs, screened, extras
        self._tolerance = tolerance_percent
        self._executor, self._journal = executor, journal
        self._known: dict[tuple[Shim, ...], dict[K, Candidate]] = {}

    def purchases(self, sets: Sequence[tuple[Shim, ...]]) -> list[Purchase[K]]:
        """What each of the sets of sizes would do; all but a set's last size were tried before."""
        steps: dict[tuple[tuple[Shim, ...], K], Step[tuple[tuple[Shim, ...], K]]] = {}
        for sizes in sets:
            self._known[sizes] = dict(self._known.get(sizes[:-1], {}))
            for place, need in self._needs.items():
                items = [item for item in self._extras[place] if _shim(item) in sizes]
                if items and self._promising(place, sizes):
                    steps[sizes, place] = Step((), Known(self._search(place, need, sizes, items)))
        results = carry_out(steps, self._executor, self._journal)
        for (sizes, place), result in results.items():
            best = [*result.candidates[:1], *self._known_of(sizes, place)]
            if best:
                self._known[sizes][place] = min(best, key=lambda one: (not one.sound, *one.order))
        return [self._purchase(sizes) for sizes in sets]

    def _promising(self, place: K, sizes: tuple[Shim, ...]) -> bool:
        """Not good enough without the last size, which the quick model found a use for."""
        before = self._known_of(sizes, place)
        if before and before[0].sound and before[0].error_percent <= self._tolerance:
            return False
        limit = self._needs[place].error_percent
        return any(one.error_percent < limit for one in self._using(place, sizes[-1]))

    def _known_of(self, sizes: tuple[Shim, ...], place: K) -> list[Candidate]:
        known = self._known[sizes].get(place)
        return [] if known is None else [known]

    def _using(self, place: K, shim: Shim) -> list[Candidate]:
        """Screened stacks of a cell that use a size beyond what it has."""
        order = self._needs[place].order
        return [one for one in self._screened[place] if shim in beyond(order, one.stack)]

    def _search(
        self, place: K, need: Need, sizes: tuple[Shim, ...], items: Sequence[StockItem]
    ) -> SearchTask:
        """The cell's search with the sizes bought, from the stacks that may use them."""
        lines = (*need.order.lines, *items)
        settings = replace(need.order.settings, evaluations=EVALUATIONS)
        fitting = [*self._known_of(sizes, place), *self._using(place, sizes[-1])]
        begin = [
            *_stacks(fitting, BEGIN_WITH),
            *self._made_to_fit(place, lines),
            *_stacks(need.candidates, BEGIN_WITH),
        ]
        return SearchTask(replace(need.order, lines=lines, settings=settings, start=tuple(begin)))

    def _made_to_fit(self, place: K, lines: Sequence[StockLine]) -> list[Stack]:
        """Stacks of every size there is to buy, made anew from these lines."""
        seat = self._needs[place].order.setup.valve.seat
        face_mm = seat.cover_mm if seat else 0.0
        ordered = sorted(self._screened[place], key=lambda one: (not one.sound, *one.order))
        made = [projected(one.stack, lines, face_mm) for one in ordered[:BEGIN_WITH]]
        return [stack for stack in made if stack is not None]

    def _purchase(self, sizes: tuple[Shim, ...]) -> Purchase[K]:
        best = self._known.get(sizes, {})
        errors = {
            place: min(need.error_percent, _error(best.get(place)))
            for place, need in self._needs.items()
        }
        fixed = [place for place, error in errors.items() if error <= self._tolerance]
        taken = [beyond(self._needs[place].order, one.stack) for place, one in best.items()]
        pieces = tuple(max([1, *(one.get(shim, 0) for one in taken)]) for shim in sizes)
        return Purchase(sizes, pieces, errors, tuple(sorted(fixed)))


def beyond(order: Order, stack: Stack) -> dict[Shim, int]:
    """Pieces of each size that a stack takes beyond the order's own lines."""
    had: dict[tuple[float, float], int] = {}
    for line in order.lines:
        had[line.outer_mm, line.thickness_mm] = (
            had.get((line.outer_mm, line.thickness_mm), 0) + line.quantity
        )
    used: dict[Shim, int] = {}
    for group in stack.groups:
        used[group.shim] = used.get(group.shim, 0) + group.quantity
    short = {
        shim: count - had.get((shim.outer_mm, shim.thickness_mm), 0) for shim, count in used.items()
    }
    return {shim: count for shim, count in short.items() if count > 0}


def _bundles(
    needs: Mapping[K, Need],
    screened: Mapping[K, tuple[Candidate, ...]],
    extras: Mapping[K, tuple[StockItem, ...]],
) -> list[tuple[Shim, ...]]:
    """Sets of a few sizes that single stacks of little error need together, best first."""
    errors: dict[tuple[Shim, ...], float] = {}
    for place, stacks in screened.items():
        buyable = {_shim(item) for item in extras[place]}
        for one in stacks:
            sizes = beyond(needs[place].order, one.stack).keys()
            if one.sound and 1 < len(sizes) <= TOGETHER and sizes <= buyable:
                ordered = tuple(sorted(sizes, key=_widest_first))
                ratio = one.error_percent / needs[place].error_percent
                errors[ordered] = min(errors.get(ordered, 1.0), ratio)
    return [sizes for sizes in sorted(errors, key=lambda k: errors[k]) if errors[sizes] < 1.0][
        :BUNDLES
    ]


def _shortlist(
    needs: Mapping[K, Need],
    screened: Mapping[K, tuple[Candidate, ...]],
    extras: Mapping[K, tuple[StockItem, ...]],
    tolerance_percent: float,
) -> list[Shim]:
    """Sizes that fix the most cells by the quick model, then those that lower errors most."""
    gains: dict[Shim, tuple[float, float]] = {}
    for place, stacks in screened.items():
        buyable = {_shim(item) for item in extras[place]}
        for candidate in stacks:
            gain = max(needs[place].error_percent - candidate.error_percent, 0.0)
            fixed = float(candidate.error_percent <= tolerance_percent)
            sizes = beyond(needs[place].order, candidate.stack).keys() & buyable
            for shim in sizes:
                share = 1.0 / (len(sizes) * len(stacks))
                old = gains.get(shim, (0.0, 0.0))
                gains[shim] = old[0] + share * fixed, old[1] + share * gain
    ranked = sorted(
        gains, key=lambda shim: (-gains[shim][0], -gains[shim][1], shim.outer_mm, shim.thickness_mm)
    )
    return [shim for shim in ranked if gains[shim][1] > 0.0][:SHORTLIST]


def _rank(purchase: Purchase[K]) -> tuple[float, float, int, tuple[Shim, ...]]:
    return (
        -purchase.fixed_per_size,
        round(purchase.mean_percent, 6),
        len(purchase.sizes),
        tuple(replace(shim, inner_mm=0.0) for shim in purchase.sizes),
    )


def _had(sizes: Sizes, order: Order) -> Ints:
    """(sizes,) pieces that the order's own lines have of each size."""
    had: dict[tuple[float, float, float], int] = {}
    for line in order.lines:
        key = line.outer_mm, line.thickness_mm, line.real_mm
        had[key] = had.get(key, 0) + line.quantity
    keys = zip(sizes.outer_mm, sizes.nominal_mm, sizes.thickness_mm, strict=True)
    return np.array(
        [had.get((float(a), float(b), float(c)), 0) for a, b, c in keys], dtype=np.int64
    )


def _stacks(candidates: Sequence[Candidate], most: int) -> tuple[Stack, ...]:
    return tuple(one.stack for one in candidates[:most])


def _widest_first(shim: Shim) -> tuple[float, float]:
    return -shim.outer_mm, -shim.thickness_mm


def _shim(item: StockItem) -> Shim:
    return Shim(item.outer_mm, item.thickness_mm)


def _same(outer_mm: float, thickness_mm: float, item: StockItem) -> bool:
    return (
        abs(outer_mm - item.outer_mm) <= SAME_DIAMETER_MM
        and abs(thickness_mm - item.thickness_mm) <= SAME_THICKNESS_MM
    )


def _error(candidate: Candidate | None) -> float:
    return float("inf") if candidate is None or not candidate.sound else candidate.error_percent
