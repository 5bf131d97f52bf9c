"""How new stacks arise: sampling, crossover and mutation on counts, all rows at once."""

from collections.abc import Callable

import numpy as np

from optimiser.search.counts import NONE, Counts, Plans
from optimiser.search.repair import Random, Repair
from optimiser.search.sizes import Floats, Ints
from optimiser.search.space import Mask, Space
from optimiser.search.steps import Steps

TWO_STAGE_SHARE = 0.5
CROSSED_SHARE = 0.9


def sample(repair: Repair, count: int, rng: Random) -> Plans:
    """Diverse buildable plans (count, width): short to tall, thin to thick, one stage and two."""
    space = repair.space
    sizes, most = space.sizes, space.rules.parts - 1
    if not repair.possible:
        return np.zeros((count, space.width), dtype=np.int16)
    face = rng.choice(np.flatnonzero(space.may_face), size=count)
    clamp = rng.choice(np.flatnonzero(space.may_clamp), size=count)
    number = 1 + _spread(count, rng) * most
    thin, thick = sizes.thickness_mm.min(), sizes.thickness_mm.max()
    liked = thin + rng.random(count) * (thick - thin)
    weight = np.exp(-(((sizes.thickness_mm - liked[:, None]) / (0.3 * (thick - thin) + 1e-9)) ** 2))
    weight = weight * (space.diameter >= face[:, None]) * (space.diameter < clamp[:, None])
    counts = _empty(space, count)
    shared = np.where(rng.random(count) < TWO_STAGE_SHARE, rng.random(count), 1.0)
    limit = np.where(shared < 1, face + rng.random(count) * 0.7 * (clamp - face), clamp)
    first = np.ceil(number * shared)
    _lay(counts.pieces[:, 0], weight * (space.diameter <= limit[:, None]), first, rng)
    _lay(counts.pieces[:, 1], weight, number - first, rng)
    counts.crossover[shared < 1] = _draw_weighted(
        (space.diameter > limit[:, None]) & (space.diameter < clamp[:, None]), 1, rng
    )[shared < 1, 0]
    counts.clamp = np.searchsorted(space.diameter, clamp)
    top = _draw_weighted(weight * (space.diameter == face[:, None]), 1, rng)[:, 0]
    counts.pieces[np.arange(count), 0, top] += 1 + rng.integers(0, 3, count)
    return repair.counts(counts, rng)


def _empty(space: Space, count: int) -> Counts:
    none = np.full(count, NONE)
    pieces = np.zeros((count, 2, len(space.sizes)), dtype=np.int64)
    return Counts(pieces, none, none.copy())


def _spread(count: int, rng: Random) -> Floats:
    """Evenly spread numbers in 0..1 in random order."""
    return np.asarray(rng.permutation((np.arange(count) + rng.random(count)) / max(count, 1)))


def _draw_weighted(weight: Floats | Ints | Mask, draws: int, rng: Random) -> Ints:
    cumulative = np.cumsum(weight, axis=1, dtype=float)
    mark = rng.random((len(weight), draws)) * cumulative[:, -1:]
    found = (cumulative[:, None, :] <= mark[:, :, None]).sum(axis=2)
    last: Ints = np.minimum(found, weight.shape[1] - 1)
    return last


def _lay(pieces: Ints, weight: Floats | Mask, number: Floats, rng: Random) -> None:
    draws = int(np.max(number, initial=1))
    drawn = _draw_weighted(weight, max(draws, 1), rng)
    wanted = np.arange(drawn.shape[1]) < np.floor(number)[:, None]
    row, column = np.nonzero(wanted)
    np.add.at(pieces, (row, drawn[row, column]), 1)


def cross(space: Space, mothers: Plans, fathers: Plans, rng: Random) -> Counts:
    """One child a pair (plans, width): the face side of one parent, the clamp side of the other.

    Half of the pairs are cut at a diameter, the other half between the stages.
    """
    head, tail = space.decode(mothers), space.decode(fathers)
    count, sizes = len(head), len(space.sizes)
    cut = rng.integers(0, sizes + 1, size=count)
    upper = (np.arange(sizes) < cut[:, None])[:, None, :]
    mixed = np.where(upper, head.pieces, tail.pieces)
    by_stage = rng.random(count) < 0.5
    swapped = np.stack([head.pieces[:, 0], tail.pieces[:, 1]], axis=1)
    pieces = np.where(by_stage[:, None, None], swapped, mixed)
    own = rng.random(count) < 0.5
    crossover = np.where(own, head.crossover, tail.crossover)
    one_sided = np.where(crossover < 0, np.maximum(head.crossover, tail.crossover), crossover)
    crossover = np.where(by_stage & pieces[:, 1].any(axis=1), one_sided, crossover)
    return Counts(pieces, crossover, tail.clamp.copy())


