"""Sharp slits and orifices.

H. E. Merritt, *Hydraulic Control Systems* (Wiley 1967): discharge coefficient of a sharp slit
pi / (pi + 2) = 0.611; M. G. Rabie, *Fluid Power Engineering* (McGraw-Hill 2009), eq. 2.39: an
orifice of 5 mm at 310 bar, density 870 kg/m3, Cd 0.61 passes 191.8 L/min.
"""

from math import pi

import pytest

from optimiser.damper import Seat
from optimiser.hydraulics.restrictions import (
    curtain_flow,
    curtain_unit_terms,
    flow,
    orifice_term,
)


def test_orifice_of_5_mm_at_310_bar() -> None:
    b = orifice_term(pi * 0.005**2 / 4, 0.61, 870.0)
    assert flow(310e5, 0.0, b) * 60e3 == pytest.approx(191.8, abs=0.05)


def test_seat_default_is_the_sharp_slit() -> None:
    assert Seat(seat_mm=30.0, land_mm=1.0).discharge == pytest.approx(pi / (pi + 2), abs=2e-3)


def test_curtain_is_a_slit_when_nothing_is_viscous() -> None:
    """Length 2 pi r, height y: Q = pi/(pi+2) 2 pi r y sqrt(2 dp / rho)."""
    slit = pi / (pi + 2)
    terms = curtain_unit_terms(15e-3, 1e-3, 1.0, slit, 870.0, 1e-12)
    expected = slit * 2 * pi * 15e-3 * 2e-4 * (2 * 1e6 / 870.0) ** 0.5
    assert curtain_flow(1e6, 2e-4, *terms) == pytest.approx(expected, rel=1e-7)
