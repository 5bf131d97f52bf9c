"""Low, mid and high speed: our own plain definition, because no standard gives one.

The target's velocity range is cut into three bands equally wide in log velocity. A target from
0.05 to 1.35 m/s has edges at 0.15 and 0.45 m/s.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from optimiser.wanted.arrays import Floats
from optimiser.wanted.target import Target, rms_percent

BANDS = ("low", "mid", "high")


@dataclass(frozen=True)
class BandErrors:
    """Weighted r.m.s. error of a curve in each band, %; None where no weighted point lies."""

    low_percent: float | None
    mid_percent: float | None
    high_percent: float | None
    low_to_m_s: float
    mid_to_m_s: float


def band_edges_m_s(velocity_m_s: Floats) -> tuple[float, float]:
    """The two velocities, m/s, that part the range of velocity_m_s (n,) in thirds of its log."""
    first, last = float(velocity_m_s[0]), float(velocity_m_s[-1])
    step = (last / first) ** (1.0 / 3.0)
    return first * step, first * step * step


def band_of(velocity_m_s: Floats) -> Floats:
    """Band 0, 1 or 2 (n,) of each of the sorted velocities (n,), m/s; an edge belongs below."""
    first, last = velocity_m_s[0], velocity_m_s[-1]
    place = 3.0 * np.log(velocity_m_s / first) / np.log(last / first)
    return np.asarray(np.clip(np.ceil(place - 1e-9) - 1.0, 0.0, 2.0))


def band_errors(target: Target, force_n: ArrayLike) -> BandErrors:
    """Error of a curve's force_n (n,), N, at the target's velocities, band by band."""
    relative, band = target.relative(force_n), band_of(target.velocity_m_s)
    errors: list[float | None] = []
    for number in range(3):
        counts = (band == number) & (target.weight > 0.0)
        value = rms_percent(relative[counts], target.weight[counts]) if counts.any() else None
        errors.append(value)
    return BandErrors(errors[0], errors[1], errors[2], *band_edges_m_s(target.velocity_m_s))
