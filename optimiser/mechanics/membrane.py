"""Stretching of one annular plate as it bends: the von Karman membrane force.

With the stress function F = r N_r (N_t = F') and u(clamp) = 0, N_r(edge) = 0, compatibility

    F'' + F'/r - F/r^2 = -E t (w')^2 / (2 r)

has the Green's function p(r<) q(r>) / W with p = r + c/r, q = r - b^2/r, c = a^2 (1-nu)/(1+nu),
W = 2 (b^2 + c). Hence F is linear in (w')^2, and the membrane energy is
pi * integral of F (w')^2 / 2 dr.

Source: S. Timoshenko and S. Woinowsky-Krieger, *Theory of Plates and Shells*, 2nd ed. (1959),
art. 100 (large deflections of circular plates).
"""

from optimiser.compiled import kernel
from optimiser.mechanics.layout import Floats


@kernel
def inner_factor(r: float, clamp: float, poisson: float) -> float:
    """Solution p(r) that does not move at the clamp."""
    return r + clamp * clamp * (1.0 - poisson) / (1.0 + poisson) / r


@kernel
def outer_factor(r: float, clamp: float, edge: float, poisson: float) -> float:
    """Solution -q(r) / W that carries no force at the free edge."""
    constant = clamp * clamp * (1.0 - poisson) / (1.0 + poisson)
    return (edge * edge / r - r) / (2.0 * (edge * edge + constant))


@kernel
def stress_function(stretch: Floats, inner: Floats, outer: Floats, result: Floats) -> None:
    """F at each point per unit E t, from ``stretch`` = weight x (w')^2 / 2 at the same points.

    All arrays (n,); ``inner`` and ``outer`` are the two factors there; ``result`` is overwritten.
    """
    total = 0.0
    for k in range(stretch.size):
        total += inner[k] * stretch[k]
        result[k] = outer[k] * total
    total = 0.0
    for k in range(stretch.size - 1, -1, -1):
        result[k] += inner[k] * total
        total += outer[k] * stretch[k]
