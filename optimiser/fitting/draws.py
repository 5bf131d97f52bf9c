"""Seeded draws of everything uncertain about one stack in one damper; the first draw is nominal."""

from dataclasses import dataclass

import numpy as np

from optimiser.fitting.parameters import FRICTION, PRELOAD, parameter, with_number
from optimiser.fitting.uncertainty import MEASURED_MM, Uncertainty
from optimiser.hydraulics.lift import Floats
from optimiser.hydraulics.oil import COLDEST_C, HOTTEST_C, oil_at
from optimiser.hydraulics.restrictions import short_tube_terms
from optimiser.hydraulics.valve import bleed_area_m2, valve_numbers
from optimiser.materials import thickness_tolerance_mm
from optimiser.prediction import Setup
from optimiser.stack import Shim, Stack

#: A strip's permitted deviation is this many standard deviations of its real one, which never goes
#: beyond it (common practice, no source).
TOLERANCE_SPREADS = 2.0


@dataclass(frozen=True, eq=False)
class Draws:
    """s draws: ``values`` (s, p) of the valve's numbers ``keys``, ``friction_n`` (s,),
    ``height_m`` (s,) of the seat, ``thickness_m`` (s, shims), ``clicks`` (s,), ``temp_c`` (s,),
    ``factor`` (s,) on all forces."""

    keys: tuple[str, ...]
    values: Floats
    friction_n: Floats
    height_m: Floats
    thickness_m: Floats
    clicks: Floats
    temp_c: Floats
    factor: Floats

    @property
    def count(self) -> int:
        """Number of draws, the nominal one included."""
        return int(self.factor.size)


def drawn(
    setup: Setup, stack: Stack, clicks: int, known: Uncertainty, samples: int, seed: int
) -> Draws:
    """``samples`` draws behind the nominal one. Each cause has its own stream of the seed, so that
    stacks of one damper are compared under the same draws of everything else."""
    streams = [np.random.default_rng(s) for s in np.random.SeedSequence(seed).spawn(5)]
    keys, covariance = known.of_direction(setup.direction)
    items = [parameter(setup.damper, key, setup.direction) for key in keys]
    means = np.array([item.start for item in items])
    values = _normal(streams[0], means, covariance, samples)
    for number, item in enumerate(items):
        values[:, number] = np.clip(values[:, number], item.low, item.high)
    column = dict(zip(keys, values.T, strict=True))
    seat = setup.valve.seat
    usual = np.ones(samples + 1)
    friction = column.get(FRICTION, setup.damper.friction_n * usual)
    height = column.get(PRELOAD, (seat.height_mm if seat else 0.0) * usual)
    play = _even(streams[2], known.clicks_play, samples) if setup.clicks_range else 0.0
    span = _even(streams[3], known.oil_temp_span_c, samples)
    factor = np.exp(0.01 * known.model_percent * streams[4].standard_normal(samples))
    return Draws(
        tuple(keys),
        values,
        friction,
        1e-3 * height,
        1e-3 * _thicknesses(streams[1], stack, setup, known, samples),
        np.clip(clicks + play, 0.0, setup.clicks_range) * usual,
        np.clip(setup.oil_temp_c + span, COLDEST_C, HOTTEST_C),
        np.concatenate([[1.0], factor]),
    )


def _normal(random: np.random.Generator, means: Floats, covariance: Floats, samples: int) -> Floats:
    """Means (p,) and below them draws of a normal law, (samples + 1, p)."""
    if means.size == 0:
        return np.zeros((samples + 1, 0))
    draws = random.multivariate_normal(means, covariance, samples, method="eigh")
    return np.vstack([means, draws])


def _even(random: np.random.Generator, reach: float, samples: int) -> Floats:
    """0 and then draws spread evenly from -reach to reach, (samples + 1,)."""
    return np.concatenate([[0.0], random.uniform(-reach, reach, samples)])


def _thicknesses(
    random: np.random.Generator, stack: Stack, setup: Setup, known: Uncertainty, samples: int
) -> Floats:
    """Thickness (samples + 1, shims), mm, of every bending shim. Shims of one size are stamped from
    one strip: they share their deviation, unless each was measured."""
    shims = stack.bending
    result = np.tile([shim.thickness_mm for shim in shims], (samples + 1, 1))
    if known.thickness == "measured":
        result[1:] += MEASURED_MM * random.standard_normal((samples, len(shims)))
        return result
    strips: dict[Shim, Floats] = {}
    for place, shim in enumerate(shims):
        if shim not in strips:
            limit = thickness_tolerance_mm(
                shim.thickness_mm, known.thickness or setup.steel.thickness_tolerance
            )
            spread = limit / TOLERANCE_SPREADS * random.standard_normal(samples)
            strips[shim] = np.clip(spread, -limit, limit)
        result[1:, place] += strips[shim]
    return result


def numbers_of(setup: Setup, draws: Draws) -> tuple[Floats, Floats]:
    """ValveNumbers' fields (s, 8) and the bleed's terms (s, 2) of every draw, SI."""
    numbers, bleeds = np.empty((draws.count, 8)), np.empty((draws.count, 2))
    for s in range(draws.count):
        valve = setup.valve
        for key, value in zip(draws.keys, draws.values[s], strict=True):
            if key != FRICTION:
                valve = with_number(valve, key, float(value))
        oil = oil_at(setup.oil, float(draws.temp_c[s]))
        numbers[s] = valve_numbers(valve, setup.damper.body, oil)
        bleeds[s] = short_tube_terms(
            bleed_area_m2(valve.bleed, float(draws.clicks[s])),
            valve.bleed.length_mm * 1e-3,
            valve.bleed.discharge,
            oil.density_kg_m3,
            oil.viscosity_pa_s,
        )
    return numbers, bleeds
