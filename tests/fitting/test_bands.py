"""Prediction bands: they cover as stated, every cause counts, seeds hold, they are quick."""

from dataclasses import replace
from time import perf_counter

import numpy as np
import pytest
from scipy.stats import binom

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.fitting.bands import Bands, force_bands, probability_within
from optimiser.fitting.calibrate import calibrate
from optimiser.fitting.parameters import with_values
from optimiser.fitting.uncertainty import (
    Uncertainty,
    fitted_uncertainty,
    uncertainty_of_record,
    uncertainty_record,
    usual_uncertainty,
)
from optimiser.hydraulics.lift import Floats
from optimiser.prediction import Setup, predict
from optimiser.stack import Group, Stack
from optimiser.wanted.target import Target
from tests.fitting.invented import TRUTH, noisy, parts, three_runs

SPEEDS = np.array([0.03, 0.1, 0.3, 0.8])
NOTHING = Uncertainty((), np.zeros((0, 0)), 0.0, "measured", 0.0, 0.0)


def setup_of(name: str = "rear-monotube", direction: Direction = "compression") -> Setup:
    damper, steel, oil = parts(name)
    return Setup(damper, direction, steel, oil, damper.oil_temp_c)


def stack_of(setup: Setup) -> Stack:
    assert setup.valve.fitted is not None
    return setup.valve.fitted


def bands(
    known: Uncertainty, setup: Setup | None = None, seed: int = 0, samples: int = 300
) -> Bands:
    at = setup or setup_of()
    return force_bands(at, stack_of(at), SPEEDS, None, known, samples, seed)


def width(found: Bands) -> Floats:
    return np.asarray((found.p95_n - found.p05_n) / found.nominal_n)


CAUSES = {
    "gap": replace(NOTHING, names=("compression.seat.discharge",), covariance=np.array([[0.0009]])),
    "friction": replace(NOTHING, names=("friction_n",), covariance=np.array([[25.0]])),
    "model": replace(NOTHING, model_percent=3.0),
    "thickness": replace(NOTHING, thickness="normal"),
    "play": replace(NOTHING, clicks_play=2.0),
    "oil": replace(NOTHING, oil_temp_span_c=15.0),
}


@pytest.mark.parametrize("cause", CAUSES)
def test_every_cause_widens_the_band(cause: str) -> None:
    narrow, wide = width(bands(NOTHING)), width(bands(CAUSES[cause]))
    assert np.all(wide >= 0.98 * narrow)
    assert wide.max() > 1.3 * narrow.max()


def test_a_common_error_has_the_stated_spread() -> None:
    """5 to 95 % of a normal law is 3.290 standard deviations; measured shims add a little."""
    found = bands(CAUSES["model"], samples=4000)
    assert width(found) == pytest.approx(np.hypot(3.29 * 0.03, width(bands(NOTHING))), rel=0.05)


@pytest.mark.parametrize(
    ("name", "direction"),
    [
        ("rear-monotube", "compression"),
        ("rear-monotube", "rebound"),
        ("digressive-monotube", "compression"),
        ("fork-cartridge", "compression"),
    ],
)
def test_the_middle_is_the_prediction(name: str, direction: Direction) -> None:
    """Half the samples lie on either side of it, within what curvature and chance move."""
    found = bands(usual_uncertainty(setup_of(name, direction)), setup_of(name, direction))
    assert found.p50_n == pytest.approx(found.nominal_n, rel=0.05)
    assert np.all(found.p05_n < found.nominal_n)
    assert np.all(found.nominal_n < found.p95_n)


def test_bands_cover_dampers_drawn_from_what_is_uncertain() -> None:
    """Independent draws through the full prediction lie in the 5-95 % band 9 times of 10."""
    setup = setup_of()
    covariance = np.array([[0.0016, 0.0], [0.0, 0.09]])
    known = replace(
        NOTHING,
        names=("compression.seat.discharge", "compression.bleed.area_mm2"),
        covariance=covariance,
        thickness="fine",
    )
    found = bands(known, setup, samples=2000)
    random = np.random.default_rng(77)
    inside = []
    for _ in range(60):
        seat, bleed = random.multivariate_normal([0.61, 0.5], covariance)
        damper = with_values(
            setup.damper,
            {
                ("seat.discharge", "compression"): float(np.clip(seat, 0.2, 1.0)),
                ("bleed.area_mm2", "compression"): float(max(bleed, 0.0)),
            },
        )
        stack = _cut(setup, stack_of(setup), random)
        force = predict(replace(setup, damper=damper), stack, SPEEDS).force_n
        inside.append((force >= found.p05_n) & (force <= found.p95_n))
    share = np.mean(inside, axis=0)
    assert np.all(share >= binom.ppf(1e-3, 60, 0.9) / 60)
    assert np.all(share <= binom.ppf(0.999, 60, 0.9) / 60)


