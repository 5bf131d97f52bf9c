"""The same answer from this process, from other processes and from a Dask cluster."""

from pathlib import Path
from typing import Any

import pytest

from optimiser.faults import BadInput
from optimiser.tuning import executors
from optimiser.tuning.executors import Here, local, scheduler
from optimiser.tuning.runner import Forgetful, Step, carry_out

from .tasks import Count, DieOnce


def counts(number: int) -> dict[int, Step[int]]:
    return {k: Step((), lambda _, k=k: Count(k)) for k in range(number)}


def test_one_process_and_two_agree() -> None:
    here = carry_out(counts(6), Here(), Forgetful())
    with local(2) as pool:
        assert carry_out(counts(6), pool, Forgetful()) == here


def test_dask_agrees_with_this_process(cluster: Any) -> None:
    here = carry_out(counts(6), Here(), Forgetful())
    with scheduler(cluster.scheduler_address) as executor:
        assert carry_out(counts(6), executor, Forgetful()) == here


def test_a_lost_worker_does_not_change_the_answer(cluster: Any, tmp_path: Path) -> None:
    """One task ends its worker's process while others are under way."""
    mark = tmp_path / "mark"
    steps = {**counts(4), 9: Step((), lambda _: DieOnce(str(mark)))}
    with scheduler(cluster.scheduler_address) as executor:
        found = carry_out(steps, executor, Forgetful())
    assert mark.read_text(encoding="utf-8") == "tried"
    assert found == carry_out(steps, Here(), Forgetful())


def test_nobody_at_the_address(monkeypatch: pytest.MonkeyPatch) -> None:
    pytest.importorskip("distributed", reason="Dask is not installed")
    monkeypatch.setattr(executors, "_SECONDS_TO_CONNECT", 0.5)
    for address in ("tcp://127.0.0.1:9", "nonsense://x:1"):
        with (
            pytest.raises(BadInput, match=r"--scheduler .*: no scheduler answers"),
            scheduler(address),
        ):
            pass


def test_dask_that_is_not_installed(monkeypatch: pytest.MonkeyPatch) -> None:
    def missing(name: str) -> None:
        raise ModuleNotFoundError(name)

    monkeypatch.setattr(executors, "import_module", missing)
    with (
        pytest.raises(BadInput, match=r"shimwright\[cluster\]"),
        scheduler("tcp://127.0.0.1:1"),
    ):
        pass
