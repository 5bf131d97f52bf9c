"""One stack under pressure, at the fidelity asked for. mm, N and MPa at this door, SI behind it."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from optimiser.faults import BadInput
from optimiser.mechanics.assembly import assemble
from optimiser.mechanics.equilibrium import bending_moments, membrane_forces, shapes
from optimiser.mechanics.layout import Floats, Ints, group_shims, nearest
from optimiser.mechanics.quick import Setting, advance, bench, lay_out, layers_of, profile
from optimiser.mechanics.tables import tables_for

Fidelity = Literal["linear", "search", "reported"]
FIDELITIES = ("linear", "search", "reported")

#: Least number of intervals between the clamp and the widest edge at the `reported` fidelity.
PIECES = 12
#: Beyond this edge rise, in thicknesses of the face shim, waves may form around the edge.
RISE_LIMIT = 2.0
#: Largest step between pressures, as a ratio, from which the next one is reached safely.
_LARGEST_STEP = 4.0
#: Relative change of the face edge's rise at which the `search` fidelity is settled.
SETTLED = 1e-3


class BackSpringForce(NamedTuple):
    """A coil spring pressing the back of the stack at a ring."""

    ring_mm: float
    rate_n_mm: float
    preload_n: float


@dataclass(frozen=True)
class Deflection:
    """What p pressures do to a stack of n shims (face first, without the clamp shim).

    ``edge_deflection_mm`` (p,): mid-plane rise of the face shim's edge above the clamp plane;
    ``seat_lift_mm`` (p,): rise above the seat, 0 while closed (without a seat: rise at the port
    ring's outer edge); ``clamp_moment_n`` (p, n): radial moment at the clamp, N mm/mm;
    ``peak_stress_mpa`` (p, n): largest membrane + bending stress of each shim; ``peak_at_mm`` (p,
    n): its diameter; ``rise_thicknesses`` (p,): edge rise over the face shim's own thickness, the
    largest of all shims that reach it; ``outside_model`` (p,): the rise is beyond what the model
    was checked for.
    """

    pressure_mpa: Floats
    edge_deflection_mm: Floats
    seat_lift_mm: Floats
    clamp_moment_n: Floats
    peak_stress_mpa: Floats
    peak_at_mm: Floats
    rise_thicknesses: Floats
    outside_model: np.ndarray


class _Pressed(NamedTuple):
    """A checked question in SI units."""

    outer: Floats
    thickness: Floats
    hole: Floats
    clamp: float
    port: tuple[float, float]
    seat: float
    seat_height: float
    spring: tuple[float, float, float]
    youngs: float
    poisson: float


class _Profiles(NamedTuple):
    """Solution over p pressures, m groups and k radii (clamp first), SI."""

    edge: Floats  # (p,)
    seat: Floats  # (p,) rise above the seat
    radii: Floats  # (k,)
    moments: Floats  # (p, m, k) N
    pulls: Floats  # (p, m, k) N/m


def deflect(
    shims: Sequence[tuple[float, ...]],
    clamp_mm: float,
    port_inner_mm: float,
    port_outer_mm: float,
    pressures_mpa: ArrayLike,
    seat_mm: float | None = None,
    seat_height_mm: float = 0.0,
    youngs_mpa: float = 206000.0,
    poisson: float = 0.3,
    fidelity: Fidelity = "reported",
    back_spring: BackSpringForce | None = None,
) -> Deflection:
    """Lift, moments and stress of a stack under uniform pressure over the port ring.

    ``shims``: ``(outer_mm, thickness_mm)`` face first, or ``(outer_mm, thickness_mm, inner_mm)``
    for a ring shim whose hole is wider than the clamp; a shim no wider than the clamp only fills
    height. ``clamp_mm`` diameter of the clamp shim; ``port_inner_mm``, ``port_outer_mm``
    diameters of the pressed ring; ``pressures_mpa`` (p,) in any order; ``seat_mm`` diameter of
    the seat, raised by ``seat_height_mm`` above the clamp plane (None: nothing to rest on);
    ``fidelity`` "linear" (small deflections), "search" (stretched plates, explicit) or "reported"
    (stretched plates, fine). Raises BadInput. Model and sources: see equilibrium.py and quick.py.
    """
    pressures = np.atleast_1d(np.asarray(pressures_mpa, dtype=float))
    faults = _faults(shims, clamp_mm, port_inner_mm, port_outer_mm, pressures)
    if fidelity not in FIDELITIES:
        faults.append(f"fidelity is '{fidelity}'; allowed: {', '.join(FIDELITIES)}")
    if seat_mm is not None and not clamp_mm < seat_mm <= shims[0][0]:
        faults.append(
            f"seat_mm is {seat_mm:g}; it must lie between the clamp and the face shim's edge"
        )
    if not np.isfinite(seat_height_mm):
        faults.append(f"seat_height_mm is {seat_height_mm}; it must be a finite number")
    if not (0.0 < youngs_mpa < np.inf and 0.0 <= poisson < 0.5):
        faults.append("youngs_mpa must be finite and above 0, poisson from 0 to below 0.5")
    if back_spring is not None:
        faults += _spring_faults(back_spring, clamp_mm)
    if faults:
        raise BadInput(faults)
    question = _Pressed(
        np.array([s[0] for s in shims]) * 0.5e-3,
        np.array([s[1] for s in shims]) * 1e-3,
        np.array([s[2] if len(s) > 2 else 0.0 for s in shims]) * 0.5e-3,
        clamp_mm * 0.5e-3,
        (port_inner_mm * 0.5e-3, port_outer_mm * 0.5e-3),
        0.0 if seat_mm is None else seat_mm * 0.5e-3,
        seat_height_mm * 1e-3 if seat_mm is not None else 0.0,
        _spring(back_spring),
        youngs_mpa * 1e6,
        poisson,
    )
    return _answer(question, pressures * 1e6, fidelity)


def _spring_faults(spring: BackSpringForce, clamp_mm: float) -> list[str]:
    if not np.all(np.isfinite(spring)):
        return ["the back spring's ring, rate and preload must be finite numbers"]
    faults = []
    if spring.ring_mm <= clamp_mm:
        faults.append(f"the back spring's ring must be wider than the clamp, {clamp_mm:g} mm")
    if spring.rate_n_mm < 0.0 or spring.preload_n < 0.0:
        faults.append("the back spring's rate and preload must be 0 or more")
    return faults


def _spring(spring: BackSpringForce | None) -> tuple[float, float, float]:
    if spring is None:
        return (0.0, 0.0, 0.0)
    return (spring.ring_mm * 0.5e-3, spring.rate_n_mm * 1e3, spring.preload_n)


def _faults(
    shims: Sequence[tuple[float, ...]], clamp: float, inner: float, outer: float, pressures: Floats
) -> list[str]:
    if not len(shims):
        return ["the stack is empty: it needs at least a face shim"]
    faults = []
    for number, shim in enumerate(shims, start=1):
        if not 2 <= len(shim) <= 3 or not all(np.isfinite(v) and v > 0 for v in shim):
            faults.append(f"shim {number}: (outer_mm, thickness_mm[, inner_mm]), all above 0")
        elif len(shim) == 3 and not clamp < shim[2] < shim[0]:
            faults.append(f"shim {number}: a ring's hole lies between the clamp and its own edge")
    if not clamp > 0:
        faults.append(f"clamp_mm is {clamp:g}; it must be above 0")
    if faults:
        return faults
    if len(shims[0]) == 3 or not shims[0][0] > clamp:
        faults.append("the face shim must be a plain shim wider than the clamp")
    if not 0 < inner < outer or outer <= clamp:
        faults.append(
            "the port ring needs 0 < port_inner_mm < port_outer_mm and must pass the clamp"
        )
    if pressures.ndim != 1 or not pressures.size or not np.all(np.isfinite(pressures)):
        faults.append("pressures_mpa must be a list of finite numbers")
    elif np.any(pressures < 0):
        faults.append("pressures_mpa must be 0 or more: shims do not open backwards")
    return faults


def _ladder(pressures: Floats) -> Floats:
    """Ascending pressures, with steps in between where two are far apart."""
    wanted = np.unique(pressures)
    steps = [wanted[0]]
    for high in wanted[1:]:
        low = steps[-1]
        if low > 0.0 and high / low > _LARGEST_STEP:
            count = int(np.ceil(np.log(high / low) / np.log(_LARGEST_STEP)))
            steps.extend(low * (high / low) ** (np.arange(1, count) / count))
        steps.append(high)
    return np.asarray(steps)


def _answer(question: _Pressed, pressures: Floats, fidelity: Fidelity) -> Deflection:
    ladder = _ladder(pressures)
    pick = np.searchsorted(ladder, pressures)
    groups, member = group_shims(question.outer, question.thickness, question.hole)
    if fidelity == "search":
        found = _quick(question, groups, ladder)
    else:
        found = _fine(question, groups, ladder, fidelity == "reported")
    clamp_moments, stress, places = _per_shim(question, groups, member, found)
    rise = found.edge[pick] / question.thickness[0]
    open_by = np.where(found.seat[pick] > 1e-12 * question.outer[0], found.seat[pick], 0.0)
    return Deflection(
        pressures * 1e-6,
        found.edge[pick] * 1e3,
        open_by * 1e3,
        clamp_moments[pick],
        stress[pick] * 1e-6,
        places[pick] * 2e3,
        rise,
        rise > RISE_LIMIT,
    )


def _per_shim(
    question: _Pressed, groups: Floats, member: Ints, found: _Profiles
) -> tuple[Floats, Floats, Floats]:
    """Clamp moment N, peak stress Pa and its radius m, each (p, n): a shim carries t^3 of its
    group's bending and t of its membrane force."""
    shape = (found.edge.size, member.size)
    moments, stress, places = np.zeros(shape), np.zeros(shape), np.full(shape, question.clamp)
    for shim, group in enumerate(member):
        if group < 0:
            continue
        t = question.thickness[shim]
        moments[:, shim] = found.moments[:, group, 0] * t**3 / groups[group, 2]
        profile = (
            np.abs(found.pulls[:, group]) / groups[group, 1]
            + 6.0 * np.abs(found.moments[:, group]) * t / groups[group, 2]
        )
        peak = np.argmax(profile, axis=1)
        stress[:, shim] = np.take_along_axis(profile, peak[:, None], axis=1)[:, 0]
        places[:, shim] = found.radii[peak]
    return moments, stress, places


def _fine(question: _Pressed, groups: Floats, ladder: Floats, stretched: bool) -> _Profiles:
    seat = np.array([question.seat, question.seat_height])
    model = assemble(
        groups, question.clamp, np.array(question.port), seat, np.array(question.spring),
        question.youngs, question.poisson, PIECES,
    )  # fmt: skip
    lifts, steps = shapes(model, ladder, stretched)
    if np.any(steps < 0):
        raise ArithmeticError(
            f"no equilibrium at {ladder[steps < 0][0]:g} Pa after the allowed Newton steps"
        )
    moments = bending_moments(model, lifts, ladder)
    pulls = membrane_forces(model, lifts) if stretched else np.zeros_like(moments)
    rest = question.seat if question.seat > 0.0 else min(question.port[1], question.outer[0])
    seat_rise = lifts[:, nearest(model.radii, rest)] - question.seat_height
    radii = np.concatenate([[question.clamp], model.radii])
    return _Profiles(lifts[:, model.held[0] - 1], seat_rise, radii, moments, pulls)


def _quick(question: _Pressed, groups: Floats, ladder: Floats) -> _Profiles:
    plates = groups[(groups[:, 4] == 0.0) & (groups[:, 0] > question.clamp * (1 + 1e-9))]
    edges = np.unique(np.round(plates[:, 0], 9))
    rings = groups[groups[:, 4] > 0.0]
    holes = np.concatenate([rings[:, 4], rings[:, 0]])
    rest = question.seat if question.seat > 0.0 else min(question.port[1], question.outer[0])
    tables = tables_for(
        edges, holes, question.clamp, question.port, rest, question.spring[0], question.poisson
    )
    layers = layers_of(tables, groups)
    setting = Setting(
        question.youngs,
        question.seat_height,
        question.spring[1],
        question.spring[2],
        SETTLED,
        question.seat > 0.0,
    )
    b = bench(layers.plate.size, tables.nodes.size)
    lay_out(tables, layers, setting, b)
    found = []
    ahead = 1.0
    for p in range(ladder.size):
        rounds, ahead = advance(tables, layers, setting, ladder, p, ahead, b)
        if rounds < 0:
            raise ArithmeticError(f"the shims did not settle at {ladder[p]:g} Pa")
        found.append(profile(tables, layers, setting, b, ladder[p]))
    lift, moments, pulls = (np.stack(part) for part in zip(*found, strict=True))
    face = tables.edge_node[layers.plate[0]] + 1
    seat_rise = lift[:, 0, tables.seat + 1] - question.seat_height
    radii = np.concatenate([[question.clamp], tables.nodes])
    return _Profiles(lift[:, 0, face], seat_rise, radii, moments, pulls)
