"""Nothing unbuildable comes out, judged by a checker that shares no code with the search."""

from itertools import product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import NothingBuildable
from optimiser.search.engine import Search, Settings
from optimiser.search.enumerate import all_plans, count_plans, first_plans
from optimiser.search.neighbours import Neighbours
from optimiser.search.obstacles import obstacles
from optimiser.search.operators import Mutation, offspring, sample
from optimiser.search.rank import rank
from optimiser.search.repair import Repair

from .cases import Case, build, cases
from .checker import faults_of
from .standin import VELOCITY_M_S, StandIn


def assert_buildable(case: Case, plans: np.ndarray) -> None:
    for plan in np.unique(plans, axis=0):
        assert faults_of(case.shims(plan), case.bench) == []


@settings(max_examples=60, deadline=None)
@given(case=cases(), seed=st.integers(0, 99))
def test_operators_only_make_buildable_stacks(case: Case, seed: int) -> None:
    rng = np.random.default_rng(seed)
    repair = Repair(case.space)
    junk = rng.integers(-1, len(case.space.sizes) + 3, (40, case.space.width)).astype(np.int16)
    mended = repair(junk, rng)
    if not repair.possible:
        assert not mended.any()
        assert count_plans(case.space, 10) == 0
        assert len(obstacles(case.space)) >= 1
        return
    sampled = sample(repair, 30, rng)
    born = offspring(repair, Mutation(case.space), sampled[:15], sampled[15:], rng)
    near = Neighbours(case.space)
    plans = [mended, sampled, born, near.single(sampled[0]), near.double(sampled[1], 30, rng)]
    for made in plans:
        assert_buildable(case, made)
    assert np.array_equal(repair(sampled, rng), sampled), "repair leaves buildable stacks alone"


@settings(max_examples=25, deadline=None)
@given(case=cases(), seed=st.integers(0, 99))
def test_search_only_returns_buildable_stacks(case: Case, seed: int) -> None:
    wanted = 60.0 + 200.0 * VELOCITY_M_S
    options = Settings(evaluations=300, enumerate_up_to=100)
    search = Search(case.space, StandIn(case.space, wanted), seed, options)
    try:
        outcome = search.run()
    except NothingBuildable as error:
        assert len(str(error)) > 20
        return
    assert_buildable(case, outcome.archive.plans)
    for row in rank(outcome.archive, count=5):
        pieces = [(shim.outer_mm, shim.thickness_mm) for shim in row.stack.pieces]
        assert faults_of(pieces, case.bench) == []
        assert row.parts == len(pieces)


def brute_force(case: Case) -> set[tuple[tuple[tuple[float, float], ...], float]]:
    """(bending shims, clamp diameter) of all stacks, by trying every sequence of shims."""
    bench = case.bench
    shims = [shim for shim, pieces in bench.drawer.items() if pieces > 0]
    found = set()
    for length in range(1, bench.parts):
        for bending in product(shims, repeat=length):
            for clamp in shims:
                if bending[-1] == clamp:
                    continue  # told the same stack with one clamp shim fewer
                for clamps in range(1, bench.parts - length + 1):
                    if not faults_of([*bending, *[clamp] * clamps], bench):
                        found.add((in_order(bending), clamp[0]))
    return found


def in_order(bending: tuple[tuple[float, float], ...]) -> tuple[tuple[float, float], ...]:
    """Neighbours of one diameter sorted by thickness: their order makes no difference."""
    runs: list[list[tuple[float, float]]] = []
    for shim in bending:
        if runs and runs[-1][0][0] == shim[0]:
            runs[-1].append(shim)
        else:
            runs.append([shim])
    return tuple(shim for run in runs for shim in sorted(run, reverse=True))


STOCKS = {
    "tapers": ([(34.0, 0.1, 2), (34.0, 0.2, 1), (26.0, 0.1, 2), (18.0, 0.15, 2)], {"stages": (1,)}),
    "crossovers": (
        [(34.0, 0.1, 3), (26.0, 0.15, 1), (22.0, 0.1, 2), (16.0, 0.3, 1)],
        {"stages": (2,), "parts": 6},
    ),
    "both": (
        [(34.0, 0.1, 2), (30.0, 0.2, 1), (22.0, 0.1, 2), (16.0, 0.1, 3)],
        {"parts": 6, "face_min": 2},
    ),
    "tall": ([(34.0, 0.2, 2), (30.0, 0.2, 2), (16.0, 0.1, 3), (14.0, 0.3, 1)], {"low": 0.9}),
    "flat": ([(34.0, 0.2, 2), (30.0, 0.1, 2), (16.0, 0.1, 3), (14.0, 0.3, 1)], {"high": 0.5}),
}


@pytest.mark.parametrize("name", STOCKS)
def test_enumeration_finds_every_stack_once(name: str) -> None:
    stock, options = STOCKS[name]
    case = build(stock, **{"parts": 5, **options})  # type: ignore[arg-type]
    plans = all_plans(case.space, 100_000)
    assert plans is not None
    found = set()
    for plan in plans:
        shims = case.shims(plan)
        clamp = shims[-1]
        bending = shims[: shims.index(clamp)]
        found.add((in_order(tuple(bending)), clamp[0]))
    assert len(found) == len(plans), "each stack once"
    assert found == brute_force(case)


@settings(max_examples=12, deadline=None)
@given(case=cases(sizes=4, parts=5))
def test_enumeration_equals_brute_force_on_random_drawers(case: Case) -> None:
    plans = all_plans(case.space, 1_000_000)
    assert plans is not None
    assert len(plans) == len(brute_force(case))
    assert (len(first_plans(case.space, 3)) > 0) == (len(plans) > 0)


def test_counting_stops_at_the_cap() -> None:
    stock = [(float(outer), 0.1, 5) for outer in range(14, 44, 2)]
    case = build(stock, parts=12)
    assert count_plans(case.space, 5000) == 5000
    assert all_plans(case.space, 5000) is None
