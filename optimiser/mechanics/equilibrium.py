"""Equilibrium of a stack at the `reported` (stretched plates) or `linear` fidelity.

The energy

    bending + membrane (von Karman) - pressure work + spring + contact

is minimised by Newton's method, with a line search when it takes long. A contact that overlaps
pushes back like a spring ten thousand times stiffer than the plates there
(assembly.CONTACT_STIFFNESS): overlaps stay far below what matters, and closing a gap is
continuous.
"""

from typing import NamedTuple

import numpy as np

from optimiser.compiled import kernel, step
from optimiser.mechanics.assembly import Model
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.membrane import inner_factor, outer_factor, stress_function
from optimiser.mechanics.plate import pressure_response
from optimiser.mechanics.plates import back_substitute, factor, moments_at

RELATIVE_TOLERANCE = 1e-8
MOST_STEPS = 100
#: First Newton steps are taken whole: the set of closed contacts settles faster than along a
#: descent.
FULL_STEPS = 20
#: At rest every shim lies on the next one: gaps below this share of the span start as closed.
TOUCHING = 1e-9


class Work(NamedTuple):
    """Scratch arrays of one solve: s unknowns, m groups, q points, n radii."""

    gradient: Floats  # (s,)
    hessian: Floats  # (s, s), upper part
    reach: Ints  # (s,) last column used in each row
    widest: Ints  # (s,) the same before factoring
    theta: Floats  # (m, q) slopes
    force: Floats  # (m, q) stress function per E t
    stretch: Floats  # (q,)
    scaled: Floats  # (q, n)
    carried: Floats  # (q, n)


def scratch(model: Model) -> Work:
    """Arrays for :func:`evaluate`, made once a stack."""
    size = model.start[-1]
    m, q, n = model.slope.shape
    widest = np.repeat(model.start[1:] - 1, model.held)
    for f, b in zip(model.front, model.back, strict=True):
        widest[f] = max(widest[f], b)
    return Work(
        np.zeros(size),
        np.zeros((size, size)),
        widest.copy(),
        widest,
        np.zeros((m, q)),
        np.zeros((m, q)),
        np.zeros(q),
        np.zeros((q, n)),
        np.zeros((q, n)),
    )


@step
def _bend(model: Model, shape: Floats, work: Work) -> float:
    """Bending energy; sets the gradient and the group blocks of the Hessian."""
    energy = 0.0
    for g in range(model.held.size):
        s, k = model.start[g], model.held[g]
        for i in range(k):
            total = 0.0
            for j in range(k):
                total += model.bending[g, i, j] * shape[s + j]
            work.gradient[s + i] = total
            energy += 0.5 * total * shape[s + i]
            row = work.hessian[s + i]
            row[s + i : model.start[g + 1]] = model.bending[g, i, i:k]
            row[model.start[g + 1] : work.widest[s + i] + 1] = 0.0
    return energy


@step
def _stretch(model: Model, shape: Floats, work: Work, g: int) -> float:
    """Membrane energy of one group; adds to the gradient and the Hessian."""
    s, k = model.start[g], model.held[g]
    points = 2 * k
    inner, outer = model.inner, model.outer[g]
    theta, force = work.theta[g], work.force[g]
    for q in range(points):
        total = 0.0
        for j in range(k):
            total += model.slope[g, q, j] * shape[s + j]
        theta[q] = total
        work.stretch[q] = 0.5 * model.weights[q] * total * total
    stress_function(work.stretch[:points], inner, outer, force)

    factor_2pi = 2.0 * np.pi * model.stretching[g]
    energy = 0.0
    scaled, carried = work.scaled, work.carried
    # The membrane's compliance p(r<) q(r>) is applied by one sweep out and one sweep back.
    for q in range(points):
        energy += 0.5 * factor_2pi * work.stretch[q] * force[q]
        pull = factor_2pi * model.weights[q] * force[q] * theta[q]
        turn = model.weights[q] * theta[q]
        for j in range(k):
            slope = model.slope[g, q, j]
            work.gradient[s + j] += pull * slope
            scaled[q, j] = turn * slope
            before = carried[q - 1, j] / outer[q - 1] if q > 0 else 0.0
            carried[q, j] = outer[q] * (before + inner[q] * scaled[q, j])
    beyond = np.zeros(k)
    for q in range(points - 1, -1, -1):
        for j in range(k):
            carried[q, j] += inner[q] * beyond[j]
            beyond[j] += outer[q] * scaled[q, j]
    for q in range(points):
        tension = factor_2pi * model.weights[q] * force[q]
        for i in range(k):
            first = tension * model.slope[g, q, i]
            second = factor_2pi * scaled[q, i]
            row = work.hessian[s + i]
            for j in range(i, k):
                row[s + j] += first * model.slope[g, q, j] + second * carried[q, j]
    return energy


