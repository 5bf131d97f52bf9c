"""One stack a row so that moving a row changes few shims: exact, by dynamic programming.

The rows of one feel form a chain along the mass axis. What is minimised is the sum over rows of
the errors of all circuits plus a price for every shim taken out or put in between neighbouring
rows. All circuits of a row must be buildable at once, so a state is one candidate of each; since
the price of a move is a sum over circuits, the best predecessor is found circuit by circuit
(Bellman, *Dynamic Programming*, 1957: the principle of optimality).
"""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from optimiser.search.find import exchanged
from optimiser.search.sizes import Floats, Ints
from optimiser.stack import Stack

Mask = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Row:
    """Candidates of one row.

    ``errors`` one array (candidates,) a circuit, % each; ``stacks`` in the same order; ``fits``
    (candidates of the first circuit, candidates of the second) which pairs the drawer builds at
    once, (candidates,) for one circuit. One or two circuits.
    """

    errors: tuple[Floats, ...]
    stacks: tuple[tuple[Stack, ...], ...]
    fits: Mask

    @property
    def cost(self) -> Floats:
        """Sum of the errors of every state, infinite where it cannot be built; shape of fits."""
        total = self.errors[0]
        for errors in self.errors[1:]:
            total = total[:, None] + errors
        return np.where(self.fits, total, np.inf)


@dataclass(frozen=True)
class Chain:
    """``choice`` the candidate's number for each row and circuit; ``cost`` what was minimised."""

    choice: tuple[tuple[int, ...], ...]
    cost: float


def best_chain(rows: Sequence[Row], price: float) -> Chain:
    """The chain of least cost; among equals the one with the lowest numbers in the last rows.

    ``price`` points of error a shim moved. Raises ValueError when a row has no state that fits.
    """
    if any(not row.fits.any() for row in rows):
        raise ValueError("every row of a chain needs a state that can be built")
    best = rows[0].cost
    came: list[list[Ints]] = []
    for before, row in pairwise(rows):
        steps: list[Ints] = []
        for circuit, (old, new) in enumerate(zip(before.stacks, row.stacks, strict=True)):
            best, origin = _moved(best, circuit, price * _moves(old, new))
            steps.append(origin)
        came.append(steps)
        best = best + row.cost
    state = np.unravel_index(int(np.argmin(best)), best.shape)
    cost = float(best[state])
    choice = [tuple(int(number) for number in state)]
    for steps in came[::-1]:
        choice.append(_back(choice[-1], steps))
    return Chain(tuple(choice[::-1]), cost)


def cost_of(rows: Sequence[Row], choice: Sequence[tuple[int, ...]], price: float) -> float:
    """What ``best_chain`` minimises, for any choice; infinite when a row cannot be built."""
    total = sum(float(row.cost[numbers]) for row, numbers in zip(rows, choice, strict=True))
    chosen = [
        [stacks[k] for stacks, k in zip(row.stacks, numbers, strict=True)]
        for row, numbers in zip(rows, choice, strict=True)
    ]
    for before, after in pairwise(chosen):
        total += price * sum(exchanged(a, b) for a, b in zip(before, after, strict=True))
    return total


def _moves(old: Sequence[Stack], new: Sequence[Stack]) -> Floats:
    """(old, new) shims taken out plus put in from each stack to each."""
    return np.array([[float(exchanged(one, other)) for other in new] for one in old])


def _moved(best: Floats, circuit: int, price: Floats) -> tuple[Floats, Ints]:
    """Least cost after one circuit moved from each old candidate to each new one, and from where.

    ``price`` (old, new); the axis ``circuit`` of ``best`` changes from old to new candidates.
    """
    kept = np.moveaxis(best, circuit, -1)
    through = kept[..., :, None] + price
    origin = through.argmin(axis=-2)
    least = np.take_along_axis(through, origin[..., None, :], axis=-2)[..., 0, :]
    return np.moveaxis(least, -1, circuit), np.moveaxis(origin, -1, circuit)


def _back(state: tuple[int, ...], steps: Sequence[Ints]) -> tuple[int, ...]:
    """The row's state before; circuits were moved first to last, so they go back last to first."""
    numbers = list(state)
    for circuit in range(len(steps) - 1, -1, -1):
        numbers[circuit] = int(steps[circuit][tuple(numbers)])
    return tuple(numbers)
