"""The smallest set of shims that builds any one cell, and what a smaller one costs in error.

An exact choice among given candidates, as an integer programme solved by HiGHS (through
``scipy.optimize.milp``): one candidate a cell and circuit, as many shims of a size as the neediest
cell takes, and a set measured by its shims, its sizes or its price.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import coo_array

from optimiser.search.sizes import Floats, Ints

Measure = Literal["pieces", "sizes", "price"]

#: Sets on the front.
POINTS = 5
#: Branches the solver may follow for one set; beyond that it is not proven the smallest.
_BRANCHES = 20_000
_ROUNDING = 1e-6


@dataclass(frozen=True, eq=False)
class Choices:
    """Candidates of one circuit of one cell: ``error_percent`` (n,), ``uses`` (n, sizes) shims."""

    error_percent: Floats
    uses: Ints


@dataclass(frozen=True, eq=False)
class KitTask:
    """``cells``: the circuits of every cell, which are built at once; ``most`` (sizes,) shims of
    each size there are; ``price`` (sizes,) of one shim, None where they are not known."""

    cells: tuple[tuple[Choices, ...], ...]
    most: Ints
    price: Floats | None = None


@dataclass(frozen=True, eq=False)
class Kit:
    """One set of shims.

    ``quantity`` (sizes,); ``choice`` the candidate of every cell and circuit; ``error_percent``
    the mean and ``worst_percent`` the greatest error over them; ``cost`` None without prices;
    ``proven`` False when the solver stopped before it was sure that nothing is better.
    """

    quantity: Ints
    choice: tuple[tuple[int, ...], ...]
    error_percent: float
    worst_percent: float
    cost: float | None
    proven: bool

    @property
    def pieces(self) -> int:
        """Number of shims."""
        return int(self.quantity.sum())

    @property
    def sizes(self) -> int:
        """Number of different sizes."""
        return int((self.quantity > 0).sum())


def kit_front(task: KitTask, by: Measure = "pieces", points: int = POINTS) -> tuple[Kit, ...]:
    """Sets between the smallest and the one of least error, smallest first, none better in both.

    Each has the least error of its size, and then the least size of that error. Empty when no
    set exists or there are no cells. Raises ValueError for a price that is not known.
    """
    if not task.cells:
        return ()
    model = _Model(task, by)
    smallest = model.solve(model.size)
    exact = model.solve(model.error)
    if smallest is None or exact is None:
        return ()
    least, most = smallest.measured, _tightened(model, exact).measured
    caps = sorted({_cap(by, least, most, k / max(points - 1, 1)) for k in range(points)})
    found: dict[float, Kit] = {}
    for cap in caps:
        best = model.solve(model.error, size_to=cap)
        if best is not None:
            tight = _tightened(model, best)
            found.setdefault(tight.measured, tight.kit(task))
    return tuple(found[size] for size in sorted(found))


def _cap(by: Measure, least: float, most: float, share: float) -> float:
    cap = least + share * (most - least)
    return cap if by == "price" else float(np.floor(cap + _ROUNDING))


def kit_of(task: KitTask, choice: Sequence[Sequence[int]], proven: bool = True) -> Kit:
    """The set that a given choice of candidates needs."""
    uses = [
        sum((circuit.uses[k] for circuit, k in zip(cell, numbers, strict=True)), 0 * task.most)
        for cell, numbers in zip(task.cells, choice, strict=True)
    ]
    errors = [
        float(circuit.error_percent[k])
        for cell, numbers in zip(task.cells, choice, strict=True)
        for circuit, k in zip(cell, numbers, strict=True)
    ]
    quantity = np.max(np.array(uses), axis=0)
    cost = None if task.price is None else float(quantity @ task.price)
    numbers = tuple(tuple(int(k) for k in row) for row in choice)
    return Kit(quantity, numbers, float(np.mean(errors)), max(errors), cost, proven)


@dataclass(frozen=True)
class _Solution:
    choice: tuple[tuple[int, ...], ...]
    error: float
    measured: float
    proven: bool

    def kit(self, task: KitTask) -> Kit:
        return kit_of(task, self.choice, self.proven)


def _tightened(model: "_Model", best: _Solution) -> _Solution:
    """The smallest set with an error as good."""
    smaller = model.solve(model.size, error_to=best.error)
    if smaller is None or smaller.measured > best.measured:
        return best
    both = best.proven and smaller.proven
    return _Solution(smaller.choice, smaller.error, smaller.measured, both)


class _Model:
    """The integer programme: choices (0 or 1), then quantities, then sizes used (0 or 1)."""

    def __init__(self, task: KitTask, by: Measure) -> None:
        if by == "price" and task.price is None:
            raise ValueError("a kit cannot be measured by prices that are not known")
        self._task, self._by = task, by
        self._flat = [choices for cell in task.cells for choices in cell]
        counts = [len(choices.error_percent) for choices in self._flat]
        self._first = np.concatenate([[0], np.cumsum(counts)])
        self._choices, self._sizes = int(self._first[-1]), len(task.most)
        errors = np.concatenate([choices.error_percent for choices in self._flat])
        nothing = np.zeros(self._sizes)
        measures = {
            "pieces": (nothing + 1.0, nothing),
            "sizes": (nothing, nothing + 1.0),
            "price": (nothing if task.price is None else task.price, nothing),
        }
        self.error = np.concatenate([errors / len(self._flat), nothing, nothing])
        self.size = np.concatenate([np.zeros(self._choices), *measures[by]])
        self._rules = [self._one_each(), self._enough(), self._counted()]

    def solve(
        self, goal: Floats, error_to: float = np.inf, size_to: float = np.inf
    ) -> _Solution | None:
        """The best choice for a goal (columns,) under limits of both; None when there is none."""
        tops = [np.ones(self._choices), self._task.most.astype(float), np.ones(self._sizes)]
        rules = list(self._rules)
        for row, limit in ((self.error, error_to), (self.size, size_to)):
            if np.isfinite(limit):
                rules.append(LinearConstraint(row[None], -np.inf, limit + _ROUNDING))
        found = milp(
            goal,
            integrality=np.ones(len(goal), dtype=np.int64),
            bounds=Bounds(0.0, np.concatenate(tops)),
            constraints=rules,
            options={"node_limit": _BRANCHES, "mip_rel_gap": 0.0},
        )
        if found.x is None:
            return None
        return self._solution(found.x, found.status == 0)

    def _solution(self, columns: Floats, proven: bool) -> _Solution:
        numbers = iter(
            int(np.argmax(columns[a:b])) for a, b in zip(self._first, self._first[1:], strict=False)
        )
        choice = tuple(tuple(next(numbers) for _ in cell) for cell in self._task.cells)
        kit = kit_of(self._task, choice)
        measures = {"pieces": kit.pieces, "sizes": kit.sizes, "price": kit.cost or 0.0}
        return _Solution(choice, kit.error_percent, float(measures[self._by]), proven)

    def _one_each(self) -> LinearConstraint:
        """Every circuit of every cell has one candidate."""
        rows = np.repeat(np.arange(len(self._flat)), np.diff(self._first))
        matrix = self._matrix(rows, np.arange(self._choices), np.ones(self._choices))
        return LinearConstraint(matrix, 1.0, 1.0)

    def _enough(self) -> LinearConstraint:
        """The set holds what each cell takes of each size: sum of uses <= quantity."""
        rows, columns, values = [], [], []
        place = 0
        for number, cell in enumerate(self._task.cells):
            for choices in cell:
                candidate, size = np.nonzero(choices.uses)
                rows.append(number * self._sizes + size)
                columns.append(self._first[place] + candidate)
                values.append(choices.uses[candidate, size].astype(float))
                place += 1
        total = len(self._task.cells) * self._sizes
        rows.append(np.arange(total))
        columns.append(self._choices + np.arange(total) % self._sizes)
        values.append(np.full(total, -1.0))
        parts = (np.concatenate(part) for part in (rows, columns, values))
        return LinearConstraint(self._matrix(*parts), -np.inf, 0.0)

    def _counted(self) -> LinearConstraint:
        """A size without a mark has no shims: quantity <= most x mark."""
        size = np.arange(self._sizes)
        rows = np.concatenate([size, size])
        columns = self._choices + np.concatenate([size, self._sizes + size])
        values = np.concatenate([np.ones(self._sizes), -self._task.most.astype(float)])
        return LinearConstraint(self._matrix(rows, columns, values), -np.inf, 0.0)

    def _matrix(self, rows: Ints, columns: Ints, values: Floats) -> coo_array:
        shape = (int(rows.max(initial=-1)) + 1, self._choices + 2 * self._sizes)
        return coo_array((values, (rows, columns)), shape=shape)
