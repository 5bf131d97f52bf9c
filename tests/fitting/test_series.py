"""Velocity from displacement over time, and what makes a time series useless."""

from collections.abc import Callable

import numpy as np
import pytest

from optimiser.faults import BadInput
from optimiser.fitting.series import motion_of
from optimiser.hydraulics.lift import Floats

Three = tuple[Floats, Floats, Floats]
Spoil = Callable[[Floats, Floats, Floats], Three]


def sine(rate: float = 500.0, hertz: float = 2.0, cycles: float = 4.0) -> tuple[Floats, Floats]:
    time = np.arange(0.0, cycles / hertz, 1.0 / rate)
    return time, 20.0 * np.sin(2.0 * np.pi * hertz * time)


def test_velocity_of_a_sine_within_the_stated_loss() -> None:
    """A window of a twentieth of the cycle loses (pi/20)^2/10 = 0.25 % of a sine's velocity."""
    time, travel = sine()
    motion = motion_of(time, travel, time)
    exact = 20e-3 * 2.0 * np.pi * 2.0 * np.cos(2.0 * np.pi * 2.0 * motion.time_s)
    peak = np.abs(exact).max()
    assert np.max(np.abs(motion.velocity_m_s - exact)) / peak == pytest.approx(0.0025, abs=4e-4)


def test_noise_is_smoothed() -> None:
    time, travel = sine()
    noise = 0.02 * np.random.default_rng(3).standard_normal(time.size)
    exact = motion_of(time, travel, time).velocity_m_s
    rough = np.gradient(travel + noise, time)[12:-12] * 1e-3
    smooth = motion_of(time, travel + noise, time)
    error = np.std(smooth.velocity_m_s - exact)
    assert error < 0.1 * np.std(rough[: exact.size] - exact[: rough.size])


def test_speed_gain_is_the_sign_of_the_acceleration() -> None:
    time, travel = sine()
    motion = motion_of(time, travel, time)
    phase = 2.0 * np.pi * 2.0 * motion.time_s
    clear = np.abs(np.sin(2.0 * phase)) > 0.2
    gains = np.sign(-np.sin(phase) * np.sign(np.cos(phase)))
    assert np.array_equal(np.sign(motion.speed_gain[clear]), gains[clear])


def test_uneven_steps_are_resampled() -> None:
    random = np.random.default_rng(1)
    time = np.cumsum(random.uniform(0.0015, 0.0025, 1000))
    travel = 20.0 * np.sin(2.0 * np.pi * 2.0 * time)
    motion = motion_of(time, travel, np.cos(2.0 * np.pi * 2.0 * time))
    assert np.allclose(np.diff(motion.time_s), motion.time_s[1] - motion.time_s[0])
    exact = 20e-3 * 4.0 * np.pi * np.cos(4.0 * np.pi * motion.time_s)
    # Straight lines between uneven samples add a little noise of their own.
    assert np.max(np.abs(motion.velocity_m_s - exact)) < 0.01 * np.abs(exact).max()


def test_a_given_window_is_used() -> None:
    time, travel = sine()
    assert motion_of(time, travel, time, 0.03).window_s == pytest.approx(0.03)


@pytest.mark.parametrize(
    ("spoil", "text"),
    [
        (lambda t, x, f: (t[:10], x[:10], f[:10]), "holds 10 samples"),
        (lambda t, x, f: (np.r_[t[:50], t[40], t[51:]], x, f), "time goes from"),
        (lambda t, x, f: (np.r_[t[:500], t[500:] + 1.0], x, f), "no samples between"),
        (lambda t, x, f: (t, 0.0 * x + 5.0, f), "displacement is the same"),
        (lambda t, x, f: (t, 10.0 * t, f), "never reverses"),
        (lambda t, x, f: (t, x, 0.0 * f + 3.0), "force is the same"),
    ],
)
def test_useless_series_are_refused(spoil: Spoil, text: str) -> None:
    time, travel = sine()
    with pytest.raises(BadInput, match=text):
        motion_of(*spoil(time, travel, np.cos(time)))


def test_all_faults_at_once() -> None:
    time, travel = sine()
    with pytest.raises(BadInput) as raised:
        motion_of(time, 0.0 * travel, 0.0 * travel)
    assert len(raised.value.faults) == 2


def test_smoothing_that_swallows_the_strokes() -> None:
    time, travel = sine()
    with pytest.raises(BadInput, match="blurs strokes"):
        motion_of(time, travel, time, 0.4)
