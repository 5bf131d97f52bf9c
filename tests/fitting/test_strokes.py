"""Signs, strokes, friction and gas of a dyno file."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import BadInput
from optimiser.fitting.binning import band_means, speed_bands
from optimiser.fitting.strokes import strokes_of
from optimiser.hydraulics.lift import Floats

SPEED = np.geomspace(0.01, 1.0, 12)


def table(friction: float = 20.0, gas: float = 250.0) -> tuple[Floats, Floats]:
    """Velocity and force, positive in compression: straight lines of 1000 and 2500 N s/m."""
    velocity = np.r_[-SPEED, SPEED]
    force = np.r_[-(2500.0 * SPEED + friction) + gas, 1000.0 * SPEED + friction + gas]
    return velocity, force


@settings(max_examples=40, deadline=None)
@given(
    st.sampled_from([-1.0, 1.0]),
    st.sampled_from([-1.0, 1.0]),
    st.floats(0.0, 60.0),
    st.floats(120.0, 900.0),
)
def test_any_sign_convention_gives_the_same_strokes(
    way: float, load: float, friction: float, gas: float
) -> None:
    velocity, force = table(friction, gas)
    found = strokes_of(way * velocity, load * force)
    assert found.friction_n == pytest.approx(friction, abs=1e-6)
    assert found.gas_n == pytest.approx(gas, abs=1e-6)
    assert found.curves["compression"].velocity_m_s == pytest.approx(SPEED)
    assert found.curves["compression"].force_n == pytest.approx(1000.0 * SPEED + friction + gas)
    assert found.curves["rebound"].force_n == pytest.approx(2500.0 * SPEED + friction - gas)


def test_the_signs_are_stated() -> None:
    velocity, force = table()
    notes = " ".join(strokes_of(-velocity, force).notes)
    assert "recorded against the motion" in notes
    assert "positive velocity is read as rebound" in notes


def test_without_gas_the_harder_stroke_is_rebound() -> None:
    velocity, force = table(gas=0.0)
    found = strokes_of(-velocity, -force)
    assert found.curves["rebound"].force_n[-1] > 2.0 * found.curves["compression"].force_n[-1]
    assert any("damped harder" in note for note in found.notes)


def test_a_symmetric_damper_must_be_told() -> None:
    velocity = np.r_[-SPEED, SPEED]
    with pytest.raises(BadInput, match="which stroke is which"):
        strokes_of(velocity, 900.0 * velocity)
    told = strokes_of(velocity, 900.0 * velocity, positive="rebound")
    assert set(told.curves) == {"compression", "rebound"}
    assert any("as the request says" in note for note in told.notes)


def test_one_stroke_needs_its_name_and_is_turned_positive() -> None:
    with pytest.raises(BadInput, match="one stroke only"):
        strokes_of(SPEED, 900.0 * SPEED)
    found = strokes_of(-SPEED, -900.0 * SPEED, only="rebound")
    assert found.curves["rebound"].force_n == pytest.approx(900.0 * SPEED)
    assert (found.friction_n, found.gas_n) == (None, None)


@pytest.mark.parametrize(
    ("velocity", "force", "text"),
    [
        (SPEED[:3], SPEED[:3], "holds 3 points"),
        (SPEED, 0.0 * SPEED + 5.0, "force is the same"),
        (0.0 * SPEED + 0.1, SPEED, "velocity is the same"),
    ],
)
def test_useless_tables_are_refused(velocity: Floats, force: Floats, text: str) -> None:
    with pytest.raises(BadInput, match=text):
        strokes_of(velocity, force, only="compression")


def loop(width: float) -> tuple[Floats, Floats, Floats]:
    phase = np.linspace(0.0, 6.0 * np.pi, 3000)
    velocity = np.sin(phase)
    gain = np.gradient(np.abs(velocity))
    branch = np.where(gain > 0.0, 0.5, -0.5) * width * np.sign(velocity)
    slope = np.where(velocity > 0.0, 1000.0, 2000.0)
    return velocity, slope * velocity + branch, gain


def test_a_loop_is_averaged_and_its_width_shown() -> None:
    found = strokes_of(*loop(60.0), positive="compression")
    curve = found.curves["compression"]
    assert curve.hysteresis_n == pytest.approx(np.full(curve.force_n.size, 60.0), abs=15.0)
    assert curve.force_n == pytest.approx(1000.0 * curve.velocity_m_s, rel=0.02)
    assert any("60 N wide" in note or "loop is up to" in note for note in found.notes)


def test_the_middle_of_a_loop_does_not_depend_on_how_many_samples_a_branch_has() -> None:
    velocity, force, gain = loop(60.0)
    kept = (gain > 0.0) | (np.arange(gain.size) % 3 == 0)
    found = strokes_of(velocity[kept], force[kept], gain[kept], positive="compression")
    curve = found.curves["compression"]
    assert curve.force_n == pytest.approx(1000.0 * curve.velocity_m_s, rel=0.02)


def test_bands_meet_and_reach_the_fastest_sample() -> None:
    low, high = speed_bands(2.0)
    assert np.array_equal(low[1:], high[:-1])
    assert high[-1] > 2.0
    means = band_means(np.array([2.0]), np.array([7.0]), np.array([1.0]), low, high)
    assert means.samples.sum() == 1.0
