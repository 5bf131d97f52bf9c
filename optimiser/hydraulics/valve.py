"""One shim valve: ports, curtain under the lifted shims, bleed beside them, series parts behind.

Everything is explicit in the pressure across the shims: lift -> flow through the curtain -> port
loss added -> bleed in parallel -> series loss added. :func:`drops_at` inverts that relation.
"""

from math import exp, inf, log, log1p, pi
from typing import NamedTuple

import numpy as np

from optimiser.compiled import kernel
from optimiser.damper import Bleed, Body, Displacement, Valve
from optimiser.faults import BadInput
from optimiser.hydraulics.lift import Cell, Floats, cell_at, lift_in, opening
from optimiser.hydraulics.oil import OilState
from optimiser.hydraulics.restrictions import (
    curtain_flow,
    curtain_unit_terms,
    drop,
    flow,
    needle_area,
    port_terms,
    share,
    short_tube_terms,
)

#: Relative error of the flow at which the inversion stops; the drop is then as near.
FLOW_TOLERANCE = 1e-7
MOST_STEPS = 200


class ValveNumbers(NamedTuple):
    """A shim valve and its oil as SI numbers for the kernels (all but the bleed, see below).

    port_a, port_b and series_a, series_b: Pa s/m3 and Pa s2/m6; curtain_a, curtain_b: the same at
    1 m lift, to be divided by lift^3 and lift^2; area_m2: the area that pushes oil through the
    valve; loaded_fraction: share of the port ring the pressure acts on, for whoever computes the
    lift.
    """

    port_a: float
    port_b: float
    curtain_a: float
    curtain_b: float
    series_a: float
    series_b: float
    area_m2: float
    loaded_fraction: float


def displaced_area_m2(displacement: Displacement, body: Body) -> float:
    """Area (m2) that pushes oil: piston, piston less shaft (ring) or shaft."""
    piston = 0.25 * pi * (body.piston_mm * 1e-3) ** 2
    shaft = 0.25 * pi * (body.shaft_mm * 1e-3) ** 2
    areas = {"piston": piston, "piston_less_shaft": piston - shaft, "shaft": shaft}
    return areas[displacement]


def valve_numbers(valve: Valve, body: Body, oil: OilState) -> ValveNumbers:
    """Numbers of a shim valve (``kind = "shim"``) in ``body`` with oil at one temperature.

    Formulas: :mod:`optimiser.hydraulics.restrictions`. Calibratable: ``ports.discharge``,
    ``ports.loaded_fraction``, ``seat.discharge``. Raises TypeError for a check valve.
    """
    ports, seat = valve.ports, valve.seat
    if ports is None or seat is None:
        raise TypeError(f"valve '{valve.name}' is not a shim valve")
    density, viscosity, _ = oil
    port = port_terms(
        ports.area_mm2 * 1e-6,
        ports.hydraulic_mm * 1e-3,
        ports.length_mm * 1e-3,
        ports.discharge,
        density,
        viscosity,
    )
    curtain = curtain_unit_terms(
        0.5e-3 * seat.seat_mm,
        1e-3 * seat.land_mm,
        seat.open_fraction,
        seat.discharge,
        density,
        viscosity,
    )
    area = displaced_area_m2(valve.displacement, body)
    return ValveNumbers(*port, *curtain, *series_numbers(valve, oil), area, ports.loaded_fraction)


def series_numbers(valve: Valve, oil: OilState) -> tuple[float, float]:
    """(a, b) of the valve's series part (Pa s/m3, Pa s2/m6); zeros when it has none."""
    part = valve.series
    if part is None:
        return 0.0, 0.0
    return port_terms(
        part.area_mm2 * 1e-6,
        part.hydraulic_mm * 1e-3,
        part.length_mm * 1e-3,
        part.discharge,
        oil.density_kg_m3,
        oil.viscosity_pa_s,
    )


