"""Everything a quick solve needs that does not depend on the stack: one table per plate diameter.

A drawer holds a few dozen diameters; under one clamp each of them is the same plate up to its
stiffness. Its responses to ring loads at all radii that may matter, to the pressure and to membrane
forces are tabulated once (D = 1), so that a stack is solved without a single logarithm.

A membrane force F = r N_r acts on a plate with slope w' through the virtual work 2 pi F w' (dw)':
a load that turns rather than lifts, called a *slope load* here. Its responses are the derivatives
of the ring-load responses with respect to the loaded radius.
"""

from math import pi
from typing import NamedTuple

import numpy as np

from optimiser.compiled import kernel, step
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.membrane import inner_factor, outer_factor
from optimiser.mechanics.plate import (
    pressure_response,
    pressure_slope,
    ring_deflection,
    ring_moment,
    ring_slope,
    slope_load_moment,
    slope_load_slope,
)

#: Gauss points on every plate for its slope and membrane force.
POINTS = 6
#: Contacts are looked for at this many places over the port ring beside the edges and the seat.
PORT_NODES = 2

_ROOTS, _WEIGHTS = np.polynomial.legendre.leggauss(POINTS)
_FINE_ROOTS, _FINE_WEIGHTS = np.polynomial.legendre.leggauss(24)


class Tables(NamedTuple):
    """Responses of d plates at n radii and q Gauss points, D = 1, SI units."""

    clamp: float
    poisson: float
    nodes: Floats  # (n,) radii where shims may touch, ascending
    common: Ints  # (k,) nodes that matter for every stack (port ring, seat, spring)
    seat: int  # node of the seat; -1 for none
    spring: int  # node of the back spring; -1 for none
    edge: Floats  # (d,) edge radius of each plate
    edge_node: Ints  # (d,) its node
    deflection: Floats  # (d, n, n) at node i under 1 N at node j
    moment: Floats  # (d, n + 1, n) at the clamp and node i - 1 under 1 N at node j
    slope: Floats  # (d, n, q) at point q under 1 N at node i
    pressed: Floats  # (d, n) deflection under 1 Pa on the port ring
    pressed_moment: Floats  # (d, n + 1)
    pressed_slope: Floats  # (d, q)
    slope_load: Floats  # (d, q, q) slope at q under a unit slope load at the other
    slope_load_moment: Floats  # (d, n + 1, q)
    weight: Floats  # (d, q) quadrature weight, m
    membrane: Floats  # (d, q, q) F per E t from (w')^2 / 2 at the points
    membrane_edge: Floats  # (d, n + 1, q) F per E t at the clamp and nodes
    stiffening: Floats  # (d,) membrane over bending secant stiffness, x D / (E t w_edge^2)


@step
def _lagrange(points: Floats, k: int, x: float) -> float:
    """Value at x of the polynomial that is 1 at point k and 0 at the others."""
    value = 1.0
    for j in range(points.size):
        if j != k:
            value *= (x - points[j]) / (points[k] - points[j])
    return value


@step
def _membrane_row(
    r: float, points: Floats, clamp: float, edge: float, poisson: float, row: Floats
) -> None:
    """F at r per E t for (w')^2 / 2 given at ``points``: the Green's function of the membrane
    integrated exactly against the polynomial through the points."""
    row[:] = 0.0
    for part in range(2):
        low = clamp if part == 0 else r
        high = r if part == 0 else edge
        half = 0.5 * (high - low)
        if half <= 0.0:
            continue
        for g in range(_FINE_ROOTS.size):
            s = low + half * (1.0 + _FINE_ROOTS[g])
            green = inner_factor(min(r, s), clamp, poisson) * outer_factor(
                max(r, s), clamp, edge, poisson
            )
            for k in range(points.size):
                row[k] += half * _FINE_WEIGHTS[g] * green * _lagrange(points, k, s)


@step
def _stiffening(theta: Floats, weight: Floats, membrane: Floats, lift: float, work: float) -> float:
    """Membrane over bending secant stiffness of a shape, per (E t / D) and squared edge lift."""
    energy = 0.0
    for q in range(theta.size):
        force = 0.0
        for k in range(theta.size):
            force += membrane[q, k] * 0.5 * theta[k] * theta[k]
        energy += 2.0 * pi * weight[q] * force * theta[q] * theta[q]
    return energy / (work * lift * lift)


