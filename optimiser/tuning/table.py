"""A whole tune table, from what it is asked for to stacks, changes and kits."""

from collections.abc import Callable, Iterable, Mapping
from concurrent.futures import Executor
from dataclasses import dataclass, field, replace
from functools import partial
from typing import Literal

from optimiser.tuning.candidate import Candidate, within
from optimiser.tuning.cells import Cell, Materials, Place, cells_of, derive_all
from optimiser.tuning.choose import choose_by_chain, choose_from_one_drawer, fits
from optimiser.tuning.kits import TableKit, chosen_kit, kits_of
from optimiser.tuning.runner import Journal, Step, carry_out
from optimiser.tuning.shelf import Shelf
from optimiser.tuning.steps import again_steps, rest_step, search_steps, settle_steps
from optimiser.tuning.tasks import Result, kept
from optimiser.wanted.derive import Derived

Stage = Literal["search", "settle", "again", "rest"]
#: Called with the stage, the cell, its result and whether it was known from an earlier run.
Progress = Callable[[Stage, Place, Result, bool], None]

TOGETHER = "the drawer does not build it beside the other circuit's stack"
USED_UP = "the other cells use the drawer up"


@dataclass(frozen=True, eq=False)
class TuneTable:
    """What a table came to.

    ``candidates`` of each cell, those it may choose from, least error first; ``chosen`` the one
    in the table, missing where ``reasons`` says why; ``kit`` what the table as it stands needs to
    build any one mass and feel, ``kits`` smaller ones with other candidates, smallest first.
    ``evaluations`` stacks tried; ``seconds`` of all workers together, s.
    """

    materials: Materials
    derived: Mapping[tuple[int, int], Derived]
    cells: Mapping[Place, Cell]
    candidates: Mapping[Place, tuple[Candidate, ...]]
    chosen: Mapping[Place, Candidate]
    reasons: Mapping[Place, str]
    shelf: Shelf
    kit: TableKit | None
    kits: tuple[TableKit, ...]
    evaluations: int
    seconds: float

    @property
    def changes(self) -> tuple[tuple[Place, Place], ...]:
        """Neighbouring rows that both have a stack, feel by feel and circuit by circuit."""
        order = sorted(self.chosen, key=lambda place: (place.feel, place.circuit, place.mass))
        pairs = ((place, replace(place, mass=place.mass + 1)) for place in order)
        return tuple(pair for pair in pairs if pair[1] in self.chosen)

    @property
    def short(self) -> tuple[Place, ...]:
        """Cells without a stack within the tolerance."""
        limit = self.materials.request.tolerance_percent
        return tuple(
            place
            for place in sorted(self.cells)
            if place not in self.chosen or self.chosen[place].error_percent > limit
        )


def make_table(
    materials: Materials, executor: Executor, journal: Journal, tell: Progress | None = None
) -> TuneTable:
    """Search every cell, choose the stacks and work out the kits.

    The same materials give the same table on any executor and after any interruption. Raises
    BadInput for riders the frame cannot carry.
    """
    derived = derive_all(materials)
    work = _Work(materials, cells_of(materials, derived), executor, journal, tell or _silent)
    work.search()
    candidates = work.candidates()
    circuits = range(len(materials.setups))
    shelf = Shelf.of(materials.stock, [materials.post_mm(circuit) for circuit in circuits])
    request = materials.request
    if request.one_drawer:
        chosen, _ = choose_from_one_drawer(candidates, shelf)
        chosen |= work.fill_from_rest(chosen)
    else:
        candidates = work.with_pairs(candidates, shelf)
        price = request.change_price_percent
        chosen = choose_by_chain(candidates, shelf, len(circuits), price)
    missing = USED_UP if request.one_drawer else TOGETHER
    return TuneTable(
        materials,
        derived,
        work.cells,
        candidates,
        dict(sorted(chosen.items())),
        {place: work.found[place].reason or missing for place in work.cells if place not in chosen},
        shelf,
        chosen_kit(chosen, shelf),
        kits_of(candidates, chosen, shelf, request.tolerance_percent),
        work.evaluations,
        work.seconds,
    )


