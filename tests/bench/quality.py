"""How good the search is, on the real model: `python -m tests.bench.quality
[exact|recover|compare]`.

* exact: spaces that can be tried out completely; the front found with 5 % of the evaluations
  against the exact one (hypervolume by moocore, best error), ten seeds each;
* recover: random buildable stacks of the workshop stock, their own predicted curve as target;
* compare: hypervolume against random stacks and the library's own operators at equal evaluations.
"""

import sys
import time
from dataclasses import dataclass, replace

import moocore
import numpy as np

from optimiser.damper import Direction
from optimiser.files import read_damper, read_oil, read_steel, read_stock
from optimiser.prediction import Setup, predict
from optimiser.search.archive import Archive
from optimiser.search.engine import Search, Settings
from optimiser.search.enumerate import all_plans
from optimiser.search.evaluate import ModelEvaluator
from optimiser.search.evaluator import evaluate_in_parallel
from optimiser.search.find import Order, find
from optimiser.search.operators import sample
from optimiser.search.repair import Repair
from optimiser.search.rules import Limits
from optimiser.search.space import Space
from optimiser.stock import StockItem
from optimiser.wanted.target import Target
from optimiser.wish import EXAMPLE_DAMPER

SEEDS = range(10)
WORST = np.array([0.5, 15.0, 3.0])
VELOCITIES = (0.05, 0.1, 0.2, 0.35, 0.5, 0.75, 1.0)


@dataclass(frozen=True)
class Case:
    """One space to be tried out completely."""

    name: str
    damper: str
    direction: Direction
    items: tuple[StockItem, ...]
    limits: Limits
    shape: float  # how far the target is bent


def setup_of(damper: str, direction: Direction) -> Setup:
    """A bundled damper with its own oil and steel."""
    read = read_damper(damper)
    steel, oil = read_steel(read.steel), read_oil(read.oil)
    return Setup(read, direction, steel, oil, read.oil_temp_c)


def drawer(text: str, bore_mm: float = 12.0) -> tuple[StockItem, ...]:
    """Items from 'quantity x outer x thickness' words."""
    items = []
    for word in text.split():
        quantity, outer, thickness = word.split("x")
        items.append(StockItem(float(outer), bore_mm, float(thickness), int(quantity)))
    return tuple(items)


CASES = (
    Case(
        "crossovers",
        "rear-monotube",
        "compression",
        drawer(
            "3x40x0.25 2x40x0.20 2x38x0.20 2x36x0.20 1x34x0.20 1x32x0.20 2x28x0.20 2x24x0.20 "
            "1x22x0.15 2x20x0.30 2x18x0.30"
        ),
        Limits(parts=8, stages=(1, 2)),
        0.06,
    ),
    Case(
        "preloaded seat",
        "digressive-monotube",
        "compression",
        tuple(read_stock("small-shop").for_post(12.0)),
        Limits(parts=7, stages=(1,)),
        -0.05,
    ),
    Case(
        "fork base valve",
        "fork-cartridge",
        "compression",
        tuple(read_stock("workshop").for_post(8.0)),
        Limits(parts=6, stages=(1,)),
        0.05,
    ),
)


def target_of(setup: Setup, space: Space, shape: float) -> Target:
    """The curve of one of the space's stacks, bent over velocity so that no stack meets it."""
    _, known = _hidden(setup, space, 2, np.random.default_rng(1))
    bend = 1.0 + shape * np.sin(3.0 * np.log(known.velocity_m_s))
    return Target.of(known.velocity_m_s, known.force_n * bend, direction=setup.direction)


def volume(archive: Archive) -> float:
    """Hypervolume of an archive's front in the box from 0 to WORST."""
    front = archive.objectives[archive.front()][:, :3]
    inside = front[(front < WORST).all(axis=1)] / WORST
    return float(moocore.hypervolume(inside, ref=np.ones(3))) if len(inside) else 0.0


