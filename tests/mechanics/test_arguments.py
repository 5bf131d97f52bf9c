"""Arguments that make no sense are refused in one clear sentence each, all of them at once."""

from typing import Any

import pytest

from optimiser.faults import BadInput
from optimiser.mechanics import BackSpringForce, deflect

GOOD: dict[str, Any] = {
    "shims": [(30.0, 0.2), (24.0, 0.2)],
    "clamp_mm": 12.0,
    "port_inner_mm": 16.0,
    "port_outer_mm": 24.0,
    "pressures_mpa": [0.1],
}
NAN = float("nan")


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"shims": []}, "empty"),
        ({"shims": [(30.0, -0.2)]}, "shim 1"),
        ({"shims": [(30.0, 0.2), (NAN, 0.2)]}, "shim 2"),
        ({"shims": [(30.0, 0.2), (24.0,)]}, "shim 2"),
        ({"shims": [(30.0, 0.2), (24.0, 0.2, 11.0), (28.0, 0.2)]}, "ring"),
        ({"shims": [(30.0, 0.2, 20.0), (28.0, 0.2)]}, "face shim"),
        ({"shims": [(12.0, 0.2)]}, "wider than the clamp"),
        ({"clamp_mm": 0.0}, "clamp_mm"),
        ({"clamp_mm": NAN}, "clamp_mm"),
        ({"port_inner_mm": 24.0}, "port"),
        ({"port_inner_mm": NAN}, "port"),
        ({"port_inner_mm": 6.0, "port_outer_mm": 10.0}, "port"),
        ({"pressures_mpa": []}, "pressures_mpa"),
        ({"pressures_mpa": [0.1, NAN]}, "pressures_mpa"),
        ({"pressures_mpa": [-0.1]}, "pressures_mpa"),
        ({"pressures_mpa": [[0.1]]}, "pressures_mpa"),
        ({"seat_mm": 31.0}, "seat_mm"),
        ({"seat_mm": 12.0}, "seat_mm"),
        ({"seat_mm": NAN}, "seat_mm"),
        ({"seat_mm": 28.0, "seat_height_mm": NAN}, "seat_height_mm"),
        ({"youngs_mpa": 0.0}, "youngs_mpa"),
        ({"youngs_mpa": float("inf")}, "youngs_mpa"),
        ({"poisson": 0.5}, "poisson"),
        ({"poisson": NAN}, "poisson"),
        ({"fidelity": "best"}, "linear, search, reported"),
        ({"back_spring": BackSpringForce(10.0, 100.0, 0.0)}, "spring"),
        ({"back_spring": BackSpringForce(20.0, -1.0, 0.0)}, "spring"),
        ({"back_spring": BackSpringForce(20.0, 100.0, NAN)}, "spring"),
    ],
)
def test_refused(change: dict[str, Any], words: str) -> None:
    with pytest.raises(BadInput) as refused:
        deflect(**(GOOD | change))
    assert len(refused.value.faults) == 1
    assert words in refused.value.faults[0]


def test_all_faults_at_once() -> None:
    with pytest.raises(BadInput) as refused:
        deflect(**(GOOD | {"pressures_mpa": [-1.0], "poisson": 0.7, "port_inner_mm": 30.0}))
    assert len(refused.value.faults) == 3


@pytest.mark.parametrize("fidelity", ["linear", "search", "reported"])
def test_shapes_of_the_answer(fidelity: Any) -> None:
    found = deflect(**(GOOD | {"pressures_mpa": [0.2, 0.1, 0.1]}), fidelity=fidelity)
    for name in ("edge_deflection_mm", "seat_lift_mm", "rise_thicknesses", "outside_model"):
        assert getattr(found, name).shape == (3,)
    for name in ("clamp_moment_n", "peak_stress_mpa", "peak_at_mm"):
        assert getattr(found, name).shape == (3, 2)
    assert found.edge_deflection_mm[1] == found.edge_deflection_mm[2]


def test_one_number_is_one_pressure() -> None:
    assert deflect(**(GOOD | {"pressures_mpa": 0.1})).edge_deflection_mm.shape == (1,)
