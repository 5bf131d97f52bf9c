"""One drawer for every cell at once: the best of all ways, counted out one by one."""

from itertools import product

import numpy as np
import pytest

from optimiser.tuning.drawer import EMPTY, assign
from optimiser.tuning.kit import Choices


def brute_force(cells: list[Choices], quantity: np.ndarray) -> float:
    best = float("inf")
    for numbers in product(*(range(-1, len(cell.error_percent)) for cell in cells)):
        used, cost = np.zeros_like(quantity), 0.0
        for cell, k in zip(cells, numbers, strict=True):
            used = used + (cell.uses[k] if k >= 0 else 0)
            cost += cell.error_percent[k] if k >= 0 else EMPTY
        if (used <= quantity).all():
            best = min(best, cost)
    return best


@pytest.mark.parametrize("seed", range(8))
def test_assignment_equals_enumeration(seed: int) -> None:
    rng = np.random.default_rng(seed)
    quantity = rng.integers(2, 9, 4)
    cells = [Choices(rng.uniform(1, 6, 3), rng.integers(0, 4, (3, 4))) for _ in range(4)]
    found = assign(cells, quantity)
    used, cost = np.zeros_like(quantity), 0.0
    for cell, k in zip(cells, found.choice, strict=True):
        used = used + (cell.uses[k] if k is not None else 0)
        cost += EMPTY if k is None else float(cell.error_percent[k])
    assert found.proven
    assert (used <= quantity).all()
    assert cost == pytest.approx(brute_force(cells, quantity))


def test_a_drawer_that_is_too_small_leaves_cells_empty() -> None:
    cell = Choices(np.array([2.0]), np.array([[2]]))
    assert sorted(assign([cell, cell, cell], np.array([4])).choice, key=str) == [0, 0, None]
