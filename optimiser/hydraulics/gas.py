"""The gas behind the oil: its pressure at a shaft position and its force on the shaft.

The four kinds of damper differ only in which valve changes the pressure between the gas and the
low-pressure side (``Valve.low_side``); the static pressure is the gas's in all of them.
"""

from math import pi

from optimiser.damper import Body, Direction, Gas
from optimiser.faults import BadInput

#: Standard atmosphere (ISO 2533), Pa.
ATMOSPHERE_PA = 101325.0


def gas_pressure_pa(gas: Gas, body: Body, travel_mm: float = 0.0) -> float:
    """Absolute gas pressure (Pa) with the shaft ``travel_mm`` into the body from full extension.

    Boyle's law, p V constant: the shaft takes its own volume from the gas. Slow movement, constant
    temperature. Raises BadInput for a travel outside the stroke.
    """
    if not 0.0 <= travel_mm <= body.stroke_mm:
        raise BadInput(
            f"travel {travel_mm:g} mm: allowed is 0 to the stroke, {body.stroke_mm:g} mm"
        )
    full = gas.volume_cm3 * 1e-6
    left = full - 0.25 * pi * body.shaft_mm**2 * travel_mm * 1e-9
    return (gas.pressure_mpa * 1e6 + ATMOSPHERE_PA) * full / left


def gas_force_n(gas: Gas, body: Body, direction: Direction, travel_mm: float = 0.0) -> float:
    """Gas force (N) in the direction of the stroke's resistance: gauge pressure x shaft area.

    It pushes the shaft out: it adds to the compression force a raw dyno shows and is missing from
    the rebound force.
    """
    gauge = gas_pressure_pa(gas, body, travel_mm) - ATMOSPHERE_PA
    out = gauge * 0.25 * pi * body.shaft_mm**2 * 1e-6
    return out if direction == "compression" else -out
