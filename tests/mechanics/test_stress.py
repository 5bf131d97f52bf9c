"""Where the stress is, and how neighbours share it."""

from typing import Any

import numpy as np
import pytest

from optimiser.mechanics import deflect
from optimiser.mechanics.plate import pressure_response

from .stacks import CLAMP, EDGE, PORT

PLACE: dict[str, Any] = {"clamp_mm": CLAMP, "port_inner_mm": PORT[0], "port_outer_mm": PORT[1]}
FIDELITIES: list[Any] = ["linear", "search", "reported"]


@pytest.mark.parametrize("fidelity", FIDELITIES)
def test_equal_diameters_share_by_the_cube_of_thickness(fidelity: Any) -> None:
    found = deflect([(EDGE, 0.1), (EDGE, 0.2)], pressures_mpa=0.1, fidelity=fidelity, **PLACE)
    thin, thick = found.clamp_moment_n[0]
    assert thick / thin == pytest.approx(8.0, rel=1e-9)


def test_stress_of_a_linear_shim_is_six_m_over_t_squared_at_the_clamp() -> None:
    found = deflect([(EDGE, 0.2)], pressures_mpa=0.1, fidelity="linear", **PLACE)
    radii = (CLAMP / 2, PORT[0] / 2, PORT[1] / 2, CLAMP / 2, EDGE / 2)
    moment = 0.1 * pressure_response(*radii, 0.3, True)
    assert found.clamp_moment_n[0, 0] == pytest.approx(moment, rel=1e-6)
    assert found.peak_stress_mpa[0, 0] == pytest.approx(6 * moment / 0.2**2, rel=1e-6)
    assert found.peak_at_mm[0, 0] == CLAMP


@pytest.mark.parametrize("fidelity", ["search", "reported"])
def test_stretching_adds_membrane_stress(fidelity: Any) -> None:
    """The clamp's membrane force is tension: the peak is above the bending stress alone."""
    found = deflect([(EDGE, 0.2)], pressures_mpa=[1e-4, 0.3], fidelity=fidelity, **PLACE)
    bending = 6 * found.clamp_moment_n[:, 0] / 0.2**2
    share = found.peak_stress_mpa[:, 0] / bending - 1
    assert share[0] == pytest.approx(0.0, abs=1e-4)
    assert 0.05 < share[1] < 0.5


@pytest.mark.parametrize("fidelity", FIDELITIES)
def test_the_peak_may_lie_away_from_the_clamp(fidelity: Any) -> None:
    """A thin face shim before a stiff block bends over the block's edge."""
    shims = [(EDGE, 0.1), (18.0, 0.3), (18.0, 0.3), (18.0, 0.3)]
    found = deflect(shims, pressures_mpa=0.1, fidelity=fidelity, **PLACE)
    assert found.peak_at_mm[0].tolist() == pytest.approx([18.0, CLAMP, CLAMP, CLAMP])
    assert found.peak_stress_mpa[0, 0] > 1.5 * 6 * abs(found.clamp_moment_n[0, 0]) / 0.1**2


@pytest.mark.parametrize("fidelity", FIDELITIES)
def test_outside_model_is_the_rise_over_two_thicknesses(fidelity: Any) -> None:
    levels = np.array([0.05, 0.2, 0.6])
    found = deflect([(EDGE, 0.2)], pressures_mpa=levels, fidelity=fidelity, **PLACE)
    assert found.rise_thicknesses == pytest.approx(found.edge_deflection_mm / 0.2)
    assert found.outside_model.tolist() == (found.rise_thicknesses > 2.0).tolist()
    assert found.outside_model.tolist() == [False, False, True]
