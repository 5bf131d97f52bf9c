"""Density over temperature.

ASTM D1250, lubricating oils: rho = rho15 exp(-alpha dT (1 + 0.8 alpha dT)), alpha = 0.6278/rho15.
The constants and the values 834.22 (40 C) and 795.76 kg/m3 (100 C) for 850 at 15 C are from memory:
a loose check, to 0.05 %.
"""

import pytest

from optimiser.hydraulics.oil import density_kg_m3


@pytest.mark.parametrize(("temp_c", "density"), [(15.0, 850.0), (40.0, 834.22), (100.0, 795.76)])
def test_from_memory(temp_c: float, density: float) -> None:
    assert density_kg_m3(850.0, temp_c) == pytest.approx(density, rel=5e-4)


def test_expansion_at_15_c() -> None:
    """Slope there is alpha rho = 0.6278 kg/m3 per kelvin, whatever the oil."""
    for rho in (800.0, 850.0, 950.0):
        slope = (density_kg_m3(rho, 15.5) - density_kg_m3(rho, 14.5)) / 1.0
        assert slope == pytest.approx(-0.6278, rel=1e-4)
