"""Least squares: exact recovery, honest intervals, robustness."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import binom

from optimiser.faults import BadInput
from optimiser.fitting.estimate import estimate
from optimiser.fitting.model import Model
from optimiser.fitting.parameters import parameter
from tests.bench.fit_coverage import coverage
from tests.fitting.invented import FAST, parts, prepared, repeated, run_of

COVERED_OFTEN = 40


def test_runs_without_noise_give_the_truth() -> None:
    model, seen, truth = prepared()
    start = np.array([item.start for item in model.parameters])
    found = estimate(model, seen, [start])
    assert found.values == pytest.approx(truth, rel=2e-4)
    assert found.scatter < 1e-4
    assert not any(found.at_limit)


def test_intervals_hold_the_truth_as_often_as_stated() -> None:
    """Of 40 repetitions at most 1 in 1000 sound fits would fall outside these binomial limits; the
    full 200 are in tests/bench/fit_coverage.py (93 to 97 %)."""
    _, held, scaled = coverage(COVERED_OFTEN)
    least = binom.ppf(1e-3, COVERED_OFTEN, 0.95) / COVERED_OFTEN
    assert np.all(held.mean(axis=0) >= least)
    assert held.mean() <= binom.ppf(0.999, held.size, 0.95) / held.size
    assert np.all(np.abs(scaled.mean(axis=0)) < 3.3 / np.sqrt(COVERED_OFTEN))


def test_outliers_do_not_break_it() -> None:
    model, seen, truth = prepared()
    noisy = repeated(seen, np.random.default_rng(11))
    start = np.array([item.start for item in model.parameters])
    clean = estimate(model, noisy, [start])
    spoiled = []
    for item in noisy:
        force = item.run.force_n.copy()
        force[[3, 11]] *= (1.8, 0.4)
        spoiled.append(replace(item, run=replace(item.run, force_n=force)))
    found = estimate(model, spoiled, [start])
    assert found.outliers.sum() >= 5
    assert np.all(np.abs(found.values - truth) < 3.5 * found.errors)
    assert np.all(found.errors < 2.5 * clean.errors)


def test_the_preload_is_found() -> None:
    damper, steel, oil = parts("digressive-monotube")
    keys = ("seat.height_mm", "seat.discharge", "bleed.area_mm2")
    items = [parameter(damper, key, "compression") for key in keys]
    model = Model(damper, steel, oil, tuple(items), "search")
    seen = model.prepare(run_of(damper, clicks=0))
    truth = np.array([0.183, 0.66, 3.0])
    seen = replace(seen, run=replace(seen.run, force_n=model.force_n(seen, truth)))
    found = estimate(model, [seen], [np.array([item.start for item in items])])
    assert found.values == pytest.approx(truth, rel=1e-3)


def test_a_number_that_wants_beyond_its_limit_is_marked() -> None:
    model, seen, truth = prepared("search")
    beyond = np.array([1.15, *truth[1:]])
    pushed = [
        replace(item, run=replace(item.run, force_n=model.force_n(item, beyond))) for item in seen
    ]
    found = estimate(model, pushed, [truth])
    assert found.at_limit[0]
    assert found.values[0] == 1.0


def test_fewer_points_than_numbers() -> None:
    model, seen, truth = prepared("search")
    run = run_of(parts()[0], velocity=FAST[:4])
    few = model.prepare(run)
    with pytest.raises(BadInput, match="hold 4 points in all; allowed: at least 6"):
        estimate(model, [few], [truth])
    assert len(seen) == 3