def bleed_area_m2(bleed: Bleed, clicks: float | None) -> float:
    """Open bleed area (m2): the fixed hole plus the needle at ``clicks`` out from closed.

    ``clicks`` counts only where there is a needle; None then means the middle of its range.
    Raises BadInput for a setting outside the needle's clicks.
    """
    fixed, needle = bleed.area_mm2 * 1e-6, bleed.needle
    if needle is None:
        return fixed
    setting = needle.clicks // 2 if clicks is None else clicks
    if not 0 <= setting <= needle.clicks:
        raise BadInput(
            f"clicks {setting:g}: this adjuster has 0 (closed) to {needle.clicks} (fully open)"
        )
    lift_mm = needle.offset_mm + setting * needle.lift_per_click_mm
    return fixed + needle_area(needle.jet_mm * 1e-3, needle.cone_deg, lift_mm * 1e-3)


def bleed_numbers(valve: Valve, oil: OilState, clicks: float | None = None) -> tuple[float, float]:
    """(a, b) of the bleed at a click setting (Pa s/m3, Pa s2/m6); infinite when it is closed.

    Fixed hole and needle count as one round passage of their total area. ``clicks`` None means
    the valve's ``fitted_clicks``, else the middle of the needle's range. Calibratable:
    ``bleed.area_mm2``, ``bleed.discharge``, ``needle.offset_mm``.
    """
    setting = valve.fitted_clicks if clicks is None else clicks
    return short_tube_terms(
        bleed_area_m2(valve.bleed, setting),
        valve.bleed.length_mm * 1e-3,
        valve.bleed.discharge,
        oil.density_kg_m3,
        oil.viscosity_pa_s,
    )


def bleed_settings(valve: Valve, oil: OilState) -> tuple[Floats, Floats]:
    """(a, b) of the bleed at every click, closed first: two arrays (clicks + 1,), or (1,) without
    a needle. Units as in :func:`bleed_numbers`."""
    needle = valve.bleed.needle
    settings = range(needle.clicks + 1) if needle else range(1)
    pairs = np.array([bleed_numbers(valve, oil, setting) for setting in settings])
    return np.ascontiguousarray(pairs[:, 0]), np.ascontiguousarray(pairs[:, 1])


@kernel
def through_shims(
    numbers: ValveNumbers, shim_pressure_pa: float, lift_m: float
) -> tuple[float, float]:
    """(flow through ports and curtain m3/s, drop over both Pa) at one shim pressure and lift."""
    q = curtain_flow(shim_pressure_pa, lift_m, numbers.curtain_a, numbers.curtain_b)
    return q, shim_pressure_pa + drop(q, numbers.port_a, numbers.port_b)


@kernel
def valve_table(
    numbers: ValveNumbers, bleed_a: float, bleed_b: float, pressure_pa: Floats, lift_m: Floats
) -> tuple[Floats, Floats]:
    """(total flow m3/s (k,), total drop Pa (k,)) at the entries of a lift table, both rising.

    ``pressure_pa`` (k,) across the shims, ``lift_m`` (k,); bleed and series part included.
    """
    flows, drops = np.empty(pressure_pa.size), np.empty(pressure_pa.size)
    for i in range(pressure_pa.size):
        q, across = through_shims(numbers, pressure_pa[i], lift_m[i])
        flows[i] = q + flow(across, bleed_a, bleed_b)
        drops[i] = across + drop(flows[i], numbers.series_a, numbers.series_b)
    return flows, drops


@kernel
def softest_drop(numbers: ValveNumbers, bleed_a: float, bleed_b: float, flow_m3_s: float) -> float:
    """Drop (Pa) without any shims: ports and bleed side by side, series part behind."""
    q = share(flow_m3_s, numbers.port_a, numbers.port_b, bleed_a, bleed_b)
    across = drop(q, numbers.port_a, numbers.port_b)
    return across + drop(flow_m3_s, numbers.series_a, numbers.series_b)


@kernel
def firmest_drop(numbers: ValveNumbers, bleed_a: float, bleed_b: float, flow_m3_s: float) -> float:
    """Drop (Pa) with the shims held shut: bleed and series part only; infinite without a bleed."""
    across = drop(flow_m3_s, bleed_a, bleed_b)
    return across + drop(flow_m3_s, numbers.series_a, numbers.series_b)


