"""Lift tables of known stacks at any seat height and load, computed once and kept.

A stack's lift depends on the load (pressure x loaded share of the port ring) and on the seat's
height. The load only scales a table's pressures. Between heights a table is interpolated entry by
entry: each table begins at the load that opens the stack, so that its entries move smoothly with
the height, and the fit sees a smooth function.
"""

from dataclasses import dataclass, field
from math import floor

import numpy as np

from optimiser.damper import Valve
from optimiser.hydraulics.lift import LiftTable
from optimiser.mechanics.deflect import Fidelity
from optimiser.prediction import ENTRIES, Setup, bend, opening_pressure_pa
from optimiser.stack import Stack

#: Heights at which tables are computed, mm apart.
HEIGHT_STEP_MM = 0.01
_Key = tuple[str, tuple[str, ...], float]


@dataclass
class LiftStore:
    """Tables by valve, stack, reach and seat height, at one fidelity of the mechanics."""

    fidelity: Fidelity = "reported"
    tables: dict[_Key, LiftTable] = field(default_factory=dict)

    def table(
        self, setup: Setup, valve: Valve, stack: Stack, top_pa: float, free_height: bool
    ) -> LiftTable:
        """Lift table of ``stack`` in ``valve`` at its seat height and loaded share.

        ``top_pa``: pressure in the ports it reaches at least, Pa. With ``free_height`` it is
        interpolated between multiples of :data:`HEIGHT_STEP_MM`.
        """
        ports, seat = valve.ports, valve.seat
        if ports is None or seat is None:
            raise TypeError(f"valve '{valve.name}' has no shims")
        if free_height:
            step = floor(seat.height_mm / HEIGHT_STEP_MM + 1e-9)
            share = seat.height_mm / HEIGHT_STEP_MM - step
            low, high = (
                self._at(setup, valve, stack, top_pa, round(k * HEIGHT_STEP_MM, 9))
                for k in (step, step + 1)
            )
            load = low.pressure_pa + share * (high.pressure_pa - low.pressure_pa)
            lift = low.lift_m + share * (high.lift_m - low.lift_m)
        else:
            load, lift = self._at(setup, valve, stack, top_pa, seat.height_mm)
        return LiftTable(load / ports.loaded_fraction, lift)

    def _at(
        self, setup: Setup, valve: Valve, stack: Stack, top_pa: float, height_mm: float
    ) -> LiftTable:
        side = f"{setup.direction} {valve.name} {top_pa:g}"
        key = (side, tuple(stack.lines()), height_mm)
        if key not in self.tables:
            self.tables[key] = _computed(setup, valve, stack, top_pa, height_mm, self.fidelity)
        return self.tables[key]


def _computed(
    setup: Setup, valve: Valve, stack: Stack, top_pa: float, height_mm: float, fidelity: Fidelity
) -> LiftTable:
    """Table over load, Pa on the whole port ring; unless the seat is low it opens at entry one."""
    assert valve.ports is not None
    assert valve.seat is not None
    whole = valve.model_copy(
        update={
            "ports": valve.ports.model_copy(update={"loaded_fraction": 1.0}),
            "seat": valve.seat.model_copy(update={"height_mm": height_mm}),
        }
    )
    opens = opening_pressure_pa(setup, whole, stack, top_pa, fidelity)
    top = max(top_pa, 1.5 * opens)
    above = np.expm1(4.0 * np.arange(ENTRIES + 1) / ENTRIES) / np.expm1(4.0)
    load = opens + (top - opens) * above
    lift = np.maximum.accumulate(bend(setup, whole, stack, load * 1e-6, fidelity).seat_lift_mm)
    if height_mm >= 0.0:
        lift[0] = 0.0
        return LiftTable(load, lift * 1e-3)
    return LiftTable(load[1:].copy(), lift[1:] * 1e-3)


def no_stack() -> LiftTable:
    """Table of a valve without its stack: wide open at any pressure."""
    return LiftTable(np.array([1.0, 1e9]), np.array([1.0, 1.0]))
