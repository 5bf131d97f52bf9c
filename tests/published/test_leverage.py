"""Leverage: spring and damper seen from the wheel.

At constant leverage LR = wheel travel per shaft stroke: k_w = k_s/LR^2 and c_w = c_s/LR^2 (virtual
work). Worked example computed from these formulas: 87563.4 N/m, LR 2.6, 60 kg give a wheel rate of
12953.2 N/m, 2.3385 Hz, a critical damping of 11919.0 N s/m at the shaft and a static sag of
17.471 mm of stroke.
"""

import numpy as np
import pytest

from optimiser.wanted.derive import ride_of
from optimiser.wanted.frame import Frame
from optimiser.wanted.rider import Rider
from optimiser.wanted.sag import energies_j

RATE_N_MM, RATIO = 87.5634, 2.6


def corner(**spring: float) -> Frame:
    """60 kg of rider, all on one wheel, no machine, on a lever of one ratio."""
    return Frame.model_validate(
        {
            "name": "worked example",
            "wheel_travel_mm": 150.0,
            "leverage": {"travel_mm": [0, 150], "ratio": [RATIO, RATIO]},
            "share_of_mass": 1.0,
            "sprung_kg": 0.0,
            "unsprung_kg": 3.0,
            "tyre_n_mm": 80.0,
            "spring": {"kind": "coil", **spring},
        }
    )


def test_worked_example_of_a_known_coil():
    ride = ride_of(Rider(mass_kg=60.0), corner(rate_n_mm=RATE_N_MM))
    assert ride.wheel_rate_n_mm * 1e3 == pytest.approx(12953.2, abs=0.05)
    assert ride.body_hz == pytest.approx(2.3385, abs=5e-5)
    assert ride.critical_shaft_n_s_m == pytest.approx(11919.0, abs=0.05)
    assert ride.sag_stroke_mm == pytest.approx(17.471, abs=5e-4)


def test_worked_example_backwards_from_the_sag():
    ride = ride_of(Rider(mass_kg=60.0), corner(), sag=100 * 17.471 * RATIO / 150.0)
    # The printed sag has five digits.
    assert ride.coil_n_mm == pytest.approx(RATE_N_MM, rel=5e-5)


def test_varying_leverage_adds_the_force_times_the_bend():
    """k_w = k_s/LR^2 + F_s d(1/LR)/dx, checked by the slope of the stored energy."""
    points = {"travel_mm": [0, 75, 150], "ratio": [2.9, 2.6, 2.4]}
    frame = corner(rate_n_mm=RATE_N_MM).model_copy(update={})
    frame = Frame.model_validate({**frame.model_dump(), "leverage": points})
    ride = ride_of(Rider(mass_kg=60.0), frame)
    step, x = 0.05, ride.sag_travel_mm
    energy = [1e3 * energies_j(frame.lever, ride.spring, x + d)[1] for d in (-step, 0.0, step)]
    curvature = (energy[0] - 2 * energy[1] + energy[2]) / step**2
    assert ride.wheel_rate_n_mm == pytest.approx(curvature, rel=1e-5)
    assert ride.load_n == pytest.approx((energy[2] - energy[0]) / (2 * step), rel=1e-6)
    assert np.isclose(ride.load_n, 60 * 9.80665)
