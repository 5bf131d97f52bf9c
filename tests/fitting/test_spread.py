"""Bands around a prediction: where it has none, and what is said of it."""

from dataclasses import replace

import numpy as np
import pytest

from optimiser.files import read_damper, read_oil, read_steel
from optimiser.fitting.bands import force_bands
from optimiser.fitting.spread import SAMPLES, Spread
from optimiser.fitting.uncertainty import usual_uncertainty
from optimiser.prediction import Prediction, Setup, predict

SPEEDS = np.array([0.05, 0.2, 0.6])


@pytest.fixture(scope="module")
def seen() -> Prediction:
    """The bundled rear damper in compression, as fitted."""
    damper = read_damper("rear-monotube")
    steel, oil = read_steel(damper.steel), read_oil(damper.oil)
    setup = Setup(damper, "compression", steel, oil, damper.oil_temp_c)
    assert setup.valve.fitted is not None
    return predict(setup, setup.valve.fitted, SPEEDS, 7)


@pytest.fixture(scope="module")
def spread(seen: Prediction) -> Spread:
    return Spread(usual_uncertainty(seen.setup), "somewhere", 60, 3)


def test_the_band_is_that_of_the_prediction(seen: Prediction, spread: Spread) -> None:
    found = spread.bands(seen)
    same = force_bands(seen.setup, seen.stack, SPEEDS, 7, spread.known, 60, 3)
    assert found is not None
    assert np.array_equal(found.samples_n, same.samples_n)


def test_locked_velocities_have_no_band(seen: Prediction, spread: Spread) -> None:
    force = seen.force_n.copy()
    force[0] = np.inf
    found, whole = spread.bands(replace(seen, force_n=force)), spread.bands(seen)
    assert found is not None
    assert whole is not None
    assert np.isnan([found.p05_n[0], found.p50_n[0], found.p95_n[0]]).all()
    assert found.p05_n[1:] == pytest.approx(whole.p05_n[1:], rel=1e-3)
    assert found.samples_n.shape == (60, 3)
    assert spread.bands(replace(seen, force_n=np.full(3, np.inf))) is None


def test_what_is_said(spread: Spread) -> None:
    assert "60 samples (seed 3), from somewhere" in spread.sentence


def test_edges_move_as_little_as_stated(seen: Prediction) -> None:
    """Standard error of an edge over the band's width: 2 % for a normal law."""
    edges = []
    for seed in range(12):
        found = Spread(usual_uncertainty(seen.setup), "", SAMPLES, seed).bands(seen)
        assert found is not None
        edges.append((found.p05_n, found.p95_n))
    low, high = np.array(edges).std(axis=0, ddof=1)
    width = np.array(edges)[:, 1].mean(axis=0) - np.array(edges)[:, 0].mean(axis=0)
    assert np.all(np.concatenate([low / width, high / width]) < 0.04)
