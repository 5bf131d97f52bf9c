"""Leverage, springs, sag: statics of a rider on a frame."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import trapezoid

from optimiser.checking import validate
from optimiser.faults import BadInput
from optimiser.wanted.derive import ride_of, stroke_notes
from optimiser.wanted.frame import Frame
from optimiser.wanted.leverage import Leverage
from optimiser.wanted.rider import Rider
from optimiser.wanted.sag import (
    coil_for_sag,
    energies_j,
    sag_percent,
    sag_travel_mm,
    travel_under_load_mm,
    wheel_force_n,
    wheel_rate_n_mm,
)
from optimiser.wanted.spring import CoilSpring

from .builders import constant_lever, frame, frames, rider, riders

AIR = {
    "kind": "air",
    "stroke_mm": [0, 10, 30, 60, 90, 120, 150],
    "force_n": [130, 220, 370, 540, 740, 1080, 1850],
}


def air_fork(**changes):
    """A frame with leverage 1 and an air spring."""
    keys = {"spring": AIR, "share_of_mass": 0.4, "sprung_kg": 11.0, "unsprung_kg": 2.0}
    return constant_lever(1.0, 150.0, **{**keys, **changes})


def test_stroke_is_the_integral_of_the_inverse_leverage():
    lever = frame().lever
    travel = np.linspace(0, 240, 20001)
    inverse = np.array([lever.stroke_per_travel(float(x)) for x in travel])
    assert lever.full_stroke_mm == pytest.approx(trapezoid(inverse, travel), rel=1e-8)
    assert lever.ratio_at(60.0) == pytest.approx(2.8)


@given(frames(), st.floats(0.0, 1.0))
@settings(max_examples=40)
def test_leverage_stays_between_its_points_and_inverts(any_frame, part):
    lever = any_frame.lever
    travel = part * lever.full_travel_mm
    assert lever.ratio.min() * (1 - 1e-9) <= lever.ratio_at(travel)
    assert lever.ratio_at(travel) <= lever.ratio.max() * (1 + 1e-9)
    assert lever.travel_at_mm(lever.stroke_mm(travel)) == pytest.approx(travel, abs=1e-8)


@given(frames(), riders, st.floats(5.0, 50.0), st.floats(0.0, 100.0))
@settings(max_examples=60)
def test_coil_from_sag_balances_forces_and_energy(any_frame, any_rider, sag, gas):
    ride = ride_of(any_rider, any_frame, sag, gas)
    lever, travel = any_frame.lever, ride.sag_travel_mm
    assert wheel_force_n(lever, ride.spring, travel) == pytest.approx(ride.load_n, rel=1e-12)
    work, energy = energies_j(lever, ride.spring, travel)
    assert work == pytest.approx(energy, rel=1e-9)
    assert sag_percent(any_frame, travel) == pytest.approx(sag, rel=1e-9)


@given(st.floats(60.0, 200.0), st.floats(0.2, 0.6))
@settings(max_examples=30)
def test_air_spring_balances_forces_and_energy(mass, share):
    fork = air_fork(share_of_mass=share)
    load = share * (mass + 11.0) * 9.80665
    if not 200.0 < load < 600.0:
        return
    ride = ride_of(rider(mass), fork)
    assert ride.coil_n_mm is None
    assert wheel_force_n(fork.lever, ride.spring, ride.sag_travel_mm) == pytest.approx(load)
    work, energy = energies_j(fork.lever, ride.spring, ride.sag_travel_mm)
    assert work == pytest.approx(energy, rel=1e-9)


def test_air_spring_over_varying_leverage_balances_energy():
    bent = air_fork(leverage={"travel_mm": [0, 70, 150], "ratio": [1.3, 1.1, 1.0]})
    ride = ride_of(rider(), bent)
    work, energy = energies_j(bent.lever, ride.spring, ride.sag_travel_mm)
    assert work == pytest.approx(energy, rel=1e-9)


@given(frames(), riders, st.floats(5.0, 50.0))
@settings(max_examples=40)
def test_computed_coil_gives_its_sag_back(any_frame, any_rider, sag):
    ride = ride_of(any_rider, any_frame, sag)
    found = travel_under_load_mm(ride.load_n, any_frame.lever, ride.spring)
    assert wheel_force_n(any_frame.lever, ride.spring, found) == pytest.approx(ride.load_n)
    assert found <= ride.sag_travel_mm * (1 + 1e-9)


def test_wheel_rate_is_the_slope_of_the_wheel_force():
    lever, spring = frame().lever, CoilSpring(60.0, 8.0, 150.0)
    for travel in (20.0, 75.0, 130.0, 200.0):
        forces = [wheel_force_n(lever, spring, travel + step) for step in (-1e-3, 1e-3)]
        slope = (forces[1] - forces[0]) / 2e-3
        assert wheel_rate_n_mm(lever, spring, travel) == pytest.approx(slope, rel=1e-6)


def test_more_preload_and_gas_ask_for_a_softer_coil():
    plain = coil_for_sag(900.0, frame().lever, 80.0)
    assert coil_for_sag(900.0, frame().lever, 80.0, preload_mm=10.0).coil_n_mm < plain.coil_n_mm
    assert coil_for_sag(900.0, frame().lever, 80.0, gas_force_n=200.0).coil_n_mm < plain.coil_n_mm


def test_sag_can_be_counted_on_the_shaft():
    by_shaft = frame(sag_of="shaft_stroke")
    travel = sag_travel_mm(by_shaft, 30.0)
    assert by_shaft.lever.stroke_mm(travel) == pytest.approx(0.3 * by_shaft.lever.full_stroke_mm)
    assert sag_travel_mm(frame(), 30.0) == pytest.approx(72.0)


def test_known_coil_gives_the_sag():
    asked = ride_of(rider(), frame(), 33.0)
    known = frame(spring={"kind": "coil", "rate_n_mm": asked.coil_n_mm, "preload_mm": 6.0})
    found = ride_of(rider(), known)
    assert found.sag_percent == pytest.approx(33.0, rel=1e-9)
    assert found.wheel_rate_n_mm == pytest.approx(asked.wheel_rate_n_mm, rel=1e-9)


@pytest.mark.parametrize(
    ("changes", "sag", "mass", "sentence"),
    [
        ({}, 4.9, 82, "sag must be 5 to 50 %, not 4.9"),
        ({}, 51.0, 82, "sag must be 5 to 50 %, not 51"),
        ({}, float("nan"), 82, "sag must be 5 to 50 %, not nan"),
        ({"spring": {"rate_n_mm": 3.0}}, None, 82, "the spring cannot hold the rider: at most"),
        (
            {"spring": {"rate_n_mm": 40.0}},
            None,
            110,
            "the spring of bench frame is too soft for this rider: sag would be",
        ),
        (
            {"spring": {"rate_n_mm": 600.0, "preload_mm": 1.0}},
            None,
            30,
            "the spring of bench frame is too firm for this rider: sag would be",
        ),
        (
            {"spring": {"rate_n_mm": 300.0, "preload_mm": 40.0}},
            None,
            82,
            "the spring stays topped out: it pushes",
        ),
        ({"spring": {"rate_n_mm": 60.0}}, 30.0, 82, "names its spring, so the sag follows from it"),
        (
            {"spring": {"kind": "air", "stroke_mm": [0, 20, 40], "force_n": [0, 1000, 3000]}},
            None,
            82,
            "the air spring's points end at 40 mm of stroke, but the frame uses",
        ),
        (
            {"leverage": {"travel_mm": [0, 60, 120, 240], "ratio": [2.0, 2.2, 5.5, 9.0]}},
            40.0,
            82,
            "the leverage rises so fast there that the wheel goes on sinking",
        ),
    ],
)
def test_statics_that_cannot_be(changes, sag, mass, sentence):
    with pytest.raises(BadInput) as caught:
        ride_of(rider(mass), frame(**changes), sag)
    assert sentence in str(caught.value)


def test_gas_that_holds_the_rider_alone():
    with pytest.raises(BadInput, match="gas force of 5000 N on the shaft already holds"):
        ride_of(rider(), frame(), 30.0, gas_force_n=5000.0)


def test_air_spring_too_weak_for_the_rider():
    weak = {**AIR, "force_n": [13, 22, 37, 54, 74, 108, 185]}
    with pytest.raises(BadInput, match="the spring cannot hold the rider"):
        ride_of(rider(), air_fork(spring=weak))


@pytest.mark.parametrize(
    ("changes", "sentence"),
    [
        (
            {"leverage": {"travel_mm": [0, 240], "ratio": [2.5, 0]}},
            "key leverage: leverage ratio at travel_mm 240 must be above 0 and at most 20, not 0",
        ),
        (
            {"leverage": {"travel_mm": [0, 240], "ratio": [-2.5, 2]}},
            "leverage ratio at travel_mm 0 must be above 0 and at most 20, not -2.5",
        ),
        (
            {"leverage": {"travel_mm": [0, 120, 100, 240], "ratio": [2, 2, 2, 2]}},
            "leverage travel_mm 100 follows 120; travel must rise at every point",
        ),
        (
            {"leverage": {"travel_mm": [5, 240], "ratio": [2, 2]}},
            "leverage travel_mm must start at 0 (topped out), not 5",
        ),
        (
            {"leverage": {"travel_mm": [0, 200], "ratio": [2, 2]}},
            "the leverage points end at travel_mm 200, but must end at wheel_travel_mm 240",
        ),
        (
            {"leverage": {"travel_mm": [0, 240], "ratio": [2]}},
            "leverage needs 2 or more points, as many travel_mm as ratio, not 2 and 1",
        ),
        ({"sag_percent": 55}, "key sag_percent: sag_percent must be 5 to 50 %, not 55"),
        ({"share_of_mass": 1.5}, "share_of_mass must be 0.1 to 1, not 1.5"),
        ({"wheel_travel_mm": float("nan")}, "wheel_travel_mm must be 20 to 500 mm, not nan"),
        ({"spring": {"kind": "oil"}}, "key spring.kind: "),
        ({"spring": {"rate": 30}}, "did you mean rate_n_mm?"),
        ({"spring": {"rate_n_mm": -1}}, "key spring.rate_n_mm: coil rate must be 1 to 2000 N/mm"),
        ({"spring": {"preload_mm": -1}}, "coil preload must be 0 to 60 mm, not -1"),
        ({"spring": {"kind": "air"}}, "an air spring needs 3 or more points"),
        (
            {"spring": {**AIR, "rate_n_mm": 30}},
            "an air spring has no rate_n_mm and no preload_mm; leave them out",
        ),
        ({"spring": {**AIR, "kind": "coil"}}, "stroke_mm and force_n describe an air spring"),
        (
            {"spring": {"kind": "air", "stroke_mm": [0, 9, 9], "force_n": [1, 2, 3]}},
            "stroke_mm must start at 0 and rise at every point",
        ),
        (
            {"spring": {"kind": "air", "stroke_mm": [0, 5, 9], "force_n": [1, 3, 2]}},
            "force_n must be 0 or more and rise at every point",
        ),
    ],
)
def test_bad_frames_get_a_clear_sentence(changes, sentence):
    data = {**frame().model_dump(), **changes}
    with pytest.raises(BadInput) as caught:
        validate(Frame, data, "mine.toml")
    assert sentence in str(caught.value)
    assert str(caught.value).startswith("mine.toml: ")


@pytest.mark.parametrize("mass", [19.9, 251.0, -80.0, float("nan")])
def test_absurd_riders(mass):
    with pytest.raises(BadInput, match="rider mass with kit must be 20 to 250 kg, not"):
        validate(Rider, {"mass_kg": mass}, "--rider-kg")


def test_all_faults_of_a_leverage_are_told_at_once():
    leverage = {"travel_mm": [0, 120, 100, 240], "ratio": [2, -2, 0, 2]}
    with pytest.raises(BadInput) as caught:
        validate(Frame, {**frame().model_dump(), "leverage": leverage}, "mine.toml")
    assert len(caught.value.faults) == 3


def test_a_damper_too_short_for_the_frame_is_remarked():
    (note,) = stroke_notes(frame(), 60.0)
    assert "mm of shaft stroke for its 240 mm of wheel travel, the damper has 60 mm" in note
    assert stroke_notes(frame(), 120.0) == []


def test_lever_of_one_ratio_is_a_plain_division():
    lever = Leverage(np.array([0.0, 100.0]), np.array([2.5, 2.5]))
    assert lever.stroke_mm(50.0) == pytest.approx(20.0, rel=1e-14)
    assert lever.travel_at_mm(999.0) == 100.0
