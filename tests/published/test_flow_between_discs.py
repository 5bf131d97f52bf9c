"""Radial flow between two parallel discs: Q = pi h^3 dp / (6 mu ln(r2/r1)).

Standard thin-film result (e.g. H. E. Merritt, *Hydraulic Control Systems* (Wiley 1967)); computed
case: h 0.1 mm, r 5 to 10 mm, 8.5 mPa s, 1 bar: 8.88698e-6 m3/s. The slowing outflow regains
(27/140) rho Q^2/(pi^2 h^2) (1/r1^2 - 1/r2^2) = 3935.4 Pa there (850 kg/m3), from the momentum of a
parabolic profile.
"""

from math import log, pi

import numpy as np
import pytest
from scipy.integrate import quad

from optimiser.hydraulics.restrictions import curtain_flow, curtain_unit_terms

GAP, R1, R2, VISCOSITY, DENSITY = 1e-4, 5e-3, 10e-3, 8.5e-3, 850.0


def recovery_pa(q: float, gap: float, r1: float, r2: float) -> float:
    return 27 / 140 * DENSITY * q * q / (pi * gap) ** 2 * (1 / r1**2 - 1 / r2**2)


def test_viscous_flow_through_the_curtain() -> None:
    """Without inertia (no density) the curtain is the film between discs."""
    terms = curtain_unit_terms((R1 + R2) / 2, R2 - R1, 1.0, 0.61, 1e-9, VISCOSITY)
    q = curtain_flow(1e5, GAP, *terms)
    assert q == pytest.approx(8.88698e-6, rel=1e-6)
    assert q == pytest.approx(pi * GAP**3 * 1e5 / (6 * VISCOSITY * log(R2 / R1)), rel=1e-9)


def test_flow_goes_with_the_cube_of_the_gap() -> None:
    terms = curtain_unit_terms(7.5e-3, 5e-3, 1.0, 0.61, 1e-9, VISCOSITY)
    gaps = np.array([2e-5, 4e-5, 8e-5])
    flows = np.array([curtain_flow(1e5, gap, *terms) for gap in gaps])
    np.testing.assert_allclose(flows[1:] / flows[:-1], 8.0, rtol=1e-9)


def test_recovered_pressure_of_the_published_case() -> None:
    """Dynamic pressure of the mean speed times 54/35, the kinetic energy of a parabolic profile."""
    energy = quad(lambda z: (1.5 * (1 - z * z)) ** 3, 0.0, 1.0)[0]
    assert energy == pytest.approx(54 / 35, rel=1e-12)
    q = 8.88698e-6
    speeds = [q / (2 * pi * r * GAP) for r in (R1, R2)]
    regained = energy * DENSITY / 2 * (speeds[0] ** 2 - speeds[1] ** 2)
    assert regained == pytest.approx(3935.4, abs=0.1)
    assert recovery_pa(q, GAP, R1, R2) == pytest.approx(3935.4, abs=0.1)


def test_recovery_over_a_valve_land_is_small() -> None:
    """Why the model leaves it to the discharge coefficient: on a 1 mm land of a 36 mm seat it is at
    most 6.4 % of the curtain's drop, reached when viscosity no longer matters."""
    unit_a, unit_b = curtain_unit_terms(18e-3, 1e-3, 1.0, 0.61, DENSITY, VISCOSITY)
    shares = []
    for lift in (2e-5, 1e-4, 5e-4):
        for drop in (1e4, 1e6, 2e7):
            q = curtain_flow(drop, lift, unit_a, unit_b)
            shares.append(recovery_pa(q, lift, 17.5e-3, 18.5e-3) / drop)
    limit = recovery_pa(1.0, 1.0, 17.5e-3, 18.5e-3) / unit_b
    assert limit == pytest.approx(0.064, abs=5e-4)
    assert max(shares) < limit
    assert min(shares) < 0.01 * limit
