"""Targets relative to a fitted stack's prediction."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import BadInput
from optimiser.wanted.change import LEAST_SLOPE, Wish, changed

SPEEDS = np.geomspace(0.04, 1.5, 10)


def knee_curve(knee: float, low: float = 2.0, high: float = 0.6) -> np.ndarray:
    """A power law low of velocity under the knee, high above, joined smoothly."""
    ratio = SPEEDS / knee
    return 400 * (knee / 0.2) ** low * ratio**low * (1 + ratio**4) ** ((high - low) / 4)


def test_no_change_is_no_change():
    force = knee_curve(0.2)
    target = changed(SPEEDS, force, direction="rebound")
    assert target.force_n == pytest.approx(force, rel=1e-12)
    assert target.direction == "rebound"
    assert target.origin == "fitted stack: no change"
    assert target.notes == ()


def test_equal_wishes_scale_the_whole_curve():
    force = knee_curve(0.2)
    target = changed(SPEEDS, force, low_percent=12, mid_percent=12, high_percent=12)
    assert target.force_n == pytest.approx(1.12 * force, rel=1e-12)


def test_wishes_hold_in_the_middle_of_the_bands_and_at_the_ends():
    speeds = np.geomspace(0.05, 1.35, 7)
    force = 1000 * speeds
    target = changed(speeds, force, low_percent=20, mid_percent=0, high_percent=-15)
    ratio = target.force_n / force
    assert ratio[[0, 1]] == pytest.approx([1.2, 1.2], rel=1e-3)
    assert ratio[3] == pytest.approx(1.0, rel=1e-3)
    assert ratio[[5, 6]] == pytest.approx([0.85, 0.85], rel=1e-3)
    assert "low +20 %, high -15 %" in target.origin


def test_change_is_smooth():
    speeds = np.geomspace(0.05, 1.35, 300)
    target = changed(speeds, 1000 * speeds, low_percent=20, high_percent=-15)
    slope = np.diff(np.log(target.force_n)) / np.diff(np.log(speeds))
    assert np.abs(np.diff(slope)).max() < 0.02


@given(
    st.floats(0.1, 2.2),
    st.floats(0.1, 2.2),
    *[st.floats(-80.0, 300.0)] * 3,
    st.floats(-60.0, 150.0),
)
@settings(max_examples=80)
def test_never_falls_whatever_is_wished(low_power, high_power, low, mid, high, knee):
    force = knee_curve(0.2, low_power, high_power)
    target = changed(
        SPEEDS, force, low_percent=low, mid_percent=mid, high_percent=high, knee_percent=knee
    )
    rise = np.diff(np.log(target.force_n)) / np.diff(np.log(SPEEDS))
    assert rise.min() >= LEAST_SLOPE * (1 - 1e-6)


def test_a_bent_wish_says_so():
    force = knee_curve(0.2, 1.0, 0.3)
    target = changed(SPEEDS, force, low_percent=100, high_percent=-70)
    (note,) = target.notes
    assert "the target was bent, most at" in note


@pytest.mark.parametrize("percent", [-40.0, 30.0, 80.0])
def test_knee_moves_along_the_low_speed_line(percent):
    target = changed(SPEEDS, knee_curve(0.25), knee_percent=percent)
    moved = knee_curve(0.25 * (1 + percent / 100))
    # Ten points carry the curve, so the knee is known to a few per cent only.
    assert target.force_n == pytest.approx(moved, rel=0.03)


def test_a_later_knee_leaves_low_speed_alone_and_a_power_law_as_it_is():
    assert changed(SPEEDS, knee_curve(0.3), knee_percent=50).force_n[0] == pytest.approx(
        knee_curve(0.3)[0], rel=1e-3
    )
    straight = 700 * SPEEDS**1.1
    assert changed(SPEEDS, straight, knee_percent=50).force_n == pytest.approx(straight)


def test_bias_of_the_model_cancels():
    """The same relative wish on a prediction that is 30 % off everywhere is 30 % off everywhere."""
    wish = {"low_percent": 15.0, "high_percent": -10.0, "knee_percent": 20.0}
    true = changed(SPEEDS, knee_curve(0.2), **wish).force_n
    biased = changed(SPEEDS, 1.3 * knee_curve(0.2), **wish).force_n
    assert biased / true == pytest.approx(np.full(10, 1.3), rel=1e-12)


def test_wishes_out_of_range_are_all_named():
    with pytest.raises(BadInput) as caught:
        changed(SPEEDS, SPEEDS, low_percent=-100, high_percent=np.nan, knee_percent=900)
    assert caught.value.faults == [
        "the wish for low must be -80 to +300 %, not -100",
        "the wish for high must be -80 to +300 %, not nan",
        "the wish for knee must be -60 to +150 %, not 900",
    ]


def test_a_falling_curve_cannot_be_changed():
    with pytest.raises(BadInput, match="the curve to change falls with velocity"):
        changed([0.1, 0.2, 0.3], [10, 9, 20], low_percent=5)


def test_words():
    assert Wish(low_percent=5, knee_percent=-10).words == "low +5 %, knee -10 %"
