"""How far the shims lift at a pressure: monotone cubic interpolation of a table.

The table comes from the mechanics (this room knows nothing of shims): the seat lift, i.e. the gap
that is open, 0 while the seat is closed, at rising pressures across the shims.
"""

from typing import NamedTuple, Self

import numpy as np
import numpy.typing as npt

from optimiser.compiled import kernel
from optimiser.faults import BadInput

Floats = npt.NDArray[np.float64]


class LiftTable(NamedTuple):
    """Lift of one stack: pressure across the shims (Pa, (k,), rising, > 0) and lift (m, (k,)).

    The pressure is that in the ports; a valve whose ports load only part of the ring
    (``loaded_fraction``) has its stack loaded by that share of it, which is up to the caller.
    The table of a preloaded stack must begin with at least one closed (0) entry, best the pressure
    that opens it (:func:`pressure_grid`); without that entry the opening pressure is extrapolated
    from the open ones. A table that begins open lifts in proportion to pressure below its first.
    """

    pressure_pa: Floats
    lift_m: Floats

    @classmethod
    def from_mm(cls, pressure_mpa: npt.ArrayLike, lift_mm: npt.ArrayLike) -> Self:
        """Table from pressures in MPa and lifts in mm, both (k,), k >= 2.

        Raises BadInput when the lengths differ, a pressure does not rise or a lift is negative.
        """
        pressure = np.array(pressure_mpa, dtype=np.float64) * 1e6
        lift = np.array(lift_mm, dtype=np.float64) * 1e-3
        if pressure.ndim != 1 or pressure.shape != lift.shape or pressure.size < 2:
            raise BadInput("a lift table needs as many lifts as pressures, two or more of each")
        if not (np.isfinite(pressure).all() and pressure[0] >= 0 and (np.diff(pressure) > 0).all()):
            raise BadInput("the pressures of a lift table must be finite, 0 or more, and rise")
        if not (np.isfinite(lift).all() and (lift >= 0).all()):
            raise BadInput("the lifts of a lift table must be finite and 0 or more")
        return cls(pressure, lift)


class Cell(NamedTuple):
    """One stretch of the interpolation: lift = y + s (c1 + s (c2 + s c3)), s = pressure - left."""

    left: float
    right: float
    y: float
    c1: float
    c2: float
    c3: float


def pressure_grid(max_pa: float, n: int, opens_pa: float = 0.0) -> Floats:
    """Pressures (Pa, (n,)) for a lift table: small steps at the low end, growing ones above.

    p_i = max (e^(4 i/n) - 1) / (e^4 - 1), i = 1..n: with n = 16 the first is 0.5 % of ``max_pa``,
    so that small openings are resolved, and the last step is a fifth of it. For a preloaded stack
    ``opens_pa`` is the pressure that opens it: the first entry, with the steps counted from there.
    Raises ValueError unless n >= 3 and 0 <= opens_pa < max_pa.
    """
    if not (0.0 <= opens_pa < max_pa and n >= 3):
        raise ValueError("pressure_grid needs 0 <= opens_pa < max_pa and n >= 3")
    lowest = 0 if opens_pa > 0.0 else 1
    steps = n - 1 + lowest
    above = np.expm1(4.0 * np.arange(lowest, steps + 1) / steps) / np.expm1(4.0)
    grid = opens_pa + (max_pa - opens_pa) * above
    grid[-1] = max_pa
    return np.asarray(grid, dtype=np.float64)


@kernel
def opening(pressure: Floats, lift: Floats) -> tuple[int, float]:
    """(index of the first open entry, pressure in Pa at which the seat begins to open).

    The opening pressure is found on the straight line through the first two open entries, and lies
    between the last closed entry and the first open one. (k, last pressure) if it never opens.
    """
    k = pressure.size
    first = 0
    while first < k and lift[first] <= 0.0:
        first += 1
    if first == 0:
        return 0, 0.0
    shut = pressure[first - 1]
    if first + 1 >= k or lift[first + 1] <= lift[first]:
        return first, shut
    slope = (lift[first + 1] - lift[first]) / (pressure[first + 1] - pressure[first])
    guess = pressure[first] - lift[first] / slope
    return first, guess if shut < guess < pressure[first] else shut


