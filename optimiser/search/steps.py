"""Neighbouring sizes: the next thickness, the next diameter."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from optimiser.search.sizes import Floats, Ints
from optimiser.search.space import Mask, Space


@dataclass(frozen=True, eq=False)
class Steps:
    """Neighbouring sizes, each (sizes,); a size without such a neighbour names itself."""

    thicker: Ints
    thinner: Ints
    wider: Ints
    narrower: Ints

    @classmethod
    def of(cls, space: Space) -> "Steps":
        """Next thickness in the same diameter; most alike thickness in the next diameter."""
        outer, thick = space.diameter, space.sizes.thickness_mm
        return cls(
            thicker=_next_size(outer, thick, lambda d, t: (d == 0) & (t > 0)),
            thinner=_next_size(outer, thick, lambda d, t: (d == 0) & (t < 0)),
            wider=_next_size(outer, thick, lambda d, t: d == -1),
            narrower=_next_size(outer, thick, lambda d, t: d == 1),
        )

    def around(self) -> Ints:
        """(4, sizes) all neighbours."""
        return np.stack([self.thicker, self.thinner, self.wider, self.narrower])


def _next_size(outer: Ints, thick: Floats, relation: Callable[[Ints, Floats], Mask]) -> Ints:
    apart = outer[None, :] - outer[:, None]
    more = thick[None, :] - thick[:, None]
    distance = np.where(relation(apart, more), np.abs(more), np.inf)
    size = np.arange(len(outer))
    if len(size) == 0:
        return size
    best = np.argmin(distance, axis=1)
    return np.where(np.isfinite(distance[size, best]), best, size).astype(np.int64)
