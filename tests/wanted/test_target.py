"""Targets, bands, dyno copies."""

import json

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import BadInput
from optimiser.wanted.bands import band_edges_m_s, band_errors, band_of
from optimiser.wanted.dyno_copy import copied
from optimiser.wanted.target import Target, shape_notes

SPEEDS = [0.05, 0.15, 0.45, 1.35]


def test_error_is_the_weighted_root_mean_square():
    target = Target.of(SPEEDS, [100, 200, 300, 400], [1, 1, 2, 0])
    force = np.array([110.0, 200.0, 285.0, 4000.0])
    expected = 100 * np.sqrt((0.1**2 + 0.0 + 2 * 0.05**2) / 4)
    assert target.error_percent(force) == pytest.approx(expected, rel=1e-12)
    assert target.worst(force).velocity_m_s == 0.05
    assert target.worst(force).percent == pytest.approx(10.0)


def test_worst_point_keeps_its_sign():
    target = Target.of(SPEEDS, [100, 200, 300, 400])
    assert target.worst([100, 200, 240, 410]).percent == pytest.approx(-20.0)


def test_curve_of_another_length_is_a_bug_not_bad_input():
    with pytest.raises(ValueError, match="shape"):
        Target.of(SPEEDS, [1, 2, 3, 4]).error_percent([1.0, 2.0])


def test_arrays_cannot_be_changed_and_are_copies():
    speeds = np.array(SPEEDS)
    target = Target.of(speeds, [1, 2, 3, 4])
    speeds[0] = 9.0
    assert target.velocity_m_s[0] == 0.05
    with pytest.raises(ValueError, match="read-only"):
        target.force_n[0] = 5.0


def test_record_is_json_and_complete():
    target = Target.of([0.1, 0.2], [1, 2], direction="rebound", origin="here", notes=["a note"])
    assert json.loads(json.dumps(target.record())) == {
        "direction": "rebound",
        "origin": "here",
        "velocity_m_s": [0.1, 0.2],
        "force_n": [1.0, 2.0],
        "weight": [1.0, 1.0],
        "notes": ["a note"],
    }


@pytest.mark.parametrize(
    ("velocity", "force", "weight", "sentence"),
    [
        ([0.1], [100], None, "at least 2 points, not 1"),
        ([], [], None, "at least 2 points, not 0"),
        ([0.1, 0.2], [100], None, "not 2, 1 and 2"),
        ([0.2, 0.1], [1, 2], None, "point 2: velocity_m_s 0.1 follows 0.2; points must be sorted"),
        ([0.1, 0.1], [1, 2], None, "point 2: velocity_m_s 0.1 appears twice"),
        ([-0.1, 0.1], [1, 2], None, "point 1: velocity_m_s must be a number above 0, not -0.1"),
        ([0.0, 0.1], [1, 2], None, "point 1: velocity_m_s must be a number above 0, not 0"),
        ([0.1, np.nan], [1, 2], None, "point 2: velocity_m_s must be a number above 0, not nan"),
        ([0.1, 0.2], [0, 2], None, "point 1: force_n must be a number above 0, not 0"),
        ([0.1, 0.2], [1, np.inf], None, "point 2: force_n must be a number above 0, not inf"),
        ([0.1, 0.2], [1, 2], [1, -1], "point 2: weight must be 0 or more, not -1"),
        ([0.1, 0.2], [1, 2], [np.nan, 1], "point 1: weight must be 0 or more, not nan"),
        ([0.1, 0.2], [1, 2], [0, 0], "all weights are 0; at least one point must count"),
        ([0.1, 0.2], ["a", 2], None, "a list of numbers is needed"),
        ([[0.1, 0.2]], [[1, 2]], None, "not 2 dimensions"),
    ],
)
def test_bad_points_get_a_clear_sentence(velocity, force, weight, sentence):
    with pytest.raises(BadInput) as caught:
        Target.of(velocity, force, weight)
    assert sentence in str(caught.value)


def test_all_faults_are_told_at_once():
    with pytest.raises(BadInput) as caught:
        Target.of([0.2, 0.1, 0.1], [-1, 2, 3], [1, 1, -1])
    assert len(caught.value.faults) == 4


def test_unknown_direction():
    with pytest.raises(BadInput, match="compression or rebound, not sideways"):
        Target.of([0.1, 0.2], [1, 2], direction="sideways")


@given(st.floats(0.3, 2.2), st.floats(10.0, 2000.0), st.integers(2, 40), st.floats(0.0, 5.0))
@settings(max_examples=40)
def test_resampling_a_power_law_is_exact(power, scale, points, extra):
    speeds = np.array([0.03, 0.1, 0.4, 2.0])
    target = Target.of(speeds, scale * speeds**power, [1, 1 + extra, 1, 1]).resampled(points)
    assert target.velocity_m_s[[0, -1]] == pytest.approx([0.03, 2.0])
    assert target.force_n == pytest.approx(scale * target.velocity_m_s**power, rel=1e-10)


