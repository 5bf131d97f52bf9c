"""All stacks one change away from a given one, and a sample of those two changes away."""

import numpy as np

from optimiser.search.counts import NONE, Counts, Plans
from optimiser.search.repair import Random
from optimiser.search.sizes import Ints
from optimiser.search.space import Space
from optimiser.search.steps import Steps


class Neighbours:
    """Changes of single plans (width,); every plan returned is buildable and in canonical form."""

    def __init__(self, space: Space) -> None:
        self.space = space
        self._around = Steps.of(space).around()
        self._alike = _alike(space)
        self._one = np.eye(2 * len(space.sizes), dtype=np.int64).reshape(-1, 2, len(space.sizes))

    def single(self, plan: Plans) -> Plans:
        """Buildable plans with one change: a shim exchanged, added, taken out or moved to the
        other stage; two shims of different stages, or the thicknesses of two diameters, changing
        places; another crossover; a gap opened or closed; another clamp diameter.
        """
        counts = self.space.decode(plan.reshape(1, -1))
        batches = [self._pieces(counts), self._swaps(counts), self._clamps(counts)]
        return self._finish([*batches, *self._gaps(counts)])

    def double(self, plan: Plans, most: int, rng: Random) -> Plans:
        """Up to ``most`` random buildable plans with two changes, most of them small.

        The first change steps a shim to a neighbouring size or exchanges it; the second steps,
        exchanges, adds or takes out a shim, steps the crossover or changes the clamp.
        """
        counts = self.space.decode(np.repeat(plan.reshape(1, -1), most, axis=0))
        for kinds in ((0, 1), (0, 1, 2, 3, 4, 5)):
            kind = rng.choice(np.array(kinds), size=most)
            self._change(counts, kind, rng)
        return self._finish([counts])

    def combined(self, plan: Plans, ones: Plans, others: Plans) -> tuple[Plans, Ints]:
        """Buildable plans with the changes of two others at once, and which pairs they stem from.

        ``ones`` and ``others`` (pairs, width) differ from ``plan`` (width,) by some changes. Pairs
        that both change the crossover, or both the clamp diameter, are left out. Order is kept.
        """
        base = self.space.decode(plan.reshape(1, -1))
        one, other = self.space.decode(ones), self.space.decode(others)
        clamps = [self.space.diameter[counts.clamp] for counts in (base, one, other)]
        clash = (one.crossover != base.crossover) & (other.crossover != base.crossover)
        clash |= (clamps[1] != clamps[0]) & (clamps[2] != clamps[0])
        both = Counts(
            one.pieces + other.pieces - base.pieces,
            np.where(one.crossover != base.crossover, one.crossover, other.crossover),
            np.where(clamps[1] != clamps[0], one.clamp, other.clamp),
        )
        pairs = np.flatnonzero(~clash)
        plans, sound = self._sound(both.pick(pairs))
        return plans, pairs[sound]

    def _pieces(self, counts: Counts) -> Counts:
        """One shim added, taken out, exchanged, or moved to the other stage."""
        single = counts.pieces[0]
        stages = 2 if counts.two_stage[0] else 1
        sizes = len(self.space.sizes)
        gains = self._one[: stages * sizes]
        losses = self._one[np.flatnonzero(single.ravel())]
        both = (gains[None] - losses[:, None]).reshape(-1, 2, sizes)
        changes = np.concatenate([gains, -losses, both])
        return _with_pieces(counts, single + changes)

    def _swaps(self, counts: Counts) -> Counts:
        """Two shims change stages, or two diameters exchange their thicknesses."""
        sizes, single = len(self.space.sizes), counts.pieces[0]
        laid = np.flatnonzero(single.ravel())
        one, other = laid[np.array(np.triu_indices(len(laid), 1))]
        apart = one // sizes != other // sizes
        into_one, into_other = _elsewhere(other, sizes), _elsewhere(one, sizes)
        stages = self._exchanged(one, other, into_one, into_other)[apart]
        into_one = one - one % sizes + self._alike[one % sizes, other % sizes]
        into_other = other - other % sizes + self._alike[other % sizes, one % sizes]
        known = (self._alike[one % sizes, other % sizes] >= 0) & (
            self._alike[other % sizes, one % sizes] >= 0
        )
        thicknesses = self._exchanged(one, other, into_one, into_other)[known]
        return _with_pieces(counts, single + np.concatenate([stages, thicknesses]))

    def _exchanged(self, one: Ints, other: Ints, new_one: Ints, new_other: Ints) -> Ints:
        lost = self._one[one] + self._one[other]
        return np.asarray(self._one[new_one] + self._one[new_other] - lost)

    def _gaps(self, counts: Counts) -> list[Counts]:
        """Another crossover; the gap closed; or a gap opened below any shim."""
        space, size = self.space, np.arange(len(self.space.sizes))
        if counts.two_stage[0]:
            closed = np.stack([counts.pieces[0].sum(axis=0), np.zeros_like(size)])
            kept = _with_pieces(counts, np.repeat(counts.pieces, len(size), axis=0))
            kept.crossover = size
            return [kept, Counts(closed[None], np.array([NONE]), counts.clamp.copy())]
        splits = _splits(counts.pieces[0, 0])
        opened = _with_pieces(counts, np.repeat(splits, len(size), axis=0))
        opened.crossover = np.tile(size, len(splits))
        outer = space.diameter[opened.crossover]
        useful = (outer > space.widest(opened.pieces[:, 1])) & (
            outer < space.diameter[opened.clamp]
        )
        return [opened.pick(useful)]

    def _clamps(self, counts: Counts) -> Counts:
        other = _with_pieces(counts, np.repeat(counts.pieces, len(self.space.clamp_sizes), axis=0))
        other.clamp = self.space.clamp_sizes.copy()
        return other

    def _change(self, counts: Counts, kind: Ints, rng: Random) -> None:
        """Apply one random change of the given kind (plans,) to each row."""
        count, sizes = len(counts), len(self.space.sizes)
        row = np.arange(count)
        chance = (counts.pieces > 0).reshape(count, -1) * rng.random((count, 2 * sizes))
        stage, old = np.divmod(chance.argmax(axis=1), sizes)
        near = self._around[rng.integers(0, 4, count), old]
        new = np.where(kind == 0, near, rng.integers(0, sizes, count))
        counts.pieces[row, stage, old] -= np.isin(kind, (0, 1, 3))
        counts.pieces[row, stage, new] += np.isin(kind, (0, 1, 2))
        crossed = counts.two_stage & (kind == 4)
        moved = self._around[rng.integers(0, 4, count), counts.crossover]
        counts.crossover = np.where(crossed, moved, counts.crossover)
        clamp = rng.choice(self.space.clamp_sizes, size=count)
        counts.clamp = np.where(kind == 5, clamp, counts.clamp)

    def _finish(self, batches: list[Counts]) -> Plans:
        """Buildable rows of all batches, without repetitions."""
        plans, _ = self._sound(
            Counts(
                np.concatenate([b.pieces for b in batches]),
                np.concatenate([b.crossover for b in batches]),
                np.concatenate([b.clamp for b in batches]),
            )
        )
        return np.unique(plans, axis=0) if len(plans) else plans

    def _sound(self, counts: Counts) -> tuple[Plans, Ints]:
        """Buildable rows in their order, with the clamp shim chosen anew, and their places."""
        sound = (counts.pieces >= 0).all(axis=(1, 2)) & counts.pieces[:, 0].any(axis=1)
        sound &= counts.pieces.sum(axis=(1, 2)) + counts.two_stage < self.space.rules.parts
        place = np.flatnonzero(sound)
        counts = counts.pick(place)
        counts.clamp = self.space.choose_clamp(counts, self.space.diameter[counts.clamp]).size
        good = np.flatnonzero(~self.space.broken(counts).any(axis=1))
        return self.space.encode(counts.pick(good)), place[good]


