"""One circuit: all valves that act in one direction of travel, as force over shaft velocity.

    F(v) = sum over valves of A_j dp_j(A_j v) + friction + gas

A_j is the area that pushes oil through valve j. What the shims do comes from the caller as one lift
table a shim valve; nothing here knows what a shim is.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.optimize import brentq

from optimiser.damper import Damper, Direction, Valve
from optimiser.faults import BadInput
from optimiser.hydraulics.gas import gas_force_n, gas_pressure_pa
from optimiser.hydraulics.lift import Floats, LiftTable
from optimiser.hydraulics.oil import OilState
from optimiser.hydraulics.restrictions import check_drop, drop, flow, orifice_term
from optimiser.hydraulics.valve import (
    bleed_numbers,
    bleed_shares,
    displaced_area_m2,
    drops_at,
    firmest_drop,
    series_numbers,
    softest_drop,
    valve_numbers,
)

Lifts = Mapping[str, LiftTable]
#: Clicks of the searched valve, or of any valve by name; None: as fitted.
Clicks = float | Mapping[str, float] | None
_LOW_SIDE_SIGN = {"lowers": -1.0, "raises": 1.0, "no_effect": 0.0}


@dataclass(frozen=True)
class ValveCurve:
    """What one valve does over the circuit's velocities; all arrays (n,).

    ``area_mm2`` pushes oil through it, ``drop_mpa`` is over the whole valve, ``force_n`` = area x
    drop, ``shim_pressure_mpa`` across the shims, ``lift_mm`` of the seat, ``bleed_share`` 0 to 1,
    ``beyond_table`` where the lift table had to be continued in a straight line. A check valve has
    no lift; its shim pressure is its drop less that of the series part.
    """

    name: str
    area_mm2: float
    drop_mpa: Floats
    force_n: Floats
    shim_pressure_mpa: Floats
    lift_mm: Floats
    bleed_share: Floats
    beyond_table: npt.NDArray[np.bool_]


@dataclass(frozen=True)
class CircuitCurve:
    """Force over velocity of one circuit; all arrays (n,).

    ``force_n`` includes ``friction_n`` and ``gas_n`` (0 unless the damper has ``gas_in_force``).
    ``low_side_mpa``: absolute pressure on the low-pressure side. ``cavitation_m_s``: velocity at
    which that meets the oil's vapour pressure, None when it does not up to the highest velocity.
    ``searched``: name of the valve whose stack is looked for.
    """

    direction: Direction
    searched: str
    velocity_m_s: Floats
    force_n: Floats
    valves: tuple[ValveCurve, ...]
    friction_n: float
    gas_n: float
    low_side_mpa: Floats
    cavitation_m_s: float | None

    def valve(self, name: str | None = None) -> ValveCurve:
        """Curve of the valve called ``name``, by default the searched one. Raises KeyError."""
        wanted = self.searched if name is None else name
        found = [valve for valve in self.valves if valve.name == wanted]
        if not found:
            raise KeyError(wanted)
        return found[0]

    @property
    def drop_mpa(self) -> Floats:
        """Pressure drop over the searched valve, MPa (n,)."""
        return self.valve().drop_mpa

    @property
    def lift_mm(self) -> Floats:
        """Seat lift of the searched valve, mm (n,)."""
        return self.valve().lift_mm

    @property
    def bleed_share(self) -> Floats:
        """Share of the searched valve's oil that passes its bleed, 0 to 1 (n,)."""
        return self.valve().bleed_share


