"""Sizes, rules, plans and stacks."""

from types import SimpleNamespace

import numpy as np
import pytest

from optimiser.damper import Ports, Post, Seat, Valve
from optimiser.faults import BadInput
from optimiser.search.enumerate import all_plans
from optimiser.search.obstacles import obstacles
from optimiser.search.rules import Limits
from optimiser.search.sizes import Sizes
from optimiser.search.space import BROKEN_RULES, Space
from optimiser.stack import Stack

from .cases import build


def line(outer: float, nominal: float, quantity: int, real: float | None = None) -> SimpleNamespace:
    real = nominal if real is None else real
    return SimpleNamespace(outer_mm=outer, thickness_mm=nominal, real_mm=real, quantity=quantity)


def valve(**post: float) -> Valve:
    return Valve(
        name="piston",
        displacement="piston",
        low_side="lowers",
        searched=True,
        ports=Ports(inner_mm=20, outer_mm=30, area_mm2=150, hydraulic_mm=4, length_mm=8),
        seat=Seat(seat_mm=32, land_mm=1),
        post=Post(post_mm=12, **{"height_min_mm": 0.5, "height_max_mm": 3.0, **post}),
        fitted=Stack.parse(["3 x 36 x 0.15", "1 x 30 x 0.15", "1 x 18 x 0.30"]),
    )


STOCK = [line(o, t, 3) for o in (38, 36, 30, 24, 18) for t in (0.1, 0.15, 0.3)]


def test_sizes_are_sorted_merged_and_without_empty_lines() -> None:
    sizes = Sizes.of([line(20, 0.1, 2), line(30, 0.1, 1), line(20, 0.1, 3), line(24, 0.2, 0)])
    assert sizes.outer_mm.tolist() == [30, 20]
    assert sizes.quantity.tolist() == [1, 5]


def test_measured_thickness_counts_and_nominal_is_shown() -> None:
    space = Space.of([*STOCK, line(38, 0.2, 2, real=0.21)], valve())
    size = space.sizes.nearest(38, 0.2)
    assert size is not None
    assert space.sizes.thickness_mm[size] == 0.21
    plan = space.from_stack(Stack.parse(["2 x 38 x 0.20", "1 x 18 x 0.30"]))
    assert plan is not None
    assert space.to_stack(plan).groups[0].shim.thickness_mm == 0.2
    assert space.to_stack(plan, real=True).groups[0].shim.thickness_mm == 0.21


def test_fitted_shims_come_on_top_of_the_stock() -> None:
    fitted = Stack.parse(["2 x 38 x 0.10", "1 x 30 x 0.25", "1 x 18 x 0.30"])
    space = Space.of(STOCK, valve(), fitted=fitted)
    assert space.sizes.quantity[space.sizes.nearest(38, 0.1)] == 5
    assert space.sizes.quantity[space.sizes.nearest(30, 0.25)] == 1


def test_changed_counts_shims_in_and_out() -> None:
    fitted = Stack.parse(["2 x 38 x 0.10", "1 x 30 x 0.30", "1 x 18 x 0.30"])
    space = Space.of(STOCK, valve(), fitted=fitted)
    other = Stack.parse(["1 x 38 x 0.10", "1 x 30 x 0.30", "1 x 24 x 0.15", "1 x 18 x 0.30"])
    plans = np.stack([space.from_stack(fitted), space.from_stack(other)])
    assert space.changed(plans).tolist() == [0, 2]


def test_ring_shims_of_the_fitted_stack_count_as_removed() -> None:
    fitted = Stack.parse(["1 x 38 x 0.10", "1 x 36 x 0.20 / 30", "1 x 38 x 0.10", "1 x 18 x 0.30"])
    space = Space.of(STOCK, valve(), fitted=fitted)
    assert space.from_stack(fitted) is None
    plain = space.from_stack(Stack.parse(["2 x 38 x 0.10", "1 x 18 x 0.30"]))
    assert plain is not None
    assert space.changed(plain[None]).tolist() == [1]


def test_stacks_survive_the_way_through_a_plan() -> None:
    space = Space.of(STOCK, valve())
    lines = ["2 x 38 x 0.15", "1 x 36 x 0.10", "1 x 24 x 0.10", "1 x 36 x 0.30", "1 x 30 x 0.15"]
    stack = Stack.parse([*lines, "1 x 18 x 0.30"])
    plan = space.from_stack(stack)
    assert plan is not None
    assert space.to_stack(plan).bending == stack.bending
    assert space.buildable(plan[None]).all()


