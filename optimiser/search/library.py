"""The only module that touches pymoo: NSGA-II around our own sampling and operators.

It is imported when a search starts, because pymoo takes 0.4 s to load.
"""

from time import perf_counter
from typing import Any

import numpy as np
from pymoo.algorithms.moo.nsga2 import NSGA2
from pymoo.config import Config
from pymoo.core.infill import InfillCriterion
from pymoo.core.population import Population
from pymoo.core.problem import Problem
from pymoo.core.termination import Termination
from pymoo.termination.ftol import MultiObjectiveSpaceTermination
from pymoo.termination.max_gen import MaximumGenerationTermination
from pymoo.termination.robust import RobustTermination

from optimiser.search.archive import Archive
from optimiser.search.budget import Budget
from optimiser.search.counts import Plans
from optimiser.search.operators import Mutation, offspring
from optimiser.search.repair import Random, Repair
from optimiser.search.sizes import Floats, Ints

Config.warnings["not_compiled"] = False  # its notice would be printed to standard output

BEYOND = 1e4  # larger than any objective
ERROR_SCALE = 0.02  # fraction below which errors are told apart linearly, above in ratio


MATING_TRIES = 3  # rounds of mating a generation when most children are known already
SURPLUS = 1.6  # children made for each one wanted, since some are known already


class StackProblem(Problem):  # type: ignore[misc]
    """Plans as rows of integers, evaluated through the archive.

    Every stack within the model's range dominates every one beyond it. (The library's own
    constraint handling does the same for 4 ms a generation.)
    """

    def __init__(self, archive: Archive) -> None:
        space = archive.space
        objectives = 4 if archive.revalve else 3
        top = max(len(space.sizes), 1)
        super().__init__(n_var=space.width, n_obj=objectives, xl=0, xu=top, vtype=int)
        self.archive = archive
        self.seconds = 0.0

    def _evaluate(self, x: Plans, out: dict[str, Any], *args: object, **kwargs: object) -> None:
        start = perf_counter()
        rows = self.archive.rows(x.astype(np.int16))
        goals = self.archive.objectives[rows].copy()
        # order is kept, but the crowding looks at the useful end of the scale
        goals[:, 0] = np.log1p(goals[:, 0] / ERROR_SCALE)
        excess = np.maximum(self.archive.rise[rows] / self.archive.rise_max - 1.0, 0.0)[:, None]
        out["F"] = np.where(excess > 0, goals + BEYOND * (1.0 + excess), goals)
        self.seconds += perf_counter() - start


class _Mating(InfillCriterion):  # type: ignore[misc]
    """Binary tournaments, then our own crossover, mutation and repair on whole arrays.

    Children that were evaluated before are dropped, so a generation may come out smaller.
    """

    def __init__(self, archive: Archive, repair: Repair, budget: Budget) -> None:
        super().__init__()
        self.archive = archive
        self.budget = budget
        self.repair_plans = repair
        self.mutation = Mutation(repair.space)

    def do(
        self, problem: Any, pop: Any, n_offsprings: int, random_state: Random, **kwargs: Any
    ) -> Any:
        """A population of up to ``n_offsprings`` new plans."""
        n_offsprings = min(n_offsprings, self.budget.left)
        plans = pop.get("X").astype(np.int16)
        order = _standing(pop)
        born = np.zeros((0, plans.shape[1]), dtype=np.int16)
        for _ in range(MATING_TRIES):
            pairs = int(SURPLUS * (n_offsprings - len(born))) + 8
            mothers, fathers = (plans[_tournament(order, pairs, random_state)] for _ in "mf")
            children = offspring(self.repair_plans, self.mutation, mothers, fathers, random_state)
            born = self.archive.fresh(np.concatenate([born, children]))
            if len(born) >= n_offsprings:
                break
        return Population.new("X", born[:n_offsprings].astype(np.int64))


def _standing(pop: Any) -> Floats:
    """(population,) place of each member: by rank, then the less crowded first."""
    rank, crowding = (np.asarray(value, dtype=float) for value in pop.get("rank", "crowding"))
    place = np.lexsort((-crowding, rank))
    standing = np.empty(len(place))
    standing[place] = np.arange(len(place))
    return standing


def _tournament(standing: Floats, count: int, rng: Random) -> Ints:
    """(count,) winners of duels between two random members each."""
    duel = rng.integers(0, len(standing), size=(count, 2))
    return np.where(standing[duel[:, 0]] < standing[duel[:, 1]], duel[:, 0], duel[:, 1])


class _Either(Termination):  # type: ignore[misc]
    """Ends when the front has not moved for a while, or at a number of generations."""

    def __init__(self, generations: int, patience: int) -> None:
        super().__init__()
        settled = MultiObjectiveSpaceTermination(tol=0.0025)
        self.reasons = (
            RobustTermination(settled, period=patience),
            MaximumGenerationTermination(generations),
        )

    def _update(self, algorithm: Any) -> float:
        return max(float(reason.update(algorithm)) for reason in self.reasons)


def evolve(
    archive: Archive,
    repair: Repair,
    start: Plans,
    budget: Budget,
    seed: int,
    generations: int,
    patience: int,
) -> float:
    """Run the generations from a first population (plans, width) of unevaluated rows.

    Returns the seconds spent in pymoo and the operators, that is outside the archive.
    """
    began = perf_counter()
    problem = StackProblem(archive)
    algorithm = NSGA2(
        pop_size=len(start),
        sampling=archive.fresh(start).astype(np.int64),
        mating=_Mating(archive, repair, budget),
        eliminate_duplicates=False,
    )
    algorithm.setup(problem, termination=_Either(generations, patience), seed=seed)
    while algorithm.has_next() and budget.goes_on():
        algorithm.next()
        budget.generation += 1
        budget.report("generations")
    return perf_counter() - began - problem.seconds
