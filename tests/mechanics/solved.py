"""The solvers behind the public door, for tests that look at contact forces and energies. SI."""

from typing import NamedTuple

import numpy as np

from optimiser.mechanics.assembly import Model, assemble
from optimiser.mechanics.equilibrium import contact_forces, evaluate, scratch, shapes
from optimiser.mechanics.layout import group_shims
from optimiser.mechanics.quick import Bench, Setting, advance, bench, lay_out, layers_of
from optimiser.mechanics.tables import tables_for

from .stacks import CLAMP, PORT, Question

YOUNGS, POISSON = 206e9, 0.3


class Fine(NamedTuple):
    """A stack and its shapes (p, s), m, at pressures (p,), Pa."""

    model: Model
    pressures: np.ndarray
    shapes: np.ndarray
    stretched: bool

    def contacts(self, p: int) -> tuple[np.ndarray, np.ndarray]:
        """Force N and clearance m (c,) of every contact."""
        return contact_forces(self.model, self.shapes[p])

    def energy(self, shape: np.ndarray, p: int) -> float:
        """Energy J of any shape (s,) at pressure p."""
        work = scratch(self.model)
        return evaluate(self.model, shape, work, self.pressures[p], self.stretched, 0.0)

    def residual(self, p: int) -> np.ndarray:
        """Force N left over at every unknown (s,)."""
        work = scratch(self.model)
        evaluate(self.model, self.shapes[p], work, self.pressures[p], self.stretched, 0.0)
        return work.gradient


def _groups(question: Question) -> np.ndarray:
    outer, thickness, hole = (
        np.array([shim[k] if len(shim) > k else 0.0 for shim in question.shims]) for k in range(3)
    )
    return group_shims(outer * 0.5e-3, thickness * 1e-3, hole * 0.5e-3)[0]


def _options(question: Question) -> tuple[float, float, tuple[float, float, float]]:
    """Seat radius and height m; spring radius m, rate N/m, preload N; zeros for none."""
    options = question.options
    spring = options.get("back_spring", (0.0, 0.0, 0.0))
    return (
        options.get("seat_mm", 0.0) * 0.5e-3,
        options.get("seat_height_mm", 0.0) * 1e-3,
        (spring[0] * 0.5e-3, spring[1] * 1e3, spring[2]),
    )


def fine(question: Question, pressures_mpa: np.ndarray, stretched: bool, pieces: int = 12) -> Fine:
    """Solve by the `reported` or `linear` path."""
    seat, height, spring = _options(question)
    model = assemble(
        _groups(question), CLAMP * 0.5e-3, np.array(PORT) * 0.5e-3, np.array([seat, height]),
        np.array(spring), YOUNGS, POISSON, pieces,
    )  # fmt: skip
    pressures = pressures_mpa * 1e6
    found, steps = shapes(model, pressures, stretched)
    assert np.all(steps >= 0)
    return Fine(model, pressures, found, stretched)


class Contact(NamedTuple):
    """One contact of the `search` path: force N, clearance m."""

    force: float
    clearance: float
    sprung: bool


def quick_contacts(question: Question, pressures_mpa: np.ndarray) -> list[list[Contact]]:
    """Every contact at every pressure, ascending, by the `search` path."""
    seat, height, spring = _options(question)
    groups = _groups(question)
    edges = np.unique(np.round(groups[groups[:, 4] == 0.0, 0], 9))
    rings = groups[groups[:, 4] > 0.0]
    tables = tables_for(
        edges[edges > CLAMP * 0.5e-3 * (1 + 1e-9)],
        np.concatenate([rings[:, 4], rings[:, 0]]),
        CLAMP * 0.5e-3, (PORT[0] * 0.5e-3, PORT[1] * 0.5e-3), seat or PORT[1] * 0.5e-3,
        spring[0], POISSON,
    )  # fmt: skip
    layers = layers_of(tables, groups)
    setting = Setting(YOUNGS, height, spring[1], spring[2], 1e-6, seat > 0.0)
    b = bench(layers.plate.size, tables.nodes.size)
    lay_out(tables, layers, setting, b)
    pressures, ahead, rows = pressures_mpa * 1e6, 1.0, []
    for p in range(pressures.size):
        rounds, ahead = advance(tables, layers, setting, pressures, p, ahead, b)
        assert rounds > 0
        rows.append([_contact(b, c) for c in range(b.size[1])])
    return rows


def _contact(b: Bench, c: int) -> Contact:
    clear = float(b.gap[c])
    clear += float(b.lift[b.back[c], b.at[c]]) if b.back[c] >= 0 else 0.0
    clear -= float(b.lift[b.front[c], b.at[c]]) if b.front[c] >= 0 else 0.0
    return Contact(float(b.force[c]), clear, b.closed[c] == 2)
