"""Invented dampers and runs with known numbers, for the tests of the fit."""

from dataclasses import replace

import numpy as np

from optimiser.damper import Damper, Direction
from optimiser.files import read_damper, read_oil, read_steel
from optimiser.fitting.model import Model, Seen
from optimiser.fitting.parameters import Parameter, parameter, with_values
from optimiser.fitting.runs import Run
from optimiser.hydraulics.lift import Floats
from optimiser.materials import Oil, Steel
from optimiser.mechanics.deflect import Fidelity
from optimiser.prediction import Setup, predict
from optimiser.stack import Stack

#: A softer stack than the fitted one of rear-monotube, compression.
SOFT = Stack.parse(["1 x 40 x 0.25", "1 x 34 x 0.20", "1 x 26 x 0.20", "4 x 20 x 0.30"])
FAST = np.geomspace(0.02, 1.5, 18)

Values = dict[tuple[str, Direction | None], float]
TRUTH: Values = {
    ("seat.discharge", "compression"): 0.68,
    ("ports.discharge", "compression"): 0.62,
    ("bleed.area_mm2", "compression"): 1.2,
    ("friction_n", None): 30.0,
}


def parts(name: str = "rear-monotube") -> tuple[Damper, Steel, Oil]:
    """A bundled damper with its steel and oil."""
    damper = read_damper(name)
    return damper, read_steel(damper.steel), read_oil(damper.oil)


def run_of(
    truth: Damper,
    stack: Stack | None = None,
    clicks: int = 10,
    direction: Direction = "compression",
    gas_n: float = 0.0,
    velocity: Floats = FAST,
    temp_c: float = 40.0,
    label: str = "",
) -> Run:
    """A run of ``truth`` without noise."""
    setup = Setup(truth, direction, read_steel(truth.steel), read_oil(truth.oil), temp_c)
    fitted = setup.valve.fitted if stack is None else stack
    assert fitted is not None
    force = predict(setup, fitted, velocity, clicks).force_n
    steady = gas_n if direction == "compression" else -gas_n
    name = label or f"{direction} {clicks}"
    return Run(name, direction, fitted, clicks, temp_c, velocity, force + steady)


def noisy(run: Run, random: np.random.Generator, share: float = 0.02, floor: float = 2.0) -> Run:
    """The run with noise of ``share`` of the force and ``floor`` N."""
    unit = random.standard_normal((2, run.force_n.size))
    return replace(run, force_n=run.force_n * (1.0 + share * unit[0]) + floor * unit[1])


def four_free(damper: Damper) -> list[Parameter]:
    """Gap, ports and bleed in compression, and friction."""
    keys = ("seat.discharge", "bleed.area_mm2", "friction_n", "ports.discharge")
    return [parameter(damper, key, "compression") for key in keys]


def three_runs(truth: Damper) -> list[Run]:
    """Compression: fitted at 10 clicks, fitted closed, and a softer stack."""
    return [run_of(truth), run_of(truth, clicks=0), run_of(truth, SOFT, label="soft")]


def prepared(fidelity: Fidelity = "reported") -> tuple[Model, list[Seen], Floats]:
    """A model of four free numbers, three noise-free runs of its own force, and the truth (p,)."""
    damper, steel, oil = parts()
    truth = with_values(damper, TRUTH)
    items = four_free(damper)
    model = Model(damper, steel, oil, tuple(items), fidelity)
    values = np.array([TRUTH[item.key, item.direction] for item in items])
    seen = []
    for run in three_runs(truth):
        one = model.prepare(run)
        seen.append(replace(one, run=replace(run, force_n=model.force_n(one, values))))
    return model, seen, values


def repeated(seen: list[Seen], random: np.random.Generator) -> list[Seen]:
    """The same runs with fresh noise."""
    return [replace(item, run=noisy(item.run, random)) for item in seen]
