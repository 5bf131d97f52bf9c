"""From rider, frame and feel to wheel rate, critical damping and a target a direction."""

from dataclasses import dataclass
from math import pi, sqrt

import numpy as np

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.wanted.feel import Feel, StrokeFeel
from optimiser.wanted.frame import LEAST_SAG_PERCENT, MOST_SAG_PERCENT, Frame
from optimiser.wanted.rebound_rule import rebound_notes
from optimiser.wanted.rider import Rider
from optimiser.wanted.sag import (
    coil_for_sag,
    sag_percent,
    sag_travel_mm,
    sprung_mass_kg,
    travel_under_load_mm,
    weight_n,
    wheel_rate_n_mm,
)
from optimiser.wanted.spring import CoilSpring, ShaftSpring, air_spring
from optimiser.wanted.target import Target


@dataclass(frozen=True)
class Ride:
    """One rider at rest on one wheel of a frame."""

    rider_kg: float
    sprung_kg: float
    """Mass this wheel's spring carries, kg."""
    load_n: float
    """Its weight at the wheel, N."""
    sag_percent: float
    sag_travel_mm: float
    sag_stroke_mm: float
    leverage_at_sag: float
    spring: ShaftSpring
    coil_n_mm: float | None
    """Rate of the coil, N/mm; None for an air spring."""
    shaft_rate_n_mm: float
    """Slope of the spring's force on the shaft at sag, N/mm."""
    wheel_rate_n_mm: float
    """Slope of the force at the wheel at sag, N/mm."""
    body_hz: float
    """Undamped natural frequency of the sprung mass on its spring alone, Hz."""
    critical_wheel_n_s_m: float
    critical_shaft_n_s_m: float


@dataclass(frozen=True)
class Derived:
    """What rider, frame and feel ask of the damper."""

    ride: Ride
    compression: Target
    rebound: Target
    notes: tuple[str, ...]
    """The rebound rule's remarks (common practice, no source); empty when it is kept."""

    def target(self, direction: Direction) -> Target:
        """The target of one direction."""
        return self.compression if direction == "compression" else self.rebound


def ride_of(rider: Rider, frame: Frame, sag: float | None = None, gas_force_n: float = 0.0) -> Ride:
    """Statics and critical damping of a rider on a frame.

    ``sag``, %, is met by choosing the coil rate; left out, the frame's usual sag is taken. A
    spring that is already known (coil with a rate, air) gives its own sag instead.
    ``gas_force_n`` is the damper's constant gas force on the shaft, N (coil springs only: an air
    spring is measured with the damper inside). With k the wheel rate at sag and m the sprung mass:
    body frequency sqrt(k/m)/(2 pi), critical damping 2 sqrt(k m) at the wheel (Rao, *Mechanical
    Vibrations*, single-degree system) and LR^2 times that at the shaft. Raises BadInput.
    """
    mass = sprung_mass_kg(rider, frame)
    load = weight_n(mass)
    spring, travel = _settled(frame, load, sag, gas_force_n)
    stroke = frame.lever.stroke_mm(travel)
    leverage = frame.lever.ratio_at(travel)
    rate = wheel_rate_n_mm(frame.lever, spring, travel)
    if rate <= 0.0:
        raise BadInput(
            f"the wheel rate at {travel:.1f} mm of travel is {rate:.2f} N/mm: the leverage rises "
            "so fast there that the wheel goes on sinking; check the leverage points"
        )
    critical = 2.0 * sqrt(1e3 * rate * mass)
    return Ride(
        rider_kg=rider.mass_kg,
        sprung_kg=mass,
        load_n=load,
        sag_percent=sag_percent(frame, travel),
        sag_travel_mm=travel,
        sag_stroke_mm=stroke,
        leverage_at_sag=leverage,
        spring=spring,
        coil_n_mm=spring.coil_n_mm if isinstance(spring, CoilSpring) else None,
        shaft_rate_n_mm=spring.rate_n_mm(stroke),
        wheel_rate_n_mm=rate,
        body_hz=sqrt(1e3 * rate / mass) / (2.0 * pi),
        critical_wheel_n_s_m=critical,
        critical_shaft_n_s_m=critical * leverage * leverage,
    )


def derive(
    rider: Rider,
    frame: Frame,
    feel: Feel,
    sag: float | None = None,
    gas_force_n: float = 0.0,
    points: int = 10,
) -> Derived:
    """Targets of both directions for a rider (sag in %, gas force in N), and the statics.

    Raises BadInput as ``ride_of`` does.
    """
    ride = ride_of(rider, frame, sag, gas_force_n)
    origin = f"{rider.mass_kg:g} kg on {frame.name}, {feel.name}"
    compression = shaft_target(ride, feel.compression, "compression", origin, points)
    rebound = shaft_target(ride, feel.rebound, "rebound", origin, points)
    return Derived(ride, compression, rebound, tuple(rebound_notes(compression, rebound)))


def shaft_target(
    ride: Ride, feel: StrokeFeel, direction: Direction, origin: str, points: int = 10
) -> Target:
    """The feel's wheel force carried to the shaft: F_s(v_s) = LR F_w(LR v_s), LR at sag.

    Virtual work on the lever; for a viscous damper c_s = LR^2 c_w. Points are evenly spaced in
    log velocity over the feel's wheel speeds.
    """
    wheel = np.geomspace(feel.slowest_wheel_m_s, feel.fastest_wheel_m_s, points)
    force = feel.wheel_force_n(wheel, ride.critical_wheel_n_s_m)
    leverage = ride.leverage_at_sag
    return Target.of(wheel / leverage, force * leverage, direction=direction, origin=origin)


def stroke_notes(frame: Frame, damper_stroke_mm: float) -> list[str]:
    """A sentence when the frame's whole travel needs more stroke than the damper has, mm."""
    needed = frame.lever.full_stroke_mm
    if needed <= damper_stroke_mm * 1.001:
        return []
    return [
        f"{frame.name} needs {needed:.1f} mm of shaft stroke for its {frame.wheel_travel_mm:g} mm "
        f"of wheel travel, the damper has {damper_stroke_mm:g} mm"
    ]


def _settled(
    frame: Frame, load_n: float, sag: float | None, gas_force_n: float
) -> tuple[ShaftSpring, float]:
    """The spring and the wheel travel, mm, at which it carries load_n, N."""
    description, lever = frame.spring, frame.lever
    spring: ShaftSpring
    if description.kind == "air":
        spring = air_spring(description, lever.full_stroke_mm)
    elif description.rate_n_mm is not None:
        spring = CoilSpring(description.rate_n_mm, description.preload_mm, gas_force_n)
    else:
        asked = frame.sag_percent if sag is None else sag
        travel = sag_travel_mm(frame, asked)
        coil = coil_for_sag(load_n, lever, travel, description.preload_mm, gas_force_n)
        return coil, travel
    if sag is not None:
        raise BadInput(
            f"{frame.name} names its spring, so the sag follows from it; give a sag only for a "
            "coil without rate_n_mm"
        )
    travel = travel_under_load_mm(load_n, lever, spring)
    found = sag_percent(frame, travel)
    if not LEAST_SAG_PERCENT <= found <= MOST_SAG_PERCENT:
        fault = "too soft" if found > MOST_SAG_PERCENT else "too firm"
        raise BadInput(
            f"the spring of {frame.name} is {fault} for this rider: sag would be {found:.1f} %, "
            f"allowed are {LEAST_SAG_PERCENT:g} to {MOST_SAG_PERCENT:g} %"
        )
    return spring, travel
