"""From everything tried to a short list."""

import numpy as np
import pytest

from optimiser.search.archive import Archive
from optimiser.search.evaluator import Scores
from optimiser.search.operators import sample
from optimiser.search.rank import EXPLAINED, RankBy, rank, worth_checking
from optimiser.search.repair import Repair
from optimiser.search.space import Space
from optimiser.stack import Stack

from .standin import VELOCITY_M_S, StandIn, workshop


class Told:
    """Evaluator that gives out the scores it was told, in order."""

    def __init__(self, rows: list[tuple[float, float, float]]) -> None:
        self.rows = rows

    def evaluate(self, plans: np.ndarray) -> Scores:
        error, utilisation, rise = np.array(self.rows[: len(plans)]).T
        return Scores(error, utilisation, np.full(len(plans), 8.0), rise, np.zeros((len(plans), 0)))


def told(stacks: list[list[str]], rows: list[tuple[float, float, float]]) -> Archive:
    space = workshop()
    plans = [space.from_stack(Stack.parse(lines)) for lines in stacks]
    assert all(plan is not None for plan in plans)
    archive = Archive(space, Told(rows))
    archive.rows(np.stack(plans))
    return archive


A = ["2 x 40 x 0.10", "1 x 34 x 0.10", "1 x 28 x 0.10", "1 x 16 x 0.25"]
A_THICKER = ["2 x 40 x 0.10", "1 x 34 x 0.15", "1 x 28 x 0.10", "1 x 16 x 0.25"]
A_WIDER = ["2 x 40 x 0.10", "1 x 36 x 0.10", "1 x 28 x 0.10", "1 x 16 x 0.25"]
A_CLAMP = ["2 x 40 x 0.10", "1 x 34 x 0.10", "1 x 28 x 0.10", "1 x 18 x 0.25"]
TWO_STAGE = ["1 x 40 x 0.10", "1 x 20 x 0.10", "1 x 34 x 0.10", "1 x 16 x 0.25"]
TALL = ["2 x 40 x 0.15", "2 x 34 x 0.15", "2 x 28 x 0.15", "2 x 24 x 0.15", "1 x 16 x 0.25"]


def test_near_twins_become_one_row_with_their_count() -> None:
    rows = [(0.020, 0.5, 1.0), (0.021, 0.52, 1.0), (0.022, 0.5, 1.0), (0.023, 0.5, 1.0)]
    found = rank(told([A, A_THICKER, A_WIDER, A_CLAMP], rows), "error")
    assert [row.stack.clamp_mm for row in found] == [16, 18]
    assert [row.variants for row in found] == [2, 0]
    assert found[0].error == 0.020


def test_unlike_errors_or_stress_are_no_twins() -> None:
    rows = [(0.020, 0.5, 1.0), (0.027, 0.5, 1.0), (0.021, 0.8, 1.0)]
    found = rank(told([A, A_THICKER, A_WIDER], rows), "error")
    assert [row.variants for row in found] == [0, 0, 0]


@pytest.mark.parametrize(
    ("by", "order"),
    [
        ("error", [9, 5, 4]),
        ("default", [5, 9, 4]),
        ("parts", [4, 5, 9]),
        ("stress", [9, 5, 4]),
    ],
)
def test_each_rule_ranks_as_it_says(by: RankBy, order: list[int]) -> None:
    rows = [(0.0205, 0.5, 1.0), (0.0200, 0.2, 1.0), (0.030, 0.9, 1.0)]
    found = rank(told([A, TALL, TWO_STAGE], rows), by)
    assert [row.parts for row in found] == order
    assert EXPLAINED[by].startswith("Ranked by") and "\n" not in EXPLAINED[by]


def test_a_short_life_counts_as_error_in_the_default_rule() -> None:
    found = rank(told([A, TALL], [(0.010, 1.1, 1.0), (0.025, 0.5, 1.0)]))
    assert [row.parts for row in found] == [9, 5]


def test_stacks_beyond_the_model_come_last_and_are_marked() -> None:
    for by in EXPLAINED:
        found = rank(told([A, TALL, TWO_STAGE], [(0.01, 0.1, 2.5), (0.9, 2, 1), (0.5, 1, 1)]), by)
        assert [row.beyond for row in found] == [False, False, True]
        assert found[-1].error == 0.01


def test_a_real_archive_gives_distinct_rows_in_bounded_number() -> None:
    space: Space = workshop()
    archive = Archive(space, StandIn(space, 30.0 + 180.0 * VELOCITY_M_S), rise_max=9.0)
    archive.rows(sample(Repair(space), 600, np.random.default_rng(0)))
    found = rank(archive, count=12, middle_clicks=10)
    assert len(found) == 12 and len({str(row.stack) for row in found}) == 12
    checked = worth_checking(archive, 30)
    assert len(np.unique(checked, axis=0)) == 30
    front = archive.front()
    best = front[np.argmin(archive.objectives[front, 0])]
    assert (checked == archive.plans[best]).all(axis=1).any()


def test_an_empty_archive_gives_an_empty_list() -> None:
    space = workshop()
    assert rank(Archive(space, StandIn(space, VELOCITY_M_S))) == []