def _cut(setup: Setup, stack: Stack, random: np.random.Generator) -> Stack:
    """The stack stamped from strips whose thickness is off by half the tolerance, one sigma."""
    strips: dict[object, float] = {}
    groups = []
    for group in stack.groups[:-1]:
        limit = setup.steel.thickness_tolerance_mm(group.shim.thickness_mm)
        off = strips.setdefault(
            group.shim, float(np.clip(random.normal(0, limit / 2), -limit, limit))
        )
        shim = replace(group.shim, thickness_mm=group.shim.thickness_mm + off)
        groups.append(Group(group.quantity, shim))
    return Stack((*groups, stack.groups[-1]))


def test_the_seed_decides() -> None:
    known = usual_uncertainty(setup_of())
    assert np.array_equal(bands(known, seed=3).samples_n, bands(known, seed=3).samples_n)
    assert not np.array_equal(bands(known, seed=3).samples_n, bands(known, seed=4).samples_n)


def test_a_thousand_samples_in_under_two_seconds() -> None:
    setup = setup_of()
    known = usual_uncertainty(setup)
    bands(known, setup)
    began = perf_counter()
    found = force_bands(setup, stack_of(setup), SPEEDS, None, known, 1000)
    assert perf_counter() - began < 2.0
    assert found.samples_n.shape == (1000, 4)


def test_a_fit_narrows_the_band() -> None:
    damper, steel, oil = parts()
    random = np.random.default_rng(8)
    truth = with_values(damper, TRUTH)
    result = calibrate(
        damper, steel, oil, [noisy(run, random, 0.01, 1.0) for run in three_runs(truth)], None, 0.0
    )
    known = replace(fitted_uncertainty(result), thickness="measured")
    setup = Setup(result.damper, "compression", steel, oil, 40.0)
    found = bands(known, setup)
    assert np.all(width(found) < 0.6 * width(bands(usual_uncertainty(setup_of()))))
    honest = predict(Setup(truth, "compression", steel, oil, 40.0), stack_of(setup), SPEEDS)
    assert np.all((honest.force_n > found.p05_n) & (honest.force_n < found.p95_n))


def test_uncertainty_survives_a_file() -> None:
    known = usual_uncertainty(setup_of())
    again = uncertainty_of_record(uncertainty_record(known), "x")
    assert again.names == known.names
    assert np.array_equal(again.covariance, known.covariance)
    assert again.model_percent == known.model_percent


@pytest.mark.parametrize(
    ("record", "text"),
    [
        ({}, "no record of a fit"),
        ({"names": ["a"], "covariance": [[1.0, 2.0]], "model_percent": 1.0}, "no record"),
        ({"names": ["shim"], "covariance": [[1.0]], "model_percent": 1.0}, "names is shim"),
        (
            {"names": ["friction_n"], "covariance": [[-1.0]], "model_percent": 1.0},
            "is no covariance",
        ),
    ],
)
def test_records_that_are_none(record: dict[str, object], text: str) -> None:
    with pytest.raises(BadInput, match=text):
        uncertainty_of_record(record, "x.json")


def test_probability_within() -> None:
    found = bands(replace(NOTHING, model_percent=5.0), samples=1000)
    target = Target.of(SPEEDS, found.nominal_n)
    near, far = (probability_within(found, target, percent) for percent in (5.0, 15.0))
    assert near == pytest.approx(0.68, abs=0.05)
    assert far > 0.98
    assert probability_within(found, Target.of(SPEEDS, 2.0 * found.nominal_n), 10.0) == 0.0
    with pytest.raises(ValueError, match="velocities"):
        probability_within(found, Target.of(SPEEDS * 1.1, found.nominal_n), 5.0)


def test_bad_questions() -> None:
    setup = setup_of()
    known = usual_uncertainty(setup)
    with pytest.raises(BadInput, match="samples"):
        force_bands(setup, stack_of(setup), SPEEDS, None, known, 5)
    with pytest.raises(BadInput, match="must rise"):
        force_bands(setup, stack_of(setup), SPEEDS[::-1], None, known)
    with pytest.raises(BadInput, match="clicks"):
        force_bands(setup, stack_of(setup), SPEEDS, 99, known)
