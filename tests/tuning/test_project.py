"""A stack made anew from what there is keeps its stages and takes nothing twice."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.stack import Stack
from optimiser.stock import Stock, StockItem
from optimiser.tuning.project import projected

TWO_STAGES = Stack.parse(
    ["2 x 40 x 0.25", "1 x 22 x 0.10", "3 x 38 x 0.30", "1 x 30 x 0.20", "1 x 18 x 0.30"]
)


def drawer(*sizes: tuple[float, float, int]) -> Stock:
    return Stock(StockItem(outer, 12.0, thickness, count) for outer, thickness, count in sizes)


def test_a_stack_that_can_be_built_stays_as_it_is() -> None:
    stock = drawer((40, 0.25, 2), (22, 0.1, 1), (38, 0.3, 3), (30, 0.2, 1), (18, 0.3, 1))
    assert projected(TWO_STAGES, stock, 36.0) == TWO_STAGES


def test_missing_shims_are_replaced_by_similar_ones() -> None:
    stock = drawer((40, 0.25, 2), (24, 0.1, 1), (40, 0.3, 3), (32, 0.2, 1), (16, 0.3, 2))
    made = projected(TWO_STAGES, stock, 36.0)
    assert made is not None
    assert made.lines() == [
        "2 x 40 x 0.25", "1 x 24 x 0.10", "3 x 40 x 0.30", "1 x 32 x 0.20", "1 x 16 x 0.30",
    ]  # fmt: skip


def test_too_small_a_drawer_makes_nothing() -> None:
    assert projected(TWO_STAGES, drawer((40, 0.25, 3), (18, 0.3, 2)), 36.0) is None
    assert projected(TWO_STAGES, drawer(), 36.0) is None


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 10**6))
def test_what_is_made_is_in_the_drawer_and_covers_the_seat(seed: int) -> None:
    rng = np.random.default_rng(seed)
    sizes = [(float(o), float(t)) for o in range(16, 44, 2) for t in (0.1, 0.2, 0.3)]
    stock = drawer(*((o, t, int(rng.integers(0, 3))) for o, t in sizes))
    made = projected(TWO_STAGES, stock, 36.0)
    if made is not None:
        assert not stock.shortage(made, 12.0)
        assert made.groups[0].shim.outer_mm >= 36.0
        assert made.parts == TWO_STAGES.parts
