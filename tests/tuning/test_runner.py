"""Steps run when their sources are done, on any executor, and are not run twice."""

import json
from collections.abc import Sequence
from concurrent.futures import Executor, ThreadPoolExecutor
from pathlib import Path
from typing import Any

import pytest

from optimiser.table_files import FolderJournal, open_journal
from optimiser.tuning.executors import Here
from optimiser.tuning.runner import Forgetful, Step, carry_out
from optimiser.tuning.tasks import Result, Task

from .tasks import Count, Fails


def chain(length: int) -> dict[int, Step[int]]:
    """Each step counts one more than the one before it."""

    def after(sources: Sequence[Result]) -> Task:
        return Count(sum(result.evaluations for result in sources) + 1)

    return {k: Step((k - 1,) if k else (), after) for k in range(length)}


@pytest.mark.parametrize("executor", [Here(), ThreadPoolExecutor(3)])
def test_steps_get_what_their_sources_found(executor: Executor) -> None:
    steps = dict(reversed(chain(6).items()))
    found = carry_out(steps, executor, Forgetful())
    assert {k: result.evaluations for k, result in found.items()} == {k: k + 1 for k in range(6)}


def test_a_finished_step_is_not_run_again(tmp_path: Path) -> None:
    told: list[tuple[int, bool]] = []

    def tell(name: int, _result: Result, known: bool) -> None:
        told.append((name, known))

    journal = open_journal(tmp_path / "out")
    first = carry_out(chain(3), Here(), journal, tell)
    second = carry_out(chain(4), Here(), open_journal(tmp_path / "out"), tell)
    assert told == [(0, False), (1, False), (2, False), (0, True), (1, True), (2, True), (3, False)]
    assert all(second[k] == first[k] for k in first)


def test_records_come_back_exactly(tmp_path: Path) -> None:
    journal = open_journal(tmp_path)
    found = carry_out(chain(2), Here(), journal)
    again = carry_out(chain(2), _Never(), open_journal(tmp_path))
    assert again == found


@pytest.mark.parametrize("damaged", ["", "{", "[]", "{}", '{"candidates": 3}', "\x00"])
def test_a_damaged_record_is_found_anew(tmp_path: Path, damaged: str) -> None:
    carry_out(chain(1), Here(), open_journal(tmp_path))
    (file,) = (tmp_path / "cells").iterdir()
    whole = file.read_text(encoding="utf-8")
    file.write_text(damaged, encoding="utf-8")
    carry_out(chain(1), Here(), open_journal(tmp_path))
    assert json.loads(file.read_text(encoding="utf-8")) == json.loads(whole)


def test_a_bug_in_a_task_keeps_its_type() -> None:
    with pytest.raises(ZeroDivisionError, match="a bug"):
        carry_out({0: Step[int]((), lambda _: Fails())}, Here(), Forgetful())


def test_steps_that_wait_for_each_other_are_a_bug() -> None:
    steps = {0: Step((1,), lambda _: Count(1)), 1: Step((0,), lambda _: Count(1))}
    with pytest.raises(ValueError, match="wait for each other"):
        carry_out(steps, Here(), Forgetful())


def test_unknown_keys_have_no_record(tmp_path: Path) -> None:
    assert FolderJournal(tmp_path).get("unknown") is None


class _Never(Executor):
    """Runs nothing."""

    def submit(self, *_arguments: Any, **_named: Any) -> Any:
        raise AssertionError("a task was run again")
