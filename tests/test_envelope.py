"""What a damper can do at all: limits that enclose every stack and that extreme ones come near."""

from dataclasses import replace

import numpy as np
import pytest

from optimiser.cli.inputs import read_given
from optimiser.damper import Bleed
from optimiser.envelope import damper_limits, place_percent
from optimiser.files import bundled_names
from optimiser.prediction import Setup, predict
from optimiser.stack import Stack
from optimiser.wanted.feasible import Limits, feasibility
from optimiser.wanted.target import Target

VELOCITY = (0.02, 0.08, 0.3, 0.9)


@pytest.fixture(scope="module")
def rear() -> Setup:
    return read_given("rear-monotube").setup("compression")


@pytest.mark.parametrize("name", bundled_names("damper"))
def test_the_fitted_stack_lies_between_the_limits_at_every_click(name: str) -> None:
    given = read_given(name)
    for direction in given.directions():
        setup = given.setup(direction)
        limits = damper_limits(setup, VELOCITY)
        assert setup.valve.fitted is not None
        seen = predict(setup, setup.valve.fitted, VELOCITY)
        assert np.all(limits.bare_n <= seen.force_open_n)
        assert np.all(seen.force_closed_n <= limits.shut_n * (1.0 + 1e-9))
        assert np.all(limits.others_n <= limits.bare_n)
        assert limits.preloaded == (setup.valve.seat is not None and setup.valve.seat.height_mm > 0)


def test_a_stack_as_stiff_as_a_block_comes_to_the_firmest(rear: Setup) -> None:
    block = Stack.parse(["20 x 42 x 5", "2 x 26 x 1"])
    shut = damper_limits(rear, VELOCITY).shut_n
    # The slowest point only: the block needs no lift there, at MPa by the hundred it gives way.
    assert predict(rear, block, VELOCITY, 0).force_n[0] == pytest.approx(shut[0], rel=0.02)


def test_a_stack_as_soft_as_foil_comes_to_the_softest(rear: Setup) -> None:
    foil = Stack.parse(["1 x 40 x 0.02", "2 x 16 x 1"])
    bare = damper_limits(rear, VELOCITY).bare_n
    others = damper_limits(rear, VELOCITY).others_n
    force = predict(rear, foil, VELOCITY, rear.clicks_range).force_n
    assert np.all(force >= bare)
    # Half of what a fitted stack adds to the bare valve is far more than the foil adds.
    assert rear.valve.fitted is not None
    fitted = predict(rear, rear.valve.fitted, VELOCITY, rear.clicks_range).force_n
    assert np.all(force - bare < 0.5 * (fitted - bare))
    assert np.all(bare > others)


def test_without_a_bleed_the_firmest_is_locked_and_has_no_place(rear: Setup) -> None:
    valve = rear.valve.model_copy(update={"bleed": Bleed(), "fitted_clicks": None})
    circuit = rear.damper.circuit("compression").model_copy(update={"valves": (valve,)})
    damper = rear.damper.model_copy(update={"compression": circuit})
    limits = damper_limits(replace(rear, damper=damper), VELOCITY)
    assert np.all(np.isinf(limits.shut_n))
    assert np.all(np.isnan(place_percent([100.0] * 4, limits)))


def test_place_is_by_ratio() -> None:
    limits = Limits.of([10.0, 10.0], [1000.0, 40.0], [10.0, 10.0], [1000.0, 40.0])
    assert place_percent([10.0, 40.0], limits) == pytest.approx([0.0, 100.0])
    assert place_percent([100.0, 20.0], limits) == pytest.approx([50.0, 50.0])
    assert place_percent([5.0, 80.0], limits) == pytest.approx([-15.05, 150.0], abs=0.01)


def test_points_outside_say_what_stops_the_damper(rear: Setup) -> None:
    limits = damper_limits(rear, VELOCITY)
    soft = Target.of(VELOCITY, 0.5 * limits.others_n)
    assert {point.reason for point in feasibility(soft, limits).outside} == {"other_parts_too_firm"}
    firm = Target.of(VELOCITY, 1.5 * limits.shut_n)
    assert {point.reason for point in feasibility(firm, limits).outside} == {"bleed_too_large"}
    between = Target.of(VELOCITY[2:], 0.6 * limits.bare_n[2:])
    cut = damper_limits(rear, VELOCITY[2:])
    assert feasibility(between, cut).outside[-1].reason == "ports_too_small"


def test_hotter_oil_and_friction_move_the_limits(rear: Setup) -> None:
    cold, hot = (damper_limits(replace(rear, oil_temp_c=t), VELOCITY) for t in (0.0, 90.0))
    assert np.all(cold.shut_n > hot.shut_n)
    assert np.all(cold.bare_n >= hot.bare_n)
    rough = replace(rear, damper=rear.damper.model_copy(update={"friction_n": 118.0}))
    moved = damper_limits(rough, VELOCITY)
    assert moved.others_n == pytest.approx(damper_limits(rear, VELOCITY).others_n + 100.0)
