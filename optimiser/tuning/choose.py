"""From every cell's candidates to one stack a cell."""

from collections.abc import Mapping, Sequence

import numpy as np

from optimiser.tuning.candidate import Candidate
from optimiser.tuning.cells import Place
from optimiser.tuning.chain import Mask, Row, best_chain
from optimiser.tuning.drawer import assign
from optimiser.tuning.kit import Choices
from optimiser.tuning.shelf import Shelf

Candidates = Mapping[Place, tuple[Candidate, ...]]


def fits(shelf: Shelf, row: Sequence[tuple[Candidate, ...]]) -> Mask:
    """Which combinations of one candidate a circuit the drawer builds at once, (n,) or (n, m)."""
    taken = [
        shelf.uses([one.stack for one in candidates], circuit)
        for circuit, candidates in enumerate(row)
    ]
    if len(taken) == 1:
        return np.asarray((taken[0] <= shelf.quantity).all(axis=1))
    both = taken[0][:, None] + taken[1][None]
    return np.asarray((both <= shelf.quantity).all(axis=2))


def choose_by_chain(
    candidates: Candidates, shelf: Shelf, circuits: int, price: float
) -> dict[Place, Candidate]:
    """For each feel the chain of least error and changes; see :func:`chain.best_chain`.

    A row that lacks a circuit, or whose circuits the drawer cannot build at once, interrupts the
    chain; there the first circuit takes its best candidate, the second the best that fits.
    """
    chosen: dict[Place, Candidate] = {}
    for feel in sorted({place.feel for place in candidates}):
        masses = sorted({place.mass for place in candidates if place.feel == feel})
        run: list[list[Place]] = []
        for mass in masses:
            places = [Place(mass, feel, circuit) for circuit in range(circuits)]
            if _complete(candidates, shelf, places):
                run.append(places)
                continue
            chosen |= _chained(candidates, shelf, run, price)
            chosen |= _alone(candidates, shelf, places)
            run = []
        chosen |= _chained(candidates, shelf, run, price)
    return chosen


def choose_from_one_drawer(
    candidates: Candidates, shelf: Shelf
) -> tuple[dict[Place, Candidate], bool]:
    """Stacks that can all lie on the bench at once, and whether nothing better exists.

    As many cells as possible, then the least sum of errors; cells left empty are missing.
    """
    places = sorted(place for place in candidates if candidates[place])
    cells = [choices_of(candidates[place], shelf, place.circuit) for place in places]
    assignment = assign(cells, shelf.quantity)
    chosen = {
        place: candidates[place][number]
        for place, number in zip(places, assignment.choice, strict=True)
        if number is not None
    }
    return chosen, assignment.proven


def choices_of(candidates: Sequence[Candidate], shelf: Shelf, circuit: int) -> Choices:
    """Candidates of one circuit of one cell as numbers."""
    errors = np.array([one.error_percent for one in candidates])
    return Choices(errors, shelf.uses([one.stack for one in candidates], circuit))


def _complete(candidates: Candidates, shelf: Shelf, places: Sequence[Place]) -> bool:
    row = [candidates.get(place, ()) for place in places]
    return all(row) and bool(fits(shelf, row).any())


def _chained(
    candidates: Candidates, shelf: Shelf, run: Sequence[Sequence[Place]], price: float
) -> dict[Place, Candidate]:
    if not run:
        return {}
    rows = []
    for places in run:
        row = [candidates[place] for place in places]
        errors = tuple(np.array([one.error_percent for one in part]) for part in row)
        stacks = tuple(tuple(one.stack for one in part) for part in row)
        rows.append(Row(errors, stacks, fits(shelf, row)))
    choice = best_chain(rows, price).choice
    return {
        place: candidates[place][number]
        for places, numbers in zip(run, choice, strict=True)
        for place, number in zip(places, numbers, strict=True)
    }


def _alone(candidates: Candidates, shelf: Shelf, places: Sequence[Place]) -> dict[Place, Candidate]:
    """The best of each circuit in turn that the drawer still builds."""
    chosen: dict[Place, Candidate] = {}
    left = shelf.quantity.copy()
    for place in places:
        part = candidates.get(place, ())
        uses = shelf.uses([one.stack for one in part], place.circuit)
        possible = np.flatnonzero((uses <= left).all(axis=1))
        if possible.size:
            chosen[place] = part[int(possible[0])]
            left = left - uses[possible[0]]
    return chosen
