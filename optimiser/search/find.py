"""The inverse search of one circuit, from order to ranked proposals."""

from dataclasses import dataclass, field, replace
from time import perf_counter

import numpy as np

from optimiser.mechanics.deflect import RISE_LIMIT
from optimiser.prediction import Prediction, Setup, predict
from optimiser.search.archive import Archive
from optimiser.search.budget import Budget, Progress, ProgressCall, StopCall
from optimiser.search.engine import Outcome, Search, Settings
from optimiser.search.evaluate import ModelEvaluator, middle_clicks
from optimiser.search.evaluator import evaluate_in_parallel
from optimiser.search.extremes import limits_of
from optimiser.search.final import ReportedEvaluator, corrected
from optimiser.search.polish import Polish
from optimiser.search.rank import RankBy, Ranked, rank, worth_checking
from optimiser.search.rules import Limits as BuildLimits
from optimiser.search.sizes import Floats, StockLine
from optimiser.search.space import Space
from optimiser.stack import Stack
from optimiser.wanted.bands import BandErrors, band_errors
from optimiser.wanted.feasible import Feasibility, Limits, feasibility
from optimiser.wanted.target import Target, Worst

#: Plans judged at the `reported` fidelity, after the search and once more after the correction.
CHECKED = 40


@dataclass(frozen=True)
class Order:
    """What to look for: a target in a damper, from a stock.

    ``lines`` what is in stock for this post; ``fitted`` turns on revalve mode; ``click_range``
    (first, last) allowed clicks, by default the middle half; ``rows`` proposals wanted; ``start``
    stacks to begin from.
    """

    setup: Setup
    target: Target
    lines: tuple[StockLine, ...]
    fitted: Stack | None = None
    limits: BuildLimits = field(default_factory=BuildLimits)
    click_range: tuple[int, int] | None = None
    rank_by: RankBy = "default"
    rows: int = 8
    seed: int = 0
    workers: int = 1
    settings: Settings = field(default_factory=Settings)
    start: tuple[Stack, ...] = ()


@dataclass(frozen=True, eq=False)
class Proposal:
    """One stack that can be built, as predicted at the `reported` fidelity.

    ``stack`` in nominal thicknesses, ``real_stack`` as measured, clamp shims included; forces at
    the target's velocities. ``changed`` shims put in and taken out, None without a fitted stack.
    """

    stack: Stack
    real_stack: Stack
    clicks: int
    force_n: Floats
    error_percent: float
    worst: Worst
    bands: BandErrors
    utilisation: float
    rise: float
    changed: int | None
    variants: int

    @property
    def parts(self) -> int:
        """Number of shims."""
        return self.stack.parts

    @property
    def sizes(self) -> int:
        """Number of distinct sizes."""
        return len({group.shim for group in self.stack.groups})

    @property
    def outside_model(self) -> bool:
        """The edge rises further than the model was checked for."""
        return self.rise > RISE_LIMIT


@dataclass(frozen=True, eq=False)
class Found:
    """What a search came to, best proposal first."""

    order: Order
    proposals: tuple[Proposal, ...]
    limits: Limits
    feasibility: Feasibility
    evaluations: int
    complete: bool
    cut_short: bool
    seconds: float
    seconds_model: float
    seconds_library: float

    def details(self, place: int = 0) -> Prediction:
        """Full prediction of a proposal at the target's velocities."""
        proposal = self.proposals[place]
        return predict(
            self.order.setup, proposal.real_stack, self.order.target.velocity_m_s, proposal.clicks
        )


def find(order: Order, progress: ProgressCall | None = None, stop: StopCall | None = None) -> Found:
    """Search, polish and re-evaluate. Raises NothingBuildable and BadInput.

    ``progress`` is called between batches; ``stop`` ends the search early when it turns true. The
    same order and seed give the same answer for any number of workers.
    """
    began = perf_counter()
    setup, target = order.setup, order.target
    space = Space.of(order.lines, setup.valve, order.limits, order.fitted)
    clicks = order.click_range or middle_clicks(setup)
    quick = ModelEvaluator(setup, space, target, clicks)
    evaluator = evaluate_in_parallel(quick, order.workers)
    outcome = Search(space, evaluator, order.seed, order.settings, order.start).run(progress, stop)
    reported = ReportedEvaluator(setup, space, target, clicks, order.workers)
    checked = Archive(space, reported, order.settings.rise_max)
    middle = 0.5 * setup.clicks_range if setup.clicks_range else None
    checked.rows(worth_checking(outcome.archive, CHECKED, middle))
    archives = [outcome.archive, checked]
    cut_short = outcome.cut_short
    if not cut_short:
        polished, cut_short = _polish_corrected(
            order, quick, checked, reported, outcome, progress, stop
        )
        checked.rows(worth_checking(polished, CHECKED, middle))
        archives.append(polished)
    limits = limits_of(quick, target)
    ranked = rank(checked, order.rank_by, order.rows, middle)
    return Found(
        order,
        tuple(_proposal(order, space, reported, row) for row in ranked),
        limits,
        feasibility(target, limits),
        sum(len(archive) for archive in archives),
        outcome.complete,
        cut_short,
        perf_counter() - began,
        sum(archive.model_seconds for archive in archives),
        outcome.seconds.library,
    )


def _proposal(order: Order, space: Space, reported: ReportedEvaluator, row: Ranked) -> Proposal:
    final = reported.final(row.plan)
    return Proposal(
        row.stack,
        space.to_stack(row.plan, real=True),
        final.clicks,
        final.force_n,
        100.0 * row.error,
        order.target.worst(final.force_n),
        band_errors(order.target, final.force_n),
        row.utilisation,
        row.rise,
        row.changed if order.fitted is not None else None,
        row.variants,
    )


def _polish_corrected(
    order: Order,
    quick: ModelEvaluator,
    checked: Archive,
    reported: ReportedEvaluator,
    outcome: Outcome,
    progress: ProgressCall | None,
    stop: StopCall | None,
) -> tuple[Archive, bool]:
    """A local pass of the quick model on the target corrected by what the fine model said, and
    whether it was cut short."""
    rows = checked.front()
    best = checked.plans[rows[np.argmin(checked.objectives[rows, 0])]]
    force = reported.final(best).force_n
    target = corrected(order.target, quick.forces(best[None])[0], force)
    evaluator = evaluate_in_parallel(quick.with_target(target), order.workers)
    archive = Archive(quick.space, evaluator, order.settings.rise_max)
    spent = outcome.evaluations

    def report(told: Progress) -> None:
        if progress:
            progress(replace(told, evaluations=spent + told.evaluations))

    most = max(order.settings.evaluations // 5, 500)
    budget = Budget(archive, most, report, stop or (lambda: False))
    archive.rows(checked.plans.copy())
    rng = np.random.default_rng((order.seed, 3))
    Polish(archive, budget, rng, replace(order.settings.effort, runners_up=10)).run()
    return archive, budget.cut_short


def exchanged(one: Stack, other: Stack) -> int:
    """Shims to take out plus shims to put in, from one stack to another."""
    counts: dict[object, int] = {}
    for stack, sign in ((one, 1), (other, -1)):
        for group in stack.groups:
            counts[group.shim] = counts.get(group.shim, 0) + sign * group.quantity
    return sum(abs(count) for count in counts.values())
