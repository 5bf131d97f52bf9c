"""A target relative to what is fitted: so much per cent at low, mid and high speed, a later knee.

The change is applied to the model's own prediction of the fitted stack, so a bias of the model
that acts on both stacks alike cancels.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import PchipInterpolator

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.wanted.arrays import Floats
from optimiser.wanted.target import Target, shape_notes

LEAST_PERCENT, MOST_PERCENT = -80.0, 300.0
LEAST_KNEE_PERCENT, MOST_KNEE_PERCENT = -60.0, 150.0
LEAST_SLOPE = 0.01
"""d ln F / d ln v below which a wish is bent: force may not fall as velocity rises."""
_GRID = 400


@dataclass(frozen=True)
class Wish:
    """How the fitted damping should change, %; 0 leaves it as it is.

    ``low``, ``mid`` and ``high`` hold at the middle of the bands of ``optimiser.wanted.bands``
    (and beyond the outer two); ``knee`` moves the knee velocity: positive opens later.
    """

    low_percent: float = 0.0
    mid_percent: float = 0.0
    high_percent: float = 0.0
    knee_percent: float = 0.0

    def __post_init__(self) -> None:
        faults = [
            _out_of_range(name, getattr(self, f"{name}_percent"), LEAST_PERCENT, MOST_PERCENT)
            for name in ("low", "mid", "high")
        ]
        faults.append(
            _out_of_range("knee", self.knee_percent, LEAST_KNEE_PERCENT, MOST_KNEE_PERCENT)
        )
        if any(faults):
            raise BadInput(fault for fault in faults if fault)

    @property
    def words(self) -> str:
        """The wish in one line, e.g. ``low +10 %, high -5 %``."""
        parts = [
            f"{name} {getattr(self, f'{name}_percent'):+g} %"
            for name in ("low", "mid", "high", "knee")
            if getattr(self, f"{name}_percent") != 0.0
        ]
        return ", ".join(parts) or "no change"


def changed(
    velocity_m_s: ArrayLike,
    force_n: ArrayLike,
    *,
    low_percent: float = 0.0,
    mid_percent: float = 0.0,
    high_percent: float = 0.0,
    knee_percent: float = 0.0,
    direction: Direction = "compression",
    origin: str = "fitted stack",
) -> Target:
    """Target at the same velocities (n,), m/s, from the fitted stack's predicted force_n (n,), N.

    Knee: F1(v) = F(v/k) k^s, with k = 1 + knee/100 and s = d ln F / d ln v at the lowest velocity:
    the curve slides along its own low-speed line, so the low-speed damping stays and what comes
    after opens at k times the velocity. Bands: F2(v) = F1(v) g(v), ln g a monotone cubic in ln v
    through the three wishes at the bands' middles, flat outside. Where F2 would fall or stand
    still (d ln F / d ln v under ``LEAST_SLOPE``) its slope is raised to that and the curve
    shifted to stay as close as possible; a note says where and by how much. (Own definitions;
    no source.) Raises BadInput for a wish out of range or a curve that is no target.
    """
    wish = Wish(low_percent, mid_percent, high_percent, knee_percent)
    base = Target.of(velocity_m_s, force_n, direction=direction)
    if shape_notes(base):
        raise BadInput(f"the curve to change falls with velocity: {shape_notes(base)[0]}")
    x = np.log(base.velocity_m_s)
    grid = np.unique(np.concatenate([x, np.linspace(x[0], x[-1], _GRID)]))
    wished = _slid(x, np.log(base.force_n), grid, wish.knee_percent) + _lift(grid, wish)
    rising = wished if wish == Wish() else _rising(grid, wished)
    at = np.searchsorted(grid, x)
    notes = _bent_notes(base.velocity_m_s, rising[at] - wished[at])
    return Target.of(
        base.velocity_m_s,
        np.exp(rising[at]),
        direction=direction,
        origin=f"{origin}: {wish.words}",
        notes=notes,
    )


def _out_of_range(name: str, percent: float, least: float, most: float) -> str:
    if least <= percent <= most:
        return ""
    return f"the wish for {name} must be {least:+g} to {most:+g} %, not {percent:g}"


def _slid(x: Floats, y: Floats, grid: Floats, knee_percent: float) -> Floats:
    """Log force on the grid after the knee has moved; straight beyond the known range."""
    curve = PchipInterpolator(x, y)
    shift = np.log1p(knee_percent / 100.0)
    first, last = (float(slope) for slope in curve(x[[0, -1]], 1))
    at = grid - shift
    inside = np.clip(at, x[0], x[-1])
    outside = np.where(at < x[0], first, last) * (at - inside)
    return np.asarray(curve(inside) + outside + first * shift)


def _lift(grid: Floats, wish: Wish) -> Floats:
    """ln of the wished factor on the grid of log velocities."""
    percents = np.array([wish.low_percent, wish.mid_percent, wish.high_percent])
    low, mid, high = np.log1p(percents / 100.0)
    nodes = grid[0] + (grid[-1] - grid[0]) * np.array([0.0, 1.0, 3.0, 5.0, 6.0]) / 6.0
    return np.asarray(PchipInterpolator(nodes, [low, low, mid, high, high])(grid))


def _rising(grid: Floats, wished: Floats) -> Floats:
    """The wish itself where it rises fast enough, else its slope raised to the least one."""
    steps = np.diff(grid)
    slope = np.diff(wished) / steps
    if np.all(slope >= LEAST_SLOPE):
        return wished
    climbed = np.cumsum(np.maximum(slope, LEAST_SLOPE) * steps)
    bent = wished[0] + np.concatenate([[0.0], climbed])
    return np.asarray(bent - np.mean(bent - wished))


def _bent_notes(velocity: Floats, bend: Floats) -> list[str]:
    off = 100.0 * np.expm1(bend)
    if np.max(np.abs(off)) < 0.05:
        return []
    index = int(np.argmax(np.abs(off)))
    return [
        "this wish would make the force fall or stand still as velocity rises, which no shim valve "
        f"does; the target was bent, most at {velocity[index]:g} m/s ({off[index]:+.1f} %)"
    ]
