"""Plans as counts of pieces: the form in which stacks are changed.

A plan is one int16 row: first-stage slots, crossover slot, second-stage slots, clamp slot; every
entry is a size index plus one, 0 is empty. Counts hold how many pieces of each size lie in each
stage, so that canonical order (widest first, thickest first) comes by itself.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Plans = NDArray[np.int16]
Pieces = NDArray[np.int64]
Index = NDArray[np.int64]

NONE = -1


@dataclass
class Counts:
    """``pieces`` has shape (plans, 2, sizes); ``crossover`` and ``clamp`` (plans,), -1 = none."""

    pieces: Pieces
    crossover: Index
    clamp: Index

    def __len__(self) -> int:
        return len(self.clamp)

    def pick(self, rows: NDArray[np.intp] | NDArray[np.bool_] | slice) -> "Counts":
        """A copy of some rows."""
        return Counts(
            self.pieces[rows].copy(), self.crossover[rows].copy(), self.clamp[rows].copy()
        )

    def place(self, rows: NDArray[np.intp] | NDArray[np.bool_], other: "Counts") -> None:
        """Overwrite some rows by those of ``other``."""
        self.pieces[rows] = other.pieces
        self.crossover[rows] = other.crossover
        self.clamp[rows] = other.clamp

    @property
    def two_stage(self) -> NDArray[np.bool_]:
        """(plans,) whether there is a crossover shim."""
        return self.crossover >= 0


def slots(parts: int) -> tuple[int, int]:
    """Number of first-stage and second-stage slots of a plan for at most ``parts`` shims."""
    return parts - 1, max(parts - 3, 0)


def width(parts: int) -> int:
    """Length of a plan."""
    return sum(slots(parts)) + 2


def decode(plans: Plans, sizes: int, parts: int) -> Counts:
    """Counts of (plans, width) rows. Entries beyond the known sizes are taken as empty."""
    first, _ = slots(parts)
    known = np.where((plans > 0) & (plans <= sizes), plans, 0).astype(np.int64)
    count = len(plans)
    stages = (known[:, :first], known[:, first + 1 : -1])
    pieces = np.stack([_histogram(stage, count, sizes) for stage in stages], axis=1)
    return Counts(pieces, known[:, first] - 1, known[:, -1] - 1)


def encode(counts: Counts, parts: int) -> Plans:
    """(plans, width) rows of counts; pieces that find no slot are left out."""
    first, second = slots(parts)
    plans = np.zeros((len(counts), width(parts)), dtype=np.int16)
    _fill(plans[:, :first], counts.pieces[:, 0])
    _fill(plans[:, first + 1 : first + 1 + second], counts.pieces[:, 1])
    plans[:, first] = counts.crossover + 1
    plans[:, -1] = counts.clamp + 1
    return plans


def _histogram(stage: Index, count: int, sizes: int) -> Pieces:
    flat = (np.arange(count)[:, None] * (sizes + 1) + stage).ravel()
    table = np.bincount(flat, minlength=count * (sizes + 1)).reshape(count, sizes + 1)
    return table[:, 1:]


def _fill(target: Plans, pieces: Pieces) -> None:
    row, size = np.nonzero(pieces)
    repeat = pieces[row, size]
    row, size = np.repeat(row, repeat), np.repeat(size, repeat)
    total = pieces.sum(axis=1)
    column = np.arange(len(row)) - (np.cumsum(total) - total)[row]
    fits = column < target.shape[1]
    target[row[fits], column[fits]] = size[fits] + 1
