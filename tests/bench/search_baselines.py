"""Simpler searches to compare with at equal evaluations: random stacks and library operators.

Both return the same kind of archive as the real search. Run as a command from the repository's
top folder, it compares the three on the analytic stand-in model:

    PYTHONPATH=.:tests python tests/bench/search_baselines.py
"""

from typing import Any

import moocore
import numpy as np
from pymoo.algorithms.moo.nsga2 import NSGA2
from pymoo.config import Config
from pymoo.core.repair import Repair as LibraryRepair
from pymoo.core.termination import NoTermination
from pymoo.operators.crossover.sbx import SBX
from pymoo.operators.mutation.pm import PM
from pymoo.operators.repair.rounding import RoundingRepair
from pymoo.operators.sampling.rnd import IntegerRandomSampling

from optimiser.search.archive import Archive
from optimiser.search.counts import Counts, Plans
from optimiser.search.evaluator import Evaluator
from optimiser.search.library import StackProblem
from optimiser.search.repair import Repair
from optimiser.search.space import Space

_BATCH = 500
_MOST_ROUNDS = 200  # rounds without a new plan after which a baseline gives up
Config.warnings["not_compiled"] = False


def random_search(
    space: Space,
    evaluator: Evaluator,
    evaluations: int,
    seed: int,
    every: Plans | None = None,
    rise_max: float = 2.0,
) -> Archive:
    """Random buildable stacks: exactly uniform among ``every`` plan where those are given.

    In larger spaces the number of shims, each shim's size and stage, the crossover and the clamp
    shim are drawn uniformly; draws that break a rule are thrown away.
    """
    rng = np.random.default_rng(seed)
    archive = Archive(space, evaluator, rise_max)
    if every is not None:
        archive.rows(every[rng.permutation(len(every))[:evaluations]])
        return archive
    for _ in range(100_000):
        plans = _random_plans(space, 20 * _BATCH, rng)
        fresh = archive.fresh(plans[space.buildable(plans)])
        archive.rows(fresh[: evaluations - len(archive)])
        if len(archive) >= evaluations:
            break
    return archive


def _random_plans(space: Space, count: int, rng: np.random.Generator) -> Plans:
    sizes, most = len(space.sizes), space.rules.parts - 1
    number = rng.integers(1, most + 1, size=count)
    chosen = rng.integers(0, sizes, size=(count, most))
    two = rng.random(count) < 0.5
    stage = rng.integers(0, 2, size=(count, most)) * two[:, None]
    row, column = np.nonzero(np.arange(most) < number[:, None])
    pieces = np.zeros((count, 2, sizes), dtype=np.int64)
    np.add.at(pieces, (row, stage[row, column], chosen[row, column]), 1)
    crossover = np.where(two, rng.integers(0, sizes, size=count), -1)
    return space.encode(Counts(pieces, crossover, rng.integers(0, sizes, size=count)))


class _Mend(LibraryRepair):  # type: ignore[misc]
    def __init__(self, space: Space) -> None:
        super().__init__()
        self.mend = Repair(space)

    def _do(self, problem: Any, plans: Any, random_state: Any = None, **kwargs: Any) -> Any:
        return self.mend(np.rint(plans).astype(np.int16), random_state).astype(np.int64)


def library_search(
    space: Space,
    evaluator: Evaluator,
    evaluations: int,
    seed: int,
    population: int = 100,
    rise_max: float = 2.0,
) -> Archive:
    """NSGA-II with the library's own integer sampling, crossover and mutation, plus our repair."""
    archive = Archive(space, evaluator, rise_max)
    algorithm = NSGA2(
        pop_size=population,
        sampling=IntegerRandomSampling(),
        crossover=SBX(prob=0.9, eta=3.0, vtype=float, repair=RoundingRepair()),
        mutation=PM(prob=1.0, eta=3.0, vtype=float, repair=RoundingRepair()),
        repair=_Mend(space),
        eliminate_duplicates=False,
    )
    algorithm.setup(StackProblem(archive), termination=NoTermination(), seed=seed)
    idle = 0
    while len(archive) + population <= evaluations and idle < _MOST_ROUNDS:
        before = len(archive)
        algorithm.next()
        idle = idle + 1 if len(archive) == before else 0
    return archive


def volume(archive: Archive, worst: tuple[float, float, float]) -> float:
    """Share of the box from 0 to ``worst`` (error, parts, utilisation) that the front dominates."""
    front = archive.objectives[archive.front()][:, :3]
    inside = front[(front < worst).all(axis=1)]
    return float(moocore.hypervolume(inside / worst, ref=[1.0, 1.0, 1.0])) if len(inside) else 0.0


def main() -> None:
    """Print hypervolume and best error of the three searches, seed by seed."""
    from search.standin import VELOCITY_M_S, StandIn, forces, workshop  # type: ignore[import]

    from optimiser.search.engine import Search, Settings
    from optimiser.search.operators import sample

    space, evaluations, worst = workshop(), 10_000, (0.3, 15.0, 3.0)
    hidden = sample(Repair(space), 1, np.random.default_rng(4))
    wave = 1 + 0.02 * np.sin(np.arange(len(VELOCITY_M_S)))
    model = StandIn(space, forces(space, hidden, 0.0)[0][0, 5] * wave)
    print(f"{evaluations} evaluations each: hypervolume (best error)")
    for seed in range(10):
        settings = Settings(evaluations=evaluations, enumerate_up_to=0, rise_max=9.0)
        archives = {
            "search": Search(space, model, seed, settings).run().archive,
            "library operators": library_search(space, model, evaluations, seed, rise_max=9.0),
            "random": random_search(space, model, evaluations, seed, rise_max=9.0),
        }
        cells = [
            f"{name} {volume(a, worst):.4f} ({100 * a.objectives[:, 0].min():.2f} %)"
            for name, a in archives.items()
        ]
        print(f"seed {seed}: " + ", ".join(cells), flush=True)


if __name__ == "__main__":
    main()
