"""The chain is the best of all there are."""

from itertools import product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.search.find import exchanged
from optimiser.tuning.chain import Row, best_chain, cost_of

from .builders import random_row, random_stacks, stack_of


def brute_force(rows: list[Row], price: float) -> float:
    """The least cost over every combination of candidates, reckoned term by term."""
    states = [list(np.ndindex(row.fits.shape)) for row in rows]
    best = float("inf")
    for choice in product(*states):
        cost = 0.0
        for row, state in zip(rows, choice, strict=True):
            cost += sum(errors[k] for errors, k in zip(row.errors, state, strict=True))
            cost += 0.0 if row.fits[state] else float("inf")
        for k in range(len(rows) - 1):
            for circuit in range(len(rows[0].stacks)):
                old = rows[k].stacks[circuit][choice[k][circuit]]
                new = rows[k + 1].stacks[circuit][choice[k + 1][circuit]]
                cost += price * exchanged(old, new)
        best = min(best, cost)
    return best


@settings(max_examples=60, deadline=None)
@given(
    seed=st.integers(0, 10**6),
    circuits=st.integers(1, 2),
    count=st.integers(1, 4),
    price=st.sampled_from([0.0, 0.05, 0.5, 5.0]),
)
def test_chain_equals_brute_force(seed: int, circuits: int, count: int, price: float) -> None:
    rng = np.random.default_rng(seed)
    rows = [random_row(rng, circuits, 5 if circuits == 1 else 3) for _ in range(count)]
    chain = best_chain(rows, price)
    assert chain.cost == pytest.approx(brute_force(rows, price))
    assert cost_of(rows, chain.choice, price) == pytest.approx(chain.cost)
    assert all(row.fits[choice] for row, choice in zip(rows, chain.choice, strict=True))


def test_a_high_price_keeps_the_stack_and_none_takes_the_least_error() -> None:
    one, other = stack_of([2, 0, 0, 1, 0]), stack_of([0, 1, 1, 0, 2])
    rows = [
        Row((np.array([1.0, 2.0]),), ((one, other),), np.ones(2, bool)),
        Row((np.array([2.0, 1.0]),), ((one, other),), np.ones(2, bool)),
    ]
    assert best_chain(rows, 0.0).choice == ((0,), (1,))
    assert best_chain(rows, 1.0).choice in (((0,), (0,)), ((1,), (1,)))


def test_a_row_that_cannot_be_built_is_refused() -> None:
    stacks = random_stacks(np.random.default_rng(1), 2)
    row = Row((np.array([1.0, 2.0]),), (stacks,), np.zeros(2, bool))
    with pytest.raises(ValueError, match="every row"):
        best_chain([row], 0.1)
