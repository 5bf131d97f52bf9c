"""How long the example tune table takes, what warm starts gain and how it scales.

``python -m tests.bench.table`` prints the seconds of the whole table (8 masses x 3 feels x 2
circuits = 48 searches) for one and more workers and for parts of it, and what a cold search must
spend to be as good as one that begins from its neighbour's stacks.
"""

import os
import platform
from collections.abc import Iterator
from concurrent.futures import Executor
from contextlib import contextmanager
from dataclasses import replace
from time import perf_counter

import numpy as np

from optimiser.search.find import Order
from optimiser.table_files import read_request
from optimiser.tuning.cell_search import search_cell
from optimiser.tuning.cells import Cell, Materials, Place, cells_of, derive_all
from optimiser.tuning.executors import Here, local
from optimiser.tuning.runner import Forgetful, carry_out
from optimiser.tuning.steps import search_steps
from optimiser.tuning.table import make_table
from optimiser.tuning.tasks import SearchTask

WORKERS = (1, 2)
MASSES = (2, 4, 8)
#: A cold search spends so many times a warm one's evaluations until it is as good.
EFFORTS = (1, 2, 4, 8, 16)
#: Errors closer than this count as equal, points.
EQUAL = 0.1
FEEL = 1


@contextmanager
def _ready(workers: int) -> Iterator[Executor]:
    """An executor whose processes have loaded (and compiled) the model."""
    with local(workers) as executor:
        cell = next(iter(_cells(read_request("example-table").materials).values()))
        settings = replace(cell.order.settings, evaluations=100)
        task = SearchTask(replace(cell.order, settings=settings))
        for future in [executor.submit(task.run) for _ in range(2 * workers)]:
            future.result()
        yield executor


def _cells(materials: Materials) -> dict[Place, Cell]:
    return cells_of(materials, derive_all(materials))


def _timed_table(materials: Materials, workers: int) -> tuple[float, int, float]:
    """Seconds, stacks tried and the mean error, %."""
    with _ready(workers) as executor:
        began = perf_counter()
        table = make_table(materials, executor, Forgetful())
        seconds = perf_counter() - began
    errors = [one.error_percent for one in table.chosen.values()]
    return seconds, table.evaluations, float(np.mean(errors))


def show_scaling(materials: Materials) -> None:
    request = materials.request
    print("masses  searches  workers  seconds  stacks tried  mean error %")
    for masses in MASSES:
        fewer = request.model_copy(update={"rider_masses_kg": request.rider_masses_kg[:masses]})
        for workers in WORKERS if masses == MASSES[-1] else WORKERS[-1:]:
            seconds, tried, error = _timed_table(replace(materials, request=fewer), workers)
            row = f"{masses:6d} {fewer.cells:9d} {workers:8d} {seconds:8.1f}"
            print(f"{row} {tried:13d} {error:13.2f}", flush=True)


def show_warm_starts(materials: Materials) -> None:
    """One feel, every mass but the middle one, both circuits."""
    cells = {place: cell for place, cell in _cells(materials).items() if place.feel == FEEL}
    masses = len(materials.request.rider_masses_kg)
    warm = carry_out(search_steps(cells, masses), Here(), Forgetful())
    middle = (masses - 1) // 2
    places = [place for place in cells if place.mass != middle]
    efforts, seconds = [], []
    for place in places:
        effort, spent = _cold_effort(cells[place].order, warm[place].candidates[0].error_percent)
        efforts.append(effort)
        seconds.append(spent)
    warm_seconds = [warm[place].seconds for place in places]
    beyond = sum(effort > EFFORTS[-1] for effort in efforts)
    print(f"{len(places)} cells of one feel, errors within {EQUAL:g} points counted as equal:")
    print(f"warm: {np.mean(warm_seconds):.2f} s a cell")
    print(
        f"cold: {np.mean(seconds):.2f} s a cell to be as good, "
        f"{np.mean(seconds) / np.mean(warm_seconds):.1f} times as long; "
        f"evaluations, times a warm search's: median {np.median(efforts):g}; "
        f"{beyond} cells not as good with {EFFORTS[-1]} times"
    )


def _cold_effort(order: Order, error_percent: float) -> tuple[float, float]:
    """Evaluations, times the order's own, that a cold search needs, and its seconds."""
    spent = 0.0
    for effort in EFFORTS:
        settings = replace(order.settings, evaluations=effort * order.settings.evaluations)
        began = perf_counter()
        found, _ = search_cell(replace(order, settings=settings))
        spent = perf_counter() - began
        if (
            min((c.error_percent for c in found if c.sound), default=np.inf)
            <= error_percent + EQUAL
        ):
            return effort, spent
    return 2 * EFFORTS[-1], spent


def main() -> None:
    materials = read_request("example-table").materials
    print(f"{platform.processor() or platform.machine()}, {os.cpu_count()} cores")
    show_scaling(materials)
    print()
    show_warm_starts(materials)


if __name__ == "__main__":
    main()
