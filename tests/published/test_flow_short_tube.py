"""Short-tube orifices.

M. G. Rabie, *Fluid Power Engineering* (McGraw-Hill 2009), eq. 2.40 and 2.41, after H. E. Merritt,
*Hydraulic Control Systems* (Wiley 1967): with x = Re d/L the discharge coefficient is
[1.5 + 13.74 x^-1/2]^-1/2 for x > 50, else [2.28 + 64 / x]^-1/2.
"""

from math import pi, sqrt

import pytest

from optimiser.hydraulics.restrictions import flow, port_terms, short_tube_terms

PRINTED = {2.0: 0.1708, 10.0: 0.3394, 100.0: 0.5899, 1000.0: 0.7190, 1e4: 0.7815}
DENSITY, VISCOSITY, DIAMETER, LENGTH = 870.0, 0.0122, 2e-3, 6e-3
AREA = pi * DIAMETER**2 / 4


def published(x: float) -> float:
    return (1.5 + 13.74 / sqrt(x)) ** -0.5 if x > 50 else (2.28 + 64.0 / x) ** -0.5


def ours(x: float, discharge: float) -> float:
    """Discharge coefficient of a tube with Re d/L = x: flow over area times the ideal speed."""
    q = x * LENGTH / DIAMETER * VISCOSITY / (DENSITY * DIAMETER) * AREA
    a, b = short_tube_terms(AREA, LENGTH, discharge, DENSITY, VISCOSITY)
    drop = a * q + b * q * q
    assert flow(drop, a, b) == pytest.approx(q, rel=1e-12)
    return q / (AREA * sqrt(2.0 * drop / DENSITY))


@pytest.mark.parametrize(("x", "printed"), PRINTED.items())
def test_the_formula_gives_the_printed_values(x: float, printed: float) -> None:
    assert published(x) == pytest.approx(printed, abs=6e-5)


@pytest.mark.parametrize("x", [0.5, 2.0, 10.0, 50.0])
def test_long_or_slow_tube_is_eq_2_41_exactly(x: float) -> None:
    """With Cd = 2.28^-1/2 the law a Q + b Q^2 is the second formula itself."""
    assert ours(x, 2.28**-0.5) == pytest.approx(published(x), rel=1e-12)


@pytest.mark.parametrize(("x", "printed"), PRINTED.items())
def test_bleed_default_over_the_whole_range(x: float, printed: float) -> None:
    """Default 0.70: within 11 %. One constant stands for 0.66 (long) to 0.82 (short, fast), which
    is why the coefficient is calibratable."""
    assert ours(x, 0.70) == pytest.approx(printed, rel=0.11)


@pytest.mark.parametrize(("x", "printed"), PRINTED.items())
def test_port_default_over_the_whole_range(x: float, printed: float) -> None:
    """Default 0.72: within 8.1 %, for the same reason."""
    assert ours(x, 0.72) == pytest.approx(printed, rel=0.081)


def test_a_round_port_is_a_short_tube() -> None:
    tube = short_tube_terms(AREA, LENGTH, 0.7, DENSITY, VISCOSITY)
    port = port_terms(AREA, DIAMETER, LENGTH, 0.7, DENSITY, VISCOSITY)
    assert port == pytest.approx(tube, rel=1e-14)
