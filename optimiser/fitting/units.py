"""Units of dyno files, and questions about numbers that look like another unit.

Factors: the inch is 25.4 mm, the pound-force 0.45359237 kg x 9.80665 m/s2 and the kilogram-force
9.80665 N exactly (international yard and pound agreement 1959; standard gravity of ISO 80000-3).
"""

from typing import Literal

from optimiser.hydraulics.lift import Floats

Quantity = Literal["velocity", "force", "displacement", "time"]

#: Factor to m/s, N, mm and s.
UNITS: dict[Quantity, dict[str, float]] = {
    "velocity": {"m/s": 1.0, "cm/s": 1e-2, "mm/s": 1e-3, "in/s": 25.4e-3},
    "force": {"N": 1.0, "kN": 1e3, "lbf": 0.45359237 * 9.80665, "kgf": 9.80665},
    "displacement": {"mm": 1.0, "cm": 10.0, "m": 1e3, "in": 25.4},
    "time": {"s": 1.0, "ms": 1e-3},
}
#: A column's name ends in its unit: ``velocity_mm_s``, ``force_lbf``.
SUFFIXES: dict[Quantity, dict[str, str]] = {
    quantity: {unit.replace("/", "_").lower(): unit for unit in units}
    for quantity, units in UNITS.items()
}
#: Largest values of each quantity that a damper dyno gives, in m/s, N, mm and s: lowest and
#: highest. Common practice, no source.
PLAUSIBLE: dict[Quantity, tuple[float, float]] = {
    "velocity": (0.01, 20.0),
    "force": (10.0, 1e5),
    "displacement": (0.5, 500.0),
    "time": (0.05, 1e5),
}
BASE: dict[Quantity, str] = {"velocity": "m/s", "force": "N", "displacement": "mm", "time": "s"}


def question(quantity: Quantity, values: Floats, unit: str) -> str:
    """A sentence when the largest of ``values`` (n,), given in ``unit``, cannot be meant so.

    Names the units in which the same numbers would be plausible; empty when nothing is odd.
    """
    factor = UNITS[quantity][unit]
    largest = float(abs(values).max())
    low, high = PLAUSIBLE[quantity]
    if low <= largest * factor <= high or largest == 0.0:
        return ""
    others = [u for u, f in UNITS[quantity].items() if u != unit and low <= largest * f <= high]
    asked = f" (is it in {' or '.join(others)}?)" if others else ""
    return (
        f"{quantity} goes up to {largest:g} {unit}{asked}; allowed: a largest {quantity} of "
        f"{low:g} to {high:g} {BASE[quantity]}"
    )
