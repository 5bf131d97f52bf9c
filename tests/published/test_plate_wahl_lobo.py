"""Annular plate, inner edge clamped, outer edge free, Poisson's ratio 0.3.

A. M. Wahl and G. Lobo, "Stresses and deflections in flat circular plates with central holes",
Trans. ASME 52 (1930); S. Timoshenko and S. Woinowsky-Krieger, *Theory of Plates and Shells*, 2nd
ed. (1959), table 3; as reproduced in J. Carvill, *Mechanical Engineer's Data Handbook*, sec.
1.10.3, cases 7 and 8.

With outer radius a, hole radius b, thickness h: pressure q gives w = k1 q a^4 / (E h^3) and stress
k q a^2 / h^2; a total load P on the outer edge gives w = k1 P a^2 / (E h^3) and k P / h^2.

Each line has the printed factor and the exact one. The exact ones are held to their digits, the
printed ones to 1.5 %: they are hand calculations, up to 1.4 % off at a/b of 3 (k1 under pressure).
"""

from math import pi
from typing import Literal

import numpy as np
import pytest

from optimiser.mechanics import deflect
from optimiser.mechanics.plate import pressure_response, ring_deflection, ring_moment
from optimiser.mechanics.reference import ring_responses

NU = 0.3
RATIOS = (1.25, 1.5, 2.0, 3.0, 4.0, 5.0)
# a/b: printed and exact
PRESSURE_LIFT = (
    (0.00231, 0.002315),
    (0.0183, 0.018331),
    (0.0938, 0.093788),
    (0.293, 0.289021),
    (0.448, 0.448168),
    (0.564, 0.563838),
)
PRESSURE_STRESS = (
    (0.135, 0.13518),
    (0.410, 0.40967),
    (1.040, 1.04141),
    (2.150, 2.15279),
    (2.990, 3.00640),
    (3.690, 3.68121),
)
EDGE_LIFT = (
    (0.00510, 0.005105),
    (0.0249, 0.024888),
    (0.0877, 0.087689),
    (0.209, 0.209489),
    (0.293, 0.293762),
    (0.350, 0.350258),
)
EDGE_STRESS = (
    (0.227, 0.22731),
    (0.428, 0.42767),
    (0.753, 0.75332),
    (1.205, 1.20550),
    (1.514, 1.51389),
    (1.745, 1.74610),
)
ON_THE_EDGE = list(zip(RATIOS, EDGE_LIFT, EDGE_STRESS, strict=True))
PRESSED = list(zip(RATIOS, PRESSURE_LIFT, PRESSURE_STRESS, strict=True))
SIX, FIVE = 0.5e-6, 0.5e-5  # half of the last digit


def _holds(value: float, factors: tuple[float, float], digits: float) -> None:
    printed, exact = factors
    assert value == pytest.approx(exact, rel=0.0, abs=digits * 1.001)
    assert value == pytest.approx(printed, rel=0.015)


@pytest.mark.parametrize(("ratio", "lift", "stress"), ON_THE_EDGE)
def test_case_7_load_on_the_outer_edge(
    ratio: float, lift: tuple[float, float], stress: tuple[float, float]
) -> None:
    a, b = 1.0, 1.0 / ratio
    flexible = 12.0 * (1.0 - NU**2)  # E h^3 / D
    _holds(flexible * ring_deflection(a, a, b, a, NU), lift, SIX)
    _holds(6.0 * ring_moment(b, a, b, a, NU), stress, FIVE)


@pytest.mark.parametrize(("ratio", "lift", "stress"), ON_THE_EDGE)
def test_case_7_by_the_readable_version(
    ratio: float, lift: tuple[float, float], stress: tuple[float, float]
) -> None:
    b = 1.0 / ratio
    w, _, moment = ring_responses(np.array([b, 1.0]), np.array([1.0]), b, 1.0, NU)
    _holds(12.0 * (1.0 - NU**2) * w[1, 0], lift, SIX)
    _holds(6.0 * moment[0, 0], stress, FIVE)


@pytest.mark.parametrize(("ratio", "lift", "stress"), PRESSED)
def test_case_8_pressure_over_the_whole_plate(
    ratio: float, lift: tuple[float, float], stress: tuple[float, float]
) -> None:
    a, b = 1.0, 1.0 / ratio
    _holds(12.0 * (1.0 - NU**2) * pressure_response(a, b, a, b, a, NU, False), lift, SIX)
    _holds(6.0 * pressure_response(b, b, a, b, a, NU, True), stress, FIVE)


@pytest.mark.parametrize("fidelity", ["linear", "search", "reported"])
@pytest.mark.parametrize(("ratio", "lift", "stress"), PRESSED)
def test_case_8_through_the_public_door(
    ratio: float,
    lift: tuple[float, float],
    stress: tuple[float, float],
    fidelity: Literal["linear", "search", "reported"],
) -> None:
    """A 30 mm shim of 0.2 mm; the pressure is so low that stretching does not matter."""
    outer_mm, h, youngs = 30.0, 0.2, 206000.0
    a = outer_mm / 2
    q = 1e-5 * youngs * h**4 / a**4  # lifts by less than 1e-5 h
    found = deflect(
        [(outer_mm, h)], outer_mm / ratio, outer_mm / ratio, outer_mm, q, fidelity=fidelity
    )
    _holds(float(found.edge_deflection_mm[0]) * youngs * h**3 / (q * a**4), lift, SIX)
    _holds(float(found.peak_stress_mpa[0, 0]) * h**2 / (q * a**2), stress, FIVE)
    assert found.peak_at_mm[0, 0] == pytest.approx(outer_mm / ratio)


def test_the_edge_load_is_a_total_load() -> None:
    """Total load P and P / (2 pi a) per length are the same thing: narrow pressed ring at the
    edge."""
    b, width = 0.4, 1e-3
    area = pi * (1.0 - (1.0 - width) ** 2)
    narrow = pressure_response(1.0, 1.0 - width, 1.0, b, 1.0, NU, False) / area
    assert narrow == pytest.approx(ring_deflection(1.0, 1.0 - width / 2, b, 1.0, NU), rel=1e-6)
