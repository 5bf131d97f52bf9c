"""Shim steels and oils: bounds, and rules between their values."""

from typing import Any

import pytest

from optimiser.checking import validate
from optimiser.faults import BadInput
from optimiser.materials import Oil, Steel, thickness_tolerance_mm

STEEL: dict[str, Any] = {
    "name": "a",
    "youngs_mpa": 206e3,
    "poisson": 0.3,
    "tensile_mpa": 1600.0,
    "endurance_mpa": 500.0,
    "source": "from memory",
}
OIL: dict[str, Any] = {
    "name": "a",
    "viscosity_40c_cst": 15.0,
    "viscosity_100c_cst": 4.2,
    "density_15c_kg_m3": 848.0,
    "source": "from memory",
}


@pytest.mark.parametrize(
    ("model", "data", "key", "value", "words"),
    [
        (Steel, STEEL, "youngs_mpa", 206.0, "50000 or more, at most 400000"),
        (Steel, STEEL, "poisson", 0.6, "0.1 or more, at most 0.45"),
        (Steel, STEEL, "endurance_mpa", 1700.0, "at most 1500"),
        (Steel, {**STEEL, "tensile_mpa": 450.0}, "endurance_mpa", 500.0, "below tensile_mpa 450"),
        (Steel, STEEL, "thickness_tolerance", "rough", "'normal', 'fine' or 'precision'"),
        (Steel, STEEL, "source", "", "at least 1 character"),
        (Oil, OIL, "viscosity_40c_cst", float("nan"), "a finite number"),
        (Oil, OIL, "viscosity_100c_cst", 15.0, "below viscosity_40c_cst 15"),
        (Oil, OIL, "density_15c_kg_m3", "850", "a number, 700 or more, at most 1100"),
        (Oil, OIL, "vapour_pressure_mpa", -0.1, "0 or more, at most 0.1"),
    ],
)
def test_one_clear_sentence(
    model: type[Steel] | type[Oil], data: dict[str, Any], key: str, value: object, words: str
) -> None:
    with pytest.raises(BadInput) as caught:
        validate(model, {**data, key: value}, "mine.toml")
    (fault,) = caught.value.faults
    assert fault.startswith(f"mine.toml: key {key}")
    assert words in fault


def test_tolerance_beyond_the_table_grows_with_thickness() -> None:
    steel = validate(Steel, STEEL, "mine.toml")
    assert steel.thickness_tolerance_mm(0.8) == pytest.approx(2 * 0.015)
    with pytest.raises(ValueError, match="must be positive"):
        thickness_tolerance_mm(0.0, "fine")
