"""Which part of the damper stops a wish, and by how much."""

import numpy as np
import pytest

from optimiser.wanted.feasible import Limits, feasibility
from optimiser.wanted.target import Target

SPEEDS = np.array([0.1, 0.3, 1.0])
BARE, SOFT, FIRM = [20, 60, 300], [80, 200, 500], [600, 1500, 3000]
SHUT = [1000, 9000, 90000]


def judged(force, weight=None, **limits):
    keys = {"bare_n": BARE, "shut_n": SHUT, "softest_n": SOFT, "firmest_n": FIRM}
    preloaded = limits.pop("preloaded", False)
    return feasibility(
        Target.of(SPEEDS, force, weight), Limits.of(**{**keys, **limits}, preloaded=preloaded)
    )


def test_inside_the_envelope():
    answer = judged([100, 300, 900])
    assert answer.reachable
    assert answer.points == 3
    assert answer.far_outside is None


def test_half_a_per_cent_beyond_is_still_inside():
    assert judged([600 * 1.004, 1500, 3000 * 1.004]).reachable
    assert not judged([600 * 1.006, 1500, 3000]).reachable


@pytest.mark.parametrize(
    ("force", "limits", "reason", "limit", "percent", "words"),
    [
        ([1200, 1300, 1400], {}, "bleed_too_large", 1000, 20, "the bleed is too large"),
        ([10, 210, 510], {}, "ports_too_small", 20, -50, "the ports are too small"),
        (
            [10, 210, 510],
            {"others_n": [16, 50, 200]},
            "other_parts_too_firm",
            16,
            -37.5,
            "the other valves, friction and gas alone make 16 N",
        ),
        ([900, 1300, 1400], {}, "no_preload", 600, 50, "the seat has no preload"),
        (
            [900, 1300, 1400],
            {"preloaded": True},
            "preload_too_small",
            600,
            50,
            "preload is too small",
        ),
        ([40, 210, 510], {"preloaded": True}, "preload_too_high", 80, -50, "preload is too high"),
        ([40, 210, 510], {}, "no_shim_thin_enough", 80, -50, "no shim thin enough"),
        ([100, 300, 4500], {}, "no_shim_thick_enough", 3000, 50, "no shims thick or many enough"),
        ([90, 250, 400], {"preloaded": True}, "no_shim_thin_enough", 500, -20, "no shim thin"),
    ],
)
def test_the_part_that_stops_it_is_named(force, limits, reason, limit, percent, words):
    (point,) = judged(force, **limits).outside
    assert point.reason == reason
    assert point.limit_n == limit
    assert point.beyond_percent == pytest.approx(percent)
    assert words in point.sentence
    assert f"{limit} N" in point.sentence
    assert f"{abs(percent):.0f} % {'more' if percent > 0 else 'less'} is asked" in point.sentence
    assert f"at {point.velocity_m_s:.3g} m/s {point.wanted_n:.0f} N is wanted" in point.sentence


def test_points_that_do_not_count_are_not_judged():
    answer = judged([9999, 300, 900], [0, 1, 1])
    assert answer.reachable
    assert answer.points == 2


def test_far_outside_needs_every_point():
    assert judged([1, 2, 3]).far_outside is not None
    assert "check its unit" in judged([1, 2, 3]).far_outside
    assert judged([1, 2, 900]).far_outside is None
    assert judged([1, 2, 900], [1, 1, 0]).far_outside is not None


def test_limits_of_another_length_are_a_bug():
    with pytest.raises(ValueError, match="needs 3 forces"):
        judged([1, 2, 3], bare_n=[1, 2])