@step
def _press(model: Model, shape: Floats, work: Work, pressure: float, tight: float) -> float:
    """Pressure, spring and contact energy; adds to the gradient and the Hessian.

    Contacts whose overlap exceeds ``-tight`` count as closed.
    """
    gradient, hessian = work.gradient, work.hessian
    energy = 0.0
    for k in range(model.held[0]):
        gradient[k] -= pressure * model.load[k]
        energy -= pressure * model.load[k] * shape[k]
    for c in range(model.front.size):
        f, b = model.front[c], model.back[c]
        push = model.push[c]
        overlap = -model.gap[c]
        if b >= 0:
            overlap += shape[f] - shape[b]
        else:
            overlap -= shape[f]
        if overlap <= -tight:
            continue
        energy += 0.5 * push * overlap * overlap
        hessian[f, f] += push
        if b >= 0:
            gradient[f] += push * overlap
            gradient[b] -= push * overlap
            hessian[b, b] += push
            hessian[f, b] -= push
        else:
            gradient[f] -= push * overlap
    if model.sprung >= 0:
        k = model.sprung
        pressing = model.spring[2] + model.spring[1] * shape[k]
        gradient[k] += pressing
        hessian[k, k] += model.spring[1]
        energy += 0.5 * (pressing + model.spring[2]) * shape[k]
    return energy


@kernel
def evaluate(
    model: Model, shape: Floats, work: Work, pressure: float, stretched: bool, tight: float
) -> float:
    """Energy of a shape (s,) in J; leaves gradient and Hessian in ``work``."""
    work.reach[:] = work.widest
    energy = _bend(model, shape, work)
    if stretched:
        for g in range(model.held.size):
            if model.held[g] > 0:
                energy += _stretch(model, shape, work, g)
    return energy + _press(model, shape, work, pressure, tight)


@step
def _shorten(
    model: Model, shape: Floats, work: Work, pressure: float, stretched: bool, before: Floats,
    direction: Floats, slope: float,
) -> None:  # fmt: skip
    """Shorten a step that went past the lowest energy on its line, by bisection on the derivative.

    ``slope`` is the derivative's size at the start; the energy is convex there.
    """
    low, high = 0.0, 1.0
    length = 1.0
    for _bisection in range(40):
        ahead = np.dot(work.gradient, direction)
        if abs(ahead) <= 0.1 * slope or (ahead > 0.0 and length == 1.0):
            return
        if ahead > 0.0:
            low = length
        else:
            high = length
        length = 0.5 * (low + high)
        shape[:] = before - length * direction
        evaluate(model, shape, work, pressure, stretched, 0.0)


@kernel
def _descend(
    model: Model, shape: Floats, work: Work, pressure: float, stretched: bool, at_rest: bool,
    whole: int,
) -> int:  # fmt: skip
    """Newton's method from ``shape`` (s,), in place, with a line search after ``whole`` steps.

    Returns the number of steps, or -1 where no equilibrium was found.
    """
    span = model.radii[-1] - model.clamp
    size = shape.size
    direction = np.empty(size)
    before = np.empty(size)
    evaluate(model, shape, work, pressure, stretched, TOUCHING * span * at_rest)
    for count in range(1, MOST_STEPS + 1):
        direction[:] = work.gradient
        if not factor(work.hessian, work.reach, size):
            return -1
        back_substitute(work.hessian, work.reach, size, direction)
        slope = np.dot(work.gradient, direction)
        before[:] = shape
        shape[:] = before - direction
        evaluate(model, shape, work, pressure, stretched, 0.0)
        if count > whole:
            _shorten(model, shape, work, pressure, stretched, before, direction, slope)
        moved = np.max(np.abs(direction))
        if moved <= RELATIVE_TOLERANCE * (np.max(np.abs(shape)) + 1e-9 * span):
            return count
    return -1


