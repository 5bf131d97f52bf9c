"""The space of stacks that can be built on one post from one drawer."""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from optimiser.damper import Valve
from optimiser.search import counts as form
from optimiser.search.counts import NONE, Counts, Plans
from optimiser.search.rules import SLACK_MM, Limits, Rules
from optimiser.search.sizes import Floats, Ints, Sizes, StockLine
from optimiser.stack import Shim, Stack

Mask = NDArray[np.bool_]

BROKEN_RULES = (
    "not in canonical form",
    "stage count not allowed",
    "face shim does not cover the seat",
    "too few face shims",
    "second stage wider than the face shim",
    "crossover not narrower than its neighbours",
    "clamp shim not the narrowest or over the ports",
    "more shims than in stock",
    "height or parts out of limits",
)


@dataclass(frozen=True)
class ClampChoice:
    """The clamp shim that makes up the height; arrays (plans,). ``size`` is -1 where none does."""

    size: Ints
    pieces: Ints
    height_mm: Floats


@dataclass(frozen=True, eq=False)
class Space:
    """Sizes, rules and the fitted stack of one search, with the tables derived from them."""

    sizes: Sizes
    rules: Rules
    fitted: Stack | None = None

    @classmethod
    def of(
        cls,
        lines: Iterable[StockLine],
        valve: Valve,
        limits: Limits | None = None,
        fitted: Stack | None = None,
    ) -> "Space":
        """The space of a valve and the stock lines whose bore fits its post.

        The shims of ``fitted`` count as available on top of the lines and turn on the
        count of changed shims. Raises BadInput for contradicting limits.
        """
        rules = Rules.of(valve, limits or Limits())
        return cls(Sizes.of(lines, fitted, rules.clearance_mm), rules, fitted)

    @property
    def width(self) -> int:
        """Length of a plan."""
        return form.width(self.rules.parts)

    @property
    def key(self) -> str:
        """Text that names sizes, quantities and rules exactly, for hashing."""
        table = zip(
            self.sizes.outer_mm.tolist(),
            self.sizes.thickness_mm.tolist(),
            self.sizes.quantity.tolist(),
            strict=True,
        )
        return f"{list(table)} {self.rules} {self.fitted.lines() if self.fitted else None}"

    @cached_property
    def diameter(self) -> Ints:
        """(sizes,) number of the size's diameter, 0 = widest."""
        return np.unique(-self.sizes.outer_mm, return_inverse=True)[1].astype(np.int64).ravel()

    @cached_property
    def outer_of(self) -> Floats:
        """(diameters,) outer diameter, mm, widest first."""
        return -np.unique(-self.sizes.outer_mm)

    @cached_property
    def may_face(self) -> Mask:
        """(diameters,) covers the seat and has pieces enough for the face."""
        total = np.bincount(self.diameter, self.sizes.quantity, minlength=len(self.outer_of))
        covers = self.outer_of >= self.rules.cover_mm - SLACK_MM
        return np.asarray(covers & (total >= self.rules.face_min))

    @cached_property
    def may_clamp(self) -> Mask:
        """(diameters,) narrow enough to leave the ports free, and than some face shim."""
        narrow = self.outer_of < self.rules.port_inner_mm - SLACK_MM
        widest = self.outer_of[self.may_face].max(initial=0.0)
        return np.asarray(narrow & (self.outer_of < widest))

    @cached_property
    def clamp_sizes(self) -> Ints:
        """Indices of the sizes that may clamp."""
        return np.flatnonzero(self.may_clamp[self.diameter])

    @cached_property
    def fitted_counts(self) -> Ints:
        """(sizes,) pieces of each size in the fitted stack."""
        counts = np.zeros(len(self.sizes), dtype=np.int64)
        for shim in self.fitted.pieces if self.fitted else ():
            size = self.sizes.nearest(shim.outer_mm, shim.thickness_mm)
            if size is not None and shim.inner_mm is None:
                counts[size] += 1
        return counts

    @property
    def fitted_elsewhere(self) -> int:
        """Shims of the fitted stack no plan can hold (ring shims, too wide): always removed."""
        return self.fitted.parts - int(self.fitted_counts.sum()) if self.fitted else 0

    def decode(self, plans: Plans) -> Counts:
        """Counts of plans."""
        return form.decode(plans, len(self.sizes), self.rules.parts)

    def encode(self, counts: Counts) -> Plans:
        """Plans of counts, in canonical order."""
        return form.encode(counts, self.rules.parts)

    def clamp_table(self, counts: Counts) -> tuple[Ints, Mask, Floats]:
        """Pieces needed, whether that can be done, and height (mm), each (plans, clamp sizes)."""
        number, bending_mm = self.bending(counts)
        thick = self.sizes.thickness_mm[self.clamp_sizes]
        missing = (self.rules.height_min_mm - bending_mm)[:, None] / thick
        pieces = np.maximum(np.ceil(missing - 1e-7), 1).astype(np.int64)
        height = bending_mm[:, None] + pieces * thick
        possible = (
            (pieces <= self.sizes.quantity[self.clamp_sizes])
            & (height <= self.rules.height_max_mm + SLACK_MM)
            & (number[:, None] + pieces <= self.rules.parts)
        )
        return pieces, possible, height

    def bending(self, counts: Counts) -> tuple[Ints, Floats]:
        """(plans,) number and height (mm) of all shims but the clamp shims."""
        pieces = counts.pieces.sum(axis=1)
        crossed = counts.two_stage
        number = pieces.sum(axis=1) + crossed
        thickness = self.sizes.thickness_mm
        height = pieces @ thickness + np.where(crossed, thickness[counts.crossover], 0.0)
        return number, height

    def choose_clamp(self, counts: Counts, diameter: Ints) -> ClampChoice:
        """The clamp size of a given diameter number (plans,) that makes up the height best.

        Its thickness does not change the curve, so one is chosen: fewest changes of the fitted
        stack if there is one, then fewest pieces, then least height.
        """
        pieces, possible, height = self.clamp_table(counts)
        possible = possible & (self.diameter[self.clamp_sizes] == diameter[:, None])
        if not possible.size:
            none = np.full(len(counts), NONE)
            return ClampChoice(none, np.zeros_like(none), np.zeros(len(counts)))
        had = self.fitted_counts[self.clamp_sizes]
        changes = np.abs(pieces - had) - had if self.fitted else np.zeros_like(pieces)
        order = np.where(possible, changes * 1e6 + pieces * 1e3 + height, np.inf)
        best = np.argmin(order, axis=1)
        row = np.arange(len(counts))
        size = np.where(possible[row, best], self.clamp_sizes[best], NONE)
        return ClampChoice(size, pieces[row, best], height[row, best])

    def narrowest(self, counts: Counts) -> Ints:
        """(plans,) diameter number of the narrowest bending shim, -1 for none."""
        present = np.where(counts.pieces.any(axis=1), self.diameter, NONE)
        crossed = np.where(counts.two_stage, self.diameter[counts.crossover], NONE)
        narrowest: Ints = np.maximum(present.max(axis=1, initial=NONE), crossed)
        return narrowest

    def widest(self, pieces: Ints) -> Ints:
        """(plans,) diameter number of the widest shim of one stage (plans, sizes)."""
        none = len(self.outer_of)
        widest: Ints = np.where(pieces > 0, self.diameter, none).min(axis=1, initial=none)
        return widest

    def face_pieces(self, counts: Counts) -> Ints:
        """(plans,) first-stage shims of the face shim's diameter."""
        face = self.widest(counts.pieces[:, 0])
        of_face = self.diameter == face[:, None]
        return np.asarray((counts.pieces[:, 0] * of_face).sum(axis=1))

    def violations(self, plans: Plans) -> Mask:
        """(plans, rules) which of ``BROKEN_RULES`` each row breaks."""
        counts = self.decode(plans)
        broken = self.broken(counts)
        if len(self.sizes):
            broken[:, 0] |= (plans != self.encode(counts)).any(axis=1)
        return broken

    def buildable(self, plans: Plans) -> Mask:
        """(plans,) whether a row keeps every rule."""
        return np.asarray(~self.violations(plans).any(axis=1))

    def broken(self, counts: Counts) -> Mask:
        """(plans, rules) which of ``BROKEN_RULES`` counts break."""
        if len(self.sizes) == 0:
            return np.ones((len(counts), len(BROKEN_RULES)), dtype=bool)
        first, second = counts.pieces[:, 0], counts.pieces[:, 1]
        crossed, filled = counts.two_stage, second.any(axis=1)
        face, second_face = self.widest(first), self.widest(second)
        last_face = np.minimum(face, len(self.outer_of) - 1)
        cross = self.diameter[counts.crossover]
        last_first = np.where(first > 0, self.diameter, NONE).max(axis=1, initial=NONE)
        of_face = first * (self.diameter == face[:, None])
        pieces, possible = self._clamp_pieces(counts)
        return np.column_stack(
            [
                ~first.any(axis=1) | (counts.clamp < 0) | (crossed != filled),
                ~np.isin(1 + crossed, self.rules.stages),
                self.outer_of[last_face] < self.rules.cover_mm - SLACK_MM,
                of_face.sum(axis=1) < self.rules.face_min,
                second_face < face,
                crossed & ((cross <= last_first) | (cross <= second_face)),
                self._clamp_too_wide(counts),
                (self._used(counts, pieces) > self.sizes.quantity).any(axis=1),
                ~possible,
            ]
        )

    def _clamp_too_wide(self, counts: Counts) -> Mask:
        clamp = self.diameter[counts.clamp]
        return (clamp <= self.narrowest(counts)) | ~self.may_clamp[clamp]

    def _clamp_pieces(self, counts: Counts) -> tuple[Ints, Mask]:
        """Pieces of the row's own clamp size and whether height, parts and stock allow it."""
        pieces, possible, _ = self.clamp_table(counts)
        match = self.clamp_sizes == counts.clamp[:, None]
        return (pieces * match).sum(axis=1), (possible & match).any(axis=1)

    def used(self, counts: Counts) -> Ints:
        """(plans, sizes) pieces of each size, crossover and clamp shims included."""
        return self._used(counts, self._clamp_pieces(counts)[0])

    def _used(self, counts: Counts, clamp_pieces: Ints) -> Ints:
        used: Ints = counts.pieces.sum(axis=1)
        crossed = np.flatnonzero(counts.two_stage)
        used[crossed, counts.crossover[crossed]] += 1
        clamped = np.flatnonzero(counts.clamp >= 0)
        used[clamped, counts.clamp[clamped]] += clamp_pieces[clamped]
        return used

    def parts(self, plans: Plans) -> Ints:
        """(plans,) number of shims, all clamp shims included."""
        counts = self.decode(plans)
        parts: Ints = self.bending(counts)[0] + self._clamp_pieces(counts)[0]
        return parts

    def changed(self, plans: Plans) -> Ints:
        """(plans,) shims to add plus shims to remove, starting from the fitted stack."""
        used = self.used(self.decode(plans))
        moved: Ints = np.abs(used - self.fitted_counts).sum(axis=1)
        return moved + self.fitted_elsewhere

    def shims(self, plan: Plans) -> list[int]:
        """Size indices of one plan, face first, every clamp shim included."""
        row = plan.reshape(1, -1)
        clamp = int(self._clamp_pieces(self.decode(row))[0][0])
        bending = [int(entry) - 1 for entry in plan[:-1] if entry > 0]
        return bending + [int(plan[-1]) - 1] * clamp

    def to_stack(self, plan: Plans, real: bool = False) -> Stack:
        """The stack of one plan, with nominal thickness (mm) or, on request, real thickness."""
        thick = self.sizes.thickness_mm if real else self.sizes.nominal_mm
        return Stack.of(
            Shim(float(self.sizes.outer_mm[size]), float(thick[size])) for size in self.shims(plan)
        )

    def from_stack(self, stack: Stack) -> Plans | None:
        """The plan of a stack (nominal thickness), or None when the space cannot hold it.

        The clamp diameter is kept; the clamp shim's thickness becomes the one this space
        chooses, which leaves the curve as it is.
        """
        plan = self._plain_plan(stack)
        if plan is None:
            return None
        plan = self.with_best_clamp(plan.reshape(1, -1))
        return plan[0] if self.buildable(plan)[0] else None

    def with_best_clamp(self, plans: Plans) -> Plans:
        """Plans with the clamp size replaced by the best of its diameter; 0 where none will do."""
        counts = self.decode(plans)
        diameter = np.where(counts.clamp >= 0, self.diameter[counts.clamp], NONE)
        changed = plans.copy()
        changed[:, -1] = self.choose_clamp(counts, diameter).size + 1
        return changed

    def _plain_plan(self, stack: Stack) -> Plans | None:
        found = [self.sizes.nearest(s.outer_mm, s.thickness_mm) for s in stack.bending]
        clamp = self.sizes.nearest(stack.clamp_mm, stack.groups[-1].shim.thickness_mm)
        sizes = [size for size in found if size is not None]
        rings = any(shim.inner_mm is not None for shim in stack.bending)
        if len(sizes) < len(found) or clamp is None or rings or len(sizes) >= self.rules.parts:
            return None
        outer = self.sizes.outer_mm[sizes]
        rises = np.flatnonzero(np.diff(outer) > 0)
        if len(rises) > 1 or (len(rises) == 1 and rises[0] == 0):
            return None
        pieces = np.zeros((1, 2, len(self.sizes)), dtype=np.int64)
        crossing = int(rises[0]) if len(rises) else len(sizes)
        np.add.at(pieces[0, 0], sizes[:crossing], 1)
        np.add.at(pieces[0, 1], sizes[crossing + 1 :], 1)
        crossover = sizes[crossing] if len(rises) else NONE
        plans = self.encode(Counts(pieces, np.array([crossover]), np.array([clamp])))
        return np.asarray(plans[0])