def circuit_curve(
    damper: Damper,
    direction: Direction,
    oil: OilState,
    velocity_m_s: npt.ArrayLike,
    lifts: Lifts,
    clicks: Clicks = None,
    travel_mm: float = 0.0,
) -> CircuitCurve:
    """Force (N) over shaft velocity (m/s, (n,), >= 0) of one circuit of ``damper``.

    ``lifts``: lift table of every shim valve by the valve's name. ``clicks``: setting of the
    searched valve, or a mapping by valve name; valves not named stay as fitted. ``travel_mm``:
    shaft position for the gas pressure, 0 = extended, where the gas is weakest. Raises BadInput for
    velocities that cannot be used and clicks out of range, KeyError for a circuit or a lift table
    that is missing.
    """
    circuit = damper.circuit(direction)
    velocity = _velocities(velocity_m_s)
    curves = _valve_curves(
        damper, circuit.valves, oil, velocity, lifts, clicks, circuit.searched.name
    )
    friction, gas = _other_forces(damper, direction, travel_mm)
    static = gas_pressure_pa(damper.gas, damper.body, travel_mm)
    low = _low_side_pa(circuit.valves, curves, static)

    def margin(speed: float) -> float:
        at = _velocities([speed])
        there = _valve_curves(damper, circuit.valves, oil, at, lifts, clicks, circuit.searched.name)
        return float(_low_side_pa(circuit.valves, there, static)[0]) - oil.vapour_pressure_pa

    return CircuitCurve(
        direction=direction,
        searched=circuit.searched.name,
        velocity_m_s=velocity,
        force_n=_sum_of_forces(curves, velocity) + friction + gas,
        valves=curves,
        friction_n=friction,
        gas_n=gas,
        low_side_mpa=low * 1e-6,
        cavitation_m_s=_first_crossing(velocity, low - oil.vapour_pressure_pa, margin),
    )


def fixed_force_n(
    damper: Damper,
    direction: Direction,
    oil: OilState,
    velocity_m_s: npt.ArrayLike,
    lifts: Lifts,
    clicks: Clicks = None,
    travel_mm: float = 0.0,
) -> Floats:
    """Force (N, (n,)) of everything but the searched valve, to be taken off a target.

    All other valves of the circuit, friction and gas. Arguments and errors as in
    :func:`circuit_curve`; the searched valve needs no lift table.
    """
    circuit = damper.circuit(direction)
    velocity = _velocities(velocity_m_s)
    others = tuple(valve for valve in circuit.valves if not valve.searched)
    curves = _valve_curves(damper, others, oil, velocity, lifts, clicks, circuit.searched.name)
    return _sum_of_forces(curves, velocity) + sum(_other_forces(damper, direction, travel_mm))


def limit_forces_n(
    damper: Damper,
    direction: Direction,
    oil: OilState,
    velocity_m_s: npt.ArrayLike,
    lifts: Lifts,
    clicks: Clicks = None,
    travel_mm: float = 0.0,
) -> tuple[Floats, Floats]:
    """(softest, firmest) force (N, (n,)) any stack in the searched valve can give.

    Softest: no shims, only ports, bleed and series part. Firmest: shims held shut, bleed and series
    part only, infinite without a bleed. Arguments and errors as in :func:`fixed_force_n`.
    """
    valve = damper.circuit(direction).searched
    velocity = _velocities(velocity_m_s)
    fixed = fixed_force_n(damper, direction, oil, velocity, lifts, clicks, travel_mm)
    numbers = valve_numbers(valve, damper.body, oil)
    bleed = bleed_numbers(valve, oil, _setting(valve, clicks, valve.name))
    flows = numbers.area_m2 * velocity
    softest = np.array([softest_drop(numbers, *bleed, q) for q in flows])
    firmest = np.array([firmest_drop(numbers, *bleed, q) for q in flows])
    return fixed + numbers.area_m2 * softest, fixed + numbers.area_m2 * firmest


def _velocities(velocity_m_s: npt.ArrayLike) -> Floats:
    velocity = np.array(velocity_m_s, dtype=np.float64)
    if velocity.ndim != 1 or velocity.size == 0:
        raise BadInput("velocities must be a list of one or more numbers, m/s")
    if not (np.isfinite(velocity).all() and (velocity >= 0.0).all()):
        raise BadInput("velocities must be finite and 0 or more, m/s")
    return velocity


def _setting(valve: Valve, clicks: Clicks, searched: str) -> float | None:
    if isinstance(clicks, Mapping):
        return clicks.get(valve.name)
    return clicks if valve.name == searched else None


