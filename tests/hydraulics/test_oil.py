"""Oil state: passes through its own data, thinner and lighter when hot, all faults at once."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import BadInput
from optimiser.hydraulics.oil import density_kg_m3, oil_at, viscosity_cst

from .examples import Oil

fast = settings(max_examples=60, deadline=None)


@fast
@given(st.floats(2.5, 300.0), st.floats(0.15, 0.8))
def test_passes_through_the_two_given_points(cold: float, ratio: float) -> None:
    """The printed inverse of ASTM D341 closes to 0.1 % above 0.5 cSt."""
    hot = max(0.6, cold * ratio)
    assert viscosity_cst(cold, hot, 40.0) == pytest.approx(cold, rel=1e-3)
    assert viscosity_cst(cold, hot, 100.0) == pytest.approx(hot, rel=1e-3)


@fast
@given(st.floats(5.0, 200.0), st.floats(0.15, 0.6), st.floats(-40.0, 199.0), st.floats(0.1, 50.0))
def test_hotter_is_thinner_and_lighter(cold: float, ratio: float, t: float, more: float) -> None:
    hot = max(0.9, cold * ratio)
    oil = Oil(viscosity_40c_cst=cold, viscosity_100c_cst=hot)
    here, there = oil_at(oil, t), oil_at(oil, min(t + more, 200.0))
    assert there.viscosity_pa_s < here.viscosity_pa_s
    assert there.density_kg_m3 < here.density_kg_m3


def test_state_is_si() -> None:
    state = oil_at(Oil(vapour_pressure_mpa=0.003), 40.0)
    density = density_kg_m3(850.0, 40.0)
    assert state.density_kg_m3 == density
    assert state.viscosity_pa_s == pytest.approx(16e-6 * density, rel=1e-6)
    assert state.vapour_pressure_pa == pytest.approx(3000.0)
    assert density_kg_m3(850.0, 15.0) == 850.0


def test_every_fault_is_told_at_once() -> None:
    bad = Oil(10.0, 12.0, 85.0, 1.0)
    with pytest.raises(BadInput) as caught:
        oil_at(bad, 500.0)
    text = str(caught.value)
    assert len(caught.value.faults) == 4
    assert "12 cSt" in text
    assert "500 C: allowed is -40 to 200 C" in text


@pytest.mark.parametrize("temp", [float("nan"), -41.0, 201.0])
def test_temperature_out_of_range(temp: float) -> None:
    with pytest.raises(BadInput, match="oil temperature"):
        oil_at(Oil(), temp)
