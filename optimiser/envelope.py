"""What a damper can do at all, whatever the stack: the softest and the firmest possible force."""

import numpy as np
from numpy.typing import ArrayLike

from optimiser.hydraulics.circuit import fixed_force_n, limit_forces_n
from optimiser.hydraulics.lift import Floats
from optimiser.prediction import Setup, fixed_tables
from optimiser.wanted.feasible import Limits


def damper_limits(setup: Setup, velocity_m_s: ArrayLike) -> Limits:
    """Forces (n,), N, that bound every stack in the searched valve at velocities (n,), m/s.

    ``bare_n``: no shim at all and the needle fully open; ``shut_n``: shims that never lift and the
    needle shut, infinite without a bleed; both with the other valves, friction and gas, which
    alone are ``others_n``. The stock is not looked at: ``softest_n`` is ``bare_n`` and
    ``firmest_n`` is ``shut_n`` (a search replaces them by what its stock can build). Raises
    BadInput for velocities that cannot be used.
    """
    velocity = np.atleast_1d(np.asarray(velocity_m_s, dtype=np.float64))
    damper, direction, oil = setup.damper, setup.direction, setup.oil_state
    tables = fixed_tables(setup, float(velocity.max()))
    open_clicks = setup.clicks_range if setup.valve.bleed.needle else None
    shut_clicks = 0 if setup.valve.bleed.needle else None
    bare, _ = limit_forces_n(damper, direction, oil, velocity, tables, open_clicks)
    _, shut = limit_forces_n(damper, direction, oil, velocity, tables, shut_clicks)
    others = fixed_force_n(damper, direction, oil, velocity, tables)
    seat = setup.valve.seat
    preloaded = seat is not None and seat.height_mm > 0.0
    return Limits.of(bare, shut, bare, shut, others, preloaded=preloaded)


def place_percent(force_n: ArrayLike, limits: Limits) -> Floats:
    """Where forces (n,), N, lie between the softest (0) and the firmest possible (100), %.

    By ratio, ln(F/softest)/ln(firmest/softest), because the firmest is often many times the
    softest; below 0 and above 100 outside. NaN where the firmest is infinite. (Own definition.)
    """
    force = np.asarray(force_n, dtype=np.float64)
    room = np.log(limits.firmest_n / limits.softest_n)
    known = np.isfinite(room) & (room > 1e-9)
    place = 100.0 * np.log(force / limits.softest_n) / np.where(known, room, 1.0)
    return np.where(known, place, np.nan)
