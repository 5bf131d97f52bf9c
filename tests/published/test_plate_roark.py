"""Annular plate, inner edge fixed, outer edge free, Poisson's ratio 0.3.

W. C. Young and R. G. Budynas, *Roark's Formulas for Stress and Strain*, 7th ed. (2002), table
11.2, cases 1l (line load w per length at r0) and 2l (pressure q from r0 to the edge): y = K_y w
a^3 / D or K_y q a^4 / D at the outer edge, M_rb = K_M w a or K_M q a^2 at the inner one. Roark's
loads act downwards, ours away from the seat: the signs differ. Coefficients computed from the
stated formulas."""

from math import pi

import pytest

from optimiser.mechanics.plate import pressure_response, ring_deflection, ring_moment

NU = 0.3
FIVE, SIX = 0.5e-5 * 1.001, 0.5e-6 * 1.001  # half of the last digit

# b/a, K_y, K_M
CASE_1L_AT_THE_EDGE = (
    (0.1, -0.26913, -2.55536),
    (0.3, -0.13895, -1.38200),
    (0.5, -0.05045, -0.78888),
    (0.7, -0.01032, -0.39086),
    (0.9, -0.00035, -0.10898),
)
CASE_2L_OVER_ALL = (
    (0.1, -0.07569, -0.96457),
    (0.3, -0.03182, -0.41034),
    (0.5, -0.00859, -0.17357),
    (0.7, -0.00110, -0.05408),
    (0.9, -0.00001, -0.00530),
)
# r0/a, K_y, K_M at b/a = 0.5
CASE_1L_INSIDE = (
    (0.6, -0.002047, -0.112075),
    (0.7, -0.008334, -0.247451),
    (0.8, -0.018794, -0.405426),
    (0.9, -0.033046, -0.585838),
)


@pytest.mark.parametrize(("b", "lift", "moment"), CASE_1L_AT_THE_EDGE)
def test_case_1l_on_the_edge(b: float, lift: float, moment: float) -> None:
    load = 2.0 * pi  # w = 1 on a circle of radius 1
    assert -load * ring_deflection(1.0, 1.0, b, 1.0, NU) == pytest.approx(lift, rel=0, abs=FIVE)
    assert -load * ring_moment(b, 1.0, b, 1.0, NU) == pytest.approx(moment, rel=0, abs=FIVE)


@pytest.mark.parametrize(("r0", "lift", "moment"), CASE_1L_INSIDE)
def test_case_1l_between_the_edges(r0: float, lift: float, moment: float) -> None:
    load = 2.0 * pi * r0
    assert -load * ring_deflection(1.0, r0, 0.5, 1.0, NU) == pytest.approx(lift, rel=0, abs=SIX)
    assert -load * ring_moment(0.5, r0, 0.5, 1.0, NU) == pytest.approx(moment, rel=0, abs=SIX)


@pytest.mark.parametrize(("b", "lift", "moment"), CASE_2L_OVER_ALL)
def test_case_2l_from_the_inner_edge(b: float, lift: float, moment: float) -> None:
    found = -pressure_response(1.0, b, 1.0, b, 1.0, NU, False)
    assert found == pytest.approx(lift, rel=0, abs=FIVE)
    found = -pressure_response(b, b, 1.0, b, 1.0, NU, True)
    assert found == pytest.approx(moment, rel=0, abs=FIVE)


@pytest.mark.parametrize("r0", [0.55, 0.6, 0.75, 0.9])
def test_case_2l_is_case_1l_added_up(r0: float) -> None:
    """Pressure from r0 out is the whole pressure less that inside r0; superposition holds."""
    inner, outer = (0.5, r0), (r0, 1.0)
    for place, moment in ((1.0, False), (0.5, True)):
        parts = [pressure_response(place, *ring, 0.5, 1.0, NU, moment) for ring in (inner, outer)]
        whole = pressure_response(place, 0.5, 1.0, 0.5, 1.0, NU, moment)
        assert sum(parts) == pytest.approx(whole, rel=1e-12)
