"""One annular plate, clamped at its inner radius and free at its outer edge: closed forms.

Sign convention: loads, deflections and slopes are positive away from the seat; a moment that
lifts the edge is positive. Lengths in any one unit, forces in N: results are for a bending
stiffness D = 1 and scale with 1/D (moments do not depend on D).

Source: S. Timoshenko and S. Woinowsky-Krieger, *Theory of Plates and Shells*, 2nd ed. (1959),
art. 16-17: for a ring load the plate equation d/dr[(1/r) d(r w')/dr] = -V/D integrates in closed
form. Checked against *Roark's Formulas for Stress and Strain* in tests/published.
"""

from math import log, pi

import numpy as np

from optimiser.compiled import kernel


@kernel
def _shear_integral(r: float, s: float, clamp: float) -> float:
    """Integral of x ln(x/s) from the clamp to r."""
    return (
        0.5 * r * r * log(r / s)
        - 0.25 * r * r
        - (0.5 * clamp * clamp * log(clamp / s) - 0.25 * clamp * clamp)
    )


@kernel
def _edge_constant(s: float, clamp: float, edge: float, poisson: float) -> float:
    """Curvature sum w'' + w'/r outside the ring load, from M_r = 0 at the free edge."""
    return (
        -(1.0 - poisson)
        / pi
        * _shear_integral(s, s, clamp)
        / ((1.0 + poisson) * edge * edge + (1.0 - poisson) * clamp * clamp)
    )


@kernel
def ring_slope(r: float, s: float, clamp: float, edge: float, poisson: float) -> float:
    """Slope at radius r of a plate under 1 N spread over the ring of radius s (D = 1)."""
    if r <= clamp or s <= clamp:
        return 0.0
    outside = _edge_constant(s, clamp, edge, poisson)
    inner = min(r, s)
    return 0.5 * outside * (r - clamp * clamp / r) - _shear_integral(inner, s, clamp) / (
        2.0 * pi * r
    )


@kernel
def ring_deflection(r: float, s: float, clamp: float, edge: float, poisson: float) -> float:
    """Deflection at radius r of a plate under 1 N spread over the ring of radius s (D = 1)."""
    if r <= clamp or s <= clamp:
        return 0.0
    outside = _edge_constant(s, clamp, edge, poisson)
    inner = min(r, s)
    squared = clamp * clamp
    start = 0.5 * squared * log(clamp / s) - 0.25 * squared
    bent = (
        0.25 * inner * inner * log(inner / s)
        - 0.25 * inner * inner
        - 0.25 * squared * log(clamp / s)
        + 0.25 * squared
        - start * log(inner / clamp)
    )
    if r > s:
        bent += _shear_integral(s, s, clamp) * log(r / s)
    return 0.5 * outside * (0.5 * (r * r - squared) - squared * log(r / clamp)) - bent / (2.0 * pi)


@kernel
def ring_moment(r: float, s: float, clamp: float, edge: float, poisson: float) -> float:
    """Radial bending moment per length at radius r, under 1 N on the ring of radius s."""
    if s <= clamp:
        return 0.0
    total = _edge_constant(s, clamp, edge, poisson)
    if r < s:
        total -= log(r / s) / (2.0 * pi)
    return total - (1.0 - poisson) * ring_slope(r, s, clamp, edge, poisson) / r


@kernel
def slope_load_slope(r: float, s: float, clamp: float, edge: float, poisson: float) -> float:
    """Slope at r under a unit slope load at s: the derivative of :func:`ring_slope` by s (D =
    1)."""
    squared = clamp * clamp
    whole = (1.0 + poisson) * edge * edge + (1.0 - poisson) * squared
    inner = min(r, s)
    turned = (1.0 - poisson) / whole * (r * r - squared) * (s * s - squared)
    return (turned + inner * inner - squared) / (4.0 * pi * r * s)


@kernel
def slope_load_moment(r: float, s: float, clamp: float, edge: float, poisson: float) -> float:
    """Radial moment at r under a unit slope load at s: derivative of :func:`ring_moment` by s."""
    squared = clamp * clamp
    whole = (1.0 + poisson) * edge * edge + (1.0 - poisson) * squared
    total = (1.0 - poisson) * (s * s - squared) / (2.0 * pi * s * whole)
    if r < s:
        total += 1.0 / (2.0 * pi * s)
    return total - (1.0 - poisson) * slope_load_slope(r, s, clamp, edge, poisson) / r


_POINTS, _WEIGHTS = np.polynomial.legendre.leggauss(16)


@kernel
def pressure_response(
    r: float, inner: float, outer: float, clamp: float, edge: float, poisson: float, moment: bool
) -> float:
    """Deflection (D = 1), or radial moment, at r under unit pressure between two radii.

    The ring-load forms are integrated by Gauss-Legendre, split at r where they have a kink, which
    is exact to rounding for any ring wider than a few per cent of its radius.
    """
    total = 0.0
    start = max(inner, clamp)
    stop = min(outer, edge)
    middle = min(max(r, start), stop)
    for low, high in ((start, middle), (middle, stop)):
        if high <= low:
            continue
        half = 0.5 * (high - low)
        for k in range(_POINTS.size):
            s = low + half * (1.0 + _POINTS[k])
            weight = _WEIGHTS[k] * half * 2.0 * pi * s
            if moment:
                total += weight * ring_moment(r, s, clamp, edge, poisson)
            else:
                total += weight * ring_deflection(r, s, clamp, edge, poisson)
    return total


@kernel
def pressure_slope(
    r: float, inner: float, outer: float, clamp: float, edge: float, poisson: float
) -> float:
    """Slope (D = 1) at r under unit pressure between two radii, integrated as above."""
    total = 0.0
    start = max(inner, clamp)
    stop = min(outer, edge)
    middle = min(max(r, start), stop)
    for low, high in ((start, middle), (middle, stop)):
        if high <= low:
            continue
        half = 0.5 * (high - low)
        for k in range(_POINTS.size):
            s = low + half * (1.0 + _POINTS[k])
            total += _WEIGHTS[k] * half * 2.0 * pi * s * ring_slope(r, s, clamp, edge, poisson)
    return total
