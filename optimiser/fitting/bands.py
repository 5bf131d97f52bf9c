"""Prediction bands: what a stack may really do, by seeded Monte Carlo through the quick model.

Every sample draws the damper's numbers (from the covariance of a fit), the thickness of every size
of shim, the needle's play, the oil's temperature and one error of the model that all forces share.
The quick model's small difference to the reported one is taken out by the ratio of both at the
nominal values.
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from optimiser.compiled import kernel
from optimiser.faults import BadInput
from optimiser.fitting.draws import Draws, drawn, numbers_of
from optimiser.fitting.uncertainty import Uncertainty
from optimiser.hydraulics.circuit import fixed_force_n
from optimiser.hydraulics.lift import Floats, pressure_grid
from optimiser.hydraulics.oil import oil_at
from optimiser.hydraulics.valve import ValveNumbers, drops_at
from optimiser.mechanics.layout import Ints, group_shims
from optimiser.mechanics.quick import Bench, Layers, Setting, bench, follow, layers_of
from optimiser.mechanics.tables import Tables, tables_for
from optimiser.prediction import Prediction, Setup, fixed_tables, predict
from optimiser.stack import Stack
from optimiser.wanted.target import Target

#: Entries of a sample's lift table, and how far it reaches beyond the nominal pressure.
ENTRIES = 20
REACH = 2.0
#: Relative change at which a pressure is settled.
SETTLED = 2e-3
#: Temperatures at which the fixed valves are computed, between which they are interpolated.
_TEMPERATURES = 5


@dataclass(frozen=True, eq=False)
class Bands:
    """Where the force of one stack lies: ``p05_n``, ``p50_n`` and ``p95_n`` (n,) are the 5th, 50th
    and 95th of a hundred samples at ``velocity_m_s`` (n,); ``nominal_n`` (n,) is the prediction;
    ``samples_n`` (s, n) every sample. All N."""

    velocity_m_s: Floats
    p05_n: Floats
    p50_n: Floats
    p95_n: Floats
    nominal_n: Floats
    samples_n: Floats
    seed: int


class _Bent(NamedTuple):
    """A stack as the kernel needs it: one row a shim, face first, SI."""

    outer: Floats  # (n,)
    hole: Floats  # (n,)
    plate: Ints  # (m,) of its merged groups
    hole_node: Ints  # (m,)
    rim_node: Ints  # (m,)


def force_bands(
    setup: Setup,
    stack: Stack,
    velocity_m_s: ArrayLike,
    clicks: int | None,
    uncertainty: Uncertainty,
    samples: int = 1000,
    seed: int = 0,
) -> Bands:
    """5-95 % band of the force of ``stack`` at ``velocity_m_s`` (n,), m/s, rising.

    ``clicks`` out from closed, None as fitted. The same ``seed`` gives the same samples; stacks of
    one damper share the draws of the damper's numbers. Raises BadInput.
    """
    if samples < 20:
        raise BadInput(f"samples is {samples}; allowed: 20 or more")
    nominal = predict(setup, stack, velocity_m_s, clicks)
    order = np.argsort(nominal.velocity_m_s)
    if np.any(np.diff(order) < 0):
        raise BadInput("velocities for a band must rise")
    draws = drawn(setup, stack, nominal.clicks, uncertainty, samples, seed)
    force = _forces(setup, nominal, draws)
    share = force[1:] / force[0]
    spread = nominal.force_n * share * draws.factor[1:, None]
    kept = spread[np.isfinite(spread).all(axis=1)]
    if kept.shape[0] < 0.9 * samples:
        raise BadInput(
            "more than a tenth of the samples cannot be computed: the stack works too far outside "
            "the model for a band"
        )
    p05, p50, p95 = np.percentile(kept, [5.0, 50.0, 95.0], axis=0)
    return Bands(nominal.velocity_m_s, p05, p50, p95, nominal.force_n, kept, seed)


def probability_within(bands: Bands, target: Target, percent: float) -> float:
    """Share of the samples, 0 to 1, whose weighted r.m.s. error to ``target`` is ``percent`` or
    less. The band must be at the target's velocities (ValueError)."""
    if not np.array_equal(bands.velocity_m_s, target.velocity_m_s):
        raise ValueError("the band is not at the target's velocities")
    relative = bands.samples_n / target.force_n - 1.0
    weight = target.weight / target.weight.sum()
    error = 100.0 * np.sqrt((relative**2 * weight).sum(axis=1))
    return float(np.mean(error <= percent))


def _forces(setup: Setup, nominal: Prediction, draws: Draws) -> Floats:
    """Force (s, n), N, of every draw by the quick model; the first is the nominal one."""
    valve, velocity = setup.valve, nominal.velocity_m_s
    spring = valve.back_spring
    numbers, bleeds = numbers_of(setup, draws)
    tables, bent = _quick_stack(setup, nominal.stack)
    top = REACH * max(float(nominal.shim_pressure_mpa.max()) * 1e6, 1e3)
    drops = np.empty((draws.count, velocity.size))
    sample_drops(
        tables,
        bent,
        draws.thickness_m,
        draws.height_m,
        Setting(
            setup.steel.youngs_mpa * 1e6,
            0.0,
            spring.rate_n_mm * 1e3 if spring else 0.0,
            spring.preload_n if spring else 0.0,
            SETTLED,
            True,
        ),
        pressure_grid(top, ENTRIES),
        numbers,
        bleeds,
        numbers[0, 6] * velocity,
        bench(bent.plate.size, tables.nodes.size),
        drops,
    )
    forces: Floats = numbers[0, 6] * drops + _others(setup, velocity, draws)
    return forces


