"""Scores of plans by the quick model: many stacks in one damper against one wanted curve."""

from copy import copy
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from optimiser.compiled import kernel, step
from optimiser.hydraulics.circuit import fixed_force_n
from optimiser.hydraulics.lift import pressure_grid
from optimiser.hydraulics.valve import ValveNumbers, bleed_settings, drops_at, valve_numbers
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.quick import Bench, Layers, Setting, bench, follow
from optimiser.mechanics.stress import fatigue_utilisation
from optimiser.mechanics.tables import Tables, tables_for
from optimiser.prediction import Setup, fixed_tables
from optimiser.search.counts import Plans
from optimiser.search.evaluator import Scores
from optimiser.search.space import Space
from optimiser.wanted.target import Target

#: Entries of a stack's lift table.
ENTRIES = 12
#: The table reaches this many times the greatest wanted pressure.
REACH = 1.6
#: Relative change at which a pressure is settled.
SETTLED = 2e-3
#: Scores of a stack the model cannot follow: out of every comparison.
HOPELESS = 10.0


class Job(NamedTuple):
    """One damper, one target: what every plan is scored against. SI units."""

    pressures: Floats  # (k,) in the ports
    numbers: ValveNumbers
    bleed_a: Floats  # (c,) one entry a click setting
    bleed_b: Floats  # (c,)
    first_click: int
    flows: Floats  # (n,) rising
    fixed: Floats  # (n,) N, of everything but the searched valve
    wanted: Floats  # (n,) N
    weight: Floats  # (n,) root of each point's share of the weight


class Shelf(NamedTuple):
    """The sizes as rows of one clamp's tables."""

    plate: Ints  # (sizes,)
    thickness: Floats  # (sizes,) m


class Desk(NamedTuple):
    """Scratch arrays of one thread."""

    layers: Layers
    edge: Floats
    lift: Floats
    stress: Floats
    pressures: Floats
    drop: Floats
    shim_pressure: Floats
    lift_at: Floats
    trial: Floats  # (n,) force over wanted force less 1 at the click being tried


@step
def _stack_up(plan: Plans, shelf: Shelf, layers: Layers) -> int:
    """Write a plan's groups, face first; their number."""
    count = 0
    for k in range(plan.size - 1):
        if plan[k] == 0:
            continue
        plate = shelf.plate[plan[k] - 1]
        t = shelf.thickness[plan[k] - 1]
        if count == 0 or layers.plate[count - 1] != plate:
            layers.plate[count] = plate
            layers.thick[count] = 0.0
            layers.cubed[count] = 0.0
            layers.thickest[count] = 0.0
            count += 1
        layers.thick[count - 1] += t
        layers.cubed[count - 1] += t * t * t
        layers.thickest[count - 1] = max(layers.thickest[count - 1], t)
    return count


@step
def _copy(source: Floats, target: Floats) -> None:
    for n in range(source.size):
        target[n] = source[n]


@step
def _misfit(job: Job, desk: Desk, click: int) -> float:
    """Weighted r.m.s. of force over wanted force less 1 at a click; leaves the points in the
    desk."""
    drops_at(
        job.numbers, job.bleed_a[click], job.bleed_b[click], desk.pressures, desk.lift, job.flows,
        desk.drop, desk.shim_pressure, desk.lift_at,
    )  # fmt: skip
    total = 0.0
    for n in range(job.flows.size):
        force = job.fixed[n] + job.numbers.area_m2 * desk.drop[n]
        value = min(force / job.wanted[n] - 1.0, HOPELESS)
        desk.trial[n] = value
        total += (value * job.weight[n]) ** 2
    return float(np.sqrt(total))


