"""The trade's rule for rebound, as a check (common practice, no source).

Rebound is damped harder than compression, over a smaller velocity range, and is kept linear to
slightly progressive. Nothing is changed here: the notes say where a pair of targets departs.
"""

import numpy as np

from optimiser.wanted.target import Target

LEAST_POWER, MOST_POWER = 0.85, 1.4
"""d ln F / d ln v taken as "linear to slightly progressive" (own reading of the rule)."""
_MARK = "(common practice, no source)"


def rebound_notes(compression: Target, rebound: Target) -> list[str]:
    """One sentence for each part of the rule that the pair of targets does not keep."""
    return [*_harder(compression, rebound), *_narrower(compression, rebound), *_power(rebound)]


def _harder(compression: Target, rebound: Target) -> list[str]:
    low = max(compression.velocity_m_s[0], rebound.velocity_m_s[0])
    high = min(compression.velocity_m_s[-1], rebound.velocity_m_s[-1])
    if low >= high:
        return []
    shared = np.geomspace(low, high, 25)
    share = rebound.force_at(shared) / compression.force_at(shared)
    index = int(np.argmin(share))
    if share[index] > 1.0:
        return []
    return [
        f"rebound is usually damped harder than compression; at {shared[index]:.3g} m/s it is "
        f"{share[index]:.2f} times compression {_MARK}"
    ]


def _narrower(compression: Target, rebound: Target) -> list[str]:
    squash, back = compression.velocity_m_s[-1], rebound.velocity_m_s[-1]
    if back < squash:
        return []
    return [
        f"rebound usually works over a smaller velocity range than compression; here it goes to "
        f"{back:.3g} m/s, compression to {squash:.3g} m/s {_MARK}"
    ]


def _power(rebound: Target) -> list[str]:
    velocity, force = rebound.velocity_m_s, rebound.force_n
    power = np.diff(np.log(force)) / np.diff(np.log(velocity))
    notes = []
    for index, word in ((int(np.argmin(power)), "digressive"), (int(np.argmax(power)), "steep")):
        outside = power[index] < LEAST_POWER if word == "digressive" else power[index] > MOST_POWER
        if outside:
            notes.append(
                f"rebound is usually linear to slightly progressive (force as velocity to the "
                f"power {LEAST_POWER:g} to {MOST_POWER:g}); from {velocity[index]:.3g} to "
                f"{velocity[index + 1]:.3g} m/s the power is {power[index]:.2f} {_MARK}"
            )
    return notes
