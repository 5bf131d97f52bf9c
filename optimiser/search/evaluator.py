"""The search's only view of the model: plans in, scores out."""

from collections.abc import Iterable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, fields
from typing import Protocol

import numpy as np

from optimiser.search.counts import Plans
from optimiser.search.sizes import Floats


@dataclass(frozen=True)
class Scores:
    """What the model says of plans; arrays have shape (plans,) and are finite.

    ``error`` is the weighted r.m.s. of force over wanted force minus 1 at the best click (a
    fraction), ``utilisation`` the peak fatigue utilisation, ``clicks`` the best click setting,
    ``rise`` the greatest edge rise over thickness (a fraction). ``misfit`` has shape
    (plans, points): force over wanted force minus 1, times the root of the point's share of the
    weight, so that ``error`` is the length of its rows; it may have no points, then the local
    pass has less to go by.
    """

    error: Floats
    utilisation: Floats
    clicks: Floats
    rise: Floats
    misfit: Floats

    def __len__(self) -> int:
        return len(self.error)

    @classmethod
    def join(cls, parts: Iterable["Scores"]) -> "Scores":
        """Scores of consecutive batches as one."""
        kept = list(parts)
        names = [item.name for item in fields(cls)]
        return cls(*(np.concatenate([getattr(part, name) for part in kept]) for name in names))


class Evaluator(Protocol):
    """Scores plans; each row's scores depend on that row alone."""

    def evaluate(self, plans: Plans) -> Scores:
        """Scores of (plans, width) rows."""


class ParallelEvaluator:
    """Splits every batch over threads, in order; the wrapped evaluator must release the GIL."""

    def __init__(self, evaluator: Evaluator, workers: int) -> None:
        self._evaluator = evaluator
        self._workers = workers
        self._pool = ThreadPoolExecutor(workers)

    def evaluate(self, plans: Plans) -> Scores:
        """Scores of (plans, width) rows, equal to those of the wrapped evaluator."""
        if len(plans) < 2 * self._workers:
            return self._evaluator.evaluate(plans)
        chunks = np.array_split(plans, self._workers)
        return Scores.join(self._pool.map(self._evaluator.evaluate, chunks))

    def close(self) -> None:
        """End the threads."""
        self._pool.shutdown()


def evaluate_in_parallel(evaluator: Evaluator, workers: int) -> Evaluator:
    """The evaluator itself for one worker, else one that splits batches over threads."""
    return evaluator if workers <= 1 else ParallelEvaluator(evaluator, workers)
