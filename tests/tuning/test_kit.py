"""Kits are the smallest there are, and their front is the whole trade-off's."""

from itertools import product

import numpy as np
import pytest

from optimiser.tuning.kit import Choices, Kit, KitTask, Measure, kit_front, kit_of


def random_task(seed: int, cells: int = 4, candidates: int = 3, sizes: int = 5) -> KitTask:
    rng = np.random.default_rng(seed)
    return KitTask(
        tuple(
            tuple(
                Choices(
                    np.round(np.sort(rng.uniform(1, 5, candidates)), 2),
                    rng.integers(0, 4, (candidates, sizes)),
                )
                for _ in range(int(rng.integers(1, 3)))
            )
            for _ in range(cells)
        ),
        np.full(sizes, 20),
        np.round(rng.uniform(0.5, 3.0, sizes), 2),
    )


def every_kit(task: KitTask) -> list[Kit]:
    ways = [range(len(choices.error_percent)) for cell in task.cells for choices in cell]
    kits = []
    for numbers in product(*ways):
        left = iter(numbers)
        kits.append(kit_of(task, [[next(left) for _ in cell] for cell in task.cells]))
    return [kit for kit in kits if (kit.quantity <= task.most).all()]


def measured(kit: Kit, by: Measure) -> float:
    return {"pieces": kit.pieces, "sizes": kit.sizes, "price": kit.cost}[by] or 0.0


@pytest.mark.parametrize("by", ["pieces", "sizes", "price"])
@pytest.mark.parametrize("seed", range(4))
def test_kits_equal_enumeration(seed: int, by: Measure) -> None:
    task = random_task(seed)
    every = [(measured(kit, by), kit.error_percent) for kit in every_kit(task)]
    front = kit_front(task, by)
    assert front[0].proven
    assert measured(front[0], by) == pytest.approx(min(size for size, _ in every))
    assert front[-1].error_percent == pytest.approx(min(error for _, error in every))
    for kit in front:
        size, error = measured(kit, by), kit.error_percent
        better = [
            one
            for one in every
            if one[0] <= size + 1e-6
            and one[1] <= error + 1e-6
            and one[0] + one[1] < size + error - 1e-5
        ]
        assert better == []


def test_there_are_three_kits_between_few_shims_and_little_error() -> None:
    front = kit_front(random_task(3))
    assert len(front) >= 3
    sizes = [kit.pieces for kit in front]
    errors = [kit.error_percent for kit in front]
    assert sizes == sorted(set(sizes))
    assert errors == sorted(set(errors), reverse=True)


@pytest.mark.parametrize("seed", range(3))
def test_a_kit_builds_any_one_cell(seed: int) -> None:
    task = random_task(seed)
    for kit in kit_front(task):
        for cell, numbers in zip(task.cells, kit.choice, strict=True):
            needed = sum(part.uses[k] for part, k in zip(cell, numbers, strict=True))
            assert (needed <= kit.quantity).all()
        assert kit.cost == pytest.approx(float(kit.quantity @ task.price))


def test_a_kit_takes_no_more_than_the_drawer_holds() -> None:
    task = random_task(5)
    short = KitTask(task.cells, np.array([4, 4, 4, 4, 4]), task.price)
    every = every_kit(short)
    front = kit_front(short)
    assert len(every) < len(every_kit(task))
    assert front[0].pieces == min(kit.pieces for kit in every)
    assert all((kit.quantity <= short.most).all() for kit in front)


def test_nothing_to_build_has_no_kit_and_prices_must_be_known() -> None:
    task = random_task(0)
    assert kit_front(KitTask((), task.most)) == ()
    assert kit_front(KitTask(task.cells, np.zeros(5, dtype=np.int64))) == ()
    with pytest.raises(ValueError, match="price"):
        kit_front(KitTask(task.cells, task.most), "price")
