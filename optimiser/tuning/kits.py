"""The kits of a table: candidates to choose from, and the front."""

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from optimiser.search.sizes import Floats
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.cells import Place
from optimiser.tuning.choose import Candidates, choices_of
from optimiser.tuning.kit import Choices, Kit, KitTask, Measure, kit_front, kit_of
from optimiser.tuning.shelf import Shelf

#: Candidates of a cell and circuit that a kit chooses from: the commonest in the table, the best.
COMMON, BEST = 8, 4


@dataclass(frozen=True, eq=False)
class TableKit:
    """A kit, and the stacks it builds in the cells."""

    kit: Kit
    stacks: Mapping[Place, Candidate]


def chosen_kit(chosen: Mapping[Place, Candidate], shelf: Shelf) -> TableKit | None:
    """The shims that build any one mass and feel of a table as it stands; None for an empty one."""
    if not chosen:
        return None
    task, cells = _task({place: (candidate,) for place, candidate in chosen.items()}, shelf)
    return TableKit(kit_of(task, [[0] * len(cell) for cell in cells]), chosen)


def kits_of(
    candidates: Candidates,
    chosen: Mapping[Place, Candidate],
    shelf: Shelf,
    tolerance_percent: float,
    by: Measure = "pieces",
) -> tuple[TableKit, ...]:
    """The front of kits that build every filled cell; see :func:`kit.kit_front`.

    No cell gets a stack beyond the tolerance, or worse than the one in the table where that is.
    """
    often = Counter(_text(one) for place in chosen for one in candidates.get(place, ()))
    picked = {
        place: _worth_a_kit(_allowed(candidates.get(place, ()), one, tolerance_percent), one, often)
        for place, one in chosen.items()
    }
    task, cells = _task(picked, shelf)
    return tuple(TableKit(kit, _stacks(kit, cells, picked)) for kit in kit_front(task, by))


def _stacks(
    kit: Kit, cells: Sequence[Sequence[Place]], picked: Candidates
) -> dict[Place, Candidate]:
    return {
        place: picked[place][number]
        for cell, numbers in zip(cells, kit.choice, strict=True)
        for place, number in zip(cell, numbers, strict=True)
    }


def _allowed(
    candidates: Sequence[Candidate], chosen: Candidate, tolerance_percent: float
) -> list[Candidate]:
    limit = max(tolerance_percent, chosen.error_percent)
    return [one for one in candidates if one.error_percent <= limit]


def _worth_a_kit(
    candidates: Sequence[Candidate], chosen: Candidate, often: Counter[str]
) -> tuple[Candidate, ...]:
    """The stack in the table, those most cells could use, and those of least error."""
    common = sorted(candidates, key=lambda one: (-often[_text(one)], *one.order))
    picked = {_text(one): one for one in (chosen, *common[:COMMON], *candidates[:BEST])}
    return tuple(sorted(picked.values(), key=lambda one: one.order))


def _task(candidates: Candidates, shelf: Shelf) -> tuple[KitTask, tuple[tuple[Place, ...], ...]]:
    """What kits choose from, and the cells (mass and feel) in that order."""
    rows = sorted({(place.mass, place.feel) for place in candidates})
    cells = tuple(
        tuple(place for place in sorted(candidates) if (place.mass, place.feel) == row)
        for row in rows
    )
    choices = tuple(
        tuple(choices_of(candidates[place], shelf, place.circuit) for place in cell)
        for cell in cells
    )
    return KitTask(choices, shelf.quantity, _prices(choices, shelf)), cells


def _prices(cells: Sequence[Sequence[Choices]], shelf: Shelf) -> Floats | None:
    """(sizes,) prices, None when a size that a candidate uses has none."""
    used = np.zeros(len(shelf.sizes), dtype=bool)
    for cell in cells:
        for choices in cell:
            used |= choices.uses.any(axis=0)
    return np.nan_to_num(shelf.price) if np.isfinite(shelf.price[used]).all() else None


def _text(candidate: Candidate) -> str:
    return " + ".join(candidate.stack.lines())