@given(st.lists(st.floats(0.0, 400.0), min_size=2, max_size=9), st.integers(2, 60))
@settings(max_examples=60)
def test_resampling_keeps_a_rising_curve_rising_and_in_its_range(steps, points):
    force = 50.0 + np.cumsum(steps)
    target = Target.of(np.geomspace(0.02, 3.0, len(steps)), force)
    again = target.resampled(points)
    assert np.all(np.diff(again.force_n) >= -1e-9 * force[-1])
    assert again.force_n.min() >= force[0] * (1 - 1e-12)
    assert again.force_n.max() <= force[-1] * (1 + 1e-12)


def test_resampling_passes_through_the_points():
    target = Target.of(SPEEDS, [100, 250, 300, 900])
    assert target.resampled(4).force_n == pytest.approx(target.force_n, rel=1e-9)
    assert target.resampled(7).force_n[::2] == pytest.approx(target.force_n, rel=1e-9)


def test_resampling_refuses_what_it_cannot_do():
    target = Target.of(SPEEDS, [1, 2, 3, 4], [0, 1, 0, 0])
    with pytest.raises(BadInput, match="2 to 500 points, not 1"):
        target.resampled(1)
    with pytest.raises(BadInput, match="misses every point with a weight"):
        target.resampled(2)
    with pytest.raises(BadInput, match=r"known from 0.05 to 1.35 m/s only"):
        target.force_at([2.0])


def test_a_falling_force_is_remarked():
    target = Target.of([0.1, 0.2, 0.4], [100, 90, 120])
    (note,) = shape_notes(target)
    assert "falls from 100 N at 0.1 m/s to 90 N at 0.2 m/s" in note
    assert shape_notes(Target.of([0.1, 0.2], [100, 100])) == []


def test_bands_are_thirds_of_the_log_range():
    assert band_edges_m_s(np.array(SPEEDS)) == pytest.approx((0.15, 0.45))
    assert band_of(np.array([0.05, 0.15, 0.16, 0.45, 0.46, 1.35])).tolist() == [0, 0, 1, 1, 2, 2]


def test_band_errors_split_the_whole_error():
    speeds = np.geomspace(0.05, 1.35, 12)
    target = Target.of(speeds, 1000 * speeds, np.linspace(1, 3, 12))
    force = target.force_n * (1 + 0.1 * np.sin(np.arange(12)))
    bands = band_errors(target, force)
    weights = [target.weight[band_of(speeds) == number].sum() for number in range(3)]
    errors = [bands.low_percent, bands.mid_percent, bands.high_percent]
    whole = np.sqrt(np.average(np.square(errors), weights=weights))
    assert whole == pytest.approx(target.error_percent(force), rel=1e-12)


def test_a_band_without_points_has_no_error():
    bands = band_errors(Target.of([0.05, 1.35], [100, 900]), [110, 900])
    assert bands.low_percent == pytest.approx(10.0)
    assert bands.mid_percent is None
    assert bands.high_percent == pytest.approx(0.0)


def test_copy_of_a_noisy_dyno_run_follows_the_damper():
    random = np.random.default_rng(3)
    speeds = random.uniform(0.02, 1.2, 2000)
    clean = 900 * speeds**0.7
    force = clean * random.normal(1.0, 0.03, speeds.size) + 60.0
    target = copied(speeds, force, direction="rebound", static_force_n=60.0)
    assert target.direction == "rebound"
    assert len(target) == 12
    assert np.all(np.diff(target.force_n) >= 0)
    # 3 % noise on force averaged over some tens of rows a bin, more rows at high speed.
    assert target.force_n == pytest.approx(900 * target.velocity_m_s**0.7, rel=0.03)


def test_copy_of_few_points_keeps_them():
    target = copied([0.4, 0.1, 0.2], [300, 100, 180], direction="compression", points=3)
    assert target.velocity_m_s == pytest.approx([0.1, 0.2, 0.4])
    assert target.force_n == pytest.approx([100, 180, 300])
    assert target.notes == ()


def test_copy_takes_the_median_of_repeats_and_levels_what_falls():
    target = copied(
        [0.1, 0.1, 0.1, 0.2, 0.4], [100, 104, 400, 90, 200], direction="compression", points=3
    )
    assert target.force_n[0] == pytest.approx(target.force_n[1])
    assert target.force_n[0] == pytest.approx(np.sqrt(104 * 90))
    assert "falling forces were levelled, by up to 7.5 %" in target.notes[0]


@pytest.mark.parametrize(
    ("velocity", "force", "static", "sentence"),
    [
        ([0.1, 0.2], [1.0], 0.0, "as many velocities as forces, not 2 and 1"),
        ([0.1, -0.2], [1.0, 2.0], 0.0, "point 2: velocity_m_s must be a number above 0"),
        ([0.1, 0.2], [50.0, 90.0], 60.0, "point 1: force_n less 60 N must be a number above 0"),
        ([0.1, 0.1], [50.0, 90.0], 0.0, "at least 2 different velocities"),
        ([], [], 0.0, "at least 2 different velocities"),
    ],
)
def test_bad_dyno_runs(velocity, force, static, sentence):
    with pytest.raises(BadInput) as caught:
        copied(velocity, force, direction="compression", static_force_n=static)
    assert sentence in str(caught.value)