@kernel
def bleed_shares(
    numbers: ValveNumbers, bleed_a: float, bleed_b: float, flows_m3_s: Floats, drops_pa: Floats
) -> Floats:
    """Share (0 to 1, (n,)) of each flow (m3/s, (n,)) that passes the bleed at its total drop (Pa).

    At no flow it is the limit: 1 with an open bleed, else 0.
    """
    shares = np.empty(flows_m3_s.size)
    for n in range(flows_m3_s.size):
        q = flows_m3_s[n]
        if q <= 0.0:
            shares[n] = 1.0 if bleed_a < inf else 0.0
        else:
            across = drops_pa[n] - drop(q, numbers.series_a, numbers.series_b)
            shares[n] = min(1.0, flow(across, bleed_a, bleed_b) / q)
    return shares


@kernel
def _total(
    numbers: ValveNumbers, bleed_a: float, bleed_b: float, cell: Cell, pressure: float
) -> float:
    """Flow through shims and bleed (m3/s) at one shim pressure (Pa)."""
    q, across = through_shims(numbers, pressure, lift_in(cell, pressure))
    return q + flow(across, bleed_a, bleed_b)


@kernel
def _slope(
    numbers: ValveNumbers, bleed_a: float, bleed_b: float, cell: Cell, pressure: float
) -> tuple[float, float, float]:
    """(flow through shims and bleed, drop over them, d flow / d shim pressure).

    Through the curtain, from a Q + b Q^2 = p with a ~ y^-3 and b ~ y^-2:
    dQ = (dp + (3 a Q + 2 b Q^2) dy / y) / (a + 2 b Q).
    """
    s = pressure - cell.left
    y = lift_in(cell, pressure)
    q = curtain_flow(pressure, y, numbers.curtain_a, numbers.curtain_b)
    across = pressure + drop(q, numbers.port_a, numbers.port_b)
    gain = 0.0
    if y > 0.0:
        dy = cell.c1 + s * (2.0 * cell.c2 + s * 3.0 * cell.c3)
        a, b = numbers.curtain_a, numbers.curtain_b * y * q
        gain = (y * y * y + (3.0 * a + 2.0 * b) * q * dy / y) / (a + 2.0 * b)
    bled = flow(across, bleed_a, bleed_b)
    total = q + bled
    steeper = 1.0 + (numbers.port_a + 2.0 * numbers.port_b * q) * gain
    bleed_slope = bleed_a + 2.0 * bleed_b * bled if bled > 0.0 else inf
    return total, across, gain + (steeper / bleed_slope if bleed_slope > 0.0 else inf)


@kernel
def _start(q: float, low: float, q_low: float, high: float, q_high: float) -> float:
    """First pressure: a straight line in log-log, which is exact for a power law."""
    if q_high <= q_low:
        return 0.5 * (low + high)
    if low > 0.0 and q_low > 0.0:
        return low * exp(log(high / low) * log(q / q_low) / log(q_high / q_low))
    return low + (high - low) * (q - q_low) / (q_high - q_low)


@kernel
def _better(pressure: float, excess: float, exponent: float) -> float:
    """Newton's step in log-log for Q ~ p^exponent; ``excess`` = wanted flow / flow - 1."""
    step = excess / exponent
    if abs(step) < 0.1:
        return pressure * (1.0 + step * (1.0 + 0.5 * step * (1.0 - exponent)))
    return pressure * exp(log1p(excess) / exponent)


@kernel
def _invert(
    numbers: ValveNumbers,
    bleed_a: float,
    bleed_b: float,
    cell: Cell,
    q: float,
    bounds: tuple[float, float, float, float],
) -> tuple[float, float]:
    """(shim pressure, drop over shims and ports) at total flow ``q`` within one cell.

    ``bounds`` = pressure and flow at the lower and the upper end, q between the flows. Newton's
    steps in log-log, halving the bracket instead whenever one leaves it or they take long.
    """
    low, _, high, _ = bounds
    pressure, across = high, high
    wanted = _start(q, bounds[0], bounds[1], bounds[2], bounds[3])
    for step in range(MOST_STEPS):
        if not low < wanted < high or step % 4 == 3:
            wanted = 0.5 * (low + high)
        pressure = wanted
        total, across, slope = _slope(numbers, bleed_a, bleed_b, cell, pressure)
        if abs(total - q) <= FLOW_TOLERANCE * q or high - low <= 1e-14 * high:
            break
        if total < q:
            low = pressure
        else:
            high = pressure
        exponent = pressure * slope / total if total > 0.0 else inf
        usable = 0.0 < exponent < inf
        wanted = _better(pressure, q / total - 1.0, exponent) if usable else low
    return pressure, across


