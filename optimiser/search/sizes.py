"""The shim sizes a search may use, as arrays."""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from optimiser.stack import Stack

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


class StockLine(Protocol):
    """What a search needs to know of one line of a stock list."""

    @property
    def outer_mm(self) -> float:
        """Outer diameter, mm."""

    @property
    def thickness_mm(self) -> float:
        """Nominal thickness, mm."""

    @property
    def real_mm(self) -> float:
        """Thickness to reckon with, mm: measured where it was measured, else nominal."""

    @property
    def quantity(self) -> int:
        """Pieces on the shelf."""


@dataclass(frozen=True, eq=False)
class Sizes:
    """Available sizes, widest first, then thickest first. Every array has shape (sizes,)."""

    outer_mm: Floats
    thickness_mm: Floats  # real thickness, which bends and fills height
    nominal_mm: Floats  # what is written on the bin
    quantity: Ints

    def __len__(self) -> int:
        return len(self.outer_mm)

    @classmethod
    def of(
        cls,
        lines: Iterable[StockLine],
        fitted: Stack | None = None,
        widest_mm: float = np.inf,
    ) -> "Sizes":
        """Collect equal lines into sizes and add the shims of the fitted stack (no ring shims).

        Lines of one outer diameter and nominal thickness (mm) that were measured differently
        stay separate sizes; a fitted shim goes to the one nearest to its nominal thickness.
        Sizes without pieces or wider than ``widest_mm`` are left out.
        """
        pieces: dict[tuple[float, float, float], int] = {}
        for line in lines:
            key = (float(line.outer_mm), float(line.thickness_mm), float(line.real_mm))
            pieces[key] = pieces.get(key, 0) + int(line.quantity)
        for group in fitted.groups if fitted else ():
            if group.shim.inner_mm is None:
                key = _key_of(pieces, group.shim.outer_mm, group.shim.thickness_mm)
                pieces[key] = pieces.get(key, 0) + group.quantity
        kept = [key for key, count in pieces.items() if count > 0 and key[0] <= widest_mm]
        kept.sort(key=lambda key: (-key[0], -key[2], -key[1]))
        table = np.array(kept, dtype=float).reshape(-1, 3)
        counts = np.array([pieces[key] for key in kept], dtype=np.int64)
        return cls(table[:, 0].copy(), table[:, 2].copy(), table[:, 1].copy(), counts)

    def nearest(self, outer_mm: float, nominal_mm: float, tolerance_mm: float = 1e-6) -> int | None:
        """Index of the size with this outer diameter and nominal thickness (mm), or None."""
        same = np.flatnonzero(
            (np.abs(self.outer_mm - outer_mm) < tolerance_mm)
            & (np.abs(self.nominal_mm - nominal_mm) < tolerance_mm)
        )
        if len(same) == 0:
            return None
        return int(same[np.argmin(np.abs(self.thickness_mm[same] - nominal_mm))])


def _key_of(
    pieces: dict[tuple[float, float, float], int], outer: float, nominal: float
) -> tuple[float, float, float]:
    same = [k for k in pieces if abs(k[0] - outer) < 1e-6 and abs(k[1] - nominal) < 1e-6]
    if same:
        return min(same, key=lambda key: (abs(key[2] - nominal), key[2]))
    return (float(outer), float(nominal), float(nominal))
