"""What a stack does in a damper: mechanics and hydraulics put together, one stack at a time."""

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from optimiser.damper import Damper, Direction, Valve, warnings_for
from optimiser.faults import BadInput
from optimiser.hydraulics.circuit import CircuitCurve, circuit_curve
from optimiser.hydraulics.lift import Floats, LiftTable, pressure_grid
from optimiser.hydraulics.oil import OilState, oil_at
from optimiser.hydraulics.valve import bleed_numbers, drops_at, valve_numbers
from optimiser.materials import Oil, Steel
from optimiser.mechanics import BackSpringForce, Deflection, deflect
from optimiser.mechanics.deflect import RISE_LIMIT, Fidelity
from optimiser.mechanics.stress import fatigue_utilisation
from optimiser.stack import Shim, Stack

#: Entries of a lift table; gaps that close between two of them cost least when they are close.
ENTRIES = 28
_FIRST_TOP_PA = 0.5e6
_HIGHEST_TOP_PA = 500e6


@dataclass(frozen=True)
class Setup:
    """A damper in one direction, with its steel and oil: everything but the stack."""

    damper: Damper
    direction: Direction
    steel: Steel
    oil: Oil
    oil_temp_c: float

    @property
    def valve(self) -> Valve:
        """The valve whose stack is looked for."""
        return self.damper.circuit(self.direction).searched

    @property
    def oil_state(self) -> OilState:
        """The oil at its temperature."""
        return oil_at(self.oil, self.oil_temp_c)

    @property
    def clicks_range(self) -> int:
        """Clicks from closed to fully open; 0 without an adjuster."""
        needle = self.valve.bleed.needle
        return needle.clicks if needle else 0

    @property
    def default_clicks(self) -> int:
        """Clicks as fitted, or the middle of the range."""
        fitted = self.valve.fitted_clicks
        return self.clicks_range // 2 if fitted is None else fitted


@dataclass(frozen=True)
class ShimState:
    """One shim at the hardest point of the velocity range."""

    outer_mm: float
    thickness_mm: float
    inner_mm: float | None
    peak_stress_mpa: float
    peak_at_mm: float
    at_clamp: bool
    utilisation: float


@dataclass(frozen=True)
class Prediction:
    """What a stack does; arrays (n,) over ``velocity_m_s``.

    ``pressure_mpa`` drop over the searched valve, ``shim_pressure_mpa`` over its shims;
    ``lift_mm`` above the seat; ``bleed_share`` of the valve's oil, 0 to 1; ``force_closed_n`` and
    ``force_open_n`` with the adjuster shut and fully open (equal without one; infinite where
    nothing lets the oil through); ``rise_thicknesses`` edge rise over the face shim's thickness,
    beyond RISE_LIMIT the model is not checked (``outside_model``); ``cavitation_m_s`` None: not
    in range.
    """

    setup: Setup
    stack: Stack
    clicks: int
    velocity_m_s: Floats
    force_n: Floats
    pressure_mpa: Floats
    shim_pressure_mpa: Floats
    lift_mm: Floats
    bleed_share: Floats
    force_closed_n: Floats
    force_open_n: Floats
    rise_thicknesses: Floats
    edge_rise_mm: Floats
    shims: tuple[ShimState, ...]
    cavitation_m_s: float | None
    warnings: tuple[str, ...] = field(default=())

    @property
    def utilisation(self) -> float:
        """Fatigue utilisation of the hardest worked shim."""
        return max(shim.utilisation for shim in self.shims)

    @property
    def outside_model(self) -> bool:
        """Whether the edge rises further than the model was checked for."""
        return bool(np.max(self.rise_thicknesses) > RISE_LIMIT)


def bend(
    setup: Setup,
    valve: Valve,
    stack: Stack,
    port_pressure_mpa: ArrayLike,
    fidelity: Fidelity = "reported",
) -> Deflection:
    """Deflection of ``stack`` in ``valve`` at pressures (p,) in its ports, MPa."""
    ports, seat, spring = valve.ports, valve.seat, valve.back_spring
    if ports is None or seat is None:
        raise TypeError(f"valve '{valve.name}' has no shims")
    return deflect(
        [_as_tuple(shim) for shim in stack.bending],
        stack.clamp_mm,
        ports.inner_mm,
        ports.outer_mm,
        np.asarray(port_pressure_mpa) * ports.loaded_fraction,
        seat.seat_mm,
        seat.height_mm,
        setup.steel.youngs_mpa,
        setup.steel.poisson,
        fidelity,
        BackSpringForce(spring.ring_mm, spring.rate_n_mm, spring.preload_n) if spring else None,
    )


