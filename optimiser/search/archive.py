"""Every stack that was evaluated, once, with its scores and objectives."""

from dataclasses import dataclass
from time import perf_counter

import moocore
import numpy as np

from optimiser.search.counts import Plans
from optimiser.search.evaluator import Evaluator, Scores
from optimiser.search.sizes import Floats, Ints
from optimiser.search.space import Mask, Space


@dataclass(frozen=True)
class Record:
    """Evaluated plans as arrays, first dimension (plans,); ``changed`` is 0 without a fitted stack.

    ``beyond`` marks stacks outside the range the model was checked in.
    """

    plans: Plans
    scores: Scores
    parts: Ints
    changed: Ints
    beyond: Mask


class Archive:
    """Evaluates plans and remembers them; asks the evaluator for no plan twice.

    Objectives, all minimised: error, parts, utilisation, and in revalve mode changed shims.
    Stacks whose edge rises by more than ``rise_max`` thicknesses lie beyond the model's range.
    """

    def __init__(self, space: Space, evaluator: Evaluator, rise_max: float = 2.0) -> None:
        self.space = space
        self.rise_max = rise_max
        self.model_seconds = 0.0
        self.best_error = float("inf")  # within the model's range
        self._evaluator = evaluator
        self._place: dict[bytes, int] = {}
        self._plans = np.zeros((1024, space.width), dtype=np.int16)
        self._table = np.zeros((1024, 6))  # error, parts, utilisation, changed, clicks, rise
        self._misfit = np.zeros((1024, 0))

    def __len__(self) -> int:
        return len(self._place)

    @property
    def revalve(self) -> bool:
        """Whether changed shims are an objective."""
        return self.space.fitted is not None

    @property
    def plans(self) -> Plans:
        """(evaluated, width) every plan, in the order of evaluation."""
        return self._plans[: len(self)]

    @property
    def objectives(self) -> Floats:
        """(evaluated, 3 or 4) error, parts, utilisation, changed shims in revalve mode."""
        return self._table[: len(self), : 4 if self.revalve else 3]

    @property
    def misfit(self) -> Floats:
        """(evaluated, points) weighted misfit at each point of the target."""
        return self._misfit[: len(self)]

    @property
    def rise(self) -> Floats:
        """(evaluated,) greatest edge rise over thickness."""
        return self._table[: len(self), 5]

    @property
    def within(self) -> Mask:
        """(evaluated,) whether the stack lies in the range the model was checked in."""
        return self.rise <= self.rise_max

    def known(self, plans: Plans) -> Mask:
        """(plans,) whether each row was evaluated before."""
        return np.fromiter((key in self._place for key in keys(plans)), bool, len(plans))

    def fresh(self, plans: Plans) -> Plans:
        """The rows not evaluated yet, without repetition, in their order."""
        seen: set[bytes] = set()
        keep = []
        for row, key in enumerate(keys(plans)):
            if key not in self._place and key not in seen:
                seen.add(key)
                keep.append(row)
        return plans[keep]

    def rows(self, plans: Plans) -> Ints:
        """(plans,) row numbers of plans, which are evaluated where that is still to do."""
        fresh = self.fresh(plans)
        if len(fresh):
            self._append(fresh)
        return np.fromiter((self._place[key] for key in keys(plans)), np.int64, len(plans))

    def front(self) -> Ints:
        """Rows no other row is better than in every objective, within the model's range.

        If no evaluated stack lies within the range, the front of those beyond it.
        """
        among = np.flatnonzero(self.within)
        if len(among) == 0:
            among = np.arange(len(self))
        return among[best_of(self.objectives[among])]

    def record(self, rows: Ints | None = None) -> Record:
        """The archive, or some of its rows, as arrays."""
        chosen = np.arange(len(self)) if rows is None else rows
        error, parts, utilisation, changed, clicks, rise = self._table[chosen].T
        return Record(
            self._plans[chosen],
            Scores(error, utilisation, clicks, rise, self._misfit[chosen]),
            parts.astype(np.int64),
            changed.astype(np.int64),
            rise > self.rise_max,
        )

    def _append(self, plans: Plans) -> None:
        start = perf_counter()
        scores = self._evaluator.evaluate(plans)
        self.model_seconds += perf_counter() - start
        first, last = len(self), len(self) + len(plans)
        if first == 0:
            self._misfit = np.zeros((len(self._plans), scores.misfit.shape[1]))
        while last > len(self._plans):
            self._plans = np.concatenate([self._plans, np.zeros_like(self._plans)])
            self._table = np.concatenate([self._table, np.zeros_like(self._table)])
            self._misfit = np.concatenate([self._misfit, np.zeros_like(self._misfit)])
        changed = self.space.changed(plans) if self.revalve else np.zeros(len(plans))
        columns = (scores.error, self.space.parts(plans), scores.utilisation, changed)
        table = np.column_stack([*columns, scores.clicks, scores.rise])
        if not (np.isfinite(table).all() and np.isfinite(scores.misfit).all()):
            raise FloatingPointError("the model returned scores that are not finite")
        self._plans[first:last] = plans
        self._table[first:last] = table
        self._misfit[first:last] = scores.misfit
        within = scores.error[scores.rise <= self.rise_max]
        self.best_error = min(self.best_error, float(within.min(initial=np.inf)))
        self._place.update((key, first + row) for row, key in enumerate(keys(plans)))


def keys(plans: Plans) -> list[bytes]:
    """One hashable key a row."""
    data = np.ascontiguousarray(plans).tobytes()
    size = plans.shape[1] * plans.itemsize
    return [data[start : start + size] for start in range(0, len(data), size)]


def best_of(objectives: Floats) -> Ints:
    """Indices of the non-dominated rows (one of each set of equals) of (rows, objectives)."""
    if len(objectives) == 0:
        return np.zeros(0, dtype=np.int64)
    return np.flatnonzero(moocore.is_nondominated(objectives))
