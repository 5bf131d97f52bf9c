"""How likely a prediction is: the band around it, and the chance to be near what is wanted."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from optimiser.faults import BadInput
from optimiser.fitting.bands import Bands, force_bands
from optimiser.fitting.uncertainty import Uncertainty
from optimiser.hydraulics.lift import Floats
from optimiser.prediction import Prediction

#: Samples behind a band: the standard error of its edges is then 2 % of its width (normal law).
SAMPLES = 1000
#: Error, % r.m.s., a stack should be within, unless stated.
USUAL_WITHIN = 5.0


@dataclass(frozen=True, eq=False)
class Spread:
    """What bands are drawn from: what is ``known``, ``origin`` (in words, for a report) of that,
    number of ``samples`` and ``seed``."""

    known: Uncertainty
    origin: str
    samples: int = SAMPLES
    seed: int = 0

    def bands(self, seen: Prediction) -> Bands | None:
        """Band around a prediction, at its velocities, which must rise; NaN where the oil is
        locked. None where too many samples leave the model."""
        free = np.isfinite(seen.force_n)
        if not free.any():
            return None
        velocity = seen.velocity_m_s[free]
        try:
            found = force_bands(
                seen.setup, seen.stack, velocity, seen.clicks, self.known, self.samples, self.seed
            )
        except BadInput:  # the prediction itself stands: only its samples cannot be computed
            return None
        return found if free.all() else _widened(found, seen, free)

    @property
    def sentence(self) -> str:
        """What the band is, in one line."""
        return (
            f"5 to 95 %: the middle nine tenths of {self.samples} samples (seed {self.seed}), from "
            f"{self.origin}"
        )


def _widened(found: Bands, seen: Prediction, free: NDArray[np.bool_]) -> Bands:
    """The band at all velocities of the prediction, NaN where it has none."""

    def wide(values: Floats) -> Floats:
        full = np.full((*values.shape[:-1], free.size), np.nan)
        full[..., free] = values
        return full

    return Bands(
        seen.velocity_m_s,
        wide(found.p05_n),
        wide(found.p50_n),
        wide(found.p95_n),
        seen.force_n,
        wide(found.samples_n),
        found.seed,
    )


@dataclass(frozen=True, eq=False)
class Likely:
    """How likely the stacks listed for one direction are: ``bands`` one a stack, at the target's
    velocities, None where it cannot be computed; ``chance`` one a stack, 0 to 1, to be within
    ``within_percent`` (r.m.s. error), 0 without a band."""

    spread: Spread
    within_percent: float
    bands: tuple[Bands | None, ...]
    chance: tuple[float, ...]
