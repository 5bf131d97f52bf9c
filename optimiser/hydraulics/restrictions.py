"""Single restrictions: pressure drop = a Q + b Q |Q|, and its closed inverse.

The viscous part ``a`` (Pa s/m3) grows with the oil's viscosity, the inertial part ``b``
(Pa s2/m6) with its density. A passage that does not exist has a = b = infinity: it lets
nothing through. Everything here is SI: m, m2, Pa, m3/s, kg/m3, Pa s.
"""

from math import cos, inf, log, pi, radians, sin, sqrt

from optimiser.compiled import kernel


@kernel
def drop(flow_m3_s: float, a: float, b: float) -> float:
    """Pressure drop (Pa) of a flow (m3/s, either sign): a Q + b Q |Q|."""
    if flow_m3_s == 0.0:
        return 0.0
    return (a + b * abs(flow_m3_s)) * flow_m3_s


@kernel
def flow(drop_pa: float, a: float, b: float) -> float:
    """Flow (m3/s) under a drop (Pa, either sign): the root of a Q + b Q |Q| = dp.

    Written as 2 dp / (a + sqrt(a^2 + 4 b |dp|)), which loses no digits when a or b vanishes.
    Infinite when both are zero.
    """
    if drop_pa == 0.0:
        return 0.0
    root = a + sqrt(a * a + 4.0 * b * abs(drop_pa))
    if root == 0.0:
        return inf if drop_pa > 0.0 else -inf
    return 2.0 * drop_pa / root


@kernel
def share(flow_m3_s: float, a: float, b: float, a_beside: float, b_beside: float) -> float:
    """Flow (m3/s) through passage (a, b) when ``flow_m3_s`` >= 0 splits over it and one beside it.

    Both have the same drop: a x + b x^2 = a' (Q - x) + b' (Q - x)^2, a quadratic in x whose
    positive root is written without a difference.
    """
    q = flow_m3_s
    if q <= 0.0 or a == inf:
        return 0.0
    if a_beside == inf:
        return q
    a_sum = a + a_beside
    inner = a_sum * a_sum + 4.0 * q * (a * b_beside + a_beside * b + b * b_beside * q)
    bottom = a_sum + 2.0 * b_beside * q + sqrt(inner)
    if bottom == 0.0:
        return 0.5 * q
    return min(q, 2.0 * q * (a_beside + b_beside * q) / bottom)


@kernel
def port_terms(
    area_m2: float,
    hydraulic_m: float,
    length_m: float,
    discharge: float,
    density: float,
    viscosity: float,
) -> tuple[float, float]:
    """(a, b) of a port or any passage with a hydraulic diameter.

    a = 32 mu L / (A d^2), Hagen-Poiseuille in a round hole of diameter d = 4 area / perimeter (a
    narrow slot of the same hydraulic diameter has 1.5 times as much); b = rho / (2 Cd^2 A^2).
    Calibratable: the discharge coefficient. Its default 0.72 lies between the 0.66 (long, 1/sqrt
    2.28) and 0.82 (short, 1/sqrt 1.5) of M. G. Rabie, *Fluid Power Engineering* (2009) eq. 2.40 and
    2.41.
    ``density`` kg/m3, ``viscosity`` Pa s. An area of 0 gives infinite terms.
    """
    if area_m2 <= 0.0:
        return inf, inf
    a = 32.0 * viscosity * length_m / (area_m2 * hydraulic_m * hydraulic_m)
    return a, orifice_term(area_m2, discharge, density)


@kernel
def short_tube_terms(
    area_m2: float, length_m: float, discharge: float, density: float, viscosity: float
) -> tuple[float, float]:
    """(a, b) of a bleed passage: one round hole of the given area.

    Calibratable: area and discharge coefficient; the default 0.70 is the middle of the same
    source as :func:`port_terms`, whose law this is with d = sqrt(4 A / pi).
    """
    diameter = sqrt(4.0 * max(area_m2, 0.0) / pi)
    return port_terms(area_m2, diameter, length_m, discharge, density, viscosity)