def _others(setup: Setup, velocity: Floats, draws: Draws) -> Floats:
    """Force (s, n), N, of everything but the searched valve, at each draw's temperature."""
    low, high = float(draws.temp_c.min()), float(draws.temp_c.max())
    places = np.linspace(low, high, _TEMPERATURES) if high > low else np.array([low])
    tables = fixed_tables(setup, float(velocity.max()))
    quiet = setup.damper.model_copy(update={"friction_n": 0.0})
    rows = np.array(
        [
            fixed_force_n(quiet, setup.direction, oil_at(setup.oil, temp), velocity, tables)
            for temp in places
        ]
    )
    columns = [np.interp(draws.temp_c, places, rows[:, k]) for k in range(velocity.size)]
    return np.asarray(np.array(columns).T + draws.friction_n[:, None])


def _quick_stack(setup: Setup, stack: Stack) -> tuple[Tables, _Bent]:
    """Tables of the stack's plates, and its shims as rows."""
    valve = setup.valve
    if valve.ports is None or valve.seat is None:
        raise TypeError(f"valve '{valve.name}' has no shims")
    outer = np.array([0.5e-3 * shim.outer_mm for shim in stack.bending])
    hole = np.array([0.5e-3 * (shim.inner_mm or 0.0) for shim in stack.bending])
    thickness = np.array([1e-3 * shim.thickness_mm for shim in stack.bending])
    groups, _ = group_shims(outer, thickness, hole)
    clamp = 0.5e-3 * stack.clamp_mm
    plain = (groups[:, 4] == 0.0) & (groups[:, 0] > clamp * (1.0 + 1e-9))
    rings = groups[groups[:, 4] > 0.0]
    tables = tables_for(
        np.unique(np.round(groups[plain, 0], 9)),
        np.concatenate([rings[:, 4], rings[:, 0]]),
        clamp,
        (0.5e-3 * valve.ports.inner_mm, 0.5e-3 * valve.ports.outer_mm),
        0.5e-3 * valve.seat.seat_mm,
        0.5e-3 * valve.back_spring.ring_mm if valve.back_spring else 0.0,
        setup.steel.poisson,
    )
    layers = layers_of(tables, groups)
    return tables, _Bent(outer, hole, layers.plate, layers.hole, layers.rim)


@kernel
def sample_drops(
    tables: Tables,
    bent: _Bent,
    thickness: Floats,
    height: Floats,
    setting: Setting,
    pressures: Floats,
    numbers: Floats,
    bleeds: Floats,
    flows: Floats,
    b: Bench,
    drops: Floats,
) -> None:
    """Pressure drop ``drops`` (s, n), Pa, of every sample at ``flows`` (n,), m3/s.

    ``thickness`` (s, shims) m, ``height`` (s,) of the seat m, ``pressures`` (k,) in the ports, Pa,
    ``numbers`` (s, 8) fields of ValveNumbers, ``bleeds`` (s, 2). NaN where the shims did not
    settle.
    """
    entries = pressures.size
    edge, lift, stress = np.zeros(entries), np.zeros(entries), np.zeros(entries)
    force, table = np.zeros(entries), np.zeros(entries)
    across, lifted = np.zeros(flows.size), np.zeros(flows.size)
    for s in range(thickness.shape[0]):
        groups, _ = group_shims(bent.outer, thickness[s], bent.hole)
        ring = groups[:, 4] > 0.0
        thick = np.where(ring, groups[:, 5], groups[:, 1])
        layers = Layers(
            bent.plate,
            bent.hole_node,
            bent.rim_node,
            thick,
            groups[:, 2].copy(),
            groups[:, 3].copy(),
        )
        raised = Setting(
            setting.youngs, height[s], setting.spring_rate, setting.spring_preload,
            setting.tolerance, setting.seated,
        )  # fmt: skip
        n = numbers[s]
        valve = ValveNumbers(n[0], n[1], n[2], n[3], n[4], n[5], n[6], n[7])
        loaded = pressures * valve.loaded_fraction
        if follow(tables, layers, raised, loaded, b, edge, lift, stress, force) < 0:
            drops[s] = np.nan
            continue
        table[:] = pressures
        _mark_opening(table, lift, force)
        drops_at(
            valve, bleeds[s, 0], bleeds[s, 1], table, lift, flows, drops[s], across, lifted
        )  # fmt: skip


@kernel
def _mark_opening(pressures: Floats, lift: Floats, force: Floats) -> None:
    """Make the last closed entry of a lift table the pressure that opens the stack.

    ``force`` (k,) on the seat, N, falls almost in a straight line until then.
    """
    last = -1
    for k in range(lift.size):
        if lift[k] <= 0.0 or force[k] > 0.0:
            lift[k] = 0.0
            last = k
    for k in range(1, lift.size):
        lift[k] = max(lift[k], lift[k - 1])
    if 1 <= last < lift.size - 1 and force[last - 1] > force[last]:
        step = (pressures[last] - pressures[last - 1]) / (force[last - 1] - force[last])
        opens = pressures[last] + force[last] * step
        room = pressures[last + 1] - pressures[last]
        pressures[last] = min(opens, pressures[last] + 0.98 * room)
