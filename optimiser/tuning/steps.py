"""Which searches a table needs, and from whose stacks each begins."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

from optimiser.stack import Stack
from optimiser.stock import Stock
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.cells import Cell, Place
from optimiser.tuning.project import projected
from optimiser.tuning.runner import Step
from optimiser.tuning.tasks import Result, SearchTask, SettleTask, Task

#: Stacks a search begins from, and stacks each cell gives to the pool of its circuit.
BEGIN_WITH, TO_POOL = 12, 6


def search_steps(
    cells: Mapping[Place, Cell], masses: int, warm: bool = True
) -> dict[Place, Step[Place]]:
    """A search a cell: the middle mass first, then outwards, each from its inner neighbour.

    Who begins from whom depends on the table alone, not on what finishes first. ``warm`` False:
    every cell begins from nothing.
    """
    middle = (masses - 1) // 2
    steps: dict[Place, Step[Place]] = {}
    for place in sorted(cells, key=lambda place: (abs(place.mass - middle), place)):
        inner = place.mass + (1 if place.mass < middle else -1)
        sources = (replace(place, mass=inner),) if warm and place.mass != middle else ()
        steps[place] = Step(sources, _Search(cells[place]))
    return steps


def settle_steps(
    cells: Mapping[Place, Cell], found: Mapping[Place, Result], places: Iterable[Place]
) -> dict[Place, Step[Place]]:
    """A closer look for each of the places that has a stack, at what all the others found."""
    steps: dict[Place, Step[Place]] = {}
    for place in places:
        cell = cells[place]
        own = found[place].candidates
        if not own:
            continue
        pool = _pool(place, found)
        rows = [replace(place, mass=place.mass + step) for step in (-1, 1)]
        beside = [found[row].candidates[:1] for row in rows if row in found]
        stacks = tuple(one.stack for best in beside for one in best)
        steps[place] = Step((), Known(SettleTask(cell.order, own, pool, stacks)))
    return steps


def again_steps(cells: Mapping[Place, Cell], places: Iterable[Place]) -> dict[Place, Step[Place]]:
    """Another search from nothing with other random numbers: a neighbour's stacks may mislead."""
    steps: dict[Place, Step[Place]] = {}
    for place in places:
        order = cells[place].order
        steps[place] = Step((), Known(SearchTask(replace(order, seed=order.seed + 1))))
    return steps


def rest_step(
    cell: Cell, taken: Sequence[tuple[Stack, float]], stock: Stock, post_mm: float, known: Result
) -> Step[Place]:
    """A search of a cell from what is left in the drawer when other stacks are built.

    ``taken`` those stacks with their posts, mm; ``post_mm`` the cell's own post; ``known`` what
    the whole drawer gave.
    """
    for stack, post in taken:
        stock = stock.take(stack, post)
    lines = tuple(stock.for_post(post_mm))
    left = [one for one in known.candidates if not stock.shortage(one.stack, post_mm)]
    seat = cell.order.setup.valve.seat
    made = [
        projected(one.stack, lines, seat.cover_mm if seat else 0.0)
        for one in known.candidates[:BEGIN_WITH]
    ]
    begin = (*_begin(left), *(stack for stack in made if stack is not None))
    return Step((), Known(SearchTask(replace(cell.order, lines=lines, start=begin))))


def _begin(candidates: Sequence[Candidate]) -> tuple[Stack, ...]:
    return tuple(one.stack for one in candidates[:BEGIN_WITH])


def _pool(place: Place, found: Mapping[Place, Result]) -> tuple[Stack, ...]:
    """The best stacks of every other cell of the circuit, each once, in the table's order."""
    pool: dict[str, Stack] = {}
    for other in sorted(found):
        if other.circuit == place.circuit and other != place:
            for one in found[other].candidates[:TO_POOL]:
                pool.setdefault(" + ".join(one.stack.lines()), one.stack)
    return tuple(pool.values())


class _Search:
    """Makes a cell's search from the results it begins with."""

    def __init__(self, cell: Cell) -> None:
        self._cell = cell

    def __call__(self, sources: Sequence[Result]) -> Task:
        start = tuple(stack for result in sources for stack in _begin(result.candidates))
        return SearchTask(replace(self._cell.order, start=start))


class Known:
    """Makes a task that is known beforehand."""

    def __init__(self, task: Task) -> None:
        self._task = task

    def __call__(self, _sources: Sequence[Result]) -> Task:
        return self._task
