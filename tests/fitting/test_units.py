"""Units: exact factors, and questions about odd sizes."""

import numpy as np
import pytest

from optimiser.fitting.units import PLAUSIBLE, SUFFIXES, UNITS, Quantity, question


def test_factors() -> None:
    assert UNITS["velocity"]["in/s"] == pytest.approx(UNITS["velocity"]["mm/s"] * 25.4)
    assert UNITS["force"]["lbf"] == pytest.approx(4.4482216152605, rel=1e-13)
    assert SUFFIXES["velocity"]["mm_s"] == "mm/s"


@pytest.mark.parametrize(
    ("quantity", "largest", "unit", "asks"),
    [
        ("velocity", 500.0, "m/s", "mm/s"),
        ("velocity", 1.2, "mm/s", "m/s"),
        ("velocity", 50.0, "m/s", "in/s"),
        ("force", 2.4e6, "N", "allowed"),
        ("force", 2.4, "N", "kN"),
        ("displacement", 0.02, "mm", "m"),
        ("time", 4000.0, "ms", ""),
        ("velocity", 1.5, "m/s", ""),
        ("force", 2500.0, "N", ""),
    ],
)
def test_question(quantity: Quantity, largest: float, unit: str, asks: str) -> None:
    text = question(quantity, np.array([0.0, -largest, 0.3 * largest]), unit)
    assert (asks in text) if asks else text == ""
    if text:
        assert f"{PLAUSIBLE[quantity][1]:g}" in text
