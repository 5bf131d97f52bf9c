"""Leverage: wheel travel against shaft stroke over the whole travel."""

from dataclasses import dataclass
from functools import cached_property

from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

from optimiser.wanted.arrays import Floats


@dataclass(frozen=True, eq=False)
class Leverage:
    """Leverage ratio LR = wheel travel per shaft stroke, at points of wheel travel.

    Its inverse ds/dx (x wheel travel, s shaft stroke) is interpolated by a monotone piecewise
    cubic (Fritsch and Carlson 1980), so the stroke is the exact integral of what is used for
    forces. By virtual work F_wheel dx = F_shaft ds, hence F_wheel = F_shaft / LR and
    v_shaft = v_wheel / LR (a lever; e.g. Dixon, *The Shock Absorber Handbook*, 2nd ed. 2007,
    chapter on installation; from memory).
    """

    travel_mm: Floats
    """Wheel travel (n,), mm, from 0 to full, strictly increasing, n >= 2."""
    ratio: Floats
    """Leverage ratio (n,), dimensionless, above 0."""

    @cached_property
    def _motion(self) -> PchipInterpolator:
        return PchipInterpolator(self.travel_mm, 1.0 / self.ratio)

    @cached_property
    def _stroke(self) -> PchipInterpolator:
        return self._motion.antiderivative()

    @property
    def full_travel_mm(self) -> float:
        """Whole wheel travel, mm."""
        return float(self.travel_mm[-1])

    @property
    def full_stroke_mm(self) -> float:
        """Shaft stroke over the whole wheel travel, mm."""
        return self.stroke_mm(self.full_travel_mm)

    def ratio_at(self, travel_mm: float) -> float:
        """Leverage ratio at a wheel travel, mm."""
        return 1.0 / self.stroke_per_travel(travel_mm)

    def stroke_per_travel(self, travel_mm: float) -> float:
        """ds/dx at a wheel travel, mm."""
        return float(self._motion(travel_mm))

    def stroke_per_travel_slope(self, travel_mm: float) -> float:
        """d2s/dx2, 1/mm, at a wheel travel, mm."""
        return float(self._motion(travel_mm, 1))

    def stroke_mm(self, travel_mm: float) -> float:
        """Shaft stroke, mm, at a wheel travel, mm."""
        return float(self._stroke(travel_mm))

    def travel_at_mm(self, stroke_mm: float) -> float:
        """Wheel travel, mm, at a shaft stroke, mm, between 0 and full."""
        if stroke_mm >= self.full_stroke_mm:
            return self.full_travel_mm
        return float(
            brentq(
                lambda travel: self.stroke_mm(travel) - stroke_mm,
                0.0,
                self.full_travel_mm,
                xtol=1e-12,
                rtol=1e-14,
            )
        )
