"""Leakage through an annular gap: Q = pi R c^3 (1 + 1.5 e^2) dp / (6 mu L).

N. D. Manring, *Hydraulic Control Systems* (Wiley 2005). Case: diameter 10 mm, clearance 20 um,
length 10 mm, 8.5 mPa s, 1 MPa, concentric: 2.46399e-7 m3/s.
"""

from math import pi

import numpy as np
import pytest

from optimiser.hydraulics.restrictions import curtain_flow, curtain_unit_terms, port_terms

R, C, L, VISCOSITY, DROP = 5e-3, 20e-6, 10e-3, 8.5e-3, 1e6


def manring(eccentricity: float) -> float:
    return pi * R * C**3 * (1 + 1.5 * eccentricity**2) * DROP / (6 * VISCOSITY * L)


def film(clearance: float) -> float:
    """Flow through a curtain of the same length: a land of L/1000 under a thousandth of the drop.

    A thin land is a plane film, so its radial direction may stand for the axial one; its ln(ro/ri)
    differs from land/radius by (land/radius)^2/12, here 3e-7.
    """
    terms = curtain_unit_terms(R, L / 1000, 1.0, 0.61, 1e-9, VISCOSITY)
    return curtain_flow(DROP / 1000, clearance, *terms)


def test_concentric_gap() -> None:
    assert manring(0.0) == pytest.approx(2.46399e-7, rel=2e-6)
    assert film(C) == pytest.approx(2.46399e-7, rel=3e-6)


@pytest.mark.parametrize("eccentricity", [0.2, 0.5, 0.9])
def test_gap_that_varies_round_the_circumference(eccentricity: float) -> None:
    """Films of gap c (1 + e cos t) side by side: what a shim that lifts unevenly lets through."""
    angles = np.linspace(0.0, 2 * pi, 720, endpoint=False)
    local = [film(C * (1 + eccentricity * np.cos(t))) for t in angles]
    assert np.mean(local) == pytest.approx(manring(eccentricity), rel=1e-5)


def test_hydraulic_diameter_is_for_round_ports() -> None:
    """A gap taken as a port of hydraulic diameter 2 c has 2/3 of the true resistance."""
    a, _ = port_terms(2 * pi * R * C, 2 * C, L, 0.72, 1e-9, VISCOSITY)
    assert a == pytest.approx(2 / 3 * DROP / manring(0.0), rel=1e-9)
