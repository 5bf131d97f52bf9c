"""Equilibrium of a stack at the `reported` (stretched plates) or `linear` fidelity.

The energy

    bending + membrane (von Karman) - pressure work + spring + contact

is minimised by Newton's method, with a line search when it takes long. A contact that overlaps pushes back like a
spring ten thousand times stiffer than the plates there (assembly.CONTACT_STIFFNESS): overlaps stay
far below what matters, and closing a gap is continuous.
"""

from typing import NamedTuple

import numpy as np

from optimiser.compiled import kernel, step
from optimiser.mechanics.assembly import Model
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.membrane import inner_factor, outer_factor, stress_function
from optimiser.mechanics.plate import pressure_response, ring_moment
from optimiser.mechanics.plates import back_substitute, factor

RELATIVE_TOLERANCE = 1e-8
MOST_STEPS = 100
#: First Newton steps are taken whole: the set of closed contacts settles faster than along a descent.
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


@kernel
def scratch(model: Model) -> Work:
    """Arrays for :func:`evaluate`, made once a stack."""
    size = model.start[-1]
    m, q, n = model.slope.shape
    widest = np.empty(size, dtype=np.int64)
    for g in range(m):
        widest[model.start[g] : model.start[g + 1]] = model.start[g + 1] - 1
    for c in range(model.front.size):
        if model.back[c] >= 0:
            widest[model.front[c]] = max(widest[model.front[c]], model.back[c])
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
        if abs(ahead) <= 0.1 * slope or ahead > 0.0 and length == 1.0:
            return
        if ahead > 0.0:
            low = length
        else:
            high = length
        length = 0.5 * (low + high)
        shape[:] = before - length * direction
        evaluate(model, shape, work, pressure, stretched, 0.0)


@step
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


@kernel
def shapes(model: Model, pressures: Floats, stretched: bool) -> tuple[Floats, Floats, Ints]:
    """Equilibrium at each of ``pressures`` (p,), ascending, Pa.

    Returns deflections (p, s) m, stress functions per E t (p, m, q) m (zeros without stretching) and
    Newton steps (p,), -1 where no equilibrium was found.
    """
    size = model.start[-1]
    work = scratch(model)
    result = np.zeros((pressures.size, size))
    force = np.zeros((pressures.size, *work.force.shape))
    steps = np.zeros(pressures.size, dtype=np.int64)
    shape = np.zeros(size)
    base = np.zeros(size)
    earlier = 0.0
    for p in range(pressures.size):
        if p > 0 and pressures[p - 1] > earlier:
            ahead = (pressures[p] - pressures[p - 1]) / (pressures[p - 1] - earlier)
            shape = result[p - 1] + ahead * (result[p - 1] - base)
            earlier = pressures[p - 1]
            base = result[p - 1]
        start = shape.copy()
        steps[p] = _descend(model, shape, work, pressures[p], stretched, p == 0, FULL_STEPS)
        if steps[p] < 0:
            shape = start
            steps[p] = _descend(model, shape, work, pressures[p], stretched, p == 0, 0)
        result[p] = shape
        force[p] = work.force
    return result, force, steps


@kernel
def contact_forces(model: Model, shape: Floats) -> tuple[Floats, Floats]:
    """Force N (c,) and clearance m (c,) of every contact; the seat, if any, is the last."""
    clear = model.gap.copy()
    for c in range(clear.size):
        f, b = model.front[c], model.back[c]
        clear[c] += shape[b] - shape[f] if b >= 0 else shape[f]
    return model.push * np.maximum(0.0, -clear), np.maximum(0.0, clear)


@kernel
def bending_moments(model: Model, shape: Floats, pressure: float) -> Floats:
    """Radial moment per length, N, of every group at the clamp and at every radius (m, n + 1)."""
    m, n = model.held.size, model.radii.size
    moments = np.zeros((m, n + 1))
    for g in range(m):
        s, k = model.start[g], model.held[g]
        edge = model.groups[g, 0]
        for i in range(k + 1):
            r = model.clamp if i == 0 else model.radii[i - 1]
            if g == 0:
                port = model.port
                moments[g, i] = pressure * pressure_response(
                    r, port[0], port[1], model.clamp, edge, model.poisson, True
                )
        for j in range(k):
            ring = np.dot(model.bending[g, j, :k], shape[s : s + k])
            if g == 0:
                ring -= pressure * model.load[j]
            for i in range(k + 1):
                r = model.clamp if i == 0 else model.radii[i - 1]
                moments[g, i] += ring * ring_moment(
                    r, model.radii[j], model.clamp, edge, model.poisson
                )
    return moments


@kernel
def membrane_forces(model: Model, shape: Floats) -> Floats:
    """Radial membrane force per length, N/m, of every group at the clamp and radii (m, n + 1)."""
    m, n = model.held.size, model.radii.size
    result = np.zeros((m, n + 1))
    for g in range(m):
        s, k = model.start[g], model.held[g]
        theta = np.dot(model.slope[g, : 2 * k, :k].copy(), shape[s : s + k])
        for i in range(k + 1):
            r = model.clamp if i == 0 else model.radii[i - 1]
            inside = 0.0
            outside = 0.0
            for q in range(2 * k):
                stretch = 0.5 * model.weights[q] * theta[q] * theta[q]
                if model.points[q] < r:
                    inside += model.inner[q] * stretch
                else:
                    outside += model.outer[g, q] * stretch
            total = outer_factor(r, model.clamp, model.groups[g, 0], model.poisson) * inside
            total += inner_factor(r, model.clamp, model.poisson) * outside
            result[g, i] = model.stretching[g] * total / r
    return result