@kernel
def _climb(
    numbers: ValveNumbers,
    bleed_a: float,
    bleed_b: float,
    pressure_pa: Floats,
    lift_m: Floats,
    first: int,
    place: tuple[int, float, float],
    q: float,
) -> tuple[int, float, float]:
    """(index, flow at its lower end, flow at its upper end) of the cell that holds flow ``q``.

    ``first``: first open entry; ``place``: the same three numbers of the cell to start from. Past
    the table's last entry the upper flow is infinite.
    """
    i, q_low, q_high = place
    while q_high < q:
        i, q_low = i + 1, q_high
        if first + i >= pressure_pa.size:
            return i, q_low, inf
        through, across = through_shims(numbers, pressure_pa[first + i], lift_m[first + i])
        q_high = through + flow(across, bleed_a, bleed_b)
    return i, q_low, q_high


@kernel
def _top(
    numbers: ValveNumbers,
    bleed_a: float,
    bleed_b: float,
    cell: Cell,
    q: float,
    most: tuple[float, float],
) -> tuple[float, float]:
    """(pressure, flow) at the upper end of the search in ``cell``, where at least ``q`` passes.

    ``most``: pressure at which the bleed alone takes ``q``, above which no root lies, and the flow
    at the cell's upper end.
    """
    bled, q_high = most
    if cell.right <= bled and cell.right < inf:
        return cell.right, q_high
    if bled < inf:
        return bled, _total(numbers, bleed_a, bleed_b, cell, bled)
    pressure, total = cell.left, 0.0
    while total < q and pressure < inf:
        pressure *= 2.0
        total = _total(numbers, bleed_a, bleed_b, cell, pressure)
    return pressure, total


@kernel
def drops_at(
    numbers: ValveNumbers,
    bleed_a: float,
    bleed_b: float,
    pressure_pa: Floats,
    lift_m: Floats,
    flows_m3_s: Floats,
    drop_out: Floats,
    shim_pressure_out: Floats,
    lift_out: Floats,
) -> int:
    """What a valve does at given total flows; returns how many lie beyond the lift table.

    ``pressure_pa``, ``lift_m`` (k,): the stack's lift table (see lift.LiftTable), interpolated by
    monotone cubics. ``flows_m3_s`` (n,) >= 0, quickest when rising. Filled in, all (n,): total drop
    (Pa, series part included), pressure across the shims (Pa), lift (m). Flow i lies beyond the
    table when ``shim_pressure_out[i] > pressure_pa[-1]``: the lift is then continued in a straight
    line. The drop is infinite where nothing lets the oil through.

    The flow is met to 1e-7 relative by a bracketed iteration, so the drop's error is that of the
    table: under 0.1 % with 16 entries of ``pressure_grid`` for a smoothly stiffening stack,
    preloaded or not, if the opening pressure is an entry (else several percent just above it); a
    crossover gap that closes between two entries costs up to 2 % there (1.2 % with 32 entries).
    """
    first, start = opening(pressure_pa, lift_m)
    opens = first < pressure_pa.size
    bottom = (-1, 0.0, flow(start, bleed_a, bleed_b))
    place, before, beyond = bottom, 0.0, 0
    for n in range(flows_m3_s.size):
        q = flows_m3_s[n]
        if q < before:
            place = bottom
        before = q
        bled = drop(q, bleed_a, bleed_b)
        pressure, across, lift = bled, bled, 0.0
        if opens and q > bottom[2]:
            place = _climb(numbers, bleed_a, bleed_b, pressure_pa, lift_m, first, place, q)
            i, q_low, q_high = place
            cell = cell_at(pressure_pa, lift_m, first, start, i)
            high, q_high = _top(numbers, bleed_a, bleed_b, cell, q, (bled, q_high))
            bounds = (cell.left, q_low, high, q_high)
            pressure, across = _invert(numbers, bleed_a, bleed_b, cell, q, bounds)
            lift = lift_in(cell, pressure)
        beyond += pressure > pressure_pa[-1]
        drop_out[n] = across + drop(q, numbers.series_a, numbers.series_b)
        shim_pressure_out[n] = pressure
        lift_out[n] = lift
    return beyond
