"""Many samples of a loop to one curve: means in bands of velocity, and the loop's width there."""

from typing import NamedTuple

import numpy as np

from optimiser.hydraulics.lift import Floats

#: Bands a stroke is averaged in, and the least number of samples one needs to count.
BANDS = 24
LEAST_IN_BAND = 3
#: Slower than this share of the highest velocity, stick and reversal blur the force.
SLOWEST_SHARE = 0.05


class BandMeans(NamedTuple):
    """Means of the samples in each velocity band, all (k,); NaN where there are none.

    ``velocity`` and ``force`` over all samples; ``rising`` and ``falling`` force while the speed
    grows and while it drops; ``samples`` how many.
    """

    velocity: Floats
    force: Floats
    rising: Floats
    falling: Floats
    samples: Floats

    @property
    def centre(self) -> Floats:
        """Force (k,) midway between both branches where both are there, else over all samples."""
        middle = 0.5 * (self.rising + self.falling)
        return np.where(np.isfinite(middle), middle, self.force)

    @property
    def hysteresis(self) -> Floats:
        """Force while the speed grows less that while it drops (k,)."""
        return self.rising - self.falling


def band_means(
    velocity: Floats, force: Floats, gain: Floats, low: Floats, high: Floats
) -> BandMeans:
    """Means over the samples with ``low`` < velocity < ``high`` (k,) of each band.

    ``velocity`` and ``force`` (n,) in any unit; ``gain`` (n,): change of speed, its sign tells the
    branch. Bands may overlap.
    """
    rows = []
    for start, end in zip(low, high, strict=True):
        inside = (velocity > start) & (velocity < end)
        rows.append(
            (
                _mean(velocity[inside]),
                _mean(force[inside]),
                _mean(force[inside & (gain > 0.0)]),
                _mean(force[inside & (gain < 0.0)]),
                float(inside.sum()),
            )
        )
    return BandMeans(*np.array(rows).T)


def _mean(values: Floats) -> float:
    return float(values.mean()) if values.size else float("nan")


def speed_bands(fastest: float, count: int = BANDS) -> tuple[Floats, Floats]:
    """Lower and upper ends (count,) of bands up to ``fastest``, narrow where it is slow."""
    edges = np.linspace(np.sqrt(SLOWEST_SHARE), 1.0, count + 1) ** 2 * fastest
    edges[-1] *= 1.0 + 1e-9
    return edges[:-1], edges[1:]


def stroke_means(speed: Floats, force: Floats, gain: Floats) -> BandMeans:
    """One stroke's samples (n,) averaged in bands of speed; thinly filled bands are left out."""
    means = band_means(speed, force, gain, *speed_bands(float(speed.max())))
    kept = means.samples >= LEAST_IN_BAND
    return BandMeans(*(column[kept] for column in means))