@kernel
def make_tables(
    clamp: float,
    poisson: float,
    nodes: Floats,
    common: Ints,
    seat: int,
    spring: int,
    edge_node: Ints,
    port: Floats,
) -> Tables:
    """Tabulate the plates whose edges are at ``edge_node`` (d,) of ``nodes`` (n,).

    ``port`` (2,): inner and outer radius of the pressed ring, m.
    """
    d, n = edge_node.size, nodes.size
    q = _ROOTS.size
    edges = nodes[edge_node]
    deflection = np.zeros((d, n, n))
    moment = np.zeros((d, n + 1, n))
    slope = np.zeros((d, n, q))
    pressed = np.zeros((d, n))
    pressed_moment = np.zeros((d, n + 1))
    pressed_slope = np.zeros((d, q))
    slope_load = np.zeros((d, q, q))
    turned = np.zeros((d, n + 1, q))
    weight = np.zeros((d, q))
    membrane = np.zeros((d, q, q))
    membrane_edge = np.zeros((d, n + 1, q))
    stiffening = np.zeros(d)
    for p in range(d):
        edge, reach = edges[p], edge_node[p] + 1
        half = 0.5 * (edge - clamp)
        points = clamp + half * (1.0 + _ROOTS)
        weight[p] = half * _WEIGHTS
        for i in range(reach + 1):
            r = clamp if i == 0 else nodes[i - 1]
            pressed_moment[p, i] = pressure_response(
                r, port[0], port[1], clamp, edge, poisson, True
            )
            _membrane_row(r, points, clamp, edge, poisson, membrane_edge[p, i])
            for j in range(reach):
                moment[p, i, j] = ring_moment(r, nodes[j], clamp, edge, poisson)
                if i > 0:
                    deflection[p, i - 1, j] = ring_deflection(r, nodes[j], clamp, edge, poisson)
            for k in range(q):
                turned[p, i, k] = slope_load_moment(r, points[k], clamp, edge, poisson)
                if i > 0:
                    slope[p, i - 1, k] = ring_slope(points[k], r, clamp, edge, poisson)
            if i > 0:
                pressed[p, i - 1] = pressure_response(
                    r, port[0], port[1], clamp, edge, poisson, False
                )
        for k in range(q):
            pressed_slope[p, k] = pressure_slope(points[k], port[0], port[1], clamp, edge, poisson)
            _membrane_row(points[k], points, clamp, edge, poisson, membrane[p, k])
            for j in range(q):
                slope_load[p, k, j] = slope_load_slope(points[k], points[j], clamp, edge, poisson)
        tip = edge_node[p]
        lift = deflection[p, tip, tip]
        stiffening[p] = _stiffening(slope[p, tip], weight[p], membrane[p], lift, lift)
    return Tables(
        clamp, poisson, nodes, common, seat, spring, edges, edge_node, deflection, moment, slope,
        pressed, pressed_moment, pressed_slope, slope_load, turned, weight, membrane,
        membrane_edge, stiffening,
    )  # fmt: skip


def tables_for(
    edges: Floats,
    extra: Floats,
    clamp: float,
    port: tuple[float, float],
    seat: float,
    spring: float,
    poisson: float,
) -> Tables:
    """Tables for plates of ``edges`` (d,) radii, ascending, beyond the ``clamp`` radius.

    ``extra`` (e,) radii of ring shims' holes and edges; ``seat`` and ``spring`` radii, 0 for
    none. SI. Radii closer than a thousandth of the free span share a node.
    """
    span = edges[-1] - clamp
    low, high = max(port[0], clamp), min(port[1], edges[-1])
    inside = low + (high - low) * (np.arange(PORT_NODES) + 0.5) / PORT_NODES
    wanted = [*inside, *(r for r in (seat, spring) if r > 0.0), *extra]
    nodes = list(edges)
    for r in wanted:
        if r > clamp + 1e-3 * span and min(abs(r - x) for x in nodes) > 1e-3 * span:
            nodes.append(r)
    ordered = np.sort(np.asarray(nodes))
    ordered = ordered[ordered <= edges[-1] * (1.0 + 1e-12)]

    def at(r: float) -> int:
        return int(np.argmin(np.abs(ordered - r)))

    common = sorted({at(r) for r in wanted if clamp < r <= edges[-1]})
    return make_tables(
        clamp,
        poisson,
        ordered,
        np.asarray(common, dtype=np.int64),
        at(seat) if seat > 0.0 else -1,
        at(min(spring, edges[-1])) if spring > 0.0 else -1,
        np.asarray([at(e) for e in edges], dtype=np.int64),
        np.asarray(port, dtype=float),
    )
