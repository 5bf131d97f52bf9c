"""The wanted curve, however it was come by: one object for every way to it."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import PchipInterpolator

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.wanted.arrays import Floats, increasing_faults, positive_faults, read_only

LEAST_POINTS = 2
MOST_POINTS = 500


@dataclass(frozen=True)
class Worst:
    """The weighted point a curve misses most."""

    velocity_m_s: float
    percent: float
    """Signed: positive where the curve is above the target."""


@dataclass(frozen=True, eq=False)
class Target:
    """Wanted force over shaft velocity in one direction.

    Compression and rebound are both positive numbers. ``notes`` are plain sentences about how
    the target came about that the user should read.
    """

    velocity_m_s: Floats
    """Shaft velocity (n,), m/s, strictly increasing, above 0."""
    force_n: Floats
    """Force on the shaft (n,), N, above 0."""
    weight: Floats
    """How much each point counts (n,), 0 or more, not all 0."""
    direction: Direction
    origin: str
    """Where it comes from, in words."""
    notes: tuple[str, ...] = ()

    @classmethod
    def of(
        cls,
        velocity_m_s: ArrayLike,
        force_n: ArrayLike,
        weight: ArrayLike | None = None,
        *,
        direction: Direction = "compression",
        origin: str = "points",
        notes: Sequence[str] = (),
    ) -> "Target":
        """Build a target from anything array-like (n,), in m/s and N; weights default to 1.

        Raises BadInput with one sentence a fault.
        """
        velocity = read_only(velocity_m_s)
        given = np.ones_like(velocity) if weight is None else weight
        return cls(velocity, read_only(force_n), read_only(given), direction, origin, tuple(notes))

    def __post_init__(self) -> None:
        faults = _faults_of(self)
        if faults:
            raise BadInput(faults)
        for name in ("velocity_m_s", "force_n", "weight"):
            object.__setattr__(self, name, read_only(getattr(self, name)))

    def __len__(self) -> int:
        return len(self.velocity_m_s)

    def relative(self, force_n: ArrayLike) -> Floats:
        """F / F_target - 1 (n,) for a curve's force_n (n,), N, at the target's velocities."""
        force = np.asarray(force_n, dtype=np.float64)
        if force.shape != self.force_n.shape:
            raise ValueError(f"force_n has shape {force.shape}, not {self.force_n.shape}")
        return force / self.force_n - 1.0

    def error_percent(self, force_n: ArrayLike) -> float:
        """Weighted r.m.s. of F / F_target - 1, %, for force_n (n,), N, at its velocities."""
        return rms_percent(self.relative(force_n), self.weight)

    def worst(self, force_n: ArrayLike) -> Worst:
        """The weighted point with the largest error of force_n (n,), N."""
        relative = self.relative(force_n)
        index = int(np.argmax(np.where(self.weight > 0.0, np.abs(relative), -1.0)))
        return Worst(float(self.velocity_m_s[index]), float(100.0 * relative[index]))

    def force_at(self, velocity_m_s: ArrayLike) -> Floats:
        """Wanted force, N, at velocities (m,), m/s.

        Monotone piecewise cubic (Fritsch and Carlson 1980) of log force over log velocity: exact
        for a power law, never overshoots between points. Raises BadInput outside the range.
        """
        velocity = np.asarray(velocity_m_s, dtype=np.float64)
        low, high = self.velocity_m_s[0], self.velocity_m_s[-1]
        if np.any((velocity < low * (1 - 1e-9)) | (velocity > high * (1 + 1e-9))):
            raise BadInput(f"the target is known from {low:g} to {high:g} m/s only")
        curve = PchipInterpolator(np.log(self.velocity_m_s), np.log(self.force_n))
        return np.asarray(np.exp(curve(np.log(np.clip(velocity, low, high)))))

    def record(self) -> dict[str, object]:
        """The target as plain lists and texts, for JSON."""
        return {
            "direction": self.direction,
            "origin": self.origin,
            "velocity_m_s": self.velocity_m_s.tolist(),
            "force_n": self.force_n.tolist(),
            "weight": self.weight.tolist(),
            "notes": list(self.notes),
        }

    def resampled(self, points: int) -> "Target":
        """The same curve on evenly spaced log velocities, end points kept exactly.

        Forces by ``force_at``, weights linear in log velocity. Raises BadInput for a useless count.
        """
        if not LEAST_POINTS <= points <= MOST_POINTS:
            raise BadInput(
                f"a target can be resampled to {LEAST_POINTS} to {MOST_POINTS} points, not {points}"
            )
        velocity = np.geomspace(self.velocity_m_s[0], self.velocity_m_s[-1], points)
        force = self.force_at(velocity)
        force[[0, -1]] = self.force_n[[0, -1]]
        weight = np.interp(np.log(velocity), np.log(self.velocity_m_s), self.weight)
        if not weight.any():
            raise BadInput(
                f"resampling to {points} points misses every point with a weight; ask for more"
            )
        return Target(velocity, force, weight, self.direction, self.origin, self.notes)


def rms_percent(relative: Floats, weight: Floats) -> float:
    """Weighted root of the mean square, %, of relative errors (n,) with weights (n,)."""
    return float(100.0 * np.sqrt(np.average(relative**2, weights=weight)))


def shape_notes(target: Target) -> list[str]:
    """Plain sentences on what no shim valve can follow: a force that falls with velocity."""
    return [
        f"the wanted force falls from {target.force_n[i]:.0f} N at {target.velocity_m_s[i]:g} m/s "
        f"to {target.force_n[i + 1]:.0f} N at {target.velocity_m_s[i + 1]:g} m/s; "
        "no stack does that"
        for i in np.flatnonzero(np.diff(target.force_n) < 0.0)
    ]


def _faults_of(target: Target) -> list[str]:
    velocity, force, weight = target.velocity_m_s, target.force_n, target.weight
    if not len(velocity) == len(force) == len(weight):
        return [
            f"a target needs as many velocities as forces and weights, not "
            f"{len(velocity)}, {len(force)} and {len(weight)}"
        ]
    if len(velocity) < LEAST_POINTS:
        return [f"a target needs at least {LEAST_POINTS} points, not {len(velocity)}"]
    faults = positive_faults(velocity, "velocity_m_s")
    faults += increasing_faults(velocity, "velocity_m_s")
    faults += positive_faults(force, "force_n")
    usable = np.isfinite(weight) & (weight >= 0.0)
    faults += [
        f"point {index + 1}: weight must be 0 or more, not {weight[index]:g}"
        for index in np.flatnonzero(~usable)
    ]
    if usable.all() and not weight.any():
        faults.append("all weights are 0; at least one point must count")
    if target.direction not in ("compression", "rebound"):
        faults.append(f"direction must be compression or rebound, not {target.direction}")
    return faults