def shapes(model: Model, pressures: Floats, stretched: bool) -> tuple[Floats, Ints]:
    """Equilibrium at each of ``pressures`` (p,), ascending, Pa.

    Returns deflections (p, s) m and Newton steps (p,), -1 where no equilibrium was found.
    """
    work = scratch(model)
    result = np.zeros((pressures.size, model.start[-1]))
    steps = np.zeros(pressures.size, dtype=np.int64)
    base, earlier = np.zeros(model.start[-1]), 0.0
    for p, pressure in enumerate(pressures):
        start = base
        if p > 0:
            start = result[p - 1]
            if pressures[p - 1] > earlier:
                ahead = (pressure - pressures[p - 1]) / (pressures[p - 1] - earlier)
                start = start + ahead * (start - base)
                base, earlier = result[p - 1], pressures[p - 1]
        for whole in (FULL_STEPS, 0):
            shape = start.copy()
            steps[p] = _descend(model, shape, work, pressure, stretched, p == 0, whole)
            if steps[p] >= 0:
                break
        result[p] = shape
    return result, steps


def contact_forces(model: Model, shape: Floats) -> tuple[Floats, Floats]:
    """Force N (c,) and clearance m (c,) of every contact; the seat, if any, is the last."""
    behind = np.where(model.back >= 0, shape[model.back], 2.0 * shape[model.front])
    clear = model.gap + behind - shape[model.front]
    return model.push * np.maximum(0.0, -clear), np.maximum(0.0, clear)


def bending_moments(model: Model, lifts: Floats, pressures: Floats) -> Floats:
    """Radial moment per length, N, (p, m, n + 1) of every group at the clamp and every radius.

    ``lifts`` (p, s) of :func:`shapes` at ``pressures`` (p,).
    """
    radii = np.concatenate([[model.clamp], model.radii])
    moments = np.zeros((pressures.size, model.held.size, radii.size))
    for g, k in enumerate(model.held):
        if k == 0:
            continue
        s, edge = model.start[g], float(model.groups[g, 0])
        rings = lifts[:, s : s + k] @ model.bending[g, :k, :k]
        if g == 0:
            rings -= pressures[:, None] * model.load[:k]
            low, high = model.port
            pressed = [
                pressure_response(r, low, high, model.clamp, edge, model.poisson, True)
                for r in radii[: k + 1]
            ]
            moments[:, 0, : k + 1] = pressures[:, None] * np.array(pressed)
        unit = moments_at(radii[: k + 1], model.radii[:k], model.clamp, edge, model.poisson)
        moments[:, g, : k + 1] += rings @ unit.T
    return moments


def membrane_forces(model: Model, lifts: Floats) -> Floats:
    """Radial membrane force per length, N/m, (p, m, n + 1) at the same places."""
    radii = np.concatenate([[model.clamp], model.radii])
    result = np.zeros((len(lifts), model.held.size, radii.size))
    for g, k in enumerate(model.held):
        s, edge = model.start[g], float(model.groups[g, 0])
        at, points = radii[: k + 1, None], model.points[: 2 * k]
        theta = lifts[:, s : s + k] @ model.slope[g, : 2 * k, :k].T
        stretch = 0.5 * model.weights[: 2 * k] * theta**2
        near = np.array([inner_factor(r, model.clamp, model.poisson) for r in at[:, 0]])
        far = np.array([outer_factor(r, model.clamp, edge, model.poisson) for r in at[:, 0]])
        green = np.where(
            points < at,
            far[:, None] * model.inner[: 2 * k],
            near[:, None] * model.outer[g, : 2 * k],
        )
        result[:, g, : k + 1] = model.stretching[g] * (stretch @ (green / at).T)
    return result