def test_every_plan_of_a_space_survives_the_way_through_a_stack() -> None:
    case = build([(34.0, 0.1, 2), (30.0, 0.2, 1), (22.0, 0.1, 2), (16.0, 0.1, 3)], parts=7)
    plans = all_plans(case.space, 10_000)
    assert plans is not None and len(plans) > 20
    for plan in plans:
        assert np.array_equal(case.space.from_stack(case.space.to_stack(plan)), plan)


def test_missing_height_is_made_up_with_clamp_shims() -> None:
    space = Space.of(STOCK, valve(height_min_mm=0.9))
    plan = space.from_stack(Stack.parse(["2 x 38 x 0.15", "1 x 18 x 0.15"]))
    assert plan is not None
    stack = space.to_stack(plan)
    assert stack.lines()[-1] == "2 x 18 x 0.30", "two thick ones, not four of 0.15 mm"
    assert stack.height_mm == pytest.approx(0.9)
    assert space.parts(plan[None]).tolist() == [4]


@pytest.mark.parametrize(
    ("lines", "rule"),
    [
        (["1 x 30 x 0.15", "1 x 18 x 0.30"], "face shim does not cover the seat"),
        (["1 x 38 x 0.15", "1 x 24 x 0.30"], "clamp shim not the narrowest or over the ports"),
        (["4 x 38 x 0.15", "1 x 18 x 0.30"], "more shims than in stock"),
        (["1 x 38 x 0.10", "1 x 18 x 0.15"], None),
        (["3 x 38 x 0.30", "3 x 36 x 0.30", "3 x 30 x 0.30", "1 x 24 x 0.30", "1 x 18 x 0.30"], ""),
    ],
)
def test_broken_rules_are_named(lines: list[str], rule: str | None) -> None:
    space = Space.of(STOCK, valve())
    plan = space._plain_plan(Stack.parse(lines))
    assert plan is not None
    broken = [BROKEN_RULES[i] for i in np.flatnonzero(space.violations(plan[None])[0])]
    if rule is None:
        assert broken == [], "two more clamp shims make up the height"
    else:
        assert (rule or "height or parts out of limits") in broken


def test_too_many_face_shims_asked_for_is_named() -> None:
    space = Space.of(STOCK, valve(), Limits(face_min=3))
    plan = space._plain_plan(Stack.parse(["2 x 38 x 0.15", "1 x 18 x 0.30"]))
    assert plan is not None
    assert space.violations(plan[None])[0, BROKEN_RULES.index("too few face shims")]


@pytest.mark.parametrize(
    ("stock", "limits", "words"),
    [
        ([], Limits(), "holds no shim"),
        ([line(38, 0.1, 0)], Limits(), "holds no shim"),
        ([line(30, 0.1, 5), line(18, 0.1, 2)], Limits(), "covers the seat"),
        ([line(38, 0.1, 2), line(18, 0.1, 2)], Limits(face_min=3), "Too few face shims"),
        ([line(38, 0.1, 5), line(24, 0.1, 2)], Limits(), "No clamp shim"),
        ([line(38, 0.1, 2), line(18, 0.1, 2)], Limits(), "least height"),
        (STOCK, Limits(height_min_mm=0.1, height_max_mm=0.15), "greatest height"),
        (STOCK, Limits(parts=3, stages=(2,)), "need at least 4"),
        ([line(38, 0.3, 5), line(18, 0.3, 2)], Limits(stages=(2,)), "No crossover"),
        (
            [line(38, 0.3, 1), line(30, 0.3, 1), line(18, 0.3, 1)],
            Limits(height_min_mm=0.65, height_max_mm=0.7),
            "exclude each other",
        ),
    ],
)
def test_the_rule_that_stops_everything_is_named(
    stock: list[SimpleNamespace], limits: Limits, words: str
) -> None:
    space = Space.of(stock, valve(), limits)
    assert all_plans(space, 10) is not None and len(all_plans(space, 10)) == 0  # type: ignore[arg-type]
    assert words in " ".join(obstacles(space))


def test_limits_name_everything_that_is_wrong() -> None:
    with pytest.raises(BadInput) as error:
        Limits(parts=1, face_min=5, stages=())
    assert len(error.value.faults) == 3
    with pytest.raises(BadInput, match="stack height"):
        Space.of(STOCK, valve(), Limits(height_min_mm=4))