@kernel
def orifice_term(area_m2: float, discharge: float, density: float) -> float:
    """b of an opening without viscous part (check valve): rho / (2 Cd^2 A^2), infinite if closed.

    Calibratable: the discharge coefficient. A sharp slit has pi/(pi + 2) = 0.611; the check
    valve's default of 0.65 (between a sharp slit and a short tube) is common practice, no source.
    """
    if area_m2 <= 0.0:
        return inf
    return density / (2.0 * (discharge * area_m2) ** 2)


@kernel
def curtain_unit_terms(
    seat_radius_m: float,
    land_m: float,
    open_fraction: float,
    discharge: float,
    density: float,
    viscosity: float,
) -> tuple[float, float]:
    """(a y^3, b y^2) of the gap y between face shim and seat, so that any lift is cheap.

    a = 6 mu ln(ro/ri) / (pi y^3 phi), radial flow between discs over the land from ri to ro;
    b = rho / (2 Cd^2 (2 pi r_seat y phi)^2), phi the share of the circumference that opens.
    Calibratable: the discharge coefficient; its default 0.61 is that of a sharp slit, pi/(pi + 2)
    (H. E. Merritt, *Hydraulic Control Systems* (1967)). The pressure that the outflow regains while
    it slows down over the land is left to this coefficient.
    """
    inner, outer = seat_radius_m - 0.5 * land_m, seat_radius_m + 0.5 * land_m
    a = 6.0 * viscosity * log(outer / inner) / (pi * open_fraction)
    return a, orifice_term(2.0 * pi * seat_radius_m * open_fraction, discharge, density)


@kernel
def curtain_flow(drop_pa: float, lift_m: float, unit_a: float, unit_b: float) -> float:
    """Flow (m3/s) through the curtain at a drop >= 0 (Pa) and lift (m); 0 while it is shut.

    ``unit_a`` = a y^3 and ``unit_b`` = b y^2 are those of :func:`curtain_unit_terms`; multiplying
    the inverse by y^3 keeps it finite down to the smallest lift.
    """
    if lift_m <= 0.0 or drop_pa <= 0.0:
        return 0.0
    cube = lift_m * lift_m * lift_m
    inner = unit_a * unit_a + 4.0 * unit_b * cube * lift_m * drop_pa
    return 2.0 * drop_pa * cube / (unit_a + sqrt(inner))


@kernel
def needle_area(jet_m: float, cone_deg: float, lift_m: float) -> float:
    """Open area (m2) of a conical needle drawn ``lift_m`` out of a jet of bore ``jet_m``.

    The least area is the cone frustum square to the needle's flank, pi x sin h (d - x sin h cos h),
    h = half the included angle ``cone_deg``; it never exceeds the bore's own area.
    """
    half = radians(0.5 * cone_deg)
    across = lift_m * sin(half)
    bore = 0.25 * pi * jet_m * jet_m
    narrowing = across * cos(half)
    if narrowing >= 0.5 * jet_m:
        return bore
    return min(bore, pi * across * (jet_m - narrowing))


@kernel
def check_drop(
    flow_m3_s: float, cracking_pa: float, b: float, a_beside: float, b_beside: float
) -> float:
    """Drop (Pa) of a flow >= 0 (m3/s) through a check valve beside a bleed.

    Below the cracking pressure p0 (Pa) only the bleed (``a_beside``, ``b_beside``) is open; above,
    p0 + b x^2 = a' (Q - x) + b' (Q - x)^2 is a quadratic in the check valve's flow x.
    """
    q = flow_m3_s
    if q <= 0.0:
        return 0.0
    if a_beside == inf:
        return cracking_pa + b * q * q
    bled = drop(q, a_beside, b_beside)
    if bled <= cracking_pa or b == inf:
        return bled
    linear = a_beside + 2.0 * b_beside * q
    inner = linear * linear + 4.0 * (b - b_beside) * (bled - cracking_pa)
    bottom = linear + sqrt(max(inner, 0.0))
    if bottom == 0.0:
        return cracking_pa
    through = 2.0 * (bled - cracking_pa) / bottom
    return cracking_pa + b * through * through
