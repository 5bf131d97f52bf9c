"""Invented dampers of the four kinds, oils and lift tables the hydraulics are tried on."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.optimize import brentq

from optimiser.damper import Damper, Valve
from optimiser.hydraulics.lift import Floats, LiftTable, pressure_grid
from optimiser.hydraulics.oil import OilState, oil_at

STACK = ["3 x 36 x 0.20", "1 x 30 x 0.20", "1 x 24 x 0.20", "1 x 18 x 0.30"]
SMALL_STACK = ["2 x 20 x 0.15", "1 x 16 x 0.15", "1 x 12 x 0.30"]


@dataclass(frozen=True)
class Oil:
    viscosity_40c_cst: float = 16.0
    viscosity_100c_cst: float = 3.8
    density_15c_kg_m3: float = 850.0
    vapour_pressure_mpa: float = 0.002


OIL = oil_at(Oil(), 40.0)


def piston_valve(name: str, **changes: Any) -> dict[str, Any]:
    return {
        "name": name,
        "displacement": "piston_less_shaft",
        "low_side": "lowers",
        "ports": {
            "inner_mm": 24.0,
            "outer_mm": 34.0,
            "area_mm2": 130.0,
            "hydraulic_mm": 5.0,
            "length_mm": 12.0,
        },
        "seat": {"seat_mm": 35.0, "land_mm": 0.8},
        "post": {"post_mm": 12.0, "height_min_mm": 1.0, "height_max_mm": 8.0},
        "bleed": {
            "area_mm2": 1.0,
            "length_mm": 2.0,
            "needle": {
                "jet_mm": 3.0,
                "cone_deg": 20.0,
                "lift_per_click_mm": 0.2,
                "clicks": 20,
            },
        },
        "fitted": STACK,
    } | changes


def base_valve(name: str, **changes: Any) -> dict[str, Any]:
    small = {
        "displacement": "shaft",
        "low_side": "raises",
        "ports": {
            "inner_mm": 13.0,
            "outer_mm": 18.0,
            "area_mm2": 40.0,
            "hydraulic_mm": 3.5,
            "length_mm": 8.0,
        },
        "seat": {"seat_mm": 19.0, "land_mm": 0.6},
        "post": {"post_mm": 8.0, "height_min_mm": 0.6, "height_max_mm": 6.0},
        "fitted": SMALL_STACK,
    }
    return piston_valve(name) | small | changes


def check_valve(name: str, **changes: Any) -> dict[str, Any]:
    return {
        "name": name,
        "kind": "check",
        "displacement": "piston_less_shaft",
        "low_side": "lowers",
        "check_area_mm2": 90.0,
        "check_cracking_mpa": 0.01,
    } | changes


def monotube(**changes: Any) -> Damper:
    """Gas behind a floating piston, both stacks on the piston."""
    return _damper(
        "invented monotube",
        [piston_valve("piston", searched=True)],
        [piston_valve("rebound piston", searched=True, low_side="no_effect")],
        **changes,
    )


def solid_piston(**changes: Any) -> Damper:
    """Twin tube whose external valves take all the oil; a check valve refills the other side."""
    outer = piston_valve("external", searched=True, displacement="piston", low_side="no_effect")
    back = piston_valve("external rebound", searched=True, low_side="no_effect")
    return _damper(
        "invented solid piston",
        [outer, check_valve("refill")],
        [back, check_valve("refill", displacement="piston")],
        **changes,
    )


def cartridge(**changes: Any) -> Damper:
    """Fork cartridge: base valve with a fixed series part, and a mid valve on the piston."""
    series = {"area_mm2": 60.0, "length_mm": 10.0, "hydraulic_mm": 6.0}
    base = base_valve("base", searched=True, series=series)
    mid = base_valve("mid", displacement="piston_less_shaft", low_side="lowers")
    body = {"piston_mm": 24.0, "shaft_mm": 12.0, "stroke_mm": 300.0}
    rebound = [
        base_valve(
            "rebound", searched=True, displacement="piston_less_shaft", low_side="no_effect"
        ),
        check_valve("base refill", displacement="shaft"),
    ]
    given = {"body": body, "gas": {"pressure_mpa": 0.0, "volume_cm3": 300.0}} | changes
    return _damper("invented cartridge", [base, mid], rebound, **given)


def digressive(**changes: Any) -> Damper:
    """Monotube whose seat stands above the clamp face."""
    valve = piston_valve("piston", searched=True)
    valve["seat"] = {"seat_mm": 35.0, "land_mm": 0.8, "height_mm": 0.15}
    return _damper("invented digressive", [valve], None, **changes)


def _damper(
    name: str,
    compression: list[dict[str, Any]] | None,
    rebound: list[dict[str, Any]] | None,
    **changes: Any,
) -> Damper:
    given: dict[str, Any] = {
        "name": name,
        "oil": "medium",
        "body": {"piston_mm": 46.0, "shaft_mm": 16.0, "stroke_mm": 60.0},
        "gas": {"pressure_mpa": 1.0, "volume_cm3": 60.0},
        "compression": {"valves": compression},
        "rebound": {"valves": rebound} if rebound else None,
    }
    return Damper.model_validate(given | changes)


DAMPERS = {
    "monotube": monotube(),
    "solid piston": solid_piston(),
    "cartridge": cartridge(),
    "digressive": digressive(),
}


def searched_valve(damper: Damper | None = None) -> Valve:
    return (damper or DAMPERS["monotube"]).circuit("compression").searched


def stiffening_lift_m(
    pressure_pa: Floats, rate_pa_m: float = 2e10, thick_m: float = 0.25e-3, opens_pa: float = 0.0
) -> Floats:
    """Lift of an invented stack: p - p_open = rate y (1 + 0.5 (y/t)^2)."""

    def lift(extra: float) -> float:
        if extra <= 0.0:
            return 0.0
        return brentq(
            lambda y: rate_pa_m * y * (1.0 + 0.5 * (y / thick_m) ** 2) - extra,
            0.0,
            extra / rate_pa_m,
            xtol=1e-18,
            rtol=1e-14,
        )

    return np.array([lift(p - opens_pa) for p in pressure_pa])


def table(max_pa: float = 12e6, n: int = 24, **stack: float) -> LiftTable:
    grid = pressure_grid(max_pa, n, stack.get("opens_pa", 0.0))
    return LiftTable(grid, stiffening_lift_m(grid, **stack))


def lifts_for(damper: Damper, **stack: float) -> dict[str, LiftTable]:
    """One lift table for every shim valve of the damper; preloaded where the seat is raised."""
    tables = {}
    for circuit in (damper.compression, damper.rebound):
        for valve in circuit.valves if circuit else ():
            if valve.seat is not None:
                opens = 2e6 if valve.seat.height_mm > 0 else 0.0
                tables[valve.name] = table(**({"opens_pa": opens} | stack))
    return tables


def thinner(oil: OilState, factor: float) -> OilState:
    return oil._replace(viscosity_pa_s=oil.viscosity_pa_s / factor)
