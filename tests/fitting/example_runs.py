"""How the example runs in ``targets/dyno/`` were made: model, noise and bias, nothing measured.

The damper on the invented dyno is the bundled ``rear-monotube`` with other losses, bleed and
friction (TRUTH). Its shims are a little thicker or thinner than written, the oil is 2 C warmer than
noted, the load cell reads 0.8 % too much and shows the gas force. Run this file to write the
examples again: ``python -m tests.fitting.example_runs``.
"""

from dataclasses import replace
from pathlib import Path

import numpy as np

from optimiser.damper import Damper, Direction
from optimiser.files import read_damper, read_oil, read_stack, read_steel
from optimiser.fitting.parameters import with_values
from optimiser.hydraulics.lift import Floats
from optimiser.prediction import Setup, predict
from optimiser.stack import Group, Stack

FOLDER = Path(__file__).resolve().parents[2] / "targets" / "dyno"
SEED = 20240611
TRUTH: dict[tuple[str, Direction | None], float] = {
    ("seat.discharge", "compression"): 0.68,
    ("seat.discharge", "rebound"): 0.66,
    ("ports.discharge", "compression"): 0.65,
    ("ports.discharge", "rebound"): 0.68,
    ("bleed.area_mm2", "compression"): 1.1,
    ("bleed.area_mm2", "rebound"): 1.1,
    ("friction_n", None): 31.0,
}
GAS_N = 296.0
GAIN = 1.008
NOISE, NOISE_N = 0.012, 1.5
WARMER_C = 2.0
#: Real thickness over nominal, by nominal thickness.
STRIPS = {0.10: 1.01, 0.15: 0.99, 0.20: 1.008, 0.25: 0.994, 0.30: 1.0}
N_PER_LBF, M_PER_IN = 4.4482216152605, 0.0254


def true_damper() -> Damper:
    """The damper that stands on the invented dyno."""
    return with_values(read_damper("rear-monotube"), TRUTH)


def as_cut(stack: Stack) -> Stack:
    """The stack with its shims' real thicknesses."""
    return Stack(
        tuple(
            Group(
                g.quantity,
                replace(g.shim, thickness_mm=g.shim.thickness_mm * STRIPS[g.shim.thickness_mm]),
            )
            for g in stack.groups
        )
    )


def damping_n(
    direction: Direction, stack: Stack, clicks: int, temp_c: float, velocity: Floats
) -> Floats:
    """Force (n,), N, that resists the motion, without gas."""
    damper = true_damper()
    setup = Setup(
        damper, direction, read_steel(damper.steel), read_oil(damper.oil), temp_c + WARMER_C
    )
    return predict(setup, as_cut(stack), velocity, clicks).force_n


def _noisy(random: np.random.Generator, force: Floats) -> Floats:
    return GAIN * force * (1.0 + NOISE * random.standard_normal(force.size)) + (
        NOISE_N * random.standard_normal(force.size)
    )


def _peaks(
    random: np.random.Generator,
    direction: Direction,
    stack: Stack,
    clicks: int,
    temp_c: float,
    velocity: Floats,
) -> Floats:
    steady = GAS_N if direction == "compression" else -GAS_N
    return _noisy(random, damping_n(direction, stack, clicks, temp_c, velocity) + steady)


def _sine(random: np.random.Generator) -> tuple[Floats, Floats, Floats]:
    """Time s, displacement mm (compression counts negative) and force N (also), both strokes."""
    rate, frequency, reach, lag = 250.0, 1.9, 22.0, 0.0015
    time = np.arange(0.0, 2.0, 1.0 / rate)
    phase = 2.0 * np.pi * frequency * time
    travel = reach * np.cos(phase)  # mm into the damper
    turned = 2.0 * np.pi * frequency * (time - lag)
    speed = -1e-3 * reach * 2.0 * np.pi * frequency * np.sin(turned)  # m/s into the damper
    force = np.zeros(time.size)
    for direction, moving in (("compression", speed > 1e-4), ("rebound", speed < -1e-4)):
        damper = true_damper().circuit(direction).searched
        assert damper.fitted is not None
        order = np.linspace(1e-3, np.abs(speed).max() * 1.001, 60)
        curve = damping_n(direction, damper.fitted, 10, 38.0, order)
        sign = 1.0 if direction == "compression" else -1.0
        force[moving] = sign * np.interp(np.abs(speed[moving]), order, curve)
    shown = _noisy(random, force + GAS_N)
    return time, -travel + 0.01 * random.standard_normal(time.size), -shown


_HEAD = [
    "# Invented: computed from a model of rear-monotube with other losses, thicknesses and",
    "# temperature, a load cell that reads 0.8 % too much, and noise of 1.2 % + 1.5 N.",
    "# Made by tests/fitting/example_runs.py; nothing here was measured.",
]


def example_texts() -> dict[str, str]:
    """Name and text of every example run."""
    random = np.random.default_rng(SEED)
    damper = true_damper()
    ahead, back = (damper.circuit(d).searched.fitted for d in ("compression", "rebound"))
    assert ahead is not None
    assert back is not None
    fast = np.array([0.02, 0.035, 0.06, 0.1, 0.15, 0.22, 0.32, 0.45, 0.6, 0.8, 1.05, 1.35])
    slow = fast * 0.6
    two = read_stack("rear-two-stage")
    texts = {}
    for name, stack, clicks, temp in (
        ("compression-fitted", ahead, 10, 36.0),
        ("compression-closed", ahead, 0, 41.0),
        ("compression-two-stage", two, 10, 39.0),
    ):
        force = _peaks(random, "compression", stack, clicks, temp, fast)
        rows = [f"{v:g},{f:.0f}" for v, f in zip(fast, force, strict=True)]
        about = f"# compression, {clicks} clicks, oil {temp:g} C, peak force at each speed"
        texts[name] = "\n".join([*_HEAD, about, "velocity_m_s,force_n", *rows]) + "\n"
    force = _peaks(random, "rebound", back, 4, 40.0, slow)
    rows = [f"{v / M_PER_IN:.2f},{f / N_PER_LBF:.1f}" for v, f in zip(slow, force, strict=True)]
    about = "# rebound, 4 clicks, oil 40 C, peak force at each speed, inches and pounds-force"
    texts["rebound-fitted"] = "\n".join([*_HEAD, about, "velocity_in_s,force_lbf", *rows]) + "\n"
    rows = [f"{t:.3f},{x:.2f},{f:.1f}" for t, x, f in zip(*_sine(random), strict=True)]
    about = "# both strokes as fitted, 10 clicks, oil 38 C, sine of 22 mm at 1.9 Hz, 250 samples/s"
    texts["sine-both"] = "\n".join([*_HEAD, about, "time_s,displacement_mm,force_n", *rows]) + "\n"
    return texts


if __name__ == "__main__":
    for name, text in example_texts().items():
        (FOLDER / f"{name}.csv").write_text(text, encoding="utf-8")
