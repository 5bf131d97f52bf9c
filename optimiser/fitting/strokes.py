"""Which stroke is which, how the force is signed, and what of it is gas and what friction.

Inside the program compression and rebound are both positive. A dyno file may count either stroke
positive and may record the force on the damper or on the load cell; both are found out and stated.
"""

from dataclasses import dataclass, field
from typing import Literal

import numpy as np

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.fitting.binning import BANDS, stroke_means
from optimiser.hydraulics.lift import Floats

#: A steady force above this share of the largest one tells the strokes apart (gas pushes out).
STEADY_SHARE = 0.03
#: Without gas, the stroke that is harder by this share is taken for rebound (common practice).
HARDER_SHARE = 1.15
#: More points a stroke than this are averaged in bands.
MOST_POINTS = 3 * BANDS
LEAST_POINTS = 4
#: Slow points the force at rest is extrapolated from.
_SLOW_POINTS = 4

Positive = Literal["compression", "rebound"]


@dataclass(frozen=True, eq=False)
class Curve:
    """One stroke: ``velocity_m_s`` (n,) rising, ``force_n`` (n,), ``hysteresis_n`` (n,), the
    force while the speed grows less that while it drops (NaN where not known)."""

    velocity_m_s: Floats
    force_n: Floats
    hysteresis_n: Floats


@dataclass(frozen=True, eq=False)
class Strokes:
    """What one dyno file shows.

    ``friction_n`` and ``gas_n`` from both strokes' force at rest: half their sum, and half
    their difference (pushing the shaft out); None with one stroke only. ``notes``: how the signs
    were read, in plain sentences.
    """

    curves: dict[Direction, Curve]
    friction_n: float | None
    gas_n: float | None
    notes: tuple[str, ...] = field(default=())


def strokes_of(
    velocity_m_s: Floats,
    force_n: Floats,
    speed_gain: Floats | None = None,
    positive: Positive | None = None,
    only: Direction | None = None,
) -> Strokes:
    """Compression and rebound of signed samples: velocity (n,), m/s, and force (n,), N.

    ``speed_gain`` (n,): sign of the change of speed, for the hysteresis; ``positive``: stroke of
    positive velocity where it is known; ``only``: the stroke of a file that holds just one.
    Raises BadInput.
    """
    faults = _faults(velocity_m_s, force_n)
    if faults:
        raise BadInput(faults)
    gain = np.zeros_like(velocity_m_s) if speed_gain is None else speed_gain
    if velocity_m_s.min() >= 0.0 or velocity_m_s.max() <= 0.0:
        return _one_stroke(velocity_m_s, force_n, gain, only)
    return _both_strokes(velocity_m_s, force_n, gain, positive)


def _faults(velocity: Floats, force: Floats) -> list[str]:
    faults = []
    if velocity.size < LEAST_POINTS:
        faults.append(f"holds {velocity.size} points; allowed: {LEAST_POINTS} or more")
    elif np.ptp(np.abs(velocity)) == 0.0:
        faults.append("velocity is the same in every row; allowed: different velocities")
    elif np.ptp(force) == 0.0:
        faults.append("force is the same in every row; allowed: a force that varies")
    return faults


def _one_stroke(velocity: Floats, force: Floats, gain: Floats, only: Direction | None) -> Strokes:
    if only is None:
        raise BadInput(
            "holds one stroke only (every velocity has one sign); allowed: circuit compression or "
            "rebound, not both"
        )
    flip = np.median(force) < 0.0
    curve = _curve(np.abs(velocity), -force if flip else force, gain, only)
    notes = [f"every velocity has one sign, read as {only}"]
    if flip:
        notes.append(f"{only} forces are recorded negative and were turned round")
    notes += _loop_notes(only, curve, velocity.size)
    return Strokes({only: curve}, None, None, tuple(notes))


