"""Viscosity grades.

ISO 3448: a grade's kinematic viscosity at 40 C lies within 10 % of its number (10, 15, 22, 32, 46,
68 ...). What that leaves open in a damper.
"""

from dataclasses import dataclass
from itertools import pairwise

import pytest

from optimiser.hydraulics.oil import oil_at
from optimiser.hydraulics.restrictions import drop, short_tube_terms

GRADES = (10.0, 15.0, 22.0, 32.0, 46.0, 68.0)


@dataclass(frozen=True)
class Oil:
    viscosity_40c_cst: float
    viscosity_100c_cst: float
    density_15c_kg_m3: float = 860.0
    vapour_pressure_mpa: float = 0.0


def bleed_drop(nu: float, q: float) -> float:
    """Drop (Pa) over a 2 mm2 bleed at 40 C."""
    oil = oil_at(Oil(nu, 0.25 * nu), 40.0)
    terms = short_tube_terms(2e-6, 2e-3, 0.7, oil.density_kg_m3, oil.viscosity_pa_s)
    return drop(q, *terms)


def test_grades_do_not_overlap() -> None:
    """Each step is at least 1.44, more than the 1.1/0.9 between the bands' ends."""
    for low, high in pairwise(GRADES):
        assert 1.1 * low < 0.9 * high


@pytest.mark.parametrize("grade", GRADES)
def test_band_of_a_grade_in_the_force(grade: float) -> None:
    """10 % viscosity is 10 % force at a creep and less than 1 % (thin) to 6 % (thick) at speed."""
    for sign in (-1.0, 1.0):
        nu = grade * (1 + 0.1 * sign)
        assert bleed_drop(nu, 1e-9) / bleed_drop(grade, 1e-9) - 1 == pytest.approx(
            0.1 * sign, rel=0.02
        )
        fast = bleed_drop(nu, 1e-4) / bleed_drop(grade, 1e-4) - 1
        assert 0.0 < fast * sign < 0.001 * grade
