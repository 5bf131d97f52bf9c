"""The numbers of a damper file that dyno runs can calibrate: where they are, and their limits.

A valve's numbers (of the circuit's searched valve) are named by their key below the valve;
``friction_n`` is the damper's own. ``gas_offset_n`` is the steady force that pushes the shaft
out during the runs: gas, and what the load cell was off; it is in the runs whether the damper's
curve is to show it or not.
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from math import pi
from typing import Any

from optimiser.damper import Body, Damper, Direction, Valve
from optimiser.hydraulics.gas import gas_force_n

CURTAIN, PORTS, LOADED = "seat.discharge", "ports.discharge", "ports.loaded_fraction"
BLEED, NEEDLE, PRELOAD = "bleed.area_mm2", "bleed.needle.offset_mm", "seat.height_mm"
FRICTION, GAS = "friction_n", "gas_offset_n"
#: All calibratable numbers with their plain words; also the order in which they matter.
KEYS: dict[str, str] = {
    CURTAIN: "gap discharge",
    BLEED: "bleed area",
    FRICTION: "friction",
    GAS: "gas force",
    PRELOAD: "seat height",
    PORTS: "port discharge",
    NEEDLE: "needle offset",
    LOADED: "loaded fraction",
}
_BODY_KEYS = (FRICTION, GAS)
_UNITS = {"_mm2": "mm2", "_mm": "mm", "_n": "N"}
#: Greatest gas pressure a damper file may hold, Pa.
_MOST_GAS_PA = 10e6
_MOST_STEADY_N = 20000.0


@dataclass(frozen=True)
class Parameter:
    """One free number: ``key`` as above, ``direction`` None for the damper's own.

    ``start``, ``low`` and ``high`` in the key's own unit; ``scale``: a change that matters, in the
    same unit (how far apart two dampers of one drawing may be; common practice, no source).
    """

    key: str
    direction: Direction | None
    start: float
    low: float
    high: float
    scale: float

    @property
    def name(self) -> str:
        """Full name, such as ``compression.seat.discharge``."""
        return f"{self.direction}.{self.key}" if self.direction else self.key

    @property
    def words(self) -> str:
        """What it is, in plain words."""
        return (
            f"the {self.direction} {KEYS[self.key]}" if self.direction else f"the {KEYS[self.key]}"
        )

    @property
    def unit(self) -> str:
        """Unit of the values; empty for a ratio."""
        return next((unit for end, unit in _UNITS.items() if self.key.endswith(end)), "")

    def starting_at(self, value: float) -> "Parameter":
        """The same with another start, moved inside the limits."""
        return replace(self, start=min(max(value, self.low), self.high))


def named_directions(name: str) -> tuple[str, tuple[Direction, ...]]:
    """(key, directions) of a name: both directions unless the name begins with one."""
    head, _, rest = name.partition(".")
    if head == "compression":
        return rest, ("compression",)
    if head == "rebound":
        return rest, ("rebound",)
    return name, ("compression", "rebound")


def shaft_area_m2(body: Body) -> float:
    """Cross-section of the shaft, m2."""
    return 0.25 * pi * (body.shaft_mm * 1e-3) ** 2


def value_of(damper: Damper, key: str, direction: Direction | None) -> float:
    """The number as the damper has it. Raises KeyError where there is none (no needle)."""
    if key == FRICTION:
        return damper.friction_n
    if key == GAS:
        shown = damper.gas_in_force
        return gas_force_n(damper.gas, damper.body, "compression") if shown else 0.0
    if direction is None:
        raise KeyError(key)
    part: Any = damper.circuit(direction).searched
    for step in key.split("."):
        part = getattr(part, step)
        if part is None:
            raise KeyError(key)
    return float(part)


def parameter(damper: Damper, key: str, direction: Direction | None) -> Parameter:
    """One number as free, starting where the damper has it. Raises KeyError without a needle."""
    value = value_of(damper, key, None if key in _BODY_KEYS else direction)
    low, high, scale = _limits(damper, key, value)
    where = None if key in _BODY_KEYS else direction
    return Parameter(key, where, min(max(value, low), high), low, high, scale)


def _limits(damper: Damper, key: str, value: float) -> tuple[float, float, float]:
    if key in (CURTAIN, PORTS):
        return 0.2, 1.0, 0.1
    if key == LOADED:
        return 0.101, 1.0, 0.1
    if key == BLEED:
        return 0.0, max(20.0 * value, 50.0), max(0.3 * value, 0.3)
    if key == NEEDLE:
        return 0.0, 2.0, 0.05
    if key == PRELOAD:
        return 0.0, min(3.0, value + 0.5), 0.03
    if key == FRICTION:
        return 0.0, 2000.0, max(0.3 * value, 5.0)
    if damper.gas_in_force:
        return 0.0, _MOST_GAS_PA * shaft_area_m2(damper.body), 20.0
    return -_MOST_STEADY_N, _MOST_STEADY_N, 20.0


def with_values(damper: Damper, values: Mapping[tuple[str, Direction | None], float]) -> Damper:
    """The damper with numbers replaced, by (key, direction).

    ``gas_offset_n`` becomes the charge pressure where the damper's curve shows the gas force.
    """
    changed = damper
    for (key, direction), value in values.items():
        if key == FRICTION:
            changed = changed.model_copy(update={"friction_n": value})
        elif key == GAS:
            if damper.gas_in_force:
                pressure = 1e-6 * value / shaft_area_m2(damper.body)
                gas = changed.gas.model_copy(update={"pressure_mpa": pressure})
                changed = changed.model_copy(update={"gas": gas})
        elif direction is not None:
            circuit = changed.circuit(direction)
            valves = tuple(
                with_number(valve, key, value) if valve.searched else valve
                for valve in circuit.valves
            )
            changed = changed.model_copy(
                update={direction: circuit.model_copy(update={"valves": valves})}
            )
    return changed


def with_number(valve: Valve, key: str, value: float) -> Valve:
    """The valve with one of its numbers replaced (not validated: the limits are the caller's)."""
    replaced: Valve = _replaced(valve, key.split("."), value)
    return replaced


def _replaced(part: Any, steps: list[str], value: float) -> Any:
    if len(steps) > 1:
        return part.model_copy(
            update={steps[0]: _replaced(getattr(part, steps[0]), steps[1:], value)}
        )
    return part.model_copy(update={steps[0]: value})