def _as_tuple(shim: Shim) -> tuple[float, ...]:
    if shim.inner_mm is None:
        return (shim.outer_mm, shim.thickness_mm)
    return (shim.outer_mm, shim.thickness_mm, shim.inner_mm)


def opening_pressure_pa(
    setup: Setup, valve: Valve, stack: Stack, top_pa: float, fidelity: Fidelity = "reported"
) -> float:
    """Port pressure, Pa, that opens a preloaded stack; 0 when it rests on a flat seat."""
    low, high = 0.0, top_pa
    first = bend(setup, valve, stack, [1e-6 * top_pa * 1e-6], fidelity)
    if first.seat_lift_mm[0] > 0.0:
        return 0.0
    for _narrowing in range(4):
        grid = np.linspace(low, high, 12)[1:]
        lift = bend(setup, valve, stack, grid * 1e-6, fidelity).seat_lift_mm
        if lift[-1] <= 0.0:
            return high
        opened = int(np.argmax(lift > 0.0))
        low, high = (grid[opened - 1] if opened else low), grid[opened]
    return low


def bend_table(
    setup: Setup,
    valve: Valve,
    stack: Stack,
    top_pa: float,
    fidelity: Fidelity = "reported",
    entries: int = ENTRIES,
) -> tuple[LiftTable, Deflection]:
    """Seat lift of a stack up to ``top_pa``, with the pressure that opens it as an entry, and the
    deflection it comes from, at the table's pressures."""
    opens = opening_pressure_pa(setup, valve, stack, top_pa, fidelity)
    grid = pressure_grid(top_pa, entries, opens if opens < 0.98 * top_pa else 0.0)
    found = bend(setup, valve, stack, grid * 1e-6, fidelity)
    lift = found.seat_lift_mm * 1e-3
    if opens > 0.0:
        lift[grid <= opens] = 0.0
    return LiftTable(grid, np.maximum.accumulate(lift)), found


def lift_table(
    setup: Setup, valve: Valve, stack: Stack, top_pa: float, fidelity: Fidelity = "reported"
) -> LiftTable:
    """The table of :func:`bend_table` alone."""
    return bend_table(setup, valve, stack, top_pa, fidelity)[0]


def _tables_reaching(
    setup: Setup, stacks: Mapping[str, Stack], fastest_m_s: float, clicks: int | None
) -> dict[str, LiftTable]:
    """Lift tables of the shim valves in ``stacks`` that reach the pressures met at a velocity."""
    circuit = setup.damper.circuit(setup.direction)
    valves = [valve for valve in circuit.valves if valve.name in stacks]
    tops = {valve.name: _FIRST_TOP_PA for valve in valves}
    tables: dict[str, LiftTable] = {}
    while True:
        for valve in valves:
            if valve.name not in tables:
                stack, top = stacks[valve.name], tops[valve.name]
                tables[valve.name] = lift_table(setup, valve, stack, top)
        reached = {
            valve.name: _shim_pressure_pa(setup, valve, tables[valve.name], fastest_m_s, clicks)
            for valve in valves
        }
        short = [name for name, pa in reached.items() if tops[name] < min(pa, _HIGHEST_TOP_PA)]
        if not short:
            break
        for name in short:
            tops[name] *= 2.0
            del tables[name]
    for valve in valves:
        top = min(max(1.2 * reached[valve.name], 1e3), _HIGHEST_TOP_PA)
        tables[valve.name] = lift_table(setup, valve, stacks[valve.name], top)
    return tables


def _shim_pressure_pa(
    setup: Setup, valve: Valve, table: LiftTable, velocity: float, clicks: int | None
) -> float:
    """Pressure across the shims of one valve at a shaft velocity."""
    oil = setup.oil_state
    numbers = valve_numbers(valve, setup.damper.body, oil)
    setting = clicks if valve.searched else None
    flows = np.array([numbers.area_m2 * velocity])
    drops, pressure, lift = np.zeros((3, 1))
    bleed = bleed_numbers(valve, oil, setting)
    drops_at(numbers, *bleed, table.pressure_pa, table.lift_m, flows, drops, pressure, lift)
    return float(pressure[0])


def fixed_tables(setup: Setup, fastest_m_s: float) -> dict[str, LiftTable]:
    """Lift tables of the shim valves that are not searched, with the stacks fitted in them."""
    stacks = {
        valve.name: valve.fitted
        for valve in setup.damper.circuit(setup.direction).valves
        if valve.fitted is not None and not valve.searched
    }
    return _tables_reaching(setup, stacks, fastest_m_s, None)