def _both_strokes(
    velocity: Floats, force: Floats, gain: Floats, positive: Positive | None
) -> Strokes:
    notes = []
    slope = float(np.sum((velocity - velocity.mean()) * (force - force.mean())))
    if slope < 0.0:
        force = -force
        notes.append("the force is recorded against the motion and was turned round")
    else:
        notes.append("the force is recorded along the motion that causes it")
    with_plus = _curve(velocity[velocity > 0], force[velocity > 0], gain[velocity > 0], "positive")
    minus = velocity < 0
    with_minus = _curve(-velocity[minus], -force[minus], gain[minus], "negative")
    rest_plus, rest_minus = force_at_rest(with_plus), force_at_rest(with_minus)
    steady = 0.5 * (rest_plus - rest_minus)
    stroke, reason = _which(with_plus, with_minus, steady, positive)
    notes.append(f"positive velocity is read as {stroke}: {reason}")
    first, second = (with_plus, with_minus) if stroke == "compression" else (with_minus, with_plus)
    gas = steady if stroke == "compression" else -steady
    friction = 0.5 * (rest_plus + rest_minus)
    notes.append(
        f"drawn in a straight line to rest, the strokes show {friction:.0f} N of friction (with "
        f"what the bleed adds) and {gas:.0f} N of gas"
    )
    curves: dict[Direction, Curve] = {"compression": first, "rebound": second}
    for name, curve in curves.items():
        notes += _loop_notes(name, curve, velocity.size)
    return Strokes(curves, friction, gas, tuple(notes))


def _loop_notes(name: str, curve: Curve, samples: int) -> list[str]:
    """What averaging a loop did: how many points are left, and how wide the loop is."""
    known = curve.hysteresis_n[np.isfinite(curve.hysteresis_n)]
    if curve.velocity_m_s.size == samples or not known.size:
        return []
    widest = float(known[np.argmax(np.abs(known))])
    word = "more" if widest > 0.0 else "less"
    return [
        f"{name} averaged to {curve.velocity_m_s.size} points; the loop is up to "
        f"{abs(widest):.0f} N wide ({word} force while the speed grows)"
    ]


def _which(
    with_plus: Curve, with_minus: Curve, steady: float, positive: Positive | None
) -> tuple[Positive, str]:
    """The stroke of positive velocity, and why. Raises BadInput when nothing tells."""
    if positive is not None:
        return positive, "as the request says"
    largest = max(np.abs(with_plus.force_n).max(), np.abs(with_minus.force_n).max())
    if abs(steady) > STEADY_SHARE * largest:
        stroke: Positive = "compression" if steady > 0.0 else "rebound"
        return stroke, f"a steady {abs(steady):.0f} N, as gas pushes the shaft out, adds to it"
    fastest = min(with_plus.velocity_m_s[-1], with_minus.velocity_m_s[-1])
    plus = np.interp(0.7 * fastest, with_plus.velocity_m_s, with_plus.force_n) - steady
    minus = np.interp(0.7 * fastest, with_minus.velocity_m_s, with_minus.force_n) + steady
    if max(plus, minus) > HARDER_SHARE * min(plus, minus):
        stroke = "compression" if plus < minus else "rebound"
        return stroke, "the other stroke is damped harder, as rebound usually is"
    raise BadInput(
        "neither a gas force nor a harder rebound tells which stroke is which; allowed: say so by "
        'positive = "compression" or "rebound" (the stroke of positive velocity)'
    )


def _curve(speed: Floats, force: Floats, gain: Floats, name: str) -> Curve:
    """One stroke's samples as a curve: averaged in bands when there are many of them."""
    moving = speed > 0.0
    speed, force, gain = speed[moving], force[moving], gain[moving]
    if speed.size > MOST_POINTS:
        means = stroke_means(speed, force, gain)
        curve = Curve(means.velocity, means.centre, means.hysteresis)
    else:
        order = np.argsort(speed, kind="stable")
        curve = Curve(speed[order], force[order], np.full(speed.size, np.nan))
    if curve.velocity_m_s.size < LEAST_POINTS:
        raise BadInput(
            f"the {name} stroke gives {curve.velocity_m_s.size} points; allowed: {LEAST_POINTS} "
            "or more"
        )
    return curve


def force_at_rest(curve: Curve) -> float:
    """Force, N, a stroke starts from: a straight line through its slowest points, at rest."""
    count = min(_SLOW_POINTS, curve.velocity_m_s.size)
    speed, force = curve.velocity_m_s[:count], curve.force_n[:count]
    if np.ptp(speed) == 0.0:
        return float(force.mean())
    return float(np.polyfit(speed, force, 1)[1])
