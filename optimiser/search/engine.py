"""The search: one small interface over enumeration, generations and the local pass."""

from collections.abc import Iterable
from dataclasses import dataclass, field
from time import perf_counter

import numpy as np

from optimiser.faults import NothingBuildable
from optimiser.search.archive import Archive
from optimiser.search.budget import Budget, Progress, ProgressCall, StopCall
from optimiser.search.counts import Plans
from optimiser.search.enumerate import all_plans
from optimiser.search.evaluator import Evaluator
from optimiser.search.obstacles import obstacles
from optimiser.search.operators import sample
from optimiser.search.polish import Effort, Polish
from optimiser.search.repair import Repair
from optimiser.search.sizes import Ints
from optimiser.search.space import Space
from optimiser.stack import Stack

_BATCH = 2048


@dataclass(frozen=True)
class Settings:
    """How a search spends its evaluations.

    ``evaluations`` is the most stacks tried. A space of at most ``enumerate_up_to`` stacks (and
    no more than the evaluations) is tried out completely instead. The generations take at most
    ``generations_share`` of the evaluations, ``generations`` rounds, and end when the front has
    not moved for ``patience`` rounds. ``rise_max`` is the edge rise over thickness up to which
    the model was checked.
    """

    evaluations: int = 60_000
    population: int = 200
    generations: int = 100
    patience: int = 30
    generations_share: float = 0.5
    enumerate_up_to: int = 50_000
    rise_max: float = 2.0
    effort: Effort = field(default_factory=Effort)


@dataclass(frozen=True)
class Seconds:
    """Where the time went, s: the model, the library and operators, and the rest."""

    model: float
    library: float
    rest: float

    @property
    def total(self) -> float:
        """All of it, s."""
        return self.model + self.library + self.rest


@dataclass(frozen=True)
class Outcome:
    """What a search found; ``complete`` means every buildable stack was tried."""

    archive: Archive
    generations: int
    evaluations: int
    complete: bool
    cut_short: bool
    seconds: Seconds

    @property
    def front(self) -> Ints:
        """Rows of the archive's front."""
        return self.archive.front()


class Search:
    """Looks for stacks of a space that an evaluator finds good.

    The same seed gives the same archive, whatever the number of threads the evaluator uses.
    ``start`` are stacks to begin from, such as those of a similar task; ones the space cannot
    hold are passed over. The space's fitted stack always takes part.
    """

    def __init__(
        self,
        space: Space,
        evaluator: Evaluator,
        seed: int = 0,
        settings: Settings | None = None,
        start: Iterable[Stack] = (),
    ) -> None:
        self.space = space
        self.seed = seed
        self.settings = settings or Settings()
        self._evaluator = evaluator
        self._start = [*start, *([space.fitted] if space.fitted else [])]

    def run(self, progress: ProgressCall | None = None, stop: StopCall | None = None) -> Outcome:
        """Search until nothing helps, the evaluations are spent or ``stop()`` turns true.

        ``progress`` is called between batches. Raises NothingBuildable, saying which rule is
        the reason, when no stack can be built.
        """
        began = perf_counter()
        settings = self.settings
        archive = Archive(self.space, self._evaluator, settings.rise_max)
        budget = Budget(archive, settings.evaluations, progress or _quiet, stop or _never)
        budget.report("counting")
        repair = Repair(self.space)
        if not repair.possible:
            raise NothingBuildable(" ".join(obstacles(self.space)))
        every = all_plans(self.space, min(settings.enumerate_up_to, settings.evaluations))
        library = 0.0
        if every is not None:
            _try_all(every, budget)
        else:
            library = self._generations(archive, repair, budget)
            Polish(archive, budget, np.random.default_rng((self.seed, 2)), settings.effort).run()
        rest = perf_counter() - began - archive.model_seconds - library
        return Outcome(
            archive,
            budget.generation,
            len(archive),
            every is not None and not budget.cut_short,
            budget.cut_short,
            Seconds(archive.model_seconds, library, rest),
        )

    def _generations(self, archive: Archive, repair: Repair, budget: Budget) -> float:
        from optimiser.search.library import evolve  # pymoo takes 0.4 s to load

        settings = self.settings
        share = settings.generations_share * settings.evaluations
        most = min(settings.population, settings.evaluations)
        population = int(min(max(share / 20, 16), most))
        rounds = int(min(settings.generations, max(share / population, 1)))
        first = self._first(repair, population)
        return evolve(archive, repair, first, budget, self.seed, rounds, settings.patience)

    def _first(self, repair: Repair, count: int) -> Plans:
        """A first population: the stacks to start from, the rest sampled."""
        rng = np.random.default_rng((self.seed, 1))
        given = [self.space.from_stack(stack) for stack in self._start]
        known = [plan for plan in given if plan is not None]
        sampled = sample(repair, count, rng)
        if not known:
            return sampled
        return np.concatenate([np.stack(known), sampled])[: max(count, len(known))]


def _try_all(plans: Plans, budget: Budget) -> None:
    for start in range(0, len(plans), _BATCH):
        if not budget.goes_on():
            return
        budget.archive.rows(plans[start : start + _BATCH])
        budget.report("every stack")


def _quiet(progress: Progress) -> None:
    """Report to nobody."""


def _never() -> bool:
    return False