@step
def _best_click(job: Job, desk: Desk, relative: Floats) -> tuple[int, float]:
    """Click with the least error, by steps that halve from the middle of the range."""
    count = job.bleed_a.size
    best = count // 2
    error = _misfit(job, desk, best)
    _copy(desk.trial, relative)
    stride = max(1, (count + 1) // 4)
    while count > 1:
        moved = False
        for trial in (best - stride, best + stride):
            if 0 <= trial < count:
                value = _misfit(job, desk, trial)
                if value < error:
                    best, error, moved = trial, value, True
                    _copy(desk.trial, relative)
                    break
        if not moved:
            if stride == 1:
                break
            stride = (stride + 1) // 2 if stride > 2 else 1
    return best, error


@step
def _at(table: Floats, pressures: Floats, pressure: float) -> float:
    """Linear interpolation, carried on past the last entry; through 0 before the first."""
    k = 0
    while k < pressures.size - 2 and pressures[k + 1] < pressure:
        k += 1
    if pressure < pressures[0]:
        return float(table[0]) * pressure / float(pressures[0])
    low, high = float(table[k]), float(table[k + 1])
    share = (pressure - float(pressures[k])) / float(pressures[k + 1] - pressures[k])
    return low + share * (high - low)


@step
def _with_opening(job: Job, force: Floats, desk: Desk) -> None:
    """Lift table of the desk, with the opening pressure in place of the last closed entry.

    ``force`` (k,) on the seat: it falls almost in a straight line until the stack opens.
    """
    _copy(job.pressures, desk.pressures)
    last = -1
    for k in range(desk.lift.size):
        if desk.lift[k] <= 0.0 or force[k] > 0.0:
            desk.lift[k] = 0.0
            last = k
    for k in range(1, desk.lift.size):
        desk.lift[k] = max(desk.lift[k], desk.lift[k - 1])
    if 1 <= last < desk.lift.size - 1:
        p, fall = job.pressures, force[last - 1] - force[last]
        if fall > 0.0:
            opens = p[last] + force[last] * (p[last] - p[last - 1]) / fall
            desk.pressures[last] = min(opens, p[last] + 0.98 * (p[last + 1] - p[last]))


@kernel
def score(
    plans: Plans, shelf: Shelf, tables: Tables, setting: Setting, job: Job,
    b: Bench, desk: Desk, force: Floats, results: Floats, relative: Floats,
) -> None:  # fmt: skip
    """Score (plans, width) rows that share one clamp diameter.

    Writes ``results`` (plans, 4): error, largest stress Pa, click, edge rise over the face shim's
    thickness; and ``relative`` (plans, n): force over wanted force less 1.
    """
    loaded = job.pressures * job.numbers.loaded_fraction
    for row in range(plans.shape[0]):
        plan = plans[row]
        count = _stack_up(plan, shelf, desk.layers)
        layers = Layers(
            desk.layers.plate[:count], desk.layers.hole[:count], desk.layers.rim[:count],
            desk.layers.thick[:count], desk.layers.cubed[:count], desk.layers.thickest[:count],
        )  # fmt: skip
        rounds = follow(
            tables, layers, setting, loaded, b, desk.edge, desk.lift, desk.stress, force
        )
        if rounds < 0:
            for k in range(4):
                results[row, k] = HOPELESS
            for n in range(job.flows.size):
                relative[row, n] = HOPELESS
            continue
        _with_opening(job, force, desk)
        click, error = _best_click(job, desk, relative[row])
        _misfit(job, desk, click)
        top = 0.0
        for n in range(job.flows.size):
            top = max(top, desk.shim_pressure[n])
        results[row, 0] = error
        results[row, 1] = _at(desk.stress, job.pressures, top)
        results[row, 2] = job.first_click + click
        edge = _at(desk.edge, job.pressures, top)
        results[row, 3] = edge / shelf.thickness[plan[0] - 1]


@dataclass(frozen=True)
class _Clamped:
    """Tables of one clamp diameter."""

    tables: Tables
    shelf: Shelf


class ModelEvaluator:
    """The search's evaluator: plans of a space against a target in a damper (quick model).

    ``click_range`` (first, last) clicks tried; by default the middle half of the adjuster's range,
    so that the rider keeps room both ways. Raises BadInput as the damper's rooms do.
    """

    def __init__(
        self, setup: Setup, space: Space, target: Target, click_range: tuple[int, int] | None = None
    ) -> None:
        self.setup = setup
        self.space = space
        self.click_range = click_range or middle_clicks(setup)
        self._job = make_job(setup, target, self.click_range)
        self._clamped = {
            int(number): self._tables_of(int(number)) for number in np.flatnonzero(space.may_clamp)
        }

    def with_target(
        self, target: Target, click_range: tuple[int, int] | None = None
    ) -> "ModelEvaluator":
        """The same evaluator, with its tables, for another target and, on request, other clicks."""
        other = copy(self)
        other.click_range = click_range or self.click_range
        other._job = make_job(self.setup, target, other.click_range)
        return other

    def evaluate(self, plans: Plans) -> Scores:
        """Scores of (plans, width) rows; independent of each other and of their order."""
        results, relative = self._judge(plans)
        steel = self.setup.steel
        used = fatigue_utilisation(1e-6 * results[:, 1], steel.endurance_mpa, steel.tensile_mpa)
        misfit = relative * self._job.weight
        return Scores(results[:, 0], used, results[:, 2], results[:, 3], misfit)

    def forces(self, plans: Plans) -> Floats:
        """Force, N, (plans, points) of each plan at its best click."""
        return np.asarray(self._job.wanted * (1.0 + self._judge(plans)[1]))

    def _judge(self, plans: Plans) -> tuple[Floats, Floats]:
        """``results`` and ``relative`` of :func:`score`, in the order of the plans."""
        count, points = len(plans), self._job.flows.size
        results, relative = np.zeros((count, 4)), np.zeros((count, points))
        clamp = self.space.diameter[plans[:, -1].astype(np.int64) - 1]
        for number in np.unique(clamp):
            rows = np.flatnonzero(clamp == number)
            part, part_relative = np.zeros((rows.size, 4)), np.zeros((rows.size, points))
            self._score(self._clamped[int(number)], plans[rows], part, part_relative)
            results[rows], relative[rows] = part, part_relative
        return results, relative

    def _score(self, at: _Clamped, plans: Plans, results: Floats, relative: Floats) -> None:
        entries, points = self._job.pressures.size, self._job.flows.size
        groups = plans.shape[1]
        empty = [np.zeros(groups, np.int64) for _ in range(3)]
        sums = [np.zeros(groups) for _ in range(3)]
        desk = Desk(
            Layers(empty[0], empty[1], empty[2], sums[0], sums[1], sums[2]),
            *(np.zeros(entries) for _ in range(4)),
            *(np.zeros(points) for _ in range(4)),
        )
        score(
            np.ascontiguousarray(plans), at.shelf, at.tables, self._setting(), self._job,
            bench(groups, at.tables.nodes.size), desk, np.zeros(entries), results, relative,
        )  # fmt: skip

    def _setting(self) -> Setting:
        valve = self.setup.valve
        assert valve.seat is not None
        spring = valve.back_spring
        return Setting(
            self.setup.steel.youngs_mpa * 1e6,
            valve.seat.height_mm * 1e-3,
            spring.rate_n_mm * 1e3 if spring else 0.0,
            spring.preload_n if spring else 0.0,
            SETTLED,
            True,
        )

    def _tables_of(self, number: int) -> _Clamped:
        valve, sizes = self.setup.valve, self.space.sizes
        assert valve.ports is not None and valve.seat is not None
        clamp = 0.5e-3 * self.space.outer_of[number]
        radii = 0.5e-3 * sizes.outer_mm
        edges = np.unique(radii[radii > clamp * (1.0 + 1e-9)])
        spring = valve.back_spring
        tables = tables_for(
            edges,
            np.zeros(0),
            float(clamp),
            (0.5e-3 * valve.ports.inner_mm, 0.5e-3 * valve.ports.outer_mm),
            0.5e-3 * valve.seat.seat_mm,
            0.5e-3 * spring.ring_mm if spring else 0.0,
            self.setup.steel.poisson,
        )
        plate = np.searchsorted(edges, radii - 1e-12).astype(np.int64)
        return _Clamped(tables, Shelf(plate, 1e-3 * sizes.thickness_mm))


def middle_clicks(setup: Setup) -> tuple[int, int]:
    """The middle half of the adjuster's range."""
    count = setup.clicks_range
    return (count + 3) // 4, max((count + 3) // 4, (3 * count) // 4)


def make_job(setup: Setup, target: Target, click_range: tuple[int, int]) -> Job:
    """Everything a plan is scored against. Raises BadInput."""
    valve, oil = setup.valve, setup.oil_state
    numbers = valve_numbers(valve, setup.damper.body, oil)
    fixed = fixed_force_n(
        setup.damper,
        setup.direction,
        oil,
        target.velocity_m_s,
        fixed_tables(setup, float(target.velocity_m_s[-1])),
    )
    top = float(np.max(target.force_n - fixed, initial=10.0)) / numbers.area_m2
    bleed_a, bleed_b = bleed_settings(valve, oil)
    first, last = click_range
    share = target.weight / target.weight.sum()
    return Job(
        pressure_grid(REACH * top, ENTRIES),
        numbers,
        bleed_a[first : last + 1].copy(),
        bleed_b[first : last + 1].copy(),
        first,
        numbers.area_m2 * target.velocity_m_s,
        fixed,
        target.force_n.copy(),
        np.sqrt(share),
    )