def stacks_of(setup: Setup, stack: Stack) -> dict[str, Stack]:
    """Stack of every shim valve: ``stack`` in the searched one, the fitted ones elsewhere."""
    stacks = {}
    for valve in setup.damper.circuit(setup.direction).valves:
        if valve.kind == "shim" and valve.fitted is not None:
            stacks[valve.name] = stack if valve.searched else valve.fitted
    return stacks


def predict(
    setup: Setup, stack: Stack, velocity_m_s: ArrayLike, clicks: int | None = None
) -> Prediction:
    """Curve, lift and stress of ``stack`` in the searched valve, at the `reported` fidelity.

    ``velocity_m_s`` (n,) above 0. ``clicks`` out from closed, by default as fitted. Raises
    BadInput.
    """
    velocity = np.atleast_1d(np.asarray(velocity_m_s, dtype=float))
    if not (velocity.size and np.all(np.isfinite(velocity)) and np.all(velocity > 0.0)):
        raise BadInput("velocities must be finite and above 0 m/s")
    setting = setup.default_clicks if clicks is None else clicks
    if not 0 <= setting <= setup.clicks_range:
        raise BadInput(f"clicks is {setting}; allowed: 0 (closed) to {setup.clicks_range} (open)")
    tables = _tables_reaching(setup, stacks_of(setup, stack), float(velocity.max()), setting)

    def curve_at(count: int) -> CircuitCurve:
        return circuit_curve(
            setup.damper, setup.direction, setup.oil_state, velocity, tables, count
        )

    curve = curve_at(setting)
    searched = curve.valve()
    bent = bend(setup, setup.valve, stack, searched.shim_pressure_mpa)
    shims = _shim_states(setup, stack, bent)
    return Prediction(
        setup=setup,
        stack=stack,
        clicks=setting,
        velocity_m_s=velocity,
        force_n=curve.force_n,
        pressure_mpa=searched.drop_mpa,
        shim_pressure_mpa=searched.shim_pressure_mpa,
        lift_mm=searched.lift_mm,
        bleed_share=searched.bleed_share,
        force_closed_n=curve_at(0).force_n,
        force_open_n=curve_at(setup.clicks_range).force_n,
        rise_thicknesses=bent.rise_thicknesses,
        edge_rise_mm=bent.edge_deflection_mm,
        shims=shims,
        cavitation_m_s=curve.cavitation_m_s,
        warnings=tuple(_warnings(setup, stack, curve, bent, shims)),
    )


def _shim_states(setup: Setup, stack: Stack, bent: Deflection) -> tuple[ShimState, ...]:
    hardest = np.argmax(bent.peak_stress_mpa, axis=0)
    states = []
    for index, shim in enumerate(stack.bending):
        stress = float(bent.peak_stress_mpa[hardest[index], index])
        place = float(bent.peak_at_mm[hardest[index], index])
        used = fatigue_utilisation(
            np.asarray(stress), setup.steel.endurance_mpa, setup.steel.tensile_mpa
        )
        states.append(
            ShimState(
                shim.outer_mm,
                shim.thickness_mm,
                shim.inner_mm,
                stress,
                place,
                abs(place - stack.clamp_mm) < 1e-6,
                float(used),
            )
        )
    return tuple(states)


def _warnings(
    setup: Setup,
    stack: Stack,
    curve: CircuitCurve,
    bent: Deflection,
    shims: tuple[ShimState, ...],
) -> list[str]:
    found = list(warnings_for(setup.valve, stack))
    if np.any(bent.outside_model):
        first = curve.velocity_m_s[bent.outside_model].min()
        found.append(
            f"outside the model from {first:g} m/s: the face shim's edge rises more than "
            f"{RISE_LIMIT:g} thicknesses, where its rim may buckle into waves and soften"
        )
    if curve.cavitation_m_s is not None:
        found.append(
            f"cavitation from {curve.cavitation_m_s:.2f} m/s: the oil behind the piston would "
            "boil; more gas pressure or softer valving is needed there"
        )
    if max(shim.utilisation for shim in shims) >= 1.0:
        found.append(
            "fatigue: at least one shim is worked beyond its endurance limit and has a finite life"
        )
    for other in curve.valves:
        if other.name != setup.valve.name and other.beyond_table.any():
            found.append(f"valve '{other.name}' is worked beyond the range it was computed for")
    return found
