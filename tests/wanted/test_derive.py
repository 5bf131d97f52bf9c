"""Rider, frame and feel become targets; feels in words; the rebound rule."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.checking import validate
from optimiser.faults import BadInput
from optimiser.wanted.derive import derive, ride_of, shaft_target
from optimiser.wanted.feel import Feel, compared, explained
from optimiser.wanted.rebound_rule import rebound_notes
from optimiser.wanted.target import Target

from .builders import constant_lever, feel, frame, frames, rider, riders, stroke_feel, stroke_feels


@given(frames(), riders, stroke_feels, st.floats(5.0, 50.0))
@settings(max_examples=60)
def test_targets_rise_and_are_positive(any_frame, any_rider, any_feel, sag):
    target = shaft_target(ride_of(any_rider, any_frame, sag), any_feel, "compression", "test")
    assert np.all(target.force_n > 0.0)
    assert np.all(np.diff(target.force_n) > 0.0)


@given(stroke_feels)
@settings(max_examples=60)
def test_wheel_force_rises_at_every_speed(any_feel):
    force = any_feel.wheel_force_n(np.geomspace(1e-3, 30.0, 800), 1500.0)
    assert np.all(np.diff(force) > 0.0)


def test_damping_ratio_has_the_limits_it_names():
    plain = stroke_feel(progressive=0.0)
    assert plain.damping_ratio([1e-9, 0.6, 1e9]) == pytest.approx([0.22, 0.145, 0.07])
    square = stroke_feel(progressive=1.0)
    far = square.damping_ratio([1e6, 2e6])
    assert far[1] / far[0] == pytest.approx(2.0, rel=1e-5)


@given(st.floats(30.0, 120.0), st.floats(1.1, 2.0), st.floats(5.0, 50.0))
@settings(max_examples=40)
def test_force_scales_with_the_sprung_mass_at_equal_sag(mass, times, sag):
    """k grows with the mass at equal sag, so c = 2 z sqrt(k m) grows with the mass itself."""
    bare = frame(sprung_kg=0.0)
    one = derive(rider(mass), bare, feel(), sag)
    other = derive(rider(mass * times), bare, feel(), sag)
    for direction in ("compression", "rebound"):
        ratio = other.target(direction).force_n / one.target(direction).force_n
        assert ratio == pytest.approx(np.full(10, times), rel=1e-9)


@given(st.floats(1.0, 3.0), st.floats(1.1, 2.0))
@settings(max_examples=40)
def test_leverage_scales_force_up_and_speed_down(ratio, times):
    """Same wheel, other leverage: F_s(v) = LR F_w(LR v)."""
    one = derive(rider(), constant_lever(ratio), feel(), 30.0).compression
    coil = {"spring": {"kind": "coil", "preload_mm": 6.0 / times}}
    other = derive(rider(), constant_lever(ratio * times, **coil), feel(), 30.0).compression
    assert other.velocity_m_s == pytest.approx(one.velocity_m_s / times, rel=1e-9)
    assert other.force_n == pytest.approx(one.force_n * times, rel=1e-9)


def test_low_speed_force_is_the_ratio_times_critical_damping():
    slow = stroke_feel(slowest_wheel_m_s=0.02, knee_wheel_m_s=12.0, progressive=0.0)
    ride = ride_of(rider(), frame(), 30.0)
    target = shaft_target(ride, slow, "compression", "test")
    # At 0.02 m/s with the knee at 12 m/s the ratio is 0.1 % below its low-speed value.
    expected = 0.22 * ride.critical_shaft_n_s_m * target.velocity_m_s[0]
    assert target.force_n[0] == pytest.approx(expected, rel=2e-3)


def test_critical_damping_follows_from_rate_and_mass():
    ride = ride_of(rider(), frame(), 30.0)
    assert ride.critical_wheel_n_s_m**2 == pytest.approx(
        4.0 * 1e3 * ride.wheel_rate_n_mm * ride.sprung_kg
    )
    assert ride.critical_shaft_n_s_m == pytest.approx(
        ride.critical_wheel_n_s_m * frame().lever.ratio_at(ride.sag_travel_mm) ** 2
    )
    assert ride.body_hz == pytest.approx(ride.critical_wheel_n_s_m / (4.0 * np.pi * ride.sprung_kg))


def test_origin_names_rider_frame_and_feel():
    derived = derive(rider(82.0), frame(), feel())
    assert derived.compression.origin == "82 kg on bench frame, bench feel"
    assert derived.rebound.direction == "rebound"
    assert derived.ride.sag_percent == pytest.approx(30.0)


@pytest.mark.parametrize(
    ("changes", "sentence"),
    [
        (
            {"low_damping_ratio": 0.01},
            "key compression.low_damping_ratio: damping ratio must be 0.02 to 2, not 0.01",
        ),
        ({"high_damping_ratio": 2.5}, "damping ratio must be 0.02 to 2, not 2.5"),
        ({"high_damping_ratio": float("nan")}, "damping ratio must be 0.02 to 2, not nan"),
        ({"knee_wheel_m_s": 0}, "wheel speed must be 0.02 to 12 m/s, not 0"),
        ({"progressive": -0.1}, "progressive must be 0 to 1, not -0.1"),
        ({"fastest_wheel_m_s": 0.15}, "fastest_wheel_m_s must be at least twice"),
        ({"low_ratio": 0.3}, "key compression.low_ratio is not known"),
    ],
)
def test_bad_feels_get_a_clear_sentence(changes, sentence):
    data = feel().model_dump()
    data["compression"] = {**data["compression"], **changes}
    with pytest.raises(BadInput) as caught:
        validate(Feel, data, "feel.toml")
    assert sentence in str(caught.value)


def test_a_feel_is_explained_with_its_own_numbers():
    text = " ".join(explained(feel()))
    for number in ("0.6 m/s", "0.22", "0.07", "0.36", "0.3"):
        assert number in text
    gentle = feel().model_copy(update={"compression": stroke_feel(progressive=0.0)})
    assert "no extra braking" in " ".join(explained(gentle))


def test_feels_are_compared_in_words():
    firm = feel().model_copy(
        update={
            "compression": stroke_feel(low_damping_ratio=0.33, knee_wheel_m_s=0.45, progressive=0.2)
        }
    )
    assert compared(firm, feel()) == [
        "compression low speed: 50 % firmer than bench feel",
        "compression knee: 25 % earlier than bench feel",
        "compression: more progressive than bench feel",
    ]
    assert compared(feel(), feel()) == []


def test_rebound_rule_common_practice_no_source():
    """Common practice, no source: harder, over a smaller range, linear to slightly progressive."""
    speeds = np.geomspace(0.05, 1.4, 8)
    squash = Target.of(speeds, 900 * speeds**0.8)
    kept = Target.of(speeds[:-2], 3000 * speeds[:-2] ** 1.05, direction="rebound")
    assert rebound_notes(squash, kept) == []
    assert derive(rider(), frame(), feel()).notes == ()


@pytest.mark.parametrize(
    ("scale", "power", "last", "sentence"),
    [
        (500, 1.0, 0.8, "rebound is usually damped harder than compression"),
        (3000, 1.0, 1.6, "rebound usually works over a smaller velocity range"),
        (3000, 0.6, 0.8, "the power is 0.60"),
        (9000, 1.8, 0.8, "the power is 1.80"),
    ],
)
def test_each_departure_from_the_rebound_rule_is_named(scale, power, last, sentence):
    speeds = np.geomspace(0.1, 1.4, 8)
    back = np.geomspace(0.1, last, 8)
    squash = Target.of(speeds, 900 * speeds**0.8)
    notes = rebound_notes(squash, Target.of(back, scale * back**power, direction="rebound"))
    assert any(sentence in note for note in notes)
    assert all(note.endswith("(common practice, no source)") for note in notes)


def test_rebound_rule_without_shared_speeds_only_looks_at_the_rest():
    squash = Target.of([0.5, 1.0], [500, 900])
    back = Target.of([0.1, 0.2], [300, 600], direction="rebound")
    assert rebound_notes(squash, back) == []
