"""The last word on the best plans: an evaluator of the `reported` fidelity."""

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from optimiser.hydraulics.valve import bleed_settings, drops_at
from optimiser.mechanics.stress import fatigue_utilisation
from optimiser.prediction import Setup, bend_table
from optimiser.search.counts import Plans
from optimiser.search.evaluate import make_job
from optimiser.search.evaluator import Scores
from optimiser.search.sizes import Floats
from optimiser.search.space import Space
from optimiser.stack import Stack
from optimiser.wanted.target import Target


@dataclass(frozen=True, eq=False)
class Final:
    """A stack at the `reported` fidelity, at the target's velocities and its best click."""

    clicks: int
    force_n: Floats
    utilisation: float
    rise: float


class ReportedEvaluator:
    """Scores plans of a space against a target at the `reported` fidelity (milliseconds each).

    ``click_range`` (first, last) clicks tried; ``workers`` threads. What it finds is kept:
    :meth:`final` gives the forces of a plan scored before.
    """

    def __init__(
        self,
        setup: Setup,
        space: Space,
        target: Target,
        click_range: tuple[int, int],
        workers: int = 1,
    ) -> None:
        self.setup = setup
        self.space = space
        self.target = target
        self.click_range = click_range
        self._workers = workers
        self._job = make_job(setup, target, (0, setup.clicks_range))
        self._bleed = bleed_settings(setup.valve, setup.oil_state)
        self._finals: dict[bytes, Final] = {}

    def final(self, plan: Plans) -> Final:
        """What was found for a plan. Raises KeyError for one not scored."""
        return self._finals[plan.tobytes()]

    def evaluate(self, plans: Plans) -> Scores:
        """Scores of (plans, width) rows."""
        stacks = [self.space.to_stack(plan, real=True) for plan in plans]
        with ThreadPoolExecutor(self._workers) as pool:
            finals = list(pool.map(self.judge, stacks))
        self._finals.update((p.tobytes(), f) for p, f in zip(plans, finals, strict=True))
        relative = np.array([self.target.relative(f.force_n) for f in finals])
        misfit = relative.reshape(len(finals), -1) * self._job.weight
        return Scores(
            np.sqrt((misfit**2).sum(axis=1)),
            np.array([f.utilisation for f in finals]),
            np.array([float(f.clicks) for f in finals]),
            np.array([f.rise for f in finals]),
            misfit,
        )

    def judge(self, stack: Stack) -> Final:
        """One stack (real thicknesses) at its best click."""
        job, setup = self._job, self.setup
        top = float(job.pressures[-1])
        table, bent = bend_table(setup, setup.valve, stack, top)

        def at(click: int) -> tuple[Floats, float]:
            drop, pressure, lift = np.zeros((3, job.flows.size))
            drops_at(
                job.numbers, float(self._bleed[0][click]), float(self._bleed[1][click]),
                table.pressure_pa, table.lift_m, job.flows, drop, pressure, lift,
            )  # fmt: skip
            return job.fixed + job.numbers.area_m2 * drop, float(pressure.max())

        click = _downhill(lambda c: self.target.error_percent(at(c)[0]), *self.click_range)
        force, reached = at(click)
        beyond = max(1.0, reached / top)
        stress = np.interp(reached, table.pressure_pa, bent.peak_stress_mpa.max(axis=1))
        rise = np.interp(reached, table.pressure_pa, bent.rise_thicknesses)
        steel = setup.steel
        used = fatigue_utilisation(stress * beyond, steel.endurance_mpa, steel.tensile_mpa)
        return Final(click, force, float(used), float(rise * beyond))


def _downhill(error: Callable[[int], float], first: int, last: int) -> int:
    """Whole number with the least error, going downhill from the middle of the range."""
    best = (first + last + 1) // 2
    value = error(best)
    for stride in (1, -1):
        while first <= best + stride <= last:
            trial = error(best + stride)
            if trial >= value:
                break
            best, value = best + stride, trial
    return best


def corrected(target: Target, quick_n: Floats, reported_n: Floats) -> Target:
    """The target whose quick prediction is reached when the reported one reaches ``target``.

    The two fidelities differ by a few parts in a thousand, alike for similar stacks: the ratio at
    one good stack, put on the target, lets the quick model find what the fine one wants.
    """
    return Target.of(
        target.velocity_m_s,
        target.force_n * quick_n / reported_n,
        target.weight,
        direction=target.direction,
        origin=target.origin,
    )
