"""Every buildable stack of a space, in chunks; and a count that stops at a cap.

Stacks grow shim by shim from the face, deepest first, so that memory stays bounded and the first
stacks come out at once. A branch that can no longer reach the least height is cut.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from optimiser.search.counts import NONE, Counts, Plans
from optimiser.search.sizes import Floats, Ints
from optimiser.search.space import Mask, Space

_BATCH = 1024


@dataclass
class _Branches:
    """Unfinished stacks; ``last`` is the size laid last in the present stage, -1 for none yet."""

    counts: Counts
    last: Ints

    def __len__(self) -> int:
        return len(self.last)

    def pick(self, rows: slice) -> "_Branches":
        return _Branches(self.counts.pick(rows), self.last[rows])


def every_plan(space: Space) -> Iterator[Plans]:
    """Yield all buildable plans as chunks (rows, width), each plan once."""
    for plans in _walk(space):
        if len(plans):
            yield plans


def count_plans(space: Space, cap: int) -> int:
    """Number of buildable plans, or ``cap`` when there are at least that many."""
    found = 0
    for plans in every_plan(space):
        found += len(plans)
        if found >= cap:
            return cap
    return found


def all_plans(space: Space, cap: int) -> Plans | None:
    """All buildable plans (rows, width), or None when there are more than ``cap``."""
    chunks, found = [np.zeros((0, space.width), dtype=np.int16)], 0
    for plans in every_plan(space):
        found += len(plans)
        if found > cap:
            return None
        chunks.append(plans)
    return np.concatenate(chunks)


def first_plans(space: Space, wanted: int, most_steps: int = 20_000) -> Plans:
    """Up to ``wanted`` buildable plans from different faces, as a reserve; empty if none exists.

    Gives up after ``most_steps`` batches of branches, which only a space whose rules nearly
    contradict each other needs.
    """
    chunks, found = [np.zeros((0, space.width), dtype=np.int16)], 0
    for step, plans in enumerate(_walk(space)):
        chunks.append(plans)
        found += len(plans)
        if found >= wanted or step >= most_steps:
            break
    return np.concatenate(chunks)[:wanted]


def _walk(space: Space) -> Iterator[Plans]:
    if not space.may_face.any() or not space.may_clamp.any():
        return
    waiting = [_roots(space)]
    while waiting:
        branches = waiting.pop()
        yield _finished(space, branches)
        for longer in (_longer(space, branches), _crossed(space, branches)):
            waiting += [longer.pick(slice(i, i + _BATCH)) for i in range(0, len(longer), _BATCH)]


def _roots(space: Space) -> _Branches:
    faces = np.flatnonzero(space.may_face[space.diameter])
    pieces = np.zeros((len(faces), 2, len(space.sizes)), dtype=np.int64)
    pieces[np.arange(len(faces)), 0, faces] = 1
    none = np.full(len(faces), NONE)
    return _Branches(Counts(pieces, none, none.copy()), faces)


def _longer(space: Space, branches: _Branches) -> _Branches:
    """Lay one more shim on the present stage."""
    counts, last = branches.counts, branches.last
    size = np.arange(len(space.sizes))
    outer, crossed = space.sizes.outer_mm, counts.two_stage
    allowed = _room(space, counts) & (size >= last[:, None])
    face = space.widest(counts.pieces[:, 0])
    short = ~crossed & (space.face_pieces(counts) < space.rules.face_min)
    allowed &= ~short[:, None] | (space.diameter == face[:, None])
    above = (space.diameter >= face[:, None]) & (outer > outer[counts.crossover][:, None])
    allowed &= ~(crossed & (last == NONE))[:, None] | above
    row, chosen = np.nonzero(allowed)
    grown = counts.pick(row)
    grown.pieces[np.arange(len(row)), crossed[row].astype(int), chosen] += 1
    return _Branches(grown, chosen)


def _crossed(space: Space, branches: _Branches) -> _Branches:
    """Lay a crossover shim on a finished first stage."""
    counts, last = branches.counts, branches.last
    ready = ~counts.two_stage & (space.face_pieces(counts) >= space.rules.face_min)
    ready &= 2 in space.rules.stages
    narrower = space.diameter > space.diameter[last][:, None]
    row, chosen = np.nonzero(_room(space, counts, spare=2) & narrower & ready[:, None])
    grown = counts.pick(row)
    grown.crossover = chosen
    return _Branches(grown, np.full(len(row), NONE))


def _room(space: Space, counts: Counts, spare: int = 1) -> Mask:
    """(branches, sizes) where one more piece finds stock, slots and height."""
    number, height = space.bending(counts)
    left = space.rules.parts - number - 1
    used = counts.pieces.sum(axis=1)
    crossed = np.flatnonzero(counts.two_stage)
    used[crossed, counts.crossover[crossed]] += 1
    thin = space.sizes.thickness_mm[space.clamp_sizes].min()
    tallest = _tallest(space)[np.maximum(left, 0)] + height
    higher = height[:, None] + space.sizes.thickness_mm
    wide = space.outer_of[space.may_clamp].min() < space.sizes.outer_mm
    return np.asarray(
        (used < space.sizes.quantity)
        & wide
        & (left >= spare)[:, None]
        & (tallest + _thickest(space) >= space.rules.height_min_mm - 1e-7)[:, None]
        & (higher + thin <= space.rules.height_max_mm + 1e-7)
    )


def _thickest(space: Space) -> float:
    return float(space.sizes.thickness_mm.max())


def _tallest(space: Space) -> Floats:
    """Greatest height (mm) that 0, 1, 2 ... more pieces can add."""
    thick = np.repeat(space.sizes.thickness_mm, np.minimum(space.sizes.quantity, space.rules.parts))
    best = np.sort(thick)[::-1][: space.rules.parts]
    padded = np.pad(best, (0, space.rules.parts - len(best)))
    return np.concatenate([[0.0], np.cumsum(padded)])


def _finished(space: Space, branches: _Branches) -> Plans:
    """The branches that are stacks, with every clamp diameter that suits them."""
    counts = branches.counts
    crossed = counts.two_stage
    done = np.where(crossed, branches.last != NONE, 1 in space.rules.stages)
    done &= space.face_pieces(counts) >= space.rules.face_min
    counts = counts.pick(done)
    if len(counts) == 0:
        return np.zeros((0, space.width), dtype=np.int16)
    chunks = []
    for diameter in np.flatnonzero(space.may_clamp):
        suits = counts.pick(space.narrowest(counts) < diameter)
        suits.clamp = space.choose_clamp(suits, np.full(len(suits), diameter)).size
        chunks.append(space.encode(suits.pick(suits.clamp >= 0)))
    return np.concatenate(chunks)
