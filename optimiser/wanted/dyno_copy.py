"""A target that copies the feel of a damper measured on a dyno."""

import numpy as np
from numpy.typing import ArrayLike

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.wanted.arrays import Floats, positive_faults, read_only
from optimiser.wanted.target import Target

_LEAST_PER_BIN = 3


def copied(
    velocity_m_s: ArrayLike,
    force_n: ArrayLike,
    *,
    direction: Direction,
    static_force_n: float = 0.0,
    points: int = 12,
    origin: str = "copy of a dyno run",
) -> Target:
    """Target from a measured table of one direction, in any order, repeats allowed.

    ``velocity_m_s`` (n,) m/s and ``force_n`` (n,) N are positive; ``static_force_n`` (gas and
    friction of the measured damper, N) is taken off first. Rows at one velocity become their
    median; more rows than three a point are gathered in bins equally wide in log velocity.
    Noise that lets the force fall is levelled by isotonic regression (pool adjacent violators;
    Barlow, Bartholomew, Bremner and Brunk 1972), and a note says by how much. Raises BadInput.
    """
    velocity, force = read_only(velocity_m_s), read_only(force_n) - static_force_n
    _check(velocity, force, static_force_n)
    speeds, forces = _medians(velocity, force)
    if len(speeds) > _LEAST_PER_BIN * points:
        speeds, forces = _binned(speeds, forces, points)
    level = np.exp(_isotonic(np.log(forces)))
    moved = 100.0 * float(np.max(np.abs(level / forces - 1.0)))
    notes = [f"falling forces were levelled, by up to {moved:.1f} %"] if moved > 0.05 else []
    measured = Target.of(speeds, level, direction=direction, origin=origin, notes=notes)
    return measured.resampled(points)


def _check(velocity: Floats, force: Floats, static_force_n: float) -> None:
    if len(velocity) != len(force):
        raise BadInput(
            f"a dyno run needs as many velocities as forces, not {len(velocity)} and {len(force)}"
        )
    what = "force_n" if static_force_n == 0.0 else f"force_n less {static_force_n:g} N"
    faults = positive_faults(velocity, "velocity_m_s") + positive_faults(force, what)
    if len(np.unique(velocity)) < 2:
        faults.append("a dyno run to copy needs at least 2 different velocities")
    if faults:
        raise BadInput(faults)


def _medians(velocity: Floats, force: Floats) -> tuple[Floats, Floats]:
    """Distinct velocities, sorted, and the median force at each."""
    speeds, where = np.unique(velocity, return_inverse=True)
    order = np.argsort(where, kind="stable")
    parts = np.split(force[order], np.cumsum(np.bincount(where))[:-1])
    return speeds, np.array([np.median(part) for part in parts])


def _binned(velocity: Floats, force: Floats, bins: int) -> tuple[Floats, Floats]:
    """Geometric mean velocity and force of each filled bin of log velocity."""
    edges = np.geomspace(velocity[0], velocity[-1], bins + 1)
    place = np.clip(np.searchsorted(edges, velocity, side="right") - 1, 0, bins - 1)
    filled = [place == number for number in range(bins) if np.any(place == number)]
    means = [(np.log(velocity[rows]).mean(), np.log(force[rows]).mean()) for rows in filled]
    gathered = np.exp(np.array(means))
    return gathered[:, 0], gathered[:, 1]


def _isotonic(values: Floats) -> Floats:
    """The non-decreasing sequence closest to values (n,) in least squares."""
    blocks: list[tuple[float, int]] = []
    for value in values:
        mean, count = float(value), 1
        while blocks and blocks[-1][0] > mean:
            before, size = blocks.pop()
            mean, count = (before * size + mean * count) / (size + count), size + count
        blocks.append((mean, count))
    return np.concatenate([np.full(count, mean) for mean, count in blocks])