def _valve_curves(
    damper: Damper,
    valves: tuple[Valve, ...],
    oil: OilState,
    velocity: Floats,
    lifts: Lifts,
    clicks: Clicks,
    searched: str,
) -> tuple[ValveCurve, ...]:
    curves = []
    for valve in valves:
        bleed = bleed_numbers(valve, oil, _setting(valve, clicks, searched))
        if valve.kind == "check":
            curves.append(_check_curve(valve, damper, oil, velocity, bleed))
        else:
            curves.append(_shim_curve(valve, damper, oil, velocity, bleed, lifts[valve.name]))
    return tuple(curves)


def _shim_curve(
    valve: Valve,
    damper: Damper,
    oil: OilState,
    velocity: Floats,
    bleed: tuple[float, float],
    table: LiftTable,
) -> ValveCurve:
    numbers = valve_numbers(valve, damper.body, oil)
    flows = numbers.area_m2 * velocity
    drops, pressure, lift = np.empty((3, flows.size))
    drops_at(numbers, *bleed, table.pressure_pa, table.lift_m, flows, drops, pressure, lift)
    return ValveCurve(
        name=valve.name,
        area_mm2=numbers.area_m2 * 1e6,
        drop_mpa=drops * 1e-6,
        force_n=numbers.area_m2 * drops,
        shim_pressure_mpa=pressure * 1e-6,
        lift_mm=lift * 1e3,
        bleed_share=bleed_shares(numbers, *bleed, flows, drops),
        beyond_table=pressure > table.pressure_pa[-1],
    )


def _check_curve(
    valve: Valve, damper: Damper, oil: OilState, velocity: Floats, bleed: tuple[float, float]
) -> ValveCurve:
    area = displaced_area_m2(valve.displacement, damper.body)
    series = series_numbers(valve, oil)
    opened = (valve.check_area_mm2 or 0.0) * 1e-6
    orifice = orifice_term(opened, valve.check_discharge, oil.density_kg_m3)
    cracking = valve.check_cracking_mpa * 1e6
    flows = area * velocity
    across = np.array([check_drop(q, cracking, orifice, *bleed) for q in flows])
    bled = np.array([flow(dp, *bleed) for dp in across])
    drops = across + np.array([drop(q, *series) for q in flows])
    closed_share = 1.0 if np.isfinite(bleed[0]) else 0.0
    return ValveCurve(
        name=valve.name,
        area_mm2=area * 1e6,
        drop_mpa=drops * 1e-6,
        force_n=area * drops,
        shim_pressure_mpa=across * 1e-6,
        lift_mm=np.zeros(flows.size),
        bleed_share=np.divide(bled, flows, out=np.full(flows.size, closed_share), where=flows > 0),
        beyond_table=np.zeros(flows.size, dtype=np.bool_),
    )


def _sum_of_forces(curves: tuple[ValveCurve, ...], velocity: Floats) -> Floats:
    total = np.zeros(velocity.size)
    for curve in curves:
        total += curve.force_n
    return total


def _other_forces(damper: Damper, direction: Direction, travel_mm: float) -> tuple[float, float]:
    """(friction, gas force) in N, the latter 0 unless the damper's curve is to include it."""
    if not damper.gas_in_force:
        return damper.friction_n, 0.0
    return damper.friction_n, gas_force_n(damper.gas, damper.body, direction, travel_mm)


def _low_side_pa(
    valves: tuple[Valve, ...], curves: tuple[ValveCurve, ...], static_pa: float
) -> Floats:
    """Absolute pressure (Pa, (n,)) on the low-pressure side of the piston."""
    low = np.full(curves[0].drop_mpa.size, static_pa)
    for valve, curve in zip(valves, curves, strict=True):
        if valve.low_side != "no_effect":
            low += _LOW_SIDE_SIGN[valve.low_side] * curve.drop_mpa * 1e6
    return low


def _first_crossing(
    velocity: Floats, margins: Floats, margin: Callable[[float], float]
) -> float | None:
    """Lowest velocity (m/s) from rest to the highest given at which ``margin`` reaches 0."""
    order = np.argsort(velocity)
    below = 0.0
    for speed, left in zip(velocity[order], margins[order], strict=True):
        if left <= 0.0:
            if margin(below) <= 0.0:
                return below
            return float(brentq(margin, below, float(speed), xtol=1e-6, rtol=1e-6))
        below = float(speed)
    return None
