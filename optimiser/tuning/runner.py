"""Carry out tasks that depend on each other, on any executor, remembering what is finished."""

from collections.abc import Callable, Mapping, Sequence
from concurrent.futures import FIRST_COMPLETED, Executor, Future, wait
from dataclasses import dataclass
from typing import Any, Generic, Protocol, TypeVar

from optimiser.tuning.tasks import Result, Task, result_from, run_task

K = TypeVar("K")


class Journal(Protocol):
    """Remembers records by key; ``get`` returns None for what it does not know."""

    def get(self, key: str) -> dict[str, Any] | None:
        """The record of a key."""

    def put(self, key: str, record: dict[str, Any]) -> None:
        """Keep a record, whole or not at all."""


class Forgetful:
    """A journal for one run only."""

    def get(self, key: str) -> dict[str, Any] | None:
        """Nothing."""
        return None

    def put(self, key: str, record: dict[str, Any]) -> None:
        """Keep nothing."""


@dataclass(frozen=True)
class Step(Generic[K]):
    """One task to come: made from the results of ``sources``, which must be steps as well."""

    sources: tuple[K, ...]
    make: Callable[[Sequence[Result]], Task | None]
    """The task; None: nothing to do, the result is empty."""


#: Called with the step's name, its result and whether the journal knew it.
Tell = Callable[[K, Result, bool], None]


def carry_out(
    steps: Mapping[K, Step[K]],
    executor: Executor,
    journal: Journal,
    tell: Tell[K] | None = None,
) -> dict[K, Result]:
    """Results of all steps. Each depends on its task alone, never on the order of finishing.

    A task whose fingerprint the journal knows is not done again; every result is put there as
    soon as it is finished. What a task raises is raised; the others are then called off.
    """
    run = _Run(steps, executor, journal, tell or _quiet)
    try:
        return run.all()
    except BaseException:
        run.call_off()
        raise


class _Run(Generic[K]):
    """What is done, what is under way and what waits for its sources."""

    def __init__(
        self, steps: Mapping[K, Step[K]], executor: Executor, journal: Journal, tell: Tell[K]
    ) -> None:
        self._waiting = dict(steps)
        self._executor, self._journal, self._tell = executor, journal, tell
        self._done: dict[K, Result] = {}
        self._under_way: dict[Future[Result], tuple[K, str]] = {}

    def all(self) -> dict[K, Result]:
        """Start whatever can start until nothing is left."""
        while self._waiting or self._under_way:
            started = self._start_ready()
            if self._under_way:
                self._collect()
            elif not started:
                raise ValueError(f"steps wait for each other: {list(self._waiting)}")
        return self._done

    def call_off(self) -> None:
        """Start nothing more."""
        for future in self._under_way:
            future.cancel()

    def _start_ready(self) -> bool:
        """Start every step whose sources are done; whether there was one."""
        ready = [
            (name, step)
            for name, step in self._waiting.items()
            if all(source in self._done for source in step.sources)
        ]
        for name, step in ready:
            del self._waiting[name]
            self._start(name, step.make([self._done[source] for source in step.sources]))
        return bool(ready)

    def _start(self, name: K, task: Task | None) -> None:
        if task is None:
            self._done[name] = Result(())
            return
        key = task.key
        known = self._remembered(key)
        if known is None:
            self._under_way[self._executor.submit(run_task, task)] = name, key
        else:
            self._done[name] = known
            self._tell(name, known, True)

    def _remembered(self, key: str) -> Result | None:
        """What the journal holds; a record that cannot be read is as good as none."""
        record = self._journal.get(key)
        if record is None:
            return None
        try:
            return result_from(record)
        except (KeyError, TypeError, ValueError):
            return None

    def _collect(self) -> None:
        """Wait for the next results and keep them."""
        finished, _ = wait(self._under_way, return_when=FIRST_COMPLETED)
        for future in finished:
            name, key = self._under_way.pop(future)
            result = future.result()
            self._journal.put(key, result.record())
            self._done[name] = result
            self._tell(name, result, False)


def _quiet(_name: object, _result: Result, _remembered: bool) -> None:
    """Tell nobody."""
