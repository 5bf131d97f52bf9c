"""The last word on the best plans: re-evaluated at the `reported` fidelity."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from optimiser.hydraulics.valve import bleed_settings, drops_at
from optimiser.mechanics.stress import fatigue_utilisation
from optimiser.prediction import Setup, bend_table
from optimiser.search.evaluate import Job, make_job
from optimiser.search.sizes import Floats
from optimiser.stack import Stack
from optimiser.wanted.target import Target


@dataclass(frozen=True, eq=False)
class Final:
    """A stack at the `reported` fidelity at the target's velocities."""

    clicks: int
    force_n: Floats
    error: float
    utilisation: float
    rise: float


class FinalJudge:
    """Judges single stacks against a target at the `reported` fidelity, over a range of clicks."""

    def __init__(self, setup: Setup, target: Target, click_range: tuple[int, int]) -> None:
        self.setup = setup
        self.target = target
        self.click_range = click_range
        self._job: Job = make_job(setup, target, (0, setup.clicks_range))
        self._bleed = bleed_settings(setup.valve, setup.oil_state)

    def judge(self, stack: Stack, near: int) -> Final:
        """The stack at its best click around ``near`` (real thicknesses in ``stack``)."""
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

        first, last = self.click_range
        click = _walk(lambda c: self.target.error_percent(at(c)[0]), near, first, last)
        force, reached = at(click)
        stress = np.interp(reached, table.pressure_pa, bent.peak_stress_mpa.max(axis=1))
        stress *= max(1.0, reached / top)
        rise = np.interp(reached, table.pressure_pa, bent.rise_thicknesses)
        used = fatigue_utilisation(
            np.asarray(stress), setup.steel.endurance_mpa, setup.steel.tensile_mpa
        )
        return Final(
            click,
            force,
            self.target.error_percent(force) / 100.0,
            float(used),
            float(rise * max(1.0, reached / top)),
        )


def _walk(error: Callable[[int], float], near: int, first: int, last: int) -> int:
    """Whole number with the least error, going downhill from ``near``."""
    best = min(max(near, first), last)
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


