"""Can the damper do it? Each target point against what the damper and the stock allow."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from optimiser.wanted.arrays import Floats, read_only
from optimiser.wanted.target import Target

Reason = Literal[
    "bleed_too_large",
    "ports_too_small",
    "other_parts_too_firm",
    "no_preload",
    "preload_too_small",
    "preload_too_high",
    "no_shim_thick_enough",
    "no_shim_thin_enough",
]
TOLERANCE = 0.005
"""A point counts as outside when it is beyond a limit by more than this share of the limit."""
FAR = 3.0
"""Far outside: every point that counts is beyond its limit by this factor or more."""


@dataclass(frozen=True, eq=False)
class Limits:
    """Forces (n,), N, at the target's n velocities; all include the parts that are not searched."""

    bare_n: Floats
    """No shims at all, needle open: ports and bleed alone, the softest the parts allow."""
    shut_n: Floats
    """Shims that never lift, needle shut: bleed alone, the firmest the parts allow."""
    softest_n: Floats
    """Softest stack that can be built from the stock, needle open."""
    firmest_n: Floats
    """Firmest stack that can be built from the stock, needle shut."""
    others_n: Floats
    """Other valves, friction and gas alone, which no stack changes."""
    preloaded: bool = False
    """The seat stands above the clamp face."""

    @classmethod
    def of(
        cls,
        bare_n: ArrayLike,
        shut_n: ArrayLike,
        softest_n: ArrayLike,
        firmest_n: ArrayLike,
        others_n: ArrayLike | None = None,
        *,
        preloaded: bool = False,
    ) -> "Limits":
        """Limits from anything array-like (n,), N; ``others_n`` left out is 0."""
        bare = read_only(bare_n)
        others = np.zeros_like(bare) if others_n is None else others_n
        return cls(
            bare,
            read_only(shut_n),
            read_only(softest_n),
            read_only(firmest_n),
            read_only(others),
            preloaded,
        )


@dataclass(frozen=True)
class Outside:
    """A target point the damper cannot meet."""

    velocity_m_s: float
    wanted_n: float
    limit_n: float
    reason: Reason
    beyond_percent: float
    """How far the wish is beyond the limit, % of the limit; negative when it is softer."""
    sentence: str


@dataclass(frozen=True)
class Feasibility:
    """Where the wish lies in the damper's envelope."""

    outside: tuple[Outside, ...]
    points: int
    """Number of target points that count (weight above 0)."""

    @property
    def reachable(self) -> bool:
        """Every point that counts lies within the envelope."""
        return not self.outside

    @property
    def far_outside(self) -> str | None:
        """A sentence when all points are beyond their limits by ``FAR`` or more, else None."""
        factors = [max(p.wanted_n / p.limit_n, p.limit_n / p.wanted_n) for p in self.outside]
        if len(factors) < self.points or not factors or min(factors) < FAR:
            return None
        return (
            f"the target is far outside what this damper can do: every point is beyond its limit "
            f"by {min(factors):.1f} times or more; check its unit (N) and the circuit"
        )


def feasibility(target: Target, limits: Limits) -> Feasibility:
    """Compare the points that count with the limits, and say which part stops each one.

    Too firm: beyond the shut limit it is the bleed; else the stack opens too easily, which is
    the preload's doing when a firmer velocity further up can be reached (the shape is wrong, not
    the stiffness), and the stock's otherwise. Too soft: below the bare limit it is the ports,
    or the parts that are not searched; else a preloaded seat when a higher velocity can be
    reached, and the stock's thinnest shims otherwise. Raises ValueError for unequal lengths.
    """
    arrays = (limits.bare_n, limits.shut_n, limits.softest_n, limits.firmest_n, limits.others_n)
    if any(array.shape != target.force_n.shape for array in arrays):
        raise ValueError(f"every limit needs {len(target)} forces, one a target point")
    found = (_judged(target, limits, int(i)) for i in np.flatnonzero(target.weight > 0.0))
    return Feasibility(tuple(p for p in found if p), int(np.count_nonzero(target.weight)))


def _judged(target: Target, limits: Limits, index: int) -> Outside | None:
    wanted = target.force_n[index]
    if wanted > limits.firmest_n[index] * (1.0 + TOLERANCE):
        reason, limit = _too_firm(target, limits, index)
    elif wanted < limits.softest_n[index] * (1.0 - TOLERANCE):
        reason, limit = _too_soft(target, limits, index)
    else:
        return None
    velocity, force, most = float(target.velocity_m_s[index]), float(wanted), float(limit[index])
    percent = 100.0 * (force / most - 1.0)
    sentence = (
        f"at {velocity:.3g} m/s {force:.0f} N is wanted: {_WORDS[reason].format(limit=most)} "
        f"({abs(percent):.0f} % {'more' if percent > 0.0 else 'less'} is asked)"
    )
    return Outside(velocity, force, most, reason, percent, sentence)


def _too_firm(target: Target, limits: Limits, index: int) -> tuple[Reason, Floats]:
    if target.force_n[index] > limits.shut_n[index] * (1.0 + TOLERANCE):
        return "bleed_too_large", limits.shut_n
    within = target.force_n <= limits.firmest_n * (1.0 + TOLERANCE)
    if within[index + 1 :].any():
        return ("preload_too_small" if limits.preloaded else "no_preload"), limits.firmest_n
    return "no_shim_thick_enough", limits.firmest_n


def _too_soft(target: Target, limits: Limits, index: int) -> tuple[Reason, Floats]:
    wanted = target.force_n[index]
    if wanted < limits.others_n[index] * (1.0 - TOLERANCE):
        return "other_parts_too_firm", limits.others_n
    if wanted < limits.bare_n[index] * (1.0 - TOLERANCE):
        return "ports_too_small", limits.bare_n
    within = target.force_n >= limits.softest_n * (1.0 - TOLERANCE)
    if limits.preloaded and within[index + 1 :].any():
        return "preload_too_high", limits.softest_n
    return "no_shim_thin_enough", limits.softest_n


_WORDS: dict[Reason, str] = {
    "bleed_too_large": "the bleed is too large; with the shims shut and the needle closed it "
    "still lets all the oil through at {limit:.0f} N",
    "ports_too_small": "the ports are too small; without a single shim the damper already makes "
    "{limit:.0f} N",
    "other_parts_too_firm": "the other valves, friction and gas alone make {limit:.0f} N",
    "no_preload": "the seat has no preload; the firmest stack from this stock is already open and "
    "makes {limit:.0f} N, though it is firm enough at higher speed",
    "preload_too_small": "the seat's preload is too small; the firmest stack from this stock makes "
    "{limit:.0f} N here, though it is firm enough at higher speed",
    "preload_too_high": "the seat's preload is too high; the softest stack from this stock opens "
    "late and makes {limit:.0f} N here, though it is soft enough at higher speed",
    "no_shim_thick_enough": "the stock has no shims thick or many enough; its firmest stack makes "
    "{limit:.0f} N",
    "no_shim_thin_enough": "the stock has no shim thin enough; its softest stack makes "
    "{limit:.0f} N",
}
