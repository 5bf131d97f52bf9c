"""Velocity from a displacement measured over time, by smoothed differentiation."""

from dataclasses import dataclass
from math import ceil

import numpy as np
from scipy.signal import savgol_filter

from optimiser.faults import BadInput
from optimiser.hydraulics.lift import Floats

LEAST_SAMPLES = 20
#: The smoothing window is this share of one cycle, and never under this many samples.
WINDOW_SHARE = 0.05
LEAST_WINDOW = 5
#: Steps of time that differ by more than this share are resampled to even ones.
EVEN_SHARE = 1e-3
_LONGEST_GAP = 10.0


@dataclass(frozen=True, eq=False)
class Motion:
    """Samples (n,) of a time series at even steps, without the ends the smoothing blurs.

    ``velocity_m_s`` in the direction of growing displacement, ``speed_gain`` the change of its
    amount (m/s2, only the sign counts), ``force_n`` as recorded; ``window_s`` of the smoothing.
    """

    time_s: Floats
    displacement_mm: Floats
    velocity_m_s: Floats
    speed_gain: Floats
    force_n: Floats
    window_s: float


def motion_of(
    time_s: Floats, displacement_mm: Floats, force_n: Floats, window_s: float | None = None
) -> Motion:
    """Velocity of a time series: displacement (n,), force (n,) over time (n,), s, mm, N.

    The derivative is that of parabolas fitted in a moving window (A. Savitzky and M. J. E. Golay,
    Anal. Chem. 36 (1964)); ``window_s`` defaults to a twentieth of the mean cycle, which loses
    0.25 % of a sine's velocity. Raises BadInput for too few samples, a time that does not rise,
    gaps, a stroke that stands still or never reverses.
    """
    _raise_any(series_faults(time_s, displacement_mm, force_n))
    step = float(np.median(np.diff(time_s)))
    even = _evenly(time_s, step)
    travel = np.interp(even, time_s, displacement_mm)
    force = np.interp(even, time_s, force_n)
    window = _window(travel, step, window_s)
    velocity = savgol_filter(travel, window, 2, deriv=1, delta=step) * 1e-3
    speed_gain = np.gradient(np.abs(velocity), step)
    kept = slice(window // 2, even.size - window // 2)
    if not (velocity[kept].min() < 0.0 < velocity[kept].max()):
        raise BadInput("the stroke never reverses; allowed: at least one movement in and out")
    return Motion(
        even[kept], travel[kept], velocity[kept], speed_gain[kept], force[kept], window * step
    )


def series_faults(time_s: Floats, displacement_mm: Floats, force_n: Floats) -> list[str]:
    """What makes a time series useless, one sentence each."""
    if time_s.size < LEAST_SAMPLES:
        return [f"holds {time_s.size} samples; allowed: {LEAST_SAMPLES} or more"]
    steps = np.diff(time_s)
    faults = []
    if np.any(steps <= 0.0):
        row = int(np.argmax(steps <= 0.0))
        faults.append(
            f"time goes from {time_s[row]:g} to {time_s[row + 1]:g} s at sample {row + 2}; "
            "allowed: a time that rises from line to line"
        )
    elif steps.max() > _LONGEST_GAP * np.median(steps):
        row = int(np.argmax(steps))
        faults.append(
            f"no samples between {time_s[row]:g} and {time_s[row + 1]:g} s; allowed: steps of time "
            f"up to {_LONGEST_GAP:g} times the usual one, {np.median(steps):g} s"
        )
    if np.ptp(displacement_mm) == 0.0:
        faults.append("displacement is the same in every sample; allowed: a moving shaft")
    elif np.all(np.diff(displacement_mm) >= 0.0) or np.all(np.diff(displacement_mm) <= 0.0):
        faults.append("the stroke never reverses; allowed: at least one movement in and out")
    if np.ptp(force_n) == 0.0:
        faults.append("force is the same in every sample; allowed: a force that varies")
    return faults


def _raise_any(faults: list[str]) -> None:
    if faults:
        raise BadInput(faults)


def _evenly(time_s: Floats, step: float) -> Floats:
    if np.allclose(np.diff(time_s), step, rtol=EVEN_SHARE, atol=0.0):
        return time_s
    count = int((time_s[-1] - time_s[0]) / step) + 1
    return np.asarray(time_s[0] + step * np.arange(count))


def _window(travel: Floats, step: float, window_s: float | None) -> int:
    """Odd number of samples to smooth over. Raises BadInput for one that swallows the strokes."""
    cycle = _cycle_samples(travel)
    wanted = WINDOW_SHARE * cycle if window_s is None else window_s / step
    window = max(LEAST_WINDOW, 2 * ceil(0.5 * (wanted - 1.0) - 1e-9) + 1)
    if window > 0.5 * cycle or window > travel.size // 2:
        raise BadInput(
            f"smoothing over {window * step:g} s blurs strokes of {0.5 * cycle * step:g} s; "
            f"allowed: at least {2 * LEAST_WINDOW} samples a stroke, and smoothing_s below a "
            "quarter of a cycle"
        )
    return window


def _cycle_samples(travel: Floats) -> float:
    """Mean samples of a cycle, from crossings of mid-travel that leave it by a tenth."""
    middle, reach = 0.5 * (travel.max() + travel.min()), 0.1 * np.ptp(travel)
    sides = np.sign(travel - middle)[np.abs(travel - middle) > reach]
    places = np.flatnonzero(np.abs(travel - middle) > reach)
    crossings = places[1:][np.diff(sides) != 0]
    if crossings.size < 2:
        return float(travel.size)
    return 2.0 * float(crossings[-1] - crossings[0]) / float(crossings.size - 1)
