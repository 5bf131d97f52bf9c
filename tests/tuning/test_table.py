"""A small real table: its stacks can be built, and it is the same however it was made."""

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from optimiser.damper import Direction
from optimiser.prediction import predict
from optimiser.report.tune_table_document import table_document
from optimiser.search.pair import can_build_both
from optimiser.stock import Stock, StockItem
from optimiser.table_files import open_journal, read_request
from optimiser.tuning.buying import what_to_buy
from optimiser.tuning.candidate import within
from optimiser.tuning.cells import Materials, Place
from optimiser.tuning.executors import Here, local, scheduler
from optimiser.tuning.runner import Forgetful
from optimiser.tuning.shortage import needs_of
from optimiser.tuning.table import TuneTable, make_table

from .builders import TINY, candidate, random_stacks, stack_of, write_request

BOTH = TINY.replace('circuits = ["compression"]', "").replace("[74, 82]", "[82]")


@pytest.fixture(scope="module")
def materials(tmp_path_factory: pytest.TempPathFactory) -> Materials:
    return read_request(write_request(tmp_path_factory.mktemp("request"))).materials


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("table")


@pytest.fixture(scope="module")
def made(materials: Materials, folder: Path) -> TuneTable:
    return make_table(materials, Here(), open_journal(folder))


@pytest.fixture(scope="module")
def both(tmp_path_factory: pytest.TempPathFactory) -> TuneTable:
    """Both circuits from one drawer."""
    read = read_request(write_request(tmp_path_factory.mktemp("both"), BOTH))
    return make_table(read.materials, Here(), Forgetful())


def test_every_cell_has_a_stack_that_does_what_it_says(made: TuneTable) -> None:
    setup = made.materials.setups[0]
    assert set(made.chosen) == set(made.cells)
    for place, one in made.chosen.items():
        target = made.cells[place].order.target
        seen = predict(setup, one.stack, target.velocity_m_s, one.clicks)
        assert one.clicks == 11
        assert target.error_percent(seen.force_n) == pytest.approx(one.error_percent, abs=0.3)
        assert not made.materials.stock.shortage(one.stack, 12.0)


def test_two_processes_give_the_same_table(made: TuneTable) -> None:
    with local(2) as pool:
        other = make_table(made.materials, pool, Forgetful())
    assert table_document(other) == table_document(made)


def test_dask_gives_the_same_table(made: TuneTable, cluster: Any) -> None:
    with scheduler(cluster.scheduler_address) as executor:
        other = make_table(made.materials, executor, Forgetful())
    assert table_document(other) == table_document(made)


def test_the_journal_gives_the_same_table_without_a_search(made: TuneTable, folder: Path) -> None:
    known: list[bool] = []
    other = make_table(
        made.materials, Here(), open_journal(folder), lambda *told: known.append(told[3])
    )
    assert known
    assert all(known)
    assert table_document(other) == table_document(made)


def test_what_a_task_depends_on_changes_its_key(made: TuneTable, folder: Path) -> None:
    other = replace(made.materials, request=made.materials.request.model_copy(update={"seed": 1}))
    known: list[bool] = []

    def tell(_stage: str, _place: Place, _result: object, remembered: bool) -> None:
        known.append(remembered)
        raise StopIteration

    with pytest.raises(StopIteration):
        make_table(other, Here(), open_journal(folder), tell)
    assert known == [False]


def test_both_stacks_of_a_cell_can_be_built_at_once(both: TuneTable) -> None:
    one, other = (both.chosen[Place(0, 0, circuit)].stack for circuit in (0, 1))
    assert can_build_both(one, other, both.materials.stock, (12.0, 12.0))
    kit = both.kit
    assert kit is not None
    assert kit.kit.pieces == one.parts + other.parts


def test_every_kit_builds_every_cell(made: TuneTable, both: TuneTable) -> None:
    for table in (made, both):
        for one in (table.kit, *table.kits):
            assert one is not None
            drawer = Stock(
                StockItem(outer, post, thickness, int(count))
                for (outer, thickness, post), count in zip(
                    table.shelf.sizes, one.kit.quantity, strict=True
                )
            )
            cells = {(place.mass, place.feel) for place in one.stacks}
            for mass, feel in cells:
                left = drawer
                for place, chosen in one.stacks.items():
                    if (place.mass, place.feel) == (mass, feel):
                        left = left.take(chosen.stack, 12.0)


def test_one_drawer_builds_the_whole_table_at_once(made: TuneTable) -> None:
    request = made.materials.request.model_copy(update={"one_drawer": True})
    table = make_table(replace(made.materials, request=request), Here(), Forgetful())
    left = made.materials.stock
    for one in table.chosen.values():
        left = left.take(one.stack, 12.0)
    assert left.pieces == made.materials.stock.pieces - sum(
        one.stack.parts for one in table.chosen.values()
    )
    assert set(table.reasons) == set(table.cells) - set(table.chosen)


def test_nothing_to_buy_where_nothing_is_short(made: TuneTable) -> None:
    assert needs_of(made) == {}
    assert what_to_buy({}, Stock(), 5.0, Here(), Forgetful()) == ()


def test_candidates_within_the_tolerance() -> None:
    stacks = random_stacks(np.random.default_rng(0), 4)
    good, poor = candidate(stacks[0], 2.0), candidate(stacks[1], 6.0)
    worn = candidate(stacks[2], 1.0, utilisation=1.2)
    assert within((poor, worn, good), 5.0) == (good,)
    assert within((poor, worn), 5.0) == (poor,)
    assert within((worn,), 5.0) == (worn,)
    assert within((), 5.0) == ()
    near = candidate(stack_of([3, 3, 0, 0, 0]), 6.4)
    assert within((poor, near), 5.0) == (poor, near)


def test_directions_are_those_of_the_request(both: TuneTable) -> None:
    expected: list[Direction] = ["compression", "rebound"]
    assert [setup.direction for setup in both.materials.setups] == expected
