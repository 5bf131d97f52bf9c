"""Viscosity over temperature.

ASTM D341 (Walther): log10 log10(nu + 0.7) = A - B log10 T, T in kelvin. Published worksheet: an oil
of 32 cSt at 40 C and 5.4 cSt at 100 C has 86.278 at 20 C, 336.00 at 0 C and 8.533 at 80 C (the
sheet itself prints 8.5 with T = t + 273).
"""

from math import log10

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.hydraulics.oil import viscosity_cst


@pytest.mark.parametrize(
    ("temp_c", "nu", "digit"), [(20.0, 86.278, 1e-3), (0.0, 336.00, 1e-2), (80.0, 8.533, 1e-3)]
)
def test_worksheet(temp_c: float, nu: float, digit: float) -> None:
    assert viscosity_cst(32.0, 5.4, temp_c) == pytest.approx(nu, abs=digit)


@settings(max_examples=50, deadline=None)
@given(st.floats(10.0, 200.0), st.floats(0.15, 0.5), st.floats(-20.0, 60.0))
def test_straight_line_on_the_chart(cold: float, ratio: float, t: float) -> None:
    """Above 2 cSt the plain form with 0.7 holds: any temperature lies on the line through two."""
    hot = max(2.5, cold * ratio)

    def y(nu: float) -> float:
        return log10(log10(nu + 0.7))

    x, x1, x2 = (log10(c + 273.15) for c in (t, 40.0, 100.0))
    line = y(cold) + (y(hot) - y(cold)) * (x - x1) / (x2 - x1)
    assert y(viscosity_cst(cold, hot, t)) == pytest.approx(line, abs=2e-4)


def test_thin_oil_below_2_cst_closes() -> None:
    """The printed forward and backward formulas agree to 0.1 % down to 0.6 cSt (from memory)."""
    for hot in (0.6, 0.8, 1.0, 1.5, 2.0):
        assert viscosity_cst(5.0, hot, 100.0) == pytest.approx(hot, rel=1e-3)
