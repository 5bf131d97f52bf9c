"""Predicted forces of dyno runs as a function of the free numbers: hydraulics only in the loop."""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from optimiser.damper import Damper, Direction, Valve
from optimiser.fitting.lifts import LiftStore, no_stack
from optimiser.fitting.parameters import (
    FRICTION,
    GAS,
    PRELOAD,
    Parameter,
    with_number,
)
from optimiser.fitting.runs import Run
from optimiser.hydraulics.circuit import fixed_force_n
from optimiser.hydraulics.lift import Floats, LiftTable
from optimiser.hydraulics.valve import bleed_numbers, drops_at, valve_numbers
from optimiser.materials import Oil, Steel
from optimiser.mechanics.deflect import Fidelity
from optimiser.prediction import Setup, fixed_tables

#: Lift tables reach this many times the largest pressure measured.
REACH = 1.6
#: A force beyond this many times the largest measured stands for "locked", N/N.
LOCKED = 1e3


@dataclass(frozen=True, eq=False)
class Seen:
    """A run prepared for the model: ``others_n`` (n,) force of the circuit's other valves, N."""

    run: Run
    setup: Setup
    top_pa: float
    others_n: Floats
    stackless: bool = False


@dataclass
class Model:
    """The damper whose numbers are sought, with the tables its runs need.

    ``parameters``: the free numbers; every other one stays as the damper has it. ``steady_n``: gas
    force in the runs where it is not free, N.
    """

    damper: Damper
    steel: Steel
    oil: Oil
    parameters: tuple[Parameter, ...]
    fidelity: Fidelity = "reported"
    steady_n: float = 0.0
    store: LiftStore = field(init=False)

    def __post_init__(self) -> None:
        self.store = LiftStore(self.fidelity)

    def with_parameters(self, parameters: Sequence[Parameter], steady_n: float) -> "Model":
        """The same tables for other free numbers."""
        other = Model(self.damper, self.steel, self.oil, tuple(parameters), self.fidelity, steady_n)
        other.store = self.store
        return other

    def prepare(self, run: Run, stackless: bool = False) -> Seen:
        """What stays fixed of a run. Raises BadInput as the damper's rooms do."""
        setup = Setup(self.damper, run.direction, self.steel, self.oil, run.oil_temp_c)
        fastest = float(run.velocity_m_s.max())
        tables = fixed_tables(setup, fastest)
        quiet = self.damper.model_copy(update={"friction_n": 0.0, "gas_in_force": False})
        others = fixed_force_n(quiet, run.direction, setup.oil_state, run.velocity_m_s, tables)
        area = valve_numbers(setup.valve, self.damper.body, setup.oil_state).area_m2
        return Seen(run, setup, REACH * run.largest_n / area, others, stackless)

    def force_n(self, seen: Seen, values: Floats) -> Floats:
        """Force (n,), N, of a run at the free numbers' ``values`` (p,)."""
        run = seen.run
        valve, friction, steady = self._numbers(run.direction, values)
        numbers = valve_numbers(valve, self.damper.body, seen.setup.oil_state)
        table = self._table(seen, valve)
        bleed = bleed_numbers(valve, seen.setup.oil_state, run.clicks)
        flows = numbers.area_m2 * run.velocity_m_s
        drops, pressure, lift = np.empty((3, flows.size))
        drops_at(numbers, *bleed, table.pressure_pa, table.lift_m, flows, drops, pressure, lift)
        force = numbers.area_m2 * drops + seen.others_n + friction
        force += steady if run.direction == "compression" else -steady
        return np.minimum(force, LOCKED * run.largest_n)

    def steady_of(self, run: Run, values: Floats) -> float:
        """Gas force in a run, N, positive where it adds to the measured force."""
        steady = self._numbers(run.direction, values)[2]
        return steady if run.direction == "compression" else -steady

    def _table(self, seen: Seen, valve: Valve) -> LiftTable:
        if seen.stackless:
            return no_stack()
        free_height = any(
            p.key == PRELOAD and p.direction == seen.run.direction for p in self.parameters
        )
        return self.store.table(seen.setup, valve, seen.run.stack, seen.top_pa, free_height)

    def _numbers(self, direction: Direction, values: Floats) -> tuple[Valve, float, float]:
        """(searched valve, friction N, steady gas force N) at the free numbers' values."""
        valve = self.damper.circuit(direction).searched
        friction, steady = self.damper.friction_n, self.steady_n
        for item, value in zip(self.parameters, values, strict=True):
            if item.key == FRICTION:
                friction = float(value)
            elif item.key == GAS:
                steady = float(value)
            elif item.direction == direction:
                valve = with_number(valve, item.key, float(value))
        return valve, friction, steady


def sensitivity(model: Model, seen: Seen, values: Floats) -> Floats:
    """dF/dx (n, p), N per unit of each free number, by central differences."""
    columns = []
    for place, item in enumerate(model.parameters):
        step = 2e-3 * item.scale
        up, down = values.copy(), values.copy()
        up[place] = min(values[place] + step, item.high)
        down[place] = max(values[place] - step, item.low)
        change = model.force_n(seen, up) - model.force_n(seen, down)
        columns.append(change / (up[place] - down[place]))
    return np.array(columns).T
