"""The quarter vehicle against scipy.signal, an independent route, and with curved dampers."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal

from optimiser.wanted.derive import derive
from optimiser.wanted.target import Target
from optimiser.wanted.vehicle import (
    QuarterVehicle,
    corner,
    equal_energy_damping,
    quarter_vehicle,
    wheel_damper,
)

from .builders import feel, frame, rider

VEHICLE = QuarterVehicle(95.0, 16.0, 8300.0, 120000.0)


def transfer(vehicle: QuarterVehicle, damping: float) -> signal.TransferFunction:
    """Body over road from the equations of motion, multiplied out by hand."""
    m, u, k = vehicle.sprung_kg, vehicle.unsprung_kg, vehicle.wheel_rate_n_m
    t, c = vehicle.tyre_rate_n_m, damping
    denominator = [m * u, c * (m + u), k * (m + u) + t * m, c * t, k * t]
    return signal.TransferFunction([c * t, k * t], denominator)


vehicles = st.builds(
    QuarterVehicle,
    sprung_kg=st.floats(20, 400),
    unsprung_kg=st.floats(2, 50),
    wheel_rate_n_m=st.floats(3e3, 4e4),
    tyre_rate_n_m=st.floats(6e4, 3e5),
)


@given(vehicles, st.floats(50, 3000))
@settings(max_examples=50)
def test_transmissibility_equals_scipy_signal(vehicle, damping):
    hertz = np.geomspace(0.1, 60.0, 30)
    _, response = signal.freqresp(transfer(vehicle, damping), 2 * np.pi * hertz)
    assert vehicle.transmissibility(hertz, damping) == pytest.approx(np.abs(response), rel=1e-9)


@given(vehicles, st.floats(0.05, 1.5))
@settings(max_examples=50)
def test_modes_are_the_poles_of_the_transfer_function(vehicle, ratio):
    damping = ratio * 2 * np.sqrt(vehicle.wheel_rate_n_m * vehicle.sprung_kg)
    poles = transfer(vehicle, damping).poles
    body, wheel = vehicle.modes(damping)
    product = np.prod(np.abs(poles)) ** 0.5 / (2 * np.pi) ** 2
    assert body.hz * wheel.hz == pytest.approx(product, rel=1e-6)
    total = 2 * (2 * np.pi) * (body.hz * body.damping_ratio + wheel.hz * wheel.damping_ratio)
    assert total == pytest.approx(-poles.real.sum(), rel=1e-6)


def test_undamped_modes_are_the_undamped_frequencies():
    low, high = VEHICLE.frequencies_hz()
    body, wheel = VEHICLE.modes(1e-6)
    assert (body.hz, wheel.hz) == pytest.approx((low, high), rel=1e-6)
    assert body.damping_ratio == pytest.approx(0.0, abs=1e-6)


def test_a_mode_beyond_critical_has_a_ratio_above_one():
    modes = VEHICLE.modes(6000.0)
    assert max(mode.damping_ratio for mode in modes) > 1.0


@pytest.mark.parametrize("damping", [150.0, 450.0, 1500.0])
def test_road_step_equals_scipy_signal(damping):
    response = VEHICLE.step(lambda speed: damping * speed, "road", 0.02)
    _, expected = signal.step(transfer(VEHICLE, damping), T=response.time_s)
    assert response.body_m == pytest.approx(0.02 * expected, abs=2e-7)
    assert response.final_m == 0.02


def test_load_step_settles_at_the_static_deflection():
    response = VEHICLE.step(lambda speed: 900.0 * speed, "load", 100.0)
    assert response.final_m == pytest.approx(-100.0 / 8300.0 - 100.0 / 120000.0)
    assert response.body_m[-1] == pytest.approx(response.final_m, rel=1e-3)
    assert response.settled_s() < response.time_s[-1]


def test_more_damping_overshoots_less():
    overshoots = [
        VEHICLE.step(lambda speed, c=c: c * speed).overshoot_percent for c in (200, 500, 900)
    ]
    assert overshoots == sorted(overshoots, reverse=True)
    assert overshoots[-1] > 0


def test_equal_energy_damping_of_known_laws():
    """Viscous c; square law 8 c2 V/(3 pi); dry friction 4 F/(pi V) (closed forms)."""
    assert equal_energy_damping(lambda v: 450.0 * v, 0.3) == pytest.approx(450.0)
    square = equal_energy_damping(lambda v: 200.0 * v * abs(v), 0.5)
    assert square == pytest.approx(200.0 * 8 * 0.5 / (3 * np.pi), rel=1e-4)
    friction = equal_energy_damping(lambda v: 30.0 * np.sign(v), 0.5)
    assert friction == pytest.approx(4 * 30.0 / (np.pi * 0.5), rel=1e-4)


def test_wheel_damper_carries_the_shaft_curve_to_the_wheel():
    squash = Target.of([0.1, 1.0], [200.0, 1100.0])
    back = Target.of([0.1, 0.5], [500.0, 2500.0], direction="rebound")
    force = wheel_damper(squash, back, 2.5)
    assert force(0.0) == 0.0
    assert force(0.25) == pytest.approx(80.0)
    assert force(2.5) == pytest.approx(440.0)
    assert force(5.0) == pytest.approx((1100 + 1000) / 2.5)
    assert force(-0.25) == pytest.approx(-200.0)


def test_linear_shaft_curve_is_damping_over_leverage_squared():
    speeds = np.geomspace(0.01, 1.0, 5)
    line = Target.of(speeds, 4000 * speeds)
    force = wheel_damper(line, line, 2.6)
    assert equal_energy_damping(force, 0.4) == pytest.approx(4000 / 2.6**2, rel=1e-9)


def test_corner_of_a_rider_on_a_frame():
    derived = derive(rider(), frame(), feel())
    vehicle = quarter_vehicle(derived.ride, frame())
    damper = wheel_damper(derived.compression, derived.rebound, derived.ride.leverage_at_sag)
    table = corner(vehicle, damper)
    low, high = vehicle.frequencies_hz()
    assert low < derived.ride.body_hz
    assert table.body.hz == pytest.approx(low, rel=0.1)
    assert table.wheel.hz == pytest.approx(high, rel=0.1)
    ratio = table.damping_n_s_m / derived.ride.critical_wheel_n_s_m
    # Mean of compression (0.18) and rebound (0.34) ratios at 0.3 m/s, energy-weighted.
    assert 0.18 < ratio < 0.34
    assert 0 < table.road_overshoot_percent < table.load_overshoot_percent < 100
    assert 0 < table.settled_s < 5
