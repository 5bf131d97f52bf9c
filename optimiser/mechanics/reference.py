"""The readable stack: one stack at a time in NumPy and SciPy, for the fast kernels to be held to.

The same mathematics as the other fidelities, written for the eye and by other means wherever there
are any, so that one mistake does not hide in both:

* a plate's response to a ring load is solved for from its boundary conditions instead of taken from
  a closed form; between the radii it takes the shape of least bending energy;
* stretching follows from the membrane's Green's function on four points an interval;
* Newton's method on the energy; each step keeps all clearances at 0 or more exactly: its contact
  forces are a non-negative least-squares problem (dual of the step's quadratic programme).

Everything is in mm, N and MPa, which are consistent with each other: no conversions to go wrong.

Sources: S. Timoshenko and S. Woinowsky-Krieger, *Theory of Plates and Shells*, 2nd ed. (1959),
art. 16-17 (bending) and 100 (stretching); C. L. Lawson and R. J. Hanson, *Solving Least Squares
Problems* (1974), ch. 23 (non-negative least squares).
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.linalg import block_diag, cho_factor, cho_solve, cholesky, solve_triangular
from scipy.optimize import nnls

Floats = NDArray[np.float64]

#: Radii closer than this share of the free span are one radius.
SAME = 1e-3
RELATIVE_TOLERANCE = 1e-8
MOST_STEPS = 60
_ROOTS, _WEIGHTS = np.polynomial.legendre.leggauss(4)


@dataclass(frozen=True)
class ReferenceDeflection:
    """What p pressures do to a stack of n shims (face first, without the clamp shim).

    ``edge_deflection_mm`` (p,) rise of the face shim's edge; ``seat_lift_mm`` (p,) rise above the
    seat (without one: rise at the port ring's outer edge); ``clamp_moment_n`` (p, n) N mm/mm;
    ``peak_stress_mpa`` (p, n) membrane + bending; ``contact_force_n`` and ``clearance_mm`` (p, c).
    """

    edge_deflection_mm: Floats
    seat_lift_mm: Floats
    clamp_moment_n: Floats
    peak_stress_mpa: Floats
    contact_force_n: Floats
    clearance_mm: Floats


@dataclass(frozen=True)
class Group:
    """Neighbours of one diameter, which bend as one, or a ring shim (``hole`` > 0). mm."""

    edge: float
    hole: float
    numbers: tuple[int, ...]  # of its shims, counted from the face
    thickness: tuple[float, ...]

    @property
    def total(self) -> float:
        """Sum of t, mm: its height and, times E, its membrane stiffness."""
        return sum(self.thickness)

    @property
    def cubed(self) -> float:
        """Sum of t^3, mm3: its bending stiffness, but for a factor."""
        return sum(t**3 for t in self.thickness)


class Plate(NamedTuple):
    """A group's elastic answer at its k radii and q points between them. mm, N, MPa."""

    start: int  # its first unknown
    bending: Floats  # (k, k) N/mm
    slope: Floats  # (q, k) slope at the points per deflection, 1/mm
    weight: Floats  # (q,) mm
    membrane: Floats  # (q, q) r N_r at the points per (w')^2 / 2 dr, N/mm
    ring_moment: Floats  # (k + 1, k) at the clamp and the radii under 1 N on each ring, N/N
    ring_membrane: Floats  # (k + 1, q) N_r there per (w')^2 / 2 dr, N/mm2
    pressed: Floats  # (k,) deflection under 1 MPa on the port ring, mm/MPa
    pressed_moment: Floats  # (k + 1,) N/MPa


class Assembly(NamedTuple):
    """A stack ready to be pressed. s unknowns, c contacts. mm, N, MPa."""

    radii: Floats
    groups: list[Group]
    plates: list[Plate | None]  # one a group; None for rings and fillers
    bending: Floats  # (s, s), with the spring's rate
    load: Floats  # (s,) N/MPa
    held: Floats  # (s,) N, the spring's preload
    contact: Floats  # (c, s) clearance per deflection
    gap: Floats  # (c,) mm


def _basis(r: Floats, a: float) -> tuple[Floats, Floats, Floats]:
    """The four solutions of the plate equation and their first and second derivatives, (..., 4)."""
    x = r / a
    log, one, zero = np.log(x), np.ones_like(x), np.zeros_like(x)
    return (
        np.stack([one, log, x**2, x**2 * log], axis=-1),
        np.stack([zero, 1 / x, 2 * x, x * (2 * log + 1)], axis=-1) / a,
        np.stack([zero, -1 / x**2, 2 * one, 2 * log + 3], axis=-1) / a**2,
    )


def _ring_load_constants(s: Floats, a: float, b: float, poisson: float) -> Floats:
    """Shape under 1 N on the ring s (k,), D = 1: basis factors inside and outside, (k, 2, 4).

    Held at a, smooth at s, M_r = 0 at b. The shear inside fixes the fourth factor: -a^2 / (8 pi).
    """
    (w, turn, curve), (_, edge_turn, edge_curve) = _basis(s, a), _basis(np.array([b]), a)
    clamp_w, clamp_turn, _ = _basis(np.array([a]), a)
    moment = curve + poisson * turn / s[:, None]
    system, right = np.zeros((s.size, 6, 6)), np.zeros((s.size, 6))
    fourth = -(a**2) / (8 * np.pi)
    for row, (inner, outer) in enumerate(
        [
            (clamp_w, 0 * clamp_w),
            (clamp_turn, 0 * clamp_turn),
            (w, -w),
            (turn, -turn),
            (moment, -moment),
            (0 * w, edge_curve + poisson * edge_turn / b),
        ]
    ):
        system[:, row, :3] = inner[..., :3]
        system[:, row, 3:] = outer[..., :3]
        right[:, row] = -fourth * inner[..., 3]
    found = np.linalg.solve(system, right[..., None])[..., 0]
    constants = np.zeros((s.size, 2, 4))
    constants[:, 0, :3], constants[:, 0, 3], constants[:, 1, :3] = (
        found[:, :3],
        fourth,
        found[:, 3:],
    )
    return constants


def ring_responses(
    r: Floats, s: Floats, a: float, b: float, poisson: float
) -> tuple[Floats, Floats, Floats]:
    """Deflection, slope and radial moment at r (n,) under 1 N on each ring s (k,), D = 1; (n, k).

    ``a`` clamp and ``b`` edge radius, in the same unit as r and s.
    """
    constants = _ring_load_constants(s, a, b, poisson)
    side = (r[:, None] > s[None, :]).astype(int)
    factors = constants[np.arange(s.size)[None, :], side]  # (n, k, 4)
    w, turn, curve = (np.einsum("nf,nkf->nk", values, factors) for values in _basis(r, a))
    return w, turn, curve + poisson * turn / r[:, None]


def _membrane(r: Floats, s: Floats, a: float, b: float, poisson: float) -> Floats:
    """r N_r / (E t) at r (n,) per (w')^2 / 2 at s (q,), with u(a) = 0 and N_r(b) = 0."""
    low, high = np.minimum(r[:, None], s), np.maximum(r[:, None], s)
    c = a**2 * (1 - poisson) / (1 + poisson)
    return (low + c / low) * (b**2 / high - high) / (2 * (b**2 + c))


def _gauss(a: float, radii: Floats) -> tuple[Floats, Floats]:
    """Points and weights in every interval from the clamp radius out."""
    bounds = np.concatenate([[a], radii])
    half, middle = np.diff(bounds) / 2, (bounds[:-1] + bounds[1:]) / 2
    return (middle[:, None] + half[:, None] * _ROOTS).ravel(), np.outer(half, _WEIGHTS).ravel()


def group_shims(shims: Sequence[tuple[float, ...]]) -> list[Group]:
    """Merge neighbours of equal diameter; sizes are halved to radii, mm."""
    groups: list[Group] = []
    for number, (outer, t, *rest) in enumerate(shims):
        hole = rest[0] / 2 if rest else 0.0
        last = groups[-1] if groups else None
        if last and not hole and not last.hole and np.isclose(last.edge, outer / 2, rtol=1e-9):
            numbers, thickness = (*last.numbers, number), (*last.thickness, t)
            groups[-1] = Group(last.edge, 0.0, numbers, thickness)
        else:
            groups.append(Group(outer / 2, hole, (number,), (t,)))
    return groups


def _radii(a: float, fixed: Sequence[float], spacing: float) -> Floats:
    """Sorted radii beyond the clamp: all fixed ones, and more so that none are far apart."""
    span = max(fixed) - a
    kept = [a]
    for r in sorted(fixed):
        if r - kept[-1] > SAME * span:
            kept.append(r)
    pieces = [
        np.linspace(low, high, int(np.ceil((high - low) / spacing - 1e-9)) + 1)[1:]
        for low, high in pairwise(kept)
    ]
    return np.concatenate(pieces)


def _plate(
    group: Group,
    start: int,
    a: float,
    radii: Floats,
    port: tuple[float, float],
    youngs: float,
    poisson: float,
) -> Plate:
    b = group.edge
    rigidity = youngs * group.cubed / (12 * (1 - poisson**2))
    points, weight = _gauss(a, radii)
    places = np.concatenate([[a], radii])
    w, _, moment = ring_responses(places, radii, a, b, poisson)
    _, turn, _ = ring_responses(points, radii, a, b, poisson)
    unit = np.asarray(np.linalg.inv(w[1:]), dtype=np.float64)
    under = (points > port[0]) & (points < port[1])
    area = 2 * np.pi * points[under] * weight[under]
    pressed, _, pressed_moment = ring_responses(places, points[under], a, b, poisson)
    stretching = youngs * group.total
    return Plate(
        start,
        rigidity * unit,
        turn @ unit,
        weight,
        stretching * _membrane(points, points, a, b, poisson),
        moment,
        stretching * _membrane(places, points, a, b, poisson) / places[:, None],
        (pressed @ area)[1:] / rigidity,
        pressed_moment @ area,
    )


def _contacts(groups: list[Group], radii: Floats) -> Iterator[tuple[int, int, int, float]]:
    """(front group, back group, radius index, gap) of every pair that may touch."""
    for k in range(radii.size):
        front, gap = -1, 0.0
        for g, group in enumerate(groups):
            reaches = k <= _at(radii, group.edge) and radii[0] <= group.edge
            if group.hole:
                gap -= group.total if reaches and k >= _at(radii, group.hole) else 0.0
            elif not reaches:
                gap += group.total
            else:
                if front >= 0:
                    yield front, g, k, gap
                front, gap = g, 0.0


def _at(radii: Floats, r: float) -> int:
    return int(np.argmin(np.abs(radii - r)))


def assemble(
    shims: Sequence[tuple[float, ...]],
    a: float,
    port: tuple[float, float],
    seat: tuple[float, float] | None,
    youngs: float,
    poisson: float,
    spring: tuple[float, float, float] | None,
    pieces: int,
) -> Assembly:
    """Plates, contacts and loads of a stack; radii in mm, ``seat`` radius and height, ``spring``
    radius, N/mm and N."""
    groups = group_shims(shims)
    widest = max(group.edge for group in groups if not group.hole)
    fixed = [group.edge for group in groups] + [group.hole for group in groups] + list(port)
    fixed += [seat[0]] if seat else []
    fixed += [min(spring[0], widest)] if spring else []
    radii = _radii(a, [r for r in fixed if a < r <= widest], (widest - a) / pieces)
    plates: list[Plate | None] = []
    start = 0
    for group in groups:
        if group.hole or group.edge <= a * (1 + 1e-9):
            plates.append(None)
            continue
        own = radii[: _at(radii, group.edge) + 1]
        under = port if start == 0 else (0.0, 0.0)
        plates.append(_plate(group, start, a, own, under, youngs, poisson))
        start += own.size
    bending = block_diag(*(plate.bending for plate in plates if plate))
    load, held = np.zeros(start), np.zeros(start)
    face = _of(plates, 0)
    load[: face.pressed.size] = face.bending @ face.pressed
    if spring:
        node = _at(radii, spring[0])
        rear = [plate.start for plate in plates if plate and plate.pressed.size > node][-1] + node
        bending[rear, rear] += spring[1]
        held[rear] = spring[2]
    contact, gap = _clearances(groups, plates, radii, seat, start)
    return Assembly(radii, groups, plates, bending, load, held, contact, gap)


def _clearances(
    groups: list[Group],
    plates: list[Plate | None],
    radii: Floats,
    seat: tuple[float, float] | None,
    size: int,
) -> tuple[Floats, Floats]:
    """Rows (c, s) that turn deflections into clearances, and the clearances (c,) at rest, mm."""
    rows, gaps = [], []
    for front, back, k, gap in _contacts(groups, radii):
        row = np.zeros(size)
        row[_of(plates, front).start + k], row[_of(plates, back).start + k] = -1.0, 1.0
        rows.append(row)
        gaps.append(gap)
    if seat:
        rows.append(np.eye(size)[_at(radii, seat[0])])
        gaps.append(-seat[1])
    return np.array(rows).reshape(-1, size), np.array(gaps)


def _of(plates: list[Plate | None], number: int) -> Plate:
    plate = plates[number]
    assert plate is not None, "only plates bear load"
    return plate


def energy(
    stack: Assembly, w: Floats, pressure: float, stretched: bool
) -> tuple[float, Floats, Floats]:
    """Energy N mm, its gradient N (s,) and Hessian N/mm (s, s) at the deflections w (s,)."""
    force = stack.bending @ w
    value = 0.5 * float(w @ force) + float((stack.held - pressure * stack.load) @ w)
    gradient, hessian = force + stack.held - pressure * stack.load, stack.bending.copy()
    for plate in stack.plates if stretched else []:
        if plate is None:
            continue
        own = slice(plate.start, plate.start + plate.pressed.size)
        turn = plate.slope @ w[own]
        stretch = plate.weight * turn**2 / 2
        pull = plate.membrane @ stretch
        value += np.pi * float(stretch @ pull)
        gradient[own] += 2 * np.pi * plate.slope.T @ (plate.weight * pull * turn)
        carried = plate.slope * (plate.weight * turn)[:, None]
        hessian[own, own] += (
            2
            * np.pi
            * (
                plate.slope.T @ (plate.slope * (plate.weight * pull)[:, None])
                + carried.T @ plate.membrane @ carried
            )
        )
    return value, gradient, hessian


def _step(stack: Assembly, w: Floats, gradient: Floats, hessian: Floats) -> tuple[Floats, Floats]:
    """Newton step that keeps every clearance at 0 or more, and its contact forces (c,)."""
    factor = cho_factor(hessian)
    free = -cho_solve(factor, gradient)
    if not stack.gap.size:
        return free, np.zeros(0)
    answer = cho_solve(factor, stack.contact.T)  # deflections under a unit of each contact force
    flex = stack.contact @ answer
    scale = 1.0 / np.sqrt(np.diag(flex))
    root = cholesky(flex * np.outer(scale, scale), lower=True)
    overlap = -(stack.gap + stack.contact @ (w + free))
    target = solve_triangular(root, scale * overlap, lower=True)
    size = float(np.linalg.norm(target)) or 1.0
    force = nnls(root.T, target / size, maxiter=30 * target.size)[0] * size * scale
    return free + answer @ force, force


def _settle(stack: Assembly, w: Floats, pressure: float, stretched: bool) -> tuple[Floats, Floats]:
    """Deflections (s,) and contact forces (c,) in equilibrium, from the shape w."""
    for number in range(MOST_STEPS):
        value, gradient, hessian = energy(stack, w, pressure, stretched)
        step, force = _step(stack, w, gradient, hessian)
        length = 1.0
        # The first step may start from shims that overlap; every later one only goes downhill.
        while number and length > 1e-6:
            if energy(stack, w + length * step, pressure, stretched)[0] <= value + 1e-12 * abs(
                value
            ):
                break
            length /= 2
        w = w + length * step
        span = float(stack.radii[-1])
        if np.max(np.abs(step)) <= RELATIVE_TOLERANCE * (np.max(np.abs(w)) + 1e-9 * span):
            return w, force
    last = float(np.max(np.abs(step)))
    raise ArithmeticError(
        f"no equilibrium at {pressure:g} MPa: step {MOST_STEPS} was still {last:g} mm"
    )


def _per_shim(
    stack: Assembly, w: Floats, pressure: float, stretched: bool
) -> tuple[Floats, Floats]:
    """Clamp moment N and peak stress MPa of every shim: within a group, bending goes with t^3."""
    count = sum(len(group.numbers) for group in stack.groups)
    moments, stress = np.zeros(count), np.zeros(count)
    for group, plate in zip(stack.groups, stack.plates, strict=True):
        if plate is None:
            continue
        own = w[plate.start : plate.start + plate.pressed.size]
        ring = plate.bending @ (own - pressure * plate.pressed)
        moment = pressure * plate.pressed_moment + plate.ring_moment @ ring
        stretch = plate.weight * (plate.slope @ own) ** 2 / 2
        pull = plate.ring_membrane @ stretch * (1.0 if stretched else 0.0)
        for shim, t in zip(group.numbers, group.thickness, strict=True):
            moments[shim] = moment[0] * t**3 / group.cubed
            bent = 6 * np.abs(moment) * t / group.cubed
            stress[shim] = np.max(np.abs(pull) / group.total + bent)
    return moments, stress


def reference_deflect(
    shims: Sequence[tuple[float, ...]],
    clamp_mm: float,
    port_inner_mm: float,
    port_outer_mm: float,
    pressures_mpa: ArrayLike,
    seat_mm: float | None = None,
    seat_height_mm: float = 0.0,
    youngs_mpa: float = 206000.0,
    poisson: float = 0.3,
    stretched: bool = True,
    back_spring: tuple[float, float, float] | None = None,
    pieces: int = 12,
) -> ReferenceDeflection:
    """The question of :func:`optimiser.mechanics.deflect`, answered slowly; arguments as there.

    ``stretched`` False is its `linear` fidelity; ``back_spring`` ring diameter mm, rate N/mm and
    preload N; ``pieces`` least number of intervals between the clamp and the widest edge.
    Arguments are taken as checked. Raises ArithmeticError where no equilibrium is found.
    """
    a = clamp_mm / 2
    spring = (back_spring[0] / 2, *back_spring[1:]) if back_spring else None
    seat = (seat_mm / 2, seat_height_mm) if seat_mm is not None else None
    port = (port_inner_mm / 2, port_outer_mm / 2)
    stack = assemble(shims, a, port, seat, youngs_mpa, poisson, spring, pieces)
    height = seat_height_mm if seat else 0.0
    face = _of(stack.plates, 0).pressed.size - 1
    rest = min(_at(stack.radii, seat[0] if seat else port[1]), face)
    rows = []
    for pressure in np.atleast_1d(np.asarray(pressures_mpa, dtype=float)):
        w, force = _settle(stack, np.zeros(stack.load.size), pressure, stretched)
        moments, stress = _per_shim(stack, w, pressure, stretched)
        clear = stack.gap + stack.contact @ w
        rows.append((w[face], max(0.0, w[rest] - height), moments, stress, force, clear))
    return ReferenceDeflection(*(np.array(column) for column in zip(*rows, strict=True)))
