"""The local pass: change the best stacks shim by shim until no single change helps.

First the champions (the lowest error for each number of parts) are improved by all single
changes, then the rest of the front, then the champions by a sample of double changes; every
gain starts the sequence anew. A stack's neighbourhood is looked at once.
"""

from dataclasses import dataclass

import numpy as np

from optimiser.search.archive import Archive, best_of
from optimiser.search.budget import Budget
from optimiser.search.neighbours import Neighbours
from optimiser.search.repair import Random
from optimiser.search.sizes import Floats, Ints

_BATCH = 4096
_LOOKED_AT = 100  # front members compared when the next one to explore is chosen


@dataclass(frozen=True)
class Effort:
    """How hard the local pass tries.

    ``double_tries`` double changes are tried at a time for each champion, at most
    ``double_rounds`` times; champions further than ``keen`` times the best error (plus one
    percentage point) from the best are left alone until the others are done.
    """

    double_tries: int = 400
    double_rounds: int = 6
    keen: float = 3.0
    runners_up: int = 100


class Polish:
    """One local pass over an archive."""

    def __init__(
        self, archive: Archive, budget: Budget, rng: Random, effort: Effort | None = None
    ) -> None:
        self.archive = archive
        self.budget = budget
        self.rng = rng
        self.effort = effort or Effort()
        self.neighbours = Neighbours(archive.space)
        self._explored: set[int] = set()
        self._rounds: dict[int, int] = {}
        self._by_parts: dict[int, int] = {}
        self._by_family: dict[int, int] = {}
        self._front = np.zeros(0, dtype=np.int64)
        self._seen = 0
        self._any_within = False
        self._ran = 0

    def run(self) -> None:
        """Improve until nothing helps, the evaluations are spent or the user stops."""
        self._notice()
        while self.budget.goes_on():
            work = self._next()
            if work is None:
                return
            self._explore(*work)
            self.budget.report("polish")

    def _explore(self, row: int, double: bool) -> None:
        plan = self.archive.plans[row]
        if double:
            self._rounds[row] = self._rounds.get(row, 0) + 1
            plans = self.neighbours.double(plan, self.effort.double_tries, self.rng)
        else:
            self._explored.add(row)
            plans = self.neighbours.single(plan)
        plans = self.archive.fresh(plans)[: self.budget.left]
        for start in range(0, len(plans), _BATCH):
            if start and not self.budget.goes_on():
                return
            self.archive.rows(plans[start : start + _BATCH])
        self._notice()

    def _notice(self) -> None:
        """Take the rows evaluated since the last time into the champions and the front."""
        new = np.arange(self._seen, len(self.archive))
        self._seen = len(self.archive)
        within = self.archive.within
        if within[new].any() and not self._any_within:
            self._any_within = True
            self._front = self._front[:0]
            self._by_parts.clear()
            self._by_family.clear()
        if self._any_within:
            new = new[within[new]]
        objectives = self.archive.objectives
        among = np.concatenate([self._front, new])
        self._front = among[best_of(objectives[among])]
        self._crown(self._by_parts, new, objectives[new, 1].astype(np.int64))
        self._crown(self._by_family, new, self._family(new))

    def _family(self, rows: Ints) -> Ints:
        """(rows,) number of the family: diameters of face, clamp and crossover (if any)."""
        counts = self.archive.space.decode(self.archive.plans[rows])
        space = self.archive.space
        diameters = len(space.outer_of)
        face = space.widest(counts.pieces[:, 0])
        crossover = np.where(counts.two_stage, space.diameter[counts.crossover], diameters)
        clamp = space.diameter[counts.clamp]
        return np.asarray((face * diameters + clamp) * (diameters + 1) + crossover)

    def _crown(self, champions: dict[int, int], rows: Ints, kinds: Ints) -> None:
        """Note the rows that are better in error than the champion of their kind."""
        errors = self.archive.objectives[:, 0]
        order = np.lexsort((errors[rows], kinds))
        first = order[np.unique(kinds[order], return_index=True)[1]]
        for kind, row in zip(kinds[first].tolist(), rows[first].tolist(), strict=True):
            old = champions.get(kind)
            if old is None or errors[row] < errors[old]:
                champions[kind] = row

    def _next(self) -> tuple[int, bool] | None:
        """The row to work on and whether by double changes; None when all is done."""
        by_parts, by_family = self._keen(self._by_parts), self._keen(self._by_family)
        for row in (*by_parts, *by_family):
            if row not in self._explored:
                return row, False
        tired = self._least_tried(by_parts, 1)
        if tired is not None:
            return tired, True
        lonely = self._unexplored()
        if len(lonely):
            return int(lonely[0]), False
        everyone = [*by_parts, *by_family, *self._keen(dict(enumerate(self._front.tolist())))]
        tired = self._least_tried(everyone, self.effort.double_rounds)
        if tired is not None:
            return tired, True
        runner_up = self._runner_up()
        return None if runner_up is None else (runner_up, False)

    def _runner_up(self) -> int | None:
        """The lowest error whose neighbourhood is unknown, among a bounded number."""
        errors = self.archive.objectives[:, 0]
        count = min(self.effort.runners_up + len(self._explored), len(errors) - 1)
        best = np.argpartition(errors, count)[: count + 1]
        explored = np.fromiter(self._explored, np.int64, len(self._explored))
        left = np.setdiff1d(best, explored)
        if len(left) == 0 or self._ran >= self.effort.runners_up:
            return None
        self._ran += 1
        return int(left[np.lexsort((left, errors[left]))[0]])

    def _keen(self, champions: dict[int, int]) -> list[int]:
        """Champions not much worse than the best of them, best first."""
        errors = self.archive.objectives[:, 0]
        ranked = sorted(set(champions.values()), key=lambda row: (errors[row], row))
        if not ranked:
            return []
        limit = self.effort.keen * errors[ranked[0]] + 0.01
        return [row for row in ranked if errors[row] <= limit]

    def _least_tried(self, rows: list[int], most: int) -> int | None:
        """The first of the rows with the fewest rounds of double changes, below ``most``."""
        left = [row for row in rows if self._rounds.get(row, 0) < most]
        return min(left, key=lambda row: self._rounds.get(row, 0)) if left else None

    def _unexplored(self) -> Ints:
        """Some front rows whose neighbourhood is unknown, loneliest first."""
        explored = np.fromiter(self._explored, np.int64, len(self._explored))
        front = np.setdiff1d(self._front, explored)
        if len(front) > _LOOKED_AT:
            front = np.sort(self.rng.choice(front, _LOOKED_AT, replace=False))
        if len(front) < 2:
            return front
        return front[np.argsort(-_loneliness(self.archive.objectives[front]), kind="stable")]


def _loneliness(objectives: Floats) -> Floats:
    """(rows,) distance to the nearest other row, error on a logarithmic scale."""
    scaled = objectives.copy()
    scaled[:, 0] = np.log(scaled[:, 0] + 0.01)
    spread = np.ptp(scaled, axis=0)
    scaled = scaled / np.where(spread > 0, spread, 1.0)
    apart = np.abs(scaled[:, None, :] - scaled[None, :, :]).max(axis=2)
    np.fill_diagonal(apart, np.inf)
    return np.asarray(apart.min(axis=1))
