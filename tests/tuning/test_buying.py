"""A drawer that lacks one size of a known stack: that size is what to buy."""

from dataclasses import replace

import pytest

from optimiser.files import read_damper, read_oil, read_steel
from optimiser.prediction import Setup, predict
from optimiser.search.engine import Settings
from optimiser.search.find import Order
from optimiser.stack import Shim, Stack
from optimiser.stock import Stock, StockItem
from optimiser.tuning.buying import (
    Need,
    beyond,
    lacking,
    need_of,
    usual_sizes,
    what_to_buy,
)
from optimiser.tuning.executors import Here
from optimiser.tuning.runner import Forgetful
from optimiser.wanted.target import Target

WANTED = Stack.parse(
    ["3 x 40 x 0.25", "1 x 36 x 0.20", "1 x 32 x 0.20", "1 x 28 x 0.20", "2 x 20 x 0.30"]
)
DRAWER = Stock(
    StockItem(outer, 12.0, thickness, count)
    for outer, thickness, count in (
        (40, 0.15, 2), (36, 0.20, 1), (32, 0.20, 1), (28, 0.20, 1), (20, 0.30, 4),
    )
)  # fmt: skip
SHOP = Stock(
    StockItem(outer, 12.0, thickness, 10)
    for outer, thickness in ((30, 0.15), (40, 0.25), (26, 0.10), (20, 0.30))
)
MISSING = Shim(40, 0.25)


@pytest.fixture(scope="module")
def need() -> Need:
    """A cell that wants what ``WANTED`` does, from a drawer without its face shims."""
    damper = read_damper("rear-monotube")
    steel, oil = read_steel(damper.steel), read_oil(damper.oil)
    setup = Setup(damper, "compression", steel, oil, damper.oil_temp_c)
    velocity = [0.05, 0.1, 0.2, 0.3, 0.45, 0.6]
    seen = predict(setup, WANTED, velocity, 11)
    target = Target.of(velocity, seen.force_n, direction="compression")
    settings = Settings(evaluations=300)
    order = Order(setup, target, tuple(DRAWER), click_range=(11, 11), settings=settings)
    return need_of(order, 12.0, Here(), Forgetful())


def test_the_missing_size_comes_first(need: Need) -> None:
    found = what_to_buy({0: need}, SHOP, 1.0, Here(), Forgetful())
    assert need.error_percent > 5.0
    assert found[0].sizes == (MISSING,)
    assert found[0].fixed == (0,)
    assert found[0].error_percent[0] < 1.0
    assert found[0].pieces[0] >= 1
    assert all(one.error_percent[0] <= need.error_percent for one in found)


def test_what_is_lacking(need: Need) -> None:
    """Sizes there are enough of are left out; of the others as many as are missing."""
    assert {(item.outer_mm, item.quantity) for item in lacking(need, SHOP)} == {
        (30, 6), (40, 6), (26, 6), (20, 2),
    }  # fmt: skip
    assert beyond(need.order, WANTED) == {MISSING: 3}
    assert lacking(replace(need, post_mm=8.0), SHOP) == ()


def test_usual_sizes_fit_the_valve() -> None:
    valve = read_damper("rear-monotube").circuit("compression").searched
    sizes = usual_sizes([valve])
    assert valve.post is not None
    assert all(item.fits(valve.post.post_mm) for item in sizes)
    assert max(item.outer_mm for item in sizes) <= valve.post.clearance_mm
    assert {item.thickness_mm for item in sizes} == {0.10, 0.15, 0.20, 0.25, 0.30}