@dataclass
class _Work:
    """The searches of a table, in the order they are needed."""

    materials: Materials
    cells: dict[Place, Cell]
    executor: Executor
    journal: Journal
    tell: Progress
    found: dict[Place, Result] = field(default_factory=dict)
    evaluations: int = 0
    seconds: float = 0.0

    def search(self) -> None:
        """Search every cell, let each look at what the others found, and repeat the poor ones."""
        masses = len(self.materials.request.rider_masses_kg)
        self.found = self._carry_out("search", search_steps(self.cells, masses))
        self._settle(self.cells)
        poor = self._poor()
        for place, result in self._carry_out("again", again_steps(self.cells, poor)).items():
            both = kept([*self.found[place].candidates, *result.candidates])
            self.found[place] = replace(self.found[place], candidates=both)
        self._settle(poor)

    def _settle(self, places: Iterable[Place]) -> None:
        self.found |= self._carry_out("settle", settle_steps(self.cells, self.found, places))

    def _poor(self) -> list[Place]:
        """Cells that have a stack but none that is good enough."""
        limit = self.materials.request.tolerance_percent
        best = {place: one.candidates[0] for place, one in self.found.items() if one.candidates}
        return [place for place, one in best.items() if not one.sound or one.error_percent > limit]

    def candidates(self) -> dict[Place, tuple[Candidate, ...]]:
        """Those each cell may choose from; cells without any are missing."""
        tolerance = self.materials.request.tolerance_percent
        good = {place: within(result.candidates, tolerance) for place, result in self.found.items()}
        return {place: some for place, some in good.items() if some}

    def with_pairs(
        self, candidates: dict[Place, tuple[Candidate, ...]], shelf: Shelf
    ) -> dict[Place, tuple[Candidate, ...]]:
        """Candidates with further ones where the drawer builds no two circuits of a cell at once.

        There each circuit is searched again from what the other one's best leaves.
        """
        steps: dict[Place, Step[Place]] = {}
        for place in sorted(candidates):
            other = replace(place, circuit=1 - place.circuit)
            if len(self.materials.setups) < 2 or other not in candidates:
                continue
            row = [candidates[replace(place, circuit=circuit)] for circuit in (0, 1)]
            if not fits(shelf, row).any():
                steps[place] = self._rest(place, {other: candidates[other][0]})
        more = self._carry_out("rest", steps)
        tolerance = self.materials.request.tolerance_percent
        return candidates | {
            place: kept([*candidates[place], *within(result.candidates, tolerance)])
            for place, result in more.items()
        }

    def fill_from_rest(self, chosen: Mapping[Place, Candidate]) -> dict[Place, Candidate]:
        """Cells left empty, one after the other from what is left in the drawer."""
        filled: dict[Place, Candidate] = {}
        for place in sorted(self.cells):
            if place in chosen or not self.found[place].candidates:
                continue
            step = self._rest(place, {**chosen, **filled})
            result = self._carry_out("rest", {place: step})[place]
            best = within(result.candidates, self.materials.request.tolerance_percent)
            if best:
                filled[place] = best[0]
        return filled

    def _rest(self, place: Place, built: Mapping[Place, Candidate]) -> Step[Place]:
        taken = [(one.stack, self.materials.post_mm(other.circuit)) for other, one in built.items()]
        own_mm = self.materials.post_mm(place.circuit)
        stock, known = self.materials.stock, self.found[place]
        return rest_step(self.cells[place], taken, stock, own_mm, known)

    def _carry_out(self, stage: Stage, steps: Mapping[Place, Step[Place]]) -> dict[Place, Result]:
        results = carry_out(steps, self.executor, self.journal, partial(self.tell, stage))
        self.evaluations += sum(result.evaluations for result in results.values())
        self.seconds += sum(result.seconds for result in results.values())
        return results


def _silent(_stage: Stage, _place: Place, _result: Result, _known: bool) -> None:
    """Tell nobody."""
