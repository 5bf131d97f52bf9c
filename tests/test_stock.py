"""What is on the shelf: taking, putting back, shortages."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import BadInput
from optimiser.stack import Group, Shim, Stack
from optimiser.stock import Stock, StockItem

SHELF = Stock(
    [
        StockItem(24, 12, 0.15, 5, price=1.5, bin="a"),
        StockItem(24, 12, 0.20, 2, measured_mm=0.196),
        StockItem(24, 8, 0.15, 7),
        StockItem(20, 12.2, 0.15, 3, price=1.0),
        StockItem(24, 18, 0.10, 1),
        StockItem(14, 12, 0.30, 4, price=0.5),
        StockItem(10, 8, 0.30, 4),
    ]
)


def test_which_bores_fit() -> None:
    assert [i.inner_mm for i in SHELF.for_post(12)] == [12, 12, 12.2, 12]
    assert [i.inner_mm for i in SHELF.for_post(8)] == [8, 8]
    assert [i.inner_mm for i in SHELF.ring_shims(12)] == [18]
    assert not StockItem(24, 12.4, 0.15, 1).fits(12)
    assert not StockItem(24, 11.9, 0.15, 1).fits(12)


def test_measured_thickness_counts() -> None:
    assert SHELF.items[1].real_mm == 0.196
    assert SHELF.items[0].real_mm == 0.15


def test_take_leaves_the_rest() -> None:
    stack = Stack.parse(["2 x 24 x 0.15", "1 x 24 x 0.10 / 18", "1 x 20 x 0.15", "2 x 14 x 0.30"])
    left = SHELF.take(stack, post_mm=12)
    assert [i.quantity for i in left] == [3, 2, 7, 2, 0, 2, 4]
    assert [i.quantity for i in SHELF] == [5, 2, 7, 3, 1, 4, 4]
    assert left.pieces == SHELF.pieces - stack.parts
    assert left.put_back(stack, post_mm=12) == SHELF


def test_measured_and_nominal_name_the_same_shim() -> None:
    by_measure = Stack.parse(["2 x 24 x 0.196", "1 x 14 x 0.30"])
    by_name = Stack.parse(["2 x 24 x 0.20", "1 x 14 x 0.30"])
    assert SHELF.take(by_measure, 12) == SHELF.take(by_name, 12)


def test_exact_sizes_are_served_before_nominal_ones() -> None:
    shelf = Stock(
        [
            StockItem(24, 12, 0.15, 2, measured_mm=0.147),
            StockItem(24, 12, 0.15, 2, measured_mm=0.153),
            StockItem(14, 12, 0.3, 1),
        ]
    )
    stack = Stack.parse(["2 x 24 x 0.15", "2 x 24 x 0.147", "1 x 14 x 0.30"])
    assert [i.quantity for i in shelf.take(stack)] == [0, 0, 0]


def test_shortage_by_size() -> None:
    stack = Stack.parse(["6 x 24 x 0.15", "3 x 24 x 0.20", "1 x 22 x 0.20", "1 x 14 x 0.30"])
    expected = (
        Group(1, Shim(24.0, 0.15)),
        Group(1, Shim(24.0, 0.20)),
        Group(1, Shim(22.0, 0.20)),
    )
    assert SHELF.shortage(stack, 12) == expected
    with pytest.raises(BadInput) as caught:
        SHELF.take(stack, 12)
    assert caught.value.faults == [f"the stock lacks 1 of {group.shim} mm" for group in expected]


def test_two_bores_need_the_post_named() -> None:
    with pytest.raises(BadInput, match="bores of 8 and 12 mm: name the post"):
        SHELF.shortage(Stack.parse(["1 x 24 x 0.15", "1 x 14 x 0.30"]))
    assert SHELF.shortage(Stack.parse(["1 x 24 x 0.15", "1 x 10 x 0.30"])) == ()


def test_putting_back_a_new_size_needs_its_bore() -> None:
    stack = Stack.parse(["1 x 22 x 0.20", "1 x 14 x 0.30"])
    with pytest.raises(BadInput, match=r"22 x 0.20 mm is not in the stock list: name its post"):
        SHELF.put_back(stack)
    assert SHELF.put_back(stack, 12).items[-1] == StockItem(22, 12, 0.2, 1)


def test_price() -> None:
    assert SHELF.price_of(Stack.parse(["2 x 24 x 0.15", "1 x 14 x 0.30"]), 12) == 3.5
    assert SHELF.price_of(Stack.parse(["1 x 24 x 0.20", "1 x 14 x 0.30"]), 12) is None


@pytest.mark.parametrize(
    ("numbers", "words"),
    [
        ((24, 24, 0.15, 1), "inner_mm 24: allowed: 1 to less than outer_mm 24"),
        ((300, 12, 0.15, 1), "outer_mm 300: allowed: 2 to 200"),
        ((24, 12, 0.0, 1), "thickness_mm 0: allowed: 0.02 to 5"),
        ((24, 12, float("nan"), 1), "thickness_mm nan: allowed: 0.02 to 5"),
        ((24, 12, 0.15, -1), "quantity -1: allowed: a whole number from 0 to 100000"),
        ((24, 12, 0.15, 1, 0.25), "measured_mm 0.25: allowed: within 0.0225 mm of thickness_mm"),
        ((24, 12, 0.15, 1, None, -2.0), "price -2: allowed: 0 or more"),
    ],
)
def test_impossible_items(numbers: tuple[float, ...], words: str) -> None:
    with pytest.raises(BadInput) as caught:
        StockItem(*numbers)  # type: ignore[arg-type]  # the wrong values are the point
    assert words in str(caught.value)


def test_all_faults_of_an_item_at_once() -> None:
    with pytest.raises(BadInput) as caught:
        StockItem(300, 0, 9, -1)
    assert len(caught.value.faults) == 4


items = st.builds(
    StockItem,
    st.sampled_from([20.0, 24.0, 28.0, 32.0]),
    st.sampled_from([12.0, 12.2]),
    st.sampled_from([0.10, 0.15, 0.20]),
    st.integers(0, 6),
)
groups = st.lists(
    st.builds(
        Group,
        st.integers(1, 4),
        st.builds(Shim, st.sampled_from([20.0, 24.0, 28.0]), st.sampled_from([0.10, 0.15, 0.20])),
    ),
    min_size=1,
    max_size=6,
)


def count(stock: Stock, shim: Shim) -> int:
    return sum(
        i.quantity
        for i in stock
        if (i.outer_mm, i.thickness_mm) == (shim.outer_mm, shim.thickness_mm)
    )


@given(st.lists(items, max_size=10), groups)
@settings(max_examples=150, deadline=None)
def test_take_and_put_back(shelf: list[StockItem], wanted: list[Group]) -> None:
    stock = Stock([*shelf, StockItem(14, 12, 0.3, 1)])
    stack = Stack((*wanted, Group(1, Shim(14.0, 0.3))))
    needs: dict[Shim, int] = {}
    for group in wanted:
        needs[group.shim] = needs.get(group.shim, 0) + group.quantity
    missing = {group.shim: group.quantity for group in stock.shortage(stack, 12)}
    expected = {shim: n - count(stock, shim) for shim, n in needs.items() if n > count(stock, shim)}
    assert missing == expected
    if missing:
        with pytest.raises(BadInput):
            stock.take(stack, 12)
        return
    left = stock.take(stack, 12)
    assert all(i.quantity >= 0 for i in left)
    for shim, number in needs.items():
        assert count(left, shim) == count(stock, shim) - number
    back = left.put_back(stack, 12)
    assert all(count(back, shim) == count(stock, shim) for shim in needs)
    assert back.pieces == stock.pieces
    assert back.shortage(stack, 12) == ()
