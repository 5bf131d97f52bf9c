"""Fatigue of a shim that a valve bends from rest and lets go again."""

from optimiser.mechanics.layout import Floats


def fatigue_utilisation(
    peak_stress_mpa: Floats, endurance_mpa: float, tensile_mpa: float
) -> Floats:
    """Share of the fatigue strength that is used, any shape; 1 or more means a finite life.

    A valve pulses from zero: mean and amplitude are both half of the peak and grow together, so
    the load line is proportional and Goodman's rule gives u = (peak/2)/S_e + (peak/2)/S_u.
    ``endurance_mpa`` amplitude borne for ever under full reversal; ``tensile_mpa`` ultimate
    strength. Source: R. G. Budynas and J. K. Nisbett, *Shigley's Mechanical Engineering Design*,
    ch. 6.
    """
    half = 0.5 * peak_stress_mpa
    return half / endurance_mpa + half / tensile_mpa
