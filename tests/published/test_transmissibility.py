"""Identities of the damped mass on a spring.

Transmissibility is 1 at the frequency ratio sqrt(2) for every damping ratio; a step of load
overshoots by exp(-pi z/sqrt(1 - z^2)). Standard results of a single degree of freedom, e.g.
S. S. Rao, *Mechanical Vibrations* (edition and page from memory), recomputed from the formulas.
The quarter vehicle is held to them with a very stiff tyre and a very light wheel.
"""

import numpy as np
import pytest

from optimiser.wanted.vehicle import QuarterVehicle

MASS, RATE = 100.0, 10000.0
RIGID_TYRE = QuarterVehicle(MASS, 1e-2, RATE, 1e9)
CRITICAL = 2 * np.sqrt(RATE * MASS)
NATURAL_HZ = np.sqrt(RATE / MASS) / (2 * np.pi)
# The tyre gives 1e-5 of the spring's movement, so the one-mass limit holds to about that.
LIMIT = 1e-4


@pytest.mark.parametrize("ratio", [0.05, 0.1, 0.3, 0.7, 1.0, 1.5])
def test_transmissibility_is_one_at_root_two(ratio):
    found = RIGID_TYRE.transmissibility([np.sqrt(2) * NATURAL_HZ], ratio * CRITICAL)
    assert found == pytest.approx([1.0], rel=LIMIT)


@pytest.mark.parametrize("ratio", [0.1, 0.3, 0.7])
def test_transmissibility_formula(ratio):
    r = np.array([0.2, 0.8, 1.0, 1.2, 3.0])
    top, bottom = 1 + (2 * ratio * r) ** 2, (1 - r**2) ** 2 + (2 * ratio * r) ** 2
    found = RIGID_TYRE.transmissibility(r * NATURAL_HZ, ratio * CRITICAL)
    assert found == pytest.approx(np.sqrt(top / bottom), rel=LIMIT)


@pytest.mark.parametrize("ratio", [0.1, 0.2, 0.4, 0.6, 0.8])
def test_overshoot_after_a_step_of_load(ratio):
    expected = 100 * np.exp(-np.pi * ratio / np.sqrt(1 - ratio**2))
    response = RIGID_TYRE.step(lambda speed: ratio * CRITICAL * speed, "load", 100.0)
    # 500 samples a period place the peak to 1e-5 of the movement.
    assert response.overshoot_percent == pytest.approx(expected, abs=0.01)


@pytest.mark.parametrize("ratio", [0.05, 0.3, 0.9])
def test_body_mode_has_the_damping_ratio_it_was_given(ratio):
    body, _ = RIGID_TYRE.modes(ratio * CRITICAL)
    assert body.damping_ratio == pytest.approx(ratio, rel=LIMIT)
    assert body.hz == pytest.approx(NATURAL_HZ, rel=LIMIT)