def _with_pieces(counts: Counts, pieces: Ints) -> Counts:
    """Copies of a single plan's counts with other pieces (rows, 2, sizes)."""
    rows = len(pieces)
    return Counts(pieces, np.repeat(counts.crossover, rows), np.repeat(counts.clamp, rows))


def _elsewhere(flat: Ints, sizes: int) -> Ints:
    """The same sizes in the other stage (flat index: stage times ``sizes`` plus size)."""
    return np.asarray((flat + sizes) % (2 * sizes))


def _alike(space: Space) -> Ints:
    """(sizes, sizes) the size with the row's diameter and the column's thickness, -1 for none."""
    nominal, diameter = space.sizes.nominal_mm, space.diameter
    count = len(nominal)
    table = np.full((count, count), NONE)
    for size in range(count):
        same = np.abs(nominal - nominal[size]) < 1e-6
        for other in np.flatnonzero(same):
            table[diameter == diameter[other], size] = other
    return table


def _splits(stage: Ints) -> Ints:
    """Every way (ways, 2, sizes) to cut a single stage (sizes,) in two after one of its shims."""
    laid = np.repeat(np.arange(len(stage)), stage)
    cuts = np.arange(1, len(laid))
    ways = np.zeros((len(cuts), 2, len(stage)), dtype=np.int64)
    for way, cut in enumerate(cuts):
        np.add.at(ways[way, 0], laid[:cut], 1)
        np.add.at(ways[way, 1], laid[cut:], 1)
    return ways
