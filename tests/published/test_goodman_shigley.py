"""Fatigue under fluctuating stress: Goodman's line.

R. G. Budynas and J. K. Nisbett, *Shigley's Mechanical Engineering Design*, examples 6-10 (bar
under a load that comes and goes) and 6-11 (clamped flat spring); the endurance limits, strengths
and stresses of the examples from memory, reproduced to the printed digits.

Load line: a valve pulses from zero, so amplitude and mean are both half the peak and grow together
(a proportional load line through the origin). The book's spring keeps its amplitude while the mean
grows, which gives its other safety factors (3.55 and 1.77, by Gerber's parabola)."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from optimiser.mechanics.stress import fatigue_utilisation

KPSI = 6.894757  # MPa


def _used(peak_kpsi: float, endurance_kpsi: float, tensile_kpsi: float) -> float:
    peak = np.array([peak_kpsi * KPSI])
    return float(fatigue_utilisation(peak, endurance_kpsi * KPSI, tensile_kpsi * KPSI)[0])


def test_example_6_10_load_from_zero() -> None:
    """0 to 16 kip on a 1.5 in bar, K_f 1.85: amplitude = mean = 8.38 kpsi; S_e 33.9, S_ut 100
    kpsi."""
    amplitude = 1.85 * 8.0 / (np.pi * 1.5**2 / 4)
    assert amplitude == pytest.approx(8.38, abs=0.005)
    assert 1 / _used(2 * amplitude, 33.9, 100.0) == pytest.approx(3.02, abs=0.005)


@pytest.mark.parametrize(("mean", "safety"), [(33.0, 1.633), (65.9, 1.202)])
def test_example_6_11_proportional_load_line(mean: float, safety: float) -> None:
    """Amplitude 10.99 kpsi on a spring set to a mean above it; S_e 28, S_ut 150 kpsi.

    The pulsating part uses what a valve would; the part that never comes off only adds to the mean.
    """
    amplitude, endurance, tensile = 10.99, 28.0, 150.0
    used = _used(2 * amplitude, endurance, tensile) + (mean - amplitude) / tensile
    assert 1 / used == pytest.approx(safety, abs=0.0005)


@pytest.mark.parametrize(("mean", "safety"), [(33.0, 3.55), (65.9, 1.77)])
def test_example_6_11_constant_amplitude_is_another_question(mean: float, safety: float) -> None:
    """The book's own factors: the mean alone grows up to Gerber's parabola. Ours is the safer
    one."""
    amplitude, endurance, tensile = 10.99, 28.0, 150.0
    intercept = tensile * np.sqrt(1 - amplitude / endurance)
    assert intercept == pytest.approx(116.9, abs=0.05)
    assert intercept / mean == pytest.approx(safety, abs=0.01)
    ours = 1 / (_used(2 * amplitude, endurance, tensile) + (mean - amplitude) / tensile)
    assert ours < safety


@given(st.floats(1.0, 3000.0), st.floats(100.0, 900.0), st.floats(1000.0, 2500.0))
def test_utilisation_one_lies_on_the_line(peak: float, endurance: float, tensile: float) -> None:
    """At u = 1 the point (S_m, S_a) = (peak / 2, peak / 2) / u is on S_a/S_e + S_m/S_u = 1."""
    used = float(fatigue_utilisation(np.array(peak), endurance, tensile))
    half = peak / 2 / used
    assert half / endurance + half / tensile == pytest.approx(1.0)
    assert float(fatigue_utilisation(np.array(2 * peak), endurance, tensile)) == pytest.approx(
        2 * used
    )
