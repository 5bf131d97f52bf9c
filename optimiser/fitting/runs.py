"""One dyno run as the model sees it: a stack at a click setting, and the points measured."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from optimiser.checking import validate
from optimiser.damper import Damper, Direction, Valve
from optimiser.faults import BadInput
from optimiser.fitting.strokes import LEAST_POINTS
from optimiser.hydraulics.lift import Floats
from optimiser.stack import Stack


@dataclass(frozen=True, eq=False)
class Run:
    """Measured points of one stroke: ``velocity_m_s`` (n,) 0 or more, ``force_n`` (n,) positive
    where it resists; gas and friction are still in it.

    ``clicks`` out from closed (0 without an adjuster); ``hysteresis_n`` (n,) width of the loop the
    points are the middle of (NaN or None: not known); ``friction_n`` and ``gas_n`` as both strokes
    of the file show them at rest (None: one stroke only); ``trusted``: its units are not to be
    questioned.
    """

    label: str
    direction: Direction
    stack: Stack
    clicks: int
    oil_temp_c: float
    velocity_m_s: Floats
    force_n: Floats
    hysteresis_n: Floats | None = None
    friction_n: float | None = None
    gas_n: float | None = None
    trusted: bool = False

    @property
    def largest_n(self) -> float:
        """Largest force, N."""
        return float(np.abs(self.force_n).max())


def run_faults(damper: Damper, run: Run) -> list[str]:
    """Why a run cannot be one of this damper, one sentence each (without the run's name)."""
    if getattr(damper, run.direction) is None:
        return [f"damper {damper.name} has no {run.direction} circuit"]
    valve = damper.circuit(run.direction).searched
    needle = valve.bleed.needle
    most = needle.clicks if needle else 0
    faults = stack_faults(valve, run.stack)
    if not 0 <= run.clicks <= most:
        allowed = f"0 (closed) to {most} (open)" if most else "leave it out, there is no adjuster"
        faults.append(f"clicks {run.clicks}; allowed: {allowed}")
    if run.velocity_m_s.size < LEAST_POINTS:
        faults.append(f"holds {run.velocity_m_s.size} points; allowed: {LEAST_POINTS} or more")
    elif np.ptp(run.force_n) == 0.0:
        faults.append("force is the same in every point; allowed: a force that varies")
    elif np.ptp(run.velocity_m_s) == 0.0:
        faults.append("velocity is the same in every point; allowed: different velocities")
    elif run.force_n[np.argmax(run.velocity_m_s)] <= 0.0:
        faults.append(
            f"the force at the highest {run.direction} velocity is "
            f"{run.force_n[np.argmax(run.velocity_m_s)]:.0f} N; allowed: a force that resists the "
            "motion (are the strokes mixed up?)"
        )
    return faults


def stack_faults(valve: Valve, stack: Stack) -> list[str]:
    """Why a stack does not fit the valve, one sentence each."""
    data = valve.model_dump(exclude_none=True) | {"fitted": stack.lines()}
    try:
        validate(Valve, data, "stack")
    except BadInput as error:
        return [fault.removeprefix("stack: key fitted: ") for fault in error.faults]
    return []


def check_runs(damper: Damper, runs: Sequence[Run]) -> None:
    """Raise BadInput with every fault of every run."""
    faults = [f"{run.label}: {fault}" for run in runs for fault in run_faults(damper, run)]
    if faults:
        raise BadInput(faults)
