"""Turbulent limit of a sharp orifice.

ISO 5167-2 (Reader-Harris/Gallagher equation) as in the library `fluids`,
``C_Reader_Harris_Gallagher``: corner taps, diameter ratio 0.5, Re 5e3 to 1e8. A shape check: the
standard is for orifice plates in pipes, the model uses one constant for the edge of a shim.
"""

from math import pi, sqrt

import pytest

from optimiser.hydraulics.restrictions import curtain_flow, curtain_unit_terms

fluids = pytest.importorskip("fluids")
PRINTED = {
    5e3: 0.62757,
    1e4: 0.61858,
    3e4: 0.61091,
    1e5: 0.60687,
    1e6: 0.60378,
    1e8: 0.60221,
}


def standard(reynolds: float) -> float:
    """Coefficient in a pipe of 0.1 m with oil of 850 kg/m3 and 10 mPa s."""
    bore, density, viscosity = 0.1, 850.0, 0.01
    mass = reynolds * pi * bore * viscosity / 4
    return float(
        fluids.C_Reader_Harris_Gallagher(
            D=bore, Do=0.5 * bore, rho=density, mu=viscosity, m=mass, taps="corner"
        )
    )


@pytest.mark.parametrize(("reynolds", "printed"), PRINTED.items())
def test_library_gives_the_listed_values(reynolds: float, printed: float) -> None:
    assert standard(reynolds) == pytest.approx(printed, abs=2e-5)


@pytest.mark.parametrize("reynolds", PRINTED)
def test_curtain_default_is_the_turbulent_limit(reynolds: float) -> None:
    """0.61 within 3 %: the standard's own change over this range of Reynolds numbers."""
    r, y, drop = 15e-3, 4e-4, 5e6
    terms = curtain_unit_terms(r, 0.5e-3, 1.0, 0.61, 850.0, 1e-9)
    coefficient = curtain_flow(drop, y, *terms) / (2 * pi * r * y * sqrt(2 * drop / 850.0))
    assert coefficient == pytest.approx(standard(reynolds), rel=0.03)
