"""Viscosity index.

ISO 2909 / ASTM D2270 worked values, by ``chemicals.viscosity.viscosity_index``: (73.30, 8.86) 92,
(22.83, 5.05) 156, (53.47, 7.80) 111, kinematic viscosities in cSt at 40 and 100 C.
"""

import pytest

from optimiser.hydraulics.oil import viscosity_cst

index = pytest.importorskip("chemicals").viscosity.viscosity_index
PRINTED = [(73.30, 8.86, 92), (22.83, 5.05, 156), (53.47, 7.80, 111)]


@pytest.mark.parametrize(("cold", "hot", "printed"), PRINTED)
def test_index_of_our_curve(cold: float, hot: float, printed: int) -> None:
    """The curve through the two points, read at 40 and 100 C, has the printed index."""
    nu40, nu100 = (viscosity_cst(cold, hot, t) * 1e-6 for t in (40.0, 100.0))
    assert round(index(nu40, nu100)) == printed


def test_a_higher_index_is_a_flatter_curve() -> None:
    """What the index stands for: less thickening from 40 to 0 C at one viscosity."""
    oils = [(32.0, hot) for hot in (5.0, 5.4, 6.0, 7.0)]
    indices = [index(cold * 1e-6, hot * 1e-6) for cold, hot in oils]
    thickening = [viscosity_cst(cold, hot, 0.0) / cold for cold, hot in oils]
    assert indices == sorted(indices)
    assert thickening == sorted(thickening, reverse=True)
