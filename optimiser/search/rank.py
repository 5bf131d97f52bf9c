"""From everything tried to a short list of clearly different stacks."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from optimiser.search.archive import Archive, Record
from optimiser.search.counts import Plans
from optimiser.search.sizes import Floats, Ints
from optimiser.search.space import Mask, Space
from optimiser.stack import Stack

RankBy = Literal["default", "error", "parts", "stress"]

STEP = 0.005  # errors closer than this (a fraction) are told apart by other means
CLOSE = 0.02  # ranking by parts or stress looks first at errors this near to the best
SHORT_LIFE = 0.02  # what a utilisation of 1 or more counts as, in error
TWIN_UTILISATION = 0.1
_LOOKED_AT = 4000

EXPLAINED: dict[RankBy, str] = {
    "default": (
        "Ranked by error in steps of 0.5 points (a utilisation of 1 or more counts as 2 points), "
        "then fewer shims changed, fewer parts, clicks near the middle, lower utilisation."
    ),
    "error": "Ranked by error, then fewer parts.",
    "parts": (
        "Ranked by parts, then error, among stacks within 2 points of the least error; "
        "the others follow by error."
    ),
    "stress": (
        "Ranked by utilisation, then error, among stacks within 2 points of the least error; "
        "the others follow by error."
    ),
}


@dataclass(frozen=True)
class Ranked:
    """One row of the list.

    ``error`` and ``utilisation`` are fractions, ``rise`` the edge rise over thickness,
    ``changed`` shims added plus removed (0 without a fitted stack), ``variants`` the near-twins
    folded into this row, ``beyond`` True outside the range the model was checked in.
    """

    plan: Plans
    stack: Stack
    error: float
    parts: int
    utilisation: float
    clicks: float
    rise: float
    changed: int
    variants: int
    beyond: bool


def rank(
    archive: Archive,
    by: RankBy = "default",
    count: int = 10,
    middle_clicks: float | None = None,
) -> list[Ranked]:
    """Up to ``count`` clearly different stacks, best first; ``EXPLAINED`` says by which rule.

    Two stacks are near-twins when they have the same clamp diameter and number of stages, at
    most one shim (or the crossover) of another diameter, at most one shim more or less, errors
    within 0.5 percentage points and utilisations within 0.1. The better ranked one stands for
    the other. Stacks beyond the model's range come after all the rest.
    ``middle_clicks`` is the middle of the adjuster's range, if it has one.
    """
    order = _order(archive.record(), by, middle_clicks)[:_LOOKED_AT]
    record = archive.record(order)
    features = _Features.of(archive.space, record)
    free = np.ones(len(order), dtype=bool)
    found: list[Ranked] = []
    while free.any() and len(found) < count:
        leader = int(np.argmax(free))
        twins = features.twins(leader) & free
        free &= ~twins
        found.append(_ranked(archive.space, record, leader, int(twins.sum()) - 1))
    return found


def worth_checking(archive: Archive, count: int, middle_clicks: float | None = None) -> Plans:
    """Plans (at most ``count``, width) for a closer look by a better model.

    Half of them lead the default ranking, the others are front members, least error first.
    """
    order = _order(archive.record(), "default", middle_clicks)
    front = archive.front()
    front = front[np.argsort(archive.objectives[front, 0], kind="stable")]
    chosen = [*order[: count // 2].tolist(), *front.tolist(), *order[count // 2 :].tolist()]
    return archive.plans[list(dict.fromkeys(chosen))[:count]]


def _order(record: Record, by: RankBy, middle_clicks: float | None) -> Ints:
    """Rows, best first."""
    scores = record.scores
    inside = scores.error[~record.beyond]
    best = float(inside.min(initial=np.inf))
    best = best if np.isfinite(best) else float(scores.error.min(initial=0.0))
    row = np.arange(len(scores.error))
    far = scores.error > best + CLOSE
    middle = scores.clicks if middle_clicks is None else middle_clicks
    off_middle = np.abs(scores.clicks - middle)
    counted = scores.error - best + SHORT_LIFE * (scores.utilisation >= 1)
    keys: dict[RankBy, tuple[NDArray[np.generic], ...]] = {
        "error": (record.parts, scores.error),
        "parts": (scores.error, np.where(far, 0, record.parts), far),
        "stress": (scores.error, np.where(far, 0.0, scores.utilisation), far),
        "default": (
            scores.error,
            scores.utilisation,
            off_middle,
            record.parts,
            record.changed,
            np.floor(np.maximum(counted, -STEP) / STEP),
        ),
    }
    return np.lexsort((row, *keys[by], record.beyond))


@dataclass(frozen=True)
class _Features:
    """What near-twins are told by; first dimension (plans,)."""

    diameters: Ints  # (plans, 2 stages and crossover, diameters) pieces
    clamp: Ints
    parts: Ints
    error: Floats
    utilisation: Floats
    beyond: Mask

    @classmethod
    def of(cls, space: Space, record: Record) -> "_Features":
        counts = space.decode(record.plans)
        number = len(space.outer_of)
        one = np.eye(number, dtype=np.int64)
        by_diameter = counts.pieces @ one[space.diameter]
        crossover = one[space.diameter[counts.crossover]] * counts.two_stage[:, None]
        return cls(
            np.concatenate([by_diameter, crossover[:, None]], axis=1),
            space.diameter[counts.clamp],
            record.parts,
            record.scores.error,
            record.scores.utilisation,
            record.beyond,
        )

    def twins(self, leader: int) -> Mask:
        """(plans,) near-twins of one row, itself included."""
        apart = self.diameters - self.diameters[leader]
        more = np.maximum(apart, 0).sum(axis=(1, 2))
        less = np.maximum(-apart, 0).sum(axis=(1, 2))
        stages = self.diameters[:, 2].sum(axis=1)
        return np.asarray(
            (np.maximum(more, less) <= 1)
            & (stages == stages[leader])
            & (self.clamp == self.clamp[leader])
            & (np.abs(self.parts - self.parts[leader]) <= 1)
            & (np.abs(self.error - self.error[leader]) <= STEP)
            & (np.abs(self.utilisation - self.utilisation[leader]) <= TWIN_UTILISATION)
            & (self.beyond == self.beyond[leader])
        )


def _ranked(space: Space, record: Record, row: int, variants: int) -> Ranked:
    scores = record.scores
    return Ranked(
        plan=record.plans[row],
        stack=space.to_stack(record.plans[row]),
        error=float(scores.error[row]),
        parts=int(record.parts[row]),
        utilisation=float(scores.utilisation[row]),
        clicks=float(scores.clicks[row]),
        rise=float(scores.rise[row]),
        changed=int(record.changed[row]),
        variants=variants,
        beyond=bool(record.beyond[row]),
    )
