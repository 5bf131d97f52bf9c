"""Statics: the rider's load, the coil rate a sag asks for, the sag a spring gives."""

from itertools import pairwise

import numpy as np
from scipy.constants import g
from scipy.integrate import quad
from scipy.optimize import brentq

from optimiser.faults import BadInput
from optimiser.wanted.arrays import Floats
from optimiser.wanted.frame import LEAST_SAG_PERCENT, MOST_SAG_PERCENT, Frame
from optimiser.wanted.leverage import Leverage
from optimiser.wanted.rider import Rider
from optimiser.wanted.spring import CoilSpring, ShaftSpring

_SCAN = 400


def sprung_mass_kg(rider: Rider, frame: Frame) -> float:
    """Mass this wheel's spring carries, kg: share x (rider + sprung machine)."""
    return frame.share_of_mass * (rider.mass_kg + frame.sprung_kg)


def weight_n(mass_kg: float) -> float:
    """Weight of a mass, N, at standard gravity 9.80665 m/s2 (ISO 80000-3)."""
    return mass_kg * g


def sag_travel_mm(frame: Frame, sag_percent: float) -> float:
    """Wheel travel at a sag in per cent of what the frame names. Raises BadInput out of 5..50 %."""
    if not LEAST_SAG_PERCENT <= sag_percent <= MOST_SAG_PERCENT:
        raise BadInput(
            f"sag must be {LEAST_SAG_PERCENT:g} to {MOST_SAG_PERCENT:g} %, not {sag_percent:g}"
        )
    if frame.sag_of == "wheel_travel":
        return 0.01 * sag_percent * frame.wheel_travel_mm
    return frame.lever.travel_at_mm(0.01 * sag_percent * frame.lever.full_stroke_mm)


def sag_percent(frame: Frame, travel_mm: float) -> float:
    """Sag, %, of what the frame names, at a wheel travel, mm."""
    if frame.sag_of == "wheel_travel":
        return 100.0 * travel_mm / frame.wheel_travel_mm
    return 100.0 * frame.lever.stroke_mm(travel_mm) / frame.lever.full_stroke_mm


def wheel_force_n(lever: Leverage, spring: ShaftSpring, travel_mm: float) -> float:
    """Spring force at the wheel, N, at a wheel travel, mm: F_shaft ds/dx (virtual work)."""
    stroke = lever.stroke_mm(travel_mm)
    return spring.force_n(stroke) * lever.stroke_per_travel(travel_mm)


def wheel_rate_n_mm(lever: Leverage, spring: ShaftSpring, travel_mm: float) -> float:
    """Slope of the wheel force, N/mm: k_s (ds/dx)^2 + F_s d2s/dx2, at a wheel travel, mm.

    The product rule applied to F_w = F_s ds/dx; with constant leverage it is k_s / LR^2.
    """
    stroke, ratio = lever.stroke_mm(travel_mm), lever.stroke_per_travel(travel_mm)
    bend = lever.stroke_per_travel_slope(travel_mm)
    return spring.rate_n_mm(stroke) * ratio * ratio + spring.force_n(stroke) * bend


def coil_for_sag(
    load_n: float,
    lever: Leverage,
    travel_mm: float,
    preload_mm: float = 0.0,
    gas_force_n: float = 0.0,
) -> CoilSpring:
    """The coil that is in balance under load_n, N, at the sag's wheel travel, mm.

    The potential energy V(x) = E_spring(s(x)) - load x is stationary at the sag (principle of
    stationary potential energy): F_s ds/dx = load, so k = (load LR - F_gas)/(s + preload).
    Raises BadInput when the gas force alone already holds the load.
    """
    stroke, ratio = lever.stroke_mm(travel_mm), lever.ratio_at(travel_mm)
    left = load_n * ratio - gas_force_n
    if left <= 0.0:
        raise BadInput(
            f"the gas force of {gas_force_n:.0f} N on the shaft already holds the "
            f"{load_n * ratio:.0f} N the rider puts there; no coil gives this sag"
        )
    return CoilSpring(left / (stroke + preload_mm), preload_mm, gas_force_n)


def travel_under_load_mm(load_n: float, lever: Leverage, spring: ShaftSpring) -> float:
    """Wheel travel, mm, at which the spring holds load_n, N, at the wheel.

    Raises BadInput for a spring that stays topped out under the load or cannot hold it.
    """
    full = lever.full_travel_mm
    travel = np.linspace(0.0, full, _SCAN + 1)
    excess = [wheel_force_n(lever, spring, float(x)) - load_n for x in travel]
    if excess[0] >= 0.0:
        raise BadInput(
            f"the spring stays topped out: it pushes {excess[0] + load_n:.0f} N at the wheel "
            f"before it moves, the rider's load there is {load_n:.0f} N"
        )
    held = [index for index, value in enumerate(excess) if value >= 0.0]
    if not held:
        raise BadInput(
            f"the spring cannot hold the rider: at most {max(excess) + load_n:.0f} N at the wheel "
            f"over {full:g} mm of travel, the rider's load there is {load_n:.0f} N"
        )
    bracket = float(travel[held[0] - 1]), float(travel[held[0]])
    return float(
        brentq(lambda x: wheel_force_n(lever, spring, x) - load_n, *bracket, xtol=1e-12, rtol=1e-14)
    )


def energies_j(lever: Leverage, spring: ShaftSpring, travel_mm: float) -> tuple[float, float]:
    """(work of the wheel force from topped out to a wheel travel, energy in the spring), J.

    The two are equal when forces and leverage belong together: first law for a lever without
    friction. The work is integrated numerically, the energy is closed form.
    """
    cuts = _cuts_mm(lever, spring, travel_mm)
    pieces = [
        quad(lambda x: wheel_force_n(lever, spring, x), a, b, epsabs=0.0, epsrel=1e-12)[0]
        for a, b in pairwise(cuts)
    ]
    return 1e-3 * float(np.sum(pieces)), spring.energy_j(lever.stroke_mm(travel_mm))


def _cuts_mm(lever: Leverage, spring: ShaftSpring, travel_mm: float) -> Floats:
    """Wheel travels between which the wheel force is one smooth formula."""
    strokes = [s for s in spring.knots_mm if 0.0 < s < lever.stroke_mm(travel_mm)]
    knots = [lever.travel_at_mm(float(s)) for s in strokes]
    inner = [float(x) for x in lever.travel_mm if 0.0 < x < travel_mm]
    return np.unique([0.0, *knots, *inner, travel_mm])
