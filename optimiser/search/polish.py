"""The local pass: change the best stacks shim by shim until no single change helps.

Six queues share the evaluations: the best stacks (least error for each number of parts), those with
few parts or few changed shims, the best of each family (face and clamp diameter, crossover
size), the rest of the front, the next in error, and random double changes. For a champion all
single changes are tried, then the combinations of two to four changes that look best when the
changes' effects on the curve are added up. A neighbourhood is looked at once.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from optimiser.search.archive import Archive, best_of
from optimiser.search.budget import Budget
from optimiser.search.counts import Plans
from optimiser.search.neighbours import Neighbours
from optimiser.search.repair import Random
from optimiser.search.sizes import Floats, Ints

_EFFECTS = 300  # single changes that are combined: those with the least effect
_BEAM = 200  # combinations of changes kept for each number of changes
_LOOKED_AT = 100  # front members compared when the next one to explore is chosen


Move = Literal["single", "combined", "random"]
Queue = Literal["best", "few parts", "families", "front", "runners-up", "random"]
Step = tuple[int, Move]
Work = tuple[int, Move, Queue]

#: How the evaluations are shared out between the queues, as long as each has work.
SHARES: dict[Queue, float] = {
    "best": 3.0,
    "few parts": 2.0,
    "families": 4.0,
    "front": 1.0,
    "runners-up": 2.0,
    "random": 1.0,
}


@dataclass(frozen=True)
class Effort:
    """How hard the local pass tries.

    Single changes are tried in batches of at least ``batch``. Of the combinations of 2, 3 ...
    changes (up to ``depth`` more than one) ``combined`` each are tried at a time, for at most
    ``combined_rounds`` times a stack, if their hoped-for error is below ``hope`` times the
    stack's; not for errors below ``enough`` (a fraction), which no damper would show.
    The queue of the best takes champions of up to ``keen`` times the least error plus one
    percentage point, that of families the best ``families`` of those, that of few parts
    champions up to the error ``useful``. ``random`` double changes a round and ``random_rounds``
    rounds are tried for each champion; the next in error are turned to ``runners_up`` times.
    """

    batch: int = 48
    combined: int = 20
    combined_rounds: int = 3
    depth: int = 3
    hope: float = 1.3
    random: int = 100
    random_rounds: int = 6
    runners_up: int = 100
    keen: float = 3.0
    families: int = 8
    useful: float = 0.3
    enough: float = 0.0005


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
        self._singled: set[int] = set()
        self._combined: set[int] = set()
        self._waiting: dict[int, Plans] = {}
        self._rounds: dict[int, int] = {}
        self._combined_rounds: dict[int, int] = {}
        self._by_parts: dict[int, int] = {}
        self._by_changed: dict[int, int] = {}
        self._by_family: dict[int, int] = {}
        self._front = np.zeros(0, dtype=np.int64)
        self._seen = 0
        self._any_within = False
        self._ran = 0
        self._spent: dict[Queue, int] = dict.fromkeys(SHARES, 0)

    def run(self) -> None:
        """Improve until nothing helps, the evaluations are spent or the user stops."""
        self._notice()
        while self.budget.goes_on():
            work = self._next()
            if work is None:
                return
            self._explore(*work)
            self.budget.report("polish")

    def _explore(self, row: int, how: Move, queue: Queue) -> None:
        """Evaluate some changes of one row; a better stack is followed before the rest is tried."""
        plan, effort = self.archive.plans[row], self.effort
        if how == "single":
            waiting = self._waiting.pop(row, None)
            if waiting is None:
                waiting = self.rng.permutation(self.neighbours.single(plan))
            waiting = self.archive.fresh(waiting)
            first = max(effort.batch, len(waiting) // 8)
            plans = waiting[:first]
            if len(waiting) > first:
                self._waiting[row] = waiting[first:]
            else:
                self._singled.add(row)
        elif how == "combined":
            plans = self._hopeful(row)
            self._combined_rounds[row] = self._combined_rounds.get(row, 0) + 1
            if len(plans) < effort.combined or self._combined_rounds[row] >= effort.combined_rounds:
                self._combined.add(row)
        else:
            self._rounds[row] = self._rounds.get(row, 0) + 1
            plans = self.archive.fresh(self.neighbours.double(plan, effort.random, self.rng))
        before = len(self.archive)
        self.archive.rows(plans[: self.budget.left])
        self._spent[queue] += len(self.archive) - before
        self._notice()

    def _hopeful(self, row: int) -> Plans:
        """Untried plans some changes away that should be good if the changes' effects add up.

        Known single changes are combined two at a time, the best of these with a third, and so
        on; from each number of changes the most promising plans are taken.
        """
        archive, effort = self.archive, self.effort
        plan, misfit = archive.plans[row], archive.misfit[row]
        near = self.neighbours.single(plan)
        near = near[archive.known(near)]
        effect = archive.misfit[archive.rows(near)] - misfit
        found = [near[:0]]
        small = np.argsort((effect**2).sum(axis=1), kind="stable")[:_EFFECTS]
        near, effect = near[small], effect[small]
        if effect.size == 0:
            return near[:0]
        limit = effort.hope**2 * float((misfit**2).sum())
        beam, reached = near, misfit + effect
        for _ in range(effort.depth):
            one, other = _best_sums(reached, effect, _BEAM, limit)
            beam, kept = self.neighbours.combined(plan, beam[one], near[other])
            reached = (reached[one] + effect[other])[kept]
            beam, first = np.unique(beam, axis=0, return_index=True)
            reached = reached[first]
            order = np.argsort((reached**2).sum(axis=1), kind="stable")
            found.append(archive.fresh(beam[order])[: effort.combined])
        return archive.fresh(np.concatenate(found))

    def _notice(self) -> None:
        """Take the rows evaluated since the last time into the champions and the front."""
        new = np.arange(self._seen, len(self.archive))
        self._seen = len(self.archive)
        within = self.archive.within
        if within[new].any() and not self._any_within:
            self._any_within = True
            self._front = self._front[:0]
            self._by_parts.clear()
            self._by_changed.clear()
            self._by_family.clear()
        if self._any_within:
            new = new[within[new]]
        objectives = self.archive.objectives
        among = np.concatenate([self._front, new])
        self._front = among[best_of(objectives[among])]
        self._crown(self._by_parts, new, objectives[new, 1].astype(np.int64))
        self._crown(self._by_family, new, self._family(new))
        if self.archive.revalve:
            self._crown(self._by_changed, new, objectives[new, 3].astype(np.int64))

    def _family(self, rows: Ints) -> Ints:
        """(rows,) number of the family: face diameter, clamp diameter and crossover size."""
        space = self.archive.space
        counts = space.decode(self.archive.plans[rows])
        face, clamp = space.widest(counts.pieces[:, 0]), space.diameter[counts.clamp]
        family = (face * len(space.outer_of) + clamp) * (len(space.sizes) + 1)
        return np.asarray(family + counts.crossover + 1)

    def _crown(self, champions: dict[int, int], rows: Ints, kinds: Ints) -> None:
        """Note the rows that are better in error than the champion of their kind."""
        errors = self.archive.objectives[:, 0]
        order = np.lexsort((errors[rows], kinds))
        first = order[np.unique(kinds[order], return_index=True)[1]]
        for kind, row in zip(kinds[first].tolist(), rows[first].tolist(), strict=True):
            old = champions.get(kind)
            if old is None or errors[row] < errors[old]:
                champions[kind] = row

    def _next(self) -> Work | None:
        """The row to work on and how; None when all is done."""
        by_parts, by_family = self._keen(self._by_parts), self._keen(self._by_family)
        by_family = by_family[: self.effort.families]
        queues: dict[Queue, Callable[[], Step | None]] = {
            "best": lambda: self._systematic(by_parts),
            "few parts": lambda: self._systematic(self._by_few_parts()),
            "families": lambda: self._systematic(by_family),
            "front": self._on_front,
            "runners-up": self._runner_up,
            "random": lambda: self._at_random([*by_parts, *by_family]),
        }
        for queue in sorted(queues, key=lambda q: self._spent[q] / SHARES[q]):
            step = queues[queue]()
            if step:
                return (*step, queue)
        return None

    def _by_few_parts(self) -> list[int]:
        """Champions of useful error: fewest changed shims first, then fewest parts."""
        errors = self.archive.objectives[:, 0]
        champions = [*sorted(self._by_changed.items()), *sorted(self._by_parts.items())]
        ranked = [row for _, row in champions]
        return [row for row in ranked if errors[row] <= self.effort.useful]

    def _systematic(self, rows: list[int]) -> Step | None:
        """Single changes of the first row that lacks them, then its promising combinations."""
        errors = self.archive.objectives[:, 0]
        for row in rows:
            if row not in self._singled:
                return row, "single"
            if row not in self._combined and errors[row] > self.effort.enough:
                return row, "combined"
        return None

    def _on_front(self) -> Step | None:
        """The loneliest of some front rows whose neighbourhood is unknown."""
        front = np.setdiff1d(self._front, _as_rows(self._singled))
        if len(front) == 0:
            return None
        if len(front) > _LOOKED_AT:
            front = np.sort(self.rng.choice(front, _LOOKED_AT, replace=False))
        return int(front[_loneliest(self.archive.objectives[front])]), "single"

    def _at_random(self, rows: list[int]) -> Step | None:
        """The first of the rows with the fewest rounds of random changes."""
        left = [row for row in rows if self._rounds.get(row, 0) < self.effort.random_rounds]
        if not left:
            return None
        return min(left, key=lambda row: self._rounds.get(row, 0)), "random"

    def _runner_up(self) -> Step | None:
        """The lowest error whose neighbourhood is unknown, for a bounded number of times."""
        errors = self.archive.objectives[:, 0].copy()
        if self._any_within:
            errors[~self.archive.within] = np.inf
        count = min(len(self._singled) + 1, len(errors)) - 1
        best = np.argpartition(errors, count)[: count + 1]
        left = np.setdiff1d(best, _as_rows(self._singled))
        if len(left) == 0 or self._ran >= self.effort.runners_up:
            return None
        self._ran += 1
        return int(left[np.lexsort((left, errors[left]))[0]]), "single"

    def _keen(self, champions: dict[int, int]) -> list[int]:
        """Champions not much worse than the best of them, best first."""
        rows = np.unique(np.fromiter(champions.values(), np.int64, len(champions)))
        errors = self.archive.objectives[rows, 0]
        near = errors <= self.effort.keen * errors.min(initial=np.inf) + 0.01
        rows, errors = rows[near], errors[near]
        return [int(row) for row in rows[np.argsort(errors, kind="stable")]]


def _as_rows(rows: set[int]) -> Ints:
    return np.fromiter(rows, np.int64, len(rows))


def _best_sums(reached: Floats, effect: Floats, most: int, limit: float) -> tuple[Ints, Ints]:
    """Pairs of rows whose sum has the least square, at most ``most`` and below ``limit``."""
    if len(reached) == 0 or len(effect) == 0:
        return np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64)
    squares = (reached**2).sum(axis=1)[:, None] + (effect**2).sum(axis=1)
    hoped = (squares + 2 * reached @ effect.T).ravel()
    low = np.flatnonzero(hoped < limit)
    if len(low) > most:
        low = low[np.argpartition(hoped[low], most)[:most]]
    one, other = np.divmod(low, len(effect))
    return one, other


def _loneliest(objectives: Floats) -> int:
    """The row (rows, objectives) farthest from its nearest other, error taken logarithmically."""
    scaled = objectives.copy()
    scaled[:, 0] = np.log(scaled[:, 0] + 0.01)
    spread = np.ptp(scaled, axis=0)
    scaled = scaled / np.where(spread > 0, spread, 1.0)
    apart = np.abs(scaled[:, None, :] - scaled[None, :, :]).max(axis=2)
    np.fill_diagonal(apart, np.inf)
    return int(np.argmax(apart.min(axis=1)))
