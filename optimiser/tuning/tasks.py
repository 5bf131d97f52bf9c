"""What a worker does: pure functions of plain data, so that they run anywhere with one answer."""

import json
from collections.abc import Iterable
from dataclasses import asdict, dataclass, replace
from hashlib import sha256
from time import perf_counter
from typing import Any, Protocol

import numpy as np

from optimiser.faults import NothingBuildable
from optimiser.search.find import Order
from optimiser.stack import Stack
from optimiser.tuning.candidate import Candidate, candidate_from
from optimiser.tuning.cell_search import search_cell
from optimiser.tuning.judge import Judge

#: Changes when records or tasks change, so that no old record is taken for a new one.
FORMAT = 1
#: A cell without neighbours is searched so many times harder, for each number of stages.
COLD = 2
#: Stacks a settled cell looks at with the reported fidelity: of the pool, and one change away.
POOLED, CHANGED = 16, 16
#: Candidates kept for each cell.
KEPT = 64


@dataclass(frozen=True)
class Result:
    """What a task found, least error first.

    ``reason`` says why there is nothing; ``seconds`` are the worker's, s.
    """

    candidates: tuple[Candidate, ...]
    evaluations: int = 0
    seconds: float = 0.0
    reason: str | None = None

    def record(self) -> dict[str, Any]:
        """Plain data that :func:`result_from` reads back exactly."""
        return {**vars(self), "candidates": [one.record() for one in self.candidates]}


def result_from(record: dict[str, Any]) -> Result:
    """The result of a record. Raises KeyError, TypeError or ValueError for anything else."""
    found = tuple(candidate_from(one) for one in record["candidates"])
    return Result(**{**record, "candidates": found})


class Task(Protocol):
    """Something to do for one cell."""

    @property
    def key(self) -> str:
        """Fingerprint of everything the answer depends on."""

    def run(self) -> Result:
        """Do it."""


def run_task(task: Task) -> Result:
    """Do a task: the function that is sent to workers."""
    return task.run()


@dataclass(frozen=True)
class SearchTask:
    """A search; with nothing to begin from, one for each number of stages, and harder."""

    order: Order

    @property
    def key(self) -> str:
        """Fingerprint of everything the answer depends on."""
        return fingerprint_of("search", order_record(self.order))

    def run(self) -> Result:
        """Search. Where nothing can be built the reason is in the result."""
        tries = [self.order] if self.order.start else list(_cold(self.order))
        found: list[Candidate] = []
        reasons: list[str] = []
        evaluations, began = 0, perf_counter()
        for order in tries:
            try:
                one, tried = search_cell(order)
            except NothingBuildable as error:
                reasons.append(str(error))
                continue
            found += one
            evaluations += tried
        seconds = perf_counter() - began
        return Result(kept(found), evaluations, seconds, None if found else reasons[0])


def _cold(order: Order) -> Iterable[Order]:
    """A search may settle for one stage where two are far better, so each is tried alone too."""
    settings = replace(order.settings, evaluations=COLD * order.settings.evaluations)
    alone = [(stage,) for stage in order.limits.stages[::-1]]
    for stages in [order.limits.stages, *(alone if len(alone) > 1 else [])]:
        limits = replace(order.limits, stages=stages)
        yield replace(order, limits=limits, settings=settings)


@dataclass(frozen=True)
class SettleTask:
    """More candidates for a cell: stacks of the other cells, and small changes of some.

    ``own`` what the cell's search found, ``pool`` stacks that are good in other cells, ``beside``
    the best of the rows above and below, whose single changes are looked at.
    """

    order: Order
    own: tuple[Candidate, ...]
    pool: tuple[Stack, ...]
    beside: tuple[Stack, ...]

    @property
    def key(self) -> str:
        """Fingerprint of everything the answer depends on."""
        return fingerprint_of(
            "settle",
            order_record(self.order),
            [one.record() for one in self.own],
            *([stack.lines() for stack in stacks] for stacks in (self.pool, self.beside)),
        )

    def run(self) -> Result:
        """Judge the most promising of them; the cell's own are in the result as well."""
        began = perf_counter()
        judge = Judge(self.order, self.own[0].stack)
        plans = [
            judge.best(judge.plans(self.pool), POOLED),
            judge.best(judge.changed(self.beside), CHANGED),
        ]
        found = judge.reported(np.unique(np.concatenate(plans), axis=0))
        seconds = perf_counter() - began
        return Result(kept([*self.own, *found]), judge.evaluations, seconds)


def kept(candidates: Iterable[Candidate]) -> tuple[Candidate, ...]:
    """One of each stack, least error first, sound ones before the others, at most ``KEPT``."""
    best: dict[str, Candidate] = {}
    for one in sorted(candidates, key=lambda candidate: candidate.order):
        best.setdefault(" + ".join(one.stack.lines()), one)
    ordered = sorted(best.values(), key=lambda one: (not one.sound, *one.order))
    return tuple(ordered[:KEPT])


def order_record(order: Order) -> dict[str, Any]:
    """An order as plain data, for fingerprints."""
    setup = order.setup
    return {
        "damper": setup.damper.model_dump(mode="json"),
        "direction": setup.direction,
        "steel": setup.steel.model_dump(mode="json"),
        "oil": setup.oil.model_dump(mode="json"),
        "oil_temp_c": setup.oil_temp_c,
        "target": order.target.record(),
        "lines": [
            [line.outer_mm, line.thickness_mm, line.real_mm, line.quantity] for line in order.lines
        ],
        "limits": asdict(order.limits),
        "click_range": order.click_range,
        "rank_by": order.rank_by,
        "rows": order.rows,
        "seed": order.seed,
        "settings": asdict(order.settings),
        "start": [stack.lines() for stack in order.start],
    }


def fingerprint_of(*parts: object) -> str:
    """24 hexadecimal digits of the SHA-256 of plain data."""
    text = json.dumps([FORMAT, *parts], sort_keys=True, allow_nan=False)
    return sha256(text.encode("utf-8")).hexdigest()[:24]