@kernel
def _node(pressure: Floats, lift: Floats, first: int, start: float, i: int) -> tuple[float, float]:
    """Node i of the interpolation: 0 is the opening point, the others are the open entries."""
    if i == 0:
        return start, 0.0
    return pressure[first + i - 1], lift[first + i - 1]


@kernel
def _end_slope(near: float, far: float, near_width: float, far_width: float) -> float:
    """One-sided slope at a table's end that keeps it monotone; secants and widths of two cells."""
    slope = ((2.0 * near_width + far_width) * near - near_width * far) / (near_width + far_width)
    if slope * near <= 0.0:
        return 0.0
    if near * far <= 0.0 and abs(slope) > 3.0 * abs(near):
        return 3.0 * near
    return slope


@kernel
def _inner_slope(left: float, right: float, left_width: float, right_width: float) -> float:
    """Weighted harmonic mean of two secants; 0 at a turning point."""
    if left * right <= 0.0:
        return 0.0
    w1, w2 = 2.0 * right_width + left_width, right_width + 2.0 * left_width
    return (w1 + w2) / (w1 / left + w2 / right)


@kernel
def cell_at(pressure: Floats, lift: Floats, first: int, start: float, i: int) -> Cell:
    """Stretch i of the interpolation; (first, start) from :func:`opening`.

    Monotone piecewise cubic (F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5 (1984); the
    same slopes as SciPy's PCHIP). The stretch after the last entry goes on in a straight line.
    """
    last = pressure.size - first
    if last == 0:
        return Cell(start, np.inf, 0.0, 0.0, 0.0, 0.0)
    j = min(i, last - 1)
    p0, y0 = _node(pressure, lift, first, start, j)
    p1, y1 = _node(pressure, lift, first, start, j + 1)
    width, secant = p1 - p0, (y1 - y0) / (p1 - p0)
    before, after, before_width, after_width = 0.0, 0.0, 0.0, 0.0
    if j > 0:
        p, y = _node(pressure, lift, first, start, j - 1)
        before_width, before = p0 - p, (y0 - y) / (p0 - p)
    if j + 1 < last:
        p, y = _node(pressure, lift, first, start, j + 2)
        after_width, after = p - p1, (y - y1) / (p - p1)
    m0, m1 = secant, secant
    if j > 0:
        m0 = _inner_slope(before, secant, before_width, width)
    elif j + 1 < last:
        m0 = _end_slope(secant, after, width, after_width)
    if j + 1 < last:
        m1 = _inner_slope(secant, after, width, after_width)
    elif j > 0:
        m1 = _end_slope(secant, before, width, before_width)
    if i >= last:
        return Cell(p1, np.inf, y1, max(m1, 0.0), 0.0, 0.0)
    c2 = (3.0 * secant - 2.0 * m0 - m1) / width
    return Cell(p0, p1, y0, m0, c2, (m0 + m1 - 2.0 * secant) / (width * width))


@kernel
def lift_in(cell: Cell, pressure_pa: float) -> float:
    """Lift (m) at a pressure (Pa) inside ``cell``."""
    s = pressure_pa - cell.left
    return cell.y + s * (cell.c1 + s * (cell.c2 + s * cell.c3))


@kernel
def lift_at(pressure: Floats, lift: Floats, wanted_pa: Floats) -> Floats:
    """Lift (m, (n,)) at the pressures ``wanted_pa`` (Pa, (n,)) by the table (k,), (k,)."""
    first, start = opening(pressure, lift)
    result = np.zeros(wanted_pa.size)
    for n in range(wanted_pa.size):
        p = wanted_pa[n]
        if p > start:
            i = np.searchsorted(pressure, p) - first
            result[n] = lift_in(cell_at(pressure, lift, first, start, max(i, 0)), p)
    return result
