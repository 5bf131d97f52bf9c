"""Make any row of numbers a stack that can be built."""

import numpy as np

from optimiser.search.counts import NONE, Counts, Plans
from optimiser.search.enumerate import first_plans
from optimiser.search.sizes import Ints
from optimiser.search.space import Mask, Space
from optimiser.search.steps import Steps

Random = np.random.Generator

_RESERVE = 500


class Repair:
    """Repairs plans of one space; a row that resists becomes a known buildable one.

    ``possible`` is False when the space holds no buildable stack at all; every repaired row is
    then empty (all 0).
    """

    def __init__(self, space: Space) -> None:
        self.space = space
        self.reserve = first_plans(space, _RESERVE)
        self.possible = len(self.reserve) > 0
        self._faces = np.flatnonzero(space.may_face)
        self._clamps = np.flatnonzero(space.may_clamp)
        self._thicker = Steps.of(space).thicker

    def __call__(self, plans: Plans, rng: Random) -> Plans:
        """Buildable plans (rows, width) as close to the given ones as the rules allow."""
        if not self.possible:
            return np.zeros_like(plans)
        counts = self.space.decode(plans)
        return self.counts(counts, rng)

    def counts(self, counts: Counts, rng: Random) -> Plans:
        """Buildable plans from counts, which are changed on the way."""
        clamp = self._settle_clamp(counts, rng)
        self._settle_stages(counts)
        self._settle_face(counts, clamp, rng)
        self._settle_crossover(counts, clamp, rng)
        self._settle_stock(counts)
        self._settle_parts(counts, rng)
        self._settle_height(counts, clamp, rng)
        plans = self.space.encode(counts)
        bad = np.flatnonzero(self.space.broken(counts).any(axis=1))
        plans[bad] = self.reserve[rng.integers(len(self.reserve), size=len(bad))]
        return plans

    def _settle_clamp(self, counts: Counts, rng: Random) -> Ints:
        """Choose an allowed clamp diameter (number); drop shims that are no wider."""
        space = self.space
        clamp = np.where(counts.clamp >= 0, space.diameter[counts.clamp], NONE)
        bad = (clamp < 0) | ~space.may_clamp[clamp]
        clamp[bad] = rng.choice(self._clamps, size=int(bad.sum()))
        counts.pieces *= (space.diameter < clamp[:, None])[:, None, :]
        counts.crossover[space.diameter[counts.crossover] >= clamp] = NONE
        return clamp

    def _settle_stages(self, counts: Counts) -> None:
        """Merge what is not two whole stages, or split what must be two."""
        wanted = counts.two_stage & counts.pieces[:, 1].any(axis=1)
        if 2 not in self.space.rules.stages:
            wanted[:] = False
        merge = ~wanted
        counts.pieces[merge, 0] += counts.pieces[merge, 1]
        counts.pieces[merge, 1] = 0
        counts.crossover[merge] = NONE
        if 1 not in self.space.rules.stages:
            self._split(counts, np.flatnonzero(merge))

    def _split(self, counts: Counts, rows: Ints) -> None:
        face = self.space.widest(counts.pieces[rows, 0])
        stays = self.space.diameter == face[:, None]
        whole = counts.pieces[rows, 0]
        second = np.where(stays, whole // 2, whole)
        counts.pieces[rows, 0] = whole - second
        counts.pieces[rows, 1] = second
        counts.crossover[rows] = len(self.space.sizes) - 1

    def _settle_face(self, counts: Counts, clamp: Ints, rng: Random) -> None:
        """Give every row a face diameter that covers the seat, with shims enough."""
        space = self.space
        allowed = space.may_face[space.diameter] & (space.diameter < clamp[:, None])
        face = space.widest(counts.pieces[:, 0] * allowed)
        without = np.flatnonzero(face >= len(space.outer_of))
        face[without] = rng.choice(self._faces, size=len(without))
        counts.pieces *= (space.diameter >= face[:, None])[:, None, :]
        first = counts.pieces[:, 0]
        np.minimum(first, space.sizes.quantity, out=first)
        of_face = space.diameter == face[:, None]
        for _ in range(space.rules.face_min):
            short = np.flatnonzero((first * of_face).sum(axis=1) < space.rules.face_min)
            if len(short) == 0:
                break
            spare = of_face[short] & (first[short] < space.sizes.quantity)
            first[short, _draw(spare, rng)] += 1

    def _settle_crossover(self, counts: Counts, clamp: Ints, rng: Random) -> None:
        """Keep the crossover if it opens a gap, else draw one that does, else merge."""
        space = self.space
        rows = np.flatnonzero(counts.two_stage)
        allowed = self._crossovers(counts.pick(rows), clamp[rows])
        lost = rows[~allowed.any(axis=1)]
        if len(lost):
            face = space.widest(counts.pieces[lost, 0])
            counts.pieces[lost, 0] *= space.diameter == face[:, None]
            none = ~counts.pieces[lost, 1].any(axis=1)
            counts.pieces[lost[none], 1] = counts.pieces[lost[none], 0]
            allowed = self._crossovers(counts.pick(rows), clamp[rows])
        keeps = allowed[np.arange(len(rows)), counts.crossover[rows]]
        counts.crossover[rows] = np.where(keeps, counts.crossover[rows], _draw(allowed, rng))
        self._merge(counts, rows[~allowed.any(axis=1)])

    def _crossovers(self, counts: Counts, clamp: Ints) -> Mask:
        """(rows, sizes) which sizes could lie between the two stages."""
        space = self.space
        narrowest = np.where(counts.pieces[:, 0] > 0, space.diameter, NONE).max(axis=1)
        limit = np.maximum(narrowest, space.widest(counts.pieces[:, 1]))
        return np.asarray((space.diameter > limit[:, None]) & (space.diameter < clamp[:, None]))

    def _merge(self, counts: Counts, rows: Ints) -> None:
        counts.pieces[rows, 0] += counts.pieces[rows, 1]
        counts.pieces[rows, 1] = 0
        counts.crossover[rows] = NONE

    def _settle_stock(self, counts: Counts) -> None:
        """Use no more of a size than there is: the first stage is served first."""
        left = np.broadcast_to(self.space.sizes.quantity, counts.pieces[:, 0].shape).copy()
        np.minimum(counts.pieces[:, 0], left, out=counts.pieces[:, 0])
        left -= counts.pieces[:, 0]
        crossed = np.flatnonzero(counts.two_stage)
        left[crossed, counts.crossover[crossed]] -= 1
        np.minimum(counts.pieces[:, 1], np.maximum(left, 0), out=counts.pieces[:, 1])
        alone = counts.two_stage & ~counts.pieces[:, 1].any(axis=1)
        counts.crossover[alone] = NONE

    def _settle_parts(self, counts: Counts, rng: Random) -> None:
        """Take out random shims until the row fits its slots."""
        most = self.space.rules.parts - 1
        while True:
            number = counts.pieces.sum(axis=(1, 2)) + counts.two_stage
            over = np.flatnonzero(number > most)
            if len(over) == 0 or not self._take_out(counts, over, rng):
                return

    def _take_out(self, counts: Counts, rows: Ints, rng: Random) -> bool:
        """Take one shim that may go out of each row; False when no row has one."""
        space = self.space
        some = counts.pick(rows)
        face = space.diameter == space.widest(some.pieces[:, 0])[:, None]
        enough = space.face_pieces(some) > space.rules.face_min
        removable = some.pieces.copy()
        removable[:, 0] *= ~face | enough[:, None]
        removable[:, 1] *= (some.pieces[:, 1].sum(axis=1) > 1)[:, None]
        flat = removable.reshape(len(rows), 2 * len(space.sizes))
        possible = flat.any(axis=1)
        chosen = _draw(flat > 0, rng)
        stage, size = np.divmod(chosen, len(space.sizes))
        counts.pieces[rows[possible], stage[possible], size[possible]] -= 1
        return bool(possible.any())

    def _put_in(self, counts: Counts, rows: Ints, clamp: Ints, rng: Random) -> bool:
        """Lay one more shim on the first stage of each row; False when nothing fits."""
        space = self.space
        some = counts.pick(rows)
        first = some.pieces[:, 0]
        low = np.where(some.two_stage, space.diameter[some.crossover], clamp[rows])
        fits = (space.diameter >= space.widest(first)[:, None]) & (space.diameter < low[:, None])
        fits &= some.pieces.sum(axis=1) < space.sizes.quantity
        fits &= (space.bending(some)[0] < space.rules.parts - 1)[:, None]
        possible = fits.any(axis=1)
        counts.pieces[rows[possible], 0, _draw(fits, rng)[possible]] += 1
        return bool(possible.any())

    def _thicken(self, counts: Counts, rows: Ints, rng: Random) -> bool:
        """Exchange one shim of each row for the next thicker one; False when none can be."""
        space = self.space
        some = counts.pick(rows)
        spare = some.pieces.sum(axis=1) < space.sizes.quantity
        better = (self._thicker != np.arange(len(space.sizes))) & spare[:, self._thicker]
        flat = ((some.pieces > 0) & better[:, None, :]).reshape(len(rows), 2 * len(space.sizes))
        possible = flat.any(axis=1)
        stage, size = np.divmod(_draw(flat, rng), len(space.sizes))
        rows, stage, size = rows[possible], stage[possible], size[possible]
        counts.pieces[rows, stage, size] -= 1
        counts.pieces[rows, stage, self._thicker[size]] += 1
        return bool(possible.any())

    def _settle_height(self, counts: Counts, clamp: Ints, rng: Random) -> None:
        """Choose the clamp shim; change shims where none makes up the height."""
        space = self.space
        for _ in range(2 * space.rules.parts):
            counts.clamp = space.choose_clamp(counts, clamp).size
            open_rows = np.flatnonzero(counts.clamp < 0)
            if len(open_rows) == 0:
                return
            number, height = space.bending(counts.pick(open_rows))
            high = height >= space.rules.height_min_mm
            full = ~high & (number >= space.rules.parts - 1)
            moved = self._take_out(counts, open_rows[high], rng)
            moved |= self._thicken(counts, open_rows[full], rng)
            moved |= self._put_in(counts, open_rows[~high & ~full], clamp, rng)
            if not moved:
                return


def _draw(allowed: Mask, rng: Random) -> Ints:
    """One random allowed column a row (0 where there is none)."""
    chosen: Ints = np.argmax(allowed * rng.random(allowed.shape), axis=1)
    return chosen