class Mutation:
    """Small random changes to counts, each row on its own."""

    def __init__(self, space: Space) -> None:
        self.space = space
        self._around = Steps.of(space).around()
        self._moves: tuple[tuple[float, Callable[[Counts, Random], None]], ...] = (
            (3.0, self._step),
            (2.0, self._replace),
            (1.5, self._add),
            (1.0, self._duplicate),
            (1.5, self._remove),
            (0.5, self._reclamp),
            (1.0, self._shift_crossover),
            (0.5, self._toggle_crossover),
            (0.7, self._change_stage),
        )

    def __call__(self, counts: Counts, rng: Random, most: int = 3) -> Counts:
        """Each row changed by 1 to ``most`` moves, fewer being likelier; needs repair after."""
        weight = np.array([share for share, _ in self._moves])
        number = np.minimum(rng.geometric(0.55, size=len(counts)), most)
        for turn in range(most):
            kind = rng.choice(len(weight), size=len(counts), p=weight / weight.sum())
            kind[number <= turn] = NONE
            for which, (_, move) in enumerate(self._moves):
                rows = np.flatnonzero(kind == which)
                if len(rows):
                    some = counts.pick(rows)
                    move(some, rng)
                    counts.place(rows, some)
            np.maximum(counts.pieces, 0, out=counts.pieces)  # a child may have had no shim
        return counts

    def _present(self, counts: Counts, rng: Random) -> tuple[Ints, Ints]:
        """Stage and size of a random shim of each row."""
        flat = counts.pieces.reshape(len(counts), 2 * len(self.space.sizes))
        return np.divmod(_draw_weighted(flat, 1, rng)[:, 0], len(self.space.sizes))

    def _any_size(self, count: int, rng: Random) -> Ints:
        return rng.integers(0, len(self.space.sizes), size=count)

    def _exchange(self, counts: Counts, stage: Ints, old: Ints, new: Ints) -> None:
        row = np.arange(len(counts))
        had = counts.pieces[row, stage, old] > 0
        counts.pieces[row, stage, old] -= had
        counts.pieces[row, stage, new] += 1

    def _step(self, counts: Counts, rng: Random) -> None:
        stage, size = self._present(counts, rng)
        direction = rng.integers(0, 4, size=len(counts))
        self._exchange(counts, stage, size, self._around[direction, size])

    def _replace(self, counts: Counts, rng: Random) -> None:
        stage, size = self._present(counts, rng)
        self._exchange(counts, stage, size, self._any_size(len(counts), rng))

    def _add(self, counts: Counts, rng: Random) -> None:
        stage = rng.integers(0, 2, size=len(counts)) * counts.two_stage
        counts.pieces[np.arange(len(counts)), stage, self._any_size(len(counts), rng)] += 1

    def _duplicate(self, counts: Counts, rng: Random) -> None:
        stage, size = self._present(counts, rng)
        counts.pieces[np.arange(len(counts)), stage, size] += 1

    def _remove(self, counts: Counts, rng: Random) -> None:
        stage, size = self._present(counts, rng)
        row = np.arange(len(counts))
        counts.pieces[row, stage, size] -= counts.pieces[row, stage, size] > 0

    def _reclamp(self, counts: Counts, rng: Random) -> None:
        counts.clamp = rng.choice(self.space.clamp_sizes, size=len(counts))

    def _shift_crossover(self, counts: Counts, rng: Random) -> None:
        near = self._around[rng.integers(0, 4, size=len(counts)), counts.crossover]
        far = self._any_size(len(counts), rng)
        new = np.where(rng.random(len(counts)) < 0.6, near, far)
        counts.crossover = np.where(counts.two_stage, new, NONE)

    def _toggle_crossover(self, counts: Counts, rng: Random) -> None:
        """Close an open gap, or open one at a random diameter of a single stage."""
        crossed = counts.two_stage
        counts.pieces[crossed, 0] += counts.pieces[crossed, 1]
        counts.pieces[crossed, 1] = 0
        cut = self._present(counts, rng)[1]
        below = (np.arange(len(self.space.sizes)) >= cut[:, None]) & ~crossed[:, None]
        moved = counts.pieces[:, 0] * below
        counts.pieces[:, 0] -= moved
        counts.pieces[:, 1] += moved
        counts.crossover = np.where(crossed, NONE, self._any_size(len(counts), rng))

    def _change_stage(self, counts: Counts, rng: Random) -> None:
        stage, size = self._present(counts, rng)
        rows = np.flatnonzero(counts.two_stage)
        counts.pieces[rows, stage[rows], size[rows]] -= 1
        counts.pieces[rows, 1 - stage[rows], size[rows]] += 1


def offspring(
    repair: Repair, mutation: Mutation, mothers: Plans, fathers: Plans, rng: Random
) -> Plans:
    """Buildable children (pairs, width): crossed, changed and repaired."""
    uncrossed = (rng.random(len(mothers)) >= CROSSED_SHARE)[:, None]
    children = cross(repair.space, mothers, np.where(uncrossed, mothers, fathers), rng)
    return repair.counts(mutation(children, rng), rng)