def exact() -> None:
    """Print found over exact hypervolume and the distance to the exact best error."""
    for case in CASES:
        setup = setup_of(case.damper, case.direction)
        space = Space.of(case.items, setup.valve, case.limits)
        target = target_of(setup, space, case.shape)
        evaluator = evaluate_in_parallel(ModelEvaluator(setup, space, target), 2)
        plans = all_plans(space, 1_000_000)
        assert plans is not None
        whole = Archive(space, evaluator)
        for start in range(0, len(plans), 4096):
            whole.rows(plans[start : start + 4096])
        best, full = whole.objectives[whole.front(), 0].min(), volume(whole)
        most = len(plans) // 20
        settings = Settings(evaluations=most, enumerate_up_to=0)
        shares, gaps = [], []
        for seed in SEEDS:
            found = Search(space, evaluator, seed, settings).run().archive
            shares.append(volume(found) / full)
            gaps.append(100.0 * (found.objectives[found.front(), 0].min() - best))
        good = sum(s >= 0.995 and g <= 0.05 for s, g in zip(shares, gaps, strict=True))
        print(
            f"{case.name}: {len(plans)} stacks, {most} tried, best {100 * best:.3f} %: hypervolume "
            f"{100 * min(shares):.2f} to {100 * max(shares):.2f} % of exact, best error within "
            f"{max(gaps):.3f} points, good {good} of {len(shares)}",
            flush=True,
        )


def recover(count: int = 60, evaluations: int = 30_000) -> None:
    """Print how many random stacks are found again from their own curve."""
    rng = np.random.default_rng(7)
    dampers = ("rear-monotube", "rear-monotube", "digressive-monotube")
    errors, seconds = [], []
    for number in range(count):
        setup = setup_of(dampers[number % 3], "compression" if number % 2 else "rebound")
        post = setup.valve.post
        assert post is not None
        lines = tuple(read_stock("workshop").for_post(post.post_mm))
        space = Space.of(lines, setup.valve, Limits())
        stack, target = _hidden(setup, space, number % 3, rng)
        began = time.perf_counter()
        settings = Settings(evaluations=evaluations)
        order = Order(setup, target, lines, rank_by="error", settings=settings, workers=2)
        found = find(replace(order, seed=number))
        seconds.append(time.perf_counter() - began)
        errors.append(min(p.error_percent for p in found.proposals))
        print(f"{number + 1}: {errors[-1]:.3f} % {' '.join(stack)}", flush=True)
    good = sum(error <= 0.5 for error in errors)
    print(
        f"recovered to 0.5 % or better: {good} of {count}; worst {max(errors):.2f} %, median "
        f"{np.median(errors):.3f} %; {np.mean(seconds):.1f} s each"
    )


def _hidden(
    setup: Setup, space: Space, kind: int, rng: np.random.Generator
) -> tuple[list[str], Target]:
    """A random stack within the model's range (a taper, two stages, any) and its curve."""
    while True:
        plan = sample(Repair(space), 1, rng)[0]
        if kind < 2 and bool(space.decode(plan[None]).two_stage[0]) != (kind == 1):
            continue
        stack = space.to_stack(plan, real=True)
        known = predict(setup, stack, VELOCITIES, (setup.clicks_range + 1) // 2)
        if not known.outside_model and np.all(np.isfinite(known.force_n)):
            target = Target.of(known.velocity_m_s, known.force_n, direction=setup.direction)
            return stack.lines(), target


def compare(evaluations: int = 8_000) -> None:
    """Print hypervolume of three searches at equal evaluations, seed by seed."""
    from tests.bench.search_baselines import library_search, random_search

    setup = setup_of(EXAMPLE_DAMPER, "compression")
    post = setup.valve.post
    assert post is not None
    space = Space.of(read_stock("workshop").for_post(post.post_mm), setup.valve, Limits())
    evaluator = evaluate_in_parallel(ModelEvaluator(setup, space, target_of(setup, space, 0.06)), 2)
    settings = Settings(evaluations=evaluations, enumerate_up_to=0)
    print(f"{evaluations} evaluations each: hypervolume (best error, %)")
    for seed in SEEDS:
        archives = {
            "this search": Search(space, evaluator, seed, settings).run().archive,
            "library operators": library_search(space, evaluator, evaluations, seed),
            "random stacks": random_search(space, evaluator, evaluations, seed),
        }
        cells = [
            f"{name} {volume(a):.4f} ({100 * a.objectives[a.front(), 0].min():.2f})"
            for name, a in archives.items()
        ]
        print(f"seed {seed}: " + ", ".join(cells), flush=True)


if __name__ == "__main__":
    parts = {"exact": exact, "recover": recover, "compare": compare}
    for name in sys.argv[1:] or list(parts):
        parts[name]()
