"""A stack as one elastic model: plates, contacts, seat, spring and pressure, ready to be solved."""

from typing import NamedTuple

import numpy as np

from optimiser.mechanics.layout import Floats, Ints, find_contacts, nearest, radii_between
from optimiser.mechanics.membrane import inner_factor, outer_factor
from optimiser.mechanics.plate import pressure_response
from optimiser.mechanics.plates import compliance, inverse, slopes

#: A closed contact is this many times stiffer than the plates it joins at that radius.
CONTACT_STIFFNESS = 1e4
_GAUSS = np.array([0.5 - 0.5 / np.sqrt(3.0), 0.5 + 0.5 / np.sqrt(3.0)])


class Model(NamedTuple):
    """One stack, m groups on n radii with q points between them. SI units.

    The unknowns are the deflections, group after group: group g owns ``start[g]:start[g + 1]``,
    at the radii ``0:held[g]`` (a ring shim owns none).
    """

    clamp: float
    poisson: float
    groups: Floats  # (m, 6), see layout.group_shims
    radii: Floats  # (n,) m
    held: Ints  # (m,)
    start: Ints  # (m + 1,)
    bending: Floats  # (m, n, n) N/m
    stretching: Floats  # (m,) E t, N/m
    slope: Floats  # (m, q, n) slope at the points per deflection, 1/m
    points: Floats  # (q,) m
    weights: Floats  # (q,) m
    inner: Floats  # (q,) membrane factor from the clamp, m
    outer: Floats  # (m, q) membrane factor from the edge, 1/m
    port: Floats  # (2,) inner and outer radius of the pressed ring, m
    load: Floats  # (n,) ring loads on the face group per pascal, m2
    front: Ints  # (c,) unknown in front of each contact
    back: Ints  # (c,) unknown behind it; -1 for the seat (last contact, if any)
    gap: Floats  # (c,) m; negative is a preload
    push: Floats  # (c,) N/m
    sprung: int  # unknown the back spring presses; -1 for none
    spring: Floats  # (3,) radius m, rate N/m, preload N


def _fixed_radii(
    groups: Floats, clamp: float, port: Floats, seat: Floats, spring: Floats
) -> Floats:
    """Radii that must be among the nodes: edges, ring holes, port ring, seat, spring."""
    widest = np.max(groups[:, 0])
    ring = [*port, seat[0], min(spring[0], widest)]
    candidates = np.concatenate([groups[:, 0], groups[:, 4], ring])
    return np.asarray(candidates[(candidates > clamp) & (candidates <= widest)])


def _gauss_points(radii: Floats, clamp: float) -> tuple[Floats, Floats]:
    """Two Gauss points and weights between consecutive radii, from the clamp outwards."""
    low = np.concatenate([[clamp], radii[:-1]])
    width = radii - low
    points = low[:, None] + width[:, None] * _GAUSS
    return points.ravel(), np.repeat(0.5 * width, 2)


def _plates(
    groups: Floats,
    count: Ints,
    radii: Floats,
    points: Floats,
    clamp: float,
    rigidity: float,
    poisson: float,
) -> tuple[Floats, Floats, Floats]:
    """Bending stiffness, slope map and outer membrane factor of every group."""
    m = count.size
    bending = np.zeros((m, radii.size, radii.size))
    slope = np.zeros((m, points.size, radii.size))
    outer = np.zeros((m, points.size))
    for g in range(m):
        k = count[g]
        if k == 0:
            continue
        for h in range(g):
            if count[h] == k:
                bending[g] = bending[h] * (groups[g, 2] / groups[h, 2])
                slope[g] = slope[h]
                outer[g] = outer[h]
                break
        else:
            edge = groups[g, 0]
            unit = inverse(compliance(radii[:k], clamp, edge, poisson))
            bending[g, :k, :k] = unit * (rigidity * groups[g, 2])
            turned = slopes(points[: 2 * k], radii[:k], clamp, edge, poisson)
            slope[g, : 2 * k, :k] = turned @ unit
            outer[g, : 2 * k] = [outer_factor(r, clamp, edge, poisson) for r in points[: 2 * k]]
    return bending, slope, outer


def _contacts(
    groups: Floats,
    radii: Floats,
    start: Ints,
    bending: Floats,
    clamp: float,
    seat: Floats,
) -> tuple[Ints, Ints, Floats, Floats]:
    """Unknown in front and behind, gap and contact stiffness of every contact, seat last."""
    pairs, gaps = find_contacts(groups, radii, np.max(groups[:, 0]) - clamp)
    seated = 1 if seat[0] > 0.0 else 0
    size = gaps.size + seated
    front = np.empty(size, dtype=np.int64)
    back = np.full(size, -1)
    gap = np.empty(size)
    push = np.empty(size)
    for c in range(gaps.size):
        f, b, k = pairs[c]
        front[c] = start[f] + k
        back[c] = start[b] + k
        gap[c] = gaps[c]
        push[c] = CONTACT_STIFFNESS * min(bending[f, k, k], bending[b, k, k])
    if seated:
        k = nearest(radii, seat[0])
        front[-1] = k
        gap[-1] = -seat[1]
        push[-1] = CONTACT_STIFFNESS * bending[0, k, k]
    return front, back, gap, push


def assemble(
    groups: Floats,
    clamp: float,
    port: Floats,
    seat: Floats,
    spring: Floats,
    youngs: float,
    poisson: float,
    pieces: int,
) -> Model:
    """Build the model of a stack.

    ``groups`` (m, 6) from :func:`layout.group_shims`; ``port`` (2,) inner and outer radius of the
    pressed ring; ``seat`` (2,) radius and height above the clamp plane (radius 0: none); ``spring``
    (3,) ring radius, rate and preload of a coil spring on the back (radius 0: none); ``pieces``
    least number of intervals between the clamp and the widest edge. SI units.
    """
    span = np.max(groups[:, 0]) - clamp
    radii = radii_between(clamp, _fixed_radii(groups, clamp, port, seat, spring), span / pieces)
    points, weights = _gauss_points(radii, clamp)
    m = groups.shape[0]
    count = np.zeros(m, dtype=np.int64)
    start = np.zeros(m + 1, dtype=np.int64)
    for g in range(m):
        if groups[g, 4] == 0.0 and groups[g, 0] > clamp * (1.0 + 1e-9):
            count[g] = nearest(radii, groups[g, 0]) + 1
        start[g + 1] = start[g] + count[g]
    rigidity = youngs / (12.0 * (1.0 - poisson * poisson))
    bending, slope, outer = _plates(groups, count, radii, points, clamp, rigidity, poisson)
    inner = np.array([inner_factor(r, clamp, poisson) for r in points])
    front, back, gap, push = _contacts(groups, radii, start, bending, clamp, seat)

    k = count[0]
    edge = float(groups[0, 0])
    lifted = np.array(
        [pressure_response(r, port[0], port[1], clamp, edge, poisson, False) for r in radii[:k]]
    )
    load = np.zeros(radii.size)
    load[:k] = bending[0, :k, :k] @ lifted / (rigidity * groups[0, 2])

    sprung = -1
    if spring[0] > 0.0:
        node = nearest(radii, spring[0])
        for g in range(m):
            if count[g] > node:
                sprung = start[g] + node
    return Model(
        clamp, poisson, groups, radii, count, start, bending, youngs * groups[:, 1], slope,
        points, weights, inner, outer, port, load, front, back, gap, push, sprung, spring,
    )  # fmt: skip
