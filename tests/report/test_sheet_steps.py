"""Steps of the build: roles, bins, what is left."""

import pytest

from optimiser.report.sheet_steps import Drawer, build_steps, roles_of, shortages
from optimiser.stack import Shim, Stack
from optimiser.stock import Stock, StockItem

TWO_STAGE = Stack.parse(
    [
        "2 x 40 x 0.20",
        "1 x 34 x 0.15",
        "1 x 22 x 0.10",
        "1 x 36 x 0.20",
        "1 x 24 x 0.2",
        "2 x 20 x 0.3",
    ]
)
STOCK = Stock(
    [
        StockItem(40, 12, 0.2, 1, bin="A"),
        StockItem(40, 12, 0.2, 5, bin="B"),
        StockItem(40, 8, 0.2, 9, bin="other bore"),
        StockItem(34, 12, 0.15, 1, measured_mm=0.152, bin="C"),
        StockItem(22, 12, 0.1, 4),
        StockItem(36, 12, 0.2, 3, bin="D"),
        StockItem(24, 12, 0.2, 1, bin="E"),
        StockItem(20, 12, 0.3, 2, bin="F"),
    ]
)
DRAWER = Drawer("tin", STOCK, 12.0)


def test_roles_of_two_stages() -> None:
    assert roles_of(TWO_STAGE) == ["face", "shim", "crossover", "shim", "shim", "clamp"]


def test_roles_of_a_plain_taper_and_of_a_ring() -> None:
    assert roles_of(Stack.parse(["1 x 30 x 0.2", "1 x 20 x 0.2"])) == ["face", "clamp"]
    ringed = ["2 x 40 x 0.25", "1 x 36 x 0.10 / 30", "1 x 34 x 0.2", "2 x 20 x 0.3"]
    assert roles_of(Stack.parse(ringed)) == ["face", "ring", "shim", "clamp"]


def test_gap_of_a_crossover_in_two_thicknesses() -> None:
    stack = Stack.parse(
        ["1 x 40 x 0.2", "1 x 22 x 0.1", "1 x 22 x 0.15", "1 x 36 x 0.2", "1 x 20 x 0.3"]
    )
    steps = build_steps(stack)
    assert [step.role for step in steps] == ["face", "shim", "crossover", "shim", "clamp"]
    assert steps[2].gap_mm == pytest.approx(0.25)


def test_bins_are_those_drawn_from_and_left_is_what_they_hold_after() -> None:
    steps = build_steps(TWO_STAGE, drawer=DRAWER)
    assert [step.bins for step in steps] == [("A", "B"), ("C",), (), ("D",), ("E",), ("F",)]
    assert [step.left for step in steps] == [4, 0, 3, 2, 0, 0]


def test_without_a_drawer_nothing_is_said_of_stock() -> None:
    assert all(step.left is None and step.bins == () for step in build_steps(TWO_STAGE))


def test_measured_thickness_is_told_where_it_differs() -> None:
    pieces = [Shim(34, 0.152) if shim == Shim(34, 0.15) else shim for shim in TWO_STAGE.pieces]
    steps = build_steps(TWO_STAGE, real=Stack.of(pieces), drawer=DRAWER)
    assert [step.measured_mm for step in steps] == [(), (0.152,), (), (), (), ()]


def test_a_stack_that_is_not_in_stock_is_said_so() -> None:
    stack = Stack.parse(["3 x 36 x 0.20", "2 x 24 x 0.20", "2 x 20 x 0.30"])
    assert shortages(stack, DRAWER) == ["tin lacks 1 x 24 x 0.20 mm"]
    assert shortages(TWO_STAGE, DRAWER) == []
    assert shortages(stack, None) == []
    assert [step.bins for step in build_steps(stack, drawer=DRAWER)] == [("D",), ("E",), ("F",)]
