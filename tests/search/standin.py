"""A quick analytic stand-in for the damper model: the right flavour, none of the accuracy.

Stiffness sums t^3 with a lever arm that depends on the diameters, stretching sums t, a second
stage takes part once the gap under it has closed, and the curve follows from lift and bleed.
Lengths mm, pressures MPa, forces N, velocities m/s.
"""

from types import SimpleNamespace

import numpy as np

from optimiser.compiled import kernel
from optimiser.search.counts import slots
from optimiser.search.evaluator import Scores
from optimiser.search.rules import Rules
from optimiser.search.sizes import Sizes
from optimiser.search.space import Space

VELOCITY_M_S = np.array([0.04, 0.08, 0.15, 0.3, 0.5, 0.75, 1.0, 1.3])
YOUNGS_MPA, AREA_MM2, PISTON_MM2 = 206000.0, 500.0, 800.0
STRENGTH_MPA = 900.0
CLICKS = np.arange(0, 21, 2)
PRESSURE_MPA = np.geomspace(0.003, 12.0, 26)


@kernel
def _lift(pressure, soft, hard, soft2, hard2, gap, preload):  # type: ignore[no-untyped-def]
    load = max(pressure - preload, 0.0) * 500.0
    low, high = 0.0, 5.0
    for _ in range(34):
        y = 0.5 * (low + high)
        z = max(y - gap, 0.0)
        if soft * y + hard * y**3 + soft2 * z + hard2 * z**3 > load:
            high = y
        else:
            low = y
    return 0.5 * (low + high)


@kernel
def _curves(plans, first, outer, thick, pressure, clicks, wanted_flow, preload, out, rise, stress):  # type: ignore[no-untyped-def]
    """Fill pressures (plans, clicks, flows), rise and stress (plans,) for each plan."""
    flow = np.zeros(len(pressure))
    lifts = np.zeros(len(pressure))
    for n in range(len(plans)):
        plan = plans[n]
        a = outer[plan[-1] - 1] / 2
        big = outer[plan[0] - 1] / 2
        k = np.zeros(2)
        c = np.zeros(2)
        for j in range(len(plan) - 1):
            if plan[j] == 0:
                continue
            size = plan[j] - 1
            r, t = outer[size] / 2, thick[size]
            stage = 1 if j > first else 0
            arm = (r - a) / (big - a)
            k[stage] += 206000.0 * t**3 / (0.15 * big**2) * arm**1.3
            c[stage] += 206000.0 * t / (0.6 * big**2) * arm**2.2
        gap = 0.0
        if plan[first] > 0:
            r, t = outer[plan[first] - 1] / 2, thick[plan[first] - 1]
            gap = t * (1 + 0.3 * (big - r) / (big - a))
        for g in range(len(pressure)):
            lifts[g] = _lift(pressure[g], k[0], c[0], k[1], c[1], gap, preload)
        rise[n] = lifts[-1] / thick[plan[0] - 1]
        for m in range(len(clicks)):
            for g in range(len(pressure)):
                hole = 0.8 * (6.2832 * big * lifts[g] + 0.12 * clicks[m] + 0.05)
                flow[g] = hole * np.sqrt(2e6 * pressure[g] / 850.0)
            g = 0
            for v in range(len(wanted_flow)):
                while g < len(pressure) - 2 and flow[g + 1] < wanted_flow[v]:
                    g += 1
                part = np.log(wanted_flow[v] / flow[g]) / np.log(flow[g + 1] / flow[g])
                out[n, m, v] = pressure[g] * (pressure[g + 1] / pressure[g]) ** part
        top = out[n, len(clicks) // 2, -1]
        y = _lift(min(top, 12.0), k[0], c[0], k[1], c[1], gap, preload)
        rise[n] = y / thick[plan[0] - 1]
        for j in range(len(plan) - 1):
            if plan[j] > 0:
                r, t = outer[plan[j] - 1] / 2, thick[plan[j] - 1]
                bend = y if j < first else max(y - gap, 0.0)
                stress[n] = max(stress[n], 206000.0 * t * bend / (0.55 * (r - a) * big))


class StandIn:
    """Evaluator against a wanted curve (velocities,), N; counts the plans it was asked for."""

    def __init__(self, space: Space, force_n: np.ndarray, preload_mpa: float = 0.0) -> None:
        self.space, self.force_n, self.preload = space, force_n, preload_mpa
        self.asked = 0
        self.seen: list[bytes] = []

    def forces(self, plans: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Forces (plans, clicks, velocities), N; rise and utilisation (plans,)."""
        return forces(self.space, plans, self.preload)

    def evaluate(self, plans: np.ndarray) -> Scores:
        """Scores of (plans, width) rows."""
        self.asked += len(plans)
        force, rise, utilisation = self.forces(plans)
        misfit = (force / self.force_n - 1) / np.sqrt(force.shape[2])
        off = np.sqrt((misfit**2).sum(axis=2))
        best = np.argmin(off, axis=1)
        row = np.arange(len(plans))
        clicks = CLICKS[best].astype(float)
        return Scores(off[row, best], utilisation, clicks, rise, misfit[row, best])


def forces(
    space: Space, plans: np.ndarray, preload: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Forces (plans, clicks, velocities), N; rise and utilisation (plans,)."""
    out = np.zeros((len(plans), len(CLICKS), len(VELOCITY_M_S)))
    rise, stress = np.zeros(len(plans)), np.zeros(len(plans))
    _curves(
        np.ascontiguousarray(plans),
        slots(space.rules.parts)[0],
        space.sizes.outer_mm,
        space.sizes.thickness_mm,
        PRESSURE_MPA,
        CLICKS.astype(float),
        VELOCITY_M_S * PISTON_MM2,
        preload,
        out,
        rise,
        stress,
    )
    return out * PISTON_MM2, rise, stress / STRENGTH_MPA


def lines(
    diameters: object, thicknesses: object, quantity: int | list[int]
) -> list[SimpleNamespace]:
    """Stock lines of every diameter in every thickness, mm."""
    pairs = [(d, t) for d in diameters for t in thicknesses]  # type: ignore[attr-defined]
    each = [quantity] * len(pairs) if isinstance(quantity, int) else quantity
    return [
        SimpleNamespace(outer_mm=float(d), thickness_mm=t, real_mm=t, quantity=q)
        for (d, t), q in zip(pairs, each, strict=True)
    ]


def rules(**changes: object) -> Rules:
    """Rules of an invented piston, some replaced."""
    usual: dict[str, object] = {
        "cover_mm": 35.0,
        "clearance_mm": 46.0,
        "port_inner_mm": 19.0,
        "height_min_mm": 0.3,
        "height_max_mm": 4.0,
        "parts": 14,
        "face_min": 1,
        "stages": (1, 2),
    }
    return Rules(**{**usual, **changes})  # type: ignore[arg-type]


def workshop(**changes: object) -> Space:
    """Sixty sizes, up to 14 shims."""
    generator = np.random.default_rng(7)
    stock = lines(range(14, 44, 2), [0.1, 0.15, 0.2, 0.25], generator.integers(2, 12, 60).tolist())
    return Space(Sizes.of(stock), rules(**changes))
